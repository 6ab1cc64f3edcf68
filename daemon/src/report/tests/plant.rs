//! Rounds of an invented plant, drawn from stated sds with a fixed sequence of numbers.

use std::collections::BTreeMap;

use restudy_config::{Appraisers, Characteristic, FactorLevels, Plan};
use restudy_engine::{Interaction, Judge, Limits, OneSided, Standing};

use crate::analyse::study::work_out;
use crate::analyse::worked::Worked;
use crate::evidence::{Evidence, Factor, Feature, Run};
use crate::ledger::{Earlier, RoundRow, RoundState, StudyRow};
use crate::record::{Counts, Measured, Source};

const LIMITS: Limits = Limits {
    watch: 0.10,
    act: 0.30,
    back_below: 0.85,
};

/// A round to be.
pub(in crate::report) struct Plant {
    pub(in crate::report) plan: Plan,
    pub(in crate::report) parts: usize,
    pub(in crate::report) readers: Vec<String>,
    pub(in crate::report) trials: usize,
    pub(in crate::report) drawn: Vec<Drawn>,
    pub(in crate::report) not_used: Vec<String>,
    /// Makes the first characteristic impossible to study.
    pub(in crate::report) fault: Option<String>,
}

/// A characteristic with the sds that its readings are drawn from, in mm.
#[derive(Clone)]
pub(in crate::report) struct Drawn {
    pub(in crate::report) label: String,
    pub(in crate::report) unit: Option<String>,
    pub(in crate::report) nominal: Option<f64>,
    pub(in crate::report) lower: Option<f64>,
    pub(in crate::report) upper: Option<f64>,
    pub(in crate::report) one_sided: Option<OneSided>,
    pub(in crate::report) centre: f64,
    pub(in crate::report) part: f64,
    /// What the last reader adds.
    pub(in crate::report) reader: f64,
    pub(in crate::report) repeat: f64,
}

impl Drawn {
    pub(in crate::report) fn named(label: &str) -> Drawn {
        Drawn {
            label: label.into(),
            unit: Some("mm".into()),
            nominal: Some(50.0),
            lower: Some(49.95),
            upper: Some(50.05),
            one_sided: None,
            centre: 50.003,
            part: 0.012,
            reader: 0.0,
            repeat: 0.0022,
        }
    }
}

impl Plant {
    /// Ten parts, three loadings, three trials, four characteristics, the first with an offset of one loading.
    pub(in crate::report) fn halden() -> Plant {
        let bore = Drawn {
            lower: Some(49.987),
            upper: Some(50.014),
            centre: 50.001,
            part: 0.004,
            reader: 0.0024,
            repeat: 0.0008,
            ..Drawn::named("bore A")
        };
        let height = Drawn {
            nominal: Some(22.5),
            lower: Some(22.4),
            upper: Some(22.6),
            centre: 22.51,
            part: 0.03,
            repeat: 0.0051,
            ..Drawn::named("height B")
        };
        let slot = Drawn {
            nominal: Some(8.0),
            lower: Some(7.95),
            upper: Some(8.05),
            centre: 8.003,
            repeat: 0.0011,
            ..Drawn::named("slot width")
        };
        let flatness = Drawn {
            nominal: None,
            lower: None,
            upper: Some(0.08),
            centre: 0.03,
            part: 0.006,
            repeat: 0.001,
            ..Drawn::named("face C flatness")
        };
        Plant {
            plan: plan(),
            parts: 10,
            readers: ["KL", "MO", "TS"].map(String::from).to_vec(),
            trials: 3,
            drawn: vec![bore, height, slot, flatness],
            not_used: vec!["P04 MO of 2026-06-02 09:40: surplus: its cell has three runs".into()],
            fault: None,
        }
    }

    /// The round, worked out as a first one.
    pub(in crate::report) fn worked(&self) -> Worked {
        self.with_earlier(BTreeMap::new())
    }

    /// The round, worked out after one in which a characteristic stood so.
    pub(in crate::report) fn worked_after(
        &self,
        label: &str,
        standing: Standing,
        share: f64,
    ) -> Worked {
        let study = StudyRow {
            round: 6,
            revision: 1,
            characteristic: label.into(),
            record: "{}".into(),
            share: Some(share),
            standing,
        };
        self.with_earlier(BTreeMap::from([(
            label.into(),
            Earlier {
                number: 6,
                closed: 1_772_539_200_000,
                study,
            },
        )]))
    }

    /// The round with one value for every characteristic, from levels and trial.
    pub(in crate::report) fn worked_with(&self, value: &dyn Fn(&[usize], usize) -> f64) -> Worked {
        let mut evidence = self.evidence();
        let values: Vec<f64> = evidence
            .runs
            .iter()
            .map(|run| value(&run.levels, run.slot))
            .collect();
        evidence
            .features
            .iter_mut()
            .for_each(|feature| feature.values.clone_from(&values));
        self.work(evidence, BTreeMap::new())
    }

    fn with_earlier(&self, earlier: BTreeMap<String, Earlier>) -> Worked {
        self.work(self.evidence(), earlier)
    }

