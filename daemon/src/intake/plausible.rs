//! Values that are something else than they seem: another unit, or the deviation in place of the actual value.
//!
//! Model: a reading in a known unit is first converted to the plan's; then a value is held against its nominal
//! (the plan's drawing value, else the export's). Only what has an explanation is doubted, and nothing is
//! converted for it.
//!
//! Ratios 25.4, 1000 and 57.3 between exports and drawings: common practice, no source.

use std::collections::{BTreeMap, BTreeSet};

use jiff::ToSpan as _;
use jiff::civil::DateTime;
use jiff::tz::TimeZone;
use restudy_config::{Characteristic, Plan};
use restudy_parsers::{Parsed, Reading, SetAside, converted, fold};

use crate::now::{Now, in_zone};

/// Inch to mm, mm to µm, radian to degree.
const RATIOS: [(f64, &str); 3] = [
    (25.4, "inch and mm"),
    (1000.0, "mm and µm (or m and mm)"),
    (180.0 / std::f64::consts::PI, "radian and degree"),
];
/// A ratio is one of these within this part of it.
const RATIO_WITHIN: f64 = 0.01;
/// So many tolerance widths around its nominal (or around zero, for a deviation) a value is not doubted.
const WIDTHS: f64 = 20.0;

/// Why a value is doubted.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Doubt {
    /// What stands there.
    pub found: String,
    /// What was expected.
    pub expected: String,
    /// What a person could do.
    pub hint: String,
}

/// The latest time stamp that is believed: a day after now.
#[must_use]
pub fn latest(now: Now, zone: &TimeZone) -> DateTime {
    let today = in_zone(now.utc, zone).datetime();
    today.checked_add(1.day()).unwrap_or(DateTime::MAX)
}

/// Converts readings to the plan's units, and sets the runs with a doubted value or a time stamp after `latest` aside, whole.
#[must_use]
pub fn sift(parsed: Parsed, plan: &Plan, latest: DateTime) -> Parsed {
    let drawn: BTreeMap<String, &Characteristic> = plan
        .characteristics
        .iter()
        .map(|c| (fold(&c.name), c))
        .collect();
    let parsed = in_plan_units(parsed, &drawn);
    let mut doubts: BTreeMap<usize, SetAside> = BTreeMap::new();
    for reading in &parsed.readings {
        let named = drawn.get(&fold(&reading.characteristic)).copied();
        if doubts.contains_key(&reading.run) {
            continue;
        }
        let taken = parsed.runs.get(reading.run).and_then(|run| run.taken);
        if let Some(taken) = taken.filter(|taken| *taken > latest) {
            let aside = SetAside {
                place: reading.origin.clone(),
                found: taken.to_string(),
                expected: format!("a time stamp up to {latest}"),
                hint: Some(
                    "the instrument's clock is ahead, or the date format is another one".into(),
                ),
                reason: format!("its time stamp {taken} lies in the future"),
                run: parsed.runs.get(reading.run).cloned(),
                readings: 0,
            };
            doubts.insert(reading.run, aside);
            continue;
        }
        if let Some(doubt) = doubt(reading, named) {
            let Doubt {
                found,
                expected,
                hint,
            } = doubt;
            let reason = format!(
                "{}: `{}` is {found}; expected {expected}",
                reading.origin, reading.characteristic
            );
            let aside = SetAside {
                place: reading.origin.clone(),
                found,
                expected,
                hint: Some(hint),
                reason,
                run: parsed.runs.get(reading.run).cloned(),
                readings: 0,
            };
            doubts.insert(reading.run, aside);
        }
    }
    if doubts.is_empty() {
        return parsed;
    }
    let mut sifted = Parsed {
        set_aside: parsed.set_aside,
        notes: parsed.notes,
        ..Parsed::default()
    };
    let mut places = Vec::new();
    for (index, run) in parsed.runs.into_iter().enumerate() {
        places.push((!doubts.contains_key(&index)).then_some(sifted.runs.len()));
        if !doubts.contains_key(&index) {
            sifted.runs.push(run);
        }
    }
    for mut reading in parsed.readings {
        match (places[reading.run], doubts.get_mut(&reading.run)) {
            (Some(place), _) => {
                reading.run = place;
                sifted.readings.push(reading);
            }
            (None, Some(aside)) => aside.readings += 1,
            (None, None) => {}
        }
    }
    sifted.set_aside.extend(doubts.into_values());
    sifted
}

