//! How often 95 % limits hold the truth: readings with known variances, worked out by the engine as any study.
//!
//! `cargo bench -p restudy-engine --bench coverage -- [studies]` prints one table; it exits with 1 when a coverage leaves
//! its band in `ACCURACY.md`, or lies apart from a simulation made elsewhere
//! (`fixtures/reference/coverage.json`, which draws mean squares instead of readings).

mod count;
mod plant;
mod settings;

use std::fmt::Write as _;
use std::io::Write as _;
use std::process::ExitCode;

use rand_xoshiro::Xoshiro256PlusPlus;
use rand_xoshiro::rand_core::SeedableRng;
use restudy_engine::{Interaction, Judge, Prepared, Settings, Study, Tolerance};
use serde_json::Value;

use count::{Count, Target};
use plant::Plant;
use settings::{Case, Variances, cases};

const STUDIES: u32 = 20_000;
const SEED: u64 = 20_250_101;
/// Monte Carlo errors of both simulations; the largest of 480 normal deviates rarely passes 4.
const APART: f64 = 4.5;
const CONFIDENCE: f64 = 0.95;
const TOLERANCE: Tolerance = Tolerance {
    lower: Some(-5.0),
    upper: Some(5.0),
    one_sided: None,
};

type Fault = Box<dyn std::error::Error>;

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    if !arguments.iter().any(|argument| argument == "--bench") {
        return ExitCode::SUCCESS;
    }
    let studies = arguments.iter().find_map(|argument| argument.parse().ok());
    match run(studies.unwrap_or(STUDIES)) {
        Ok(true) => ExitCode::SUCCESS,
        Ok(false) => ExitCode::from(1),
        Err(fault) => {
            let told = writeln!(std::io::stderr(), "{fault}");
            ExitCode::from(if told.is_ok() { 1 } else { 3 })
        }
    }
}

fn run(studies: u32) -> Result<bool, Fault> {
    let elsewhere: Value =
        serde_json::from_str(include_str!("../../../fixtures/reference/coverage.json"))?;
    let mut out = std::io::stdout();
    writeln!(
        out,
        "{studies} studies a line, seed {SEED}. Coverage in %, in brackets: truth below the lower limit, truth above the upper, studies without limits.\n"
    )?;
    let mut faults = String::new();
    let mut compared = 0;
    let mut farthest: f64 = 0.0;
    let mut seed = SEED;
    for case in cases()? {
        let mut columns: Vec<Vec<Count>> = Vec::new();
        for (truth, variances) in case.truths {
            let counts = count(&case, variances, studies, seed)?;
            seed += 1;
            let key = format!("{} {truth}", case.name);
            for count in &counts {
                if let Some(fault) = count.outside_its_band() {
                    writeln!(faults, "{key}: {fault}")?;
                }
                for (what, apart) in count.apart_from(&elsewhere, &key) {
                    compared += 1;
                    farthest = farthest.max(apart);
                    if apart > APART {
                        let title = count.target.title;
                        writeln!(
                            faults,
                            "{key}: {title} {what} lies {apart:.1} Monte Carlo errors from the other simulation"
                        )?;
                    }
                }
            }
            columns.push(counts);
        }
        writeln!(out, "{}", table(&case, &columns))?;
    }
    writeln!(
        out,
        "{compared} frequencies compared with the other simulation, the farthest {farthest:.1} Monte Carlo errors away."
    )?;
    write!(out, "{faults}")?;
    Ok(faults.is_empty())
}

/// One row a figure, one column a truth.
fn table(case: &Case, columns: &[Vec<Count>]) -> String {
    let truths: Vec<&str> = case.truths.iter().map(|(truth, _)| *truth).collect();
    let mut rows = vec![
        format!("| {} | {} |", case.name, truths.join(" | ")),
        format!("|---|{}", "---|".repeat(truths.len())),
    ];
    for (row, count) in columns.first().into_iter().flatten().enumerate() {
        let cells: Vec<String> = columns.iter().map(|c| c[row].in_words()).collect();
        rows.push(format!(
            "| {} | {} |",
            count.target.title,
            cells.join(" | ")
        ));
    }
    rows.push(String::new());
    rows.join("\n")
}

fn settings(interaction: Interaction) -> Settings {
    Settings {
        confidence: CONFIDENCE,
        spread_sds: 6.0,
        interaction,
        process: None,
        limits: None,
        judge: Judge::Estimate,
    }
}

fn count(case: &Case, variances: Variances, studies: u32, seed: u64) -> Result<Vec<Count>, Fault> {
    let plant = Plant::new(case, variances);
    let prepared = |interaction| Prepared::new(&case.design, case.trials, &settings(interaction));
    let kept = prepared(Interaction::Keep)?;
    let pooling = prepared(Interaction::PoolAbove(0.25))?;
    let mut chance = Xoshiro256PlusPlus::seed_from_u64(seed);
    let mut counts: Vec<Count> = Target::all(&plant, TOLERANCE)
        .into_iter()
        .map(Count::new)
        .collect();
    for _ in 0..studies {
        let readings = plant.measure(&mut chance);
        let study = |prepared: &Prepared| -> Result<Study, Fault> {
            Ok(prepared.study(&plant.cells, &readings, &TOLERANCE)?)
        };
        let (kept, pooled) = (study(&kept)?, study(&pooling)?);
        for count in &mut counts {
            count.add(&kept, &pooled);
        }
    }
    Ok(counts)
}
