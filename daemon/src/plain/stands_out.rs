//! Whether one level of a factor stands out from the others.

/// The others lie within this part of its distance from them.
const OTHERS_WITHIN: f64 = 0.5;

/// The level that stands out, with its distance from the mean of the others; `None` when none does, as with two
/// levels, of which each is as far from the other.
pub(crate) fn stands_out(means: &[f64]) -> Option<(usize, f64)> {
    if means.len() < 3 {
        return None;
    }
    let others = |level: usize| {
        let others = means.iter().enumerate().filter(move |(l, _)| *l != level);
        others.map(|(_, mean)| *mean)
    };
    let (level, by) = (0..means.len())
        .map(|level| {
            let mean = others(level).sum::<f64>() / (means.len() - 1) as f64;
            (level, means[level] - mean)
        })
        .reduce(|a, b| if b.1.abs() > a.1.abs() { b } else { a })?;
    let range = others(level).fold(f64::MIN, f64::max) - others(level).fold(f64::MAX, f64::min);
    (by != 0.0 && range <= OTHERS_WITHIN * by.abs()).then_some((level, by))
}

#[cfg(test)]
mod tests {
    use super::stands_out;

    #[test]
    fn one_level_stands_out_only_when_the_others_keep_together() {
        assert_eq!(stands_out(&[0.0, 0.0, 2.4]), Some((2, 2.4)));
        assert_eq!(stands_out(&[-3.0, 1.0, 0.0]), Some((0, -3.5)));
        assert_eq!(stands_out(&[-10.0, 0.0, 10.0]), None);
        assert_eq!(stands_out(&[0.0, 0.0, 0.0]), None);
        assert_eq!(stands_out(&[0.0, 5.0]), None);
    }
}
