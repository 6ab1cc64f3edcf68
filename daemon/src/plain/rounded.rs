//! Numbers in words: on their own side of a limit, and never more sure than they are.

/// Decimals beyond the asked ones that are tried to keep a number on its side of a limit.
const MORE: usize = 3;
/// Numbers closer than this are the same.
const SAME: f64 = 1e-7;
/// Decimals of a percentage that is written as it was set.
const AS_SET: usize = 8;

/// Where the digits go that are not written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Rounded {
    /// To the nearest.
    Nearest,
    /// Down: a lower limit claims no more than it has.
    Down,
    /// Up: an upper limit claims no less than it has.
    Up,
}

impl Rounded {
    /// `x` with that many decimals, or as many more as keep it on its side of every limit.
    pub(crate) fn beside(self, x: f64, limits: &[f64], decimals: usize) -> String {
        let tells = |decimals: &usize| {
            let written = self.to(x, *decimals);
            limits
                .iter()
                .all(|limit| side(written, *limit) == side(x, *limit))
        };
        let most = decimals + MORE;
        let decimals = (decimals..most).find(tells).unwrap_or(most);
        format!("{:.decimals$}", self.to(x, decimals))
    }

    fn to(self, x: f64, decimals: usize) -> f64 {
        let scale = 10_f64.powi(decimals as i32);
        let scaled = scale * x;
        let whole = match self {
            Rounded::Nearest => scaled.round(),
            Rounded::Down => (scaled + SAME).floor(),
            Rounded::Up => (scaled - SAME).ceil(),
        };
        whole / scale
    }
}

/// A share or a confidence in per cent as it was set, without the sign: 0.975 is `97.5`.
pub(crate) fn percent_as_set(share: f64) -> String {
    let text = format!("{:.AS_SET$}", 100.0 * share);
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}

fn side(x: f64, limit: f64) -> i8 {
    match x - limit {
        d if d.abs() < SAME => 0,
        d if d < 0.0 => -1,
        _ => 1,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn limits_are_rounded_to_the_side_that_claims_less() {
        use Rounded::{Down, Nearest, Up};
        let table = [
            (Down, 31.7, "31"),
            (Down, 31.0, "31"),
            (Down, 100.0 * 0.29, "29"),
            (Up, 55.2, "56"),
            (Up, 100.0 * 0.07, "7"),
            (Nearest, 31.7, "32"),
            (Nearest, 30.2, "30.2"),
            (Down, 30.2, "30.2"),
            (Up, 29.96, "29.96"),
            (Up, 29.4, "29.4"),
        ];
        for (rounded, x, text) in table {
            assert_eq!(rounded.beside(x, &[30.0], 0), text, "{rounded:?} {x}");
        }
    }

    #[test]
    fn what_was_set_is_written_as_it_was_set() {
        let table = [
            (0.95, "95"),
            (0.975, "97.5"),
            (0.995, "99.5"),
            (0.99999, "99.999"),
            (0.07, "7"),
            (0.3 * 0.85, "25.5"),
        ];
        for (set, text) in table {
            assert_eq!(percent_as_set(set), text);
        }
    }
}
