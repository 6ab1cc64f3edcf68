//! Records to runs: which readings belong together, and which runs are set aside whole.
//!
//! Invariant: every record that is added is one reading of an accepted run, or is counted in one
//! entry of what was set aside.

use std::collections::{BTreeMap, HashMap, HashSet};

use crate::fault::{Fault, shown};
use crate::grid::{Content, Field};
use crate::identity::Identity;
use crate::names::{fold_blanks, shorten};
use crate::number::{Marks, Number, Quantity};
use crate::parsed::{Parsed, Reading, Run, SetAside};
use crate::reader::{LimitAt, Roles, TrialBy};
use crate::unit::Scale;
use crate::whole::Stated;

/// Label of the one characteristic of an export that names none.
const UNNAMED: &str = "value";

/// Runs while records arrive.
pub(crate) struct Runs<'r> {
    roles: &'r Roles,
    entries: Vec<Entry>,
    /// By identity: a run without its `same` values, and the fault that keeps it from being known.
    index: HashMap<(Option<Run>, Option<Fault>), usize>,
    /// Readings in order of appearance, with their entry.
    readings: Vec<Reading>,
    /// Characteristics met, by entry.
    met: HashSet<(usize, String)>,
    /// Trials counted by order: readings of a run's other labels and a characteristic.
    counted: HashMap<(Run, String), u32>,
    records: usize,
}

struct Entry {
    run: Option<Run>,
    fault: Option<Fault>,
    further_faults: usize,
    readings: usize,
    /// How many readings the run says that it has.
    stated: Option<Stated>,
}

impl<'r> Runs<'r> {
    pub(crate) fn new(roles: &'r Roles) -> Self {
        Self {
            roles,
            entries: Vec::new(),
            index: HashMap::new(),
            readings: Vec::new(),
            met: HashSet::new(),
            counted: HashMap::new(),
            records: 0,
        }
    }

    pub(crate) fn is_empty(&self) -> bool {
        self.records == 0
    }

