//! What each took in this run, and the ratios.

use std::time::Duration;

use criterion::Criterion;
use rustix::time::{ClockId, clock_gettime};

use crate::peers::Peer;

#[derive(Default)]
pub(crate) struct Tally {
    rows: Vec<Row>,
}

struct Row {
    work: &'static str,
    by: String,
    micros: f64,
}

impl Tally {
    /// Times `pass` over `count` characteristics.
    pub(crate) fn ours(
        &mut self,
        criterion: &mut Criterion,
        work: &'static str,
        count: usize,
        mut pass: impl FnMut(),
    ) {
        let passes = |n: u64| {
            let start = cpu();
            (0..n).for_each(|_| pass());
            cpu() - start
        };
        self.time(criterion, work, "restudy".to_owned(), count, passes);
    }

    /// Times a peer at the same work; nothing when it is missing.
    pub(crate) fn peer(
        &mut self,
        criterion: &mut Criterion,
        work: &'static str,
        peer: Option<Peer>,
    ) {
        if let Some(mut peer) = peer {
            let (name, count) = (peer.name.clone(), peer.count);
            self.time(criterion, work, name, count, |n| {
                peer.passes(n).expect("an answer from the peer")
            });
        }
    }

    fn time(
        &mut self,
        criterion: &mut Criterion,
        work: &'static str,
        by: String,
        count: usize,
        mut passes: impl FnMut(u64) -> Duration,
    ) {
        let mut micros = Vec::new();
        criterion.bench_function(&format!("{work} by {by}, {count} characteristics"), |b| {
            b.iter_custom(|n| {
                let taken = passes(n);
                micros.push(taken.as_secs_f64() * 1e6 / n as f64 / count as f64);
                taken
            });
        });
        micros.sort_by(f64::total_cmp);
        if let Some(&micros) = micros.get(micros.len() / 2) {
            self.rows.push(Row { work, by, micros });
        }
    }

    /// CPU time of one characteristic, median of the run, and as a multiple of ours.
    pub(crate) fn print(&self) {
        println!("{:<28}{:<14}{:>12}{:>10}", "work", "by", "CPU µs", "× ours");
        for row in &self.rows {
            let ours = self.rows.iter().find(|r| r.work == row.work);
            let ratio = row.micros / ours.map_or(row.micros, |r| r.micros);
            let Row { work, by, micros } = row;
            println!("{work:<28}{by:<14}{micros:>12.3}{ratio:>10.2}");
        }
    }
}

/// CPU time of this process.
fn cpu() -> Duration {
    let now = clock_gettime(ClockId::ProcessCPUTime);
    Duration::new(now.tv_sec.unsigned_abs(), now.tv_nsec.unsigned_abs() as u32)
}
