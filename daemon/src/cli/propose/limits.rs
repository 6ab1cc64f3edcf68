//! Whether limits are absolute or deviations from the nominal, found by comparing them with it.

use super::number::value;
use super::roles::Shared;

/// What the limits turned out to be.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Limits {
    /// In so many rows they enclose the nominal, and in none they could be deviations only.
    Absolute(usize),
    /// In so many rows they lie about zero or far from the nominal.
    Relative(usize),
    /// In so many rows they are deviations of one sign: far from the nominal, not about zero.
    PerhapsRelative(usize),
    /// Rows of both kinds.
    Mixed,
    /// Nothing tells: there is no nominal, or both readings fit.
    Open,
}

/// Judges the limits by every row that has what is needed.
pub(super) fn judge(
    nominal: Option<&Shared>,
    lower: Option<&Shared>,
    upper: Option<&Shared>,
    mark: char,
) -> Limits {
    let Some(nominal) = nominal else {
        return Limits::Open;
    };
    let (mut absolute, mut relative, mut one_sign) = (0, 0, 0);
    for (file, nominals) in nominal.by_file.iter().enumerate() {
        let at = |spot: Option<&Shared>, row: usize| {
            let values = spot?.by_file.get(file)?;
            let row = if values.len() == nominals.len() {
                row
            } else {
                return None;
            };
            value(values.get(row)?, mark)
        };
        for (row, datum) in nominals.iter().enumerate() {
            let Some(nominal) = value(datum, mark).filter(|n| *n != 0.0) else {
                continue;
            };
            let (lower, upper) = (at(lower, row), at(upper, row));
            if lower.is_none() && upper.is_none() {
                continue;
            }
            let encloses = lower.is_none_or(|l| l <= nominal) && upper.is_none_or(|u| u >= nominal);
            let about_zero = lower.is_none_or(|l| l <= 0.0) && upper.is_none_or(|u| u >= 0.0);
            let far = |limit: f64| (limit - nominal).abs() > nominal.abs() / 2.0;
            let all_far = lower.is_none_or(far) && upper.is_none_or(far);
            let none_far = !lower.is_some_and(far) && !upper.is_some_and(far);
            match (encloses, about_zero) {
                (true, false) => absolute += 1,
                (false, true) => relative += 1,
                (true, true) if none_far => absolute += 1,
                // Wide limits about zero and the nominal: either.
                (true, true) => {}
                (false, false) if all_far => one_sign += 1,
                (false, false) => absolute += 1,
            }
        }
    }
    match (absolute, relative, one_sign) {
        (0, 0, 0) => Limits::Open,
        (n, 0, 0) => Limits::Absolute(n),
        (0, 0, n) => Limits::PerhapsRelative(n),
        (0, n, m) => Limits::Relative(n + m),
        _ => Limits::Mixed,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::cli::propose::sample::{Datum, Place};

    fn column(numbers: &[Option<f64>]) -> Shared {
        let values = numbers
            .iter()
            .map(|n| n.map_or(Datum::Blank, Datum::Number));
        Shared {
            place: Place::Column("x".into()),
            names: Vec::new(),
            by_file: vec![values.collect()],
            once: false,
            twice: false,
        }
    }

    fn judged(rows: &[(f64, Option<f64>, Option<f64>)]) -> Limits {
        let nominal = column(&rows.iter().map(|r| Some(r.0)).collect::<Vec<_>>());
        let lower = column(&rows.iter().map(|r| r.1).collect::<Vec<_>>());
        let upper = column(&rows.iter().map(|r| r.2).collect::<Vec<_>>());
        judge(Some(&nominal), Some(&lower), Some(&upper), '.')
    }

    #[test]
    fn rows_decide() {
        let both = |n, l, u| (n, Some(l), Some(u));
        assert_eq!(judged(&[both(50.0, 49.9, 50.1)]), Limits::Absolute(1));
        assert_eq!(
            judged(&[both(50.0, -0.1, 0.1), both(0.0, -0.1, 0.1)]),
            Limits::Relative(1)
        );
        assert_eq!(judged(&[(50.0, None, Some(0.1))]), Limits::Relative(1));
        assert_eq!(judged(&[(50.0, Some(49.9), None)]), Limits::Absolute(1));
        assert_eq!(
            judged(&[both(50.0, 0.01, 0.03)]),
            Limits::PerhapsRelative(1)
        );
        assert_eq!(judged(&[(50.0, None, Some(50.1))]), Limits::Absolute(1));
        assert_eq!(judged(&[both(50.0, 50.03, 50.05)]), Limits::Absolute(1));
        assert_eq!(judged(&[both(0.1, -0.5, 0.5)]), Limits::Open);
        assert_eq!(judged(&[both(0.0, -0.1, 0.1)]), Limits::Open);
        assert_eq!(
            judged(&[both(50.0, -0.1, 0.1), both(50.0, 49.9, 50.1)]),
            Limits::Mixed
        );
        assert_eq!(judge(None, None, None, '.'), Limits::Open);
    }
}
