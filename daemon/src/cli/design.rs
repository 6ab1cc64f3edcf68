//! `restudy design`: what a study of some size can show, and a run sheet for it.

mod mix;
mod sheet;

use std::collections::BTreeMap;

use restudy_engine::planning::{Assumption, Candidate, Outlook, STUDIES};
use serde::Serialize;

use self::mix::Mix;
use self::sheet::{Form, print_sheet};
use super::table::table;
use super::{Answer, End, Failure, print, print_json};
use crate::figures::significant;

/// Most appraisers and trials that a search for a wanted certainty tries.
const APPRAISERS_MAX: usize = 24;
const TRIALS_MAX: usize = 4;
/// Studies a design in that search; a chance near 0.95 is then known to 0.2 %.
const STUDIES_OF_SEARCH: u32 = 20_000;

/// Show what a study of some size can tell before the first run, or print its run sheet
#[derive(Debug, clap::Args)]
#[command(after_help = "\
Examples:
  restudy design --share 0.2 --limit 0.3 --mix repeatability=60,interaction=10,appraiser=30
  restudy design --share 0.25 --limit 0.3 --mix repeatability=1,appraiser=1 --appraisers 3,6 --trials 2,3
  restudy design --share 0.25 --limit 0.3 --mix repeatability=1,appraiser=1 --wanted 0.95
  restudy design --run-sheet --people KL,MO,TS --trials 3 --seed 12          give this to the room
  restudy design --key csv --people KL,MO,TS --trials 3 --seed 12            keep this for yourself

--mix gives the weights of the sources in the gauge's variance, from an earlier study or a guess; only their ratio counts.
Where appraisers differ, more appraisers make a study surer; more trials of the same appraisers hardly do.
The same seed gives the same numbers and the same sheet; sheet and key belong together.
Exit code 1: no design up to 24 appraisers reaches --wanted.")]
pub(super) struct Line {
    /// The share of tolerance that the gauge is assumed to take
    #[arg(long, value_name = "FRACTION", required_unless_present_any = ["run_sheet", "key"])]
    share: Option<f64>,
    /// The limit on the share
    #[arg(long, value_name = "FRACTION", required_unless_present_any = ["run_sheet", "key"])]
    limit: Option<f64>,
    /// Sources of the gauge's variance: `repeatability=60,interaction=10,appraiser=30`
    #[arg(long, value_name = "SOURCE=WEIGHT,…", required_unless_present_any = ["run_sheet", "key"])]
    mix: Option<Mix>,
    /// Numbers of parts to compare
    #[arg(long, value_name = "N,…", value_delimiter = ',', default_value = "10")]
    parts: Vec<usize>,
    /// Numbers of appraisers to compare (loadings, shifts: whatever stands in their place)
    #[arg(long, value_name = "N,…", value_delimiter = ',', default_value = "3,6")]
    appraisers: Vec<usize>,
    /// Numbers of trials to compare
    #[arg(
        long,
        value_name = "N,…",
        value_delimiter = ',',
        default_value = "2,3,6"
    )]
    trials: Vec<usize>,
    /// Look for the smallest design with this chance of the right standing
    #[arg(long, value_name = "FRACTION", conflicts_with_all = ["run_sheet", "key"])]
    wanted: Option<f64>,
    /// Two-sided confidence of the limits
    #[arg(long, value_name = "FRACTION", default_value_t = 0.95)]
    confidence: f64,
    /// Seed of chance
    #[arg(long, value_name = "NUMBER", default_value_t = 1)]
    seed: u64,
    /// Print a blind run sheet in random order: `text` or `csv`
    #[arg(long, value_name = "FORM", num_args = 0..=1, default_missing_value = "text")]
    run_sheet: Option<Form>,
    /// Print what the sheet's labels stand for
    #[arg(long, value_name = "FORM", num_args = 0..=1, default_missing_value = "text", conflicts_with = "run_sheet")]
    key: Option<Form>,
    /// Names for sheet and key, instead of a number of appraisers
    #[arg(long, value_name = "NAME,…", value_delimiter = ',')]
    people: Vec<String>,
    /// Print as JSON
    #[arg(long, conflicts_with_all = ["run_sheet", "key"])]
    json: bool,
}

/// One row of the answer; shares of tolerance, not ratios.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
struct Row {
    parts: usize,
    appraisers: usize,
    trials: usize,
    readings: usize,
    /// Chance that the estimate lies on the side of the limit on which the truth lies.
    right: f64,
    /// Nine studies in ten estimate between these.
    estimate: Span,
    /// Medians of the two-sided limits.
    limits: Span,
    /// One upper limit in ten lies above this.
    upper_in_ten: f64,
    /// Mean distance from the lower to the upper limit.
    width: f64,
}

