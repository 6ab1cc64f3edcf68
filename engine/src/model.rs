//! The balanced random model of a design: which lines the table of mean squares has, and what follows.
//!
//! A line is a term (a set of factors) or the error, last. With `N` readings and `L` combinations in a
//! line, `E[MS of T]` is the sum of `(N / L_S) × variance of S` over all lines `S` that hold `T`, the error
//! included. That sum over larger lines is undone by whole-number weights (Möbius inversion over the
//! lines ordered by inclusion), so every component, every denominator of an F and every figure is a
//! combination of mean squares with whole numerators over one denominator `N`: nothing is rounded.
//!
//! Source: Searle, Casella & McCulloch, *Variance Components*, Wiley 1992, ch. 4 (rules for expected mean
//! squares); Rota 1964 for the inversion.

use crate::combination::Combination;
use crate::design::{Design, FactorSet};

/// Name of the error line.
pub const WITHIN_CELLS: &str = "within cells";

/// One line: a term, or the error.
#[derive(Debug, Clone, PartialEq)]
pub struct Line {
    /// `part`, `part × appraiser`, `part within appraiser`, `within cells`.
    pub name: String,
    /// Inner factors; none for the error.
    pub of: Vec<String>,
    /// Containing factors.
    pub within: Vec<String>,
    /// Combinations of its factors; the number of readings for the error.
    pub cells: usize,
    /// Degrees of freedom.
    pub df: usize,
    /// The factors; `None` for the error, which every term is inside of.
    set: Option<FactorSet>,
    /// Whether it joins the part with other factors.
    interaction: bool,
}

impl Line {
    fn holds(&self, other: &Line) -> bool {
        match (self.set, other.set) {
            (None, _) => true,
            (Some(_), None) => false,
            (Some(outer), Some(inner)) => outer.holds(inner),
        }
    }
}

/// The lines of a design with a number of trials, all terms or some of them.
#[derive(Debug, Clone, PartialEq)]
pub struct Model {
    readings: usize,
    lines: Vec<Line>,
    /// `weights[t][q]`: how often mean square `q` enters the inversion for line `t`.
    weights: Vec<Vec<i64>>,
    part: Option<usize>,
    crossed: usize,
}

impl Model {
    /// All terms of the design, also those without a degree of freedom.
    pub fn full(design: &Design, trials: usize) -> Model {
        Model::of(design, trials, design.terms())
    }

    /// The terms that a complete study can tell apart.
    ///
    /// Terms without a degree of freedom (a factor of one level) are left out. When nothing is left for
    /// the error, as with one trial, the largest term becomes the error.
    pub fn estimable(design: &Design, trials: usize) -> Model {
        let full = Model::full(design, trials);
        let mut terms: Vec<FactorSet> = full
            .lines
            .iter()
            .filter(|line| line.df > 0)
            .filter_map(|line| line.set)
            .collect();
        if full.error().df == 0 {
            terms.pop();
        }
        Model::of(design, trials, terms)
    }

    /// The same model without some of its lines; the error takes them in.
    pub(crate) fn without(&self, design: &Design, dropped: &[usize]) -> Model {
        let kept = self
            .lines
            .iter()
            .enumerate()
            .filter(|(i, _)| !dropped.contains(i));
        Model::of(
            design,
            self.readings / design.cells(),
            kept.filter_map(|(_, line)| line.set).collect(),
        )
    }

    fn of(design: &Design, trials: usize, terms: Vec<FactorSet>) -> Model {
        let readings = design.cells() * trials;
        let mut lines: Vec<Line> = Vec::with_capacity(terms.len() + 1);
        for set in terms {
            let cells = design.combinations(set);
            let inside: usize = lines
                .iter()
                .filter(|l| l.set.is_some_and(|s| set.holds_more_than(s)))
                .map(|l| l.df)
                .sum();
            lines.push(term(design, set, cells, cells - 1 - inside));
        }
        let df = readings - 1 - lines.iter().map(|l| l.df).sum::<usize>();
        let none = Vec::new();
        lines.push(Line {
            name: WITHIN_CELLS.to_owned(),
            of: none.clone(),
            within: none,
            cells: readings,
            df,
            set: None,
            interaction: false,
        });
        let part = lines.iter().position(|l| l.set == Some(design.part_term()));
        Model {
            readings,
            weights: inversion(&lines),
            lines,
            part,
            crossed: design.crossed(),
        }
    }

    /// All lines, the error last.
    pub fn lines(&self) -> &[Line] {
        &self.lines
    }

    /// The error line.
    pub fn error(&self) -> &Line {
        &self.lines[self.lines.len() - 1]
    }

