//! The few shapes that the pictures are made of.
//!
//! Model: across in percent of the picture's width, down in pixels. Elements are always closed, as XML wants it.

use maud::{Markup, html};

/// Shapes that tell readers apart without colour; beyond these they repeat.
const SHAPES: usize = 8;

/// A picture: its question, what it shows in words, its height in pixels, and what is in it.
pub(super) struct Picture<'a> {
    /// Unique in the page.
    pub(super) id: &'a str,
    pub(super) question: &'a str,
    pub(super) words: &'a str,
    pub(super) height: f64,
    pub(super) body: Markup,
}

impl Picture<'_> {
    pub(super) fn markup(self) -> Markup {
        let (title, words) = (format!("{}-title", self.id), format!("{}-words", self.id));
        html! {
            svg role="img" aria-labelledby=(title) aria-describedby=(words) width="100%" height=(px(self.height)) {
                title id=(title) { (self.question) }
                desc id=(words) { (self.words) }
                (self.body)
            }
        }
    }
}

/// On which side of its place a text stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Side {
    Left,
    Right,
}

impl Side {
    /// The side with more room.
    pub(super) fn roomier(x: f64) -> Side {
        if x < 50.0 { Side::Right } else { Side::Left }
    }
}

/// A text beside a place.
pub(super) fn beside(x: f64, y: f64, side: Side, class: &str, words: &str) -> Markup {
    let (anchor, dx) = match side {
        Side::Left => ("end", "-5"),
        Side::Right => ("start", "5"),
    };
    html! { text class=(class) x=(percent(x)) y=(px(y)) dx=(dx) text-anchor=(anchor) { (words) } }
}

/// A text in the middle of a place.
pub(super) fn centred(x: f64, y: f64, class: &str, words: &str) -> Markup {
    html! { text class=(class) x=(percent(x)) y=(px(y)) text-anchor="middle" { (words) } }
}

/// A text that begins at a place.
pub(super) fn from(x: f64, y: f64, class: &str, words: &str) -> Markup {
    html! { text class=(class) x=(percent(x)) y=(px(y)) { (words) } }
}

/// A text that ends at a place.
pub(super) fn up_to(x: f64, y: f64, class: &str, words: &str) -> Markup {
    html! { text class=(class) x=(percent(x)) y=(px(y)) text-anchor="end" { (words) } }
}

/// An upright line.
pub(super) fn upright(x: f64, top: f64, bottom: f64, class: &str) -> Markup {
    html! { line class=(class) x1=(percent(x)) x2=(percent(x)) y1=(px(top)) y2=(px(bottom)) {} }
}

/// A level line.
pub(super) fn level(from: f64, to: f64, y: f64, class: &str) -> Markup {
    html! { line class=(class) x1=(percent(from)) x2=(percent(to)) y1=(px(y)) y2=(px(y)) {} }
}

/// A box between two places.
pub(super) fn block(from: f64, to: f64, top: f64, height: f64, class: &str) -> Markup {
    html! { rect class=(class) x=(percent(from)) width=(percent((to - from).max(0.0))) y=(px(top)) height=(px(height)) {} }
}

/// The mark of one level of a factor.
pub(super) fn mark(level: usize, x: f64, y: f64) -> Markup {
    html! { use href=(mark_reference(level)) x=(percent(x)) y=(px(y)) {} }
}

/// A mark by itself, for a legend.
pub(super) fn lone_mark(level: usize) -> Markup {
    html! { svg class="mark" aria-hidden="true" width="14" height="14" { use href=(mark_reference(level)) x="7" y="7" {} } }
}

/// A round dot.
pub(super) fn dot(x: f64, y: f64, radius: f64, class: &str) -> Markup {
    html! { circle class=(class) cx=(percent(x)) cy=(px(y)) r=(px(radius)) {} }
}

/// The end of a line that goes on beyond the picture.
pub(super) fn arrow(x: f64, y: f64) -> Markup {
    html! { use href="#arrow" x=(percent(x)) y=(px(y)) {} }
}

/// What several pictures share: marks, arrow and hatchings. Stands once in a page.
pub(super) fn shared() -> Markup {
    let marks: [(&str, &str); SHAPES] = [
        ("M-3.4 0A3.4 3.4 0 1 0 3.4 0A3.4 3.4 0 1 0 -3.4 0Z", "solid"),
        ("M0 -4.4L4.2 3.2L-4.2 3.2Z", "hollow"),
        ("M-3.8 -3.8L3.8 3.8M-3.8 3.8L3.8 -3.8", "stroke"),
        ("M-3.2 -3.2H3.2V3.2H-3.2Z", "solid"),
        ("M0 -4.8L4.8 0L0 4.8L-4.8 0Z", "hollow"),
        ("M0 4.4L4.2 -3.2L-4.2 -3.2Z", "solid"),
        ("M0 -4.6V4.6M-4.6 0H4.6", "stroke"),
        ("M-3.2 -3.2H3.2V3.2H-3.2Z", "hollow"),
    ];
    let hatchings = [
        ("hatch-up", "M-2 2L2 -2M0 8L8 0M6 10L10 6"),
        ("hatch-down", "M-2 6L2 10M0 0L8 8M6 -2L10 2"),
    ];
    html! {
        svg class="shared" aria-hidden="true" width="0" height="0" {
            defs {
                @for (i, (path, style)) in marks.iter().enumerate() {
                    g id=(format!("mark-{i}")) { path class=(style) d=(path) {} }
                }
                g id="arrow" { path class="whisker" d="M-6 -4.5L0 0L-6 4.5" {} }
                @for (id, path) in hatchings {
                    pattern id=(id) width="8" height="8" patternUnits="userSpaceOnUse" {
                        path class="hatch" d=(path) {}
                    }
                }
            }
        }
    }
}

fn mark_reference(level: usize) -> String {
    format!("#mark-{}", level % SHAPES)
}

fn percent(x: f64) -> String {
    format!("{x:.3}%")
}

fn px(y: f64) -> String {
    format!("{y:.1}")
}
