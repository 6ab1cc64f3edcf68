//! The measured characteristics of a document, run by run, and what is said of each.

use std::collections::{BTreeSet, HashMap, HashSet};

use super::decimal::Decimal;
use super::facts::{self, Labels, Said};
use super::limits::{Bounding, Bounds};
use super::links::{Broken, Links};
use super::place::Qif;
use super::tree::{Node, RESULTS_2, Tree, is_measurement};
use super::units::{Unit, Units, quantity, stated_quantity};
use crate::fault::Fault;
use crate::grid::{Content, Place};
use crate::names::{fold, shorten};
use crate::parsed::Refused;
use crate::reader::Roles;
use crate::source::Where;

/// Statuses that stand in place of a value where none was to be measured: go/no-go, basic dimensions.
const VERDICTS: [&str; 6] = [
    "PASS",
    "FAIL",
    "REWORK",
    "UNDEFINED",
    "BASIC",
    "BASIC_OR_TED",
];

/// Said where a run has no time.
const NO_TIME: &str = "no time of inspection is stated for this run";

/// One measured characteristic and what its references lead to.
pub(super) struct Measured {
    node: Node,
    pub(super) line: u32,
    run: usize,
    item: Result<Node, Broken>,
    /// The part that was measured; `Ok(None)`: none is named.
    component: Result<Option<Node>, Broken>,
    value: Option<Node>,
    pub(super) unit: Option<Unit>,
    bounding: Result<Bounding, Broken>,
    unusable_unit: Option<String>,
}

/// Whom an unusable value costs.
pub(super) enum Cost {
    /// It alone: it is no measured value.
    Itself(Fault),
    Run(Fault),
}

/// What is the same for a part, whoever measures it.
#[derive(Clone)]
struct Part {
    serial: Said,
    operator: Option<Said>,
    inspected: Option<Said>,
}

/// What is the same for a whole run.
struct Run {
    node: Node,
    line: u32,
    operator: Option<Said>,
    inspected: Option<Said>,
    /// The first time stamp of its values, by part.
    stamps: HashMap<Option<Node>, Said>,
    component: Result<Option<Node>, Broken>,
    /// The line of an earlier run that says the same under the same identifier.
    copy_of: Option<u32>,
}

pub(super) struct Results<'t> {
    tree: &'t Tree,
    links: Links<'t>,
    units: Units<'t>,
    labels: Labels,
    /// Block of results.
    node: Node,
    runs: Vec<Run>,
    measurements: Vec<(usize, Node)>,
    /// Items, by the text that refers to them, that have a number somewhere in the document.
    measured_items: HashSet<&'t str>,
    /// Where the rule takes the value from, when that is here.
    value: Option<Qif>,
    asks_for_limits: bool,
    asks_for_unit: bool,
    names: HashMap<Node, Option<String>>,
    parts: HashMap<Node, Part>,
    bounds: HashMap<(Node, Option<String>), Result<Bounding, Broken>>,
    attributes: HashMap<(Node, String), Option<Said>>,
    notes: BTreeSet<(String, &'static str)>,
}

impl<'t> Results<'t> {
    pub(super) fn new(tree: &'t Tree, roles: &Roles) -> Result<Self, Refused> {
        let node = ["Results", RESULTS_2]
            .into_iter()
            .find_map(|name| tree.child(Node::ROOT, name))
            .ok_or_else(|| {
                Refused::new("this QIF document holds no results, only what is to be measured")
                    .hint("leave plans and definitions out with `files`")
            })?;
        let at = |source: Option<usize>| match source.map(|source| &roles.sources[source].from) {
            Some(Where::Qif(place)) => Some(place.clone()),
            _ => None,
        };
        let bounding = [
            roles.nominal,
            roles.lower.map(|limit| limit.source),
            roles.upper.map(|limit| limit.source),
        ];
        let mut results = Self {
            tree,
            links: Links::new(tree),
            units: Units::new(tree),
            labels: Labels::new(tree),
            node,
            runs: Vec::new(),
            measurements: Vec::new(),
            measured_items: HashSet::new(),
            value: at(Some(roles.value)),
            asks_for_limits: bounding.into_iter().any(|source| at(source).is_some()),
            asks_for_unit: at(roles.unit).is_some(),
            names: HashMap::new(),
            parts: HashMap::new(),
            bounds: HashMap::new(),
            attributes: HashMap::new(),
            notes: BTreeSet::new(),
        };
        let mut by_id: HashMap<String, (Node, u32)> = HashMap::new();
        for run in runs_in(tree, node) {
            results.run(run, &mut by_id);
        }
        if results.measurements.is_empty() {
            return Err(Refused::new(format!(
                "the results of this QIF document (line {}) hold no measured characteristic",
                tree.line(node)
            ))
            .hint(
                "was anything measured? have measured characteristics written, not features alone",
            ));
        }
        Ok(results)
    }

