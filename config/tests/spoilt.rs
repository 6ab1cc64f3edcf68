//! The example configuration, cut, overwritten and misspelt: always an answer, never a panic.

mod common;

use std::collections::BTreeMap;

use common::{HALDEN, read_at_halden, shown};

#[test]
fn a_file_cut_anywhere_is_answered_with_faults_or_a_configuration() {
    let mut faulty = 0;
    for (end, _) in HALDEN.char_indices() {
        if let Err(faults) = read_at_halden(&HALDEN[..end]) {
            assert!(!faults.is_empty(), "refused without a fault at {end}");
            assert!(
                faults.iter().all(|fault| fault.line >= 1
                    && !fault.expected.is_empty()
                    && !fault.found.is_empty()),
                "{}",
                shown(&faults)
            );
            faulty += 1;
        }
    }
    assert!(faulty > 1000, "{faulty}");
}

#[test]
fn a_file_with_any_byte_replaced_is_answered_too() {
    for (index, _) in HALDEN.char_indices().step_by(61) {
        for wrong in ["\"", "[", "=", "\n", "\0", "é"] {
            let mut text = HALDEN.to_owned();
            text.replace_range(
                index..index + HALDEN[index..].chars().next().map_or(0, char::len_utf8),
                wrong,
            );
            if let Err(faults) = read_at_halden(&text) {
                assert!(!faults.is_empty(), "refused without a fault at {index}");
            }
        }
    }
}

#[test]
fn deep_nesting_and_control_characters_are_answered() {
    let before = HALDEN.split("[mail]").next().unwrap();
    for text in [
        format!("{before}[mail]\nserver = {}", "[".repeat(100_000)),
        format!("{before}[mail]\nserver = {}", "{a=".repeat(100_000)),
        format!("{before}[{}]", "a.".repeat(100_000)),
        format!("{before}[{}a]", "a.".repeat(100_000)),
        HALDEN.replace("{ fixture = {", "{ \"fix\\nture\" = {"),
        HALDEN.replace("{ KL = [", "{ \"K\\u001bL\" = ["),
        HALDEN.replace("\"bridge-1\"", "\"bridge\\n1\""),
        HALDEN.replace("Halden Pump Works\"", "\\u0000\""),
    ] {
        let faults = read_at_halden(&text).unwrap_err();
        assert!(!faults.is_empty());
        for fault in faults {
            assert!(!fault.to_string().contains(char::is_control), "{fault}");
            assert!(fault.to_string().chars().count() < 500, "{fault}");
        }
    }
}

#[test]
fn every_misspelt_key_is_refused_with_the_right_one() {
    const CHOSEN_BY_THE_USER: [&str; 4] = ["fixture", "program", "stylus", "spellings"];
    let key = regex::Regex::new(r"([a-z_]+) *= ").unwrap();
    let mut tried = BTreeMap::new();
    let mut start = 0;
    for (index, line) in HALDEN.split_inclusive('\n').enumerate() {
        let code = line.split(" #").next().unwrap_or_default();
        for found in key.captures_iter(code).filter_map(|groups| groups.get(1)) {
            let key = found.as_str();
            if code.starts_with('#') || CHOSEN_BY_THE_USER.contains(&key) {
                continue;
            }
            let mut text = HALDEN.to_owned();
            text.insert(start + found.end(), 'x');
            let faults = read_at_halden(&text).expect_err(line);
            let told = faults
                .iter()
                .find(|fault| fault.found == format!("the unknown key `{key}x`"));
            let told = told.unwrap_or_else(|| panic!("{key}: {}", shown(&faults)));
            assert_eq!(told.line, index + 1, "{key}");
            assert_eq!(told.hint, Some(format!("did you mean `{key}`?")));
            *tried.entry(key).or_insert(0) += 1;
        }
        start += line.len();
    }
    assert!(tried.len() > 55, "{} keys: {tried:?}", tried.len());
}
