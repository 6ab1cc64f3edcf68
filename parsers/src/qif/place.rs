//! What a QIF document says of one measured value, by name.

use serde::{Deserialize, Serialize};

/// A place in a QIF document, as seen from one measured value.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Qif {
    /// Serial number of the part that was measured.
    Serial,
    /// Id of the part in this document, where it has no serial number; other documents may give it another.
    Component,
    /// Name of the inspection's operator.
    Operator,
    /// The first time stamp of the run's values; else when the inspection began, else ended.
    Time,
    /// The user attribute named `Trial`, where the document has one.
    Trial,
    /// Name of the characteristic item, with its designator where the name is not unique.
    Name,
    /// Designator (the drawing's number) of the characteristic item.
    Designator,
    /// The measured value.
    Value,
    /// The largest value, where several points were measured.
    Greatest,
    /// The smallest value, where several points were measured.
    Least,
    /// Unit of the value.
    Unit,
    /// Target value of the nominal.
    Nominal,
    /// Lower limit, absolute.
    Lower,
    /// Upper limit, absolute.
    Upper,
    /// Name of the measuring device.
    Device,
    /// Serial number of the measuring device.
    DeviceSerial,
    /// The run's own identifier (`ThisResultsInstanceQPId`).
    Run,
    /// The status that the writer gave the value; for display.
    Status,
    /// The user attribute of that name: of the value, else its run, its part, all results, the document.
    Attribute(String),
}

impl Qif {
    /// Places that a configuration can name, by their words.
    pub const WORDS: [(&'static str, Self); 17] = [
        ("serial", Self::Serial),
        ("component", Self::Component),
        ("operator", Self::Operator),
        ("time", Self::Time),
        ("name", Self::Name),
        ("designator", Self::Designator),
        ("value", Self::Value),
        ("max", Self::Greatest),
        ("min", Self::Least),
        ("unit", Self::Unit),
        ("nominal", Self::Nominal),
        ("lower", Self::Lower),
        ("upper", Self::Upper),
        ("device", Self::Device),
        ("device serial", Self::DeviceSerial),
        ("run", Self::Run),
        ("status", Self::Status),
    ];

    /// Where it stands, as sentences show it.
    pub(crate) fn shown(&self) -> &str {
        match self {
            Self::Serial => "ActualComponent/SerialNumber",
            Self::Component => "ActualComponent/@id",
            Self::Operator => "InspectionOperator/Name",
            Self::Time => "InspectionTraceability/InspectionStart",
            Self::Trial => "Attributes/Trial",
            Self::Name => "CharacteristicItem/Name",
            Self::Designator => "CharacteristicItem/Designator",
            Self::Value => "CharacteristicMeasurement/Value",
            Self::Greatest => "CharacteristicMeasurement/MaxValue",
            Self::Least => "CharacteristicMeasurement/MinValue",
            Self::Unit => "FileUnits",
            Self::Nominal => "CharacteristicNominal/TargetValue",
            Self::Lower | Self::Upper => "CharacteristicDefinition",
            Self::Device => "MeasurementDevice/Name",
            Self::DeviceSerial => "MeasurementDevice/SerialNumber",
            Self::Run => "MeasurementResults/ThisResultsInstanceQPId",
            Self::Status => "CharacteristicMeasurement/Status",
            Self::Attribute(name) => name,
        }
    }

    /// What to do when nothing usable stands there.
    pub(crate) fn hint(&self) -> &'static str {
        match self {
            Self::Serial => {
                "have serial numbers written, or say where the part stands, as in `part = { path = '([^/]+)[.]qif$' }`"
            }
            Self::Operator => {
                "have the operator written, or say where the appraiser stands, as in `appraiser = { path = '^([^/]+)/' }`"
            }
            Self::Time => {
                "have the inspection's start written, or say where `taken` stands, or how trials are told apart, as in `trial = { path = '-([0-9]+)[.]qif$' }`"
            }
            Self::Trial => {
                "have the attribute written for every run, or say how trials are told apart, as in `trial = { count = \"taken\" }`"
            }
            Self::Attribute(_) => {
                "have the user attribute written, or correct `attribute`; its case does not matter"
            }
            Self::Value | Self::Greatest | Self::Least => "measure this run again",
            _ => "have it written, or take another place or a constant",
        }
    }
}