#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
struct Span {
    lower: f64,
    upper: f64,
}

#[derive(Serialize)]
struct Answered<'a> {
    share: f64,
    limit: f64,
    mix: BTreeMap<&'static str, f64>,
    confidence: f64,
    studies: u32,
    seed: u64,
    designs: &'a [Row],
    twice: &'a Option<Twice>,
    wanted: Option<f64>,
    smallest: Option<Row>,
}

/// What the same number of further readings buys, from the smallest design on.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
struct Twice {
    smallest: Row,
    the_trials: Row,
    the_appraisers: Row,
}

pub(super) fn run(line: &Line) -> Answer {
    match (line.run_sheet, line.key) {
        (Some(form), _) => print_sheet(line, form, false),
        (_, Some(form)) => print_sheet(line, form, true),
        _ => compare(line),
    }
}

fn compare(line: &Line) -> Answer {
    let (Some(share), Some(limit), Some(mix)) = (line.share, line.limit, &line.mix) else {
        return Err(Failure::usage("--share, --limit and --mix are needed"));
    };
    if !line.people.is_empty() {
        return Err(Failure::usage(
            "--people belongs to --run-sheet and --key; expected --appraisers",
        ));
    }
    if let Some(wanted) = line.wanted.filter(|w| !(*w > 0.0 && *w < 1.0)) {
        return Err(Failure::usage(format!(
            "--wanted is {wanted}; expected a fraction between 0 and 1"
        )));
    }
    let planner = Planner {
        assumed: Assumption {
            mix: mix.by_line(),
            share,
            limit,
            confidence: line.confidence,
            studies: STUDIES,
            seed: line.seed,
        },
    };
    let mut rows = Vec::new();
    for &parts in &line.parts {
        for &appraisers in &line.appraisers {
            for &trials in &line.trials {
                rows.push(planner.row(parts, appraisers, trials)?);
            }
        }
    }
    let twice = planner.twice(&rows)?;
    let smallest = match line.wanted {
        Some(wanted) => planner.smallest(&line.parts, wanted)?,
        None => None,
    };
    let end = if line.wanted.is_some() && smallest.is_none() {
        End::BadNews
    } else {
        End::Fine
    };
    if line.json {
        print_json(&Answered {
            share,
            limit,
            mix: mix.parts().collect(),
            confidence: line.confidence,
            studies: STUDIES,
            seed: line.seed,
            designs: &rows,
            twice: &twice,
            wanted: line.wanted,
            smallest,
        })?;
        return Ok(end);
    }
    print(&for_people(&planner.assumed, mix, &rows))?;
    if let Some(twice) = twice {
        print(&format!("\n{}\n", twice.in_words()))?;
    }
    if let Some(wanted) = line.wanted {
        print(&format!("\n{}\n", found(wanted, smallest.as_ref())))?;
    }
    print(&format!(
        "\n{STUDIES} simulated studies a design, seed {}. A study is evidence about a gauge, not a release of product.\n",
        line.seed
    ))?;
    Ok(end)
}

struct Planner {
    assumed: Assumption,
}

impl Planner {
    fn row(&self, parts: usize, appraisers: usize, trials: usize) -> Result<Row, Failure> {
        Self::row_of(&self.assumed, parts, appraisers, trials)
    }

    fn row_of(
        assumed: &Assumption,
        parts: usize,
        appraisers: usize,
        trials: usize,
    ) -> Result<Row, Failure> {
        let at = |e: &dyn std::fmt::Display| {
            Failure::usage(format!("{parts} × {appraisers} × {trials}: {e}"))
        };
        let candidate = Candidate::crossed(parts, appraisers, trials).map_err(|e| at(&e))?;
        let outlook = assumed.outlook(&candidate).map_err(|e| at(&e))?;
        Ok(Row::new(parts, appraisers, trials, assumed.share, &outlook))
    }

    /// What twice the trials and twice the appraisers buy; `None` where appraisers do not come in.
    fn twice(&self, rows: &[Row]) -> Result<Option<Twice>, Failure> {
        let smallest = rows.iter().min_by_key(|row| row.readings);
        let Some(row) = smallest.filter(|row| row.appraisers > 1) else {
            return Ok(None);
        };
        Ok(Some(Twice {
            smallest: *row,
            the_trials: self.row(row.parts, row.appraisers, 2 * row.trials)?,
            the_appraisers: self.row(row.parts, 2 * row.appraisers, row.trials)?,
        }))
    }