    /// Weights of the components of all lines in the expected mean square of one.
    pub fn expected_mean_square(&self, line: usize) -> Vec<usize> {
        let holds = |l: &Line| {
            if l.holds(&self.lines[line]) {
                self.readings / l.cells
            } else {
                0
            }
        };
        self.lines.iter().map(holds).collect()
    }

    /// The variance component of a line as a combination of mean squares.
    pub fn component(&self, line: usize) -> Combination {
        let cells = self.lines[line].cells as i64;
        Combination::new(
            self.weights[line].iter().map(|w| w * cells).collect(),
            self.readings,
        )
    }

    /// What the mean square of a line is tested against; `None` for the error.
    pub fn denominator(&self, line: usize) -> Option<Combination> {
        self.lines[line].set?;
        let weights = self.weights[line]
            .iter()
            .enumerate()
            .map(|(q, w)| if q == line { 0 } else { -w });
        Some(Combination::new(weights.collect(), 1))
    }

    /// The sum of the components of some lines; `None` when there are none.
    pub(crate) fn sum(&self, lines: impl Iterator<Item = usize>) -> Option<Combination> {
        lines
            .map(|line| self.component(line))
            .reduce(|a, b| a.plus(&b))
    }

    /// The largest term of the design when this model's error holds it for want of a second trial.
    pub(crate) fn taken_in_by_error(&self, design: &Design) -> Option<String> {
        let full = Model::full(design, self.readings / design.cells());
        let largest = full
            .lines
            .iter()
            .rfind(|line| line.df > 0 && line.set.is_some())?;
        (full.error().df == 0).then(|| largest.name.clone())
    }

    /// The variance of the grand mean.
    pub(crate) fn variance_of_mean(&self) -> Combination {
        let added = (0..self.lines.len()).map(|q| self.weights.iter().map(|w| w[q]).sum());
        Combination::new(added.collect(), self.readings)
    }

    /// Factors of two or more levels that are crossed with one another and hold no other factor.
    pub(crate) fn crossed(&self) -> usize {
        self.crossed
    }

    pub(crate) fn readings(&self) -> usize {
        self.readings
    }

    pub(crate) fn set(&self, line: usize) -> Option<FactorSet> {
        self.lines[line].set
    }

    /// The line of the part alone; absent when the error has taken it in.
    pub(crate) fn part(&self) -> Option<usize> {
        self.part
    }

    /// The line that a term's sum of squares goes to: its own, or the error.
    pub(crate) fn home(&self, term: FactorSet) -> usize {
        let own = self.lines.iter().position(|l| l.set == Some(term));
        own.unwrap_or(self.lines.len() - 1)
    }

    /// Lines that are neither part nor error.
    pub(crate) fn reproducibility(&self) -> impl Iterator<Item = usize> {
        (0..self.lines.len() - 1).filter(|&i| Some(i) != self.part)
    }

    /// Lines that join the part with other factors, largest first.
    pub(crate) fn interactions(&self) -> Vec<usize> {
        (0..self.lines.len())
            .rev()
            .filter(|&i| self.lines[i].interaction)
            .collect()
    }

    /// Their names, in the same order.
    pub(crate) fn interaction_names(&self) -> Vec<String> {
        let lines = self.interactions().into_iter();
        lines.map(|i| self.lines[i].name.clone()).collect()
    }

    /// Whether no other term holds this one, so that the error alone would take it in.
    pub(crate) fn is_outermost(&self, line: usize) -> bool {
        let terms = self
            .lines
            .iter()
            .enumerate()
            .filter(|(_, l)| l.set.is_some());
        terms
            .filter(|&(i, _)| i != line)
            .all(|(_, l)| !l.holds(&self.lines[line]))
    }
}

fn term(design: &Design, set: FactorSet, cells: usize, df: usize) -> Line {
    let inner = design.inner(set);
    let name = |f: usize| design.factors()[f].name.clone();
    let of: Vec<String> = inner.iter().map(|&f| name(f)).collect();
    let within: Vec<String> = set
        .iter()
        .filter(|f| !inner.contains(f))
        .map(name)
        .collect();
    let mut words = of.join(" × ");
    if !within.is_empty() {
        words = format!("{words} within {}", within.join(" × "));
    }
    let interaction = inner.len() > 1 && inner.contains(&design.part());
    Line {
        name: words,
        of,
        within,
        cells,
        df,
        set: Some(set),
        interaction,
    }
}

fn inversion(lines: &[Line]) -> Vec<Vec<i64>> {
    let weights_of = |t: usize| {
        let mut weights = vec![0i64; lines.len()];
        weights[t] = 1;
        for s in t + 1..lines.len() {
            if lines[s].holds(&lines[t]) {
                weights[s] = -(t..s)
                    .filter(|&u| lines[s].holds(&lines[u]))
                    .map(|u| weights[u])
                    .sum::<i64>();
            }
        }
        weights
    };
    (0..lines.len()).map(weights_of).collect()
}
