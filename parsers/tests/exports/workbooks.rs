//! Workbooks, written here cell by cell. Values come back as they were written; nothing else about
//! the writer is taken for truth.

use std::io::{Cursor, Read, Write};

use insta::assert_snapshot;
use restudy_parsers::{
    Bounds, Count, Export, Find, Form, Header, Plain, Rule, Sheet, Taken, Trial, Value,
    is_workbook, read_plain,
};
use rust_xlsxwriter::{ExcelDateTime, Format, Formula, Workbook};
use zip::write::SimpleFileOptions;
use zip::{CompressionMethod, ZipArchive, ZipWriter};

use crate::shared::{at, column, deviation, label, read, shown, table};

/// One run on the second sheet, the first one hidden.
pub(crate) fn hub() -> Vec<u8> {
    let mut book = Workbook::new();
    book.add_worksheet()
        .set_name("Setup")
        .unwrap()
        .set_hidden(true);
    let sheet = book
        .add_worksheet()
        .set_name("Results")
        .unwrap()
        .set_active(true);
    let time = Format::new().set_num_format("dd.mm.yyyy hh:mm");
    let taken = ExcelDateTime::from_ymd(2026, 6, 2)
        .unwrap()
        .and_hms(14, 20, 5)
        .unwrap();
    sheet.write(0, 0, "Halden Pump Works").unwrap();
    sheet.write(1, 0, "Loaded by").unwrap();
    sheet.write(1, 3, "KL").unwrap();
    sheet
        .write_datetime_with_format(2, 1, &taken, &time)
        .unwrap();
    for (column, heading) in [
        "Serial no.",
        "Feature",
        "Actual",
        "Nominal",
        "Upper tol.",
        "Lower tol.",
    ]
    .iter()
    .enumerate()
    {
        sheet.write(4, column as u16, *heading).unwrap();
    }
    for (row, (feature, actual, nominal, upper, lower)) in (5..).zip([
        ("bore A", 50.0123, 50.0, 0.05, -0.05),
        ("height B", 12.034, 12.0, 0.1, -0.1),
    ]) {
        sheet.write(row, 0, 4_100_700_000_000_f64).unwrap();
        sheet.write(row, 1, feature).unwrap();
        for (column, number) in (2..).zip([actual, nominal, upper, lower]) {
            sheet.write(row, column, number).unwrap();
        }
    }
    sheet.write(8, 0, "End of report").unwrap();
    book.save_to_buffer().unwrap()
}

pub(crate) fn hub_rule() -> Rule {
    Rule {
        form: Form::Table {
            sheet: Sheet::Named("results".to_owned()),
            header: Header::Find("Serial no.".to_owned()),
            delimiter: None,
        },
        part: column("Serial no."),
        appraiser: Some(label("Loaded by")),
        taken: Some(Taken {
            role: at(2, 1),
            format: Some("%d.%m.%Y %H:%M".to_owned()),
            dates: None,
            written_in: None,
            shown_in: None,
        }),
        trial: Some(Trial::Counted(Count::Taken)),
        characteristic: Some(column("Feature")),
        value: Value {
            role: column("Actual"),
            unit: None,
        },
        nominal: Some(column("Nominal")),
        lower: deviation(column("Lower tol.")),
        upper: deviation(column("Upper tol.")),
        end: Some(Find {
            find: "End of report".to_owned(),
        }),
        decimal: ',',
        ..table()
    }
}

/// A workbook of one sheet, `part` and `value` in its first row, and one more cell.
fn with_cell(write: impl FnOnce(&mut rust_xlsxwriter::Worksheet)) -> Vec<u8> {
    let mut book = Workbook::new();
    let sheet = book.add_worksheet();
    sheet.write(0, 0, "part").unwrap();
    sheet.write(0, 1, "value").unwrap();
    sheet.write(1, 0, "P1").unwrap();
    sheet.write(2, 0, "P2").unwrap();
    sheet.write(2, 1, 50.25).unwrap();
    write(sheet);
    book.save_to_buffer().unwrap()
}

