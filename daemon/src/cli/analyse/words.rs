//! A study for people at a terminal.

use crate::cli::table::table;
use crate::figures::significant;
use crate::record::Record;
use restudy_engine::{Factor, PART, Spread, Study, WITHIN_CELLS};

pub(super) fn for_people(record: &Record) -> String {
    let study = &record.study;
    let layout = &study.design;
    let unit = record
        .unit
        .as_deref()
        .map(|u| format!(" in {u}"))
        .unwrap_or_default();
    let up_to = if layout.balanced { "" } else { "up to " };
    let mut out = format!(
        "{}: {} × {up_to}{}, {}{unit}\n\n",
        record.characteristic,
        factors(&layout.factors),
        counted(layout.trials, "trial"),
        counted(layout.readings, "reading")
    );
    let sd = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| significant(x, 4));
    let percent = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| format!("{:.1} %", 100.0 * x));
    let figures = &study.figures;
    let sources = [
        &figures.repeatability,
        &figures.reproducibility,
        &figures.gauge,
        &figures.part,
        &figures.total,
    ];
    let confidence = percent_as_set(study.confidence);
    let question = |name: &str, answer: &dyn Fn(&Spread) -> String| {
        std::iter::once(name.to_owned())
            .chain(sources.iter().map(|s| answer(s)))
            .collect()
    };
    let unit = record
        .unit
        .as_deref()
        .map(|u| format!(", {u}"))
        .unwrap_or_default();
    let rows: Vec<Vec<String>> = vec![
        question(&format!("how big (sd{unit})"), &|s| sd(s.sd.estimate)),
        question(&format!("at least, {confidence} confidence"), &|s| {
            sd(s.sd.at_least)
        }),
        question("of the tolerance", &|s| {
            percent(s.share_of_tolerance.estimate)
        }),
        question("of TV", &|s| percent(s.share_of_tv.estimate)),
    ];
    out.push_str(&table(
        &["", "EV", "AV", "GRR", "PV", "TV"],
        &[1, 2, 3, 4, 5],
        rows,
    ));
    out.push_str(&what_is_where(study));
    if layout.balanced {
        out.push('\n');
        out.push_str(&mean_squares(study));
    }
    let share = &figures.gauge.share_of_tolerance;
    out.push('\n');
    let why = share.why.as_deref().unwrap_or("no tolerance is known");
    out.push_str(&match (share.estimate, share.at_least) {
        (Some(estimate), Some(at_least)) => format!(
            "The gauge takes {} of the tolerance; with {confidence} confidence at least {:.1} %.\n",
            percent(Some(estimate)),
            (1000.0 * at_least).floor() / 10.0
        ),
        (Some(estimate), None) => {
            format!(
                "The gauge takes {} of the tolerance; no limits: {why}.\n",
                percent(Some(estimate))
            )
        }
        (None, _) => format!("Share of tolerance: none ({why}).\n"),
    });
    if let Some(ndc) = study.ndc.whole {
        out.push_str(&format!("ndc {ndc}.\n"));
    }
    for remark in &study.remarks {
        out.push_str(&format!("{}\n", remark.text));
    }
    out.push_str("A study is evidence about the gauge, not a release of product.\n\n");
    out
}

/// `10 parts × 3 appraisers`, or `3 appraisers × 8 parts within each appraiser`.
fn factors(factors: &[Factor]) -> String {
    let (crossed, nested): (Vec<&Factor>, Vec<&Factor>) =
        factors.iter().partition(|f| f.within.is_empty());
    let words: Vec<String> = crossed
        .into_iter()
        .chain(nested)
        .map(|f| match f.within.as_slice() {
            [] => counted(f.levels, &f.name),
            within => {
                let levels = counted(f.levels, &f.name);
                format!("{levels} within each {}", within.join(" × "))
            }
        })
        .collect();
    words.join(" × ")
}

/// What AV and EV hold beside what their names say.
fn what_is_where(study: &Study) -> String {
    let is_of_part = |of: &[String]| of == [PART];
    let reproducibility: Vec<&str> = study
        .components
        .iter()
        .filter(|c| c.name != WITHIN_CELLS && !is_of_part(&c.of))
        .map(|c| &*c.name)
        .collect();
    let one_trial = study.design.trials == 1;
    match reproducibility.as_slice() {
        [] if study.design.factors.len() == 1 => {
            "Only the part is in the design: there is no AV, and GRR is EV.\n".into()
        }
        ["appraiser", "part × appraiser"] => "AV holds the interaction.\n".into(),
        ["appraiser"] if one_trial && study.design.factors.iter().all(|f| f.within.is_empty()) => {
            "One trial: EV holds the interaction.\n".into()
        }
        [] | ["appraiser"] => String::new(),
        [one] => format!("AV holds {one}.\n"),
        [most @ .., last] => format!("AV holds {} and {last}.\n", most.join(", ")),
    }
}

/// The table of mean squares.
fn mean_squares(study: &Study) -> String {
    let sd = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| significant(x, 4));
    let rows = study.mean_squares.iter().map(|line| {
        let p = line.p.map_or_else(
            || "–".into(),
            |p| {
                if p < 0.0001 {
                    "< 0.0001".into()
                } else {
                    format!("{p:.4}")
                }
            },
        );
        vec![
            line.name.to_string(),
            line.df.to_string(),
            significant(line.ss, 5),
            sd(line.ms),
            line.f.map_or_else(|| "–".into(), |f| significant(f, 4)),
            p,
        ]
    });
    let headings = [
        "mean squares",
        "df",
        "sum of squares",
        "mean square",
        "F",
        "p",
    ];
    table(&headings, &[1, 2, 3, 4, 5], rows.collect())
}

fn counted(n: usize, what: &str) -> String {
    let plural = if n == 1 { "" } else { "s" };
    format!("{n} {what}{plural}")
}

/// A confidence with every digit that was asked for.
fn percent_as_set(confidence: f64) -> String {
    let percent = (1e9 * confidence).round() / 1e7;
    format!("{percent} %")
}
