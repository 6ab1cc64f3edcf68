//! One characteristic's study: the engine's figures, joined with the plan's tolerance and the round before.
//!
//! Not here: the ledger, messages.
//!
//! Invariant: a panic while a study is worked out is that study's fault, never a standing.

use std::panic::{AssertUnwindSafe, catch_unwind};

use jiff::civil::DateTime;
use restudy_config::{Characteristic, Plan};
use restudy_engine::{
    Context, Design, Factor, Judge, Limits, Names, PART, Remark, Settings, Standing, Tolerance,
    remarks, standing,
};
use restudy_parsers::fold;

use crate::evidence::{self, Evidence, Feature};
use crate::record::{Judgement, Record, SCHEMA};

/// What became of one characteristic.
#[derive(Debug, Clone)]
pub struct Outcome {
    /// Its label.
    pub characteristic: String,
    /// Its place in [`Evidence::features`].
    pub feature: usize,
    /// Named first in messages.
    pub special: bool,
    /// Its record, or one sentence that says why there is none.
    pub study: Result<Box<Record>, String>,
}

impl Outcome {
    /// Where it stands.
    #[must_use]
    pub fn standing(&self) -> Standing {
        self.study
            .as_ref()
            .map_or(Standing::NotJudged, |r| r.standing.now)
    }

    /// Gauge share of tolerance.
    #[must_use]
    pub fn share(&self) -> Option<f64> {
        self.study
            .as_ref()
            .ok()?
            .study
            .figures
            .gauge
            .share_of_tolerance
            .estimate
    }
}

/// Works out every characteristic of a round; `before` gives the standing in the plan's round before.
#[must_use]
pub fn work_out(
    site: &str,
    plan: &Plan,
    evidence: &Evidence,
    before: &dyn Fn(&str) -> Option<Standing>,
) -> Vec<Outcome> {
    let listed = |label: &str| {
        plan.characteristics
            .iter()
            .find(|c| fold(&c.name) == fold(label))
    };
    evidence
        .features
        .iter()
        .enumerate()
        .map(|(index, feature)| {
            let named = listed(&feature.label);
            let before = before(&feature.label);
            let guarded = AssertUnwindSafe(|| one(site, plan, evidence, feature, named, before));
            let study = catch_unwind(guarded).unwrap_or_else(|panic| Err(told(&panic)));
            Outcome {
                characteristic: feature.label.clone(),
                feature: index,
                special: named.is_some_and(|c| c.special),
                study: study.map(Box::new),
            }
        })
        .collect()
}

fn told(panic: &Box<dyn std::any::Any + Send>) -> String {
    let text = panic
        .downcast_ref::<String>()
        .map(String::as_str)
        .or_else(|| panic.downcast_ref::<&str>().copied())
        .unwrap_or("no message");
    format!("a fault of the program stopped this study ({text}); please report it")
}

fn one(
    site: &str,
    plan: &Plan,
    evidence: &Evidence,
    feature: &Feature,
    named: Option<&Characteristic>,
    before: Option<Standing>,
) -> Result<Record, String> {
    if let Some(differs) = &feature.unit_differs {
        return Err(differs.clone());
    }
    let drawing = drawing(feature, named)?;
    let limits = named.map_or(plan.limits, |c| c.limits);
    let settings = Settings {
        confidence: plan.confidence,
        spread_sds: plan.spread_sds,
        interaction: plan.interaction,
        process: named.and_then(|c| c.process).or(plan.process),
        limits: Some(limits),
        judge: plan.judge,
    };
    let design = design(evidence)?;
    let tolerance = Tolerance {
        lower: drawing.lower,
        upper: drawing.upper,
        one_sided: named.and_then(|c| c.one_sided),
    };
    let mut study = restudy_engine::analyse(
        &design,
        &feature.cells,
        &feature.values,
        &tolerance,
        &settings,
    )
    .map_err(|e| e.to_string())?;
    let context = context(evidence, feature);
    let (cells, values) = (&feature.cells, &feature.values);
    study.remarks = remarks(&design, cells, values, &study, &tolerance, &context);
    if let Some(differ) = feature
        .limits_differ
        .as_ref()
        .filter(|_| drawing.from_export)
    {
        study.remarks.push(Remark {
            kind: "limits differ",
            text: format!("{differ}; the first ones were used."),
            figures: std::collections::BTreeMap::new(),
        });
    }
    let judgement = judge(
        study.judged_share,
        &settings,
        limits,
        before,
        &study.figures.gauge.share_of_tolerance,
    );
    Ok(Record {
        schema: SCHEMA,
        site: Some(site.to_owned()),
        plan: Some(plan.name.clone()),
        round: Some(evidence.round.number),
        revision: Some(evidence.round.revision),
        instruments: evidence.instruments.clone(),
        measured: evidence.measured,
        characteristic: feature.label.clone(),
        unit: feature.unit.clone(),
        nominal: drawing.nominal,
        lower: drawing.lower,
        upper: drawing.upper,
        study,
        standing: judgement,
        readings: feature.counts,
        same: evidence.same.clone(),
        decisions: Vec::new(),
        source: evidence.source.clone(),
        engine: env!("CARGO_PKG_VERSION"),
    })
}