    fn run(&mut self, node: Node, by_id: &mut HashMap<String, (Node, u32)>) {
        let tree = self.tree;
        let traceability = [node, self.node]
            .into_iter()
            .filter_map(|holder| tree.child(holder, "InspectionTraceability"));
        let (mut operator, mut inspected) = (None, None);
        for block in traceability {
            operator = operator.or_else(|| facts::operator(tree, block));
            inspected = inspected.or_else(|| facts::inspected(tree, block));
        }
        let line = tree.line(node);
        let id = tree
            .child(node, "ThisResultsInstanceQPId")
            .and_then(|id| tree.text(id));
        let copy_of = id.and_then(|id| {
            let (first, first_line) = *by_id.entry(id.to_lowercase()).or_insert((node, line));
            (first != node && facts::same_run(tree, first, node)).then_some(first_line)
        });
        let mut run = Run {
            node,
            line,
            operator,
            inspected,
            stamps: HashMap::new(),
            component: self.components(node),
            copy_of,
        };
        let measured = tree
            .children(node)
            .filter(|child| tree.name(*child) == "MeasuredCharacteristics")
            .flat_map(|block| std::iter::once(block).chain(tree.children(block)))
            .flat_map(|block| tree.children(block))
            .filter(|child| is_measurement(tree.name(*child)));
        for measurement in measured {
            self.measurements.push((self.runs.len(), measurement));
            let has_number = ["Value", "MaxValue", "MinValue"]
                .into_iter()
                .any(|name| tree.child(measurement, name).is_some());
            let item = tree.child(measurement, "CharacteristicItemId");
            if let Some(item) = item.and_then(|item| tree.text(item))
                && has_number
            {
                self.measured_items.insert(item);
            }
            let stamp = tree.child(measurement, "TimeStamp");
            if let Some((stamp, text)) = stamp.and_then(|at| Some((at, tree.text(at)?)))
                && let Ok(component) = self.component(measurement, &run.component)
            {
                let said = Said::text(tree.line(stamp), text);
                run.stamps
                    .entry(component)
                    .and_modify(|first| {
                        if let Content::Text(before) = &first.content
                            && is_earlier(text, before)
                        {
                            *first = said.clone();
                        }
                    })
                    .or_insert(said);
            }
        }
        self.runs.push(run);
    }

    /// The one part that a run names for all its values.
    fn components(&self, run: Node) -> Result<Option<Node>, Broken> {
        let tree = self.tree;
        let Some(list) = tree.child(run, "ActualComponentIds") else {
            return match tree.child(run, "ActualComponentId") {
                Some(reference) => self.links.follow(reference, "the part").map(Some),
                None => Ok(None),
            };
        };
        let ids: Vec<Node> = tree
            .children(list)
            .filter(|id| tree.name(*id) == "Id")
            .collect();
        match ids.as_slice() {
            [] => Ok(None),
            [one] => self.links.follow(*one, "the part").map(Some),
            several => Err(Broken {
                line: tree.line(list),
                found: format!("{} parts", several.len()),
                wrong: format!(
                    "the run lists {} parts, and the value does not say which of them it is of",
                    several.len()
                ),
                hint: "have one run written a part",
            }),
        }
    }

    fn component(
        &self,
        measurement: Node,
        of_run: &Result<Option<Node>, Broken>,
    ) -> Result<Option<Node>, Broken> {
        match self.tree.child(measurement, "ActualComponentId") {
            Some(reference) => self.links.follow(reference, "the part").map(Some),
            None => of_run.clone(),
        }
    }

    /// Calls `take` for every measured characteristic, in document order.
    pub(super) fn each(&mut self, mut take: impl FnMut(&mut Self, &Measured)) {
        for (run, node) in std::mem::take(&mut self.measurements) {
            let measured = self.measured(run, node);
            take(self, &measured);
        }
    }

