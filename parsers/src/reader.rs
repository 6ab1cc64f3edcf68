//! A rule, checked and compiled once, and the way from an export's bytes to its content.

use encoding_rs::Encoding;

use crate::Export;
use crate::decode;
use crate::delimited;
use crate::grid::{Content, Field, Grid, Place, Row};
use crate::kind::{Kind, misnamed};
use crate::layout::Rows;
use crate::moment::Clock;
use crate::names::{fold, shorten, shorten_to};
use crate::no_value::NoValue;
use crate::number::Marks;
use crate::parsed::{Parsed, Refused};
use crate::qif;
use crate::rule::{Bounds, Count, Find, Form, Header, Limit, Role, Rule, Trial};
use crate::sheets::Sheets;
use crate::source::{Source, Where, first_group};
use crate::table;
use crate::workbook;
use crate::xml;
use crate::xml_path::XmlPath;

/// What to do about exports of another form.
pub(crate) const OTHER_FORM: &str =
    "correct `form`, or leave such files out with `files`; one instrument has exports of one form";
/// Longest path quoted in a sentence, in characters.
const PATH_MAX: usize = 200;

/// A rule that no export can be read with.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{role}: {what}")]
pub struct RuleError {
    /// The role or key of the rule.
    pub role: String,
    /// What is wrong with it.
    pub what: String,
}

impl RuleError {
    pub(crate) fn new(role: &str, what: impl Into<String>) -> Self {
        Self {
            role: role.to_owned(),
            what: what.into(),
        }
    }
}

/// A rule made ready: regexes compiled, paths resolved, labels of encodings and zones looked up.
#[derive(Debug, Clone)]
pub struct Reader {
    pub(crate) roles: Roles,
    shape: Shape,
    encoding: Option<&'static Encoding>,
    line_breaks: bool,
    pub(crate) bounds: Bounds,
}

/// Every role of a rule once, in `sources`; the other fields are places in that list.
#[derive(Debug, Clone)]
pub(crate) struct Roles {
    pub(crate) sources: Vec<Source>,
    pub(crate) part: usize,
    pub(crate) appraiser: Option<usize>,
    pub(crate) trial: TrialBy,
    pub(crate) taken: Option<(usize, Clock)>,
    pub(crate) round: Option<usize>,
    pub(crate) characteristic: Option<usize>,
    pub(crate) value: usize,
    pub(crate) unit: Option<usize>,
    pub(crate) nominal: Option<usize>,
    pub(crate) lower: Option<LimitAt>,
    pub(crate) upper: Option<LimitAt>,
    pub(crate) factors: Vec<(String, usize)>,
    pub(crate) same: Vec<(String, usize)>,
    pub(crate) marks: Marks,
    pub(crate) no_value: NoValue,
    /// Keyed text that ends the export.
    pub(crate) end: Option<End>,
    /// How many readings a whole run has.
    pub(crate) count: Option<usize>,
    pub(crate) rows: Rows,
}

/// The text that ends an export.
#[derive(Debug, Clone)]
pub(crate) struct End {
    /// As the rule writes it.
    pub(crate) text: String,
    /// Folded for comparing.
    pub(crate) key: String,
}

impl End {
    pub(crate) fn new(find: &Find) -> Self {
        Self {
            text: find.find.clone(),
            key: fold(&find.find),
        }
    }

    /// True when a cell of the row contains it.
    pub(crate) fn stands_in(&self, row: &Row) -> bool {
        row.cells.iter().any(|(_, content)| match content {
            Content::Text(text) => fold(text).contains(&self.key),
            _ => false,
        })
    }
}

/// How trials are told apart.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum TrialBy {
    /// By the label of that source.
    Label(usize),
    /// By order within the export.
    Order,
    /// Not here.
    Nothing,
}

#[derive(Debug, Clone, Copy)]
pub(crate) struct LimitAt {
    pub(crate) source: usize,
    pub(crate) from_nominal: bool,
    pub(crate) unsigned: bool,
}

#[derive(Debug, Clone)]
enum Shape {
    Table {
        sheets: Sheets,
        header: Header,
        delimiter: Option<u8>,
    },
    Xml {
        each: XmlPath,
    },
    Qif,
}

impl Reader {
    /// Compiles a rule.
    ///
    /// # Errors
    /// A regex, path, encoding, zone or delimiter that cannot be used, a role that does not fit the
    /// form, a limit from a nominal that is not there.
    pub fn new(rule: &Rule) -> Result<Self, RuleError> {
        let encoding = match &rule.encoding {
            None => None,
            Some(label) => Some(
                Encoding::for_label_no_replacement(label.as_bytes()).ok_or_else(|| {
                    RuleError::new(
                        "encoding",
                        format!("`{}` names no encoding", shorten(label)),
                    )
                })?,
            ),
        };
        qif::fits(rule)?;
        let shape = Shape::new(&rule.form, rule.decimal)?;
        Ok(Self {
            roles: Roles::new(rule, shape.each())?,
            shape,
            encoding,
            line_breaks: rule.line_breaks,
            bounds: rule.bounds,
        })
    }