    pub(in crate::report) fn work(
        &self,
        evidence: Evidence,
        earlier: BTreeMap<String, Earlier>,
    ) -> Worked {
        let plan = Plan {
            characteristics: self.drawn.iter().map(characteristic).collect(),
            ..self.plan.clone()
        };
        let outcomes = work_out("Halden Pump Works", &plan, &evidence, &|label| {
            earlier.get(label).map(|e| e.study.standing)
        });
        Worked {
            evidence,
            outcomes,
            earlier,
        }
    }

    pub(in crate::report) fn evidence(&self) -> Evidence {
        let readers = self.readers.len();
        let at = |minutes: i32| {
            jiff::civil::date(2026, 6, 1).at(7, 30, 0, 0) + jiff::Span::new().minutes(minutes)
        };
        let mut runs = Vec::new();
        for slot in 0..self.trials {
            for cell in 0..self.parts * readers {
                let taken = Some(at(15 * runs.len() as i32));
                runs.push(Run {
                    levels: vec![cell / readers, cell % readers],
                    cell,
                    slot,
                    taken,
                });
            }
        }
        let mut normal = Normal(20_260_601);
        let features = self.drawn.iter().enumerate().map(|(i, d)| {
            self.feature(
                d,
                &runs,
                &mut normal,
                self.fault.as_ref().filter(|_| i == 0),
            )
        });
        let features = features.collect();
        let measured = runs
            .first()
            .and_then(|r| r.taken)
            .zip(runs.last().and_then(|r| r.taken));
        Evidence {
            round: round(&self.plan.name),
            instruments: vec!["bridge-1".into()],
            factors: vec![
                Factor {
                    name: "part".into(),
                    word: "part".into(),
                    levels: (1..=self.parts).map(|i| format!("P{i:02}")).collect(),
                },
                Factor {
                    name: "appraiser".into(),
                    word: "loading".into(),
                    levels: self.readers.clone(),
                },
            ],
            trials: self.trials,
            runs,
            features,
            same: BTreeMap::from([("program".into(), vec!["hub rev 12".into()])]),
            source: (1..=3)
                .map(|i| Source {
                    export: format!("bridge-1/GRR/run-{i:03}.xlsx"),
                    sha256: "ab".repeat(32),
                })
                .collect(),
            measured: measured.map(|(first, last)| Measured { first, last }),
            not_used: self.not_used.clone(),
        }
    }

    fn feature(
        &self,
        drawn: &Drawn,
        runs: &[Run],
        normal: &mut Normal,
        fault: Option<&String>,
    ) -> Feature {
        let parts: Vec<f64> = (0..self.parts)
            .map(|_| drawn.part * normal.next())
            .collect();
        let last = self.readers.len() - 1;
        let value = |run: &Run, normal: &mut Normal| {
            let offset = if run.levels[1] == last {
                drawn.reader
            } else {
                0.0
            };
            drawn.centre + parts[run.levels[0]] + offset + drawn.repeat * normal.next()
        };
        let values: Vec<f64> = runs.iter().map(|run| value(run, normal)).collect();
        Feature {
            label: drawn.label.clone(),
            unit: drawn.unit.clone(),
            nominal: drawn.nominal,
            lower: drawn.lower,
            upper: drawn.upper,
            cells: runs.iter().map(|r| r.cell).collect(),
            runs: (0..runs.len()).collect(),
            counts: Counts {
                used: values.len(),
                surplus: 1,
                ..Counts::default()
            },
            values,
            unit_differs: fault.cloned(),
            limits_differ: None,
        }
    }
}

pub(in crate::report) fn plan() -> Plan {
    let names = ["KL", "MO", "TS"].map(|name| restudy_config::Label {
        name: name.into(),
        spellings: Vec::new(),
    });
    Plan {
        name: "impeller hub".into(),
        instruments: vec!["bridge-1".into()],
        only: None,
        parts: FactorLevels::Count(10),
        appraisers: Some(Appraisers {
            levels: FactorLevels::Named(names.to_vec()),
            word: "loading".into(),
        }),
        trials: 3,
        factors: Vec::new(),
        interaction: Interaction::Keep,
        spread_sds: 6.0,
        confidence: 0.95,
        finish_within: None,
        repeat_every: None,
        limits: LIMITS,
        judge: Judge::Estimate,
        process: None,
        characteristics: Vec::new(),
        whole_list: false,
    }
}

fn characteristic(drawn: &Drawn) -> Characteristic {
    Characteristic {
        name: drawn.label.clone(),
        nominal: None,
        lower: None,
        upper: None,
        unit: None,
        one_sided: drawn.one_sided,
        special: drawn.label == "height B",
        limits: LIMITS,
        process: None,
    }
}

fn round(plan: &str) -> RoundRow {
    RoundRow {
        id: 7,
        plan: plan.into(),
        number: 7,
        label: None,
        state: RoundState::Complete,
        reason: None,
        opened: Some(1_780_300_000_000),
        closed: Some(1_780_410_000_000),
        through: None,
        revision: 1,
        analysed: 1,
        reported: 0,
    }
}

/// Numbers that are nearly normal: the sum of twelve from a linear congruence, less six.
struct Normal(u64);

impl Normal {
    fn next(&mut self) -> f64 {
        let uniform = || {
            self.0 = self
                .0
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            (self.0 >> 11) as f64 / (1u64 << 53) as f64
        };
        std::iter::repeat_with(uniform).take(12).sum::<f64>() - 6.0
    }
}
