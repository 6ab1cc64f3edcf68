//! Readings of a plant whose true variances are known.

use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;
use restudy_engine::{Model, WITHIN_CELLS};

use crate::settings::{Case, Variances};

/// One random effect: its sd and the level that each cell holds.
struct Effect {
    variance: f64,
    of_parts_alone: bool,
    levels: usize,
    level_of_cell: Vec<usize>,
}

/// A plant that measures one design over and over.
pub(crate) struct Plant {
    effects: Vec<Effect>,
    repeatability_sd: f64,
    /// The cell of each reading.
    pub(crate) cells: Vec<usize>,
    pub(crate) part: f64,
    pub(crate) reproducibility: f64,
    pub(crate) gauge: f64,
    /// True variance of each line, the error last.
    pub(crate) variances: Vec<f64>,
}

impl Plant {
    pub(crate) fn new(case: &Case, variances: Variances) -> Plant {
        let model = Model::full(&case.design, case.trials);
        let variance = |name: &str| {
            let stated = variances.iter().find(|(line, _)| *line == name);
            stated.map_or(0.0, |(_, variance)| *variance)
        };
        let factors = case.design.factors();
        let mut effects = Vec::new();
        for line in model
            .lines()
            .iter()
            .filter(|line| line.name != WITHIN_CELLS)
        {
            let holds = |name: &String| line.of.contains(name) || line.within.contains(name);
            let level = |cell: usize| {
                let levels = case.design.levels_of(cell);
                (factors.iter().zip(levels))
                    .filter(|(factor, _)| holds(&factor.name))
                    .fold(0, |level, (factor, l)| level * factor.levels + l)
            };
            effects.push(Effect {
                variance: variance(&line.name),
                of_parts_alone: line.of == ["part"],
                levels: line.cells,
                level_of_cell: (0..case.design.cells()).map(level).collect(),
            });
        }
        let (parts, causes): (Vec<&Effect>, Vec<&Effect>) =
            effects.iter().partition(|effect| effect.of_parts_alone);
        let sum = |effects: &[&Effect]| effects.iter().map(|effect| effect.variance).sum::<f64>();
        let (part, reproducibility) = (sum(&parts), sum(&causes));
        let of_lines: Vec<f64> = model
            .lines()
            .iter()
            .map(|line| variance(&line.name))
            .collect();
        Plant {
            effects,
            repeatability_sd: variance(WITHIN_CELLS).sqrt(),
            cells: (0..case.design.cells() * case.trials)
                .map(|reading| reading / case.trials)
                .collect(),
            part,
            gauge: reproducibility + variance(WITHIN_CELLS),
            reproducibility,
            variances: of_lines,
        }
    }

    /// The readings of one study.
    pub(crate) fn measure(&self, chance: &mut Xoshiro256PlusPlus) -> Vec<f64> {
        let mut normal = || -> f64 { StandardNormal.sample(chance) };
        let mut readings = vec![0.0; self.cells.len()];
        for effect in self.effects.iter().filter(|effect| effect.variance > 0.0) {
            let levels: Vec<f64> = (0..effect.levels)
                .map(|_| effect.variance.sqrt() * normal())
                .collect();
            for (reading, &cell) in readings.iter_mut().zip(&self.cells) {
                *reading += levels[effect.level_of_cell[cell]];
            }
        }
        for reading in &mut readings {
            *reading += self.repeatability_sd * normal();
        }
        readings
    }
}
