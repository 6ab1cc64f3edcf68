//! The design of a study from files: which factors enter it, what is nested in what, and the cell of every reading.
//!
//! Model: the readings say which levels there are, the command line says what is nested. A factor that never varies is
//! none. Levels of a nested factor are counted within each combination of its containers, so that equal labels in two
//! of them are two things, and labels that differ throughout give the same design.
//!
//! Not here: working the study out.
//!
//! Invariant: factors that are crossed here meet in the readings; where labels show that one lies within another, or
//! that two change together, there is a [`Fault`] and no design.

use std::collections::{BTreeMap, BTreeSet};

use restudy_engine::{Design, Factor, Names};
use restudy_parsers::fold;

use super::fault::Fault;
use super::material::{Gathered, Row};
use super::nesting::Nesting;
use crate::natural;

/// The design of one characteristic's readings.
#[derive(Debug)]
pub(super) struct Structure {
    pub(super) design: Design,
    /// The cell of each row.
    pub(super) cells: Vec<usize>,
    names: Vec<(String, Vec<String>)>,
    /// What a person should know of it, a sentence each.
    pub(super) notes: Vec<String>,
}

/// A factor that varies.
struct Studied<'a> {
    place: usize,
    word: &'a str,
    within: Vec<usize>,
    /// Places of all containers, in the order of the design.
    containers: Vec<usize>,
    /// By the folded labels of the containers.
    levels: BTreeMap<Vec<String>, Levels>,
    most: usize,
}

/// The levels of a factor in one combination of its containers.
struct Levels {
    /// The labels of the containers as first written.
    under: Vec<String>,
    /// As first written, in natural order.
    labels: Vec<String>,
}

impl Structure {
    pub(super) fn of(gathered: &Gathered, nesting: &Nesting) -> Result<Self, Fault> {
        if let Some(fault) = &gathered.fault {
            return Err(Fault::new(fault.clone()));
        }
        let mut notes = Vec::new();
        let kept = varying(gathered, nesting, &mut notes);
        let studied: Vec<Studied<'_>> = kept
            .iter()
            .map(|&f| Studied::new(gathered, nesting, &kept, f))
            .collect();
        for factor in &studied {
            factor.varies_within(nesting)?;
            notes.extend(factor.unequal(nesting));
        }
        crossed_factors_meet(&gathered.rows, nesting, &studied)?;
        let factors = studied.iter().map(|s| Factor {
            name: s.word.to_owned(),
            levels: s.most,
            within: s
                .within
                .iter()
                .map(|&f| nesting.factors[f].clone())
                .collect(),
        });
        let design = Design::new(factors.collect()).map_err(|e| Fault::new(e.to_string()))?;
        let cell = |row: &Row| {
            studied
                .iter()
                .fold(0, |cell, s| cell * s.most + s.level(row))
        };
        let cells = gathered.rows.iter().map(cell).collect();
        let names = studied
            .iter()
            .map(|s| (s.word.to_owned(), s.names(&studied)))
            .collect();
        Ok(Self {
            design,
            cells,
            names,
            notes,
        })
    }

    /// What people call the factors and their levels.
    pub(super) fn names(&self) -> Vec<Names<'_>> {
        self.names
            .iter()
            .map(|(word, levels)| Names {
                word,
                levels: levels.iter().map(String::as_str).collect(),
            })
            .collect()
    }
}

/// Places of the factors that enter the design: the part, and what has two labels or more.
fn varying(gathered: &Gathered, nesting: &Nesting, notes: &mut Vec<String>) -> Vec<usize> {
    let is_kept = |&f: &usize| {
        let word = &nesting.factors[f];
        if nesting.left_out[f] {
            notes.push(format!(
                "{word} is left out of the design; what it adds counts as repeatability"
            ));
            return false;
        }
        let labels: BTreeSet<String> = gathered.rows.iter().map(|r| fold(&r.labels[f])).collect();
        let nested = !nesting.within[f].is_empty();
        if f == 0 || nested || labels.len() > 1 {
            return true;
        }
        if let Some(only) = gathered.rows.first().map(|r| &r.labels[f]) {
            notes.push(format!(
                "{word} is `{only}` throughout, so it is not in the design and its spread stays unknown"
            ));
        }
        false
    };
    (0..nesting.factors.len()).filter(is_kept).collect()
}

impl<'a> Studied<'a> {
    fn new(gathered: &Gathered, nesting: &'a Nesting, kept: &[usize], place: usize) -> Self {
        let within = nesting.within[place].iter().copied();
        let containers = nesting.all_within[place].iter().copied();
        let containers: Vec<usize> = containers.filter(|f| kept.contains(f)).collect();
        let mut seen = BTreeSet::new();
        let mut levels: BTreeMap<Vec<String>, Levels> = BTreeMap::new();
        for row in &gathered.rows {
            let (under, label) = (folded(row, &containers), &row.labels[place]);
            if !seen.insert((under.clone(), fold(label))) {
                continue;
            }
            let level = levels.entry(under).or_insert_with(|| Levels {
                under: containers.iter().map(|&f| row.labels[f].clone()).collect(),
                labels: Vec::new(),
            });
            level.labels.push(label.clone());
        }
        for level in levels.values_mut() {
            level.labels.sort_by(|a, b| natural::compare(a, b));
        }
        Self {
            place,
            word: &nesting.factors[place],
            within: within.filter(|f| kept.contains(f)).collect(),
            most: levels.values().map(|l| l.labels.len()).max().unwrap_or(0),
            containers,
            levels,
        }
    }

