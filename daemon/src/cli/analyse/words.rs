//! A study for people at a terminal.

use crate::cli::table::table;
use crate::figures::significant;
use crate::record::Record;
use restudy_engine::{Spread, Study};

pub(super) fn for_people(record: &Record) -> String {
    let study = &record.study;
    let layout = &study.design;
    let factors: Vec<String> = layout
        .factors
        .iter()
        .map(|f| counted(f.levels, &f.name))
        .collect();
    let unit = record
        .unit
        .as_deref()
        .map(|u| format!(" in {u}"))
        .unwrap_or_default();
    let up_to = if layout.balanced { "" } else { "up to " };
    let mut out = format!(
        "{}: {} × {up_to}{}, {}{unit}\n\n",
        record.characteristic,
        factors.join(" × "),
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
    out.push_str(match (study.interaction.kept, layout.trials) {
        (true, _) => "AV holds the interaction.\n",
        (false, 1) => "One trial: EV holds the interaction.\n",
        (false, _) => "",
    });
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
