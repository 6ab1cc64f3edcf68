//! Units of length and angle, by the ways they are written, and the factors between them.
//!
//! A unit that is not listed is only ever itself. A mark that means two things (`"` is inch and second
//! of arc, `'` foot and minute) means one of them beside a unit of the same quantity, else nothing.
//!
//! Factors are exact but for the radian. Source: BIPM, *The International System of Units*, 9th ed. 2019,
//! tables 7 and 8; inch: NIST Special Publication 811 (2008), appendix B.6.

use crate::names::{fold_blanks, shorten};
use crate::number::{NotANumber, Number, Quantity};

/// What is measured.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Kind {
    Length,
    Angle,
}

/// A unit in metres or degrees: `over / under`.
#[derive(Debug, PartialEq, Eq)]
struct Known {
    name: &'static str,
    kind: Kind,
    /// `None`: 180/π.
    factor: Option<(i128, i128)>,
    spellings: &'static [&'static str],
    /// Marks that mean something else beside another quantity.
    marks: &'static [&'static str],
}

const fn length(
    name: &'static str,
    factor: (i128, i128),
    spellings: &'static [&'static str],
) -> Known {
    Known {
        name,
        kind: Kind::Length,
        factor: Some(factor),
        spellings,
        marks: &[],
    }
}

static UNITS: [Known; 10] = [
    length("m", (1, 1), &["metre", "meter"]),
    length(
        "cm",
        (1, 100),
        &["CM", "\u{339d}", "centimetre", "centimeter"],
    ),
    length(
        "mm",
        (1, 1000),
        &["MM", "\u{339c}", "millimetre", "millimeter"],
    ),
    length(
        "µm",
        (1, 1_000_000),
        &[
            "\u{3bc}m",
            "um",
            "UM",
            "\u{339b}",
            "micrometre",
            "micrometer",
            "micron",
        ],
    ),
    length(
        "nm",
        (1, 1_000_000_000),
        &["\u{339a}", "nanometre", "nanometer"],
    ),
    Known {
        marks: &["\"", "''", "\u{2033}", "\u{201d}", "\u{2019}\u{2019}"],
        ..length(
            "in",
            (254, 10_000),
            &["IN", "inch", "INCH", "Inch", "inches"],
        )
    },
    Known {
        name: "°",
        kind: Kind::Angle,
        factor: Some((1, 1)),
        spellings: &["\u{ba}", "deg", "DEG", "degree", "degrees"],
        marks: &[],
    },
    Known {
        name: "arcmin",
        kind: Kind::Angle,
        factor: Some((1, 60)),
        spellings: &[],
        marks: &["'", "\u{2032}", "\u{2019}"],
    },
    Known {
        name: "arcsec",
        kind: Kind::Angle,
        factor: Some((1, 3600)),
        spellings: &[],
        marks: &["\"", "''", "\u{2033}", "\u{201d}", "\u{2019}\u{2019}"],
    },
    Known {
        name: "rad",
        kind: Kind::Angle,
        factor: None,
        spellings: &["RAD", "radian", "radians"],
        marks: &[],
    },
];

/// A unit that is known.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Unit(&'static Known);

impl Unit {
    /// The unit that the text names by itself.
    pub(crate) fn named(text: &str) -> Option<Self> {
        let text = text.trim();
        UNITS
            .iter()
            .find(|unit| unit.name == text || unit.spellings.contains(&text))
            .map(Self)
    }

    /// The unit that the text means where quantities like `self` stand.
    fn alike(self, text: &str) -> Option<Self> {
        let text = text.trim();
        let meant = |unit: &&Known| unit.kind == self.0.kind && unit.marks.contains(&text);
        Self::named(text).or_else(|| UNITS.iter().find(meant).map(Self))
    }

    pub(crate) fn name(self) -> &'static str {
        self.0.name
    }

    /// The number in `self` in the unit `to`; `None` when that is another quantity or no finite number.
    fn convert(self, number: &Number, to: Self) -> Option<Number> {
        if self == to {
            return Some(number.clone());
        }
        if self.0.kind != to.0.kind {
            return None;
        }
        match (self.0.factor, to.0.factor) {
            (Some((over, under)), Some((to_over, to_under))) => {
                number.times(over * to_under, under * to_over)
            }
            (Some((over, under)), None) => {
                Number::of(number.times(over, under)?.value.to_radians())
            }
            (None, Some((over, under))) => {
                Number::of(number.value.to_degrees())?.times(under, over)
            }
            (None, None) => Some(number.clone()),
        }
    }
}

/// True when the text is a mark that means two units.
fn is_doubtful(text: &str) -> bool {
    UNITS.iter().any(|unit| unit.marks.contains(&text))
}

