//! How long the numbers of one characteristic take, beside general-purpose peers, in CPU time.
//!
//! One characteristic is 10 parts × 3 appraisers × 3 trials. The closed-form numbers are 27: mean squares, their p,
//! components, variances, and 95 % limits of repeatability, gauge, part, total and reproducibility; the peers of
//! `tests/bench` work out the same. Draws are 10,000, the same for all characteristics.
//!
//! `cargo bench -p restudy-engine --bench speed`; a peer whose program is missing is named and left out. `PYTHON` and
//! `RSCRIPT` name other programs than `python3` (with numpy and scipy) and `Rscript`.

#![allow(clippy::print_stdout)] // the ratios are what it is run for

mod peers;
mod readings;
mod tally;

use std::hint::black_box;

use criterion::Criterion;
use restudy_engine::{
    Design, Factor, Glance, Interaction, Interval, Judge, Limits, Prepared, Quantity, Settings,
    Simulation, Tolerance,
};

use peers::Peer;
use readings::{APPRAISERS, CHARACTERISTICS, PARTS, READINGS, TRIALS};
use tally::Tally;

/// Characteristics that are drawn for or written out in full in one pass.
const FEW: usize = 200;
/// Characteristics that R's `aov` works out in one pass.
const FEW_FOR_R: usize = 50;
const DRAWS: u32 = 10_000;

fn main() {
    let values = readings::simulated();
    let file = readings::written(&values);
    let prepared = prepared();
    let mut criterion = Criterion::default()
        .sample_size(10)
        .warm_up_time(std::time::Duration::from_millis(500))
        .measurement_time(std::time::Duration::from_secs(3))
        .configure_from_args();
    let mut tally = Tally::default();

    let mut glance = prepared.glance();
    tally.ours(&mut criterion, "closed form", CHARACTERISTICS, || {
        for block in black_box(&values).chunks_exact(READINGS) {
            black_box(closed_form(&mut glance, block));
        }
    });
    let numpy = Peer::python("numpy", file.path(), CHARACTERISTICS);
    tally.peer(&mut criterion, "closed form", numpy);
    let r = Peer::r("aov", file.path(), FEW_FOR_R);
    tally.peer(&mut criterion, "closed form", r);

    tally.ours(&mut criterion, "mean squares", CHARACTERISTICS, || {
        for block in black_box(&values).chunks_exact(READINGS) {
            glance.take(block).expect("readings");
            black_box(glance.mean_squares());
        }
    });
    tally.ours(
        &mut criterion,
        "one pass over the readings",
        CHARACTERISTICS,
        || {
            for block in black_box(&values).chunks_exact(READINGS) {
                black_box(block.iter().sum::<f64>());
            }
        },
    );

    let cells: Vec<usize> = (0..READINGS).map(|i| i / TRIALS).collect();
    let tolerance = Tolerance {
        lower: Some(24.9),
        upper: Some(25.1),
        one_sided: None,
    };
    tally.ours(&mut criterion, "whole record", FEW, || {
        for block in black_box(&values).chunks_exact(READINGS).take(FEW) {
            black_box(prepared.study(&cells, block, &tolerance).expect("a study"));
        }
    });

    let drawing = self::prepared().simulated(Simulation {
        draws: DRAWS,
        seed: 1,
    });
    let mut glance = drawing.glance();
    tally.ours(&mut criterion, "shared draws", FEW, || {
        for block in black_box(&values).chunks_exact(READINGS).take(FEW) {
            black_box(drawn(&mut glance, block));
        }
    });
    let shared = Peer::python("draws-shared", file.path(), FEW);
    tally.peer(&mut criterion, "shared draws", shared);
    tally.print();
}

fn prepared() -> Prepared {
    let factors = vec![
        Factor::crossed("part", PARTS),
        Factor::crossed("appraiser", APPRAISERS),
    ];
    let design = Design::new(factors).expect("a design");
    let settings = Settings {
        confidence: 0.95,
        spread_sds: 6.0,
        interaction: Interaction::Keep,
        process: None,
        limits: Some(Limits {
            watch: 0.1,
            act: 0.3,
            back_below: 0.85,
        }),
        judge: Judge::Estimate,
    };
    Prepared::new(&design, TRIALS, &settings).expect("settings")
}

/// The 27 numbers, added up so that none is left out.
fn closed_form(glance: &mut Glance<'_>, readings: &[f64]) -> f64 {
    glance.take(readings).expect("readings");
    let mean_squares: f64 = glance.mean_squares().iter().sum();
    let tests: f64 = (0..3).filter_map(|line| glance.p(line)).sum();
    let components: f64 = (0..4).filter_map(|line| glance.component(line)).sum();
    let [between, gauge, total] = [Quantity::Reproducibility, Quantity::Gauge, Quantity::Total]
        .map(|quantity| glance.estimate(quantity).expect("a figure"));
    let limits = [
        (Quantity::Repeatability, Interval::Exact),
        (Quantity::Gauge, Interval::Mls),
        (Quantity::Total, Interval::Mls),
        (Quantity::Part, Interval::Mls),
        (Quantity::Gauge, Interval::Satterthwaite),
        (Quantity::Reproducibility, Interval::Satterthwaite),
    ];
    let limits: f64 = limits
        .into_iter()
        .filter_map(|(quantity, by)| glance.limits(quantity, by))
        .map(|(lower, upper)| lower + upper)
        .sum();
    mean_squares + tests + components + between + gauge + total + gauge / total + limits
}

/// 95 % limits of six figures from the same draws for all characteristics.
fn drawn(glance: &mut Glance<'_>, readings: &[f64]) -> f64 {
    glance.take(readings).expect("readings");
    [
        Quantity::Repeatability,
        Quantity::Reproducibility,
        Quantity::Gauge,
        Quantity::Part,
        Quantity::Total,
        Quantity::PartToGauge,
    ]
    .into_iter()
    .filter_map(|quantity| glance.limits(quantity, Interval::Generalized))
    .map(|(lower, upper)| lower + upper)
    .sum()
}
