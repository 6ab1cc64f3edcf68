//! The planned design as data: factors, how many levels, and what is nested in what.
//!
//! A cell is one combination of all factors. Its index counts in mixed radix over the factors in the
//! order given, the first factor slowest; a nested factor counts its levels afresh in every combination
//! of its containers. Trials are readings within a cell and no factor.
//!
//! Invariant: a `Design` has one factor called `part`, distinct names, at least one level a factor, and
//! no factor that contains itself.

use serde::{Deserialize, Serialize};

/// Factors that a design may have; bounds the terms (2⁶) and so the work per design.
pub const FACTORS_MAX: usize = 6;
/// Cells that a design may have.
pub const CELLS_MAX: usize = 100_000;
/// The name of the factor that stands for the measured parts.
pub const PART: &str = "part";

/// One factor: how many levels it has *within one combination of the factors it is nested in*.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Factor {
    /// Its name; one factor is called `part`.
    pub name: String,
    /// Levels within one combination of the containers.
    pub levels: usize,
    /// The factors it is nested in, by name.
    pub within: Vec<String>,
}

impl Factor {
    /// A factor that is crossed with all others unless they are nested in it.
    pub fn crossed(name: &str, levels: usize) -> Self {
        Factor {
            name: name.to_owned(),
            levels,
            within: Vec::new(),
        }
    }

    /// A factor nested in others.
    pub fn nested(name: &str, levels: usize, within: &[&str]) -> Self {
        Factor {
            name: name.to_owned(),
            levels,
            within: within.iter().map(|&w| w.to_owned()).collect(),
        }
    }
}

/// A checked list of factors.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Design {
    factors: Vec<Factor>,
    /// For each factor the set of its containers, taken transitively.
    containers: Vec<FactorSet>,
    part: usize,
    cells: usize,
}

/// Why a list of factors is no design.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum DesignError {
    /// No factor is called `part`.
    #[error(
        "the design has no factor called `part`; expected the factor of the measured parts under that name"
    )]
    NoPart,
    /// More factors than [`FACTORS_MAX`].
    #[error("the design has {0} factors; expected at most {FACTORS_MAX}")]
    TooManyFactors(usize),
    /// A factor without a name.
    #[error("factor {0} of the design has no name")]
    NoName(usize),
    /// Two factors of one name.
    #[error("the design has two factors called `{0}`; expected different names")]
    SameName(String),
    /// A factor without levels.
    #[error("factor `{0}` has no levels; expected at least 1")]
    NoLevels(String),
    /// A container that is no factor of the design.
    #[error("factor `{factor}` is nested in `{within}`, which is no factor of the design")]
    UnknownContainer {
        /// The nested factor.
        factor: String,
        /// What it is said to be nested in.
        within: String,
    },
    /// A factor that ends up within itself.
    #[error("factor `{0}` is nested in itself")]
    Circle(String),
    /// More cells than [`CELLS_MAX`].
    #[error("the design has more than {CELLS_MAX} cells; expected fewer factors or levels")]
    TooManyCells,
}

/// A set of factors, bit `i` for factor `i` in the order of the design.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub(crate) struct FactorSet(u32);

impl FactorSet {
    pub(crate) fn of(factor: usize) -> Self {
        FactorSet(1 << factor)
    }
    pub(crate) fn with(self, other: FactorSet) -> Self {
        FactorSet(self.0 | other.0)
    }
    pub(crate) fn has(self, factor: usize) -> bool {
        self.0 >> factor & 1 == 1
    }
    pub(crate) fn holds(self, other: FactorSet) -> bool {
        self.0 & other.0 == other.0
    }
    pub(crate) fn holds_more_than(self, other: FactorSet) -> bool {
        self != other && self.holds(other)
    }
    pub(crate) fn len(self) -> u32 {
        self.0.count_ones()
    }
    pub(crate) fn iter(self) -> impl Iterator<Item = usize> {
        (0..FACTORS_MAX).filter(move |&i| self.has(i))
    }
}

impl Design {
    /// Checks a list of factors.
    ///
    /// # Errors
    /// [`DesignError`] names the first fault found.
    pub fn new(factors: Vec<Factor>) -> Result<Design, DesignError> {
        if factors.len() > FACTORS_MAX {
            return Err(DesignError::TooManyFactors(factors.len()));
        }
        for (i, factor) in factors.iter().enumerate() {
            if factor.name.trim().is_empty() {
                return Err(DesignError::NoName(i + 1));
            }
            if factors[..i]
                .iter()
                .any(|earlier| earlier.name == factor.name)
            {
                return Err(DesignError::SameName(factor.name.clone()));
            }
            if factor.levels == 0 {
                return Err(DesignError::NoLevels(factor.name.clone()));
            }
        }
        let part = factors
            .iter()
            .position(|f| f.name == PART)
            .ok_or(DesignError::NoPart)?;
        let cells = factors
            .iter()
            .try_fold(1usize, |cells, f| {
                cells.checked_mul(f.levels).filter(|&n| n <= CELLS_MAX)
            })
            .ok_or(DesignError::TooManyCells)?;
        let containers = containers(&factors)?;
        Ok(Design {
            factors,
            containers,
            part,
            cells,
        })
    }