    /// Reads one export.
    ///
    /// # Errors
    /// [`Refused`] when nothing of the export can be used: what was found, where, what was expected.
    pub fn read(&self, export: Export<'_>) -> Result<Parsed, Refused> {
        let kind = Kind::of(export.bytes, &self.bounds)?;
        let once = self.once(export.path)?;
        match &self.shape {
            Shape::Table {
                sheets,
                header,
                delimiter,
            } => {
                let mut grids = match kind {
                    Kind::Text => {
                        let text = decode::decode(export.bytes, None, self.encoding)?;
                        return self
                            .read_text(&text, header, *delimiter, once)
                            .map_err(|refused| misnamed(export.path, &text, refused));
                    }
                    workbook_kind => {
                        workbook::grids(export.bytes, workbook_kind, sheets, &self.bounds)?
                    }
                };
                if sheets.may_be_blank() {
                    grids.retain(|grid| !grid.rows.is_empty());
                }
                self.read_grids(&grids, header, once)
            }
            Shape::Xml { .. } | Shape::Qif => match kind {
                Kind::Text => {
                    let declared = decode::declared(export.bytes);
                    let text = decode::decode(export.bytes, declared, self.encoding)?;
                    match self.shape.each() {
                        Some(each) => xml::read(&text, self, each, once),
                        None => qif::read(&text, self, &once),
                    }
                    .map_err(|refused| misnamed(export.path, &text, refused))
                }
                _ => Err(
                    Refused::new("this is a workbook; this instrument's exports are XML")
                        .hint(OTHER_FORM),
                ),
            },
        }
    }

    pub(crate) fn read_grids(
        &self,
        grids: &[Grid],
        header: &Header,
        once: Vec<Option<Content>>,
    ) -> Result<Parsed, Refused> {
        table::read(grids, header, &self.roles, &once)
    }

    fn read_text(
        &self,
        text: &str,
        header: &Header,
        delimiter: Option<u8>,
        once: Vec<Option<Content>>,
    ) -> Result<Parsed, Refused> {
        if text.trim_start().starts_with("<?xml") {
            return Err(
                Refused::new("this is XML; this instrument's exports are tables").hint(OTHER_FORM),
            );
        }
        let delimiter = delimited::delimiter(text, delimiter, self.roles.marks.decimal);
        let grid = delimited::grid(text, delimiter, self.line_breaks, &self.bounds)?;
        let below_sep = Header::Row(2);
        let header = match header {
            Header::Row(1) if delimiter.announced => &below_sep,
            header => header,
        };
        self.read_grids(&[grid], header, once)
    }

    /// Contents that hold for the whole export whatever its form: by source, `None` where the form
    /// must look.
    pub(crate) fn once(&self, path: &str) -> Result<Vec<Option<Content>>, Refused> {
        let sources = &self.roles.sources;
        sources
            .iter()
            .map(|source| match &source.from {
                Where::Constant(content) => Ok(Some(content.clone())),
                Where::Path(regex) => match first_group(regex, path) {
                    Some(found) => Ok(Some(Content::Text(found.into()))),
                    None => Err(Refused::new(format!(
                        "nothing in the path `{}` matches `{regex}`, where the {} should stand",
                        shorten_to(path, PATH_MAX),
                        source.role
                    ))
                    .hint("name folder or file as the others, or correct `path`; it is searched in the path below the watched folder")),
                },
                _ => Ok(None),
            })
            .collect()
    }
}

impl Source {
    /// The field of a content that [`Reader::once`] found.
    pub(crate) fn once_field<'a>(&self, content: &'a Content) -> Field<'a> {
        let place = match self.from {
            Where::Path(_) => Place::Path,
            _ => Place::Rule,
        };
        Field { place, content }
    }
}

impl Shape {
    fn new(form: &Form, decimal: char) -> Result<Self, RuleError> {
        match form {
            Form::Table {
                header: Header::Row(0),
                ..
            } => Err(RuleError::new("header", "rows are counted from 1")),
            Form::Table {
                sheet,
                header,
                delimiter,
            } => {
                let delimiter = match delimiter {
                    None => None,
                    Some(mark) if *mark == decimal => {
                        return Err(RuleError::new(
                            "delimiter",
                            format!("`{mark}` is the decimal mark as well"),
                        ));
                    }
                    Some(mark) => Some(delimited::as_delimiter(*mark).ok_or_else(|| {
                        RuleError::new("delimiter", format!("{mark:?} cannot part fields"))
                    })?),
                };
                Ok(Self::Table {
                    sheets: Sheets::new(sheet)?,
                    header: header.clone(),
                    delimiter,
                })
            }
            Form::Xml { each } => Ok(Self::Xml {
                each: XmlPath::element(each).map_err(|what| RuleError::new("each", what))?,
            }),
            Form::Qif => Ok(Self::Qif),
        }
    }

