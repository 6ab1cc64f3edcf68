//! The study of unequal cells.

use std::collections::BTreeMap;

use crate::design::Design;
use crate::fault::StudyError;
use crate::figures::ndc;
use crate::model::Model;
use crate::pooling::Pooled;
use crate::quantile::chi_square_above;
use crate::record::{ChanceAbove, InteractionChoice, Layout, OtherReading, Remark, Risk, Study};
use crate::remarks::outside::{self, one_trial};
use crate::risk::{Spreads, of_estimates};
use crate::settings::{Interaction, Judge, Process, Settings, Tolerance};
use crate::study::check;
use crate::tolerance::Share;

use super::bootstrap::SEED;
use super::fit::{Fit, NoFit};
use super::limits::Limits;
use super::reduced::Reduced;
use super::written::Reml;

const RISK_LIMITS: &str = "limits of risks need equal numbers of readings in all cells";

/// One study's readings under one design.
struct Bench<'a> {
    design: &'a Design,
    reduced: &'a Reduced,
    settings: &'a Settings,
}

/// Works out a study whose cells hold `counts` readings, not all the same number.
pub(crate) fn study(
    design: &Design,
    counts: Vec<usize>,
    cells: &[usize],
    values: &[f64],
    tolerance: &Tolerance,
    settings: &Settings,
) -> Result<Study, StudyError> {
    let trials = counts.iter().copied().max().unwrap_or(0);
    check(design, trials, settings)?;
    let reduced = Reduced::new(counts, cells, values)?;
    let bench = Bench {
        design,
        reduced: &reduced,
        settings,
    };
    let full = Fit::new(design, Model::estimable(design, trials), &reduced)?;
    let (taken_in, chosen) = bench.pooled(&full)?;
    let kept_all = chosen.is_none();
    let fit = chosen.as_ref().unwrap_or(&full);
    let share = Share::of(tolerance, settings, fit.mean);
    let limits = Limits::new(fit, reduced.scale, settings.confidence, &share);
    let figures = limits.figures();
    let part_to_gauge = limits.part_to_gauge();
    let layout = layout(design, trials, &reduced.counts);
    let statistic = bench.largest_interaction(&full);
    let judged = &figures.gauge.share_of_tolerance;
    let drawn = limits.draws.as_ref().ok();
    Ok(Study {
        tolerance_rule: share.rule,
        method: "reml",
        confidence: settings.confidence,
        spread_sds: settings.spread_sds,
        interaction: InteractionChoice {
            kept: !fit.model.interactions().is_empty(),
            p: statistic.map(p_of_interaction),
            pool_above: match settings.interaction {
                Interaction::Keep => None,
                Interaction::PoolAbove(p) => Some(p),
            },
            other_reading: bench.other_reading(&full, kept_all, &share),
        },
        mean_squares: Vec::new(),
        reml: Some(Reml {
            interaction_statistic: statistic,
            bootstrap: limits.gauge_by_bootstrap(),
            ..Reml::of(fit, reduced.scale)
        }),
        ndc: ndc(&part_to_gauge),
        risk: settings
            .process
            .map(|process| risk(&limits, process, &share)),
        chance_above: chance_above(&limits, settings, judged.estimate),
        remarks: remarks(&full.model, design, &layout)
            .into_iter()
            .chain(terms_pooled(settings, &taken_in, &full.model, &fit.model))
            .collect(),
        draws: drawn.map(|draws| draws.len() as u32),
        seed: drawn.map(|_| SEED),
        grand_mean: fit.mean,
        judged_share: match settings.judge {
            Judge::Estimate => judged.estimate,
            Judge::Chance(p) => judged
                .estimate
                .and_then(|share| lower_at(&limits, share, p)),
            Judge::Upper => judged.upper,
        },
        components: limits.components(),
        design: layout,
        figures,
        part_to_gauge,
    })
}

