//! How one instrument's exports are read: where each role comes from. Made by `restudy-config`
//! (or in code, for exports with plain headings), checked there; serialisable, so that workbooks
//! can be read in a child process.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::qif::Qif;

/// The whole rule of one instrument.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Rule {
    /// The shape of the export.
    pub form: Form,
    /// Who or what was measured.
    pub part: Role,
    /// Who measured; `None`: the study has no appraiser.
    pub appraiser: Option<Role>,
    /// How trials are told apart; `None`: one trial.
    pub trial: Option<Trial>,
    /// When the part was measured.
    pub taken: Option<Taken>,
    /// The round's own label.
    pub round: Option<Role>,
    /// The characteristic's label; `None`: one unnamed characteristic, called `value`.
    pub characteristic: Option<Role>,
    /// The measured value.
    pub value: Value,
    /// Nominal value.
    pub nominal: Option<Role>,
    /// Lower limit.
    pub lower: Option<Limit>,
    /// Upper limit.
    pub upper: Option<Limit>,
    /// Further factors, by name.
    pub factors: BTreeMap<String, Role>,
    /// Values that must stay the same within a round, by name.
    pub same: BTreeMap<String, Role>,
    /// A text that ends the export; without it every run in the export is incomplete.
    pub end: Option<Find>,
    /// How many readings a whole run has, as the export or the rule states it; a run with another
    /// number of them is set aside.
    pub count: Option<Role>,
    /// What else is known of the rows of a table.
    pub layout: Layout,
    /// The decimal mark, `.` or `,`.
    pub decimal: char,
    /// The mark between groups of three digits, `.`, `,`, a blank (any blank) or `'`; `None`: there is none.
    pub thousands: Option<char>,
    /// Texts that mean "no value" (`---`, `9999`), in any case, blanks folded; numbers among them also as
    /// numbers (`9999,00`); an empty one: a blank. As a nominal or a limit they mean that there is none, except a zero.
    pub no_value: Vec<String>,
    /// True when a quoted field of delimited text may hold line ends.
    pub line_breaks: bool,
    /// Encoding of text that is neither marked by a BOM nor UTF-8 (a WHATWG label).
    pub encoding: Option<String>,
    /// Limits on size and depth.
    pub bounds: Bounds,
}

/// The shape of an export.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum Form {
    /// One row a reading, below a row of headings: delimited text or a workbook sheet. The content
    /// decides which it is, not the file name.
    Table {
        /// The sheet to read (workbooks only).
        sheet: Sheet,
        /// The row of headings, the first of them when there are several.
        header: Header,
        /// Delimiter of text; `None`: a first line `sep=;`, else the comma (semicolon when the decimal mark is a comma).
        delimiter: Option<char>,
    },
    /// XML: `each` is the path to the repeating element that holds one reading.
    Xml {
        /// Absolute path of local names, `/export/run/feature`.
        each: String,
    },
    /// Results in the QIF standard, 2.x or 3.0: roles come from [`Cell::Qif`], a path or a constant.
    Qif,
}

/// Which sheet of a workbook.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Sheet {
    /// The only visible sheet, or the first one.
    First,
    /// The sheet of that name (any case, blanks folded).
    Named(String),
    /// Every visible sheet whose name a regex matches.
    Matching(String),
    /// Every visible sheet that holds something.
    Every,
}

/// Which row holds the headings.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Header {
    /// That row, counted from 1; row 1 is the next one where the first is a line `sep=;`.
    Row(u32),
    /// The first row in which a cell holds that text (any case, blanks folded).
    Find(String),
    /// There are no headings: readings begin in the first row, columns are named by letters.
    Nothing,
}

/// What is known of the rows of a table, beside where its headings stand.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Layout {
    /// Rows of headings below the first: a column's heading is then what stands in all of them, joined
    /// by blanks; a blank in an upper row means the text left of it (merged cells).
    pub further_headings: u32,
    /// The row below the headings holds units and no reading.
    pub units_row: bool,
    /// Every row with the text that finds the headings begins a table of its own.
    pub blocks: bool,
    /// What stands below a table and is no longer part of it.
    pub until: Option<Until>,
    /// Rows that one of these tests finds are left out.
    pub skip: Vec<Filter>,
    /// Rows that one of these tests does not find are left out.
    pub keep: Vec<Filter>,
    /// Columns in which a blank means what stands above it.
    pub fill_down: Vec<Column>,
}

/// Where a table ends before the export does.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Until {
    /// At the first blank row.
    BlankRow,
    /// At the first row in which a cell holds this text and nothing else (any case, blanks folded).
    Text(Find),
}

/// A test of rows.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Filter {
    /// The column that is looked at.
    pub column: Column,
    /// What is sought there.
    pub test: Test,
}

/// What a row's text is tested for.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Test {
    /// One of these texts (any case, blanks folded).
    Is(Vec<String>),
    /// A regex matches in it.
    Matches(String),
    /// Nothing stands there.
    Blank,
}

/// One column of a table.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Column {
    /// Below that heading (any case, blanks folded).
    Headed(String),
    /// Counted from 0: the column `A` of a sheet, the first field of a line.
    Counted(u32),
}

