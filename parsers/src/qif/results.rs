//! The measured characteristics of a document, run by run, and what is said of each.

use std::collections::{BTreeSet, HashMap, HashSet};

use super::facts::{self, Labels, Said};
use super::limits::{Bounding, Bounds};
use super::links::{Broken, Links};
use super::place::Qif;
use super::tree::{Node, RESULTS_2, Tree, is_measurement};
use super::units::{Unit, Units, quantity, stated_quantity};
use crate::grid::Content;
use crate::names::{fold, shorten};
use crate::parsed::Refused;
use crate::reader::Roles;
use crate::source::Where;

/// One measured characteristic and what its references lead to.
pub(super) struct Measured {
    pub(super) node: Node,
    pub(super) line: u32,
    pub(super) run: usize,
    pub(super) item: Result<Node, Broken>,
    /// The part that was measured; `Ok(None)`: none is named.
    pub(super) component: Result<Option<Node>, Broken>,
    pub(super) value: Option<Node>,
    pub(super) unit: Option<Unit>,
    pub(super) bounding: Result<Bounding, Broken>,
    pub(super) unusable_unit: Option<String>,
}

/// What is the same for a part, whoever measures it.
#[derive(Clone)]
pub(super) struct Part {
    pub(super) serial: Said,
    pub(super) operator: Option<Said>,
    pub(super) inspected: Option<Said>,
}

/// What is the same for a whole run.
pub(super) struct Run {
    pub(super) node: Node,
    pub(super) line: u32,
    pub(super) operator: Option<Said>,
    pub(super) inspected: Option<Said>,
    /// The first time stamp of its values, by part.
    pub(super) stamps: HashMap<Option<Node>, Said>,
    pub(super) component: Result<Option<Node>, Broken>,
    /// The line of an earlier run that says the same under the same identifier.
    pub(super) copy_of: Option<u32>,
}

pub(super) struct Results<'t> {
    pub(super) tree: &'t Tree,
    pub(super) links: Links<'t>,
    pub(super) units: Units<'t>,
    pub(super) labels: Labels,
    /// Block of results.
    pub(super) node: Node,
    pub(super) runs: Vec<Run>,
    pub(super) measurements: Vec<(usize, Node)>,
    /// Items, by the text that refers to them, that have a number somewhere in the document.
    pub(super) measured_items: HashSet<&'t str>,
    /// Where the rule takes the value from, when that is here.
    pub(super) value: Option<Qif>,
    pub(super) asks_for_limits: bool,
    pub(super) asks_for_unit: bool,
    pub(super) names: HashMap<Node, Option<String>>,
    pub(super) parts: HashMap<Node, Part>,
    pub(super) bounds: HashMap<(Node, Option<String>), Result<Bounding, Broken>>,
    pub(super) attributes: HashMap<(Node, String), Option<Said>>,
    pub(super) notes: BTreeSet<(String, &'static str)>,
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
    pub(super) fn value_name(&self) -> &'static str {
        match &self.value {
            Some(Qif::Greatest) => "MaxValue",
            Some(Qif::Least) => "MinValue",
            _ => "Value",
        }
    }

    pub(super) fn name(&mut self, item: Node) -> Option<String> {
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
pub(super) fn kind(tree: &Tree, measurement: Node) -> &str {
    let name = tree.name(measurement);
    name.split_once("Characteristic")
        .map_or(name, |(kind, _)| kind)
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
