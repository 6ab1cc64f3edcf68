//! A study for people at a terminal.

use crate::cli::table::table;
use crate::figures::significant;
use crate::record::Record;

pub(super) fn for_people(record: &Record) -> String {
    let study = &record.study;
    let layout = &study.design;
    let factors: Vec<String> = layout
        .factors
        .iter()
        .map(|f| format!("{} {}", f.levels, f.name))
        .collect();
    let unit = record
        .unit
        .as_deref()
        .map(|u| format!(" in {u}"))
        .unwrap_or_default();
    let mut out = format!(
        "{}: {} × {} trials, {} readings{unit}\n\n",
        record.characteristic,
        factors.join(" × "),
        layout.trials,
        layout.readings
    );
    let sd = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| significant(x, 4));
    let percent = |x: Option<f64>| x.map_or_else(|| "–".into(), |x| format!("{:.1} %", 100.0 * x));
    let figures = &study.figures;
    let rows = [
        ("EV, repeatability", &figures.repeatability),
        (
            "AV, reproducibility with interaction",
            &figures.reproducibility,
        ),
        ("GRR, gauge", &figures.gauge),
        ("PV, part", &figures.part),
        ("TV, total", &figures.total),
    ];
    let rows = rows.iter().map(|(name, spread)| {
        let tolerance = match name {
            name if name.starts_with("PV") || name.starts_with("TV") => "–".into(),
            _ => percent(spread.share_of_tolerance.estimate),
        };
        vec![
            (*name).to_owned(),
            sd(spread.sd.estimate),
            sd(spread.sd.lower),
            sd(spread.sd.upper),
            tolerance,
            percent(spread.share_of_tv.estimate),
        ]
    });
    let level = format!(
        "{} % limits: lower",
        significant(100.0 * study.confidence, 3)
    );
    let headings = ["", "sd", level.as_str(), "upper", "of tolerance", "of TV"];
    out.push_str(&table(&headings, &[1, 2, 3, 4, 5], rows.collect()));
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
    out.push('\n');
    let headings = [
        "mean squares",
        "df",
        "sum of squares",
        "mean square",
        "F",
        "p",
    ];
    out.push_str(&table(&headings, &[1, 2, 3, 4, 5], rows.collect()));
    let share = &figures.gauge.share_of_tolerance;
    out.push('\n');
    match (share.estimate, share.at_least) {
        (Some(estimate), at_least) => out.push_str(&format!(
            "The gauge takes {} of the tolerance; with {} % confidence at least {}.\n",
            percent(Some(estimate)),
            significant(100.0 * study.confidence, 3),
            percent(at_least)
        )),
        (None, _) => {
            let why = share.why.as_deref().unwrap_or("no tolerance is known");
            out.push_str(&format!("Share of tolerance: none ({why}).\n"));
        }
    }
    if let Some(ndc) = study.ndc.whole {
        out.push_str(&format!("ndc {ndc}.\n"));
    }
    for remark in &study.remarks {
        out.push_str(&format!("{}\n", remark.text));
    }
    out.push_str("A study is evidence about the gauge, not a release of product.\n\n");
    out
}
