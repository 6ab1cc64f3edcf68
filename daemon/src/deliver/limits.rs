//! How long delivery waits for what.

use std::time::Duration;

use super::backoff::Backoff;

/// Time limits of delivery.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Limits {
    /// For the mail server, step by step.
    pub steps: Steps,
    /// For saying goodbye.
    pub goodbye: Duration,
    /// For a mail under way when the service stops.
    pub stop: Duration,
    /// After a fault of the ledger or its disk.
    pub after_fault: Duration,
    /// Between tries.
    pub backoff: Backoff,
}

/// How long the mail server may be silent at each step.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Steps {
    /// For each of the server's addresses to take the connection.
    pub connect: Duration,
    /// From our call to the end of the greeting, encryption from the first byte included.
    pub greeting: Duration,
    /// For STARTTLS, for the login, for `MAIL` and for `RCPT`.
    pub command: Duration,
    /// For `DATA`.
    pub data: Duration,
    /// From the first byte of the content to the answer to the final dot: three minutes to write it, and ten for
    /// the server, which may look through the mail before it answers. Giving up earlier doubles mails.
    pub content: Duration,
}

/// The limits of the service. Those for the mail server: RFC 5321 §4.5.3.2, which has none for the connection.
pub const LIMITS: Limits = Limits {
    steps: Steps {
        connect: Duration::from_secs(60),
        greeting: minutes(5),
        command: minutes(5),
        data: minutes(2),
        content: minutes(3 + 10),
    },
    goodbye: Duration::from_secs(2),
    stop: Duration::from_secs(3),
    after_fault: Duration::from_secs(5),
    backoff: Backoff {
        first: Duration::from_secs(60),
        longest: minutes(30),
    },
};

const fn minutes(n: u64) -> Duration {
    Duration::from_secs(60 * n)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// RFC 5321 §4.5.3.2.1 to .6, in minutes.
    #[test]
    fn the_server_gets_the_time_that_the_standard_gives_it() {
        let (greeting, mail, rcpt, data, block, final_dot) = (5, 5, 5, 2, 3, 10);
        let steps = LIMITS.steps;
        assert!(steps.greeting >= minutes(greeting));
        assert!(steps.command >= minutes(mail) && steps.command >= minutes(rcpt));
        assert!(steps.data >= minutes(data));
        assert!(steps.content >= minutes(block) + minutes(final_dot));
    }
}