/// The workbook with one part changed, and stored, so that nothing but the change is odd.
pub(crate) fn changed(book: &[u8], name: &str, change: impl Fn(Vec<u8>) -> Vec<u8>) -> Vec<u8> {
    let mut old = ZipArchive::new(Cursor::new(book)).unwrap();
    let mut new = ZipWriter::new(Cursor::new(Vec::new()));
    let options = SimpleFileOptions::default().compression_method(CompressionMethod::Stored);
    for index in 0..old.len() {
        let mut part = old.by_index(index).unwrap();
        let mut bytes = Vec::new();
        part.read_to_end(&mut bytes).unwrap();
        let part_name = part.name().unwrap().into_owned();
        if part_name == name {
            bytes = change(bytes);
        }
        new.start_file(part_name, options).unwrap();
        new.write_all(&bytes).unwrap();
    }
    new.finish().unwrap().into_inner()
}

/// The inflated bytes of one part.
pub(crate) fn part(book: &[u8], name: &str) -> Vec<u8> {
    let mut bytes = Vec::new();
    let mut zip = ZipArchive::new(Cursor::new(book)).unwrap();
    zip.by_name(name).unwrap().read_to_end(&mut bytes).unwrap();
    bytes
}

fn replaced(book: &[u8], name: &str, from: &str, to: &str) -> Vec<u8> {
    changed(book, name, |bytes| {
        let text = String::from_utf8(bytes).unwrap();
        assert!(text.contains(from), "{text}");
        text.replace(from, to).into_bytes()
    })
}

const SHEET: &str = "xl/worksheets/sheet1.xml";

