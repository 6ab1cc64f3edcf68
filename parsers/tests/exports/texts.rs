//! Exports of `fixtures/exports/text`: encodings, delimiters, numbers, units and time stamps, each read as
//! its writer was told to write it.

use std::fmt::Write as _;

use restudy_parsers::{
    Epoch, Export, Form, Header, Parsed, Refused, Role, Rule, Sheet, Taken, Trial, Value,
};

use crate::shared::{absolute, column, constant, table};

/// Name, bytes, and what is expected.
type File = (&'static str, &'static [u8], &'static str);

macro_rules! files {
    ($($name:literal)*) => {
        &[$((
            $name,
            include_bytes!(concat!("../../../fixtures/exports/text/", $name)),
            include_str!(concat!("../../../fixtures/exports/text/", $name, ".expected")),
        )),*]
    };
}

/// Part, feature and value in mm.
fn short() -> Rule {
    Rule {
        part: column("Part"),
        characteristic: Some(column("Feature")),
        value: Value {
            role: column("Actual"),
            unit: Some(constant("mm")),
        },
        ..table()
    }
}

/// One study in many dresses.
fn study() -> Rule {
    Rule {
        appraiser: Some(column("Appraiser")),
        trial: Some(Trial::Stated(column("Trial"))),
        nominal: Some(column("Nominal")),
        lower: absolute(column("Lower")),
        upper: absolute(column("Upper")),
        ..short()
    }
}

fn delimited(mark: char) -> Form {
    Form::Table {
        sheet: Sheet::First,
        header: Header::Row(1),
        delimiter: Some(mark),
    }
}

/// The line `sep=…` is one of the file's.
fn below_its_sep_line(rule: Rule) -> Rule {
    Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Row(2),
            delimiter: None,
        },
        ..rule
    }
}

fn marks(decimal: char, thousands: char, rule: Rule) -> Rule {
    Rule {
        decimal,
        thousands: Some(thousands),
        ..rule
    }
}

fn encoded(label: &str, rule: Rule) -> Rule {
    Rule {
        encoding: Some(label.to_owned()),
        ..rule
    }
}

fn in_unit(unit: Option<Role>, rule: Rule) -> Rule {
    Rule {
        value: Value { unit, ..rule.value },
        ..rule
    }
}

fn taken(format: Option<&str>, dates: Option<Epoch>) -> Rule {
    Rule {
        taken: Some(Taken {
            role: column("Taken"),
            format: format.map(str::to_owned),
            dates,
            written_in: None,
            shown_in: None,
        }),
        ..short()
    }
}

fn rule(name: &str) -> Rule {
    let header_of_two_lines = || Rule {
        line_breaks: true,
        value: Value {
            role: column("Actual [mm]"),
            unit: Some(constant("mm")),
        },
        ..study()
    };
    let tabs = |rule| Rule {
        form: delimited('\t'),
        ..rule
    };
    match name {
        "utf-8.csv" => study(),
        "utf-8-mark.csv" => Rule {
            decimal: ',',
            ..study()
        },
        "windows-1252.csv" => encoded("windows-1252", marks(',', '.', study())),
        "iso-8859-2.txt" => encoded("iso-8859-2", tabs(marks(',', ' ', study()))),
        "iso-8859-15.txt" => Rule {
            form: delimited(';'),
            ..encoded("iso-8859-15", marks('.', '\'', study()))
        },
        "utf-16-little.txt" => tabs(marks(',', ' ', study())),
        "utf-16-big.csv" => below_its_sep_line(marks('.', '\'', study())),
        "utf-16-unmarked.txt" => encoded("utf-16le", tabs(marks('.', ',', study()))),
        "all-quoted.csv" => marks('.', ',', study()),
        "heading-of-two-lines.csv" => header_of_two_lines(),
        "shift-jis.csv" => encoded("shift_jis", study()),
        "euc-jp.csv" => encoded("euc-jp", study()),
        "utf-8-kana.csv" => Rule {
            form: delimited(';'),
            ..marks('.', ' ', study())
        },
        "lengths-in-inches.csv" => in_unit(Some(constant("inch")), short()),
        "angles.csv" => Rule {
            decimal: ',',
            ..in_unit(Some(constant("deg")), short())
        },
        "units-that-are-none.csv" => in_unit(Some(column("Unit")), short()),
        "nominal-without-unit.csv" => Rule {
            nominal: Some(column("Nominal")),
            upper: absolute(column("Upper")),
            ..in_unit(None, short())
        },
        "days-since-1900.csv" => taken(None, Some(Epoch::Of1900)),
        "days-since-1904.csv" => Rule {
            decimal: ',',
            ..taken(None, Some(Epoch::Of1904))
        },
        "two-digit-years.csv" => taken(Some("%m/%d/%y %I:%M %p"), None),
        "no-values.csv" => Rule {
            no_value: ["0", "9999", "---", "NaN", "inf", "-inf", "ol", ""]
                .map(str::to_owned)
                .into(),
            ..short()
        },
        "thousands.csv" => marks(',', '.', short()),
        "not-shift-jis.csv" => encoded("shift_jis", short()),
        _ => short(),
    }
}

