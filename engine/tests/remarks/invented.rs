//! Invented studies from a seed: part × appraiser, every run with its time, runs in random order.

use restudy_engine::{
    Context, Design, Factor, Interaction, Judge, Names, Prepared, Remark, Settings, Study,
    Tolerance, remarks,
};

pub(crate) const APPRAISERS: [&str; 4] = ["KL", "MO", "TS", "AB"];
/// Seconds from one run to the next.
pub(crate) const PACE: f64 = 240.0;

/// SplitMix64 (Steele, Lea & Flood 2014); normal values by Box & Muller 1958.
pub(crate) struct Chance(pub(crate) u64);

impl Chance {
    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ z >> 30).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ z >> 27).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ z >> 31
    }

    fn uniform(&mut self) -> f64 {
        ((self.next() >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    }

    pub(crate) fn normal(&mut self) -> f64 {
        let radius = (-2.0 * self.uniform().ln()).sqrt();
        radius * (std::f64::consts::TAU * self.uniform()).cos()
    }

    pub(crate) fn shuffle<T>(&mut self, items: &mut [T]) {
        for i in (1..items.len()).rev() {
            items.swap(i, (self.next() % (i as u64 + 1)) as usize);
        }
    }
}

/// True spreads (sd) in reading units.
#[derive(Clone, Copy)]
pub(crate) struct Truth {
    pub(crate) part: f64,
    pub(crate) appraiser: f64,
    pub(crate) interaction: f64,
    pub(crate) repeat: f64,
}

/// Parts 10, repeats 1, nothing else.
pub(crate) const REPEATABILITY_ALONE: Truth = Truth {
    part: 10.0,
    appraiser: 0.0,
    interaction: 0.0,
    repeat: 1.0,
};

/// Readings of parts × appraisers × trials, cell by cell.
#[derive(Clone)]
pub(crate) struct Plant {
    pub(crate) parts: usize,
    pub(crate) appraisers: usize,
    pub(crate) trials: usize,
    pub(crate) cells: Vec<usize>,
    pub(crate) slots: Vec<usize>,
    pub(crate) taken: Vec<f64>,
    pub(crate) values: Vec<f64>,
}

impl Plant {
    pub(crate) fn new(seed: u64, shape: [usize; 3], truth: Truth) -> Plant {
        let [parts, appraisers, trials] = shape;
        let mut chance = Chance(seed);
        let mut effects =
            |n: usize, sd: f64| -> Vec<f64> { (0..n).map(|_| sd * chance.normal()).collect() };
        let part = effects(parts, truth.part);
        let appraiser = effects(appraisers, truth.appraiser);
        let cell = effects(parts * appraisers, truth.interaction);
        let repeat = effects(parts * appraisers * trials, truth.repeat);
        let rows = 0..parts * appraisers * trials;
        let cells: Vec<usize> = rows.clone().map(|row| row / trials).collect();
        let values = rows.clone().map(|row| {
            let c = cells[row];
            500.0 + part[c / appraisers] + appraiser[c % appraisers] + cell[c] + repeat[row]
        });
        let values = values.collect();
        let mut order: Vec<usize> = rows.clone().collect();
        chance.shuffle(&mut order);
        Plant {
            parts,
            appraisers,
            trials,
            slots: rows.map(|row| row % trials).collect(),
            taken: order.iter().map(|&place| place as f64 * PACE).collect(),
            cells,
            values,
        }
    }

    /// Row of a reading; all counted from 0.
    pub(crate) fn row(&self, part: usize, appraiser: usize, trial: usize) -> usize {
        (part * self.appraisers + appraiser) * self.trials + trial
    }

    pub(crate) fn rounded(mut self, step: f64) -> Plant {
        self.values
            .iter_mut()
            .for_each(|y| *y = (*y / step).round() * step);
        self
    }

    pub(crate) fn design(&self) -> Design {
        Design::new(vec![
            Factor::crossed("part", self.parts),
            Factor::crossed("appraiser", self.appraisers),
        ])
        .unwrap()
    }

    pub(crate) fn prepared(&self) -> Prepared {
        Prepared::new(&self.design(), self.trials, &settings()).unwrap()
    }

    pub(crate) fn remarks(&self, tolerance: &Tolerance) -> Vec<Remark> {
        self.remarks_with(&self.prepared(), tolerance)
    }

    pub(crate) fn remarks_with(&self, prepared: &Prepared, tolerance: &Tolerance) -> Vec<Remark> {
        let study = prepared
            .study(&self.cells, &self.values, tolerance)
            .unwrap();
        self.remarks_on(&study, tolerance)
    }

    fn remarks_on(&self, study: &Study, tolerance: &Tolerance) -> Vec<Remark> {
        let parts: Vec<String> = (1..=self.parts).map(|i| format!("P{i:02}")).collect();
        let context = Context {
            factors: vec![
                Names {
                    word: "part",
                    levels: parts.iter().map(String::as_str).collect(),
                },
                Names {
                    word: "loading",
                    levels: APPRAISERS[..self.appraisers].to_vec(),
                },
            ],
            taken: self.taken.iter().map(|&t| Some(t)).collect(),
            trials: self.slots.clone(),
            unit: Some("µm"),
        };
        let design = self.design();
        remarks(
            &design,
            &self.cells,
            &self.values,
            study,
            tolerance,
            &context,
        )
    }

    pub(crate) fn shuffled(&self, seed: u64) -> Plant {
        let mut order: Vec<usize> = (0..self.values.len()).collect();
        Chance(seed).shuffle(&mut order);
        Plant {
            cells: order.iter().map(|&row| self.cells[row]).collect(),
            slots: order.iter().map(|&row| self.slots[row]).collect(),
            taken: order.iter().map(|&row| self.taken[row]).collect(),
            values: order.iter().map(|&row| self.values[row]).collect(),
            ..self.clone()
        }
    }
}

pub(crate) fn settings() -> Settings {
    Settings {
        confidence: 0.95,
        spread_sds: 6.0,
        interaction: Interaction::Keep,
        process: None,
        limits: None,
        judge: Judge::Estimate,
    }
}

pub(crate) fn two_sided(lower: f64, upper: f64) -> Tolerance {
    Tolerance {
        lower: Some(lower),
        upper: Some(upper),
        one_sided: None,
    }
}

/// The kinds, in the order given.
pub(crate) fn kinds(remarks: &[Remark]) -> Vec<&'static str> {
    remarks.iter().map(|r| r.kind).collect()
}
