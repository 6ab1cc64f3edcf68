//! Sheets of an OpenDocument spreadsheet (OASIS OpenDocument 1.3, part 3), read event by event from
//! `content.xml`.
//!
//! Repeats cost what they hold: blank cells nothing, others one cell each, within the bounds. The text
//! that a cell shows is read only where it has no value of its own, and to recognise errors, which
//! older writers store as the texts that they show.

mod cell;

use std::collections::BTreeSet;
use std::io::{BufRead, BufReader, Cursor};

use quick_xml::XmlVersion;
use quick_xml::events::{BytesStart, Event};
use quick_xml::name::{Namespace, ResolveResult};
use quick_xml::reader::NsReader;
use zip::ZipArchive;

use super::rows::Rows;
use crate::damage::{damaged, of_zip};
use crate::grid::{Content, Grid};
use crate::names::shorten;
use crate::parsed::Refused;
use crate::rule::Bounds;
use crate::sheets::Named;
use cell::Cell;

const OFFICE: &str = "urn:oasis:names:tc:opendocument:xmlns:office:1.0";
const TABLE: &str = "urn:oasis:names:tc:opendocument:xmlns:table:1.0";
const TEXT: &str = "urn:oasis:names:tc:opendocument:xmlns:text:1.0";
const STYLE: &str = "urn:oasis:names:tc:opendocument:xmlns:style:1.0";
/// Elements of a sheet: cells and the paragraphs in them.
const ELEMENTS_MAX: usize = 1 << 24;
/// Depth of elements; nothing here recurses.
const DEPTH_MAX: usize = 256;

/// All sheets, read; one that cannot be used costs only itself.
pub(super) struct Sheets(Vec<(Named, Result<Grid, Refused>)>);

impl Sheets {
    pub(super) fn names(&self) -> Vec<Named> {
        self.0.iter().map(|(name, _)| name.clone()).collect()
    }

    /// Takes the cells of a sheet.
    pub(super) fn grid(&mut self, name: &str) -> Result<Grid, Refused> {
        match self.0.iter().find(|(sheet, _)| sheet.name == name) {
            Some((_, grid)) => grid.clone(),
            None => Err(damaged("a sheet is listed that it does not hold")),
        }
    }
}

pub(super) fn read(bytes: &[u8], bounds: &Bounds) -> Result<Sheets, Refused> {
    let mut zip = ZipArchive::new(Cursor::new(bytes)).map_err(|why| of_zip(&why))?;
    let part = zip.by_name("content.xml").map_err(|why| of_zip(&why))?;
    let mut xml = NsReader::from_reader(BufReader::new(part));
    xml.config_mut().expand_empty_elements = true;
    let mut document = Document {
        bounds,
        hidden: BTreeSet::new(),
        style: None,
        sheets: Vec::new(),
        held: 0,
    };
    document.read(&mut xml)?;
    Ok(Sheets(document.sheets))
}

struct Document<'a> {
    bounds: &'a Bounds,
    /// Styles of tables that are not shown.
    hidden: BTreeSet<String>,
    /// The style whose properties follow.
    style: Option<String>,
    sheets: Vec<(Named, Result<Grid, Refused>)>,
    /// Cells of all sheets.
    held: usize,
}

/// What an element is to us.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Element {
    Style,
    TableProperties,
    Spreadsheet,
    Table,
    Row,
    Cell,
    Paragraph,
    Spaces,
    Tab,
    LineBreak,
    /// Holds what is neither cell nor text of one: remarks, drawings, changes.
    Aside,
    Other,
}

impl Element {
    fn of(namespace: &ResolveResult<'_>, local: &str) -> Self {
        let ResolveResult::Bound(Namespace(namespace)) = namespace else {
            return Self::Other;
        };
        match (*namespace, local) {
            (STYLE, "style") => Self::Style,
            (STYLE, "table-properties") => Self::TableProperties,
            (OFFICE, "spreadsheet") => Self::Spreadsheet,
            (TABLE, "table") => Self::Table,
            (TABLE, "table-row") => Self::Row,
            (TABLE, "table-cell" | "covered-table-cell") => Self::Cell,
            (TEXT, "p" | "h") => Self::Paragraph,
            (TEXT, "s") => Self::Spaces,
            (TEXT, "tab") => Self::Tab,
            (TEXT, "line-break") => Self::LineBreak,
            (OFFICE, "annotation")
            | (TABLE, "shapes" | "tracked-changes" | "dde-links" | "dde-link")
            | (TEXT, "note" | "ruby-text") => Self::Aside,
            (namespace, _) if namespace.ends_with(":drawing:1.0") => Self::Aside,
            _ => Self::Other,
        }
    }
}