    fn measured(&mut self, run: usize, node: Node) -> Measured {
        let tree = self.tree;
        let line = tree.line(node);
        let item = match tree.child(node, "CharacteristicItemId") {
            Some(reference) => self.links.follow(reference, "the characteristic item"),
            None => Err(Broken {
                line,
                found: String::new(),
                wrong: "the value does not say which characteristic item it is of".to_owned(),
                hint: "the document is not whole: export it again",
            }),
        };
        let value = tree.child(node, self.value_name());
        let quantity = value
            .and_then(|value| stated_quantity(tree, value))
            .or_else(|| quantity(kind(tree, node)).map(str::to_owned));
        let unit = match value.map(|value| self.units.of(value, quantity.as_deref())) {
            None => Ok(None),
            Some(unit) => unit,
        };
        let (unit, unusable_unit) = match unit {
            Ok(unit) => (unit, None),
            Err(wrong) => (None, Some(wrong)),
        };
        let bounding = match &item {
            Ok(item) if self.asks_for_limits && value.is_some() && unusable_unit.is_none() => {
                self.bounding(*item, unit.as_ref(), quantity.as_deref())
            }
            _ => Ok(Bounding::default()),
        };
        Measured {
            node,
            line,
            run,
            item,
            component: self.component(node, &self.runs[run].component),
            value,
            unit,
            bounding,
            unusable_unit,
        }
    }

    fn bounding(
        &mut self,
        item: Node,
        unit: Option<&Unit>,
        quantity: Option<&str>,
    ) -> Result<Bounding, Broken> {
        let key = (item, unit.map(|unit| unit.name.clone()));
        if let Some(known) = self.bounds.get(&key) {
            return known.clone();
        }
        let bounds = Bounds {
            tree: self.tree,
            links: &self.links,
            units: &self.units,
            unit,
            quantity,
        };
        let bounding = bounds.of(item);
        if let Ok(Bounding {
            note: Some(note), ..
        }) = &bounding
        {
            let name = self.name(item).unwrap_or_default();
            self.notes.insert((name, note));
        }
        self.bounds.insert(key, bounding.clone());
        bounding
    }

