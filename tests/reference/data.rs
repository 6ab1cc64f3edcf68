//! Reads the fixtures: a table of readings and the values that belong to it.

use std::collections::{BTreeMap, HashMap};
use std::sync::Mutex;

use restudy_engine::{
    Design, Factor, Interaction, Judge, OneSided, Prepared, Settings, Simulation, Study, Tolerance,
    analyse,
};
use serde_json::Value;

/// Readings with their factors by column name, and the reference values.
pub(crate) struct Fixture {
    pub(crate) name: &'static str,
    columns: Vec<String>,
    rows: Vec<Vec<String>>,
    pub(crate) expected: &'static Value,
}

macro_rules! fixture {
    ($name:literal) => {
        fixture!($name, $name)
    };
    ($readings:literal, $name:literal) => {
        crate::data::Fixture::parse(
            $name,
            include_str!(concat!("../../fixtures/reference/", $readings, ".csv")),
            include_str!(concat!("../../fixtures/reference/", $name, ".json")),
        )
    };
}
pub(crate) use fixture;

/// A fixture of values alone.
macro_rules! values {
    ($name:literal) => {
        crate::data::read(
            $name,
            include_str!(concat!("../../fixtures/reference/", $name, ".json")),
        )
    };
}
pub(crate) use values;

/// Values read once and kept, so that every test sees the same ones.
static READ: Mutex<BTreeMap<&'static str, &'static Value>> = Mutex::new(BTreeMap::new());

pub(crate) fn read(name: &'static str, text: &str) -> &'static Value {
    let mut kept = READ.lock().unwrap();
    let parse = || &*Box::leak(Box::new(serde_json::from_str(text).unwrap()));
    kept.entry(name).or_insert_with(parse)
}

/// All values read so far, by the name of their file.
pub(crate) fn all_read() -> BTreeMap<&'static str, &'static Value> {
    READ.lock().unwrap().clone()
}

/// Readings placed in a design.
pub(crate) struct Placed {
    pub(crate) design: Design,
    pub(crate) cells: Vec<usize>,
    pub(crate) values: Vec<f64>,
}

impl Fixture {
    pub(crate) fn parse(name: &'static str, table: &str, expected: &str) -> Self {
        let mut lines = table
            .lines()
            .map(|line| line.split(',').map(str::to_owned).collect::<Vec<_>>());
        Fixture {
            name,
            columns: lines.next().unwrap(),
            rows: lines.collect(),
            expected: read(name, expected),
        }
    }

    /// Places the readings; each factor with its containers.
    pub(crate) fn placed(&self, factors: &[(&str, &[&str])]) -> Placed {
        let column = |name: &str| self.columns.iter().position(|c| c == name).unwrap();
        let mut levels: Vec<Vec<usize>> = Vec::new();
        let mut checked = Vec::new();
        for (name, within) in factors {
            let mut seen: HashMap<Vec<&str>, Vec<&str>> = HashMap::new();
            let mut of_rows = Vec::with_capacity(self.rows.len());
            for row in &self.rows {
                let labels = seen
                    .entry(within.iter().map(|w| row[column(w)].as_str()).collect())
                    .or_default();
                let label = row[column(name)].as_str();
                of_rows.push(
                    labels
                        .iter()
                        .position(|&l| l == label)
                        .unwrap_or(labels.len()),
                );
                if !labels.contains(&label) {
                    labels.push(label);
                }
            }
            levels.push(of_rows);
            checked.push(Factor::nested(
                name,
                seen.values().map(Vec::len).max().unwrap(),
                within,
            ));
        }
        let design = Design::new(checked).unwrap();
        let cell = |row: usize| {
            design
                .factors()
                .iter()
                .zip(&levels)
                .fold(0, |cell, (f, levels)| cell * f.levels + levels[row])
        };
        let value = column("value");
        Placed {
            cells: (0..self.rows.len()).map(cell).collect(),
            values: self
                .rows
                .iter()
                .map(|row| row[value].parse().unwrap())
                .collect(),
            design,
        }
    }

    /// The tolerance of the reference values; one-sided ones are judged from the grand mean.
    pub(crate) fn tolerance(&self) -> Tolerance {
        let limit = |side: &str| {
            crate::check::compared(&self.expected["tolerance"][side])
                .as_str()
                .map(|text| text.parse().unwrap())
        };
        Tolerance {
            lower: limit("lower"),
            upper: limit("upper"),
            one_sided: Some(OneSided::ToStudyMean),
        }
    }

    /// The study with a stated number of draws behind its simulated limits.
    pub(crate) fn drawn(
        &self,
        factors: &[(&str, &[&str])],
        settings: &Settings,
        draws: u32,
    ) -> Study {
        let placed = self.placed(factors);
        let trials = placed.values.len() / placed.design.cells();
        let simulation = Simulation { draws, seed: 7 };
        let prepared = Prepared::new(&placed.design, trials, settings)
            .unwrap()
            .simulated(simulation);
        prepared
            .study(&placed.cells, &placed.values, &self.tolerance())
            .unwrap()
    }

    pub(crate) fn study(&self, factors: &[(&str, &[&str])], settings: &Settings) -> Study {
        let placed = self.placed(factors);
        analyse(
            &placed.design,
            &placed.cells,
            &placed.values,
            &self.tolerance(),
            settings,
        )
        .unwrap()
    }
}

/// Factors with their containers.
pub(crate) type Factors = &'static [(&'static str, &'static [&'static str])];

pub(crate) const PART_APPRAISER: Factors = &[("part", &[]), ("appraiser", &[])];
pub(crate) const PART_ONLY: Factors = &[("part", &[])];

/// Interaction kept, no limits on the share.
pub(crate) fn settings(confidence: f64, spread_sds: f64) -> Settings {
    Settings {
        confidence,
        spread_sds,
        interaction: Interaction::Keep,
        process: None,
        limits: None,
        judge: Judge::Estimate,
    }
}

/// Every interaction with a p is pooled.
pub(crate) fn pooling(settings: Settings) -> Settings {
    Settings {
        interaction: Interaction::PoolAbove(0.0),
        ..settings
    }
}

/// The engine's name of a line that the reference calls `part*appraiser(site,machine)` or `interaction`.
pub(crate) fn name_of_line(reference: &str) -> String {
    match reference {
        "error" | "repeatability" => "within cells".to_owned(),
        "interaction" => "part × appraiser".to_owned(),
        _ => {
            let (inner, outer) = reference.split_once('(').unwrap_or((reference, ""));
            let inner = inner.replace('*', " × ");
            let outer = outer.trim_end_matches(')').replace(',', " × ");
            if outer.is_empty() {
                inner
            } else {
                format!("{inner} within {outer}")
            }
        }
    }
}

/// A fraction of integers of any length as the nearest f64, or one next to it.
pub(crate) fn rational(text: &str) -> f64 {
    let (numerator, denominator) = text.split_once('/').unwrap_or((text, "1"));
    numerator.parse::<f64>().unwrap() / denominator.parse::<f64>().unwrap()
}
