//! Invented readings from a seed.

use restudy_engine::{Design, Factor};

/// Readings with the cells they lie in.
#[derive(Debug, Clone)]
pub(crate) struct Readings {
    pub(crate) design: Design,
    pub(crate) cells: Vec<usize>,
    pub(crate) values: Vec<f64>,
}

/// SplitMix64 (Steele, Lea & Flood 2014).
struct Chance(u64);

impl Chance {
    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ z >> 30).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ z >> 27).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ z >> 31
    }

    /// Sum of twelve uniforms less six: nearly standard normal.
    fn normal(&mut self) -> f64 {
        (0..12)
            .map(|_| (self.next() >> 11) as f64 / (1u64 << 53) as f64)
            .sum::<f64>()
            - 6.0
    }

    fn shuffle<T>(&mut self, items: &mut [T]) {
        for i in (1..items.len()).rev() {
            items.swap(i, (self.next() % (i as u64 + 1)) as usize);
        }
    }
}

/// Part × appraiser, effects of sd 8, 2 and 1, repeats of sd 1.
pub(crate) fn crossed(seed: u64, parts: usize, appraisers: usize, trials: usize) -> Readings {
    simulated(
        seed,
        vec![
            Factor::crossed("part", parts),
            Factor::crossed("appraiser", appraisers),
        ],
        trials,
    )
}

/// Part × appraiser × fixture, 6 × 3 × 2, two trials.
pub(crate) fn three_factors(seed: u64) -> Readings {
    let factors = vec![
        Factor::crossed("part", 6),
        Factor::crossed("appraiser", 3),
        Factor::crossed("fixture", 2),
    ];
    simulated(seed, factors, 2)
}

/// Main effects (8 for the part, 2 for others), a cell effect of 0.5 and repeats of 1, in multiples of 2⁻¹⁰.
pub(crate) fn simulated(seed: u64, factors: Vec<Factor>, trials: usize) -> Readings {
    let mut chance = Chance(seed);
    let design = Design::new(factors).unwrap();
    let effects: Vec<Vec<f64>> = design
        .factors()
        .iter()
        .map(|f| {
            (0..f.levels)
                .map(|_| chance.normal() * if f.name == "part" { 8.0 } else { 2.0 })
                .collect()
        })
        .collect();
    let (mut cells, mut values) = (Vec::new(), Vec::new());
    for cell in 0..design.cells() {
        let main: f64 = effects
            .iter()
            .zip(design.levels_of(cell))
            .map(|(effects, level)| effects[level])
            .sum();
        let own = 0.5 * chance.normal();
        for _ in 0..trials {
            cells.push(cell);
            values.push(((main + own + chance.normal()) * 1024.0).round() / 1024.0);
        }
    }
    Readings {
        design,
        cells,
        values,
    }
}

impl Readings {
    pub(crate) fn shuffled(&self, seed: u64) -> Readings {
        let mut rows: Vec<(usize, f64)> = self
            .cells
            .iter()
            .copied()
            .zip(self.values.iter().copied())
            .collect();
        Chance(seed).shuffle(&mut rows);
        let (cells, values) = rows.into_iter().unzip();
        Readings {
            design: self.design.clone(),
            cells,
            values,
        }
    }

    /// Every crossed factor's levels under other numbers.
    pub(crate) fn relabelled(&self, seed: u64) -> Readings {
        let mut chance = Chance(seed);
        let orders: Vec<Vec<usize>> = self
            .design
            .factors()
            .iter()
            .map(|f| {
                let mut order: Vec<usize> = (0..f.levels).collect();
                chance.shuffle(&mut order);
                order
            })
            .collect();
        let renamed = |&cell: &usize| {
            let levels = self.design.levels_of(cell);
            let places = self.design.factors().iter().zip(&orders).zip(levels);
            places.fold(0, |cell, ((f, order), level)| {
                cell * f.levels + order[level]
            })
        };
        Readings {
            cells: self.cells.iter().map(renamed).collect(),
            ..self.clone()
        }
    }

    /// Readings that follow from the levels of their cell alone.
    pub(crate) fn by_levels(&self, f: impl Fn(&[usize]) -> f64) -> Readings {
        let value = |&cell: &usize| f(&self.design.levels_of(cell));
        Readings {
            values: self.cells.iter().map(value).collect(),
            ..self.clone()
        }
    }

    pub(crate) fn mapped(&self, f: impl Fn(f64) -> f64) -> Readings {
        Readings {
            values: self.values.iter().map(|&y| f(y)).collect(),
            ..self.clone()
        }
    }
}
