//! Exports that cannot be read at all: one sentence each.

use crate::shared::{column, label, path, read, table, xml};
use insta::assert_snapshot;
use restudy_parsers::{
    Bounds, Cell, Export, Form, Header, Plain, Reader, Role, Rule, Sheet, Trial, read_plain,
};

pub(crate) fn xml_rule() -> Rule {
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
    refused, perhaps unfinished: no readings stand below the headings in line 1
      hint: was anything measured? export it again
    refused, perhaps unfinished: the file holds nothing but blanks
    refused: line 1: the control character U+0007 does not belong in text
      hint: have it exported again; text holds no control characters but tabs and line ends
    ");
    let junk: Vec<u8> = (0..=255).collect();
    assert_snapshot!(read(junk, &table()), @"
    refused: the file is neither text nor a workbook; it begins with the bytes 00 01 02 03
      hint: export it again; if the instrument writes such files beside its exports, leave them out of `files`
    ");
    assert_snapshot!(read("<?xml version=\"1.0\"?><a/>", &table()), @"
    refused: this is XML; this instrument's exports are tables
      hint: correct `form`, or leave such files out with `files`; one instrument has exports of one form
    ");
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
    assert_snapshot!(read("part,value,Value \nP1,1,2\n", &table()), @"
    refused: two columns are headed `value`, where the value should stand, in line 1
      hint: have one of them headed otherwise, so that it is clear which is meant
    ");
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
    assert_snapshot!(read("part,value\nP1,1\n", &third), @"
    refused, perhaps unfinished: line 3 is blank; the headings should stand there
      hint: correct the heading, or `header` if the headings stand in another row
    ");
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
    assert_snapshot!(read(two, &Rule { form: third, ..rule(label("by")) }), @"
    refused: the label `by` stands at two places: line 1, field 1 and line 2, field 1
      hint: name the cell itself with `cell`
    ");
    assert_snapshot!(read("part,value\nP1,1\n", &rule(path(r"by-(\w+)"))), @r#"
    refused: nothing in the path `export` matches `by-(\w+)`, where the appraiser should stand
      hint: name folder or file as the others, or correct `path`; it is searched in the path below the watched folder
    "#);
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
    refused, perhaps unfinished: line 1: the XML is malformed: a tag without its `>`
      hint: export it again
    refused, perhaps unfinished: the file holds no XML element
    refused: line 1: a second root element `export`
      hint: an export has one; were two written into one file?
    refused: line 1: text outside the root element: `tail`
    refused: line 1: the root element is `report`; this instrument's exports have `export`
      hint: correct `each`, or leave such files out with `files`
    refused: there is no element /export/run in this export
      hint: correct `each`; names stand without prefix, and case counts
    refused: there is no /export/run/value in this export, where the value should stand
      hint: correct the path; names stand without prefix, and case counts
    refused: line 1: a document type (DOCTYPE); exports that declare one are not read
    refused: line 1: the reference `&a;` means nothing here
      hint: only `&amp;`, `&lt;`, `&gt;`, `&quot;`, `&apos;` and numbers of printable characters do
    refused: line 1: the reference `&#1;` means nothing here
      hint: only `&amp;`, `&lt;`, `&gt;`, `&quot;`, `&apos;` and numbers of printable characters do
    refused: line 1: an attribute that cannot be read: its name stands twice in one tag
    refused: line 1: the namespace prefix `x` is not declared
    refused: line 2: the XML is malformed: `</export>` closes the element `run`
      hint: export it again
    refused: this is not XML, as this instrument's exports are; it begins with `part,value P1,1`
      hint: correct `form`, or leave such files out with `files`; one instrument has exports of one form
    ");
}

#[test]
fn xml_values_that_occur_twice_or_not_at_all_cost_one_run() {
    let text = "<export>\n<run part='P1'><value>1</value><value>1</value></run>\n<run part='P2'/>\n<run part='P3'><value>3</value></run></export>";
    assert_snapshot!(read(text, &xml_rule()), @"
    run P3
      value: 3 (line 4, /export/run/value)
    set aside (1): line 2, /export/run/value: holds a second text after the one in line 2, where the value should stand
      hint: correct the path so that it leads to one text a reading
    set aside (1): line 3, /export/run/value: blank, where the value should stand
      hint: measure this run again
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
      hint: correct the heading, or `header` if the headings stand in another row
    set aside (1): line 2, field 2: 3 fields below 2 headings
      hint: does a decimal comma or a text part the fields as well?
    run P1 | 1 | fixture left
      value: 1.5 (line 2, column `value`)
    run P1 | 2 | fixture left
      value: 1 (line 3, column `value`)
    ");
}
