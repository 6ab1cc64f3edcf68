//! When a file is worth reading: its size and times have held still long enough.
//!
//! Model: a table from path to how the file looked last and since when it has looked so, driven by the
//! caller's clock that only goes forward; setting the wall clock cannot settle a file early.
//!
//! Not here: the disk.

use std::collections::HashMap;
use std::time::Duration;

use crate::ledger::Stat;

/// An empty file often is one about to be written; it is believed to be empty only after this long.
pub const EMPTY_GRACE: Duration = Duration::from_secs(10);

/// Watches files become quiet.
#[derive(Debug)]
pub struct Settler {
    after: Duration,
    watched: HashMap<Vec<u8>, Quiet>,
}

#[derive(Debug)]
struct Quiet {
    stat: Stat,
    since: Duration,
    looked: Duration,
}

impl Settler {
    /// Files must hold still for `after`.
    #[must_use]
    pub fn new(after: Duration) -> Self {
        Self {
            after,
            watched: HashMap::new(),
        }
    }

    /// Notes how a file looks; true once it has held still long enough.
    pub fn observe(&mut self, path: &[u8], stat: Stat, uptime: Duration) -> bool {
        let quiet = self.watched.entry(path.to_vec()).or_insert(Quiet {
            stat,
            since: uptime,
            looked: uptime,
        });
        if quiet.stat != stat {
            quiet.stat = stat;
            quiet.since = uptime;
        }
        quiet.looked = uptime;
        uptime.saturating_sub(quiet.since) >= needed(self.after, stat)
    }

    /// The file was dealt with, or changed while it was read: waiting starts over if it comes back.
    pub fn forget(&mut self, path: &[u8]) {
        self.watched.remove(path);
    }

    /// Forgets the files that this look did not find.
    pub fn keep_only_seen_at(&mut self, uptime: Duration) {
        self.watched.retain(|_, quiet| quiet.looked == uptime);
    }

    /// When the next file will have settled if nothing changes.
    #[must_use]
    pub fn next_due(&self) -> Option<Duration> {
        self.watched
            .values()
            .map(|q| q.since + needed(self.after, q.stat))
            .min()
    }
}

fn needed(after: Duration, stat: Stat) -> Duration {
    if stat.size == 0 {
        after.max(EMPTY_GRACE)
    } else {
        after
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn look(size: u64, mtime: i64) -> Stat {
        Stat {
            size,
            mtime,
            ctime: mtime,
            device: 1,
            inode: 1,
        }
    }

    fn secs(s: u64) -> Duration {
        Duration::from_secs(s)
    }

    #[test]
    fn growing_again_restarts_the_wait() {
        let mut settler = Settler::new(secs(30));
        assert!(!settler.observe(b"a", look(10, 1), secs(0)));
        assert!(!settler.observe(b"a", look(20, 1), secs(29)));
        assert!(!settler.observe(b"a", look(20, 1), secs(58)));
        assert!(settler.observe(b"a", look(20, 1), secs(59)));
    }

    #[test]
    fn a_touch_backwards_in_time_is_a_change_too() {
        let mut settler = Settler::new(secs(3));
        settler.observe(b"a", look(10, 9), secs(0));
        assert!(!settler.observe(b"a", look(10, 2), secs(3)));
        assert!(settler.observe(b"a", look(10, 2), secs(6)));
    }

    #[test]
    fn an_empty_file_waits_longer() {
        let mut settler = Settler::new(secs(1));
        settler.observe(b"a", look(0, 1), secs(0));
        assert!(!settler.observe(b"a", look(0, 1), secs(9)));
        assert!(settler.observe(b"a", look(0, 1), secs(10)));
    }

    #[test]
    fn a_file_that_vanished_starts_over() {
        let mut settler = Settler::new(secs(3));
        settler.observe(b"a", look(1, 1), secs(0));
        settler.observe(b"b", look(1, 1), secs(1));
        settler.keep_only_seen_at(secs(1));
        assert_eq!(settler.next_due(), Some(secs(4)));
        assert!(!settler.observe(b"a", look(1, 1), secs(5)));
    }
}