    /// Adds one record: a field for every source of the roles, in their order; `ragged` when the
    /// record itself is out of shape.
    pub(crate) fn add(&mut self, fields: &[Field<'_>], ragged: Option<Fault>) {
        self.records += 1;
        let characteristic = match self.roles.characteristic {
            None => Ok(UNNAMED.to_owned()),
            Some(source) => self.roles.sources[source].label(fields[source]),
        };
        let Identity { mut run, mut fault } = Identity::read(self.roles, fields);
        if self.roles.trial == TrialBy::Order
            && fault.is_none()
            && let Some(run) = &mut run
        {
            match &characteristic {
                Ok(characteristic) => {
                    run.trial = Some(self.next_trial(run, characteristic).to_string());
                }
                Err(uncountable) => fault = Some(uncountable.clone()),
            }
        }
        let same = match run.as_mut() {
            Some(run) => std::mem::take(&mut run.same),
            None => BTreeMap::new(),
        };
        let unknown = fault.is_some();
        let known = self.index.get(&(run.clone(), fault.clone())).copied();
        let at = known.unwrap_or(self.entries.len());
        if known.is_none() {
            self.index.insert((run.clone(), fault.clone()), at);
            let run = run.map(|run| Run {
                same: same.clone(),
                ..run
            });
            self.entries.push(Entry {
                run,
                fault,
                further_faults: 0,
                readings: 0,
                stated: None,
            });
        }
        self.entries[at].readings += 1;
        if unknown {
            return;
        }
        let stated = &mut self.entries[at].stated;
        if let Err(fault) = Stated::note(stated, self.roles, fields) {
            self.entries[at].blame(fault);
            return;
        }
        match self.reading(at, fields, ragged, characteristic, &same) {
            Ok(reading) => self.readings.push(reading),
            Err(fault) => self.entries[at].blame(fault),
        }
    }

    fn next_trial(&mut self, run: &Run, characteristic: &str) -> u32 {
        let counted = Run {
            taken: None,
            same: BTreeMap::new(),
            ..run.clone()
        };
        let count = self
            .counted
            .entry((counted, characteristic.to_owned()))
            .or_insert(0);
        *count += 1;
        *count
    }

    fn reading(
        &mut self,
        at: usize,
        fields: &[Field<'_>],
        ragged: Option<Fault>,
        characteristic: Result<String, Fault>,
        same: &BTreeMap<String, String>,
    ) -> Result<Reading, Fault> {
        if let Some(ragged) = ragged {
            return Err(ragged);
        }
        let characteristic = characteristic?;
        let roles = self.roles;
        let value = fields[roles.value];
        let written = measured(roles, value)?;
        let unit = match roles.unit {
            None => None,
            Some(source) => roles.sources[source]
                .text(fields[source])?
                .map(|text| fold_blanks(&text)),
        };
        let scale = Scale::new(unit.as_deref(), &written)
            .map_err(|not| not.fault(value, roles.marks.expected()))?;
        let number = scaled(&scale, &written, value)?;
        let nominal = match roles.nominal {
            None => None,
            Some(source) => bounding(roles, source, &scale, fields)?,
        };
        let lower = limit(roles, roles.lower, nominal.as_ref(), &scale, fields)?;
        let upper = limit(roles, roles.upper, nominal.as_ref(), &scale, fields)?;
        if let (Some(lower), Some(upper), Some(at)) = (lower, upper, roles.lower)
            && lower > upper
        {
            let field = fields[at.source];
            return Err(Fault::new(
                field.place,
                shown(field.content),
                "a lower limit below the upper one",
                format!("the lower limit {lower} lies above the upper limit {upper}"),
            )
            .hint("are the limits signed deviations (`from = \"nominal\"`), or exchanged?"));
        }
        self.keeps_the_same(at, fields, same)?;
        if !self.met.insert((at, characteristic.clone())) {
            return Err(Fault::new(
                value.place,
                shown(value.content),
                "each characteristic once in a run",
                format!("`{}` occurs twice in one run", shorten(&characteristic)),
            )
            .hint("if these are trials, say where the trial stands or how trials are counted"));
        }
        Ok(Reading {
            run: at,
            characteristic,
            value: number.value,
            unit: scale.name().map(str::to_owned),
            nominal: nominal.map(|nominal| nominal.value),
            lower,
            upper,
            origin: value.place.to_string(),
        })
    }

    fn keeps_the_same(
        &self,
        at: usize,
        fields: &[Field<'_>],
        same: &BTreeMap<String, String>,
    ) -> Result<(), Fault> {
        let Some(run) = &self.entries[at].run else {
            return Ok(());
        };
        for (name, source) in &self.roles.same {
            let (before, now) = (run.same.get(name), same.get(name));
            if before != now {
                let before = before.map_or("", String::as_str);
                let now = now.map_or("", String::as_str);
                return Err(Fault::new(
                    fields[*source].place,
                    shorten(now),
                    format!("`{}`, as before in this run", shorten(before)),
                    format!(
                        "{name} is `{}` here and `{}` before in the same run",
                        shorten(now),
                        shorten(before)
                    ),
                )
                .hint("a run keeps it from beginning to end: measure this run again"));
            }
        }
        Ok(())
    }

    /// Ends the export. `missing_end` is what its end should have been and was not: then every run
    /// is incomplete.
    pub(crate) fn finish(mut self, missing_end: Option<&str>) -> Parsed {
        if let Some(end) = missing_end {
            for entry in self
                .entries
                .iter_mut()
                .filter(|entry| entry.fault.is_none())
            {
                entry.fault = Some(Fault {
                    place: "end of the export".to_owned(),
                    found: String::new(),
                    expected: format!("the text `{end}`"),
                    hint: Some(
                        "a run that was broken off looks like this: measure it again".to_owned(),
                    ),
                    wrong: format!("the text `{end}` is missing, so the run is incomplete"),
                });
            }
        }
        for entry in self
            .entries
            .iter_mut()
            .filter(|entry| entry.fault.is_none())
        {
            let stated = entry.stated.as_ref();
            entry.fault = stated.and_then(|stated| stated.fault(entry.readings));
        }
        let mut parsed = Parsed::default();
        let mut places = Vec::with_capacity(self.entries.len());
        for entry in self.entries {
            match (entry.fault, entry.run) {
                (None, Some(run)) => {
                    places.push(Some(parsed.runs.len()));
                    parsed.runs.push(run);
                }
                (fault, run) => {
                    places.push(None);
                    parsed.set_aside.extend(
                        fault.map(|fault| {
                            set_aside(fault, run, entry.further_faults, entry.readings)
                        }),
                    );
                }
            }
        }
        parsed.readings = self
            .readings
            .into_iter()
            .filter_map(|reading| {
                Some(Reading {
                    run: places[reading.run]?,
                    ..reading
                })
            })
            .collect();
        let aside: usize = parsed.set_aside.iter().map(|aside| aside.readings).sum();
        debug_assert_eq!(parsed.readings.len() + aside, self.records);
        parsed
    }
}

impl Entry {
    fn blame(&mut self, fault: Fault) {
        match &self.fault {
            None => self.fault = Some(fault),
            Some(_) => self.further_faults += 1,
        }
    }
}

fn set_aside(fault: Fault, run: Option<Run>, further: usize, readings: usize) -> SetAside {
    let mut reason = fault.sentence();
    if further > 0 {
        let readings = if further == 1 { "reading" } else { "readings" };
        reason.push_str(&format!(
            " (and {further} further unusable {readings} in this run)"
        ));
    }
    let Fault {
        place,
        found,
        expected,
        hint,
        ..
    } = fault;
    SetAside {
        place,
        found,
        expected,
        hint,
        reason,
        run,
        readings,
    }
}

/// The value itself: a number that does not mean "no value".
fn measured(roles: &Roles, field: Field<'_>) -> Result<Quantity, Fault> {
    let source = &roles.sources[roles.value];
    if let Some(text) = source.text(field)?
        && roles.no_value.means(&text, marks_of(roles, field))
    {
        return Err(Fault::new(
            field.place,
            shown(field.content),
            "a measured value",
            format!("`{}` stands for no value", shorten(&text)),
        )
        .hint("measure this run again"));
    }
    source
        .quantity(field, roles.marks)?
        .ok_or_else(|| match roles.no_value.is_blank() {
            true => Fault::new(field.place, "", "a measured value", "blank: no value")
                .hint("measure this run again"),
            false => source.blank(field.place),
        })
}

/// The number in the reading's unit.
fn scaled(scale: &Scale, written: &Quantity, field: Field<'_>) -> Result<Number, Fault> {
    scale.number(written).map_err(|not| {
        let expected = match scale.name() {
            Some(unit) => format!("a number in {unit}"),
            None => "a number without a unit, as the value".to_owned(),
        };
        not.fault(field, expected)
    })
}

/// A nominal or a limit; `None` when nothing stands there.
fn bounding(
    roles: &Roles,
    source: usize,
    scale: &Scale,
    fields: &[Field<'_>],
) -> Result<Option<Number>, Fault> {
    let field = fields[source];
    let source = &roles.sources[source];
    match source.text(field)? {
        Some(text) if roles.no_value.means_no_limit(&text, marks_of(roles, field)) => Ok(None),
        Some(_) => source
            .quantity(field, roles.marks)?
            .map(|written| scaled(scale, &written, field))
            .transpose(),
        None => Ok(None),
    }
}

fn marks_of(roles: &Roles, field: Field<'_>) -> Marks {
    match field.content {
        Content::Number(_) => Marks::PLAIN,
        _ => roles.marks,
    }
}

fn limit(
    roles: &Roles,
    at: Option<LimitAt>,
    nominal: Option<&Number>,
    scale: &Scale,
    fields: &[Field<'_>],
) -> Result<Option<f64>, Fault> {
    let Some(at) = at else { return Ok(None) };
    let Some(written) = bounding(roles, at.source, scale, fields)? else {
        return Ok(None);
    };
    if !at.from_nominal {
        return Ok(Some(written.value));
    }
    let field = fields[at.source];
    let role = &roles.sources[at.source].role;
    let fault = |expected: &str, wrong: String| {
        Fault::new(field.place, shown(field.content), expected, wrong)
    };
    let Some(nominal) = nominal else {
        return Err(fault(
            "a nominal value",
            format!("the {role} is taken from the nominal, which is blank"),
        )
        .hint("fill in the nominal, or leave `from` out if the limit is absolute"));
    };
    let deviation = match at.unsigned {
        false => Some(written),
        true if written.value >= 0.0 => written.times(-1, 1),
        true => {
            return Err(fault(
                "a deviation without its sign",
                format!(
                    "the {role} {} has a sign, where the rule says that it is left out",
                    written.value
                ),
            )
            .hint("correct `sign`, or have all of them written in one way"));
        }
    };
    match deviation.and_then(|deviation| nominal.plus(&deviation)) {
        Some(sum) => Ok(Some(sum)),
        None => Err(fault(
            "a finite limit",
            format!("nominal and {role} add up to no finite number"),
        )),
    }
}
