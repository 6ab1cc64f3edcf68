//! What is counted: a figure, its truth, the band its coverage keeps.

use restudy_engine::{Figure, Study, Tolerance};
use serde_json::Value;

use crate::plant::Plant;

/// Monte Carlo errors that a coverage may lie beyond its band.
const SLACK: f64 = 3.0;
/// What a gauge study needs to be sure of.
const USUAL: (f64, f64) = (0.94, 0.97);
/// The root method errs on the safe side.
const RATIO: (f64, f64) = (0.94, 0.975);
/// The one-sided lower limit is too high where the causes beside repeats add little.
const AT_LEAST: (f64, f64) = (0.92, 0.96);
/// Limits that the cut at 0 widens where the truth is 0.
const CUT: (f64, f64) = (0.94, 0.98);

/// A figure of a study that keeps the interaction, or of the same readings pooled above p 0.25.
type Pick = for<'a> fn(&'a Study, &'a Study) -> &'a Figure;

/// Quantity and method in the other simulation.
type Elsewhere = Option<(&'static str, &'static str)>;

/// One figure of a study and its true value.
pub(crate) struct Target {
    pub(crate) title: &'static str,
    truth: f64,
    band: (f64, f64),
    elsewhere: Elsewhere,
    figure: Pick,
    one_sided: bool,
}

impl Target {
    fn new(
        title: &'static str,
        truth: f64,
        band: (f64, f64),
        elsewhere: Elsewhere,
        figure: Pick,
    ) -> Target {
        Target {
            title,
            truth,
            band,
            elsewhere,
            figure,
            one_sided: false,
        }
    }

    /// Every figure that is counted, for a plant.
    pub(crate) fn all(plant: &Plant, tolerance: Tolerance) -> Vec<Target> {
        let width = tolerance.upper.unwrap_or(0.0) - tolerance.lower.unwrap_or(0.0);
        let (gauge, part) = (plant.gauge, plant.part);
        let mls = |quantity| Some((quantity, "mls"));
        let mut targets = vec![
            Target::new("gauge sd", gauge.sqrt(), USUAL, mls("gauge"), |kept, _| {
                &kept.figures.gauge.sd
            }),
            Target {
                one_sided: true,
                ..Target::new(
                    "gauge sd, at least",
                    gauge.sqrt(),
                    AT_LEAST,
                    None,
                    |kept, _| &kept.figures.gauge.sd,
                )
            },
            Target::new(
                "gauge share of tolerance",
                6.0 * gauge.sqrt() / width,
                USUAL,
                mls("gauge"),
                |kept, _| &kept.figures.gauge.share_of_tolerance,
            ),
            Target::new(
                "part/gauge ratio",
                part / gauge,
                RATIO,
                Some(("part_to_gauge", "mls_root")),
                |kept, _| &kept.part_to_gauge,
            ),
            Target::new(
                "gauge share of TV",
                (gauge / (gauge + part)).sqrt(),
                RATIO,
                None,
                |kept, _| &kept.figures.gauge.share_of_tv,
            ),
            Target::new(
                "gauge sd, pooled above p 0.25",
                gauge.sqrt(),
                USUAL,
                Some(("gauge", "mls_pooled_when_p_above_0.25")),
                |_, pooled| &pooled.figures.gauge.sd,
            ),
            Target::new(
                "reproducibility sd",
                plant.reproducibility.sqrt(),
                CUT,
                mls("reproducibility"),
                |kept, _| &kept.figures.reproducibility.sd,
            ),
            Target::new("part sd", part.sqrt(), CUT, mls("part"), |kept, _| {
                &kept.figures.part.sd
            }),
            Target::new(
                "total sd",
                (gauge + part).sqrt(),
                CUT,
                mls("total"),
                |kept, _| &kept.figures.total.sd,
            ),
        ];
        if let [_, appraiser, interaction, _] = &plant.variances[..] {
            targets.push(Target::new(
                "appraiser sd",
                appraiser.sqrt(),
                CUT,
                mls("appraiser"),
                |kept, _| &kept.components[1].sd,
            ));
            targets.push(Target::new(
                "part × appraiser sd",
                interaction.sqrt(),
                CUT,
                mls("interaction"),
                |kept, _| &kept.components[2].sd,
            ));
        }
        targets
    }
}

