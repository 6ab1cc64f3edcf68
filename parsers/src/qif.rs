//! QIF results (ANSI/DMSC QIF 2.0, 2.1 and 3.0; ISO 23952) to records: one a measured characteristic.
//!
//! Model: a document is a graph. A measured value names its characteristic item, that its nominal,
//! that its definition with the tolerance; a run (`MeasurementResults`) names its parts, operator and
//! times. [`Qif`] names what is looked up, as seen from one value; every role of a rule takes one of
//! them, a path, or a constant.
//!
//! Not here: judging by the writer's status, statistics, features, other documents (never opened).
//! A value without a number that a go/no-go gauge gave is no reading and costs its run nothing.
//!
//! Source: ISO 23952:2020.

mod cost;
mod decimal;
mod facts;
mod limits;
mod links;
mod place;
mod results;
mod say;
mod tree;
mod units;

use crate::fault::Fault;
use crate::grid::{Content, Field, Place};
use crate::identity::Identity;
use crate::names::shorten;
use crate::parsed::{Parsed, Refused, SetAside};
use crate::reader::{OTHER_FORM, Reader, Roles, RuleError, TrialBy};
use crate::rule::{Cell, Form, Role, Rule, Trial};
use crate::runs::Runs;
use crate::source::Where;
use cost::Cost;
use facts::Said;
pub use place::Qif;
use results::Results;
use tree::Tree;

/// Checks that places in a QIF document stand in rules for such documents, and no others do.
pub(crate) fn fits(rule: &Rule) -> Result<(), RuleError> {
    let is_qif = matches!(rule.form, Form::Qif);
    let trial = match &rule.trial {
        Some(Trial::Stated(role)) => Some(role),
        _ => None,
    };
    let single: [(&str, Option<&Role>); 11] = [
        ("part", Some(&rule.part)),
        ("appraiser", rule.appraiser.as_ref()),
        ("trial", trial),
        ("time", rule.taken.as_ref().map(|taken| &taken.role)),
        ("round", rule.round.as_ref()),
        ("characteristic", rule.characteristic.as_ref()),
        ("value", Some(&rule.value.role)),
        ("unit", rule.value.unit.as_ref()),
        ("nominal", rule.nominal.as_ref()),
        ("lower limit", rule.lower.as_ref().map(|limit| &limit.role)),
        ("upper limit", rule.upper.as_ref().map(|limit| &limit.role)),
    ];
    let named = rule.factors.iter().chain(&rule.same);
    let named = named.map(|(name, role)| (name.as_str(), Some(role)));
    for (name, role) in single.into_iter().chain(named) {
        let Some(role) = role else { continue };
        let wrong = match (&role.from, is_qif) {
            (Cell::Qif(_), false) => "a place in a QIF document, but the form is another",
            (Cell::Qif(_) | Cell::Path(_) | Cell::Constant(_), true) | (_, false) => continue,
            _ => "no place in a QIF document, but the form is QIF",
        };
        return Err(RuleError::new(name, wrong));
    }
    if is_qif && rule.decimal != '.' {
        return Err(RuleError::new("decimal", "QIF writes a point"));
    }
    if is_qif && rule.end.is_some() {
        return Err(RuleError::new("end", "a QIF document ends with its root"));
    }
    Ok(())
}

