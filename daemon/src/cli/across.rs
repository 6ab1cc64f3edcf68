//! What `preview` adds for people: runs × characteristics, and what the plan's drawing makes of the names and nominals.

use std::io::IsTerminal as _;

use restudy_config::Plan;
use restudy_parsers::{Parsed, fold, nearest};

use super::table::table;

/// Columns and rows that are shown.
const CHARACTERISTICS_SHOWN: usize = 8;
const RUNS_SHOWN: usize = 40;

/// One row a run, one column a characteristic, in order of appearance.
pub(super) fn across(parsed: &Parsed) -> String {
    let mut names: Vec<&str> = Vec::new();
    for reading in &parsed.readings {
        if !names.contains(&reading.characteristic.as_str()) {
            names.push(&reading.characteristic);
        }
    }
    let shown = &names[..names.len().min(CHARACTERISTICS_SHOWN)];
    let headings: Vec<&str> = std::iter::once("run")
        .chain(shown.iter().copied())
        .collect();
    let value = |run: usize, name: &str| {
        let found = parsed
            .readings
            .iter()
            .find(|r| r.run == run && r.characteristic == name);
        found.map_or_else(|| "–".into(), |r| r.value.to_string())
    };
    let rows = (0..parsed.runs.len().min(RUNS_SHOWN)).map(|run| {
        std::iter::once((run + 1).to_string())
            .chain(shown.iter().map(|name| value(run, name)))
            .collect()
    });
    let right: Vec<usize> = (0..headings.len()).collect();
    let mut out = table(&headings, &right, rows.collect());
    for (n, most, what) in [
        (names.len(), CHARACTERISTICS_SHOWN, "characteristics"),
        (parsed.runs.len(), RUNS_SHOWN, "runs"),
    ] {
        if n > most {
            out.push_str(&format!("and {} more {what} (--json has all)\n", n - most));
        }
    }
    out
}

/// Where the export's names and nominals differ from the plan's, one line each.
pub(super) fn against_drawing(plan: &Plan, parsed: &Parsed) -> String {
    let mut out = String::new();
    let mut told: Vec<&str> = Vec::new();
    let known = || plan.characteristics.iter().map(|c| c.name.as_str());
    for reading in &parsed.readings {
        let name = reading.characteristic.as_str();
        if told.contains(&name) {
            continue;
        }
        let drawn = plan
            .characteristics
            .iter()
            .find(|c| fold(&c.name) == fold(name));
        let line = match drawn {
            None => nearest(name, known())
                .map(|near| format!("`{name}` is not among the plan's characteristics; did you mean `{near}`?")),
            Some(drawn) => drawn
                .nominal
                .zip(reading.nominal)
                .filter(|(drawn, stated)| drawn != stated)
                .map(|(drawn, stated)| {
                    format!("`{name}`: the export's nominal is {stated}, the plan's {drawn}; the plan's counts")
                }),
        };
        if let Some(line) = line {
            told.push(name);
            out.push_str(&format!("  {line}\n"));
        }
    }
    out
}

/// Bold where a terminal shows it and `NO_COLOR` is not set; see no-color.org.
pub(super) fn bold(text: &str) -> String {
    let plain = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty());
    if plain || !std::io::stdout().is_terminal() {
        return text.to_owned();
    }
    format!("\u{1b}[1m{text}\u{1b}[0m")
}

#[cfg(test)]
mod tests {
    use restudy_parsers::{Export, Plain, read_plain};

    use super::*;

    fn parsed(text: &str) -> Parsed {
        let export = Export {
            path: "a.csv",
            bytes: text.as_bytes(),
        };
        read_plain(export, &Plain::default()).unwrap()
    }

    #[test]
    fn a_run_is_a_row_and_a_characteristic_a_column() {
        let parsed = parsed(
            "part,trial,characteristic,value\nP1,1,bore,1.5\nP1,1,pin,2.25\nP2,1,bore,1.625\n",
        );
        assert_eq!(
            across(&parsed),
            "run   bore   pin\n  1    1.5  2.25\n  2  1.625     –\n"
        );
    }

    #[test]
    fn what_is_not_shown_is_counted() {
        let mut text = String::from("part,characteristic,value\n");
        for n in 0..10 {
            text.push_str(&format!("P1,f{n},1\n"));
        }
        let out = across(&parsed(&text));
        assert!(
            out.ends_with("and 2 more characteristics (--json has all)\n"),
            "{out}"
        );
    }

    struct AllThere;

    impl restudy_config::Disk for AllThere {
        fn is_folder(&self, _: &std::path::Path) -> bool {
            true
        }

        fn text(&self, path: &std::path::Path) -> Result<String, String> {
            Err(path.display().to_string())
        }
    }

    #[test]
    fn names_and_nominals_are_held_against_the_drawing() {
        let config = r#"
site = { name = "Halden Pump Works", zone = "Europe/Oslo" }
state = { folder = "state" }
[[instrument]]
name = "bench-1"
folders = ["exports"]
files = ["*.csv"]
settle = "1s"
[instrument.read]
form = "table"
part = { column = "part" }
characteristic = { column = "characteristic" }
value = { column = "value", unit = "mm" }
nominal = { column = "nominal" }
[[plan]]
name = "pin"
instruments = ["bench-1"]
parts = 2
trials = 1
interaction = "keep"
limits = { watch = 0.1, act = 0.3 }
[[plan.characteristic]]
name = "bore A"
nominal = 50
lower = 49.9
upper = 50.1
[[plan.characteristic]]
name = "pin"
nominal = 12
lower = 11.9
upper = 12.1
"#;
        let root = std::path::Path::new("/");
        let (config, _) = restudy_config::read(config, "restudy.toml", root, &AllThere)
            .unwrap_or_else(|faults| panic!("{faults:?}"));
        let parsed = parsed(
            "part,characteristic,value,nominal\nP1,Bore A,50.01,50.02\nP1,pin,12,12\nP1,bore B,1,1\nP1,xyz,1,1\n",
        );
        assert_eq!(
            against_drawing(&config.plans[0], &parsed),
            "  `Bore A`: the export's nominal is 50.02, the plan's 50; the plan's counts\n  \
             `bore B` is not among the plan's characteristics; did you mean `bore A`?\n"
        );
    }

    #[test]
    fn nothing_is_bold_where_no_terminal_shows_it() {
        assert!(std::io::stdout().is_terminal() || bold("set aside") == "set aside");
    }
}
