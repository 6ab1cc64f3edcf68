//! A sum of mean squares with exact rational weights over one common denominator.

/// `sum of numerators[q] × MS_q / denominator`.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Combination {
    numerators: Vec<i64>,
    denominator: usize,
}

impl Combination {
    pub(crate) fn new(numerators: Vec<i64>, denominator: usize) -> Self {
        Combination {
            numerators,
            denominator,
        }
    }

    /// Whole numerators, one a mean square.
    pub fn numerators(&self) -> &[i64] {
        &self.numerators
    }

    /// The denominator that they share.
    pub fn denominator(&self) -> usize {
        self.denominator
    }

    /// The weights as the nearest f64.
    pub fn weights(&self) -> Vec<f64> {
        self.numerators
            .iter()
            .map(|&n| n as f64 / self.denominator as f64)
            .collect()
    }

    /// Indices of the mean squares that take part.
    pub fn members(&self) -> impl Iterator<Item = usize> {
        self.numerators
            .iter()
            .enumerate()
            .filter(|&(_, &n)| n != 0)
            .map(|(q, _)| q)
    }

    /// The value for given mean squares.
    pub fn value(&self, mean_squares: &[f64]) -> f64 {
        Ready::from(self).value(mean_squares)
    }

    /// The same in lowest terms.
    fn reduced(&self) -> Combination {
        let gcd = |a: usize, b: usize| {
            let (mut a, mut b) = (a, b);
            while b != 0 {
                (a, b) = (b, a % b);
            }
            a
        };
        let numerators = self.numerators.iter();
        let common = numerators.fold(self.denominator, |a, n| gcd(a, n.unsigned_abs() as usize));
        Combination {
            numerators: self.numerators.iter().map(|n| n / common as i64).collect(),
            denominator: self.denominator / common,
        }
    }

    pub(crate) fn plus(&self, other: &Combination) -> Combination {
        self.joined(other, |a, b| a + b)
    }

    pub(crate) fn minus(&self, other: &Combination) -> Combination {
        self.joined(other, |a, b| a - b)
    }

    fn joined(&self, other: &Combination, f: impl Fn(i64, i64) -> i64) -> Combination {
        debug_assert_eq!(self.denominator, other.denominator);
        let numerators = self
            .numerators
            .iter()
            .zip(&other.numerators)
            .map(|(&a, &b)| f(a, b))
            .collect();
        Combination {
            numerators,
            denominator: self.denominator,
        }
    }
}

/// A combination ready to be worked out often: its members alone, in lowest terms, so that a difference of two mean
/// squares is rounded once.
#[derive(Debug, Clone)]
pub(crate) struct Ready {
    members: Vec<(usize, f64)>,
    denominator: f64,
}

impl From<&Combination> for Ready {
    fn from(combination: &Combination) -> Ready {
        let reduced = combination.reduced();
        let member = |q: usize| (q, reduced.numerators[q] as f64);
        Ready {
            members: reduced.members().map(member).collect(),
            denominator: reduced.denominator as f64,
        }
    }
}

impl Ready {
    pub(crate) fn value(&self, ms: &[f64]) -> f64 {
        let sum: f64 = self.members.iter().map(|&(q, n)| n * ms[q]).sum();
        sum / self.denominator
    }

    /// Whether all its mean squares are zero.
    pub(crate) fn is_zero(&self, ms: &[f64]) -> bool {
        self.members.iter().all(|&(q, _)| ms[q] == 0.0)
    }
}
