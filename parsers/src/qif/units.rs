//! The units of a QIF document, by name and by their factor to the SI unit.
//!
//! Not here: assuming one. A value whose unit is stated nowhere has none.

use std::collections::HashMap;

use super::decimal::Decimal;
use super::tree::{Node, Tree};
use crate::names::{fold, listed, shorten};

/// Relative difference from which a stated factor is another unit's.
const FACTOR_REL: f64 = 1e-3;

/// One unit.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Unit {
    /// `mm`, `in`, `°` where it is known, else as written.
    pub(super) name: String,
    /// `LinearUnit`, `AngularUnit`, …
    quantity: String,
    /// Unit times this is the SI unit.
    factor: Option<Decimal>,
}

struct Known {
    name: &'static str,
    quantity: &'static str,
    factor: &'static str,
    /// Folded.
    spellings: &'static [&'static str],
}

/// Factors: SI brochure, 9th edition; the inch is 25.4 mm exactly, a degree π/180 rad.
const KNOWN: [Known; 7] = [
    Known {
        name: "mm",
        quantity: "LinearUnit",
        factor: "0.001",
        spellings: &[
            "mm",
            "millimeter",
            "millimetre",
            "millimeters",
            "millimetres",
        ],
    },
    Known {
        name: "µm",
        quantity: "LinearUnit",
        factor: "0.000001",
        spellings: &[
            "µm",
            "μm",
            "um",
            "micrometer",
            "micrometre",
            "micrometers",
            "micrometres",
            "micron",
            "microns",
        ],
    },
    Known {
        name: "cm",
        quantity: "LinearUnit",
        factor: "0.01",
        spellings: &[
            "cm",
            "centimeter",
            "centimetre",
            "centimeters",
            "centimetres",
        ],
    },
    Known {
        name: "m",
        quantity: "LinearUnit",
        factor: "1",
        spellings: &["m", "meter", "metre", "meters", "metres"],
    },
    Known {
        name: "in",
        quantity: "LinearUnit",
        factor: "0.0254",
        spellings: &["in", "inch", "inches", "\""],
    },
    Known {
        name: "°",
        quantity: "AngularUnit",
        factor: "0.017453292519943295",
        spellings: &[
            "degree",
            "degrees",
            "deg",
            "°",
            "angular degree",
            "decimal degree",
        ],
    },
    Known {
        name: "rad",
        quantity: "AngularUnit",
        factor: "1",
        spellings: &["rad", "radian", "radians"],
    },
];

/// The units that a document states.
pub(super) struct Units<'t> {
    tree: &'t Tree,
    primary: Option<Node>,
    by_name: HashMap<&'t str, Vec<Node>>,
    /// Names of all units, as sentences list them.
    listed: String,
}

impl<'t> Units<'t> {
    pub(super) fn new(tree: &'t Tree) -> Self {
        let file_units = tree.child(Node::ROOT, "FileUnits");
        let mut by_name: HashMap<&str, Vec<Node>> = HashMap::new();
        let mut names = Vec::new();
        for unit in file_units.into_iter().flat_map(|units| tree.inside(units)) {
            if let Some(name) = tree
                .child(unit, "UnitName")
                .and_then(|name| tree.text(name))
            {
                names.push(name);
                by_name.entry(name).or_default().push(unit);
            }
        }
        Self {
            tree,
            primary: file_units.and_then(|units| tree.child(units, "PrimaryUnits")),
            by_name,
            listed: listed(names),
        }
    }