/// The value in the unit `to`, when both texts name units of one quantity: correctly rounded from the
/// decimal text of `value` where the factor is exact, within two units in the last place for radians.
///
/// ```
/// # use restudy_parsers::converted;
/// assert_eq!(converted(1.97, "inch", "mm"), Some(50.038));
/// assert_eq!(converted(12.0, "\u{3bc}m", "µm"), Some(12.0));
/// assert_eq!(converted(12.0, "mm", "°"), None);
/// assert_eq!(converted(12.0, "HRC", "HRC"), None);
/// ```
#[must_use]
pub fn converted(value: f64, from: &str, to: &str) -> Option<f64> {
    let (from, to) = match (Unit::named(from), Unit::named(to)) {
        (Some(from), Some(to)) => (from, to),
        (Some(known), None) => (known, known.alike(to)?),
        (None, Some(known)) => (known.alike(from)?, known),
        (None, None) => return None,
    };
    Some(from.convert(&Number::of(value)?, to)?.value)
}

/// What value, nominal and limits of one reading are in.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Scale {
    /// Nothing says.
    Unstated,
    /// As the rule or the export states it; a number without a unit of its own is in it.
    Stated(Unit),
    /// As the value's own unit; only the value says so.
    Value(Unit),
    /// A unit that is not known: numbers without one, or with just that, are in it.
    Other(String),
}

impl Scale {
    /// From what is stated and what stands behind the value.
    pub(crate) fn new(stated: Option<&str>, value: &Quantity) -> Result<Self, NotANumber> {
        match (stated, &value.suffix) {
            (Some(stated), _) => Ok(match Unit::named(stated) {
                Some(unit) => Self::Stated(unit),
                None => Self::Other(fold_blanks(stated)),
            }),
            (None, None) => Ok(Self::Unstated),
            (None, Some(suffix)) => Unit::named(suffix)
                .map(Self::Value)
                .ok_or_else(|| unknown(suffix)),
        }
    }

    pub(crate) fn name(&self) -> Option<&str> {
        match self {
            Self::Unstated => None,
            Self::Stated(unit) | Self::Value(unit) => Some(unit.name()),
            Self::Other(name) => Some(name),
        }
    }

    /// The number in this unit.
    pub(crate) fn number(&self, quantity: &Quantity) -> Result<Number, NotANumber> {
        let number = &quantity.number;
        let Some(suffix) = &quantity.suffix else {
            return match self {
                Self::Value(unit) if number.value != 0.0 => Err(NotANumber::new(
                    format!(
                        "`{}` has no unit, where the value is in {}",
                        number.value,
                        unit.name()
                    ),
                    "say what numbers without a unit are in, as in `unit = \"mm\"` beside the value",
                )),
                _ => Ok(number.clone()),
            };
        };
        let out_of_range = || {
            NotANumber::new(
                format!(
                    "`{} {}` is no finite number in {}",
                    number.value,
                    shorten(suffix),
                    self.name().unwrap_or_default()
                ),
                "have it written in the unit that is stated",
            )
        };
        match self {
            Self::Unstated if Unit::named(suffix).is_some() => Err(NotANumber::new(
                format!("it is in {}, where the value has no unit", shorten(suffix)),
                "say what numbers without a unit are in, as in `unit = \"mm\"` beside the value",
            )),
            Self::Unstated => Err(unknown(suffix)),
            Self::Other(name) if same(name, suffix) => Ok(number.clone()),
            Self::Other(name) => Err(other(suffix, name)),
            Self::Stated(unit) | Self::Value(unit) => match unit.alike(suffix) {
                Some(own) if own.0.kind == unit.0.kind => {
                    own.convert(number, *unit).ok_or_else(out_of_range)
                }
                Some(_) => Err(other(suffix, unit.name())),
                None => Err(unknown(suffix)),
            },
        }
    }
}

fn same(a: &str, b: &str) -> bool {
    crate::names::fold(a) == crate::names::fold(b)
}

fn other(found: &str, stated: &str) -> NotANumber {
    NotANumber::new(
        format!(
            "it is in `{}`, which cannot be converted to {}",
            shorten(found),
            shorten(stated)
        ),
        "correct `unit`, or have the instrument write the unit that is stated",
    )
}

fn unknown(suffix: &str) -> NotANumber {
    let suffix = shorten(suffix);
    match is_doubtful(&suffix) {
        true => NotANumber::new(
            format!("`{suffix}` behind the number can mean a length and an angle"),
            "say which with `unit = \"inch\"` or `unit = \"°\"` beside the value",
        ),
        false => NotANumber::new(
            format!("`{suffix}` behind the number is no unit that is known here"),
            format!(
                "if it is the unit, state it with `unit = {suffix:?}` beside the value; else take the number alone with `find`"
            ),
        ),
    }
}

#[cfg(test)]
mod tests;
