//! A cause in words: the sentence that explains, and the step that follows from it.

use restudy_engine::{PART, Study, WITHIN_CELLS};

use super::cause::{Cause, Source};
use super::past::{Past, Repeatability};
use super::words::{self, Scale, count, list, percent};
use crate::evidence::Evidence;
use crate::plain::plural;

/// More other levels than these are counted, not named.
const OTHERS_NAMED: usize = 3;

/// What is needed to speak of a characteristic's readings.
#[derive(Clone, Copy)]
pub(super) struct Telling<'a> {
    pub(super) evidence: &'a Evidence,
    pub(super) scale: &'a Scale,
}

impl Telling<'_> {
    /// What makes the share, with its part of the gauge's variance.
    pub(super) fn why(self, cause: &Cause) -> String {
        let part = format!("{} of the gauge's variance", percent(cause.of_gauge));
        match &cause.source {
            Source::Level {
                factor,
                level,
                by,
                parts,
            } => {
                let direction = if *by > 0.0 { "above" } else { "below" };
                let all = self
                    .evidence
                    .factors
                    .iter()
                    .find(|f| f.name == PART)
                    .map_or(0, |f| f.levels.len());
                let on = if *parts == all {
                    format!("all {all} parts")
                } else {
                    format!("{parts} of {all} parts")
                };
                format!(
                    "{} reads {} {direction} {}, on {on}; differences between {} make {part}",
                    self.level(*factor, *level),
                    self.scale.length(by.abs()),
                    self.others(*factor, *level),
                    self.levels_of(*factor),
                )
            }
            Source::Levels {
                factor,
                lowest,
                highest,
                by,
            } => format!(
                "{} differ by {}, from {} (lowest) to {} (highest); that makes {part}",
                words::capital(&self.levels_of(*factor)),
                self.scale.length(*by),
                self.level(*factor, *lowest),
                self.level(*factor, *highest),
            ),
            Source::Together { factors, furthest } => {
                let names: Vec<String> = factors.iter().map(|f| self.word(*f)).collect();
                let what = match names.as_slice() {
                    [first, other] if first == PART => format!(
                        "differences between {} change from part to part",
                        plural(other)
                    ),
                    _ => format!("{} act together", list(&names)),
                };
                let where_ = match (factors.as_slice(), furthest) {
                    ([part, factor], Some((p, l, off))) => format!(
                        ", most for part {} with {} ({} {})",
                        self.level(*part, *p),
                        self.level(*factor, *l),
                        self.scale.length(off.abs()),
                        if *off > 0.0 { "high" } else { "low" },
                    ),
                    _ => String::new(),
                };
                format!("{}{where_}; that makes {part}", words::capital(&what))
            }
            Source::Repeatability {
                with: Some(term), ..
            } => format!(
                "Repeatability with {} makes {part}; one trial does not tell them apart",
                self.in_plant_words(term)
            ),
            Source::Repeatability { widest, with: None } => {
                let where_ = widest.as_ref().map(|(levels, range)| {
                    let runs = count(self.evidence.trials, "run");
                    format!(
                        "; widest: {}, {} over {runs}",
                        self.cell(levels),
                        self.scale.length(*range)
                    )
                });
                format!("Repeatability makes {part}{}", where_.unwrap_or_default())
            }
        }
    }

    /// What the share would be without the cause.
    pub(super) fn without(self, cause: &Cause) -> Option<String> {
        let what = match &cause.source {
            Source::Level { factor, .. } | Source::Levels { factor, .. } => {
                format!("differences between {}", self.levels_of(*factor))
            }
            Source::Together { .. } => "it".to_owned(),
            Source::Repeatability { .. } => return None,
        };
        Some(format!("Without {what}: {}", percent(cause.without?)))
    }

    /// The step that would show the reason.
    pub(super) fn next(self, cause: &Cause) -> String {
        match &cause.source {
            Source::Level { factor, level, .. } => format!(
                "go through one part with {}, step by step, until the physical reason is found; then repeat the whole round",
                self.level(*factor, *level)
            ),
            Source::Levels { factor, lowest, highest, .. } => format!(
                "let {} and {} show each other on one part what they do differently; agree on one way among {}, then repeat the whole round",
                self.level(*factor, *lowest),
                self.level(*factor, *highest),
                self.levels_of(*factor),
            ),
            Source::Together { factors, furthest } => match (factors.as_slice(), furthest) {
                ([part, factor], Some((p, l, _))) => format!(
                    "look at part {} with {} first: seat, datum, clamping; then repeat the whole round",
                    self.level(*part, *p),
                    self.level(*factor, *l)
                ),
                _ => "look at the combinations that differ; then repeat the whole round".to_owned(),
            },
            Source::Repeatability { with: Some(term), .. } => format!(
                "repeat the whole round with two trials or more: only they tell repeatability from {}",
                self.in_plant_words(term)
            ),
            Source::Repeatability { with: None, .. } => {
                "same part, same hands, other value: look at seat, clamping, stylus and cleaning; then repeat the whole round".to_owned()
            }
        }
    }

    /// Repeatability now and in the round before.
    pub(super) fn repeatability(self, now: &Study, past: &Past) -> Option<String> {
        let shown = match (
            now.figures.repeatability.share_of_tolerance.estimate,
            past.repeatability,
        ) {
            (Some(now), Some(before)) => {
                format!("{} of tolerance (was {})", percent(now), percent(before))
            }
            _ => {
                let sd = now.figures.repeatability.sd.estimate?;
                let before = past.sds.get(WITHIN_CELLS)?;
                format!(
                    "sd {} (was {})",
                    self.scale.length(sd),
                    self.scale.length(*before)
                )
            }
        };
        let moved = match past.repeatability_now(now)? {
            Repeatability::AsBefore => "no more change than chance makes",
            Repeatability::Higher => "higher, by more than chance explains",
            Repeatability::Lower => "lower, by more than chance explains",
        };
        Some(format!("Repeatability: {shown}, {moved}"))
    }

    /// The source that shrank most since the round before.
    pub(super) fn shrunk(self, now: &Study, past: &Past) -> Option<String> {
        let fell = |sd: f64, before: f64| before * before - sd * sd;
        let (name, sd, before) = now
            .components
            .iter()
            .filter(|c| c.of != [PART])
            .filter(|c| c.name != WITHIN_CELLS || past.same_repeats(now))
            .filter_map(|c| {
                Some((
                    c.name.as_ref(),
                    c.sd.estimate?,
                    *past.sds.get(c.name.as_ref())?,
                ))
            })
            .filter(|(_, sd, before)| sd < before)
            .max_by(|a, b| fell(a.1, a.2).total_cmp(&fell(b.1, b.2)))?;
        let what = match name {
            WITHIN_CELLS => "repeatability".to_owned(),
            name => match self.evidence.factors.iter().find(|f| f.name == name) {
                Some(factor) => {
                    format!("differences between {}", plural(&words::name(&factor.word)))
                }
                None => self.in_plant_words(name),
            },
        };
        Some(format!(
            "{}: sd {}, was {}",
            words::capital(&what),
            self.scale.length(sd),
            self.scale.length(before)
        ))
    }

    /// A line's name with the plant's own words for its factors.
    pub(super) fn in_plant_words(self, line: &str) -> String {
        let word = |name: &str| {
            let factor = self.evidence.factors.iter().find(|f| f.name == name);
            factor.map_or_else(|| name.to_owned(), |f| words::name(&f.word))
        };
        line.split(" × ").map(word).collect::<Vec<_>>().join(" × ")
    }

    fn word(self, factor: usize) -> String {
        words::name(&self.evidence.factors[factor].word)
    }

    fn levels_of(self, factor: usize) -> String {
        plural(&self.word(factor))
    }

    fn level(self, factor: usize, level: usize) -> String {
        words::name(&self.evidence.factors[factor].levels[level])
    }

    fn others(self, factor: usize, but: usize) -> String {
        let count = self.evidence.factors[factor].levels.len();
        let others: Vec<String> = (0..count)
            .filter(|l| *l != but)
            .map(|l| self.level(factor, l))
            .collect();
        if others.len() > OTHERS_NAMED {
            format!("the other {}", others.len())
        } else {
            list(&others)
        }
    }

    fn cell(self, levels: &[usize]) -> String {
        let names = levels.iter().enumerate().map(|(factor, level)| {
            match self.evidence.factors[factor].name.as_str() {
                PART => format!("part {}", self.level(factor, *level)),
                _ => self.level(factor, *level),
            }
        });
        names.collect::<Vec<_>>().join(" with ")
    }
}
