//! The restricted likelihood of variance components, its slope and its curvature.
//!
//! ```text
//! log L = -1/2 [ (N-1) log 2π + log|V| + log(1'V⁻¹1) + y'Py ],  V = sum θ_i K_i,  P = V⁻¹ - V⁻¹1 (1'V⁻¹1)⁻¹ 1'V⁻¹
//! score_i = 1/2 [ y'PK_iPy - tr(PK_i) ]     expected_ij = 1/2 tr(PK_iPK_j)     observed_ij = y'PK_iPK_jPy - expected_ij
//! ```
//! With `W` the covariance of the blocks and `U` the columns across, `P = W⁻¹ - W⁻¹ U T U'W⁻¹`, where
//! `T = S (S U'W⁻¹U S + J)⁻¹ S`, `S` the sds of the columns (1 for the mean) and `J` the identity but 0 for the mean.
//! No matrix is larger than a block or than the number of columns.
//!
//! Sources: Searle, Casella & McCulloch, *Variance Components*, Wiley 1992, ch. 6; Patterson & Thompson, *Biometrika* 58
//! (1971) 545–554. The constant is that of the density of N - 1 contrasts `A'y` with `A'A = I`, less log N / 2.

use std::f64::consts::PI;

use super::blocks::{Blocks, Class, Reach};
use super::dense::{Matrix, dot};
use super::reduced::Seen;

/// The likelihood at one point.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Evaluation {
    pub(super) log_likelihood: f64,
    pub(super) score: Vec<f64>,
    pub(super) expected: Matrix,
    pub(super) observed: Matrix,
    /// Generalised-least-squares mean.
    pub(super) mean: f64,
}

/// Inverse covariance of a class of blocks, and what it makes of the columns.
struct Inverted {
    inverse: Matrix,
    columns: Matrix,
}

/// Everything that depends on the components alone.
struct Structure {
    classes: Vec<Inverted>,
    log_determinant: f64,
    /// `U'W⁻¹U`.
    cross: Matrix,
    /// `T`.
    middle: Matrix,
}

impl Blocks {
    /// `None` where the covariance is not positive.
    pub(super) fn evaluate(&self, seen: &Seen, components: &[f64]) -> Option<Evaluation> {
        let structure = self.structure(components)?;
        let error = components.len() - 1;
        let (variance, df) = (components[error], self.within_df as f64);
        let (mut traces, mut pairs) = self.traces(&structure);
        traces[error] += df / variance;
        pairs[(error, error)] += df / (variance * variance);

        let mut forms = self.forms(&structure, seen);
        forms.whole += seen.within / variance;
        forms.first[error] += seen.within / variance.powi(2);
        forms.second[(error, error)] += seen.within / variance.powi(3);

        let log_determinant = structure.log_determinant
            + self.log_counts
            + if df > 0.0 { df * variance.ln() } else { 0.0 };
        let constant = (self.readings - 1) as f64 * (2.0 * PI).ln();
        let n = components.len();
        Some(Evaluation {
            log_likelihood: -0.5 * (constant + log_determinant + forms.whole),
            score: (0..n).map(|i| 0.5 * (forms.first[i] - traces[i])).collect(),
            expected: Matrix::from_fn(n, n, |i, j| 0.5 * pairs[(i, j)]),
            observed: Matrix::from_fn(n, n, |i, j| forms.second[(i, j)] - 0.5 * pairs[(i, j)]),
            mean: forms.mean,
        })
    }

    /// Twice the expected information, without readings.
    pub(super) fn information(&self, components: &[f64]) -> Option<Matrix> {
        let structure = self.structure(components)?;
        let error = components.len() - 1;
        let (_, mut pairs) = self.traces(&structure);
        pairs[(error, error)] += self.within_df as f64 / components[error].powi(2);
        Some(pairs)
    }

