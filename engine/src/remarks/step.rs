//! The step of the readings, and whether it is too coarse for the gauge or the tolerance.

use super::material::{self, Material};
use super::scope::width;
use super::words::percent;
use crate::record::Remark;

/// Fewer distinct readings than this say nothing about spread.
const DISTINCT_MIN: usize = 5;
/// A step above this part of the tolerance, or of six gauge sd, is too coarse.
const SHARE_MAX: f64 = 0.1;
const SPREAD_SDS: f64 = 6.0;
/// Two readings may stand up to this many steps apart, so that no step is the smallest gap.
const GAP_MAX: u32 = 5;
/// Readings without a step fit one of this many steps in their range by rounding alone.
const STEPS_MAX: f64 = 1e6;
/// How far, in steps, a reading may lie off the step that it belongs to.
const OFF_STEP: f64 = 1e-3;

/// The readings show too few steps to tell a spread from rounding.
pub(super) fn remark(material: &Material<'_>) -> Option<Remark> {
    if too_few_values(material) {
        let distinct = sorted(material.values).len();
        let values = if distinct == 1 { "value" } else { "values" };
        let text = format!(
            "All {} readings take only {distinct} different {values}: the steps are too coarse to show a spread. \
             Export more digits or use a finer gauge.",
            material.values.len()
        );
        let figures = [("different values", distinct as f64)];
        return Some(material::remark("coarse steps", text, &figures));
    }
    let step = step(&material.shifted)?;
    let of_gauge = step / (SPREAD_SDS * gauge_sd(material)?);
    let of_tolerance = width(material).map(|width| step / width);
    let too_coarse = if of_tolerance.is_some_and(|share| share > SHARE_MAX) {
        format!("{} of the tolerance", percent(of_tolerance?))
    } else if of_gauge > SHARE_MAX {
        if of_gauge.is_finite() {
            format!("{} of six gauge sd", percent(of_gauge))
        } else {
            "more than the gauge spreads".to_owned()
        }
    } else {
        return None;
    };
    let text = format!(
        "The readings come in steps of {}, {too_coarse}; a tenth is the most that lets rounding pass unseen. Rounding \
         alone is an sd of {}.",
        material.length(step),
        material.length(step / 12.0_f64.sqrt()),
    );
    let figures = [
        ("step", step),
        ("step of tolerance", of_tolerance.unwrap_or(f64::NAN)),
        ("step of six gauge sd", of_gauge),
    ];
    Some(material::remark("coarse steps", text, &figures))
}

/// Whether the step alone can hide the repeats' spread from the gauge's.
pub(super) fn hides_the_gauge(material: &Material<'_>) -> bool {
    let sd = gauge_sd(material).unwrap_or(0.0);
    step(&material.shifted).is_some_and(|step| step > SHARE_MAX * SPREAD_SDS * sd)
}

fn gauge_sd(material: &Material<'_>) -> Option<f64> {
    material.study.figures.gauge.sd.estimate
}

/// What rounding alone may add to a difference of two readings, per reading: twice a twelfth of a squared step. A
/// variance seen below it says nothing about the spread before rounding.
pub(super) fn least_variance(material: &Material<'_>) -> f64 {
    step(&material.shifted).map_or(0.0, |step| step * step / 6.0)
}

/// Whether the readings take too few values to say anything about spread.
pub(super) fn too_few_values(material: &Material<'_>) -> bool {
    sorted(material.values).len() < DISTINCT_MIN
}

fn sorted(values: &[f64]) -> Vec<f64> {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted.dedup();
    sorted
}

/// The largest step that all differences between readings are whole multiples of; `None` when there is none to see.
pub(super) fn step(values: &[f64]) -> Option<f64> {
    let sorted = sorted(values);
    let first = *sorted.first()?;
    let range = sorted.last()? - first;
    // Rounding of the subtraction makes gaps of its own.
    let noise = range / STEPS_MAX;
    let gaps = sorted.windows(2).map(|pair| pair[1] - pair[0]);
    let smallest = gaps
        .filter(|&gap| gap > noise)
        .fold(f64::INFINITY, f64::min);
    let fits = |step: &f64| {
        let off = |y: &f64| {
            let steps = (y - first) / step;
            (steps - steps.round()).abs()
        };
        range / step <= STEPS_MAX && sorted.iter().all(|y| off(y) <= OFF_STEP)
    };
    if !smallest.is_finite() {
        return None;
    }
    (1..=GAP_MAX)
        .map(|parts| smallest / f64::from(parts))
        .find(fits)
}
