//! The risks of one study with their limits.

use std::borrow::Cow;

use super::guard::{Guarded, guarded};
use super::misclassification::{Judged, Misclassification, misclassification};
use crate::figure::{Bounds, Figure};
use crate::figures::{ALL_EQUAL, Evidence, GAUGE_ZERO, NOT_APART};
use crate::limits::MANY_CROSSED;
use crate::record::{ConsumerRisk, ProducerRisk, Risk, RiskProcess};
use crate::settings::Process;
use crate::tolerance::Share;

/// Joint consumer's risks that guarded limits are given for: 100, 10 and 1 in a million.
const WANTED: [f64; 3] = [1e-4, 1e-5, 1e-6];
/// A drawn gauge sd below this share of the estimated one counts as this share.
const GAUGE_SD_LEAST: f64 = 1e-12;
const FIGURES: usize = 8;

const NO_LIMITS: &str = "the characteristic has no tolerance";
const NEVER: &str = "the condition has a probability of zero";

/// What a study estimates that risks are made from; variances in squared reading units.
pub(crate) struct Spreads<'a> {
    pub(crate) mean: f64,
    pub(crate) part: Option<f64>,
    pub(crate) gauge: Option<f64>,
    pub(crate) all_equal: bool,
    pub(crate) share: &'a Share,
}

/// Risks under a named process, with generalized limits.
pub(crate) fn of_study(evidence: &Evidence<'_>, process: Process, grand_mean: f64) -> Risk {
    let spreads = Spreads {
        mean: grand_mean,
        part: evidence.estimates.part,
        gauge: evidence.estimates.gauge,
        all_equal: evidence.all_equal,
        share: evidence.share,
    };
    of_estimates(&spreads, process, |judged| {
        limits(evidence, process, judged)
    })
}

/// Risks under a named process, with limits from elsewhere or a reason why there are none.
pub(crate) fn of_estimates(
    spreads: &Spreads<'_>,
    process: Process,
    limits: impl FnOnce(&Judged) -> Result<[Bounds; FIGURES], &'static str>,
) -> Risk {
    let (from, mean, sd) = match process {
        Process::Stated { mean, sd } => ("stated", Some(mean), Some(sd)),
        Process::StudyParts => (
            "study parts",
            Some(spreads.mean),
            spreads.part.map(f64::sqrt),
        ),
    };
    let named = RiskProcess {
        from,
        mean: mean.filter(|x| x.is_finite()),
        sd: sd.filter(|x| x.is_finite()),
    };
    let risks = judged(spreads, process, &named).and_then(|judged| {
        let risks = misclassification(&judged).ok_or_else(|| out_of_order(&judged))?;
        Ok((judged, risks))
    });
    match risks {
        Err(why) => record(named, std::array::from_fn(|_| Figure::absent(why.clone()))),
        Ok((judged, risks)) => Risk {
            guarded: guard_bands(&judged, &risks),
            ..record(named, with_limits(&risks, limits(&judged)))
        },
    }
}

/// The process, the gauge and the limits, or why they do not make a risk.
fn judged(
    spreads: &Spreads<'_>,
    process: Process,
    named: &RiskProcess,
) -> Result<Judged, Cow<'static, str>> {
    let share = spreads.share;
    if share.lower.is_none() && share.upper.is_none() {
        return Err(NO_LIMITS.into());
    }
    if spreads.all_equal {
        return Err(ALL_EQUAL.into());
    }
    let gauge = spreads.gauge.ok_or(NOT_APART)?;
    if gauge == 0.0 {
        return Err(GAUGE_ZERO.into());
    }
    if let Process::Stated { mean, sd } = process
        && !(mean.is_finite() && sd.is_finite() && sd > 0.0)
    {
        return Err(format!(
            "the process has mean {mean} and sd {sd}; expected numbers, the sd above zero"
        )
        .into());
    }
    Ok(Judged {
        mean: named.mean.ok_or(NOT_APART)?,
        part_sd: named.sd.ok_or(NOT_APART)?,
        gauge_sd: gauge.sqrt(),
        lower: share.lower,
        upper: share.upper,
    })
}