    /// The element that a rule takes the value from.
    fn value_name(&self) -> &'static str {
        match &self.value {
            Some(Qif::Greatest) => "MaxValue",
            Some(Qif::Least) => "MinValue",
            _ => "Value",
        }
    }

    fn name(&mut self, item: Node) -> Option<String> {
        let (labels, tree) = (&self.labels, self.tree);
        self.names
            .entry(item)
            .or_insert_with(|| labels.of(tree, item))
            .clone()
    }

    /// Sentences about limits that are not all they could be.
    pub(super) fn notes(&self) -> Vec<String> {
        self.notes
            .iter()
            .map(|(name, note)| format!("`{}`: {note}", shorten(name)))
            .collect()
    }

    /// True when the text is a name of the unit.
    pub(super) fn is_called(&self, unit: &Unit, text: &str) -> bool {
        fold(&unit.name) == fold(text) || unit.is_spelled(text)
    }

    /// What the document says at a place, as seen from one value.
    pub(super) fn say(&mut self, measured: &Measured, place: &Qif) -> Said {
        let tree = self.tree;
        let part = match place {
            Qif::Serial | Qif::Operator | Qif::Time => self.part(measured),
            _ => None,
        };
        let run = &self.runs[measured.run];
        let said = |node: Option<Node>| {
            let node = node?;
            Some(Said::text(tree.line(node), tree.text(node)?))
        };
        let number = |number: fn(&Bounding) -> Option<f64>| {
            let content = match measured.bounding.as_ref().ok().and_then(number) {
                Some(number) => Content::Number(number),
                None => Content::Blank,
            };
            Some(Said {
                line: measured.line,
                content,
            })
        };
        let found = match place {
            Qif::Serial => match (&measured.component, part) {
                (Err(broken), _) => Some(Said::broken(broken)),
                (Ok(_), part) => part.map(|part| part.serial),
            },
            Qif::Component => {
                let part = measured.component.as_ref().ok().copied().flatten();
                part.and_then(|part| Some(Said::text(tree.line(part), tree.attribute(part, "id")?)))
            }
            Qif::Operator => run
                .operator
                .clone()
                .or_else(|| part.and_then(|part| part.operator)),
            Qif::Time => {
                let component = measured.component.as_ref().ok().copied().flatten();
                let stamp = run.stamps.get(&component).cloned();
                stamp
                    .or_else(|| run.inspected.clone())
                    .or_else(|| part.and_then(|part| part.inspected))
                    .or_else(|| Some(Said::unusable(run.line, NO_TIME)))
            }
            Qif::Trial => self.user_attribute(measured, "Trial"),
            Qif::Attribute(name) => self.user_attribute(measured, name),
            Qif::Name => match &measured.item {
                Err(broken) => Some(Said::broken(broken)),
                Ok(item) => {
                    let (item, line) = (*item, tree.line(*item));
                    self.name(item).map(|name| Said::text(line, &name))
                }
            },
            Qif::Designator => match &measured.item {
                Err(broken) => Some(Said::broken(broken)),
                Ok(item) => said(facts::designator(tree, *item)),
            },
            Qif::Value | Qif::Greatest | Qif::Least => {
                let name = match place {
                    Qif::Greatest => "MaxValue",
                    Qif::Least => "MinValue",
                    _ => "Value",
                };
                said(tree.child(measured.node, name)).map(|said| match &said.content {
                    // `5.` is a decimal number of XML Schema
                    Content::Text(text) if Decimal::read(text).is_some() => {
                        Said::text(said.line, text.strip_suffix('.').unwrap_or(text))
                    }
                    _ => said,
                })
            }
            Qif::Unit => measured
                .unit
                .as_ref()
                .map(|unit| Said::text(measured.line, &unit.name)),
            Qif::Nominal => number(|bounding| bounding.nominal),
            Qif::Lower => number(|bounding| bounding.lower),
            Qif::Upper => number(|bounding| bounding.upper),
            Qif::Device => self.device(measured, "Name"),
            Qif::DeviceSerial => self.device(measured, "SerialNumber"),
            Qif::Run => said(tree.child(run.node, "ThisResultsInstanceQPId")),
            Qif::Status => status(tree, measured.node)
                .map(|status| Said::text(tree.line(measured.node), status)),
        };
        found.unwrap_or(Said::nothing(measured.line))
    }

    fn part(&mut self, measured: &Measured) -> Option<Part> {
        let node = (*measured.component.as_ref().ok()?)?;
        let tree = self.tree;
        let part = self.parts.entry(node).or_insert_with(|| {
            let serial = tree.child(node, "SerialNumber");
            let text = serial.and_then(|serial| tree.text(serial));
            let traced = tree.child(node, "Traceability");
            Part {
                serial: match (serial, text) {
                    (Some(serial), Some(text)) => Said::text(tree.line(serial), text),
                    _ => Said::nothing(tree.line(node)),
                },
                operator: traced.and_then(|traced| facts::operator(tree, traced)),
                inspected: traced.and_then(|traced| facts::inspected(tree, traced)),
            }
        });
        Some(part.clone())
    }

    fn user_attribute(&mut self, measured: &Measured, name: &str) -> Option<Said> {
        let tree = self.tree;
        if let Some(own) = facts::user_attribute(tree, measured.node, name) {
            return Some(own);
        }
        let part = measured.component.as_ref().ok().copied().flatten();
        let run = self.runs[measured.run].node;
        [Some(run), part, Some(self.node), Some(Node::ROOT)]
            .into_iter()
            .flatten()
            .find_map(|holder| {
                self.attributes
                    .entry((holder, name.to_owned()))
                    .or_insert_with(|| facts::user_attribute(tree, holder, name))
                    .clone()
            })
    }

    fn device(&self, measured: &Measured, name: &str) -> Option<Said> {
        let item = measured.item.as_ref().ok().copied();
        let part = measured.component.as_ref().ok().copied().flatten();
        let traced = part.and_then(|part| self.tree.child(part, "Traceability"));
        [Some(measured.node), item, traced]
            .into_iter()
            .flatten()
            .find_map(|holder| facts::device(self.tree, &self.links, holder, name))
    }

    /// What keeps a value from being used, and whom that costs.
    pub(super) fn cost(&self, measured: &Measured) -> Option<Cost> {
        let tree = self.tree;
        let at = |line: u32, path: &'static str| Place::Element { line, path };
        let here = |expected: &str, wrong: String| {
            Fault::new(
                at(measured.line, "CharacteristicMeasurement"),
                "",
                expected,
                wrong,
            )
        };
        let run = &self.runs[measured.run];
        if let Some(first) = run.copy_of {
            let wrong = format!(
                "the run in line {} is the one in line {first} once more, with the same identifier",
                run.line
            );
            return Some(Cost::Itself(
                here("each run once", wrong).hint("the first is used"),
            ));
        }
        let of_broken = |broken: &Broken, expected: &str| {
            let mut fault = Fault::new(
                at(broken.line, "CharacteristicMeasurement"),
                broken.found.clone(),
                expected,
                broken.wrong.clone(),
            );
            fault.hint = Some(broken.hint.to_owned());
            Cost::Run(fault)
        };
        if self.value.is_some() {
            let kind = kind(tree, measured.node);
            if kind == "UserDefinedAttribute" {
                let wrong = "a user-defined attribute has a text, no number".to_owned();
                return Some(Cost::Itself(
                    here("a measured value", wrong).hint("it is not studied"),
                ));
            }
            if let Some(cost) = self.without_value(measured, &here) {
                return Some(cost);
            }
        }
        if let Err(broken) = &measured.item {
            return Some(of_broken(broken, "a characteristic of this document"));
        }
        if self.asks_for_unit
            && let Some(wrong) = &measured.unusable_unit
        {
            let fault = Fault::new(
                at(measured.line, "CharacteristicMeasurement/Value"),
                "",
                "a unit of this document",
                wrong.clone(),
            );
            return Some(Cost::Run(
                fault.hint("correct the units where the export is made"),
            ));
        }
        match &measured.bounding {
            Err(broken) => {
                let mut cost = of_broken(broken, "nominal and limits that can be read");
                if let Cost::Run(fault) = &mut cost {
                    fault.place = at(broken.line, "CharacteristicDefinition").to_string();
                }
                Some(cost)
            }
            Ok(_) => None,
        }
    }

    fn without_value(
        &self,
        measured: &Measured,
        here: &dyn Fn(&str, String) -> Fault,
    ) -> Option<Cost> {
        if measured.value.is_some() {
            return None;
        }
        let tree = self.tree;
        let others: Vec<&str> = ["Value", "MaxValue", "MinValue"]
            .into_iter()
            .filter(|name| tree.child(measured.node, name).is_some())
            .collect();
        if !others.is_empty() {
            let wrong = format!(
                "there is no {}, only {}",
                self.value_name(),
                others.join(" and ")
            );
            let fault = here("a measured value", wrong).hint(
                "if one of them is what is studied, say so, as in `value = { qif = \"max\" }`",
            );
            return Some(Cost::Run(fault));
        }
        let status = status(tree, measured.node).unwrap_or("");
        let reference = tree
            .child(measured.node, "CharacteristicItemId")
            .and_then(|item| tree.text(item));
        let elsewhere = reference.is_some_and(|item| self.measured_items.contains(item));
        let wrong = format!("there is no value, only the status `{}`", shorten(status));
        Some(match VERDICTS.contains(&status) && !elsewhere {
            true => Cost::Itself(
                here("a measured value", wrong)
                    .hint("a go/no-go result cannot be studied as a measured value"),
            ),
            false => Cost::Run(here("a measured value", wrong).hint("measure this run again")),
        })
    }
}