    /// The factors in the order given.
    pub fn factors(&self) -> &[Factor] {
        &self.factors
    }

    /// Number of cells: the product of all levels.
    pub fn cells(&self) -> usize {
        self.cells
    }

    /// The level of each factor (from 0, in the order of the factors) in a cell.
    pub fn levels_of(&self, cell: usize) -> Vec<usize> {
        let mut rest = cell;
        let mut levels: Vec<usize> = self
            .factors
            .iter()
            .rev()
            .map(|f| {
                let level = rest % f.levels;
                rest /= f.levels;
                level
            })
            .collect();
        levels.reverse();
        levels
    }

    pub(crate) fn part(&self) -> usize {
        self.part
    }

    /// Index of a factor's level among those of all combinations of its containers, the last container fastest.
    pub(crate) fn place_within_containers(&self, factor: usize, levels: &[usize]) -> usize {
        let containers = self.containers[factor].iter().chain([factor]);
        containers.fold(0, |place, f| place * self.factors[f].levels + levels[f])
    }

    /// The cell in words, levels counted from 1: `part 2, appraiser 3`.
    pub(crate) fn cell_in_words(&self, cell: usize) -> String {
        let levels = self.levels_of(cell);
        let words: Vec<String> = self
            .factors
            .iter()
            .zip(levels)
            .map(|(f, level)| format!("{} {}", f.name, level + 1))
            .collect();
        words.join(", ")
    }

    /// All terms (sets that hold the containers of their members), small ones first.
    pub(crate) fn terms(&self) -> Vec<FactorSet> {
        let mut terms: Vec<FactorSet> = (1..1u32 << self.factors.len())
            .map(FactorSet)
            .filter(|set| set.iter().all(|f| set.holds(self.containers[f])))
            .collect();
        terms.sort_by_key(|set| (set.len(), set.iter().collect::<Vec<_>>()));
        terms
    }

    /// The term of the part alone: the part and its containers.
    pub(crate) fn part_term(&self) -> FactorSet {
        FactorSet::of(self.part).with(self.containers[self.part])
    }

    /// Members that contain no other member.
    pub(crate) fn inner(&self, term: FactorSet) -> Vec<usize> {
        term.iter()
            .filter(|&f| !term.iter().any(|g| self.containers[g].has(f)))
            .collect()
    }

    /// Factors of two or more levels that contain no other factor: all of them crossed with one another.
    pub(crate) fn crossed(&self) -> usize {
        let all = (0..self.factors.len())
            .map(FactorSet::of)
            .fold(FactorSet::default(), FactorSet::with);
        let inner = self.inner(all).into_iter();
        inner.filter(|&f| self.factors[f].levels > 1).count()
    }

    /// Number of combinations of the levels of a term's factors.
    pub(crate) fn combinations(&self, term: FactorSet) -> usize {
        term.iter().map(|f| self.factors[f].levels).product()
    }

    /// For every cell the index of its combination in the term.
    pub(crate) fn projection(&self, term: FactorSet) -> Vec<u32> {
        (0..self.cells)
            .map(|cell| {
                let levels = self.levels_of(cell);
                term.iter().fold(0, |index, f| {
                    index * self.factors[f].levels as u32 + levels[f] as u32
                })
            })
            .collect()
    }
}

fn containers(factors: &[Factor]) -> Result<Vec<FactorSet>, DesignError> {
    let mut sets = Vec::with_capacity(factors.len());
    for factor in factors {
        let mut set = FactorSet::default();
        for name in &factor.within {
            let place = factors
                .iter()
                .position(|f| &f.name == name)
                .ok_or_else(|| DesignError::UnknownContainer {
                    factor: factor.name.clone(),
                    within: name.clone(),
                })?;
            set = set.with(FactorSet::of(place));
        }
        sets.push(set);
    }
    // As many rounds as factors reach every container of a container.
    for _ in 0..factors.len() {
        for i in 0..sets.len() {
            sets[i] = sets[i].iter().fold(sets[i], |set, f| set.with(sets[f]));
        }
    }
    match (0..sets.len()).find(|&i| sets[i].has(i)) {
        Some(i) => Err(DesignError::Circle(factors[i].name.clone())),
        None => Ok(sets),
    }
}
