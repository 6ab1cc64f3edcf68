//! Nominal and limits of one characteristic item, absolute and in the unit of its value.
//!
//! Not here: fit codes (`H7`), bonus tolerances, limits that are stated nowhere.
//!
//! A limit that is not there is absent, never 0.

use super::decimal::Decimal;
use super::links::{Broken, Links};
use super::tree::{Node, Tree};
use super::units::{Unit, Units};
use crate::names::shorten;

/// What bounds a value.
#[derive(Debug, Clone, Default)]
pub(super) struct Bounding {
    pub(super) nominal: Option<f64>,
    pub(super) lower: Option<f64>,
    pub(super) upper: Option<f64>,
    /// What a person should know of these limits, to stand after the characteristic's name.
    pub(super) note: Option<&'static str>,
}

/// Where numbers of one item are looked up.
pub(super) struct Bounds<'t, 'd> {
    pub(super) tree: &'t Tree,
    pub(super) links: &'d Links<'t>,
    pub(super) units: &'d Units<'t>,
    /// The unit of the value.
    pub(super) unit: Option<&'d Unit>,
    /// What is measured, as units are grouped by it.
    pub(super) quantity: Option<&'d str>,
}

impl Bounds<'_, '_> {
    pub(super) fn of(&self, item: Node) -> Result<Bounding, Broken> {
        let tree = self.tree;
        let Some(reference) = tree.child(item, "CharacteristicNominalId") else {
            return Ok(Bounding::default());
        };
        let nominal = self
            .links
            .follow(reference, "the characteristic's nominal")?;
        let target = self.number(tree.child(nominal, "TargetValue"))?;
        let bounding = Bounding {
            nominal: target.map(Decimal::value),
            ..Bounding::default()
        };
        let definition = match tree.child(nominal, "CharacteristicDefinitionId") {
            Some(reference) => self
                .links
                .follow(reference, "the characteristic's definition")?,
            None => nominal,
        };
        let holds_limits = |node: &Node| {
            tree.children(*node)
                .any(|child| matches!(tree.name(child), "MaxValue" | "MinValue"))
        };
        let places = [definition, nominal];
        let tolerance = places
            .into_iter()
            .find_map(|node| tree.child(node, "Tolerance"))
            .or_else(|| places.into_iter().find(holds_limits));
        if let Some(tolerance) = tolerance {
            return self.of_tolerance(tolerance, target, bounding);
        }
        if let Some(zone) = self.zone(definition) {
            return self.of_zone(definition, zone, bounding);
        }
        let has_fit = tree
            .child(definition, "LimitsAndFitsSpecification")
            .is_some();
        Ok(Bounding {
            note: has_fit
                .then_some("its limits are a fit's code, which is not worked out: none are taken"),
            ..bounding
        })
    }

    /// Limits, or signed deviations from the target.
    fn of_tolerance(
        &self,
        tolerance: Node,
        target: Option<Decimal>,
        bounding: Bounding,
    ) -> Result<Bounding, Broken> {
        let tree = self.tree;
        let tolerance = match tree.child(tolerance, "DefinitionId") {
            Some(reference) => self.links.follow(reference, "the tolerance definition")?,
            None => tolerance,
        };
        let of = |name: &str| {
            tree.child(tolerance, name)
                .or_else(|| tree.inside(tolerance).find(|node| tree.name(*node) == name))
        };
        let upper = self.number(of("MaxValue"))?;
        let lower = self.number(of("MinValue"))?;
        if upper.is_none() && lower.is_none() {
            return Ok(bounding);
        }
        let said = of("DefinedAsLimit");
        let text = said.and_then(|node| tree.text(node)).unwrap_or("");
        let absolute = match text {
            "true" | "1" => true,
            "false" | "0" => false,
            _ => {
                return Err(Broken {
                    line: tree.line(said.unwrap_or(tolerance)),
                    found: shorten(text),
                    wrong: format!(
                        "`{}` does not say whether the tolerance's values are limits or deviations",
                        shorten(text)
                    ),
                    hint: "`DefinedAsLimit` is `true` or `false`; export it again",
                });
            }
        };
        if absolute {
            return Ok(Bounding {
                lower: lower.map(Decimal::value),
                upper: upper.map(Decimal::value),
                ..bounding
            });
        }
        let Some(target) = target else {
            return Ok(Bounding {
                note: Some(
                    "its limits are deviations from a target that is not stated: none are taken",
                ),
                ..bounding
            });
        };
        let sum = |deviation: Option<Decimal>| match deviation {
            None => Ok(None),
            Some(deviation) => self.sum(target, deviation, tolerance).map(Some),
        };
        Ok(Bounding {
            lower: sum(lower)?,
            upper: sum(upper)?,
            ..bounding
        })
    }