    /// The design with the fewest readings that stands right often enough.
    fn smallest(&self, parts: &[usize], wanted: f64) -> Result<Option<Row>, Failure> {
        let rough = Assumption {
            studies: STUDIES_OF_SEARCH,
            ..self.assumed.clone()
        };
        let mut sizes: Vec<(usize, usize, usize)> = parts
            .iter()
            .flat_map(|&p| (2..=APPRAISERS_MAX).map(move |a| (p, a)))
            .flat_map(|(p, a)| (2..=TRIALS_MAX).map(move |t| (p, a, t)))
            .collect();
        sizes.sort_by_key(|&(p, a, t)| (p * a * t, t));
        for (p, a, t) in sizes {
            if Self::row_of(&rough, p, a, t)?.right >= wanted {
                let row = self.row(p, a, t)?;
                if row.right >= wanted {
                    return Ok(Some(row));
                }
            }
        }
        Ok(None)
    }
}

impl Row {
    fn new(parts: usize, appraisers: usize, trials: usize, share: f64, outlook: &Outlook) -> Row {
        Row {
            parts,
            appraisers,
            trials,
            readings: outlook.readings,
            right: outlook.right,
            estimate: Span {
                lower: share * outlook.estimate_low,
                upper: share * outlook.estimate_high,
            },
            limits: Span {
                lower: share * outlook.lower,
                upper: share * outlook.upper,
            },
            upper_in_ten: share * outlook.upper_in_ten,
            width: share * outlook.width,
        }
    }

    fn size(&self) -> String {
        format!("{} × {} × {}", self.parts, self.appraisers, self.trials)
    }

    fn wrong(&self) -> f64 {
        1.0 - self.right
    }
}

impl Twice {
    fn in_words(&self) -> String {
        let (trials, appraisers) = (&self.the_trials, &self.the_appraisers);
        let advice = match (
            appraisers.width < trials.width,
            appraisers.right >= trials.right,
        ) {
            (true, true) => "buy appraisers, not trials",
            (false, false) => "here trials buy more",
            _ => "neither wins in both",
        };
        format!(
            "From {} on, {} further readings either way: twice the trials ({}) narrow the limits by {} and leave {} on the \
             wrong side, twice the appraisers ({}) by {} and {}: {advice}.",
            self.smallest.size(),
            trials.readings - self.smallest.readings,
            trials.size(),
            percent((1.0 - trials.width / self.smallest.width).max(0.0)),
            percent(trials.wrong()),
            appraisers.size(),
            percent((1.0 - appraisers.width / self.smallest.width).max(0.0)),
            percent(appraisers.wrong()),
        )
    }
}

fn found(wanted: f64, smallest: Option<&Row>) -> String {
    match smallest {
        Some(row) => format!(
            "The smallest design that stands right in {} of studies: {} ({} readings, {}).",
            percent(wanted),
            row.size(),
            row.readings,
            percent(row.right)
        ),
        None => format!(
            "No design up to {APPRAISERS_MAX} appraisers and {TRIALS_MAX} trials stands right in {} of studies: the assumed share \
             lies too near the limit.",
            percent(wanted)
        ),
    }
}

fn for_people(assumed: &Assumption, mix: &Mix, rows: &[Row]) -> String {
    let sources: Vec<String> = mix
        .parts()
        .map(|(word, part)| format!("{word} {}", percent(part)))
        .collect();
    let mut out = format!(
        "A gauge that truly takes {} of the tolerance, held against a limit of {}. Its variance: {}.\n\n",
        percent(assumed.share),
        percent(assumed.limit),
        sources.join(", ")
    );
    let span = |span: Span| format!("{} to {}", percent(span.lower), percent(span.upper));
    let cells = rows.iter().map(|row| {
        vec![
            row.size(),
            row.readings.to_string(),
            percent(row.wrong()),
            span(row.estimate),
            span(row.limits),
            percent(row.upper_in_ten),
        ]
    });
    let limits = format!("{} limits, typically", percent(assumed.confidence));
    let headings = [
        "parts × appraisers × trials",
        "readings",
        "wrong side",
        "9 of 10 studies show",
        limits.as_str(),
        "upper, 1 in 10 above",
    ];
    out.push_str(&table(&headings, &[1, 2, 3, 4, 5], cells.collect()));
    out
}

fn percent(fraction: f64) -> String {
    format!("{} %", significant(100.0 * fraction, 2))
}
