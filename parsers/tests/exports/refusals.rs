//! Exports that cannot be read at all: one sentence each.

use crate::shared::{column, label, path, read, read_at, table, xml};
use insta::assert_snapshot;
use restudy_parsers::{
    Bounds, Cell, Export, Form, Header, Plain, Reader, Role, Rule, Sheet, Trial, read_plain,
};

fn xml_rule() -> Rule {
    Rule {
        form: Form::Xml {
            each: "/export/run".to_owned(),
        },
        part: xml("@part"),
        value: restudy_parsers::Value {
            role: xml("value"),
            unit: None,
        },
        ..table()
    }
}

#[test]
fn files_that_hold_no_table() {
    let all = [
        "",
        " \r\n",
        "part,value\nP1,1\0\0\0",
        "\u{feff}",
        "part,value\n",
        "\n\n",
        "a\u{7}b",
    ]
    .map(|text| read(text, &table()))
    .concat();
    assert_snapshot!(all, @"
    refused, perhaps unfinished: the file is empty
    refused, perhaps unfinished: the file holds nothing but blanks
    refused, perhaps unfinished: the file ends in NUL bytes, as one does that is still being written
    refused, perhaps unfinished: the file holds nothing but blanks
    refused, perhaps unfinished: no readings stand below the headings
    refused, perhaps unfinished: the file holds nothing but blanks
    refused: line 1: the control character U+0007 does not belong in text
    ");
    let junk: Vec<u8> = (0..=255).collect();
    assert_snapshot!(read(junk, &table()), @r#"
    refused: byte 129 (0x80) is not UTF-8 text, and nothing names another encoding
      hint: if this is text, name its encoding, as in `encoding = "windows-1252"`
    "#);
    assert_snapshot!(read("<?xml version=\"1.0\"?><a/>", &table()), @"refused: this is XML; this instrument's exports are tables");
}

#[test]
fn headings_that_are_missing_mistyped_or_double() {
    let rule = Rule {
        appraiser: Some(column("Loaded by")),
        ..table()
    };
    assert_snapshot!(read("part,loadedby,value\nP1,KL,1\n", &rule), @"
    refused: no column is headed `Loaded by`, where the appraiser should stand; line 1 has `part`, `loadedby`, `value`
      hint: did you mean `loadedby`?
    ");
    assert_snapshot!(read("part,value,Value \nP1,1,2\n", &table()), @"refused: two columns are headed `value`, where the value should stand, in line 1");
    assert!(read("part,value,note,note\nP1,1,,\n", &table()).starts_with("run P1"));
    let find = |text: &str| Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Find(text.to_owned()),
            delimiter: None,
        },
        ..table()
    };
    assert_snapshot!(read("Parts,value\nP1,1\n", &find("part")), @"
    refused, perhaps unfinished: no cell holds the heading `part`
      hint: did you mean `Parts`?
    ");
    let third = Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Row(3),
            delimiter: None,
        },
        ..table()
    };
    assert_snapshot!(read("part,value\nP1,1\n", &third), @"refused, perhaps unfinished: line 3 is blank; the headings should stand there");
}