    fn level(&self, row: &Row) -> usize {
        let label = fold(&row.labels[self.place]);
        self.level_of(&folded(row, &self.containers), &label)
    }

    /// Index of a level by folded labels, 0 for one that no reading has.
    fn level_of(&self, under: &[String], label: &str) -> usize {
        let levels = self.levels.get(under);
        levels
            .and_then(|l| l.labels.iter().position(|l| fold(l) == label))
            .unwrap_or(0)
    }

    /// The labels in every combination of the containers, the last container fastest; blank where there are fewer.
    fn names(&self, studied: &[Studied<'_>]) -> Vec<String> {
        let containers: Vec<&Studied<'_>> = studied
            .iter()
            .filter(|s| self.containers.contains(&s.place))
            .collect();
        let mut names =
            vec![String::new(); containers.iter().map(|s| s.most).product::<usize>() * self.most];
        for (under, levels) in &self.levels {
            let label_of: BTreeMap<usize, &String> =
                self.containers.iter().copied().zip(under).collect();
            let combination = containers.iter().fold(0, |place, s| {
                let above: Vec<String> = s.containers.iter().map(|f| label_of[f].clone()).collect();
                place * s.most + s.level_of(&above, label_of[&s.place])
            });
            for (level, label) in levels.labels.iter().enumerate() {
                names[combination * self.most + level].clone_from(label);
            }
        }
        names
    }

    fn varies_within(&self, nesting: &Nesting) -> Result<(), Fault> {
        if self.containers.is_empty() || self.most > 1 {
            return Ok(());
        }
        let containers = words(nesting, &self.containers);
        Err(Fault::hinted(
            format!(
                "there is one {} within each {containers}, so that nothing tells their spreads apart",
                self.word
            ),
            format!("a factor that is nested needs two levels or more within each {containers}"),
        ))
    }

    /// Containers that hold fewer levels than others.
    fn unequal(&self, nesting: &Nesting) -> Option<String> {
        let holds = |levels: &&Levels| levels.labels.len() == self.most;
        let most = self.levels.values().find(holds)?;
        let fewer = self.levels.values().find(|levels| !holds(levels))?;
        let told = |levels: &Levels| {
            let under: Vec<String> = self
                .containers
                .iter()
                .zip(&levels.under)
                .map(|(&f, label)| format!("{} {label}", nesting.factors[f]))
                .collect();
            format!("{} within {}", levels.labels.len(), under.join(", "))
        };
        Some(format!(
            "the levels of {} differ in number, {} and {}; are all labels as they should be?",
            self.word,
            told(most),
            told(fewer)
        ))
    }
}

/// Refuses factors that the labels show to be nested, or to change together, though they are not said to be.
fn crossed_factors_meet(
    rows: &[Row],
    nesting: &Nesting,
    studied: &[Studied<'_>],
) -> Result<(), Fault> {
    // Whether every level of `inner` is met under one level of `outer` only.
    let lies_within = |inner: &Studied<'_>, outer: &Studied<'_>| {
        let mut under = BTreeMap::new();
        outer.most > 1
            && inner.most > 1
            && rows.iter().all(|row| {
                let found = outer.identity(row);
                *under
                    .entry(inner.identity(row))
                    .or_insert_with(|| found.clone())
                    == found
            })
    };
    for inner in studied {
        let others = studied.iter().filter(|outer| {
            outer.place != inner.place
                && !inner.containers.contains(&outer.place)
                && !outer.containers.contains(&inner.place)
        });
        let outer: Vec<&Studied<'_>> = others.filter(|outer| lies_within(inner, outer)).collect();
        let Some(first) = outer.first() else { continue };
        if lies_within(first, inner) {
            return Err(Fault::hinted(
                format!(
                    "{} and {} change together, so that nothing tells their spreads apart",
                    inner.word, first.word
                ),
                format!(
                    "leave one of them out, as in --leave-out {}",
                    quoted(spare(inner, first))
                ),
            ));
        }
        let declared = nesting.within[inner.place].iter();
        let containers: Vec<&str> = declared
            .map(|&f| nesting.factors[f].as_str())
            .chain(outer.iter().map(|o| o.word))
            .collect();
        let met: Vec<&str> = outer.iter().map(|o| o.word).collect();
        return Err(Fault::hinted(
            format!(
                "every {} appears under one {} only, so that a crossed design would have empty cells",
                inner.word,
                met.join(" and one ")
            ),
            format!(
                "if that was the plan, say --within {}",
                quoted(&format!("{}={}", inner.word, containers.join(",")))
            ),
        ));
    }
    Ok(())
}

/// Of two factors that change together, the one that a study can do without.
fn spare<'a>(one: &Studied<'a>, other: &Studied<'a>) -> &'a str {
    if other.place == 0 {
        one.word
    } else {
        other.word
    }
}

impl Studied<'_> {
    /// What tells a level from all others: its label under those of its containers.
    fn identity(&self, row: &Row) -> (Vec<String>, String) {
        (folded(row, &self.containers), fold(&row.labels[self.place]))
    }
}

fn folded(row: &Row, factors: &[usize]) -> Vec<String> {
    factors.iter().map(|&f| fold(&row.labels[f])).collect()
}

fn words(nesting: &Nesting, factors: &[usize]) -> String {
    let words: Vec<&str> = factors
        .iter()
        .map(|&f| nesting.factors[f].as_str())
        .collect();
    words.join(" × ")
}

/// A word of a command line.
fn quoted(text: &str) -> String {
    if text.contains(' ') {
        format!("\"{text}\"")
    } else {
        text.to_owned()
    }
}