impl Bench<'_> {
    fn without(&self, model: &Model, dropped: &[usize]) -> Result<Fit, NoFit> {
        Fit::new(
            self.design,
            model.without(self.design, dropped),
            self.reduced,
        )
    }

    /// What is pooled, largest interaction first, and the fit after it; `None` when nothing is pooled.
    fn pooled(&self, full: &Fit) -> Result<(Vec<Pooled>, Option<Fit>), NoFit> {
        let mut taken_in = Vec::new();
        let Interaction::PoolAbove(limit) = self.settings.interaction else {
            return Ok((taken_in, None));
        };
        let mut chosen: Option<Fit> = None;
        loop {
            let now = chosen.as_ref().unwrap_or(full);
            let mut next = None;
            for line in now.model.interactions() {
                if !now.model.is_outermost(line) {
                    continue;
                }
                let fewer = self.without(&now.model, &[line])?;
                let p = statistic(now, &fewer).map(p_of_interaction);
                if let Some(p) = p.filter(|p| *p > limit) {
                    let name = now.model.lines()[line].name.clone();
                    taken_in.push(Pooled { name, p });
                    next = Some(fewer);
                    break;
                }
            }
            match next {
                Some(fewer) => chosen = Some(fewer),
                None => return Ok((taken_in, chosen)),
            }
        }
    }

    /// Twice the log likelihood that the largest interaction adds.
    fn largest_interaction(&self, full: &Fit) -> Option<f64> {
        let line = *full.model.interactions().first()?;
        statistic(full, &self.without(&full.model, &[line]).ok()?)
    }

    fn other_reading(&self, full: &Fit, kept_all: bool, share: &Share) -> Option<OtherReading> {
        let interactions = full.model.interactions();
        if interactions.is_empty() {
            return None;
        }
        let pooled = kept_all.then(|| self.without(&full.model, &interactions));
        let other = match &pooled {
            None => Some(full),
            Some(fit) => fit.as_ref().ok(),
        };
        let gauge = |fit: &Fit| {
            let error = fit.components.len() - 1;
            let members = fit.model.reproducibility().chain([error]);
            members.map(|i| fit.components[i]).sum::<f64>().sqrt() * self.reduced.scale
        };
        let gauge_sd = other.map(gauge);
        let per_sd = share
            .per_sd
            .as_ref()
            .ok()
            .filter(|_| !self.reduced.all_equal());
        Some(OtherReading {
            gauge_sd,
            share_of_tolerance: gauge_sd.zip(per_sd).map(|(sd, per_sd)| sd * per_sd),
        })
    }
}

fn statistic(more: &Fit, fewer: &Fit) -> Option<f64> {
    let gain = 2.0 * (more.log_likelihood()? - fewer.log_likelihood()?);
    Some(gain.max(0.0))
}

/// Half the tail of chi-square with one degree of freedom: the component lies on the edge of its range.
///
/// Self & Liang, *J. Amer. Statist. Assoc.* 82 (1987) 605–610.
fn p_of_interaction(statistic: f64) -> f64 {
    0.5 * chi_square_above(statistic, 1.0)
}

fn risk(limits: &Limits<'_>, process: Process, share: &Share) -> Risk {
    let spreads = Spreads {
        mean: limits.fit.mean,
        part: limits.part_variance(),
        gauge: limits.gauge_variance(),
        all_equal: limits.all_equal(),
        share,
    };
    of_estimates(&spreads, process, |_| Err(RISK_LIMITS))
}

/// The one-sided lower limit of the share at a confidence.
fn lower_at(limits: &Limits<'_>, share: f64, confidence: f64) -> Option<f64> {
    let quotients = limits.gauge_quotients().ok()?;
    Some(share / quotients.percentile(confidence))
}

fn chance_above(limits: &Limits<'_>, settings: &Settings, share: Option<f64>) -> ChanceAbove {
    let above = || {
        let (share, limits_of_share) = (share?, settings.limits?);
        let quotients = limits.gauge_quotients().ok()?;
        let above = |limit: f64| Some(quotients.probability(share / limit));
        Some(ChanceAbove {
            watch: above(limits_of_share.watch),
            act: above(limits_of_share.act),
        })
    };
    above().unwrap_or_default()
}

fn layout(design: &Design, trials: usize, counts: &[usize]) -> Layout {
    let readings = counts.iter().sum();
    Layout {
        factors: design.factors().to_vec(),
        trials,
        cells: counts.len(),
        readings,
        missing: counts.len() * trials - readings,
        balanced: false,
    }
}

/// Names the terms pooled, where there was more than one to pool.
fn terms_pooled(
    settings: &Settings,
    taken_in: &[Pooled],
    full: &Model,
    left: &Model,
) -> Option<Remark> {
    match settings.interaction {
        Interaction::PoolAbove(limit) if full.interactions().len() > 1 => {
            outside::terms_pooled(limit, taken_in, &left.interaction_names())
        }
        _ => None,
    }
}

fn remarks(model: &Model, design: &Design, layout: &Layout) -> Vec<Remark> {
    let text = format!(
        "{} of {} readings are missing: the components are those of largest likelihood, and their limits are approximate. With few levels beside the parts, upper limits lie too low. \
         Equal repeats, cells that stand out and levels that read apart were not looked for, which takes equally \
         many readings in every cell.",
        layout.missing,
        layout.missing + layout.readings
    );
    let figures = [
        ("missing", layout.missing as f64),
        ("readings", layout.readings as f64),
    ];
    let unequal = Remark {
        kind: "readings missing",
        text,
        figures: BTreeMap::from(figures.map(|(key, x)| (key.to_owned(), x))),
    };
    let one_trial = model.taken_in_by_error(design).as_deref().map(one_trial);
    [unequal].into_iter().chain(one_trial).collect()
}