/// Readings in the units of the plan, with a note for each characteristic that came in another or in none.
fn in_plan_units(mut parsed: Parsed, drawn: &BTreeMap<String, &Characteristic>) -> Parsed {
    let mut notes = BTreeSet::new();
    for reading in &mut parsed.readings {
        let planned = drawn
            .get(&fold(&reading.characteristic))
            .and_then(|c| c.unit.as_deref());
        let Some(planned) = planned else { continue };
        let Some(found) = reading.unit.clone() else {
            notes.insert(format!(
                "`{}` comes without a unit; its numbers are taken to be in the plan's `{planned}`",
                reading.characteristic
            ));
            continue;
        };
        let is_spelling = converted(1.0, &found, planned) == Some(1.0);
        if fold(&found) == fold(planned) || !convert(reading, &found, planned) || is_spelling {
            continue;
        }
        notes.insert(format!(
            "`{}` comes in `{found}`; it is converted to the plan's `{planned}`",
            reading.characteristic
        ));
    }
    parsed.notes.extend(notes);
    parsed
}

/// Puts value, nominal and limits into the unit `to`, all or none.
fn convert(reading: &mut Reading, from: &str, to: &str) -> bool {
    let all = || {
        let maybe = |number: Option<f64>| match number {
            None => Some(None),
            Some(number) => converted(number, from, to).map(Some),
        };
        Some((
            converted(reading.value, from, to)?,
            maybe(reading.nominal)?,
            maybe(reading.lower)?,
            maybe(reading.upper)?,
        ))
    };
    let Some((value, nominal, lower, upper)) = all() else {
        return false;
    };
    *reading = Reading {
        value,
        nominal,
        lower,
        upper,
        unit: Some(to.to_owned()),
        ..reading.clone()
    };
    true
}

/// Holds a reading against the drawing: what the plan says of its characteristic, if anything.
#[must_use]
pub fn doubt(reading: &Reading, drawn: Option<&Characteristic>) -> Option<Doubt> {
    let drawn_nominal = drawn.and_then(|c| c.nominal);
    if let (Some(drawn), Some(stated)) = (drawn_nominal, reading.nominal)
        && let Some(units) = ratio(stated, drawn)
    {
        return Some(Doubt {
            found: format!("nominal {stated}"),
            expected: format!("the plan's nominal {drawn}"),
            hint: format!("the ratio is that of {units}; set the unit in the exporter"),
        });
    }
    let nominal = drawn_nominal.or(reading.nominal)?;
    let lower = drawn.and_then(|c| c.lower).or(reading.lower)?;
    let upper = drawn.and_then(|c| c.upper).or(reading.upper)?;
    let near = WIDTHS * (upper - lower);
    if near <= 0.0 || (reading.value - nominal).abs() <= near {
        return None;
    }
    let hint = match ratio(reading.value, nominal) {
        Some(units) => format!("the ratio is that of {units}; set the unit in the exporter"),
        None if reading.value.abs() <= near => {
            "this looks like the deviation from the nominal; export the actual value".into()
        }
        None => return None,
    };
    Some(Doubt {
        found: reading.value.to_string(),
        expected: format!("a value near the nominal {nominal}"),
        hint,
    })
}