#[test]
fn a_run_with_its_date_cell_and_long_serial_number() {
    assert_snapshot!(read(hub(), &hub_rule()), @"
    run 4100700000000 | KL | 2026-06-02T14:20:05
      bore A: 50.0123 [49.95 50 50.05] (sheet `Results`, cell C6)
      height B: 12.034 [11.9 12 12.1] (sheet `Results`, cell C7)
    ");
}

#[test]
fn the_first_visible_sheet_is_read_where_none_is_named() {
    let first = Form::Table {
        sheet: Sheet::First,
        header: Header::Find("Serial no.".to_owned()),
        delimiter: None,
    };
    assert_eq!(
        read(
            hub(),
            &Rule {
                form: first,
                ..hub_rule()
            }
        ),
        read(hub(), &hub_rule())
    );
    let other = Form::Table {
        sheet: Sheet::Named("Result".to_owned()),
        header: Header::Row(5),
        delimiter: None,
    };
    assert_snapshot!(read(hub(), &Rule { form: other, ..hub_rule() }), @"
    refused: no sheet is named `Result`; the workbook has `Setup`, `Results`
      hint: did you mean `Results`?
    ");
}

#[test]
fn cells_that_are_no_values() {
    let day = ExcelDateTime::from_ymd(2026, 6, 2).unwrap();
    let date = Format::new().set_num_format("yyyy-mm-dd");
    let span = Format::new().set_num_format("[h]:mm");
    let all = [
        with_cell(|_| ()),
        with_cell(|sheet| drop(sheet.write(1, 1, "12.03.4"))),
        with_cell(|sheet| drop(sheet.write(1, 1, true))),
        with_cell(|sheet| drop(sheet.write_datetime_with_format(1, 1, &day, &date))),
        with_cell(|sheet| drop(sheet.write_with_format(1, 1, 1.5, &span))),
        with_cell(|sheet| drop(sheet.write(1, 1, Formula::new("=1/0").set_result("#DIV/0!")))),
    ]
    .map(|book| read(book, &table()))
    .concat();
    assert_snapshot!(all, @"
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: blank, where the value should stand
      hint: measure this run again
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: `12.03.4` is not a number; this instrument's decimal mark is `.`
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: `TRUE` is not a number; this instrument's decimal mark is `.`
      hint: if it means that nothing was measured, list it in `no_value`
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds the date 2026-06-02T00:00:00, where the value should stand
      hint: have the cell formatted as a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds a span of time, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds the error `#DIV/0!`, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    ");
}

#[test]
fn formulas_errors_and_numbers_that_a_library_would_pass_on() {
    let book = with_cell(|sheet| drop(sheet.write(1, 1, 77.5)));
    let cell = "<c r=\"B2\"><v>77.5</v></c>";
    let all = [
        "<c r=\"B2\"><f>A1</f></c>",
        "<c r=\"B2\" t=\"e\"><v>#SPILL!</v></c>",
        "<c t=\"e\"><v>#SPILL!</v></c>",
        "<c r=\"B2\" t=\"n\"><v>1e999</v></c>",
        "<c r=\"B2\" t=\"n\"><v>NaN</v></c>",
        "<c r=\"B2\" t=\"n\"><v>x</v></c>",
        "<c r=\"B2\" t=\"b\"><v>7</v></c>",
        "<c r=\"B2\"><v>1</v></c><c r=\"B2\"><v>2</v></c>",
        "<c r=\"B2\"><f>A1*2</f><v>3.5</v></c>",
    ]
    .map(|odd| read(replaced(&book, SHEET, cell, odd), &table()))
    .concat();
    assert_snapshot!(all, @"
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds a formula without a result, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds the error `#SPILL!`, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds the error `#SPILL!`, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds `inf`, which is no finite number, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds `NaN`, which is no finite number, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds a text in place of its number, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds `7`, which means nothing there, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: holds two contents, where the value should stand
      hint: correct the cell where the export is made; it must hold a text or a number
    run P1
      value: 3.5 (sheet `Sheet1`, cell B2)
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    ");
}

/// 1904-01-01 and 1899-12-31 are 1,462 days apart (ECMA-376 part 1, 18.17.4.1).
#[test]
fn a_book_of_the_1904_epoch_is_read_by_it() {
    let book = replaced(
        &hub(),
        "xl/workbook.xml",
        "<workbookPr ",
        "<workbookPr date1904=\"1\" ",
    );
    assert!(read(hub(), &hub_rule()).contains("2026-06-02T14:20:05"));
    assert!(read(book, &hub_rule()).contains("2030-06-03T14:20:05"));
}

#[test]
fn plain_headings_are_found_in_a_workbook() {
    let mut book = Workbook::new();
    let sheet = book.add_worksheet();
    for (column, heading) in ["Value", "PART", "Fixture", "appraiser"].iter().enumerate() {
        sheet.write(3, column as u16, *heading).unwrap();
    }
    for (row, (value, part)) in (4..).zip([(50.01, 7.0), (50.02, 7.0), (50.03, 8.0)]) {
        sheet.write(row, 0, value).unwrap();
        sheet.write(row, 1, part).unwrap();
        sheet.write(row, 2, "left").unwrap();
        sheet.write(row, 3, "KL").unwrap();
    }
    let bytes = book.save_to_buffer().unwrap();
    let asked = Plain {
        factors: vec!["fixture".to_owned()],
    };
    assert!(is_workbook(&bytes));
    assert_snapshot!(shown(&read_plain(Export { path: "", bytes: &bytes }, &asked)), @"
    run 7 | KL | 1 | fixture left
      value: 50.01 (sheet `Sheet1`, cell A5)
    run 7 | KL | 2 | fixture left
      value: 50.02 (sheet `Sheet1`, cell A6)
    run 8 | KL | 1 | fixture left
      value: 50.03 (sheet `Sheet1`, cell A7)
    ");
}

#[test]
fn containers_that_are_not_read() {
    let zip = |parts: &[(&str, &[u8])]| {
        let mut zip = ZipWriter::new(Cursor::new(Vec::new()));
        for (name, bytes) in parts {
            zip.start_file(*name, SimpleFileOptions::default()).unwrap();
            zip.write_all(bytes).unwrap();
        }
        zip.finish().unwrap().into_inner()
    };
    let compound = |tail: &str| {
        let tail: Vec<u8> = tail.encode_utf16().flat_map(u16::to_le_bytes).collect();
        [
            &[0xD0, 0xCF, 0x11, 0xE0, 0xA1, 0xB1, 0x1A, 0xE1],
            tail.as_slice(),
        ]
        .concat()
    };
    let hub = hub();
    let all = [
        compound("Workbook"),
        zip(&[("content.xml", b"<a/>")]),
        zip(&[("xl/workbook.bin", b"")]),
        zip(&[("notes.txt", b"hub")]),
        zip(&[("_rels/.rels", b"<a/>")]),
        hub[..hub.len() / 2].to_vec(),
        b"PK\x03\x04".to_vec(),
    ]
    .map(|bytes| {
        assert!(is_workbook(&bytes));
        read(bytes, &table())
    })
    .concat();
    assert_snapshot!(all, @"
    refused, perhaps unfinished: the workbook is cut short or damaged: its streams cannot be read
      hint: export it again
    refused: this is an OpenDocument file that is no spreadsheet
      hint: have it saved as xlsx, or leave such files out with `files`
    refused: the workbook is damaged: its list of sheets has no end
      hint: export it again
    refused: this is a zip archive that holds no workbook
      hint: have it saved as xlsx, or leave such files out with `files`
    refused: the workbook is damaged: a part ends inside the element `Relationships`
      hint: export it again
    refused, perhaps unfinished: the workbook is cut short or damaged: its table of parts cannot be read
      hint: export it again
    refused, perhaps unfinished: the workbook is cut short or damaged: its table of parts cannot be read
      hint: export it again
    ");
    let xml = Rule {
        form: Form::Xml {
            each: "/a".to_owned(),
        },
        ..only_constants()
    };
    assert_snapshot!(read(hub, &xml), @"
    refused: this is a workbook; this instrument's exports are XML
      hint: correct `form`, or leave such files out with `files`; one instrument has exports of one form
    ");
}

fn only_constants() -> Rule {
    Rule {
        part: crate::shared::constant("P1"),
        value: Value {
            role: crate::shared::constant("1"),
            unit: None,
        },
        ..table()
    }
}

#[test]
fn stated_sizes_are_judged_before_anything_is_inflated() {
    let mut zip = ZipWriter::new(Cursor::new(Vec::new()));
    zip.start_file("xl/worksheets/sheet1.xml", SimpleFileOptions::default())
        .unwrap();
    for _ in 0..64 {
        zip.write_all(&[b' '; 1 << 20]).unwrap();
    }
    let bomb = zip.finish().unwrap().into_inner();
    assert!(bomb.len() < 200_000);
    let bounds = Bounds {
        inflated_bytes: 32 << 20,
        ..Bounds::default()
    };
    assert_snapshot!(read(bomb, &Rule { bounds, ..table() }), @"refused: the workbook states 67108864 bytes when inflated; the limit is 33554432");
    let flood = replaced(
        &hub(),
        "xl/sharedStrings.xml",
        "uniqueCount=\"",
        "uniqueCount=\"99999999999",
    );
    assert!(read(flood, &hub_rule()).contains("texts in a table of"));
}

#[test]
fn two_far_cells_cost_two_cells() {
    let book = with_cell(|sheet| drop(sheet.write(1_048_575, 4_000, 1.0)));
    assert_snapshot!(read(book, &table()), @"
    run P2
      value: 50.25 (sheet `Sheet1`, cell B3)
    set aside (1): sheet `Sheet1`, cell B2: blank, where the value should stand
      hint: measure this run again
    set aside (1): sheet `Sheet1`, cell A1048576: blank, where the part should stand
      hint: have every row filled in: nothing is taken over from the row above
    ");
    let book = with_cell(|sheet| drop(sheet.write(1_048_575, 16_383, 1.0)));
    assert_snapshot!(read(book, &table()), @"refused: sheet `Sheet1`, cell XFD1048576: beyond the limit of 4096 columns");
}
