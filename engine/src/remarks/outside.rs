//! What a study's own figures leave to be explained: estimates outside their limits, terms lost in the error.

use std::collections::BTreeMap;

use super::words::{list, number, rounded};
use crate::figure::Figure;
use crate::pooling::Pooled;
use crate::record::{Component, Figures, Remark};

/// Digits that show an estimate apart from its limit.
const DIGITS: i32 = 4;

/// Names the figures whose estimates lie outside their limits; the numbers are those of the first.
pub(crate) fn outside_limits(
    components: &[Component],
    figures: &Figures,
    part_to_gauge: &Figure,
) -> Option<Remark> {
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
    let outside: Vec<(String, &Figure)> = of_components
        .chain(of_spreads)
        .chain(ratio)
        .filter(|(_, figure)| figure.contradicts_itself())
        .collect();
    let ((name, figure), others) = outside.split_first()?;
    let others: Vec<String> = others.iter().map(|(name, _)| name.clone()).collect();
    Some(outside_its_limits(name, figure, &others, &below_zero))
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

/// Which interactions the error took in, and which stayed; `None` when it took in none.
pub(crate) fn terms_pooled(limit: f64, taken_in: &[Pooled], kept: &[String]) -> Option<Remark> {
    if taken_in.is_empty() {
        return None;
    }
    let named: Vec<String> = taken_in
        .iter()
        .map(|term| format!("{} (p {})", term.name, number(term.p)))
        .collect();
    let rest = if kept.is_empty() {
        "No interaction with the part is kept".to_owned()
    } else {
        format!("Kept: {}", list(kept))
    };
    let figures = taken_in
        .iter()
        .map(|term| (format!("p of {}", term.name), term.p))
        .collect();
    Some(Remark {
        kind: "terms pooled",
        text: format!(
            "The line within cells has taken in {}, each with a p above {limit} when it was tested. {rest}.",
            list(&named)
        ),
        figures,
    })
}

fn outside_its_limits(
    name: &str,
    figure: &Figure,
    others: &[String],
    below_zero: &[&str],
) -> Remark {
    let brief = |x: f64| rounded(DIGITS, x);
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
    let likewise = if others.is_empty() {
        String::new()
    } else {
        format!(" Likewise: {}.", list(others))
    };
    Remark {
        kind: "estimate outside limits",
        text: format!("The {name}, {estimate}, lies outside its {limits}: {why}.{likewise}"),
        figures,
    }
}