/// How often the limits of one figure held its truth.
pub(crate) struct Count {
    pub(crate) target: Target,
    studies: u32,
    /// Truth below the lower limit.
    below: u32,
    /// Truth above the upper limit.
    above: u32,
    /// Studies that state no limits.
    unstated: u32,
}

impl Count {
    pub(crate) fn new(target: Target) -> Count {
        Count {
            target,
            studies: 0,
            below: 0,
            above: 0,
            unstated: 0,
        }
    }

    /// Without an upper limit the truth lies below it; a figure without limits counts by itself.
    pub(crate) fn add(&mut self, kept: &Study, pooled: &Study) {
        let figure = (self.target.figure)(kept, pooled);
        let truth = self.target.truth;
        let rounding = 1e-12 * truth;
        let open = figure.open.map(|_| f64::INFINITY);
        let limits = match self.target.one_sided {
            true => (figure.at_least, Some(f64::INFINITY)),
            false => (figure.lower, figure.upper.or(open)),
        };
        match limits {
            (Some(lower), Some(upper)) => {
                self.studies += 1;
                self.below += u32::from(lower > truth + rounding);
                self.above += u32::from(upper < truth - rounding);
            }
            _ => self.unstated += 1,
        }
    }

    fn coverage(&self) -> f64 {
        1.0 - self.frequency(self.below + self.above)
    }

    fn frequency(&self, count: u32) -> f64 {
        f64::from(count) / f64::from(self.studies)
    }

    fn error(&self, coverage: f64) -> f64 {
        (coverage * (1.0 - coverage) / f64::from(self.studies)).sqrt()
    }

    pub(crate) fn in_words(&self) -> String {
        let unstated = match self.unstated {
            0 => String::new(),
            n => format!(
                "; none in {:.1}",
                100.0 * f64::from(n) / f64::from(n + self.studies)
            ),
        };
        format!(
            "{:.1} ± {:.2} ({:.1}, {:.1}{unstated})",
            100.0 * self.coverage(),
            100.0 * self.error(self.coverage()),
            100.0 * self.frequency(self.below),
            100.0 * self.frequency(self.above)
        )
    }

    pub(crate) fn outside_its_band(&self) -> Option<String> {
        let (low, high) = self.target.band;
        let coverage = self.coverage();
        let inside = coverage >= low - SLACK * self.error(low)
            && coverage <= high + SLACK * self.error(high);
        (!inside).then(|| {
            format!(
                "{} covers {:.2} %, expected {:.1} to {:.1} %",
                self.target.title,
                100.0 * coverage,
                100.0 * low,
                100.0 * high
            )
        })
    }

    /// Distances from the other simulation, in Monte Carlo errors of both.
    pub(crate) fn apart_from(&self, elsewhere: &Value, key: &str) -> Vec<(&'static str, f64)> {
        let Some((quantity, method)) = self.target.elsewhere else {
            return Vec::new();
        };
        let theirs = &elsewhere["results"][key][quantity][method];
        let their_studies = match method {
            "mls_root" => &elsewhere["studies_ratio_root"],
            _ => &elsewhere["studies_closed"],
        };
        let apart = |what, ours: f64| {
            let (theirs, n) = (theirs[what].as_f64()?, their_studies.as_f64()?);
            // A rare event's own frequency tells too little of its error.
            let variance = |p: f64, n: f64| (p * (1.0 - p) + 1.0 / n) / n;
            let error = (variance(theirs, n) + variance(theirs, f64::from(self.studies))).sqrt();
            Some((what, (ours - theirs).abs() / error))
        };
        [
            ("coverage", self.coverage()),
            ("true_above_upper", self.frequency(self.above)),
            ("true_below_lower", self.frequency(self.below)),
        ]
        .into_iter()
        .filter_map(|(what, ours)| apart(what, ours))
        .collect()
    }
}