    fn structure(&self, components: &[f64]) -> Option<Structure> {
        let mut cross = Matrix::zero(self.columns, self.columns);
        let mut log_determinant = 0.0;
        let mut classes = Vec::with_capacity(self.classes.len());
        for class in &self.classes {
            let cells = class.counts.len();
            let mut covariance = Matrix::zero(cells, cells);
            for (component, reach) in components.iter().zip(&self.reach) {
                if let Reach::Inside(place) = reach {
                    covariance.add(*component, &class.inside[*place]);
                }
            }
            let factor = covariance.cholesky()?;
            let inverse = factor.inverse();
            let columns = inverse.times(&class.across);
            let blocks = class.blocks as f64;
            log_determinant += blocks * factor.log_determinant();
            cross.add_across(blocks, &class.across, &columns);
            classes.push(Inverted { inverse, columns });
        }
        let mut sds = vec![1.0; self.columns];
        for (component, reach) in components.iter().zip(&self.reach) {
            if let Reach::Across(columns) = reach {
                sds[columns.clone()].fill(component.sqrt());
            }
        }
        let scaled = Matrix::from_fn(self.columns, self.columns, |a, b| {
            let identity = f64::from(u8::from(a == b && a > 0));
            sds[a] * cross[(a, b)] * sds[b] + identity
        });
        let factor = scaled.cholesky()?;
        let inverse = factor.inverse();
        let middle = Matrix::from_fn(self.columns, self.columns, |a, b| {
            sds[a] * inverse[(a, b)] * sds[b]
        });
        Some(Structure {
            classes,
            log_determinant: log_determinant + factor.log_determinant(),
            cross,
            middle,
        })
    }

    /// `tr(PK_i)` and `tr(PK_iPK_j)`, but for what lies within cells.
    fn traces(&self, structure: &Structure) -> (Vec<f64>, Matrix) {
        let Structure { cross, middle, .. } = structure;
        let (n, inside, columns) = (self.components(), self.inside, self.columns);
        let mut traces = Traces {
            single: vec![0.0; inside],
            double: Matrix::zero(inside, inside),
            squares: vec![Matrix::zero(columns, columns); inside],
        };
        let mut room = Room::new(0, columns, inside);
        for (class, inverted) in self.classes.iter().zip(&structure.classes) {
            if room.cells != class.counts.len() {
                room = Room::new(class.counts.len(), columns, inside);
            }
            class.add_traces(inverted, middle, &mut room, &mut traces);
        }
        let Traces {
            single,
            mut double,
            squares,
        } = traces;
        let middle_squares: Vec<Matrix> = squares.iter().map(|s| middle.times(s)).collect();
        for i in 0..inside {
            for j in i..inside {
                double[(i, j)] += middle_squares[i].trace_with(&middle_squares[j]);
            }
        }
        let mut rest = middle.times(cross);
        rest = Matrix::from_fn(columns, columns, |a, b| {
            f64::from(u8::from(a == b)) - rest[(a, b)]
        });
        let outer = cross.times(&rest);
        let by_column: Vec<Vec<f64>> = squares
            .iter()
            .map(|square| {
                let product = square.times(&rest);
                let column = |c: usize| (0..columns).map(|r| rest[(r, c)] * product[(r, c)]).sum();
                (0..columns).map(column).collect()
            })
            .collect();

        let traces = self.reach.iter().map(|reach| match reach {
            Reach::Inside(place) => single[*place],
            Reach::Across(range) => range.clone().map(|c| outer[(c, c)]).sum(),
        });
        let pair = |i: usize, j: usize| match (&self.reach[i], &self.reach[j]) {
            (Reach::Inside(a), Reach::Inside(b)) => double[(*a.min(b), *a.max(b))],
            (Reach::Inside(a), Reach::Across(range)) | (Reach::Across(range), Reach::Inside(a)) => {
                by_column[*a][range.clone()].iter().sum()
            }
            (Reach::Across(rows), Reach::Across(range)) => rows
                .clone()
                .flat_map(|r| range.clone().map(move |c| (r, c)))
                .map(|place| outer[place].powi(2))
                .sum(),
        };
        (traces.collect(), Matrix::from_fn(n, n, pair))
    }

