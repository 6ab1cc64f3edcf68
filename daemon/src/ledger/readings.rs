//! Readings as the ledger packs them: one JSON array a delivery, an array a reading, exact to the bit.

use restudy_parsers::Reading;
use serde::{Deserialize, Serialize};

/// One reading without its run: characteristic, value, unit, nominal, lower, upper, origin.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(into = "Row", from = "Row")]
pub struct PackedReading {
    /// The characteristic's label.
    pub characteristic: String,
    /// In `unit`.
    pub value: f64,
    /// Unit of value, nominal and limits.
    pub unit: Option<String>,
    /// In `unit`.
    pub nominal: Option<f64>,
    /// In `unit`.
    pub lower: Option<f64>,
    /// In `unit`.
    pub upper: Option<f64>,
    /// Where in the export.
    pub origin: String,
}

type Row = (
    String,
    f64,
    Option<String>,
    Option<f64>,
    Option<f64>,
    Option<f64>,
    String,
);

impl From<PackedReading> for Row {
    fn from(r: PackedReading) -> Self {
        (
            r.characteristic,
            r.value,
            r.unit,
            r.nominal,
            r.lower,
            r.upper,
            r.origin,
        )
    }
}

impl From<Row> for PackedReading {
    fn from((characteristic, value, unit, nominal, lower, upper, origin): Row) -> Self {
        Self {
            characteristic,
            value,
            unit,
            nominal,
            lower,
            upper,
            origin,
        }
    }
}

impl From<&Reading> for PackedReading {
    fn from(r: &Reading) -> Self {
        Self {
            characteristic: r.characteristic.clone(),
            value: r.value,
            unit: r.unit.clone(),
            nominal: r.nominal,
            lower: r.lower,
            upper: r.upper,
            origin: r.origin.clone(),
        }
    }
}

/// What one export brought for one run.
#[derive(Debug, Clone, PartialEq)]
pub struct Delivered {
    /// The export.
    pub export: i64,
    /// Bytes of its path.
    pub path: Vec<u8>,
    /// Its readings, in order.
    pub readings: Vec<PackedReading>,
}
