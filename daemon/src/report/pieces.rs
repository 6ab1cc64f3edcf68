//! Pieces that several parts of the page are put together from.

use jiff::civil::DateTime;
use maud::{Markup, html};
use restudy_engine::Standing;

use super::svg::Picture;
use crate::plain::dates;

/// A picture's drawing, with its height in pixels.
pub(super) struct Strip {
    pub(super) height: f64,
    pub(super) body: Markup,
    /// How to read it, printed below it.
    pub(super) caption: String,
    /// What it shows, for those who do not see it; goes before the caption.
    pub(super) aloud: String,
}

/// Pictures under their question, each with its caption.
pub(super) fn figure(
    id: &str,
    question: &str,
    strips: Vec<Strip>,
    above: Option<Markup>,
    below: Option<&str>,
) -> Markup {
    html! {
        figure {
            h3 { (question) }
            @if let Some(above) = above { (above) }
            @for (i, strip) in strips.into_iter().enumerate() {
                @let id = format!("{id}-{}", i + 1);
                @let words = format!("{} {}", strip.aloud, strip.caption);
                (Picture { id: &id, question, words: words.trim(), height: strip.height, body: strip.body }.markup())
                p class="caption" { (strip.caption) }
            }
            @if let Some(below) = below { p class="advice" { (below) } }
        }
    }
}

/// A standing as a word in a frame of its own; told apart by weight and frame, not by colour.
pub(super) fn standing(standing: Standing) -> Markup {
    let class = match standing {
        Standing::Act => "standing act",
        Standing::Watch => "standing watch",
        Standing::NotJudged => "standing not-judged",
        Standing::Under => "standing under",
    };
    html! { span class=(class) { (standing.as_str()) } }
}

/// A civil time as a reader writes it.
pub(super) fn time(at: DateTime) -> String {
    dates::minute(at).replace(' ', "\u{a0}")
}
