//! The run sheet, which names no part, and the key to its labels.

use std::str::FromStr;

use restudy_engine::planning::{SHEET_RUNS_MAX, SheetRun, run_sheet};
use restudy_parsers::fold;

use super::super::table::table;
use super::super::{Answer, End, Failure, print};
use super::Line;

/// Appraisers and trials of the usual study.
const USUAL: usize = 3;

#[derive(Debug, Clone, Copy)]
pub(super) enum Form {
    Text,
    Csv,
}

impl FromStr for Form {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        match fold(text).as_str() {
            "text" => Ok(Self::Text),
            "csv" => Ok(Self::Csv),
            _ => Err("expected `text` or `csv`".into()),
        }
    }
}

/// Prints the sheet, or what its labels stand for.
pub(super) fn print_sheet(line: &Line, form: Form, key: bool) -> Answer {
    let parts = only("--parts", &line.parts, None)?;
    let trials = only("--trials", &line.trials, Some(USUAL))?;
    let people: Vec<String> = if line.people.is_empty() {
        let count = only("--appraisers", &line.appraisers, Some(USUAL))?;
        (1..=count).map(|n| format!("appraiser {n}")).collect()
    } else {
        people(&line.people)?
    };
    let runs = run_sheet(parts, people.len(), trials, line.seed).ok_or_else(|| {
        Failure::usage(format!(
            "{parts} parts, {} appraisers and {trials} trials make no sheet; expected 1 to {SHEET_RUNS_MAX} runs",
            people.len(),
        ))
    })?;
    let (headings, rows) = if key {
        (
            vec!["part", "appraiser", "label"],
            key_rows(&runs, &people, parts),
        )
    } else {
        (
            vec!["run", "trial", "appraiser", "label"],
            sheet_rows(&runs, &people),
        )
    };
    let text = match form {
        Form::Csv => csv(&headings, &rows),
        Form::Text => {
            let (numbers, foot): (&[usize], &str) = if key {
                (
                    &[2],
                    "Keep this from the appraisers until the round is closed.",
                )
            } else {
                (
                    &[0, 1, 3],
                    "In this order, each run loaded afresh. A label names a part for one appraiser only.",
                )
            };
            let table = table(&headings, numbers, rows);
            format!("{table}\n{foot} Seed {}.\n", line.seed)
        }
    };
    print(&text)?;
    Ok(End::Fine)
}

/// One row a run, in the order in which they are to be made; no part.
fn sheet_rows(runs: &[SheetRun], people: &[String]) -> Vec<Vec<String>> {
    let row = |(i, run): (usize, &SheetRun)| {
        vec![
            (i + 1).to_string(),
            (run.trial + 1).to_string(),
            people[run.appraiser].clone(),
            run.label.to_string(),
        ]
    };
    runs.iter().enumerate().map(row).collect()
}

/// One row a part and appraiser.
fn key_rows(runs: &[SheetRun], people: &[String], parts: usize) -> Vec<Vec<String>> {
    let digits = parts.to_string().len().max(2);
    let first = runs.iter().filter(|run| run.trial == 0);
    let mut cells: Vec<(usize, usize, u32)> = first
        .map(|run| (run.part, run.appraiser, run.label))
        .collect();
    cells.sort_unstable();
    let row = |(part, appraiser, label): (usize, usize, u32)| {
        vec![
            format!("P{:0digits$}", part + 1),
            people[appraiser].clone(),
            label.to_string(),
        ]
    };
    cells.into_iter().map(row).collect()
}

/// Names, each once.
fn people(names: &[String]) -> Result<Vec<String>, Failure> {
    let names: Vec<String> = names.iter().map(|name| name.trim().to_owned()).collect();
    for (i, name) in names.iter().enumerate() {
        if name.is_empty() || names[..i].iter().any(|earlier| fold(earlier) == fold(name)) {
            return Err(Failure::usage(format!(
                "--people has `{name}` in place {}; expected different names",
                i + 1
            )));
        }
    }
    Ok(names)
}

/// The one number that a sheet needs; of several that nobody asked for, the usual one.
fn only(option: &str, numbers: &[usize], usual: Option<usize>) -> Result<usize, Failure> {
    match (numbers, usual) {
        ([one], _) => Ok(*one),
        (several, Some(usual)) if several.contains(&usual) => Ok(usual),
        (several, _) => Err(Failure::usage(format!(
            "a run sheet needs one number for {option}; found {}",
            several.len()
        ))),
    }
}

fn csv(headings: &[&str], rows: &[Vec<String>]) -> String {
    let field = |text: &str| {
        if text.contains([',', '"', '\n', '\r']) {
            format!("\"{}\"", text.replace('"', "\"\""))
        } else {
            text.to_owned()
        }
    };
    let line = |cells: Vec<String>| cells.join(",") + "\n";
    let mut out = line(headings.iter().map(|h| (*h).to_owned()).collect());
    for row in rows {
        out.push_str(&line(row.iter().map(|cell| field(cell)).collect()));
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sheet_and_key_together_give_every_cell() {
        let people: Vec<String> = ["KL", "MO", "TS"].map(str::to_owned).to_vec();
        let runs = run_sheet(10, 3, 2, 12).unwrap();
        let (sheet, key) = (sheet_rows(&runs, &people), key_rows(&runs, &people, 10));
        assert_eq!((sheet.len(), key.len()), (60, 30));
        let mut cells: Vec<(String, String, String)> = sheet
            .iter()
            .map(|row| {
                let found = key.iter().find(|cell| cell[2] == row[3]).unwrap();
                assert_eq!(found[1], row[2]);
                (found[0].clone(), row[2].clone(), row[1].clone())
            })
            .collect();
        cells.sort();
        cells.dedup();
        assert_eq!(cells.len(), 60);
        assert_eq!((key[0][0].as_str(), key[29][0].as_str()), ("P01", "P10"));
    }

    #[test]
    fn names_with_commas_are_quoted() {
        let rows = [vec!["1".to_owned(), "Ola, \"night\"".to_owned()]];
        assert_eq!(
            csv(&["run", "appraiser"], &rows),
            "run,appraiser\n1,\"Ola, \"\"night\"\"\"\n"
        );
    }

    #[test]
    fn one_number_or_the_usual_one() {
        assert_eq!(only("--trials", &[2], Some(3)).ok(), Some(2));
        assert_eq!(only("--trials", &[2, 3, 6], Some(3)).ok(), Some(3));
        assert!(only("--trials", &[2, 6], Some(3)).is_err());
        assert!(only("--parts", &[10, 20], None).is_err());
        assert!(people(&["KL".to_owned(), " kl".to_owned()]).is_err());
    }
}