    /// The unit of a number that stands in `node`: named by its attribute, else the primary one of
    /// `quantity` (`LinearUnit`). `Err` says what is wrong.
    pub(super) fn of(&self, node: Node, quantity: Option<&str>) -> Result<Option<Unit>, String> {
        let named = self
            .tree
            .attributes(node)
            .find(|(name, value)| is_unit_attribute(name) && !value.is_empty());
        if let Some((attribute, name)) = named {
            let kind = match attribute {
                "unitName" => None,
                _ => Some(capital(attribute)),
            };
            return self.named(name, kind.as_deref()).map(Some);
        }
        let Some((primary, quantity)) = self.primary.zip(quantity) else {
            return Ok(None);
        };
        match self.tree.child(primary, quantity) {
            Some(unit) => self.read(unit),
            None => Ok(None),
        }
    }

    fn named(&self, name: &str, kind: Option<&str>) -> Result<Unit, String> {
        let is_so = |unit: &&Node| kind.is_none_or(|kind| self.tree.name(**unit) == kind);
        let stated = self
            .by_name
            .get(name)
            .and_then(|units| units.iter().find(is_so));
        if let Some(unit) = stated
            && let Some(unit) = self.read(*unit)?
        {
            return Ok(unit);
        }
        if let Some(known) = spelled(name, kind.unwrap_or("LinearUnit")) {
            return Ok(known.unit());
        }
        Err(format!(
            "the unit `{}` is not among the units of this document: {}",
            shorten(name),
            self.listed
        ))
    }

    fn read(&self, unit: Node) -> Result<Option<Unit>, String> {
        let quantity = self.tree.name(unit);
        let conversion = self.tree.child(unit, "UnitConversion");
        let text = |name: &str| {
            conversion
                .and_then(|conversion| self.tree.child(conversion, name))
                .and_then(|node| self.tree.text(node))
        };
        let shifted = text("Offset")
            .is_some_and(|offset| Decimal::read(offset).is_none_or(|by| by.value() != 0.0));
        let factor = match text("Factor").filter(|_| !shifted) {
            None => None,
            Some(written) => Some(
                Decimal::read(written)
                    .filter(|factor| factor.is_positive())
                    .ok_or_else(|| {
                        format!("the unit's factor `{}` is no factor", shorten(written))
                    })?,
            ),
        };
        let si = self.tree.child(unit, "SIUnitName");
        let written = self
            .tree
            .child(unit, "UnitName")
            .and_then(|name| self.tree.text(name));
        let name = match (written, factor) {
            (None, None) => si.and_then(|si| self.tree.text(si)),
            (written, _) => written,
        };
        let by_name = name.and_then(|name| spelled(name, quantity));
        let Some(factor) = factor else {
            return Ok(match (by_name, name) {
                (Some(known), _) if !shifted => Some(known.unit()),
                (_, Some(name)) => Some(Unit {
                    name: name.to_owned(),
                    quantity: quantity.to_owned(),
                    factor: None,
                }),
                _ => None,
            });
        };
        let is_so = |known: &&Known| known.quantity == quantity && known.is(factor);
        let by_factor = KNOWN.iter().find(is_so);
        match (by_name, by_factor, name) {
            (Some(known), by_factor, Some(name)) if !known.is(factor) => {
                let other =
                    by_factor.map_or(String::new(), |other| format!(", that of {}", other.name));
                Err(format!(
                    "the unit is named `{}`, but its factor is {}{other}",
                    shorten(name),
                    factor.value()
                ))
            }
            (Some(known), ..) | (None, Some(known), _) => Ok(Some(known.unit())),
            (None, None, Some(name)) => Ok(Some(Unit {
                name: name.to_owned(),
                quantity: quantity.to_owned(),
                factor: Some(factor),
            })),
            (None, None, None) => Ok(None),
        }
    }
}

impl Unit {
    /// A number given in this unit, in `other`. `None` when it is not known how they compare.
    pub(super) fn convert(&self, number: Decimal, other: &Self) -> Option<Decimal> {
        if self.quantity != other.quantity {
            return None;
        }
        if self.name == other.name {
            return Some(number);
        }
        number.times(self.factor?, other.factor?)
    }
}

