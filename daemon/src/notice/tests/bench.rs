//! Rounds made by hand: 10 parts, 3 loadings, 3 trials, with an analysis of variance that can be done on paper.
//!
//! Every cell holds `mean - n, mean, mean + n`, so EV = n. Without interaction, one loading that reads d above the
//! two others gives AV² = d²/3, so GRR² = n² + d²/3, exactly.

use std::collections::BTreeMap;
use std::path::Path;

use jiff::civil::date;
use restudy_config::{Config, Disk, Plan};

use crate::analyse::study::work_out;
use crate::analyse::worked::Worked;
use crate::evidence::{Evidence, Factor, Feature, Run};
use crate::ledger::{Earlier, RoundRow, RoundState, StudyRow};
use crate::record::{Counts, Measured};

pub(super) const LOADINGS: [&str; 3] = ["KL", "MO", "TS"];
const PARTS: usize = 10;
/// 3 March 2026 09:00 in Oslo.
const FIRST_CLOSED: i64 = 1_772_524_800_000;
const QUARTER: i64 = 91 * 86_400_000;

struct Nothing;

impl Disk for Nothing {
    fn is_folder(&self, _: &Path) -> bool {
        true
    }
    fn text(&self, path: &Path) -> Result<String, String> {
        Err(format!("no such file: {}", path.display()))
    }
}

const MAIL: &str = r#"
[mail]
server = "mail.halden.example"
tls    = "starttls"
from   = "Restudy <restudy@halden.example>"
[[route]]
kinds = ["standing"]
plans = ["impeller hub"]
to    = ["quality@halden.example", "room@halden.example"]
[[route]]
to    = ["records@halden.example", "quality@halden.example"]
"#;

/// Halden Pump Works with mail and two routes.
pub(super) fn halden() -> Config {
    config(MAIL, "")
}

/// With other tables at the end, and lines in the plan.
pub(super) fn config(tail: &str, plan: &str) -> Config {
    let text = format!(
        r#"
[site]
name = "Halden Pump Works"
zone = "Europe/Oslo"
[state]
folder = "/var/lib/restudy"
[[instrument]]
name    = "bridge-1"
folders = ["/srv/exports/bridge-1"]
files   = ["*.csv"]
settle  = "3s"
rescan  = "30s"
[instrument.read]
form           = "table"
decimal        = "."
part           = {{ column = "part" }}
appraiser      = {{ column = "loaded by" }}
trial          = {{ column = "trial" }}
taken          = {{ column = "taken" }}
characteristic = {{ column = "feature" }}
value          = {{ column = "value", unit = "mm" }}
[[plan]]
name           = "impeller hub"
instruments    = ["bridge-1"]
parts          = 10
appraisers     = ["KL", "MO", "TS"]
appraiser_word = "loading"
trials         = 3
interaction    = "keep"
repeat_every   = "90d"
[plan.limits]
watch = 0.20
act   = 0.30
{plan}
{tail}
"#
    );
    let read = restudy_config::read(&text, "halden.toml", Path::new("/etc/restudy"), &Nothing);
    read.unwrap_or_else(|faults| panic!("{faults:#?}")).0
}

/// How one characteristic reads; lengths in mm.
#[derive(Clone)]
pub(super) struct Reads {
    pub(super) name: &'static str,
    /// EV.
    pub(super) repeat: f64,
    /// What each loading adds.
    pub(super) by: [f64; 3],
    /// Added for one loading on every second part, taken off on the others.
    pub(super) crossed: [f64; 3],
    pub(super) lower: Option<f64>,
    pub(super) upper: Option<f64>,
    /// Why it cannot be worked out.
    pub(super) fault: Option<&'static str>,
}

/// A tolerance of 0.027 mm; limits at 5.4 µm and 8.1 µm of six gauge sds.
pub(super) fn reads(name: &'static str, repeat_um: f64, ts_um: f64) -> Reads {
    Reads {
        name,
        repeat: repeat_um * 1e-3,
        by: [0.0, 0.0, ts_um * 1e-3],
        crossed: [0.0; 3],
        lower: Some(50.0),
        upper: Some(50.027),
        fault: None,
    }
}

pub(super) fn round(
    config: &Config,
    number: i64,
    features: &[Reads],
    before: Option<&Worked>,
) -> Worked {
    revised(config, number, 1, features, before)
}

