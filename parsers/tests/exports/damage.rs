//! Exports cut short at every byte and with every byte changed: never a panic, and no value lost
//! from the account.

use restudy_parsers::{Export, Parsed, Plain, Reader, Refused, Rule, read_plain};

use crate::shared::accounted;
use crate::{fixtures, workbooks};

const MASKS: [u8; 4] = [0x01, 0x20, 0x80, 0xFF];

/// Calls `check` with the export cut at each byte, then with each byte changed in each of `masks`.
pub(crate) fn damaged(bytes: &[u8], masks: &[u8], mut check: impl FnMut(&[u8])) {
    for end in 0..bytes.len() {
        check(&bytes[..end]);
    }
    let mut changed = bytes.to_vec();
    for at in 0..bytes.len() {
        for mask in masks {
            changed[at] ^= mask;
            check(&changed);
            changed[at] ^= mask;
        }
    }
}

/// What holds for every outcome.
pub(crate) fn consistent(outcome: &Result<Parsed, Refused>) {
    match outcome {
        Ok(parsed) => {
            assert!(
                parsed
                    .readings
                    .iter()
                    .all(|reading| reading.run < parsed.runs.len())
            );
            assert!(
                parsed
                    .readings
                    .iter()
                    .all(|reading| reading.value.is_finite())
            );
            assert!(parsed.set_aside.iter().all(|aside| aside.readings > 0));
            let read = |run: usize| parsed.readings.iter().any(|reading| reading.run == run);
            assert!((0..parsed.runs.len()).all(read), "a run without a reading");
        }
        Err(refused) => {
            assert!(!refused.sentence.contains('\n'), "{}", refused.sentence);
            assert!(!refused.sentence.is_empty());
        }
    }
}

/// Lines that are not blank between the headings (line 7) and the end text.
fn value_fields(text: &[u8]) -> Option<usize> {
    let text = std::str::from_utf8(text).ok()?;
    let below = text
        .split(['\n', '\r'])
        .skip_while(|line| !line.to_lowercase().starts_with("serial no."));
    let rows = below
        .skip(1)
        .take_while(|line| !line.to_lowercase().contains("end of report"));
    Some(
        rows.filter(|line| line.split(',').any(|field| !field.trim().is_empty()))
            .count(),
    )
}

#[test]
fn delimited_text() {
    let reader = Reader::new(&fixtures::bridge_1()).unwrap();
    let mut accounts = 0;
    damaged(fixtures::BRIDGE_1, &MASKS, |bytes| {
        let outcome = reader.read(Export {
            path: "hub/run-2.csv",
            bytes,
        });
        consistent(&outcome);
        if let (Ok(parsed), Some(fields)) = (outcome, value_fields(bytes)) {
            assert_eq!(
                accounted(&parsed),
                fields,
                "{}",
                String::from_utf8_lossy(bytes)
            );
            accounts += 1;
        }
    });
    assert!(accounts > 500, "{accounts}");
}

#[test]
fn a_cut_text_is_never_taken_for_a_whole_one() {
    let reader = Reader::new(&fixtures::bridge_1()).unwrap();
    let whole = fixtures::BRIDGE_1
        .windows(13)
        .position(|w| w == b"End of report")
        .unwrap();
    for end in 0..whole {
        let bytes = &fixtures::BRIDGE_1[..end];
        match reader.read(Export {
            path: "hub/run-2.csv",
            bytes,
        }) {
            Ok(parsed) => assert!(parsed.runs.is_empty(), "cut at {end}"),
            Err(refused) => assert!(refused.perhaps_unfinished, "cut at {end}: {refused}"),
        }
    }
}

#[test]
fn plain_text() {
    damaged(
        include_bytes!("../../../fixtures/exports/plain-comma.csv"),
        &MASKS,
        |bytes| {
            consistent(&read_plain(Export { path: "", bytes }, &Plain::default()));
        },
    );
    damaged(fixtures::BENCH_2, &MASKS, |bytes| {
        consistent(&read_plain(Export { path: "", bytes }, &Plain::default()));
    });
}

#[test]
fn xml() {
    let reader = Reader::new(&fixtures::bridge_2()).unwrap();
    let read = |bytes: &[u8]| reader.read(Export { path: "", bytes });
    let whole = accounted(&read(fixtures::BRIDGE_2).unwrap());
    damaged(fixtures::BRIDGE_2, &MASKS, |bytes| {
        let outcome = read(bytes);
        consistent(&outcome);
        if let Ok(parsed) = outcome {
            assert!(accounted(&parsed) <= whole);
        }
    });
    let root_end = fixtures::BRIDGE_2
        .windows(11)
        .position(|w| w == b"</m:export>")
        .unwrap();
    for end in 0..root_end + 10 {
        let refused = read(&fixtures::BRIDGE_2[..end]).unwrap_err();
        assert!(refused.perhaps_unfinished, "cut at {end}: {refused}");
    }
}

#[test]
fn workbook() {
    let rule: Rule = workbooks::hub_rule();
    let reader = Reader::new(&rule).unwrap();
    let book = workbooks::hub();
    let read = |bytes: &[u8]| reader.read(Export { path: "", bytes });
    for end in 4..book.len() {
        let refused = read(&book[..end]).unwrap_err();
        assert!(refused.perhaps_unfinished, "cut at {end}: {refused}");
    }
    damaged(&book, &[0x20], |bytes| consistent(&read(bytes)));
}

/// A checksum guards the parts of a workbook, so that the cells themselves are changed here.
#[test]
fn the_inside_of_a_workbook() {
    let rule: Rule = workbooks::hub_rule();
    let reader = Reader::new(&rule).unwrap();
    let book = workbooks::hub();
    for part in [
        "xl/worksheets/sheet2.xml",
        "xl/workbook.xml",
        "xl/sharedStrings.xml",
    ] {
        let original = workbooks::part(&book, part);
        for at in 0..original.len() {
            let odd = workbooks::changed(&book, part, |mut bytes| {
                bytes[at] ^= 0x08;
                bytes
            });
            consistent(&reader.read(Export {
                path: "",
                bytes: &odd,
            }));
        }
    }
}
