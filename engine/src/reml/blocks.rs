//! The covariance of cell means, taken apart into blocks.
//!
//! One factor (that with the most levels, as a rule the part) cuts the cells into blocks. Terms that hold this
//! factor, and the error, vary independently from block to block: they act *inside*. The other terms and the mean
//! act *across* blocks, through a few columns. Blocks with the same cells, counts and columns form a class and are
//! worked out once, so that the work grows with the classes and not with the parts.
//!
//! Within a block the first cell is told by its mean and every other one by its difference from the first: a part
//! that lies a million times further out than repeats scatter then touches one number only.
//!
//! Invariant: a cell without readings appears nowhere.

use std::collections::BTreeMap;
use std::ops::Range;

use crate::design::{Design, FactorSet};
use crate::model::Model;

use super::dense::Matrix;

/// Where a component acts.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Reach {
    /// Within blocks; its place among the components that do.
    Inside(usize),
    /// Through these columns.
    Across(Range<usize>),
}

/// Blocks that look alike.
#[derive(Debug, Clone)]
pub(super) struct Class {
    pub(super) blocks: usize,
    /// Readings of each cell.
    pub(super) counts: Vec<usize>,
    /// What each inside component adds to the covariance of the differences, a unit of variance given.
    pub(super) inside: Vec<Matrix>,
    /// The columns of the mean (the first) and of the components that act across, of the differences.
    pub(super) across: Matrix,
    /// For each inside term the level of each cell, counted within the block.
    pub(super) levels: Vec<Vec<usize>>,
    /// For each cell the columns across, without the mean's.
    pub(super) columns: Vec<Vec<usize>>,
}

/// One block: its class and its cells.
#[derive(Debug, Clone)]
pub(super) struct Block {
    pub(super) class: usize,
    pub(super) cells: Vec<usize>,
}

/// The structure of a design's present cells under a model.
#[derive(Debug, Clone)]
pub(super) struct Blocks {
    /// For each component, the error last.
    pub(super) reach: Vec<Reach>,
    /// Components that act inside, the error last.
    pub(super) inside: usize,
    /// Columns across, the mean's included.
    pub(super) columns: usize,
    pub(super) classes: Vec<Class>,
    pub(super) blocks: Vec<Block>,
    pub(super) readings: usize,
    /// Readings less cells.
    pub(super) within_df: usize,
    /// Sum of the logs of the counts.
    pub(super) log_counts: f64,
}

/// All that decides a block's class: for each cell its count, its columns and its levels.
type Key = Vec<(usize, Vec<usize>, Vec<usize>)>;