struct Drawing {
    nominal: Option<f64>,
    lower: Option<f64>,
    upper: Option<f64>,
    from_export: bool,
}

/// Drawing values of the plan win over the export's; a unit that differs is no drawing value.
fn drawing(feature: &Feature, named: Option<&Characteristic>) -> Result<Drawing, String> {
    let exported = Drawing {
        nominal: feature.nominal,
        lower: feature.lower,
        upper: feature.upper,
        from_export: true,
    };
    let Some(named) = named else {
        return Ok(exported);
    };
    if named.lower.is_none() && named.upper.is_none() {
        return Ok(Drawing {
            nominal: named.nominal.or(feature.nominal),
            ..exported
        });
    }
    if let (Some(planned), Some(found)) = (&named.unit, &feature.unit)
        && fold(planned) != fold(found)
    {
        return Err(format!(
            "the plan's limits are in {planned}, the readings in {found}"
        ));
    }
    Ok(Drawing {
        nominal: named.nominal.or(feature.nominal),
        lower: named.lower,
        upper: named.upper,
        from_export: false,
    })
}

/// The factors of the design: one that never varies is none.
fn studied(evidence: &Evidence) -> impl Iterator<Item = &evidence::Factor> {
    let factors = evidence.factors.iter();
    factors.filter(|f| f.name == PART || f.levels.len() > 1)
}

fn design(evidence: &Evidence) -> Result<Design, String> {
    let factors = studied(evidence)
        .map(|f| Factor::crossed(&f.name, f.levels.len()))
        .collect();
    Design::new(factors).map_err(|e| e.to_string())
}

/// What people call the places of the readings, and when each was taken.
fn context<'a>(evidence: &'a Evidence, feature: &'a Feature) -> Context<'a> {
    let runs = || feature.runs.iter().map(|&run| &evidence.runs[run]);
    Context {
        factors: studied(evidence)
            .map(|f| Names {
                word: &f.word,
                levels: f.levels.iter().map(String::as_str).collect(),
            })
            .collect(),
        taken: runs().map(|run| run.taken.map(seconds)).collect(),
        trials: runs().map(|run| run.slot).collect(),
        unit: feature.unit.as_deref(),
    }
}

/// Seconds on the clock of the instrument.
pub(crate) fn seconds(taken: DateTime) -> f64 {
    let origin = DateTime::constant(2000, 1, 1, 0, 0, 0, 0);
    taken.duration_since(origin).as_secs_f64()
}

fn judge(
    share: Option<f64>,
    settings: &Settings,
    limits: Limits,
    before: Option<Standing>,
    figure: &restudy_engine::Figure,
) -> Judgement {
    let now = standing(share, &limits, before);
    let percent = |x: f64| format!("{:.1} %", 100.0 * x);
    let (judged_by, is): (_, Box<dyn Fn(f64) -> String>) = match settings.judge {
        Judge::Estimate => (
            "estimate",
            Box::new(move |x| format!("the share is estimated at {}", percent(x))),
        ),
        Judge::Chance(p) => (
            "chance",
            Box::new(move |x| {
                format!(
                    "with {} % confidence the share is above {}",
                    100.0 * p,
                    percent(x)
                )
            }),
        ),
        Judge::Upper => (
            "upper",
            Box::new(move |x| format!("the share's upper limit is {}", percent(x))),
        ),
    };
    let (watch, act, back) = (
        percent(limits.watch),
        percent(limits.act),
        limits.back_below,
    );
    let why = match (share, now) {
        (None, _) => figure
            .why
            .as_deref()
            .unwrap_or("there is no share of tolerance")
            .to_owned(),
        (Some(share), Standing::Act) if share <= limits.act => {
            format!("{}, not yet below {back} × the act limit {act}", is(share))
        }
        (Some(share), Standing::Watch) if share <= limits.watch => {
            format!(
                "{}, not yet below {back} × the watch limit {watch}",
                is(share)
            )
        }
        (Some(share), Standing::Act) => format!("{}; the act limit is {act}", is(share)),
        (Some(share), Standing::Watch) => {
            format!(
                "{}, between the watch limit {watch} and the act limit {act}",
                is(share)
            )
        }
        (Some(share), _) => format!("{}; the watch limit is {watch}", is(share)),
    };
    Judgement {
        now,
        before,
        limits: Some(limits),
        judged_by: Some(judged_by),
        why,
    }
}
