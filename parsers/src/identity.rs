//! Which run a record says it belongs to.

use std::collections::BTreeMap;

use crate::fault::Fault;
use crate::grid::{Content, Field};
use crate::parsed::Run;
use crate::reader::{Roles, TrialBy};

/// The run that a record says it belongs to.
pub(crate) struct Identity {
    /// As far as it could be read; `None` without a part.
    pub(crate) run: Option<Run>,
    /// The first label that could not be read.
    pub(crate) fault: Option<Fault>,
}

impl Identity {
    pub(crate) fn read(roles: &Roles, fields: &[Field<'_>]) -> Self {
        let mut fault = None;
        let mut keep = |fresh: Fault| {
            fault.get_or_insert(fresh);
        };
        let mut label = |source: usize| match roles.sources[source].label(fields[source]) {
            Ok(label) => Some(label),
            Err(fresh) => {
                keep(fresh);
                None
            }
        };
        let part = label(roles.part);
        let appraiser = roles.appraiser.and_then(&mut label);
        let trial = match roles.trial {
            TrialBy::Label(source) => label(source),
            TrialBy::Order | TrialBy::Nothing => None,
        };
        let round = roles.round.and_then(&mut label);
        let mut named = |list: &[(String, usize)]| -> BTreeMap<String, String> {
            list.iter()
                .filter_map(|(name, source)| Some((name.clone(), label(*source)?)))
                .collect()
        };
        let factors = named(&roles.factors);
        let same = named(&roles.same);
        let taken = roles.taken.as_ref().and_then(|(source, clock)| {
            let field = fields[*source];
            let source = &roles.sources[*source];
            let read = match field.content {
                Content::Date(_) if source.is_plain() => clock.read(field, None),
                _ => source
                    .text(field)
                    .and_then(|text| clock.read(field, text.as_deref())),
            };
            read.map_err(&mut keep).ok()
        });
        let run = part.map(|part| Run {
            part,
            appraiser,
            trial,
            factors,
            same,
            taken,
            round,
        });
        Self { run, fault }
    }
}
