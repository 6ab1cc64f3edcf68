//! What an export says, joined with what the ledger knows: new runs, copies, superseded values, ties.
//!
//! Model: a run's deliveries in order of arrival. The first value of a characteristic stands until a later
//! delivery has another one; an equal value is a copy. [`tally`] works this out for the whole run each time.

use std::collections::{BTreeMap, BTreeSet};

use restudy_config::Plan;
use restudy_parsers::{Parsed, Refused, Run, fold};

use crate::ledger::{
    Delivered, ExportState, Holds, LedgerError, NewExport, PackedReading, RunFacts, Tally, Write,
};

/// What the same path brought before.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Before {
    /// Nothing that matters.
    Nothing,
    /// The same bytes, read by another rule: what they brought is taken back.
    SameBytes(i64),
    /// Other bytes.
    OtherBytes(i64),
}

/// Records an export with its runs; answers with its number.
///
/// # Errors
/// The database's refusal.
pub fn record<'a>(
    w: &Write<'_>,
    new: &mut NewExport<'a>,
    plan: Option<&Plan>,
    outcome: &'a Result<Parsed, Refused>,
    before: Before,
) -> Result<i64, LedgerError> {
    if let Before::SameBytes(export) = before {
        take_back(w, export)?;
    }
    let parsed = match (outcome, plan) {
        (Ok(parsed), Some(_)) => parsed,
        (Ok(parsed), None) => {
            new.state = ExportState::NoPlan;
            new.readings = met(parsed);
            return w.add_export(new);
        }
        (Err(_), None) => {
            new.state = ExportState::NoPlan;
            return w.add_export(new);
        }
        (Err(refused), Some(_)) => {
            new.state = ExportState::Refused;
            new.refusal = Some((&refused.sentence, refused.hint.as_deref()));
            return w.add_export(new);
        }
    };
    let listed = plan.filter(|p| p.whole_list).map(|p| {
        p.characteristics
            .iter()
            .map(|c| fold(&c.name))
            .collect::<BTreeSet<String>>()
    });
    let mut by_run: Vec<Vec<PackedReading>> = vec![Vec::new(); parsed.runs.len()];
    let mut unplanned = 0;
    for reading in &parsed.readings {
        if listed
            .as_ref()
            .is_some_and(|l| !l.contains(&fold(&reading.characteristic)))
        {
            unplanned += 1;
        } else {
            by_run[reading.run].push(reading.into());
        }
    }
    new.readings = met(parsed);
    new.unplanned = unplanned;
    let export = w.add_export(new)?;
    for aside in &parsed.set_aside {
        w.add_set_aside(export, aside)?;
    }
    let plan = plan.map_or("", |p| p.name.as_str());
    let mut by_key: BTreeMap<String, (&Run, Vec<PackedReading>)> = BTreeMap::new();
    for (run, readings) in parsed.runs.iter().zip(by_run) {
        if !readings.is_empty() {
            by_key
                .entry(key(run)?)
                .or_insert((run, Vec::new()))
                .1
                .extend(readings);
        }
    }
    if let Before::OtherBytes(export) = before {
        withdraw(w, export, new.shown, &by_key)?;
    }
    for (key, (run, readings)) in &by_key {
        join(w, plan, new, export, key, run, readings)?;
    }
    Ok(export)
}

/// Takes back what an export brought. Runs that other exports brought too stay with what those say.
fn take_back(w: &Write<'_>, export: i64) -> Result<(), LedgerError> {
    let runs = w.read().runs_of_export(export)?;
    w.take_back(export)?;
    for run in runs {
        let deliveries = w.read().deliveries(run.id)?;
        if deliveries.is_empty() {
            w.drop_run(run.id)?;
            continue;
        }
        let counted = run.facts.trial.is_none() && run.facts.taken.is_some();
        let merged = tally(&deliveries, counted);
        w.put_tally(
            run.id,
            &merged.tallies,
            &merged.holds(),
            merged.tie.as_deref(),
            run.changed,
        )?;
    }
    Ok(())
}

/// A rewritten file that gives a run another part, appraiser or trial no longer means the run it brought before:
/// known by the time stamp, or by equal values. Runs of closed rounds stay as they were worked out.
fn withdraw(
    w: &Write<'_>,
    previous: i64,
    file: &str,
    now: &BTreeMap<String, (&Run, Vec<PackedReading>)>,
) -> Result<(), LedgerError> {
    let before = w.read().runs_of_export(previous)?;
    let known: BTreeSet<&str> = before.iter().map(|r| r.key.as_str()).collect();
    let renamed: Vec<_> = now
        .iter()
        .filter(|(key, _)| !known.contains(key.as_str()))
        .collect();
    for run in before.iter().filter(|r| !now.contains_key(&r.key)) {
        let closed = match run.place.round {
            Some(round) => w.read().round(round)?.is_some_and(|r| r.state.closed()),
            None => false,
        };
        if closed {
            continue;
        }
        let values = tally(&w.read().deliveries(run.id)?, false).values;
        let same_values = |readings: &[PackedReading]| {
            readings.len() == values.len()
                && readings.iter().all(|r| {
                    values
                        .get(&fold(&r.characteristic))
                        .is_some_and(|v| same_reading(v, r))
                })
        };
        let is = renamed.iter().find(|(_, (now, readings))| {
            (now.taken.is_some() && now.taken == run.facts.taken) || same_values(readings)
        });
        if let Some((_, (now, _))) = is {
            let who = facts("", now).who();
            w.set_tie(
                run.id,
                &format!("`{file}` was written anew and gives this run as {who}"),
            )?;
        }
    }
    Ok(())
}

