//! The table of mean squares of one study: sums of squares, F and p.

use std::borrow::Cow;

use crate::basis::Basis;
use crate::combination::Combination;
use crate::model::Model;
use crate::quantile::{FTail, f_above};
use crate::record::{Against as Written, MeanSquare};

/// What a line is tested against.
#[derive(Debug)]
pub(crate) struct Against {
    sum: Combination,
    df: f64,
    by: By,
}

#[derive(Debug)]
enum By {
    /// One mean square: F is exact.
    One { line: usize, df: f64, tail: FTail },
    /// Several: degrees of freedom by Satterthwaite.
    Several { weights: Vec<f64>, df: Vec<f64> },
}

impl Against {
    /// `None` for the error.
    pub(crate) fn new(model: &Model, line: usize) -> Option<Against> {
        let sum = model.denominator(line)?;
        let df = |q: usize| model.lines()[q].df as f64;
        let members: Vec<usize> = sum.members().collect();
        let by = match members[..] {
            [only] if sum.weights()[only] == 1.0 => By::One {
                line: only,
                df: df(only),
                tail: FTail::new(df(line), df(only)),
            },
            _ => By::Several {
                weights: sum.weights(),
                df: (0..model.lines().len()).map(df).collect(),
            },
        };
        Some(Against {
            sum,
            df: df(line),
            by,
        })
    }

    fn test(&self, observed: f64, ms: &[f64]) -> Option<Test> {
        let value = match &self.by {
            By::One { line, .. } => ms[*line],
            By::Several { .. } => self.sum.value(ms),
        };
        if value <= 0.0 {
            return None;
        }
        let f = observed / value;
        let (p, against_df) = match &self.by {
            By::One { df, tail, .. } => (tail.above(f), *df),
            By::Several { weights, df } => {
                let pieces = weights.iter().zip(ms).zip(df);
                let pieces = pieces.map(|((w, ms), df)| (w * ms / value).powi(2) / df);
                let against_df = 1.0 / pieces.sum::<f64>();
                (f_above(f, self.df, against_df), against_df)
            }
        };
        Some(Test { f, p, against_df })
    }
}

/// One F test.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Test {
    pub(crate) f: f64,
    pub(crate) p: f64,
    pub(crate) against_df: f64,
}

/// Mean squares of all lines of a model.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Table<'a> {
    pub(crate) basis: &'a Basis,
    pub(crate) ss: &'a [f64],
    pub(crate) ms: &'a [f64],
}

impl Table<'_> {
    /// The F test of a line; `None` for the error and where the denominator is not above zero.
    pub(crate) fn test(&self, line: usize) -> Option<Test> {
        self.basis.against[line]
            .as_ref()?
            .test(self.ms[line], self.ms)
    }

    /// The lines in the order of the model, then the total.
    pub(crate) fn lines(&self, total: f64) -> Vec<MeanSquare> {
        let model = &self.basis.model;
        let line = |(i, line): (usize, &crate::model::Line)| {
            let test = self.test(i);
            MeanSquare {
                name: Cow::Owned(line.name.clone()),
                of: line.of.clone(),
                within: line.within.clone(),
                ss: self.ss[i],
                df: line.df,
                ms: Some(self.ms[i]),
                f: test.map(|t| t.f),
                p: test.map(|t| t.p),
                against: self.against(i),
                against_df: test.map(|t| t.against_df),
            }
        };
        let mut lines: Vec<MeanSquare> = model.lines().iter().enumerate().map(line).collect();
        lines.push(MeanSquare {
            name: "total".into(),
            of: Vec::new(),
            within: Vec::new(),
            ss: total,
            df: model.readings() - 1,
            ms: None,
            f: None,
            p: None,
            against: None,
            against_df: None,
        });
        lines
    }

    fn against(&self, line: usize) -> Option<Vec<Written>> {
        let sum = &self.basis.against[line].as_ref()?.sum;
        let weights = sum.weights();
        let written = |q: usize| Written {
            name: self.basis.model.lines()[q].name.clone(),
            weight: weights[q],
        };
        Some(sum.members().map(written).collect())
    }
}
