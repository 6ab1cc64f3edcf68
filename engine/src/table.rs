//! The table of mean squares of one study under one model: sums of squares, F and p.

use std::borrow::Cow;

use crate::model::Model;
use crate::quantile::f_above;
use crate::record::{Against, MeanSquare};
use crate::sums::Sums;

/// Mean squares of all lines of a model.
#[derive(Debug, Clone)]
pub(crate) struct Table<'a> {
    model: &'a Model,
    pub(crate) ss: Vec<f64>,
    pub(crate) ms: Vec<f64>,
}

/// One F test.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Test {
    pub(crate) f: f64,
    pub(crate) p: f64,
    pub(crate) against_df: f64,
}

impl<'a> Table<'a> {
    pub(crate) fn new(model: &'a Model, sums: &Sums) -> Self {
        let sets: Vec<_> = (0..model.lines().len())
            .filter_map(|i| model.set(i))
            .collect();
        let rest = sums.beside(|set| sets.contains(&set));
        let ss: Vec<f64> = sets.iter().map(|&set| sums.of(set)).chain([rest]).collect();
        let ms = ss
            .iter()
            .zip(model.lines())
            .map(|(ss, line)| ss / line.df as f64)
            .collect();
        Table { model, ss, ms }
    }

    /// The F test of a line; `None` for the error and where the denominator is not above zero.
    pub(crate) fn test(&self, line: usize) -> Option<Test> {
        let against = self.model.denominator(line)?;
        let value = against.value(&self.ms);
        if value <= 0.0 {
            return None;
        }
        let df = |q: usize| self.model.lines()[q].df as f64;
        let members: Vec<usize> = against.members().collect();
        let against_df = match members[..] {
            [only] => df(only),
            _ => {
                let pieces = against
                    .weights()
                    .into_iter()
                    .enumerate()
                    .map(|(q, w)| (w * self.ms[q] / value).powi(2) / df(q));
                1.0 / pieces.sum::<f64>()
            }
        };
        let f = self.ms[line] / value;
        Some(Test {
            f,
            p: f_above(f, df(line), against_df),
            against_df,
        })
    }

    /// The lines in the order of the model, then the total.
    pub(crate) fn lines(&self, total: f64) -> Vec<MeanSquare> {
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
        let mut lines: Vec<MeanSquare> = self.model.lines().iter().enumerate().map(line).collect();
        lines.push(MeanSquare {
            name: "total".into(),
            of: Vec::new(),
            within: Vec::new(),
            ss: total,
            df: self.model.readings() - 1,
            ms: None,
            f: None,
            p: None,
            against: None,
            against_df: None,
        });
        lines
    }

    fn against(&self, line: usize) -> Option<Vec<Against>> {
        let against = self.model.denominator(line)?;
        let weights = against.weights();
        Some(
            against
                .members()
                .map(|q| Against {
                    name: self.model.lines()[q].name.clone(),
                    weight: weights[q],
                })
                .collect(),
        )
    }
}
