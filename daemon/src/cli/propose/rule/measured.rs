//! The keys of what was measured: value with its unit, nominal, limits, texts for "no value".

use super::{Drafted, counted, role};
use crate::cli::propose::draft::{Trust, quoted, shown};
use crate::cli::propose::limits::{self, Limits};
use crate::cli::propose::number::is_number;
use crate::cli::propose::sample::{Datum, Dress};
use crate::cli::propose::words::{Meaning, unit_behind};

impl Drafted<'_> {
    pub(super) fn value(&mut self) {
        let Some(taken) = self.roles.get(Meaning::Value) else {
            let left: Vec<String> = self
                .roles
                .numbers_left
                .iter()
                .take(4)
                .map(|name| shown(name))
                .collect();
            let note = match left.len() {
                0 => "no place of measured values was found".to_owned(),
                1 => format!("is it {}?", left.concat()),
                _ => format!(
                    "several places hold numbers ({}): which one, or are these values across?",
                    left.join(", ")
                ),
            };
            let value = match self.samples.first().map(|s| &s.dress) {
                Some(Dress::Xml { .. }) => "{ xml = \"\", unit = \"mm\" }",
                _ => "{ column = \"\", unit = \"mm\" }",
            };
            self.put("value", value, Trust::Missing, note);
            return;
        };
        let (mut trust, mut note) = self.judged(taken);
        let mut extra: Vec<(&str, String)> = Vec::new();
        let behind = taken.spot.unit_behind();
        if behind.is_some() {
            extra.push(("find", quoted(NUMBER)));
            trust = Trust::Check;
            note = format!("the unit behind each number is cut off; {note}");
        }
        let in_heading = taken
            .spot
            .names
            .first()
            .and_then(|name| unit_behind(name).1);
        match (self.roles.get(Meaning::Unit), behind, in_heading) {
            (Some(unit), _, _) => {
                extra.push(("unit", role(&unit.spot.place, &[])));
                if unit.spot.files() < self.samples.len() {
                    trust = Trust::Check;
                }
            }
            (None, Some(unit), _) => extra.push(("unit", quoted(&unit))),
            (None, None, Some(unit)) => extra.push(("unit", quoted(unit))),
            (None, None, None) => {
                trust = Trust::Check;
                note = format!("no unit was seen: add unit = \"…\"; {note}");
            }
        }
        let value = role(&taken.spot.place, &extra);
        self.put("value", value, trust, note);
    }
    pub(super) fn numbers(&mut self) {
        let spot = |meaning| self.roles.get(meaning).map(|taken| &taken.spot);
        let (nominal, lower, upper) = (
            spot(Meaning::Nominal),
            spot(Meaning::Lower),
            spot(Meaning::Upper),
        );
        let limits = limits::judge(nominal, lower, upper, self.mark);
        if let Some(taken) = self.roles.get(Meaning::Nominal) {
            let (trust, note) = self.judged(taken);
            self.put("nominal", role(&taken.spot.place, &[]), trust, note);
        }
        for (meaning, key) in [(Meaning::Lower, "lower"), (Meaning::Upper, "upper")] {
            let Some(taken) = self.roles.get(meaning) else {
                continue;
            };
            let (mut trust, mut note) = self.judged(taken);
            let has_nominal = self.roles.get(Meaning::Nominal).is_some();
            let (from, told, sure) = told(limits, has_nominal);
            if !sure {
                trust = Trust::Check;
            }
            note = format!("{told}; {note}");
            let extra = if from {
                vec![("from", quoted("nominal"))]
            } else {
                Vec::new()
            };
            self.put(key, role(&taken.spot.place, &extra), trust, note);
        }
        if lower.is_none() && upper.is_none() {
            self.put(
                "upper",
                "{ column = \"\" }",
                Trust::Optional,
                "no limits were seen; the plan can state them",
            );
        }
    }

    /// Texts that stand where values should.
    pub(super) fn no_value(&mut self) {
        let Some(taken) = self.roles.get(Meaning::Value) else {
            return;
        };
        const MOST: usize = 6;
        const LONGEST: usize = 8;
        let mut texts: Vec<&str> = taken
            .spot
            .values()
            .filter_map(|datum| match datum {
                Datum::Text(text) if !is_number(text) => Some(text.as_str()),
                _ => None,
            })
            .filter(|text| text.chars().count() <= LONGEST)
            .collect();
        texts.sort_unstable();
        texts.dedup();
        // What holds a digit may be a damaged number.
        texts.retain(|text| !text.chars().any(|c| c.is_numeric()));
        if texts.is_empty() || texts.len() > MOST {
            return;
        }
        let list: Vec<String> = texts.iter().map(|text| quoted(text)).collect();
        self.put(
            "no_value",
            format!("[{}]", list.join(", ")),
            Trust::Check,
            "seen in place of a value: do these mean that nothing was measured?",
        );
    }
}

/// What cuts a number out of a text with a unit behind it.
const NUMBER: &str = r"^\s*([+\-\u{2212}]?[0-9.,]+)";

/// True when the limits are deviations; why; and whether that is sure.
fn told(limits: Limits, has_nominal: bool) -> (bool, String, bool) {
    let rows = |n: usize| counted(n, "reading");
    match limits {
        Limits::Absolute(n) => (false, format!("the limits themselves: they lie about the nominal in {}", rows(n)), true),
        Limits::Relative(n) => (true, format!("a deviation: it lies about zero, not about the nominal, in {}", rows(n)), true),
        Limits::PerhapsRelative(n) => (true, format!("both limits far from the nominal and of one sign in {}: deviations? if a minus sign is left out, this reads wrong", rows(n)), false),
        Limits::Mixed => (false, "some rows look like limits, some like deviations".to_owned(), false),
        Limits::Open if has_nominal => (false, "nothing shows whether this is the limit itself or a deviation (then add from = \"nominal\")".to_owned(), false),
        Limits::Open => (false, "taken as the limit itself; no nominal was seen to compare with".to_owned(), false),
    }
}