/// The runs of a block of results, in sets or not.
fn runs_in(tree: &Tree, results: Node) -> impl Iterator<Item = Node> {
    let is_run = |node: &Node| tree.name(*node) == "MeasurementResults";
    tree.children(results)
        .flat_map(move |child| {
            let in_set = tree.name(child) == "MeasurementResultsSet";
            let inside = in_set.then(|| tree.children(child));
            std::iter::once(child).chain(inside.into_iter().flatten())
        })
        .filter(is_run)
}

/// `Diameter` of a `DiameterCharacteristicMeasurement`.
fn kind(tree: &Tree, measurement: Node) -> &str {
    let name = tree.name(measurement);
    name.split_once("Characteristic")
        .map_or(name, |(kind, _)| kind)
}

fn status(tree: &Tree, measurement: Node) -> Option<&str> {
    let status = tree.child(measurement, "Status")?;
    std::iter::once(status)
        .chain(tree.inside(status))
        .find_map(|node| tree.text(node))
}

/// True when one time stamp means an earlier moment than another; two that cannot be compared stay
/// in their order.
fn is_earlier(a: &str, b: &str) -> bool {
    use jiff::Timestamp;
    use jiff::civil::DateTime;
    match (a.parse::<Timestamp>(), b.parse::<Timestamp>()) {
        (Ok(a), Ok(b)) => a < b,
        (Err(_), Err(_)) => match (a.parse::<DateTime>(), b.parse::<DateTime>()) {
            (Ok(a), Ok(b)) => a < b,
            _ => false,
        },
        _ => false,
    }
}