/// Where a text comes from, and what of it is taken.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Role {
    /// The place.
    pub from: Cell,
    /// A regex: its first group (or the whole match) is taken.
    pub find: Option<String>,
    /// Other spellings: found text to label (any case, blanks folded).
    pub spellings: BTreeMap<String, String>,
}

/// A place in or about an export.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Cell {
    /// The column with that heading (any case, blanks folded).
    Column(String),
    /// The column of that number, from 0.
    Counted(u32),
    /// The texts of several columns, in this order; none of them may be blank.
    Joined {
        /// Their headings.
        columns: Vec<String>,
        /// What stands between two texts.
        joiner: String,
    },
    /// The value alone: several columns, each of them a reading of every row.
    Across(Across),
    /// The heading of the column that the value stands in.
    Heading,
    /// In the row in which a cell holds that text: the cell in the value's column.
    Row(String),
    /// In the row of units: the cell in the value's column.
    UnitsRow,
    /// One cell for the whole export, as in `B4` (text: row 4, second field).
    At {
        /// Row, from 0.
        row: u32,
        /// Column, from 0.
        column: u32,
    },
    /// The first non-blank cell right of the cell that holds that text, else the one below it.
    Label(String),
    /// The first non-blank cell right of the cell that holds that text.
    RightOf(String),
    /// The cell below the cell that holds that text.
    Below(String),
    /// The name of the sheet.
    Sheet,
    /// A regex searched in the export's path; its first group (or the whole match) is taken.
    Path(String),
    /// XML: a path to an element or, with `@name` last, an attribute; absolute (`/export/@id`) or relative to
    /// `each` (`value`, `@id`, `../@part`).
    Xml(String),
    /// What a QIF document says of a measured value.
    Qif(Qif),
    /// The same for every export; a number is written with a point.
    Constant(String),
}

/// The columns of a value that stands in several.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub enum Across {
    /// Those with these headings.
    Headed(Vec<String>),
    /// Those whose headings a regex matches.
    Matching(String),
}

/// How trials are told apart.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum Trial {
    /// A label.
    Stated(Role),
    /// Not stated: counted.
    Counted(Count),
}

/// What counted trials are counted by.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum Count {
    /// By time stamp, at analysis (runs keep `trial: None`).
    Taken,
    /// By order within the export: the n-th reading of the same part, appraiser, factors, round and
    /// characteristic is trial n (runs get that number).
    Order,
}

/// When a run was measured.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Taken {
    /// Where the text or workbook date stands.
    pub role: Role,
    /// A strptime format; `None`: ISO 8601 (or a workbook date cell).
    pub format: Option<String>,
    /// What numbers count from; `None`: a number is no time. A date cell of a workbook says so itself.
    pub dates: Option<Epoch>,
    /// IANA zone of the instrument's clock: texts without an offset, and date cells, are civil time
    /// there. A time that its clock shows twice is the earlier one, a time that it skips as much
    /// later as it was set forward. `None`: they are civil time of `shown_in` already.
    pub written_in: Option<String>,
    /// IANA zone in whose civil time [`Run::taken`](crate::Run::taken) is given, usually the site's.
    /// `None`: as written, an offset left aside; `written_in` must then be `None` too.
    pub shown_in: Option<String>,
}

/// What the days of a workbook's serial numbers count from. Source: ECMA-376-1:2016, 18.17.4.1.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum Epoch {
    /// 61 is 1 March 1900.
    Of1900,
    /// 0 is 1 January 1904.
    Of1904,
}

/// The measured value.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Value {
    /// Where it stands.
    pub role: Role,
    /// The unit of value, nominal and limits that have none of their own behind them: a constant, or a
    /// place. Those that have another one are converted to it.
    pub unit: Option<Role>,
}

/// A tolerance limit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Limit {
    /// Where it stands.
    pub role: Role,
    /// True when it is a signed deviation from the nominal.
    pub from_nominal: bool,
    /// True when a deviation downwards is written without its sign: `0.01` means −0.01.
    pub unsigned: bool,
}

/// A text to look for.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Find {
    /// A cell (table) or element text (XML) that contains this text, any case, blanks folded.
    pub find: String,
}

/// Limits on what is read; each is named in the sentence when it is hit.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct Bounds {
    /// Bytes of the file.
    pub file_bytes: u64,
    /// Bytes of a workbook's parts, inflated, in total.
    pub inflated_bytes: u64,
    /// Rows of a table.
    pub rows: u32,
    /// Columns of a table.
    pub columns: u32,
    /// Cells of a table that hold something.
    pub cells: u32,
    /// Bytes of one field, cell or element text.
    pub text_bytes: u32,
    /// Depth of XML elements.
    pub depth: u32,
}

impl Default for Bounds {
    fn default() -> Self {
        Self {
            file_bytes: 256 << 20,
            inflated_bytes: 1 << 30,
            rows: 1 << 20,
            columns: 4096,
            cells: 1 << 23,
            text_bytes: 64 << 10,
            depth: 64,
        }
    }
}

impl Role {
    /// The role taken whole from one place.
    #[must_use]
    pub fn plain(from: Cell) -> Self {
        Self {
            from,
            find: None,
            spellings: BTreeMap::new(),
        }
    }
}
