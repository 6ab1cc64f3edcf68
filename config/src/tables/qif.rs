//! `[instrument.read]` with `form = "qif"`: the standard says where every role stands, so that a role
//! is written only to take it from elsewhere.

use std::collections::BTreeMap;

use restudy_parsers::{Bounds, Cell, Form, Layout, Limit, Qif, Role, Rule, Taken, Trial, Value};

use crate::checked::Site;
use crate::place::regex;
use crate::tables::bounds::bounds;
use crate::tables::role::{Shape, found_in, role};
use crate::tables::rule::{encoding, limit, named_roles, texts, trial};
use crate::tables::taken::taken;
use crate::tables::value::value;
use crate::walk::{Node, Table};

const EXPECTED: &str = "one of qif, attribute, path or constant";

pub(crate) fn rule(table: &Table<'_>, site: Option<&Site>) -> Option<Rule> {
    let usual = |place: Qif| Role::plain(Cell::Qif(place));
    let one = |key: &'static str, place: &'static Qif| {
        table.or(key, usual(place.clone()), |node| {
            role(node, Shape::Qif(Some(place)))
        })
    };
    let bound = |key: &'static str, place: &'static Qif, is_lower: bool| {
        let stated = Limit {
            role: usual(place.clone()),
            from_nominal: false,
            unsigned: false,
        };
        table.or(key, stated, |node| {
            limit(node, Shape::Qif(Some(place)), true, is_lower)
        })
    };
    let part = one("part", &Qif::Serial);
    let appraiser = one("appraiser", &Qif::Operator);
    let trial = table.or("trial", Trial::Stated(usual(Qif::Trial)), |node| {
        trial(node, Shape::Qif(Some(&Qif::Trial)))
    });
    let zone = site.and_then(|site| site.zone.iana_name());
    let stated = Taken {
        role: usual(Qif::Time),
        format: None,
        dates: None,
        written_in: None,
        shown_in: zone.map(str::to_owned),
    };
    let taken = table.or("taken", stated, |node| {
        taken(node, Shape::Qif(Some(&Qif::Time)), site)
    });
    let round = table.optional("round", |node| role(node, Shape::Qif(None)));
    let characteristic = one("characteristic", &Qif::Name);
    let stated = Value {
        role: usual(Qif::Value),
        unit: None,
    };
    let value = table.or("value", stated, |node| {
        value(node, Shape::Qif(Some(&Qif::Value)))
    });
    let nominal = one("nominal", &Qif::Nominal);
    let lower = bound("lower", &Qif::Lower, true);
    let upper = bound("upper", &Qif::Upper, false);
    let named = |key: &'static str, others: &BTreeMap<String, Role>| {
        table.or(key, BTreeMap::new(), |node| {
            named_roles(node, Shape::Qif(None), others)
        })
    };
    let factors = named("factors", &BTreeMap::new());
    let same = named("same", &factors.clone().unwrap_or_default());
    let no_value = table.or("no_value", Vec::new(), |node| texts(node));
    let encoding = table.optional("encoding", |node| encoding(node));
    let bounds = table.or("bounds", Bounds::default(), bounds);
    table.never(
        &[
            "sheet",
            "header",
            "delimiter",
            "each",
            "decimal",
            "thousands",
            "line_breaks",
            "end",
            "count",
            "units_row",
            "blocks",
            "until",
            "skip",
            "keep",
            "fill_down",
        ],
        "the QIF standard says it: leave the key out",
    );
    table.finish();

    let value = value?;
    Some(Rule {
        form: Form::Qif,
        part: part?,
        appraiser: Some(appraiser?),
        trial: Some(trial?),
        taken: Some(taken?),
        round: round?,
        characteristic: Some(characteristic?),
        value: Value {
            unit: value.unit.or_else(|| Some(usual(Qif::Unit))),
            ..value
        },
        nominal: Some(nominal?),
        lower: Some(lower?),
        upper: Some(upper?),
        factors: factors?,
        same: same?,
        end: None,
        decimal: '.',
        no_value: no_value?,
        encoding: encoding?,
        bounds: bounds?,
        count: None,
        layout: Layout::default(),
        thousands: None,
        line_breaks: false,
    })
}

/// A role's own keys; without a place it stands where the standard has it, if it has.
pub(crate) fn role_in(table: &Table<'_>, usual: Option<&Qif>) -> Option<Role> {
    table.never(
        &["column", "cell", "label", "xml"],
        "a QIF document has no such place: take qif, attribute, path or constant",
    );
    let places: Vec<(&str, Node<'_>)> = ["qif", "attribute", "path", "constant"]
        .into_iter()
        .filter_map(|key| Some((key, table.get(key)?)))
        .collect();
    let found = found_in(table);
    let from = match (places.as_slice(), usual) {
        ([("qif", node)], _) => word(node).map(Cell::Qif),
        ([("attribute", node)], _) => {
            Some(Cell::Qif(Qif::Attribute(node.name()?.trim().to_owned())))
        }
        ([("path", node)], _) => Some(Cell::Path(regex(node, 1)?.as_str().to_owned())),
        ([(_, node)], _) => Some(Cell::Constant(node.name()?.to_owned())),
        ([], Some(usual)) => Some(Cell::Qif(usual.clone())),
        ([], None) => {
            table.place.fault("none of them", EXPECTED);
            None
        }
        (several, _) => {
            let keys: Vec<String> = several.iter().map(|(key, _)| format!("`{key}`")).collect();
            table.place.fault(keys.join(" and "), EXPECTED);
            None
        }
    };
    found?.at(from?)
}

fn word(node: &Node<'_>) -> Option<Qif> {
    let places = Qif::WORDS;
    let words: Vec<(&str, usize)> = places
        .iter()
        .enumerate()
        .map(|(at, (word, _))| (*word, at))
        .collect();
    let at = node.word(&words)?;
    places.into_iter().nth(at).map(|(_, place)| place)
}