#[test]
fn labels_and_paths_that_lead_nowhere() {
    let rule = |appraiser| Rule {
        appraiser: Some(appraiser),
        ..table()
    };
    assert_snapshot!(read("Loaded  By:,KL\npart,value\nP1,1\n", &rule(label("Loaded by"))), @"
    refused, perhaps unfinished: no cell holds the label `Loaded by`
      hint: did you mean `Loaded By:`?
    ");
    let two = "by,KL\nby,MO\npart,value\nP1,1\n";
    let third = Form::Table {
        sheet: Sheet::First,
        header: Header::Row(3),
        delimiter: None,
    };
    assert_snapshot!(read(two, &Rule { form: third, ..rule(label("by")) }), @"refused: the label `by` stands at two places: line 1, field 1 and line 2, field 1");
    assert_snapshot!(read("part,value\nP1,1\n", &rule(path(r"by-(\w+)"))), @r#"refused: nothing in the export's path matches `by-(\w+)`, where the appraiser should stand"#);
}

#[test]
fn xml_that_is_no_whole_export() {
    let all = [
        "<export><run part='P1'><value>1</value>",
        "<export><run part='P1'><val",
        "<?xml version='1.0'?>",
        "<export><run part='P1'><value>1</value></run></export><export/>",
        "<export><run part='P1'><value>1</value></run></export> tail",
        "<report><run/></report>",
        "<export><other/></export>",
        "<export><run part='P1'/></export>",
        "<!DOCTYPE export [<!ENTITY a 'b'>]><export/>",
        "<export><run part='P1'><value>&a;</value></run></export>",
        "<export><run part='P1'><value>&#1;</value></run></export>",
        "<export><run part='P1' part='P2'><value>1</value></run></export>",
        "<export><x:run part='P1'><value>1</value></x:run></export>",
        "<export>\n<run part='P1'></export>",
        "part,value\nP1,1\n",
    ]
    .map(|text| read(text, &xml_rule()))
    .concat();
    assert_snapshot!(all, @"
    refused, perhaps unfinished: line 1: the file ends inside 2 open elements
    refused, perhaps unfinished: line 1: the XML is malformed: syntax error: tag not closed: `>` not found before end of input
    refused, perhaps unfinished: the file holds no XML element
    refused: line 1: a second root element `export`
    refused: line 1: text outside the root element: `tail`
    refused: the root element is `report`; this instrument's exports have `export`
    refused: there is no element /export/run in this export
    refused: there is no /export/run/value in this export, where the value should stand
    refused: line 1: a document type (DOCTYPE); exports that declare one are not read
    refused: line 1: the reference `&a;` means nothing here
    refused: line 1: the reference `&#1;` means nothing here
    refused: line 1: an attribute that cannot be read: position 14: duplicated attribute, previous declaration at position 4
    refused: line 1: the namespace prefix `x` is not declared
    refused: line 2: the XML is malformed: ill-formed document: expected `</run>`, but `</export>` was found
    refused: this is not XML; it begins with `part,value P1,1`
    ");
}

#[test]
fn xml_values_that_occur_twice_or_not_at_all_cost_one_run() {
    let text = "<export>\n<run part='P1'><value>1</value><value>1</value></run>\n<run part='P2'/>\n<run part='P3'><value>3</value></run></export>";
    assert_snapshot!(read(text, &xml_rule()), @"
    run P3
      value: 3 (line 4, /export/run/value)
    set aside (1): line 2, /export/run/value: holds a second text after the one in line 2, where the value should stand
    set aside (1): line 3, /export/run/value: blank, where the value should stand
    ");
}

#[test]
fn limits_are_named() {
    let small = Bounds {
        file_bytes: 200,
        depth: 3,
        text_bytes: 8,
        rows: 2,
        ..Bounds::default()
    };
    let rule = Rule {
        bounds: small,
        ..xml_rule()
    };
    let all = [
        "x".repeat(201),
        "<export><run><value><a/></value></run></export>".to_owned(),
        "<export><run part='P1'><value>1234</value></run><run><value>56789<b/>1234</value></run></export>".to_owned(),
        "<export><run part='123456789'/></export>".to_owned(),
        "<export><run/><run/><run/></export>".to_owned(),
    ]
    .map(|text| read(text, &rule))
    .concat();
    assert_snapshot!(all, @"
    refused: the file has 201 bytes; the limit is 200
    refused: line 1: elements lie deeper than 3; that is the limit
    refused: line 1: elements lie deeper than 3; that is the limit
    refused: line 1: a text of 9 bytes; the limit is 8
    refused: more than 2 elements /export/run; that is the limit
    ");
}

#[test]
fn rules_that_cannot_be_used() {
    let part = |from| Rule {
        part: Role::plain(from),
        ..table()
    };
    let find = Role {
        find: Some("(".to_owned()),
        ..column("part")
    };
    let rules = [
        Rule {
            decimal: ';',
            ..table()
        },
        Rule {
            encoding: Some("latin-99".to_owned()),
            ..table()
        },
        part(Cell::Xml("@part".to_owned())),
        part(Cell::Path("[".to_owned())),
        Rule {
            part: find,
            ..table()
        },
        Rule {
            part: column("part"),
            ..xml_rule()
        },
        Rule {
            part: xml("a//b"),
            ..xml_rule()
        },
        Rule {
            form: Form::Xml {
                each: "run".to_owned(),
            },
            ..xml_rule()
        },
        Rule {
            upper: crate::shared::deviation(column("up")),
            ..table()
        },
        Rule {
            trial: Some(Trial::Counted(restudy_parsers::Count::Taken)),
            ..table()
        },
    ];
    let all: Vec<String> = rules
        .iter()
        .map(|rule| Reader::new(rule).unwrap_err().to_string())
        .collect();
    assert_snapshot!(all.join("\n"), @"
    decimal: `;` is neither `.` nor `,`
    encoding: `latin-99` names no encoding
    part: an XML path, but the form is a table
    part: the regex `[` cannot be used: unclosed character class
    part: the regex `(` cannot be used: unclosed group
    part: a place in a table, but the form is XML
    part: `a//b` is not a path such as `/export/run/feature`, `value`, `@id` or `../@part`
    each: `run` is not a path such as `/export/run/feature`, `value`, `@id` or `../@part`
    nominal: a limit is taken from it, but there is none
    trial: counted by time stamp, but there is no `taken`
    ");
}

#[test]
fn plain_exports_that_are_not_plain() {
    let asked = Plain {
        factors: vec!["fixture".to_owned()],
    };
    let plain = |text: &str, asked: &Plain| {
        crate::shared::shown(&read_plain(
            Export {
                path: "",
                bytes: text.as_bytes(),
            },
            asked,
        ))
    };
    let all = [
        plain("part;val\nP1;1\n", &Plain::default()),
        plain("part;value;upper\nP1;1,5;2.5\n", &Plain::default()),
        plain("part;value\nP1;1\n", &asked),
        plain("part,value\nP1,1,5\n", &Plain::default()),
        plain("Fixture\tPART\tvalue\nleft\tP1\t1,5\nleft\tP1\t1\n", &asked),
    ]
    .concat();
    assert_snapshot!(all, @"
    refused: no column is headed `value`; line 1 has `part`, `val`
      hint: the headings are `part`, `appraiser`, `trial`, `characteristic`, `value`, `nominal`, `lower`, `upper`, `unit`, `taken`
    refused: the numbers have two decimal marks: `1,5` (line 2, field 2) and `2.5` (line 2, field 3)
      hint: write all numbers with one decimal mark and no marks between thousands
    refused: no column is headed `fixture`, where the factor `fixture` should stand; line 1 has `part`, `value`
    set aside (1): line 2, field 2: 3 fields below 2 headings
      hint: does a decimal comma or a text part the fields as well?
    run P1 | 1 | fixture left
      value: 1.5 (line 2, column `value`)
    run P1 | 2 | fixture left
      value: 1 (line 3, column `value`)
    ");
}

#[test]
fn bytes_that_are_neither_text_nor_a_workbook_whatever_the_file_is_called() {
    let picture = b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR\0\0\x02\0\0\0\x01\x80";
    let latin = Rule {
        encoding: Some("windows-1252".to_owned()),
        ..table()
    };
    assert_snapshot!(read_at("run-1.xlsx", picture, &table()), @"");
    assert_eq!(
        read_at("run-1.csv", picture, &table()),
        read_at("run-1.xlsx", picture, &latin)
    );
    assert_snapshot!(read("%PDF-1.7\n\u{1}\u{2}\u{3}\u{4}", &table()), @"");
    assert_snapshot!(read(b"part,value\nSt\xfcck,1\n", &table()), @"");
}

#[test]
fn text_under_a_workbooks_name_is_told_so_only_when_it_cannot_be_read() {
    assert_snapshot!(read_at("GRR/run-1.XLSX", "part,value\nP1,1\n", &table()), @"");
    assert_snapshot!(read_at("GRR/run-1.XLSX", "part;actual\nP1;1\n", &table()), @"");
    assert_snapshot!(read_at("run-1.xlsx", "<?xml version=\"1.0\"?><a/>", &table()), @"");
    assert_snapshot!(read_at("run-1.xls", "<html><table></table></html>", &table()), @"");
    assert_snapshot!(read_at("run-1.xlsx", "part,value\nP1,1\n", &xml_rule()), @"");
    let plain = read_plain(
        Export {
            path: "run-1.xlsx",
            bytes: b"<html><table></table></html>",
        },
        &Plain::default(),
    );
    assert_snapshot!(crate::shared::shown(&plain), @"");
}

#[test]
fn a_wrong_delimiter_leaves_one_field_a_line() {
    assert_snapshot!(read("part;value;unit, SI\nP1;1;mm\n", &table()), @"");
    let semicolons = "by;KL;\n\npart;value\nP1;1,5\n";
    let find = Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Find("Part".to_owned()),
            delimiter: Some('\t'),
        },
        ..table()
    };
    assert_snapshot!(read(semicolons, &find), @"");
    let third = Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Row(3),
            delimiter: Some('|'),
        },
        appraiser: Some(label("by")),
        ..table()
    };
    assert_snapshot!(read(semicolons, &third), @"");
    assert_snapshot!(read("by;KL;\n\npart|value\nP1|1,5\n", &third), @"");
    assert_snapshot!(read("part\tvalue\nP1\t1\n", &table()), @"");
    let plain = read_plain(
        Export {
            path: "",
            bytes: b"part|value\nP1|1\n",
        },
        &Plain::default(),
    );
    assert_snapshot!(crate::shared::shown(&plain), @"");
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
    assert_snapshot!(crate::shared::shown(&plain), @"");
}