fn ratio(found: f64, expected: f64) -> Option<&'static str> {
    let ratio = found / expected;
    let is = |r: f64| (ratio / r - 1.0).abs() <= RATIO_WITHIN;
    RATIOS
        .iter()
        .find(|(r, _)| is(*r) || is(1.0 / r))
        .map(|(_, units)| *units)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn reading(value: f64) -> Reading {
        Reading {
            run: 0,
            characteristic: "bore A".into(),
            value,
            unit: Some("mm".into()),
            nominal: Some(50.0),
            lower: Some(49.95),
            upper: Some(50.05),
            origin: "line 2".into(),
        }
    }

    fn drawing() -> Characteristic {
        let limits = restudy_engine::Limits {
            watch: 0.1,
            act: 0.3,
            back_below: 0.85,
        };
        Characteristic {
            name: "bore A".into(),
            nominal: Some(50.0),
            lower: None,
            upper: None,
            unit: None,
            one_sided: None,
            special: false,
            limits,
            process: None,
        }
    }

    fn in_units(planned: Option<&str>, reading: Reading) -> (Reading, Vec<String>) {
        let drawing = Characteristic {
            unit: planned.map(str::to_owned),
            ..drawing()
        };
        let drawn = BTreeMap::from([("bore a".to_owned(), &drawing)]);
        let parsed = Parsed {
            readings: vec![reading.clone(), reading],
            ..Parsed::default()
        };
        let mut parsed = in_plan_units(parsed, &drawn);
        (parsed.readings.remove(1), parsed.notes)
    }

    /// 1 inch is 25.4 mm exactly (NIST SP 811, B.6).
    #[test]
    fn a_known_unit_is_converted_to_the_plans() {
        let inch = Reading {
            value: 1.968,
            unit: Some("in".into()),
            nominal: Some(2.0),
            lower: None,
            upper: Some(2.001),
            ..reading(0.0)
        };
        let (converted, notes) = in_units(Some("mm"), inch.clone());
        assert_eq!(
            (
                converted.value,
                converted.nominal,
                converted.lower,
                converted.upper
            ),
            (49.9872, Some(50.8), None, Some(50.8254))
        );
        assert_eq!(converted.unit.as_deref(), Some("mm"));
        assert_eq!(
            notes,
            ["`bore A` comes in `in`; it is converted to the plan's `mm`"]
        );
        assert_eq!(in_units(None, inch.clone()), (inch.clone(), vec![]));
        assert_eq!(in_units(Some("HRC"), inch.clone()), (inch.clone(), vec![]));
        assert_eq!(in_units(Some("°"), inch.clone()), (inch.clone(), vec![]));
        let (respelt, notes) = in_units(Some("inch"), inch);
        assert_eq!(
            (respelt.value, respelt.unit.as_deref()),
            (1.968, Some("inch"))
        );
        assert!(notes.is_empty());
    }

    #[test]
    fn a_reading_without_a_unit_is_told_where_the_plan_has_one() {
        let bare = Reading {
            unit: None,
            ..reading(50.01)
        };
        let (kept, notes) = in_units(Some("mm"), bare.clone());
        assert_eq!(kept, bare);
        assert_eq!(
            notes,
            ["`bore A` comes without a unit; its numbers are taken to be in the plan's `mm`"]
        );
        assert_eq!(in_units(Some("MM"), reading(50.01)).1, Vec::<String>::new());
    }

    #[test]
    fn only_what_has_an_explanation_is_doubted() {
        for fine in [50.0, 49.9, 51.5, 70.0, 9999.0] {
            assert_eq!(doubt(&reading(fine), None), None, "{fine}");
        }
        let hint = |value: f64| doubt(&reading(value), None).unwrap().hint;
        assert!(hint(50_003.0).contains("mm and µm"));
        assert!(hint(50.01 / 25.4).contains("inch and mm"));
        assert!(hint(1270.1).contains("inch and mm"));
        assert!(hint(0.012).contains("deviation"));
    }

    #[test]
    fn a_nominal_in_another_unit_is_doubted_by_the_drawing() {
        let inch = Reading {
            nominal: Some(50.0 / 25.4),
            ..reading(50.0 / 25.4)
        };
        assert_eq!(
            doubt(&inch, Some(&drawing())).unwrap().expected,
            "the plan's nominal 50"
        );
    }
}