/// The sheet that is being read.
struct Open<'a> {
    name: Named,
    rows: Rows<'a>,
    /// The first thing that makes it unusable.
    refused: Option<Refused>,
    row: u64,
    row_repeats: u64,
    column: u64,
    /// Cells of the row that hold something: first column, repeats, content.
    pending: Vec<(u64, u64, Content)>,
    /// The limit.
    columns: u64,
}

impl<'a> Open<'a> {
    fn new(name: Named, bounds: &'a Bounds) -> Self {
        Self {
            rows: Rows::new(&name.name, bounds),
            name,
            refused: None,
            row: 0,
            row_repeats: 1,
            column: 0,
            pending: Vec::new(),
            columns: u64::from(bounds.columns),
        }
    }

    fn cell(&mut self, repeats: u64, content: Content) {
        if content != Content::Blank && self.refused.is_none() {
            // One too many is enough to be told.
            let shown = repeats.min(self.columns.saturating_sub(self.column) + 1);
            self.pending.push((self.column, shown, content));
            if self.column >= self.columns {
                self.settle(usize::MAX);
            }
        }
        self.column += repeats;
    }

    fn end_row(&mut self, left: usize) {
        self.settle(left);
        self.row += self.row_repeats;
        self.row_repeats = 1;
    }

    /// Puts what is pending into its rows, unless that is more than `left` cells.
    fn settle(&mut self, left: usize) {
        let pending = std::mem::take(&mut self.pending);
        if pending.is_empty() || self.refused.is_some() {
            return;
        }
        let in_row: u64 = pending.iter().map(|(_, repeats, _)| repeats).sum();
        let held = in_row.saturating_mul(self.row_repeats);
        if held.saturating_add(self.rows.held as u64) > left as u64 {
            self.refused = Some(self.rows.too_many());
            return;
        }
        for row in self.row..self.row + self.row_repeats {
            for (column, repeats, content) in &pending {
                for column in *column..column + repeats {
                    if let Err(refused) =
                        self.rows.put((index(row), index(column)), content.clone())
                    {
                        self.refused = Some(refused);
                        return;
                    }
                }
            }
        }
    }

    fn close(self) -> (Named, Result<Grid, Refused>) {
        let grid = match self.refused {
            Some(refused) => Err(refused),
            None => Ok(self.rows.grid()),
        };
        (self.name, grid)
    }
}

/// Places beyond all bounds are refused, wherever they are.
fn index(place: u64) -> u32 {
    u32::try_from(place).unwrap_or(u32::MAX)
}