fn met(parsed: &Parsed) -> usize {
    parsed.readings.len() + parsed.set_aside.iter().map(|a| a.readings).sum::<usize>()
}

fn join(
    w: &Write<'_>,
    plan: &str,
    new: &NewExport<'_>,
    export: i64,
    key: &str,
    run: &Run,
    readings: &[PackedReading],
) -> Result<(), LedgerError> {
    let known = w.read().run_by_key(plan, key)?;
    let id = match &known {
        Some(row) => row.id,
        None => w.add_run(plan, key, &facts(new.instrument, run))?,
    };
    w.add_delivery(id, export, readings)?;
    let counted = run.trial.is_none() && run.taken.is_some();
    let Some(row) = known else {
        let alone = Delivered {
            export,
            path: new.path.to_vec(),
            readings: readings.to_vec(),
        };
        let merged = tally(&[alone], counted);
        return w.put_tally(id, &merged.tallies, &merged.holds(), None, false);
    };
    let merged = tally(&w.read().deliveries(id)?, counted);
    let closed = match row.place.round {
        Some(round) => w.read().round(round)?.is_some_and(|r| r.state.closed()),
        None => false,
    };
    if row.facts.same != run.same && (!closed || merged.last_changed) {
        w.put_same(id, &run.same)?;
    }
    let used = row.place.slot.is_some();
    let changed = row.changed || (closed && used && merged.last_changed);
    w.put_tally(
        id,
        &merged.tallies,
        &merged.holds(),
        merged.tie.as_deref(),
        changed,
    )
}

/// What makes two deliveries the same run: the mapped roles, any case, blanks folded.
fn key(run: &Run) -> Result<String, LedgerError> {
    let optional = |text: &Option<String>| text.as_deref().map(fold);
    let factors: BTreeMap<String, String> = run
        .factors
        .iter()
        .map(|(k, v)| (k.clone(), fold(v)))
        .collect();
    serde_json::to_string(&(
        fold(&run.part),
        optional(&run.appraiser),
        factors,
        optional(&run.round),
        run.taken.map(|t| t.to_string()),
        optional(&run.trial),
    ))
    .map_err(|e| LedgerError::Damaged(e.to_string()))
}

/// A run's facts as the ledger keeps them.
#[must_use]
pub fn facts(instrument: &str, run: &Run) -> RunFacts {
    RunFacts {
        instrument: instrument.to_owned(),
        part: run.part.clone(),
        appraiser: run.appraiser.clone(),
        trial: run.trial.clone(),
        factors: run.factors.clone(),
        same: run.same.clone(),
        taken: run.taken,
        round_label: run.round.clone(),
    }
}

/// A run's deliveries, joined.
pub struct Merged {
    /// The values that stand, by folded characteristic.
    pub values: BTreeMap<String, PackedReading>,
    /// How each delivery counts, in order of arrival.
    pub tallies: Vec<Tally>,
    /// Folded characteristics with a value that a later delivery replaced, once a replacement.
    pub replaced: Vec<String>,
    /// Two different files claim the same counted run with different values.
    pub tie: Option<String>,
    /// The last delivery brought a value that was not known.
    pub last_changed: bool,
}

impl Merged {
    /// The characteristics that the run has values of, with their units.
    #[must_use]
    pub fn holds(&self) -> Holds {
        self.values
            .iter()
            .map(|(name, r)| (name.clone(), r.unit.clone()))
            .collect()
    }
}

