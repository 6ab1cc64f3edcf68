//! The planned design as rounds see it: factors with their levels, and how a run's labels find their level.

use std::collections::BTreeSet;

use restudy_config::{FactorLevels, Plan};
use restudy_parsers::{fold, nearest};

use crate::ledger::RunFacts;

/// The factors of a plan in the order part, appraiser, further factors.
#[derive(Debug, Clone)]
pub struct Frame {
    /// Never empty; the first is the part.
    pub factors: Vec<FrameFactor>,
    /// Runs a cell.
    pub trials: usize,
    /// The characteristics that a run must hold, folded; `None`: all that any run of the round holds.
    pub whole_list: Option<BTreeSet<String>>,
    /// A round not complete by then is closed, in ms.
    pub finish_within: Option<i64>,
}

/// One factor of a [`Frame`].
#[derive(Debug, Clone)]
pub struct FrameFactor {
    /// `part`, `appraiser`, or the further factor's name.
    pub name: String,
    /// What the plant calls it.
    pub word: String,
    /// Its levels.
    pub levels: FactorLevels,
}

/// A label that no level has.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Unknown {
    /// One sentence, with the nearest name where one is near.
    pub reason: String,
}

impl Frame {
    /// The frame of a plan.
    #[must_use]
    pub fn of(plan: &Plan) -> Self {
        let factor = |name: &str, word: &str, levels: &FactorLevels| FrameFactor {
            name: name.into(),
            word: word.into(),
            levels: levels.clone(),
        };
        let mut factors = vec![factor("part", "part", &plan.parts)];
        if let Some(appraisers) = &plan.appraisers {
            factors.push(factor("appraiser", &appraisers.word, &appraisers.levels));
        }
        factors.extend(
            plan.factors
                .iter()
                .map(|f| factor(&f.name, &f.name, &f.levels)),
        );
        Self {
            factors,
            trials: plan.trials as usize,
            whole_list: plan
                .whole_list
                .then(|| plan.characteristics.iter().map(|c| fold(&c.name)).collect()),
            finish_within: plan
                .finish_within
                .and_then(|d| i64::try_from(d.as_millis()).ok()),
        }
    }

    /// Number of cells.
    #[must_use]
    pub fn cells(&self) -> usize {
        self.factors.iter().map(|f| f.planned()).product()
    }

    /// A run's level names in factor order: the plan's spelling where the plan names them.
    ///
    /// # Errors
    /// A label that the plan does not know, or a factor that the export does not name.
    pub fn names(&self, facts: &RunFacts) -> Result<Vec<String>, Unknown> {
        self.factors
            .iter()
            .map(|factor| factor.name_of(factor.label(facts)))
            .collect()
    }
}

impl FrameFactor {
    /// How many levels the plan has.
    #[must_use]
    pub fn planned(&self) -> usize {
        match &self.levels {
            FactorLevels::Count(n) => *n,
            FactorLevels::Named(names) => names.len(),
        }
    }

    fn label<'a>(&self, facts: &'a RunFacts) -> Option<&'a str> {
        match self.name.as_str() {
            "part" => Some(&facts.part),
            "appraiser" => facts.appraiser.as_deref(),
            other => facts.factors.get(other).map(String::as_str),
        }
    }

    fn name_of(&self, label: Option<&str>) -> Result<String, Unknown> {
        let Some(label) = label.filter(|l| !l.trim().is_empty()) else {
            return Err(Unknown {
                reason: format!("the export names no {}", self.word),
            });
        };
        let FactorLevels::Named(levels) = &self.levels else {
            return Ok(label.trim().to_owned());
        };
        let folded = fold(label);
        let known = levels.iter().flat_map(|l| {
            std::iter::once(&l.name)
                .chain(&l.spellings)
                .map(move |s| (s.as_str(), l.name.as_str()))
        });
        if let Some((_, name)) = known.clone().find(|(spelling, _)| fold(spelling) == folded) {
            return Ok(name.to_owned());
        }
        let likely = nearest(label, known.clone().map(|(spelling, _)| spelling));
        let nearest = likely
            .and_then(|s| known.clone().find(|(spelling, _)| *spelling == s))
            .map(|(_, name)| name);
        let names: Vec<&str> = levels.iter().map(|l| l.name.as_str()).collect();
        let list = match names.len() {
            0..=12 => names.join(", "),
            n => format!("{} … {} ({n} names)", names[0], names[n - 1]),
        };
        let near = nearest
            .map(|name| format!("; perhaps {name}?"))
            .unwrap_or_default();
        Err(Unknown {
            reason: format!("{} `{label}` is not in the plan ({list}){near}", self.word),
        })
    }
}