impl<'a> Document<'a> {
    fn read<R: BufRead>(&mut self, xml: &mut NsReader<R>) -> Result<(), Refused> {
        let mut buffer = Vec::new();
        let mut open: Vec<Element> = Vec::new();
        let mut aside = 0_usize;
        let mut cell: Option<Cell> = None;
        let (mut roots, mut elements) = (0_usize, 0_usize);
        let bounds = self.bounds;
        let mut sheet: Option<Open<'a>> = None;
        loop {
            buffer.clear();
            let event = xml
                .read_event_into(&mut buffer)
                .map_err(|_| damaged("a part is no well-formed XML"))?;
            match event {
                Event::Start(start) => {
                    let (namespace, local) = xml.resolver().resolve_element(start.name());
                    let mut element = Element::of(&namespace, local.into_inner());
                    if open.len() >= DEPTH_MAX {
                        return Err(Refused::new(format!(
                            "elements of the workbook are nested deeper than {DEPTH_MAX}; that is the limit"
                        )));
                    }
                    elements += 1;
                    if elements > ELEMENTS_MAX {
                        return Err(Refused::new(format!(
                            "a part of the workbook has more than {ELEMENTS_MAX} elements; that is the limit"
                        )));
                    }
                    if open.is_empty() {
                        roots += 1;
                    }
                    // A table within a cell is no sheet.
                    if element == Element::Table && sheet.is_some() {
                        element = Element::Aside;
                    }
                    open.push(element);
                    if element == Element::Aside {
                        aside += 1;
                    }
                    if aside > 0 {
                        continue;
                    }
                    let attribute =
                        |namespace: &str, name: &str| attribute(xml, &start, namespace, name);
                    match element {
                        Element::Style => self.style = attribute(STYLE, "name")?,
                        Element::TableProperties => {
                            if attribute(TABLE, "display")?.as_deref() == Some("false")
                                && let Some(style) = &self.style
                            {
                                self.hidden.insert(style.clone());
                            }
                        }
                        Element::Table if open.contains(&Element::Spreadsheet) => {
                            let name = attribute(TABLE, "name")?.unwrap_or_default();
                            let visible = attribute(TABLE, "style-name")?
                                .is_none_or(|style| !self.hidden.contains(&style));
                            sheet = Some(Open::new(Named { name, visible }, bounds));
                        }
                        Element::Row => {
                            let repeats = repeats(attribute(TABLE, "number-rows-repeated")?)?;
                            if let Some(sheet) = &mut sheet {
                                sheet.row_repeats = repeats;
                                sheet.column = 0;
                            }
                        }
                        Element::Cell if sheet.is_some() => {
                            cell = Some(Cell::of(&start, xml, bounds.text_bytes as usize)?);
                        }
                        Element::Paragraph => {
                            if let Some(cell) = &mut cell {
                                cell.begin_paragraph();
                            }
                        }
                        Element::Spaces => {
                            let count = attribute(TEXT, "c")?
                                .and_then(|count| count.parse::<usize>().ok())
                                .unwrap_or(1);
                            if let Some(cell) = &mut cell {
                                cell.show_blanks(count);
                            }
                        }
                        Element::Tab | Element::LineBreak => {
                            if let Some(cell) = &mut cell {
                                cell.show_blanks(1);
                            }
                        }
                        _ => {}
                    }
                }
                Event::End(_) => {
                    let Some(element) = open.pop() else {
                        return Err(damaged("a part is no well-formed XML"));
                    };
                    if element == Element::Aside {
                        aside -= 1;
                        continue;
                    }
                    if aside > 0 {
                        continue;
                    }
                    match element {
                        Element::Cell => {
                            if let (Some(sheet), Some(cell)) = (&mut sheet, cell.take()) {
                                let repeats = cell.repeats;
                                sheet.cell(repeats, cell.content());
                            }
                        }
                        Element::Row => {
                            if let Some(sheet) = &mut sheet {
                                sheet.end_row(
                                    (self.bounds.cells as usize).saturating_sub(self.held),
                                );
                            }
                        }
                        Element::Table => {
                            if let Some(sheet) = sheet.take() {
                                self.held += sheet.rows.held;
                                self.sheets.push(sheet.close());
                            }
                        }
                        Element::Style => self.style = None,
                        _ => {}
                    }
                }
                Event::Text(text) if aside == 0 => {
                    if let Some(cell) = &mut cell
                        && open.contains(&Element::Paragraph)
                    {
                        cell.show(&text.xml10_content());
                    }
                }
                Event::CData(text) if aside == 0 => {
                    if let Some(cell) = &mut cell
                        && open.contains(&Element::Paragraph)
                    {
                        cell.show(&text.xml10_content());
                    }
                }
                Event::GeneralRef(entity) => {
                    let resolved = match entity.resolve_char_ref() {
                        Ok(Some(c)) => Some(c),
                        Ok(None) => predefined(&entity),
                        Err(_) => None,
                    };
                    let Some(c) = resolved else {
                        return Err(damaged(&format!(
                            "the reference `&{};` means nothing there",
                            shorten(&entity)
                        )));
                    };
                    if let Some(cell) = &mut cell
                        && aside == 0
                        && open.contains(&Element::Paragraph)
                    {
                        cell.show(c.encode_utf8(&mut [0; 4]));
                    }
                }
                Event::DocType(_) => {
                    return Err(damaged(
                        "a part declares a document type, which is not read",
                    ));
                }
                Event::Eof if open.is_empty() && roots == 1 => return Ok(()),
                Event::Eof => return Err(damaged("a part ends inside an element")),
                _ => {}
            }
        }
    }
}

fn predefined(entity: &str) -> Option<char> {
    Some(match entity {
        "amp" => '&',
        "lt" => '<',
        "gt" => '>',
        "quot" => '"',
        "apos" => '\'',
        _ => return None,
    })
}

/// The attribute's value, its references resolved.
fn attribute<R>(
    xml: &NsReader<R>,
    element: &BytesStart<'_>,
    namespace: &str,
    name: &str,
) -> Result<Option<String>, Refused> {
    for attribute in element.attributes() {
        let Ok(attribute) = attribute else {
            return Err(damaged("a part is no well-formed XML"));
        };
        let (resolved, local) = xml.resolver().resolve_attribute(attribute.key);
        if local.into_inner() != name || resolved != ResolveResult::Bound(Namespace(namespace)) {
            continue;
        }
        return attribute
            .normalized_value(XmlVersion::Implicit1_0)
            .map(|value| Some(value.into_owned()))
            .map_err(|_| damaged("an attribute holds a reference that means nothing there"));
    }
    Ok(None)
}

fn repeats(stated: Option<String>) -> Result<u64, Refused> {
    let Some(stated) = stated else {
        return Ok(1);
    };
    match stated.trim().parse::<u32>() {
        Ok(count) if count > 0 => Ok(u64::from(count)),
        _ => Err(damaged(&format!(
            "a cell or row is repeated `{}` times",
            shorten(&stated)
        ))),
    }
}
