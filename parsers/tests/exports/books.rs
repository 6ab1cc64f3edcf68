//! Workbooks of every kind and many writers (`fixtures/exports/workbooks`, whose `ORIGIN.md` says who
//! wrote which).

use std::path::PathBuf;

use fs_err as fs;
use insta::assert_snapshot;
use restudy_parsers::{Form, Header, Rule, Sheet, Taken, Trial, Value};

use crate::shared::{column, read, read_at, table};
use crate::workbooks::changed;

pub(crate) fn folder() -> PathBuf {
    PathBuf::from(concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/../fixtures/exports/workbooks"
    ))
}

pub(crate) fn book(name: &str) -> Vec<u8> {
    fs::read(folder().join(name)).unwrap()
}

/// The study's rule: headings in the second row of the sheet.
pub(crate) fn study(sheet: Sheet) -> Rule {
    Rule {
        form: Form::Table {
            sheet,
            header: Header::Find("part".to_owned()),
            delimiter: None,
        },
        appraiser: Some(column("appraiser")),
        trial: Some(Trial::Stated(column("trial"))),
        value: Value {
            role: column("value"),
            unit: None,
        },
        taken: Some(Taken {
            role: column("taken"),
            format: None,
            dates: None,
            written_in: None,
            shown_in: None,
        }),
        ..table()
    }
}

fn named(beginning: &str) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder())
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .filter(|name| name.starts_with(beginning) && name.contains('-'))
        .collect();
    names.sort();
    names
}

#[test]
fn all_kinds_of_workbook_of_one_study_give_the_same_readings_bit_for_bit() {
    let expected = fs::read_to_string(folder().join("study.txt")).unwrap();
    let books = named("study-");
    for ending in [".xlsx", ".xls", ".xlsb", ".ods"] {
        let written = books.iter().filter(|name| name.ends_with(ending)).count();
        assert!(written >= 2, "{written} {ending}");
    }
    for name in books {
        let by_name = read(book(&name), &study(Sheet::Named("results".to_owned())));
        assert_eq!(by_name, expected, "{name}");
        assert_eq!(read(book(&name), &study(Sheet::First)), expected, "{name}");
    }
}

fn days(shown: &str) -> Vec<&str> {
    shown
        .lines()
        .filter(|line| line.starts_with("run "))
        .collect()
}

#[test]
fn days_counted_from_1904_are_the_same_days() {
    let study_text = fs::read_to_string(folder().join("study.txt")).unwrap();
    let books = named("epoch-1904-");
    assert_eq!(books.len(), 2);
    for name in books {
        let shown = read(book(&name), &study(Sheet::First));
        assert_eq!(days(&shown), days(&study_text), "{name}");
    }
}

/// The flag (\[MS-XLSB\] 2.4.841) set in a book of the other epoch: 1,462 days later, as in
/// ECMA-376 part 1, 18.17.4.1.
#[test]
fn the_epoch_of_xlsb() {
    let later = changed(
        &book("study-pyxlsbwriter.xlsb"),
        "xl/workbook.bin",
        |mut part| {
            let at = part
                .windows(3)
                .position(|record| record == [0x99, 0x01, 12])
                .unwrap();
            part[at + 3] |= 1;
            part
        },
    );
    let shown = read(later, &study(Sheet::First));
    assert_eq!(days(&shown)[0], "run P1 | KL | 1 | 2030-06-03T14:20:05");
}

#[test]
fn the_study_without_its_times() {
    let study_text = fs::read_to_string(folder().join("study.txt")).unwrap();
    let expected: String = study_text
        .lines()
        .map(|line| match line.strip_prefix("run ") {
            Some(_) => format!("{}\n", &line[..line.rfind(" | ").unwrap()]),
            None => format!("{line}\n"),
        })
        .collect();
    let rule = Rule {
        taken: None,
        ..study(Sheet::Named("Results".to_owned()))
    };
    let books = named("numbers-");
    assert_eq!(books.len(), 3);
    for name in books {
        assert_eq!(read(book(&name), &rule), expected, "{name}");
    }
}