    fn each(&self) -> Option<&XmlPath> {
        match self {
            Self::Table { .. } | Self::Qif => None,
            Self::Xml { each } => Some(each),
        }
    }
}

impl Roles {
    fn new(rule: &Rule, each: Option<&XmlPath>) -> Result<Self, RuleError> {
        let marks = Marks::new(rule.decimal, rule.thousands)
            .map_err(|(key, what)| RuleError::new(key, what))?;
        let mut sources = Vec::new();
        let mut add = |name: &str, role: &Role| -> Result<usize, RuleError> {
            sources.push(Source::new(name, role, each)?);
            Ok(sources.len() - 1)
        };
        let mut maybe =
            |name: &str, role: Option<&Role>| role.map(|role| add(name, role)).transpose();
        let limit = |limit: Option<&Limit>, source: Option<usize>| {
            limit.zip(source).map(|(limit, source)| LimitAt {
                source,
                from_nominal: limit.from_nominal,
                unsigned: limit.unsigned,
            })
        };
        let appraiser = maybe("appraiser", rule.appraiser.as_ref())?;
        let trial = match &rule.trial {
            Some(Trial::Stated(role)) => {
                maybe("trial", Some(role))?.map_or(TrialBy::Nothing, TrialBy::Label)
            }
            Some(Trial::Counted(Count::Order)) => TrialBy::Order,
            Some(Trial::Counted(Count::Taken)) if rule.taken.is_none() => {
                return Err(RuleError::new(
                    "trial",
                    "counted by time stamp, but there is no `taken`",
                ));
            }
            Some(Trial::Counted(Count::Taken)) | None => TrialBy::Nothing,
        };
        let taken = maybe("time", rule.taken.as_ref().map(|taken| &taken.role))?;
        let round = maybe("round", rule.round.as_ref())?;
        let characteristic = maybe("characteristic", rule.characteristic.as_ref())?;
        let unit = maybe("unit", rule.value.unit.as_ref())?;
        let nominal = maybe("nominal", rule.nominal.as_ref())?;
        let lower = maybe("lower limit", rule.lower.as_ref().map(|limit| &limit.role))?;
        let upper = maybe("upper limit", rule.upper.as_ref().map(|limit| &limit.role))?;
        let mut named = |kind: &str, name: &String, role: &Role| {
            add(&format!("{kind} `{name}`"), role).map(|source| (name.clone(), source))
        };
        let factors = rule
            .factors
            .iter()
            .map(|(name, role)| named("factor", name, role))
            .collect::<Result<_, _>>()?;
        let same = rule
            .same
            .iter()
            .map(|(name, role)| named("same", name, role))
            .collect::<Result<_, _>>()?;
        let count = match &rule.count {
            Some(role) => Some(add("number of readings", role)?),
            None => None,
        };
        let part = add("part", &rule.part)?;
        let value = add("value", &rule.value.role)?;
        let rows = Rows::new(&rule.layout)?;
        rows.fit(rule, &sources, &sources[value].from)?;
        let (lower, upper) = (
            limit(rule.lower.as_ref(), lower),
            limit(rule.upper.as_ref(), upper),
        );
        if nominal.is_none()
            && [lower, upper]
                .iter()
                .flatten()
                .any(|limit| limit.from_nominal)
        {
            return Err(RuleError::new(
                "nominal",
                "a limit is taken from it, but there is none",
            ));
        }
        let taken = match (&rule.taken, taken) {
            (Some(rule), Some(source)) => Some((
                source,
                Clock::new(rule, marks).map_err(|what| RuleError::new("taken", what))?,
            )),
            _ => None,
        };
        Ok(Self {
            sources,
            part,
            appraiser,
            trial,
            taken,
            round,
            characteristic,
            value,
            unit,
            nominal,
            lower,
            upper,
            factors,
            same,
            marks,
            no_value: NoValue::new(&rule.no_value, marks),
            end: rule.end.as_ref().map(End::new),
            count,
            rows,
        })
    }

    /// True when some role is looked up by row.
    pub(crate) fn by_row(&self) -> bool {
        self.sources.iter().any(|source| source.from.is_by_row())
    }
}