/// Reads decoded text. `once` holds the contents that are the same for the whole export, by source.
pub(crate) fn read(
    text: &str,
    reader: &Reader,
    once: &[Option<Content>],
) -> Result<Parsed, Refused> {
    if !text.trim_start().starts_with('<') {
        return Err(Refused::new(format!(
            "this is not XML, as QIF documents are; it begins with `{}`",
            shorten(text)
        ))
        .hint(OTHER_FORM));
    }
    let tree = Tree::read(text, &reader.bounds)?;
    let mut notes = Vec::new();
    let roles = as_far_as_stated(&tree, &reader.roles, &mut notes);
    let mut results = Results::new(&tree, &roles)?;
    let mut runs = Runs::new(&roles);
    let mut alone = Vec::new();
    let mut said: Vec<Said> = Vec::new();
    results.each(|results, measured| {
        said.clear();
        for (source, once) in roles.sources.iter().zip(once) {
            said.push(match (&source.from, once) {
                (Where::Qif(place), None) => results.say(measured, place),
                _ => Said::nothing(measured.line),
            });
        }
        let fields: Vec<Field<'_>> = roles
            .sources
            .iter()
            .zip(once)
            .zip(&said)
            .map(|((source, once), said)| match (&source.from, once) {
                (_, Some(content)) => source.once_field(content),
                (Where::Qif(place), None) => Field {
                    place: Place::Element {
                        line: said.line,
                        path: place.shown(),
                    },
                    content: &said.content,
                },
                _ => Field {
                    place: Place::Rule,
                    content: &said.content,
                },
            })
            .collect();
        match results.cost(measured) {
            Some(Cost::Itself(fault)) => alone.push(SetAside {
                reason: fault.sentence(),
                run: Identity::read(&roles, &fields).run,
                place: fault.place,
                found: fault.found,
                expected: fault.expected,
                hint: fault.hint,
                readings: 1,
            }),
            Some(Cost::Run(fault)) => runs.add(&fields, Some(fault)),
            None => runs.add(&fields, unit_differs(&roles, results, measured, &fields)),
        }
    });
    notes.extend(results.notes());
    let mut parsed = runs.finish(None);
    parsed.set_aside.extend(alone);
    parsed.notes = notes;
    Ok(parsed)
}

/// A unit that the rule states and the document states otherwise.
fn unit_differs(
    roles: &Roles,
    results: &Results<'_>,
    measured: &results::Measured,
    fields: &[Field<'_>],
) -> Option<Fault> {
    let source = roles.unit?;
    if matches!(roles.sources[source].from, Where::Qif(_)) {
        return None;
    }
    let own = measured.unit.as_ref()?;
    let stated = roles.sources[source].text(fields[source]).ok()??;
    if results.is_called(own, &stated) {
        return None;
    }
    let wrong = format!(
        "the value is in `{}`, but the rule says `{}`",
        shorten(&own.name),
        shorten(&stated)
    );
    Some(
        Fault::new(
            fields[roles.value].place,
            shorten(&own.name),
            format!("`{}`", shorten(&stated)),
            wrong,
        )
        .hint("leave `unit` out: the document states it"),
    )
}

/// The roles without those that nothing in the document speaks of: an export that names no operator
/// at all says nothing of the appraiser, while one that names some has runs that lack theirs.
fn as_far_as_stated(tree: &Tree, roles: &Roles, notes: &mut Vec<String>) -> Roles {
    let mut stated = roles.clone();
    let is_at = |source: usize, place: &Qif| matches!(&roles.sources[source].from, Where::Qif(from) if from == place);
    let any = |names: &[&str]| tree.all().any(|node| names.contains(&tree.name(node)));
    if roles.appraiser.is_some_and(|at| is_at(at, &Qif::Operator)) && !any(&["InspectionOperator"])
    {
        stated.appraiser = None;
        notes.push("the document names no operator; say where the appraiser stands, as in `appraiser = { path = '^([^/]+)/' }`".to_owned());
    }
    if let TrialBy::Label(at) = roles.trial
        && is_at(at, &Qif::Trial)
    {
        let has_trial = tree.all().any(|node| {
            tree.name(node) == "Attributes"
                && tree.children(node).any(|attribute| {
                    tree.attribute(attribute, "name")
                        .is_some_and(|name| name.eq_ignore_ascii_case("trial"))
                })
        });
        if !has_trial {
            stated.trial = TrialBy::Nothing;
        }
    }
    // Runs that neither a trial nor a time tells apart would be taken for one another.
    let told_apart = stated.trial != TrialBy::Nothing;
    let times = ["TimeStamp", "InspectionStart", "InspectionEnd"];
    if told_apart
        && roles
            .taken
            .as_ref()
            .is_some_and(|(at, _)| is_at(*at, &Qif::Time))
        && !any(&times)
    {
        stated.taken = None;
        notes.push("the document states no time of inspection; if it matters when a part was measured, say where `taken` stands".to_owned());
    }
    stated
}