impl Blocks {
    /// `counts` holds the readings of every cell of the design.
    pub(super) fn new(design: &Design, model: &Model, counts: &[usize]) -> Blocks {
        let terms: Vec<FactorSet> = (0..model.lines().len())
            .filter_map(|i| model.set(i))
            .collect();
        let present: Vec<usize> = (0..counts.len()).filter(|&cell| counts[cell] > 0).collect();
        let places: Vec<Vec<u32>> = terms.iter().map(|&term| design.projection(term)).collect();
        let levels_present = |term: usize| {
            let mut seen: Vec<u32> = present.iter().map(|&cell| places[term][cell]).collect();
            seen.sort_unstable();
            seen.dedup();
            seen
        };
        let cutting = (0..terms.len())
            .filter(|&term| design.inner(terms[term]).len() == 1)
            .max_by_key(|&term| (levels_present(term).len(), std::cmp::Reverse(term)));
        let is_inside = |term: usize| cutting.is_some_and(|cut| terms[term].holds(terms[cut]));

        let mut reach = Vec::new();
        let mut column_of: Vec<BTreeMap<u32, usize>> = Vec::new();
        let (mut inside, mut columns) = (0, 1);
        for term in 0..terms.len() {
            if is_inside(term) {
                reach.push(Reach::Inside(inside));
                inside += 1;
            } else {
                let seen = levels_present(term);
                let end = columns + seen.len();
                reach.push(Reach::Across(columns..end));
                column_of.push(seen.into_iter().zip(columns..end).collect());
                columns = end;
            }
        }
        let acting = |inside: bool| -> Vec<usize> {
            (0..terms.len())
                .filter(|&term| is_inside(term) == inside)
                .collect()
        };
        let (inside_terms, across_terms) = (acting(true), acting(false));
        reach.push(Reach::Inside(inside));

        let mut cells_of: BTreeMap<u32, Vec<usize>> = BTreeMap::new();
        for &cell in &present {
            let block = cutting.map_or(cell as u32, |cut| places[cut][cell]);
            cells_of.entry(block).or_default().push(cell);
        }
        let mut class_of: BTreeMap<Key, usize> = BTreeMap::new();
        let mut classes: Vec<Class> = Vec::new();
        let mut blocks = Vec::with_capacity(cells_of.len());
        for cells in cells_of.into_values() {
            let key = cells.iter().map(|&cell| {
                let columns = across_terms.iter().zip(&column_of);
                let level = |&term: &usize| {
                    let same = |&other: &usize| places[term][other] == places[term][cell];
                    cells.iter().position(same).unwrap_or_default()
                };
                (
                    counts[cell],
                    columns.map(|(&term, of)| of[&places[term][cell]]).collect(),
                    inside_terms.iter().map(level).collect(),
                )
            });
            let key: Key = key.collect();
            let class = *class_of.entry(key).or_insert_with_key(|key| {
                classes.push(Class::new(key, inside, columns));
                classes.len() - 1
            });
            classes[class].blocks += 1;
            blocks.push(Block { class, cells });
        }
        let readings = counts.iter().sum();
        Blocks {
            reach,
            inside: inside + 1,
            columns,
            classes,
            blocks,
            readings,
            within_df: readings - present.len(),
            log_counts: present.iter().map(|&cell| (counts[cell] as f64).ln()).sum(),
        }
    }

    pub(super) fn components(&self) -> usize {
        self.reach.len()
    }

    /// Rough number of multiplications in one evaluation of the likelihood.
    pub(super) fn work(&self) -> f64 {
        let pairs = (self.inside * self.inside) as f64;
        let of_class = |class: &Class| (class.counts.len() as f64).powi(3) * pairs;
        let columns = (self.columns as f64).powi(3) * (2 * self.inside + 4) as f64;
        self.classes.iter().map(of_class).sum::<f64>() + columns
    }
}

impl Class {
    fn new(key: &Key, inside: usize, columns: usize) -> Class {
        let cells = key.len();
        let differences =
            Matrix::from_fn(cells, cells, |row, cell| match (row + 1 == cells, cell) {
                (true, 0) => 1.0,
                (false, 0) => -1.0,
                (false, _) if cell == row + 1 => 1.0,
                _ => 0.0,
            });
        let seen_from_first = |covariance: Matrix| {
            differences
                .times(&covariance)
                .times(&differences.transposed())
        };
        let alike = |term: usize| {
            Matrix::from_fn(cells, cells, |a, b| {
                f64::from(u8::from(key[a].2[term] == key[b].2[term]))
            })
        };
        let error = Matrix::from_fn(cells, cells, |a, b| {
            if a == b { 1.0 / key[a].0 as f64 } else { 0.0 }
        });
        let mut indicator = Matrix::zero(cells, columns);
        for (cell, (_, of_cell, _)) in key.iter().enumerate() {
            indicator[(cell, 0)] = 1.0;
            of_cell
                .iter()
                .for_each(|&column| indicator[(cell, column)] = 1.0);
        }
        let levels = |term: usize| key.iter().map(|cell| cell.2[term]).collect();
        Class {
            blocks: 0,
            counts: key.iter().map(|cell| cell.0).collect(),
            inside: (0..inside)
                .map(alike)
                .chain([error])
                .map(seen_from_first)
                .collect(),
            across: differences.times(&indicator),
            levels: (0..inside).map(levels).collect(),
            columns: key.iter().map(|cell| cell.1.clone()).collect(),
        }
    }
}