#[test]
fn the_name_decides_nothing() {
    let expected = fs::read_to_string(folder().join("study.txt")).unwrap();
    for name in ["run.csv", "run.xls", "run.xlsx", "run.ods", "run"] {
        for written in [
            "study-openpyxl.xlsx",
            "study-xlwt.xls",
            "study-sheetjs.xlsb",
            "study-odfpy.ods",
        ] {
            assert_eq!(
                read_at(name, book(written), &study(Sheet::First)),
                expected,
                "{written} named {name}"
            );
        }
    }
}

#[test]
fn a_hidden_sheet_is_read_by_its_name_only() {
    for name in &named("study-") {
        let hidden = Rule {
            form: Form::Table {
                sheet: Sheet::Named("Setup".to_owned()),
                header: Header::Row(1),
                delimiter: None,
            },
            ..table()
        };
        let shown = read(book(name), &hidden);
        assert!(
            shown.contains("not this one") || shown.contains("no cell"),
            "{name}: {shown}"
        );
    }
}

/// Every writer's cells, `part` and `value`: what they were told stands in the scripts.
#[test]
fn cells_that_are_no_values_are_set_aside_by_name() {
    let all: String = named("cells-")
        .iter()
        .map(|name| format!("{name}\n{}", read(book(name), &table())))
        .collect();
    assert_snapshot!(all);
}

#[test]
fn passwords_are_told() {
    for name in named("password-") {
        assert_eq!(
            read(book(&name), &table()),
            "refused: the workbook is protected by a password\n  hint: have it exported without a password\n",
            "{name}"
        );
    }
    // [MS-XLS] 2.4.117, in place of a record of the same length (2.4.146).
    let mut locked = book("study-xlwt.xls");
    let at = locked
        .windows(4)
        .position(|record| record == [0xE1, 0x00, 0x02, 0x00])
        .unwrap();
    locked[at] = 0x2F;
    assert!(read(locked, &table()).contains("protected by a password"));
}

#[test]
fn two_far_cells_cost_two_cells() {
    assert_snapshot!(read(book("far-xlsxwriter.xlsx"), &table()), @"
    run P1
      value: 50.25 (sheet `Sheet1`, cell B1048576)
    ");
    let wide = read(book("far-xlwt.xls"), &table());
    assert!(
        wide.starts_with("refused: sheet 1 of this xls workbook spans"),
        "{wide}"
    );
    assert_snapshot!(read(book("repeats-odfpy.ods"), &table()), @"refused: more than 8388608 cells; that is the limit");
}

#[test]
fn workbooks_cut_short_are_refused_and_worth_another_look() {
    let rule = study(Sheet::First);
    for name in [
        "study-openpyxl.xlsx",
        "study-xlwt.xls",
        "study-libreoffice.xls",
        "study-sheetjs.xlsb",
        "study-pyxlsbwriter.xlsb",
        "study-odfpy.ods",
        "study-libreoffice.ods",
    ] {
        let whole = book(name);
        for end in (64..whole.len()).step_by(64) {
            let shown = read(&whole[..end], &rule);
            assert!(
                shown.starts_with("refused, perhaps unfinished: "),
                "{name} at {end}: {shown}"
            );
        }
    }
}

/// No checksum guards the streams of an xls workbook.
#[test]
fn changed_bytes_of_xls_are_no_panic() {
    let rule = study(Sheet::First);
    let mut bytes = book("study-xlwt.xls");
    for at in 0..bytes.len() {
        bytes[at] ^= 0x20;
        let shown = read(&bytes, &rule);
        assert!(
            ["run ", "set aside ", "refused"]
                .iter()
                .any(|told| shown.starts_with(told)),
            "{at}: {shown}"
        );
        bytes[at] ^= 0x20;
    }
}
