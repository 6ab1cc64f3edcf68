//! What the study was not fit to show: too few levels, parts too much alike, readings folded at zero.

use super::material::{Material, remark};
use super::words::{number, percent};
use crate::quantile::{Side, chi_square};
use crate::record::Remark;
use crate::settings::OneSided;

/// Fewer parts than this leave the part spread open.
const PARTS_MIN: usize = 5;
/// Levels of another factor from which on its spread can be told at all.
const LEVELS_MIN: usize = 3;
/// Parts that span less of the tolerance than this leave most of it untried.
const SPAN_MIN: f64 = 0.5;
/// Readings fold at a natural zero that is nearer than so many gauge sd.
const FOLD_SDS: f64 = 3.0;

/// The stretch of reading units that the tolerance allows, by its own rule; a distance to one limit is none.
pub(super) fn width(material: &Material<'_>) -> Option<f64> {
    let tolerance = material.tolerance;
    let width = match (tolerance.lower, tolerance.upper, tolerance.one_sided) {
        (Some(lower), Some(upper), _) => upper - lower,
        (Some(limit), None, Some(OneSided::FromZero))
        | (None, Some(limit), Some(OneSided::FromZero)) => limit.abs(),
        (_, _, Some(OneSided::Width(width))) => width,
        _ => return None,
    };
    (width > 0.0 && width.is_finite()).then_some(width)
}

/// Readings so near a natural zero that magnitudes fold there.
pub(super) fn near_zero(material: &Material<'_>) -> Option<Remark> {
    if material.tolerance.one_sided != Some(OneSided::FromZero) || two_sided(material) {
        return None;
    }
    let sd = material
        .study
        .figures
        .gauge
        .sd
        .estimate
        .filter(|sd| *sd > 0.0)?;
    let near = material
        .values
        .iter()
        .filter(|y| y.abs() < FOLD_SDS * sd)
        .count();
    if near == 0 {
        return None;
    }
    let text = format!(
        "{near} of {} readings lie within {FOLD_SDS} gauge sd ({}) of zero. Magnitudes fold there: their spread is \
         too small and not normal, so neither estimates nor limits hold; study the signed components instead.",
        material.values.len(),
        material.length(FOLD_SDS * sd),
    );
    let figures = [
        ("readings near zero", near as f64),
        ("three gauge sd", FOLD_SDS * sd),
    ];
    Some(remark("near zero", text, &figures))
}

fn two_sided(material: &Material<'_>) -> bool {
    material.tolerance.lower.is_some() && material.tolerance.upper.is_some()
}

/// A factor of two levels, or few parts: the spread of their levels can hardly be told.
pub(super) fn too_small(material: &Material<'_>) -> Vec<Remark> {
    let part = material.design.part();
    let factors = material.design.factors().iter().enumerate();
    let few = factors.filter(|(f, factor)| {
        let least = if *f == part { PARTS_MIN } else { LEVELS_MIN };
        factor.levels > 1 && factor.levels < least && factor.within.is_empty()
    });
    few.map(|(f, factor)| {
        let df = (factor.levels - 1) as f64;
        let outside = (1.0 - material.study.confidence) / 2.0;
        let times = |side| (df / chi_square(side, outside, df)).sqrt();
        let (lower, upper) = (times(Side::Above), times(Side::Below));
        let word = material.word(f);
        let advice = if f == part {
            "ndc and shares of total variation hang on that spread"
        } else {
            "more levels would tell, more trials do not"
        };
        let text = format!(
            "{} levels of {word} hardly tell how much {word} adds: at {} its true sd may be {} to {} times the sd \
             seen between them; {advice}.",
            factor.levels,
            material.confidence(),
            number(lower),
            number(upper),
        );
        let figures = [
            ("levels", factor.levels as f64),
            ("lower factor", lower),
            ("upper factor", upper),
        ];
        remark("too few levels", text, &figures)
    })
    .collect()
}

/// Parts that cover little of the tolerance.
pub(super) fn narrow_parts(material: &Material<'_>) -> Option<Remark> {
    let width = width(material)?;
    let term = material.design.part_term();
    let places = material.design.projection(term);
    let mut sums = vec![(0.0, 0.0); material.design.combinations(term)];
    for (brief, &place) in material.brief.iter().zip(&places) {
        if brief.count > 0 {
            let (sum, n) = &mut sums[place as usize];
            *sum += brief.mean;
            *n += 1.0;
        }
    }
    let means = || {
        sums.iter()
            .filter(|(_, n)| *n > 0.0)
            .map(|(sum, n)| sum / n)
    };
    let span = means().fold(f64::MIN, f64::max) - means().fold(f64::MAX, f64::min);
    let share = span / width;
    if share.is_nan() || share >= SPAN_MIN {
        return None;
    }
    let text = format!(
        "The parts span {} of the tolerance ({} of {}): the rest of it is untried, and ndc and shares of total \
         variation speak of these parts only.",
        percent(share),
        number(span),
        material.length(width),
    );
    let figures = [
        ("span of the parts", span),
        ("share of tolerance spanned", share),
    ];
    Some(remark("narrow parts", text, &figures))
}
