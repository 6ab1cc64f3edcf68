//! Readings about their part's mean: who reads what on which part.

use super::subject::Subject;
use crate::plain::stands_out;

/// All readings of a characteristic, part by part, in reading units.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Spread {
    /// The parts that have readings, in the plan's order.
    pub(super) parts: Vec<Part>,
    /// The names that readings are told apart by; one empty name when nothing tells them apart.
    pub(super) readers: Vec<String>,
}

/// One part's readings.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Part {
    pub(super) name: String,
    pub(super) mean: f64,
    /// Reader and deviation from the part's mean, in order of reader and trial.
    pub(super) deviations: Vec<(usize, f64)>,
}

/// A reader whose readings stand apart from the others'.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Outstanding {
    pub(super) name: String,
    /// Mean of this reader's deviations less the mean of the others'.
    pub(super) offset: f64,
    /// Parts on which this reader lies on that side of the others.
    pub(super) alike: usize,
    /// Parts on which it was compared.
    pub(super) compared: usize,
}

impl Spread {
    pub(super) fn of(subject: Subject<'_>) -> Spread {
        let (evidence, feature) = (subject.evidence, subject.feature);
        let readers = subject.readers();
        let mut sorted: Vec<(usize, usize, usize, f64)> = feature
            .runs
            .iter()
            .zip(&feature.values)
            .filter_map(|(&run, &value)| {
                let run = evidence.runs.get(run)?;
                let part = *run.levels.first()?;
                let reader =
                    readers.map_or(Some(0), |(index, _)| run.levels.get(index).copied())?;
                Some((part, reader, run.slot, value))
            })
            .collect();
        sorted.sort_by(|a, b| {
            (a.0, a.1, a.2)
                .cmp(&(b.0, b.1, b.2))
                .then(a.3.total_cmp(&b.3))
        });
        let parts = sorted
            .chunk_by(|a, b| a.0 == b.0)
            .map(|readings| {
                let (level, first) = (readings[0].0, readings[0].3);
                let mean = first + mean(readings.iter().map(|r| r.3 - first)).unwrap_or(0.0);
                let name = evidence.factors.first().and_then(|f| f.levels.get(level));
                Part {
                    name: name.cloned().unwrap_or_else(|| (level + 1).to_string()),
                    mean,
                    deviations: readings.iter().map(|r| (r.1, r.3 - mean)).collect(),
                }
            })
            .collect();
        let readers =
            readers.map_or_else(|| vec![String::new()], |(_, factor)| factor.levels.clone());
        Spread { parts, readers }
    }

    /// The mean deviation of each reader over all parts.
    pub(super) fn offsets(&self) -> Vec<Option<f64>> {
        let of = |reader: usize| self.parts.iter().flat_map(move |p| p.of(reader));
        (0..self.readers.len())
            .map(|reader| mean(of(reader)))
            .collect()
    }

    /// The reader who stands out from the others; `None` when nobody does.
    pub(super) fn outstanding(&self) -> Option<Outstanding> {
        let offsets: Option<Vec<f64>> = self.offsets().into_iter().collect();
        let (reader, offset) = stands_out(&offsets?)?;
        let differences: Vec<f64> = self
            .parts
            .iter()
            .filter_map(|part| part.against_others(reader))
            .collect();
        Some(Outstanding {
            name: self.readers[reader].clone(),
            offset,
            alike: differences
                .iter()
                .filter(|d| **d * offset.signum() > 0.0)
                .count(),
            compared: differences.len(),
        })
    }

    /// The readers with the lowest and the highest mean, and the difference; `None` when there is none.
    pub(super) fn ends(&self) -> Option<(&str, &str, f64)> {
        let offsets = self.offsets();
        let known = || {
            self.readers
                .iter()
                .zip(&offsets)
                .filter_map(|(name, o)| Some((name, (*o)?)))
        };
        let lowest = known().reduce(|a, b| if b.1 < a.1 { b } else { a })?;
        let highest = known().reduce(|a, b| if b.1 > a.1 { b } else { a })?;
        let by = highest.1 - lowest.1;
        (by > 0.0).then_some((lowest.0, highest.0, by))
    }

    /// The largest deviation, in absolute value.
    pub(super) fn reach(&self) -> f64 {
        self.parts.iter().map(Part::reach).fold(0.0, f64::max)
    }
}

impl Part {
    pub(super) fn reach(&self) -> f64 {
        self.deviations
            .iter()
            .map(|(_, d)| d.abs())
            .fold(0.0, f64::max)
    }

    fn of(&self, reader: usize) -> impl Iterator<Item = f64> {
        self.deviations
            .iter()
            .filter(move |(r, _)| *r == reader)
            .map(|(_, d)| *d)
    }

    fn against_others(&self, reader: usize) -> Option<f64> {
        let others = self
            .deviations
            .iter()
            .filter(|(r, _)| *r != reader)
            .map(|(_, d)| *d);
        Some(mean(self.of(reader))? - mean(others)?)
    }
}

fn mean(values: impl Iterator<Item = f64>) -> Option<f64> {
    let (count, sum) = values.fold((0usize, 0.0), |(count, sum), x| (count + 1, sum + x));
    (count > 0).then(|| sum / count as f64)
}
