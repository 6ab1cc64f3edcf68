//! `restudy results`: the recorded studies.

use restudy_config::Config;
use serde_json::Value;

use super::table::table;
use super::{Answer, ConfigPath, End, Failure, configuration, print, print_json};
use crate::ledger::{Ledger, LedgerError, Read, RoundRow};
use crate::now::in_zone;
use crate::report;

/// Show the recorded studies
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Examples:
  restudy results --config restudy.toml                       the last round of every plan
  restudy results --config restudy.toml --history --csv       every round, for a spreadsheet
  restudy results --config restudy.toml --plan \"impeller hub\" --json")]
pub(super) struct Line {
    #[command(flatten)]
    config: ConfigPath,
    /// Only this plan
    #[arg(long, value_name = "NAME")]
    plan: Option<String>,
    /// Every round, not only the last one
    #[arg(long)]
    history: bool,
    /// Print the whole study records as JSON
    #[arg(long, conflicts_with = "csv")]
    json: bool,
    /// Print the table as comma-separated text
    #[arg(long)]
    csv: bool,
}

const HEADINGS: [&str; 12] = [
    "plan",
    "round",
    "revision",
    "closed",
    "characteristic",
    "standing",
    "share %",
    "at least %",
    "EV",
    "GRR",
    "unit",
    "ndc",
];
const NUMBERS: [usize; 7] = [1, 2, 6, 7, 8, 9, 11];

pub(super) fn run(line: &Line) -> Answer {
    let config = configuration::sound(&line.config.config)?;
    if let Some(name) = &line.plan
        && !config.plans.iter().any(|p| &p.name == name)
    {
        return Err(Failure::usage(format!("no plan is called `{name}`")));
    }
    let studies = load(&config, line.plan.as_deref(), line.history)?;
    if line.json {
        let records: Vec<&Value> = studies.iter().map(|s| &s.record).collect();
        print_json(&records)?;
        return Ok(End::Fine);
    }
    let rows: Vec<Vec<String>> = studies.iter().map(|s| row(&config, s)).collect();
    if line.csv {
        let mut text = csv_line(&HEADINGS.map(str::to_owned));
        text.extend(rows.iter().map(|r| csv_line(r)));
        print(&text)?;
    } else if rows.is_empty() {
        print("No study has been recorded yet.\n")?;
    } else {
        print(&table(&HEADINGS, &NUMBERS, rows))?;
        for plan in config
            .plans
            .iter()
            .filter(|p| line.plan.as_ref().is_none_or(|n| *n == p.name))
        {
            let folder = report::folder(&config.state, &plan.name);
            print(&format!("reports of {}: {}\n", plan.name, folder.display()))?;
        }
    }
    Ok(End::Fine)
}

/// Every round of every plan as a table.
pub(super) fn print_history(config: &Config) -> Result<(), Failure> {
    let rows = load(config, None, true)?
        .iter()
        .map(|s| row(config, s))
        .collect();
    print(&table(&HEADINGS, &NUMBERS, rows))
}

fn load(config: &Config, plan: Option<&str>, history: bool) -> Result<Vec<Study>, Failure> {
    let ledger = Ledger::open_to_read(&config.state).map_err(|e| Failure::machine(&e))?;
    ledger
        .snapshot(|read| gather(read, config, plan, history))
        .map_err(|e| Failure::machine(&e))
}

struct Study {
    round: RoundRow,
    characteristic: String,
    standing: &'static str,
    record: Value,
}

fn gather(
    read: Read<'_>,
    config: &Config,
    only: Option<&str>,
    history: bool,
) -> Result<Vec<Study>, LedgerError> {
    let mut studies = Vec::new();
    for plan in config
        .plans
        .iter()
        .filter(|p| only.is_none_or(|n| n == p.name))
    {
        let mut rounds = read.rounds(&plan.name)?;
        rounds.retain(|r| r.analysed > 0);
        if !history {
            rounds = rounds.split_off(rounds.len().saturating_sub(1));
        }
        for round in rounds {
            for study in read.studies(round.id, round.analysed)? {
                let record = serde_json::from_str(&study.record)
                    .map_err(|_| LedgerError::Damaged("study record".into()))?;
                studies.push(Study {
                    round: round.clone(),
                    characteristic: study.characteristic,
                    standing: study.standing.as_str(),
                    record,
                });
            }
        }
    }
    Ok(studies)
}

fn row(config: &Config, study: &Study) -> Vec<String> {
    let number = |pointer: &str| study.record.pointer(pointer).and_then(Value::as_f64);
    let percent = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| format!("{:.1}", 100.0 * x));
    let sd = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| crate::figures::significant(x, 4));
    let text = |pointer: &str| {
        study
            .record
            .pointer(pointer)
            .and_then(Value::as_str)
            .unwrap_or("–")
            .to_owned()
    };
    let closed = study.round.closed.map(|ms| {
        in_zone(ms, &config.site.zone)
            .strftime("%Y-%m-%d %H:%M")
            .to_string()
    });
    vec![
        study.round.plan.clone(),
        study.round.number.to_string(),
        study.round.analysed.to_string(),
        closed.unwrap_or_default(),
        study.characteristic.clone(),
        study.standing.to_owned(),
        percent(number("/figures/gauge/share_of_tolerance/estimate")),
        percent(number("/figures/gauge/share_of_tolerance/at_least")),
        sd(number("/figures/repeatability/sd/estimate")),
        sd(number("/figures/gauge/sd/estimate")),
        text("/unit"),
        study
            .record
            .pointer("/ndc/whole")
            .and_then(Value::as_u64)
            .map_or_else(|| "–".into(), |n| n.to_string()),
    ]
}

fn csv_line(fields: &[String]) -> String {
    let quoted = fields.iter().map(|f| {
        if f.contains([',', '"', '\n', '\r']) {
            format!("\"{}\"", f.replace('"', "\"\""))
        } else {
            f.clone()
        }
    });
    format!("{}\r\n", quoted.collect::<Vec<_>>().join(","))
}
