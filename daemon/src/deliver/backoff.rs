//! When a failed try is repeated: soon at first, then at doubling distances up to a longest one.

use std::time::Duration;

use sha2::{Digest, Sha256};

/// First and longest wait between two tries.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Backoff {
    /// After the first failure.
    pub first: Duration,
    /// However many failures there were.
    pub longest: Duration,
}

impl Backoff {
    /// The wait after so many failures in a row, one or more.
    #[must_use]
    pub fn wait(&self, failures: u32) -> Duration {
        let doublings = failures.saturating_sub(1).min(31);
        self.first.saturating_mul(1 << doublings).min(self.longest)
    }

    /// [`wait`](Self::wait) and up to a quarter more, by the message: so messages that failed together do not come
    /// back together, and one that keeps failing leaves the next probe to another.
    #[must_use]
    pub fn wait_of(&self, failures: u32, key: &str) -> Duration {
        let wait = self.wait(failures);
        let digest = Sha256::digest(key.as_bytes());
        wait + wait.mul_f64((f64::from(digest[0]) + 1.0) / 1024.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const BACKOFF: Backoff = Backoff {
        first: Duration::from_secs(60),
        longest: Duration::from_secs(30 * 60),
    };

    #[test]
    fn one_two_four_up_to_thirty_minutes() {
        let minutes: Vec<u64> = (1..=8).map(|n| BACKOFF.wait(n).as_secs() / 60).collect();
        assert_eq!(minutes, [1, 2, 4, 8, 16, 30, 30, 30]);
        assert_eq!(BACKOFF.wait(u32::MAX), BACKOFF.longest);
    }

    #[test]
    fn a_message_waits_longer_by_at_most_a_quarter_and_always_the_same() {
        let waits: Vec<Duration> = (0..50)
            .map(|n| BACKOFF.wait_of(3, &format!("<{n}@halden.example>")))
            .collect();
        let least = BACKOFF.wait(3);
        assert!(
            waits
                .iter()
                .all(|w| *w > least && *w <= least.mul_f64(1.25)),
            "{waits:?}"
        );
        assert!(
            waits
                .iter()
                .collect::<std::collections::BTreeSet<_>>()
                .len()
                > 25
        );
        assert_eq!(waits[7], BACKOFF.wait_of(3, "<7@halden.example>"));
    }
}