fn out_of_order(judged: &Judged) -> Cow<'static, str> {
    match (judged.lower, judged.upper) {
        (Some(lower), Some(upper)) if lower >= upper => {
            format!("the upper limit {upper} is not above the lower limit {lower}").into()
        }
        _ => "the limits are too large to be worked with".into(),
    }
}

fn guard_bands(judged: &Judged, risks: &Misclassification) -> Vec<Guarded> {
    WANTED
        .into_iter()
        .filter(|&wanted| risks.consumer_joint > wanted)
        .filter_map(|wanted| guarded(judged, wanted))
        .collect()
}

fn with_limits(
    risks: &Misclassification,
    limits: Result<[Bounds; FIGURES], &'static str>,
) -> [Figure; FIGURES] {
    let estimates = in_order(risks);
    std::array::from_fn(|i| match (estimates[i], &limits) {
        (None, _) => Figure::absent(NEVER),
        (Some(estimate), Err(why)) => Figure::without_limits(estimate, *why),
        (Some(estimate), Ok(limits)) => Figure::new(estimate, limits[i]),
    })
}

/// Percentiles of the risks over draws of the gauge, and of the process where the study estimates it.
fn limits(
    evidence: &Evidence<'_>,
    process: Process,
    judged: &Judged,
) -> Result<[Bounds; FIGURES], &'static str> {
    let basis = evidence.basis;
    if basis.model.crossed() > 2 {
        return Err(MANY_CROSSED);
    }
    let (draws, ms, q) = (evidence.draws(), evidence.ms, &basis.quantities);
    let gauge = q.gauge.as_ref().ok_or(NOT_APART)?;
    let gauges = draws.all(|first, out| draws.divisor(&gauge.weights, ms, first, out));
    let least = GAUGE_SD_LEAST * judged.gauge_sd;
    let with_gauge = |gauge: f64| Judged {
        gauge_sd: gauge.max(0.0).sqrt().max(least),
        ..*judged
    };
    let mut drawn: [Vec<f64>; FIGURES] = std::array::from_fn(|_| Vec::with_capacity(gauges.len()));
    let mut keep = |judged: &Judged| {
        for (values, value) in drawn.iter_mut().zip(in_order(&judged.quickly())) {
            values.push(value.unwrap_or_default());
        }
    };
    match process {
        Process::Stated { .. } => gauges.iter().for_each(|&g| keep(&with_gauge(g))),
        Process::StudyParts => {
            let part = q.part.as_ref().ok_or(NOT_APART)?;
            let parts = draws.all(|first, out| draws.variance(&part.weights, ms, first, out));
            let spread = &basis.variance_of_mean;
            let means = draws.all(|first, out| draws.mean(judged.mean, spread, ms, first, out));
            for ((&gauge, part), mean) in gauges.iter().zip(parts).zip(means) {
                keep(&Judged {
                    mean,
                    part_sd: part.sqrt(),
                    ..with_gauge(gauge)
                });
            }
        }
    }
    Ok(drawn.map(|values| {
        evidence.percentiles(|first, out| out.copy_from_slice(&values[first..first + out.len()]))
    }))
}

fn in_order(risks: &Misclassification) -> [Option<f64>; FIGURES] {
    [
        Some(risks.bad),
        Some(risks.accepted),
        Some(risks.producer_joint),
        risks.producer_given_good,
        risks.producer_given_rejected,
        Some(risks.consumer_joint),
        risks.consumer_given_bad,
        risks.consumer_given_accepted,
    ]
}

fn record(process: RiskProcess, figures: [Figure; FIGURES]) -> Risk {
    let [
        bad,
        accepted,
        joint_p,
        given_good,
        given_rejected,
        joint_c,
        given_bad,
        given_accepted,
    ] = figures;
    Risk {
        process,
        bad,
        accepted,
        producer: ProducerRisk {
            joint: joint_p,
            given_good,
            given_rejected,
        },
        consumer: ConsumerRisk {
            joint: joint_c,
            given_bad,
            given_accepted,
        },
        guarded: Vec::new(),
    }
}