    fn forms(&self, structure: &Structure, seen: &Seen) -> Forms {
        let (n, inside, columns) = (self.components(), self.inside, self.columns);
        let mut against = vec![0.0; columns];
        for (block, values) in self.each_block(seen) {
            let inverted = &structure.classes[block];
            inverted.columns.add_applied(values, &mut against);
        }
        let effects = structure.middle.apply(&against);

        let mut whole = 0.0;
        let mut left_over = vec![0.0; columns];
        let mut inner = Matrix::zero(inside, inside);
        let mut projected = vec![0.0; n * columns];
        let (mut rest, mut residual) = (Vec::new(), Vec::new());
        let mut spread = vec![Vec::new(); inside];
        let mut inverses = vec![Vec::new(); inside];
        let mut first = vec![0.0; n];
        let place_of: Vec<usize> = (0..n)
            .filter(|&i| matches!(self.reach[i], Reach::Inside(_)))
            .collect();
        for (block, values) in self.each_block(seen) {
            let (class, inverted) = (&self.classes[block], &structure.classes[block]);
            class.across.apply_into(&effects, &mut rest);
            for (rest, y) in rest.iter_mut().zip(values) {
                *rest = y - *rest;
            }
            inverted.inverse.apply_into(&rest, &mut residual);
            whole += dot(values, &residual);
            class.across.add_applied(&residual, &mut left_over);
            for (i, k) in class.inside.iter().enumerate() {
                k.apply_into(&residual, &mut spread[i]);
                inverted.inverse.apply_into(&spread[i], &mut inverses[i]);
                first[place_of[i]] += dot(&residual, &spread[i]);
                for j in 0..=i {
                    inner[(j, i)] += dot(&spread[j], &inverses[i]);
                }
                let own = &mut projected[place_of[i] * columns..][..columns];
                inverted.columns.add_applied(&spread[i], own);
            }
        }
        for (i, reach) in self.reach.iter().enumerate() {
            if let Reach::Across(range) = reach {
                let own = &left_over[range.clone()];
                first[i] = dot(own, own);
                for c in 0..columns {
                    projected[i * columns + c] = dot(&structure.cross.row(c)[range.clone()], own);
                }
            }
        }
        let projected: Vec<&[f64]> = projected.chunks_exact(columns).collect();
        let explained: Vec<Vec<f64>> = projected
            .iter()
            .map(|of_one| structure.middle.apply(of_one))
            .collect();
        let second = |i: usize, j: usize| {
            let direct = match (&self.reach[i], &self.reach[j]) {
                (Reach::Inside(a), Reach::Inside(b)) => inner[(*a.min(b), *a.max(b))],
                (_, Reach::Across(range)) => {
                    dot(&projected[i][range.clone()], &left_over[range.clone()])
                }
                (Reach::Across(range), Reach::Inside(_)) => {
                    dot(&projected[j][range.clone()], &left_over[range.clone()])
                }
            };
            direct - dot(projected[i], &explained[j])
        };
        Forms {
            whole,
            second: Matrix::from_fn(n, n, second),
            first,
            mean: effects[0],
        }
    }

    /// The class of every block with the values that it sees.
    fn each_block<'a>(&'a self, seen: &'a Seen) -> impl Iterator<Item = (usize, &'a [f64])> {
        let mut from = 0;
        self.blocks.iter().map(move |block| {
            let values = &seen.values[from..from + block.cells.len()];
            from += block.cells.len();
            (block.class, values)
        })
    }
}

/// Quadratic forms of the readings: `y'Py`, `y'PK_iPy`, `y'PK_iPK_jPy`; and the mean.
struct Forms {
    whole: f64,
    first: Vec<f64>,
    second: Matrix,
    mean: f64,
}

/// Room for the products of one class.
struct Room {
    cells: usize,
    columns: Matrix,
    explained: Matrix,
    projected: Matrix,
    by_projected: Vec<Matrix>,
    by_explained: Vec<Matrix>,
}

impl Room {
    fn new(cells: usize, columns: usize, inside: usize) -> Room {
        let square = || Matrix::zero(cells, cells);
        Room {
            cells,
            columns: Matrix::zero(cells, columns),
            explained: square(),
            projected: square(),
            by_projected: (0..inside).map(|_| square()).collect(),
            by_explained: (0..inside).map(|_| square()).collect(),
        }
    }
}

/// Traces over all blocks so far.
struct Traces {
    /// `tr(PK_i)`.
    single: Vec<f64>,
    /// The part of `tr(PK_iPK_j)` inside blocks, for i ≤ j.
    double: Matrix,
    /// `U'W⁻¹K_iW⁻¹U`.
    squares: Vec<Matrix>,
}

impl Class {
    fn add_traces(
        &self,
        inverted: &Inverted,
        middle: &Matrix,
        room: &mut Room,
        traces: &mut Traces,
    ) {
        let blocks = self.blocks as f64;
        let Inverted { inverse, columns } = inverted;
        columns.times_into(middle, &mut room.columns);
        room.columns
            .times_transposed_into(columns, &mut room.explained);
        room.projected.clear();
        room.projected.add(1.0, inverse);
        room.projected.add(-1.0, &room.explained);
        for (i, k) in self.inside.iter().enumerate() {
            room.projected.times_into(k, &mut room.by_projected[i]);
            room.explained.times_into(k, &mut room.by_explained[i]);
            traces.single[i] += blocks * room.projected.overlap(k);
            k.times_into(columns, &mut room.columns);
            traces.squares[i].add_across(blocks, columns, &room.columns);
            for j in 0..=i {
                let whole = room.by_projected[i].trace_with(&room.by_projected[j]);
                let known = room.by_explained[i].trace_with(&room.by_explained[j]);
                traces.double[(j, i)] += blocks * (whole - known);
            }
        }
    }
}