impl Unit {
    /// True for any usual spelling of a known unit's name.
    pub(super) fn is_spelled(&self, text: &str) -> bool {
        spelled(text, &self.quantity).is_some_and(|known| known.name == self.name)
    }
}

impl Known {
    fn unit(&self) -> Unit {
        Unit {
            name: self.name.to_owned(),
            quantity: self.quantity.to_owned(),
            factor: Decimal::read(self.factor),
        }
    }

    fn is(&self, factor: Decimal) -> bool {
        Decimal::read(self.factor)
            .is_some_and(|own| (own.value() / factor.value() - 1.0).abs() < FACTOR_REL)
    }
}

fn spelled(name: &str, quantity: &str) -> Option<&'static Known> {
    let key = fold(name);
    KNOWN.iter().find(|known| {
        known.quantity == quantity && known.spellings.iter().any(|spelling| *spelling == key)
    })
}

fn is_unit_attribute(name: &str) -> bool {
    name == "unitName" || (name.ends_with("Unit") && name.len() > 4)
}

/// `LinearUnit` from `linearUnit`.
fn capital(name: &str) -> String {
    let (first, rest) = name.split_at(name.chars().next().map_or(0, char::len_utf8));
    format!("{}{rest}", first.to_uppercase())
}

/// The quantity that a number's own unit attribute speaks of.
pub(super) fn stated_quantity(tree: &Tree, node: Node) -> Option<String> {
    tree.attributes(node)
        .find(|(name, _)| *name != "unitName" && is_unit_attribute(name))
        .map(|(name, _)| capital(name))
}

/// The quantity that a kind of characteristic measures, as units are grouped by it; `None` where the
/// kind does not say.
pub(super) fn quantity(kind: &str) -> Option<&'static str> {
    if let Some(of) = kind.strip_prefix("UserDefined") {
        return Some(match of {
            "Angular" => "AngularUnit",
            "Linear" => "LinearUnit",
            "Area" => "AreaUnit",
            "Force" => "ForceUnit",
            "Mass" => "MassUnit",
            "Pressure" => "PressureUnit",
            "Speed" => "SpeedUnit",
            "Temperature" => "TemperatureUnit",
            "Time" => "TimeUnit",
            _ => return None,
        });
    }
    if kind.ends_with("Taper") {
        return None;
    }
    let is_angle = kind.contains("Angle") || kind.contains("AngularCoordinate");
    Some(match is_angle {
        true => "AngularUnit",
        false => "LinearUnit",
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn known(name: &str, quantity: &str) -> Unit {
        spelled(name, quantity).unwrap().unit()
    }

    /// 1 inch = 25.4 mm exactly (international yard and pound agreement of 1959).
    #[test]
    fn a_limit_in_another_unit_is_converted_by_exact_factors() {
        let (inch, mm) = (
            known("Inches", "LinearUnit"),
            known("millimetre", "LinearUnit"),
        );
        for (inches, millimetres) in [("1", 25.4), ("0.0005", 0.0127), ("-0.002", -0.0508)] {
            let written = Decimal::read(inches).unwrap();
            assert_eq!(inch.convert(written, &mm).unwrap().value(), millimetres);
        }
        let written = Decimal::read("0.0127").unwrap();
        assert_eq!(mm.convert(written, &inch).unwrap().value(), 0.0005);
        let strange = Unit {
            name: "skein".to_owned(),
            quantity: "LinearUnit".to_owned(),
            factor: None,
        };
        assert!(strange.convert(written, &mm).is_none());
    }

    #[test]
    fn kinds_of_characteristics_have_their_quantity() {
        assert_eq!(quantity("Diameter"), Some("LinearUnit"));
        assert_eq!(quantity("Angularity"), Some("LinearUnit"));
        assert_eq!(quantity("AngleBetween"), Some("AngularUnit"));
        assert_eq!(quantity("UserDefinedTemperature"), Some("TemperatureUnit"));
        assert_eq!(quantity("UserDefinedUnit"), None);
    }
}
