//! Invented readings: spreads that differ from one characteristic to the next, so that degrees of freedom to match do too.

use std::io::Write;

use rand::{RngExt, SeedableRng};
use rand_distr::StandardNormal;
use rand_xoshiro::Xoshiro256PlusPlus;
use tempfile::NamedTempFile;

pub(crate) const CHARACTERISTICS: usize = 10_000;
pub(crate) const PARTS: usize = 10;
pub(crate) const APPRAISERS: usize = 3;
pub(crate) const TRIALS: usize = 3;
pub(crate) const READINGS: usize = PARTS * APPRAISERS * TRIALS;

/// One characteristic after another, part by part, appraiser by appraiser, trial by trial.
pub(crate) fn simulated() -> Vec<f64> {
    let mut random = Xoshiro256PlusPlus::seed_from_u64(3);
    let mut noise = || -> f64 { random.sample(StandardNormal) };
    let mut values = Vec::with_capacity(CHARACTERISTICS * READINGS);
    for c in 0..CHARACTERISTICS {
        let people = 1e-3 * (c % 7) as f64;
        let repeats = 1e-3 * (1 + c % 11) as f64;
        let appraisers: Vec<f64> = (0..APPRAISERS).map(|_| people * noise()).collect();
        for _ in 0..PARTS {
            let part = 25.0 + 1e-2 * noise();
            for appraiser in &appraisers {
                let cell = part + appraiser + 1e-3 * noise();
                values.extend((0..TRIALS).map(|_| cell + repeats * noise()));
            }
        }
    }
    values
}

/// The same as little-endian doubles, for peers.
pub(crate) fn written(values: &[f64]) -> NamedTempFile {
    let mut file = NamedTempFile::new().expect("a temporary file");
    let bytes: Vec<u8> = values.iter().flat_map(|y| y.to_le_bytes()).collect();
    file.write_all(&bytes).expect("room on the disk");
    file
}
