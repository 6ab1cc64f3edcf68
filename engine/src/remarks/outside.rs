//! Remarks: plain sentences about a study with the numbers behind them.

use std::collections::BTreeMap;

use crate::figure::Figure;
use crate::record::{Component, Figures, Remark};

/// One remark for every figure whose estimate lies outside its limits.
pub(crate) fn outside_limits(
    components: &[Component],
    figures: &Figures,
    part_to_gauge: &Figure,
) -> Vec<Remark> {
    let below_zero: Vec<&str> = components
        .iter()
        .filter(|c| c.raw < 0.0)
        .map(|c| c.name.as_ref())
        .collect();
    let of_components = components
        .iter()
        .map(|c| (format!("variance of {}", c.name), &c.variance));
    let spreads = [
        ("repeatability", &figures.repeatability),
        ("reproducibility", &figures.reproducibility),
        ("gauge", &figures.gauge),
        ("part", &figures.part),
        ("total", &figures.total),
    ];
    let of_spreads = spreads.iter().flat_map(|(name, s)| {
        [
            (format!("{name} variance"), &s.variance),
            (format!("{name} share of total variation"), &s.share_of_tv),
        ]
    });
    let ratio = [("ratio of part to gauge variance".to_owned(), part_to_gauge)];
    of_components
        .chain(of_spreads)
        .chain(ratio)
        .filter(|(_, figure)| figure.contradicts_itself())
        .map(|(name, figure)| outside(&name, figure, &below_zero))
        .collect()
}

/// What one trial cannot tell apart: the error line holds the largest term too.
pub(crate) fn one_trial(taken_in: &str) -> Remark {
    let text = format!(
        "With one trial {taken_in} cannot be told from repeatability: the line within cells holds both."
    );
    Remark {
        kind: "one trial",
        text,
        figures: BTreeMap::new(),
    }
}

fn outside(name: &str, figure: &Figure, below_zero: &[&str]) -> Remark {
    let numbers = [
        ("estimate", figure.estimate),
        ("lower", figure.lower),
        ("upper", figure.upper),
    ];
    let figures: BTreeMap<String, f64> = numbers
        .iter()
        .filter_map(|&(key, x)| Some((key.to_owned(), x?)))
        .collect();
    let limits = match (figure.lower, figure.upper) {
        (Some(lower), Some(upper)) => format!("limits {} to {}", brief(lower), brief(upper)),
        (Some(lower), None) => format!("lower limit {}", brief(lower)),
        (None, Some(upper)) => format!("upper limit {}", brief(upper)),
        (None, None) => "limits".to_owned(),
    };
    let why = if below_zero.is_empty() {
        "the limits follow another path from the mean squares than the estimate".to_owned()
    } else {
        format!(
            "the estimate cuts components below zero ({}) at zero before adding, the limits use the mean squares as they are",
            below_zero.join(", ")
        )
    };
    let estimate = figure.estimate.map(brief).unwrap_or_default();
    Remark {
        kind: "estimate outside limits",
        text: format!("The {name}, {estimate}, lies outside its {limits}: {why}."),
        figures,
    }
}

/// Four significant digits.
fn brief(x: f64) -> String {
    let magnitude = if x == 0.0 {
        0
    } else {
        x.abs().log10().floor() as i32
    };
    if (-4..6).contains(&magnitude) {
        format!("{:.*}", (3 - magnitude).max(0) as usize, x)
    } else {
        format!("{x:.3e}")
    }
}
