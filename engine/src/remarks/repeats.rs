//! Cells whose repeats agree to the last digit, against how many rounding alone would make so.

use super::LEVEL;
use super::luck::at_least;
use super::material::{self, Material};
use super::step;
use crate::consistency::below_normal;
use crate::quantile::{Side, chi_square};
use crate::record::Remark;

/// The sd of repeats is taken at its lower limit of this confidence, so that luck gets its due.
const CONFIDENCE: f64 = 0.99;
/// Points of the integral to one sd or one step, whichever is shorter, and sds beyond which nothing is left.
const POINTS: f64 = 8.0;
const FAR: f64 = 8.0;
/// Cells named in the sentence.
const NAMED_MAX: usize = 3;

/// More cells than rounding explains hold one reading over and over.
pub(super) fn remark(material: &Material<'_>) -> Option<Remark> {
    let trials = material.trials().filter(|&t| t > 1)?;
    let cells = &material.brief;
    let same: Vec<usize> = (0..cells.len())
        .filter(|&c| cells[c].range == 0.0)
        .collect();
    if same.is_empty() {
        return None;
    }
    let (squares, df) = material.within();
    let chance = match step::step(&material.shifted) {
        None => 0.0,
        Some(_) if squares == 0.0 && step::hides_the_gauge(material) => 1.0,
        Some(_) if squares == 0.0 => 0.0,
        Some(step) => {
            let df = df as f64;
            let variance = squares / chi_square(Side::Below, CONFIDENCE, df) / (step * step);
            // Rounding itself adds a twelfth of a squared step.
            by_rounding((variance - 1.0 / 12.0).max(0.0).sqrt(), trials)
        }
    };
    let p = at_least(same.len(), cells.len(), chance);
    if p > LEVEL {
        return None;
    }
    let named: Vec<String> = same
        .iter()
        .take(NAMED_MAX)
        .map(|&c| material.cell(c))
        .collect();
    let which = if same.len() > NAMED_MAX {
        format!(" ({} and others)", named.join(", "))
    } else {
        format!(" ({})", named.join(", "))
    };
    let expected = chance * cells.len() as f64;
    let luck = if expected < 0.5 {
        "rounding alone would give none".to_owned()
    } else {
        format!("rounding alone would give about {expected:.0}")
    };
    let text = format!(
        "In {} of {} cells all repeats agree to the last digit{which}; {luck}. If the part stayed in place \
         between trials, the gauge held its value or values were copied, the repeatability is too good.",
        same.len(),
        cells.len(),
    );
    let figures = [
        ("cells alike", same.len() as f64),
        ("cells expected alike", expected),
        ("p", p),
    ];
    Some(material::remark("identical repeats", text, &figures))
}

/// Chance that `trials` normal readings round to the same step, their sd given in steps; the mean lies anywhere
/// between two steps with equal chance.
fn by_rounding(sd: f64, trials: usize) -> f64 {
    if sd <= 0.0 {
        return 1.0;
    }
    let h = sd.min(1.0) / POINTS;
    let reach = FAR * sd + 1.0;
    let points = (2.0 * reach / h).ceil() as usize;
    let sum: f64 = (0..=points)
        .map(|i| {
            let x = i as f64 * h - reach;
            let within = below_normal((x + 1.0) / sd) - below_normal(x / sd);
            within.powi(trials as i32)
        })
        .sum();
    (sum * h).min(1.0)
}