    /// The width of a tolerance zone; of a composite tolerance its first segment's.
    fn zone(&self, definition: Node) -> Option<Node> {
        let tree = self.tree;
        tree.child(definition, "ToleranceValue").or_else(|| {
            let segments = tree
                .children(definition)
                .find(|child| tree.name(*child).contains("Segment"))?;
            tree.inside(segments)
                .find(|node| tree.name(*node) == "ToleranceValue")
        })
    }

    fn of_zone(
        &self,
        definition: Node,
        zone: Node,
        bounding: Bounding,
    ) -> Result<Bounding, Broken> {
        let tree = self.tree;
        let Some(width) = self.number(Some(zone))? else {
            return Ok(bounding);
        };
        let condition = tree
            .child(definition, "MaterialCondition")
            .and_then(|node| tree.text(node));
        let note = matches!(condition, Some("MAXIMUM" | "LEAST")).then_some(
            "its tolerance grows with the part's material condition, and the bonus is not added: the limit is stricter than the drawing",
        );
        if !tree.name(definition).contains("Profile") {
            return Ok(Bounding {
                upper: Some(width.value()),
                note,
                ..bounding
            });
        }
        let half = width
            .half()
            .ok_or_else(|| self.beyond(width, width, zone))?;
        let sum = |a: Decimal, b: Decimal| self.sum(a, b, zone).map(Some);
        let (lower, upper) =
            if let Some(outer) = self.number(tree.child(definition, "OuterDisposition"))? {
                (sum(outer, width.negative())?, Some(outer.value()))
            } else if let Some(centre) =
                self.number(self.filled(definition, "UnequallyDisposedZone"))?
            {
                (sum(centre, half.negative())?, sum(centre, half)?)
            } else {
                (Some(half.negative().value()), Some(half.value()))
            };
        Ok(Bounding {
            lower,
            upper,
            note,
            ..bounding
        })
    }

    /// The element of that name, or the first inside it, that holds a text.
    fn filled(&self, node: Node, name: &str) -> Option<Node> {
        let found = self.tree.child(node, name)?;
        std::iter::once(found)
            .chain(self.tree.inside(found))
            .find(|node| self.tree.text(*node).is_some())
            .or(Some(found))
    }

    fn sum(&self, a: Decimal, b: Decimal, at: Node) -> Result<f64, Broken> {
        let sum = a.plus(b).map(Decimal::value);
        sum.filter(|sum| sum.is_finite())
            .ok_or_else(|| self.beyond(a, b, at))
    }

    fn beyond(&self, a: Decimal, b: Decimal, at: Node) -> Broken {
        Broken {
            line: self.tree.line(at),
            found: format!("{} and {}", a.value(), b.value()),
            wrong: "target and tolerance add up to a number of too many digits".to_owned(),
            hint: "correct the nominal or the tolerance",
        }
    }

    /// The number of an element, in the unit of the value; `None` without one.
    fn number(&self, node: Option<Node>) -> Result<Option<Decimal>, Broken> {
        let Some((node, text)) = node.and_then(|node| Some((node, self.tree.text(node)?))) else {
            return Ok(None);
        };
        let name = self.tree.name(node);
        let broken = |wrong: String, hint| Broken {
            line: self.tree.line(node),
            found: shorten(text),
            wrong,
            hint,
        };
        let number = Decimal::read(text).ok_or_else(|| {
            broken(
                format!("`{}` is not a number, as {name} is", shorten(text)),
                "the document is not whole: export it again",
            )
        })?;
        let own = self
            .units
            .of(node, self.quantity)
            .map_err(|wrong| broken(wrong, "name units as `FileUnits` does"))?;
        let converted = match (&own, self.unit) {
            (Some(own), Some(unit)) => own.convert(number, unit),
            (None, None) => Some(number),
            _ if self.quantity.is_none() => Some(number),
            _ => None,
        };
        let said = |unit: Option<&Unit>| {
            unit.map_or("states no unit".to_owned(), |unit| {
                format!("is in `{}`", shorten(&unit.name))
            })
        };
        converted.map(Some).ok_or_else(|| {
            broken(
                format!(
                    "{name} {}, but the value {}",
                    said(own.as_ref()),
                    said(self.unit)
                ),
                "state both units, with their factors, in `FileUnits`",
            )
        })
    }
}