/// Joins a run's deliveries; `counted`: its trial is counted by time stamp, so that another file with the same
/// stamp and another value is a contradiction, not a correction, until one of the two files is written anew.
#[must_use]
pub fn tally(deliveries: &[Delivered], counted: bool) -> Merged {
    let mut standing: BTreeMap<String, (usize, &PackedReading)> = BTreeMap::new();
    let mut tallies: Vec<Tally> = deliveries
        .iter()
        .map(|d| Tally {
            export: d.export,
            copies: 0,
            superseded: 0,
        })
        .collect();
    let mut replaced = Vec::new();
    let mut last_changed = false;
    for (index, delivered) in deliveries.iter().enumerate() {
        last_changed = false;
        for reading in &delivered.readings {
            let name = fold(&reading.characteristic);
            match standing.get(&name) {
                Some((_, known)) if same_reading(known, reading) => tallies[index].copies += 1,
                Some(&(holder, _)) if counted && deliveries[holder].path != delivered.path => {
                    tallies[index].superseded += 1;
                }
                Some(&(holder, _)) => {
                    tallies[holder].superseded += 1;
                    replaced.push(name.clone());
                    standing.insert(name, (index, reading));
                    last_changed = true;
                }
                None => {
                    standing.insert(name, (index, reading));
                    last_changed = true;
                }
            }
        }
    }
    let values = standing
        .into_iter()
        .map(|(name, (_, r))| (name, r.clone()))
        .collect();
    let tie = if counted {
        contradiction(deliveries)
    } else {
        None
    };
    Merged {
        values,
        tallies,
        replaced,
        tie,
        last_changed,
    }
}

fn same_reading(a: &PackedReading, b: &PackedReading) -> bool {
    a.value == b.value
        && (&a.unit, a.nominal, a.lower, a.upper) == (&b.unit, b.nominal, b.lower, b.upper)
}

/// Two files whose present contents give one run different values.
fn contradiction(deliveries: &[Delivered]) -> Option<String> {
    let mut latest: BTreeMap<(String, &[u8]), &PackedReading> = BTreeMap::new();
    for delivered in deliveries {
        for reading in &delivered.readings {
            latest.insert((fold(&reading.characteristic), &delivered.path), reading);
        }
    }
    let all: Vec<(&(String, &[u8]), &&PackedReading)> = latest.iter().collect();
    all.windows(2).find(|pair| pair[0].0.0 == pair[1].0.0 && !same_reading(pair[0].1, pair[1].1)).map(
        |pair| {
            let told = |((_, path), reading): (&(String, &[u8]), &&PackedReading)| {
                let file = path.rsplit(|b| *b == b'/').next().unwrap_or_default();
                let unit = reading.unit.as_deref().map(|u| format!(" {u}")).unwrap_or_default();
                format!("{}{unit} in `{}`", reading.value, String::from_utf8_lossy(file))
            };
            format!(
                "`{}` is {} and {} for one time stamp; trials are counted by time stamp, so export the \
                 right one again under both names, or measure this run again",
                pair[0].1.characteristic,
                told(pair[0]),
                told(pair[1])
            )
        },
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    fn delivered(export: i64, path: &str, values: &[(&str, f64)]) -> Delivered {
        let reading = |(name, value): &(&str, f64)| PackedReading {
            characteristic: (*name).into(),
            value: *value,
            unit: None,
            nominal: None,
            lower: None,
            upper: None,
            origin: "line 2".into(),
        };
        Delivered {
            export,
            path: path.into(),
            readings: values.iter().map(reading).collect(),
        }
    }

    fn counts(merged: &Merged) -> Vec<(usize, usize)> {
        merged
            .tallies
            .iter()
            .map(|t| (t.copies, t.superseded))
            .collect()
    }

    #[test]
    fn equal_values_are_copies_other_values_supersede_further_ones_join() {
        let merged = tally(
            &[
                delivered(1, "a", &[("bore A", 1.0), ("bore B", 2.0)]),
                delivered(
                    2,
                    "b",
                    &[("Bore  a", 1.0), ("bore B", 2.5), ("bore C", 3.0)],
                ),
            ],
            false,
        );
        assert_eq!(counts(&merged), [(0, 1), (1, 0)]);
        let values: Vec<f64> = merged.values.values().map(|r| r.value).collect();
        assert_eq!(values, [1.0, 2.5, 3.0]);
        assert!(merged.last_changed && merged.tie.is_none());
    }

    #[test]
    fn there_and_back_again_supersedes_twice() {
        let values = [1.0, 2.0, 1.0];
        let deliveries: Vec<Delivered> = (1..)
            .zip(values)
            .map(|(export, v)| delivered(export, "a", &[("x", v)]))
            .collect();
        assert_eq!(counts(&tally(&deliveries, true)), [(0, 1), (0, 1), (0, 0)]);
    }

    #[test]
    fn a_counted_run_from_another_file_with_another_value_is_a_tie() {
        let other = [
            delivered(1, "a", &[("x", 1.0)]),
            delivered(2, "b", &[("x", 2.0)]),
        ];
        assert!(tally(&other, true).tie.is_some());
        assert!(tally(&other, false).tie.is_none());
        let rewritten = [
            delivered(1, "a", &[("x", 1.0)]),
            delivered(2, "a", &[("x", 2.0)]),
        ];
        assert!(tally(&rewritten, true).tie.is_none());
        let settled = [
            delivered(1, "a", &[("x", 1.0)]),
            delivered(2, "b", &[("x", 2.0)]),
            delivered(3, "a", &[("x", 2.0)]),
        ];
        assert!(tally(&settled, true).tie.is_none(), "both files agree now");
    }
}