pub(super) fn revised(
    config: &Config,
    number: i64,
    revision: i64,
    features: &[Reads],
    before: Option<&Worked>,
) -> Worked {
    let plan = &config.plans[0];
    let evidence = evidence(plan, number, revision, features);
    let earlier = before.map(earlier).unwrap_or_default();
    let standing = |label: &str| earlier.get(label).map(|e: &Earlier| e.study.standing);
    let outcomes = work_out(&config.site.name, plan, &evidence, &standing);
    Worked {
        evidence,
        outcomes,
        earlier,
    }
}

/// The studies as the ledger would keep them.
pub(super) fn rows(worked: &Worked) -> Vec<StudyRow> {
    let row = |outcome: &crate::analyse::study::Outcome| StudyRow {
        round: worked.evidence.round.id,
        revision: worked.evidence.round.revision,
        characteristic: outcome.characteristic.clone(),
        record: outcome
            .study
            .as_ref()
            .map_or_else(|_| "{}".into(), |r| serde_json::to_string(r).unwrap()),
        share: outcome.share(),
        standing: outcome.standing(),
    };
    worked.outcomes.iter().map(row).collect()
}

fn earlier(before: &Worked) -> BTreeMap<String, Earlier> {
    let round = &before.evidence.round;
    rows(before)
        .into_iter()
        .map(|study| {
            let closed = round.closed.unwrap();
            (
                study.characteristic.clone(),
                Earlier {
                    number: round.number,
                    closed,
                    study,
                },
            )
        })
        .collect()
}

fn evidence(plan: &Plan, number: i64, revision: i64, features: &[Reads]) -> Evidence {
    let names = |count: usize| (1..=count).map(|n| format!("P{n:02}")).collect();
    let factors = vec![
        Factor {
            name: "part".into(),
            word: "part".into(),
            levels: names(PARTS),
        },
        Factor {
            name: "appraiser".into(),
            word: "loading".into(),
            levels: LOADINGS.map(String::from).to_vec(),
        },
    ];
    let mut runs = Vec::new();
    for part in 0..PARTS {
        for loading in 0..LOADINGS.len() {
            for slot in 0..plan.trials as usize {
                let taken = date(2026, 3, 1).at(8, (runs.len() / 2) as i8, 0, 0);
                runs.push(Run {
                    levels: vec![part, loading],
                    cell: part * LOADINGS.len() + loading,
                    slot,
                    taken: Some(taken),
                });
            }
        }
    }
    let measured = runs[0]
        .taken
        .zip(runs[runs.len() - 1].taken)
        .map(|(first, last)| Measured { first, last });
    Evidence {
        round: RoundRow {
            id: number,
            plan: plan.name.clone(),
            number,
            label: None,
            state: RoundState::Complete,
            reason: None,
            opened: Some(FIRST_CLOSED + (number - 1) * QUARTER - 86_400_000),
            closed: Some(FIRST_CLOSED + (number - 1) * QUARTER),
            through: None,
            revision,
            analysed: revision - 1,
            reported: revision - 1,
        },
        instruments: vec!["bridge-1".into()],
        factors,
        trials: plan.trials as usize,
        features: features.iter().map(|reads| feature(reads, &runs)).collect(),
        runs,
        same: BTreeMap::new(),
        source: Vec::new(),
        measured,
        not_used: Vec::new(),
    }
}

fn feature(reads: &Reads, runs: &[Run]) -> Feature {
    let value = |run: &Run| {
        let (part, loading) = (run.levels[0], run.levels[1]);
        let turn = if part.is_multiple_of(2) { 1.0 } else { -1.0 };
        50.0 + 0.002 * part as f64
            + reads.by[loading]
            + turn * reads.crossed[loading]
            + reads.repeat * (run.slot as f64 - 1.0)
    };
    Feature {
        label: reads.name.into(),
        unit: Some("mm".into()),
        nominal: None,
        lower: reads.lower,
        upper: reads.upper,
        cells: runs.iter().map(|r| r.cell).collect(),
        runs: (0..runs.len()).collect(),
        values: runs.iter().map(value).collect(),
        unit_differs: reads.fault.map(str::to_owned),
        limits_differ: None,
        counts: Counts {
            used: runs.len(),
            ..Counts::default()
        },
    }
}
