//! What a document says at each place, as seen from one measured characteristic.

use super::decimal::Decimal;
use super::facts::{self, Said};
use super::limits::Bounding;
use super::place::Qif;
use super::results::{Measured, Part, Results};
use super::tree::{Node, Tree};
use crate::grid::Content;

/// Said where a run has no time.
const NO_TIME: &str = "no time of inspection is stated for this run";

impl Results<'_> {
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
}

/// The status that the writer gave.
pub(super) fn status(tree: &Tree, measurement: Node) -> Option<&str> {
    let status = tree.child(measurement, "Status")?;
    std::iter::once(status)
        .chain(tree.inside(status))
        .find_map(|node| tree.text(node))
}