fn outcome(&(name, bytes, _): &File) -> Result<Parsed, Refused> {
    restudy_parsers::read(Export { path: name, bytes }, &rule(name))
}

/// In the words of the writer.
fn shown(outcome: &Result<Parsed, Refused>) -> String {
    let mut out = String::new();
    let hint = |out: &mut String, hint: &Option<String>| {
        if let Some(hint) = hint {
            writeln!(out, "  hint: {hint}").unwrap();
        }
    };
    match outcome {
        Err(refused) => {
            writeln!(out, "refused: {}", refused.sentence).unwrap();
            hint(&mut out, &refused.hint);
        }
        Ok(parsed) => {
            for reading in &parsed.readings {
                let run = &parsed.runs[reading.run];
                let taken = run.taken.map(|taken| taken.to_string());
                let labels = [
                    Some(&run.part),
                    run.appraiser.as_ref(),
                    run.trial.as_ref(),
                    taken.as_ref(),
                ]
                .map(|label| label.map_or("-", String::as_str))
                .join(" ");
                let bounds = [reading.lower, reading.nominal, reading.upper]
                    .map(|bound| bound.map_or("-".to_owned(), |bound| format!("{bound:?}")))
                    .join(" ");
                let unit = reading.unit.as_deref().unwrap_or("-");
                writeln!(
                    out,
                    "{labels} | {} = {:?} {unit} [{bounds}]",
                    reading.characteristic, reading.value
                )
                .unwrap();
            }
            for aside in &parsed.set_aside {
                writeln!(out, "set aside {}: {}", aside.readings, aside.reason).unwrap();
                hint(&mut out, &aside.hint);
            }
        }
    }
    out
}

/// Tells all files that differ at once.
fn expect(files: &[File]) {
    let mut differ = String::new();
    for file in files {
        let told = shown(&outcome(file));
        if told != file.2 {
            write!(differ, "\n{}: expected\n{}but told\n{told}", file.0, file.2).unwrap();
        }
    }
    assert_eq!(differ, "");
}

const DRESSES: &[File] = files! {
    "utf-8.csv" "utf-8-mark.csv" "windows-1252.csv" "iso-8859-2.txt" "iso-8859-15.txt" "utf-16-little.txt"
    "utf-16-big.csv" "utf-16-unmarked.txt" "all-quoted.csv" "heading-of-two-lines.csv"
};
const KANA: &[File] = files! { "shift-jis.csv" "euc-jp.csv" "utf-8-kana.csv" };

#[test]
fn one_study_in_every_dress_gives_the_same_readings_bit_for_bit() {
    for dresses in [DRESSES, KANA] {
        expect(dresses);
        let same: std::collections::BTreeSet<&str> = dresses.iter().map(|file| file.2).collect();
        assert_eq!(same.len(), 1, "the writer was told one study");
    }
}

#[test]
fn units_behind_numbers() {
    expect(files! {
        "lengths.csv" "lengths-in-inches.csv" "angles.csv" "units-that-are-none.csv" "nominal-without-unit.csv"
    });
}

#[test]
fn time_stamps() {
    expect(files! { "days-since-1900.csv" "days-since-1904.csv" "two-digit-years.csv" });
}

#[test]
fn no_value_and_no_number() {
    expect(files! { "no-values.csv" "thousands.csv" });
}

#[test]
fn damage() {
    let files: &[File] = files! {
        "open-quote.csv" "cut-in-a-quote.csv" "behind-a-quote.csv" "not-utf-8.csv" "not-shift-jis.csv"
    };
    expect(files);
    let unfinished: Vec<&str> = files
        .iter()
        .filter(|file| outcome(file).is_err_and(|refused| refused.perhaps_unfinished))
        .map(|file| file.0)
        .collect();
    assert_eq!(unfinished, ["open-quote.csv", "cut-in-a-quote.csv"]);
}
