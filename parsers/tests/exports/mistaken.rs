//! Files that are something else than their name, their rule or their headings say.

use crate::refusals::xml_rule;
use crate::shared::{label, read, read_at, table};
use insta::assert_snapshot;
use restudy_parsers::{Export, Form, Header, Plain, Rule, Sheet, read_plain};

#[test]
fn bytes_that_are_neither_text_nor_a_workbook_whatever_the_file_is_called() {
    let picture = b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR\0\0\x02\0\0\0\x01\x80";
    let latin = Rule {
        encoding: Some("windows-1252".to_owned()),
        ..table()
    };
    assert_snapshot!(read_at("run-1.xlsx", picture, &table()), @"
    refused: the file is neither text nor a workbook; it begins with the bytes 89 50 4E 47
      hint: export it again; if the instrument writes such files beside its exports, leave them out of `files`
    ");
    assert_eq!(
        read_at("run-1.csv", picture, &table()),
        read_at("run-1.xlsx", picture, &latin)
    );
    assert_snapshot!(read("%PDF-1.7\n\u{1}\u{2}\u{3}\u{4}", &table()), @"
    refused: the file is neither text nor a workbook; it begins with `%PDF-1.7`
      hint: export it again; if the instrument writes such files beside its exports, leave them out of `files`
    ");
    assert_snapshot!(read(b"part,value\nSt\xfcck,1\n", &table()), @r#"
    refused: line 2: the byte 0xFC is not UTF-8 text, and nothing names another encoding
      hint: if this is text, name its encoding, as in `encoding = "windows-1252"`
    "#);
}

#[test]
fn text_under_a_workbooks_name_is_told_so_only_when_it_cannot_be_read() {
    assert_snapshot!(read_at("GRR/run-1.XLSX", "part,value\nP1,1\n", &table()), @"
    run P1
      value: 1 (line 2, column `value`)
    ");
    assert_snapshot!(read_at("GRR/run-1.XLSX", "part;actual\nP1;1\n", &table()), @"
    refused: `run-1.XLSX` is named as a workbook but holds plain text: no column is headed `part`, where the part should stand; line 1 has one field only: `part;actual`
      hint: is the delimiter `;`?
    ");
    assert_snapshot!(read_at("run-1.xlsx", "<?xml version=\"1.0\"?><a/>", &table()), @"
    refused: `run-1.xlsx` is named as a workbook but holds XML: this is XML; this instrument's exports are tables
      hint: correct `form`, or leave such files out with `files`; one instrument has exports of one form
    ");
    assert_snapshot!(read_at("run-1.xls", "<html><table></table></html>", &table()), @"
    refused, perhaps unfinished: `run-1.xls` is named as a workbook but holds HTML: no column is headed `part`, where the part should stand; line 1 has one field only: `<html><table></table></html>`
      hint: have it saved as a workbook (xlsx)
    ");
    assert_snapshot!(read_at("run-1.xlsx", "part,value\nP1,1\n", &xml_rule()), @"
    refused: `run-1.xlsx` is named as a workbook but holds plain text: this is not XML, as this instrument's exports are; it begins with `part,value P1,1`
      hint: correct `form`, or leave such files out with `files`; one instrument has exports of one form
    ");
    let plain = read_plain(
        Export {
            path: "run-1.xlsx",
            bytes: b"<html><table></table></html>",
        },
        &Plain::default(),
    );
    assert_snapshot!(crate::shared::shown(&plain), @"
    refused, perhaps unfinished: `run-1.xlsx` is named as a workbook but holds HTML: no column is headed `part`; line 1 has `<html><table></table></html>`
      hint: have it saved as a workbook (xlsx)
    ");
}

#[test]
fn a_wrong_delimiter_leaves_one_field_a_line() {
    assert_snapshot!(read("Part;Value\nP1;1\n", &table()), @"
    refused: no column is headed `part`, where the part should stand; line 1 has one field only: `Part;Value`
      hint: is the delimiter `;`?
    ");
    let semicolons = "by;KL;\n\npart;value\nP1;1,5\n";
    let find = Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Find("Part".to_owned()),
            delimiter: Some('\t'),
        },
        ..table()
    };
    assert_snapshot!(read(semicolons, &find), @"
    refused: no cell holds the heading `Part`; line 3 has one field only: `part;value`
      hint: is the delimiter `;`?
    ");
    let third = Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Row(3),
            delimiter: Some('|'),
        },
        appraiser: Some(label("by")),
        ..table()
    };
    assert_snapshot!(read(semicolons, &third), @"
    refused: no cell holds the label `by`; line 1 has one field only: `by;KL;`
      hint: is the delimiter `;`?
    ");
    assert_snapshot!(read("by;KL;\n\npart|value\nP1|1,5\n", &third), @"
    refused: no cell holds the label `by`; line 1 has one field only: `by;KL;`
      hint: is the delimiter `;`?
    ");
    assert_snapshot!(read("part\tvalue\nP1\t1\n", &table()), @r#"
    refused: no column is headed `part`, where the part should stand; line 1 has one field only: `part value`
      hint: is the delimiter a tab, `\t`?
    "#);
    let plain = read_plain(
        Export {
            path: "",
            bytes: b"part|value\nP1|1\n",
        },
        &Plain::default(),
    );
    assert_snapshot!(crate::shared::shown(&plain), @"
    refused: no column is headed `part`; line 1 has `part|value`
      hint: one field only; part the fields by `,`, `;` or a tab
    ");
}

#[test]
fn everyday_words_for_plain_headings_are_asked_about() {
    let plain = read_plain(
        Export {
            path: "",
            bytes: b"Part,Operator,Result\nP1,KL,1\n",
        },
        &Plain::default(),
    );
    assert_snapshot!(crate::shared::shown(&plain), @"
    refused: no column is headed `value`; line 1 has `Part`, `Operator`, `Result`
      hint: is it `Result`? head that column `value`
    ");
}
