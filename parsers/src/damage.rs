//! What is wrong inside a workbook, in our own words.

use calamine::XlsxError;
use zip::result::ZipError;

use crate::names::shorten;
use crate::parsed::Refused;

/// A workbook whose table of parts is whole but whose inside is not.
pub(crate) fn damaged(what: &str) -> Refused {
    Refused::new(format!("the workbook is damaged: {what}")).hint("export it again")
}

pub(crate) fn of_zip(why: &ZipError) -> Refused {
    damaged(match why {
        ZipError::UnsupportedArchive(_) => "a part is packed in a way that workbooks do not use",
        ZipError::FileNotFound => "a part is missing",
        ZipError::InvalidPassword => "a part is locked by a password",
        _ => "a part cannot be unpacked",
    })
}

pub(crate) fn of_workbook(why: &XlsxError) -> Refused {
    match why {
        XlsxError::Zip(why) => of_zip(why),
        XlsxError::Io(_) => damaged("a part cannot be unpacked"),
        XlsxError::XmlEof(element) => {
            damaged(&format!("a part ends inside the element `{element}`"))
        }
        XlsxError::Xml(_) | XlsxError::XmlAttr(_) | XlsxError::Encoding(_) => {
            damaged("a part is no well-formed XML")
        }
        XlsxError::FileNotFound(name)
        | XlsxError::WorksheetNotFound(name)
        | XlsxError::NotAWorksheet(name) => {
            damaged(&format!("the part `{}` is missing", shorten(name)))
        }
        XlsxError::RelationshipNotFound => damaged("a sheet is listed that it does not hold"),
        XlsxError::Password => {
            Refused::new("the workbook is protected by a password").hint(NO_PASSWORD)
        }
        XlsxError::Alphanumeric(_)
        | XlsxError::NumericColumn(_)
        | XlsxError::RangeWithoutColumnComponent
        | XlsxError::RangeWithoutRowComponent
        | XlsxError::ColumnNumberOverflow
        | XlsxError::RowNumberOverflow
        | XlsxError::DimensionCount(_) => damaged("a cell stands at a place that does not exist"),
        _ => damaged("a part holds what no workbook holds"),
    }
}

/// What to do about a password.
pub(crate) const NO_PASSWORD: &str = "have it exported without a password";

/// A cell after which the others can be read, said as in "holds …".
pub(crate) fn of_cell(why: &XlsxError) -> String {
    match why {
        XlsxError::CellError(text) => format!("the error `{}`", shorten(text)),
        XlsxError::ParseFloat(_) | XlsxError::ParseInt(_) => {
            "a text in place of its number".to_owned()
        }
        XlsxError::CellTAttribute(kind) => {
            format!("a content of the unknown kind `{}`", shorten(kind))
        }
        XlsxError::Unrecognized { val, .. } => {
            format!("`{}`, which means nothing there", shorten(val))
        }
        _ => "what cannot be read".to_owned(),
    }
}
