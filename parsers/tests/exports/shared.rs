//! What the tests of whole exports share: rules in few words, and a compact rendering.

use std::collections::BTreeMap;
use std::fmt::Write as _;

use restudy_parsers::{
    Bounds, Cell, Export, Form, Header, Layout, Limit, Parsed, Refused, Role, Rule, Sheet, Value,
};

pub(crate) fn column(heading: &str) -> Role {
    Role::plain(Cell::Column(heading.to_owned()))
}

pub(crate) fn label(text: &str) -> Role {
    Role::plain(Cell::Label(text.to_owned()))
}

pub(crate) fn at(row: u32, column: u32) -> Role {
    Role::plain(Cell::At { row, column })
}

pub(crate) fn path(regex: &str) -> Role {
    Role::plain(Cell::Path(regex.to_owned()))
}

pub(crate) fn xml(path: &str) -> Role {
    Role::plain(Cell::Xml(path.to_owned()))
}

pub(crate) fn constant(text: &str) -> Role {
    Role::plain(Cell::Constant(text.to_owned()))
}

pub(crate) fn absolute(role: Role) -> Option<Limit> {
    Some(Limit {
        role,
        from_nominal: false,
        unsigned: false,
    })
}

pub(crate) fn deviation(role: Role) -> Option<Limit> {
    Some(Limit {
        role,
        from_nominal: true,
        unsigned: false,
    })
}

/// Part and value from columns below the headings in the first row, nothing else.
pub(crate) fn table() -> Rule {
    Rule {
        form: Form::Table {
            sheet: Sheet::First,
            header: Header::Row(1),
            delimiter: None,
        },
        part: column("part"),
        appraiser: None,
        trial: None,
        taken: None,
        round: None,
        characteristic: None,
        value: Value {
            role: column("value"),
            unit: None,
        },
        nominal: None,
        lower: None,
        upper: None,
        factors: BTreeMap::new(),
        same: BTreeMap::new(),
        end: None,
        count: None,
        layout: Layout::default(),
        decimal: '.',
        thousands: None,
        no_value: Vec::new(),
        line_breaks: false,
        encoding: None,
        bounds: Bounds::default(),
    }
}

pub(crate) fn read(text: impl AsRef<[u8]>, rule: &Rule) -> String {
    read_at("export", text, rule)
}

pub(crate) fn read_at(path: &str, bytes: impl AsRef<[u8]>, rule: &Rule) -> String {
    shown(&restudy_parsers::read(
        Export {
            path,
            bytes: bytes.as_ref(),
        },
        rule,
    ))
}

/// Runs with their readings, then what was set aside, or the refusal.
pub(crate) fn shown(outcome: &Result<Parsed, Refused>) -> String {
    let mut out = String::new();
    match outcome {
        Err(refused) => {
            let unfinished = if refused.perhaps_unfinished {
                ", perhaps unfinished"
            } else {
                ""
            };
            writeln!(out, "refused{unfinished}: {}", refused.sentence).unwrap();
            if let Some(hint) = &refused.hint {
                writeln!(out, "  hint: {hint}").unwrap();
            }
        }
        Ok(parsed) => {
            for (index, run) in parsed.runs.iter().enumerate() {
                write!(out, "run {}", run.part).unwrap();
                for label in [&run.appraiser, &run.trial].into_iter().flatten() {
                    write!(out, " | {label}").unwrap();
                }
                for (name, level) in &run.factors {
                    write!(out, " | {name} {level}").unwrap();
                }
                for (name, text) in &run.same {
                    write!(out, " | same {name} `{text}`").unwrap();
                }
                if let Some(taken) = run.taken {
                    write!(out, " | {taken}").unwrap();
                }
                if let Some(round) = &run.round {
                    write!(out, " | round {round}").unwrap();
                }
                out.push('\n');
                for reading in parsed
                    .readings
                    .iter()
                    .filter(|reading| reading.run == index)
                {
                    write!(out, "  {}: {}", reading.characteristic, reading.value).unwrap();
                    if let Some(unit) = &reading.unit {
                        write!(out, " {unit}").unwrap();
                    }
                    let bounds = [reading.lower, reading.nominal, reading.upper];
                    if bounds.iter().any(Option::is_some) {
                        let shown = bounds.map(|b| b.map_or("-".to_owned(), |b| b.to_string()));
                        write!(out, " [{}]", shown.join(" ")).unwrap();
                    }
                    writeln!(out, " ({})", reading.origin).unwrap();
                }
            }
            for aside in &parsed.set_aside {
                writeln!(out, "set aside ({}): {}", aside.readings, aside.reason).unwrap();
                if let Some(hint) = &aside.hint {
                    writeln!(out, "  hint: {hint}").unwrap();
                }
            }
        }
    }
    out
}

/// Readings and set-aside readings together.
pub(crate) fn accounted(parsed: &Parsed) -> usize {
    parsed.readings.len()
        + parsed
            .set_aside
            .iter()
            .map(|aside| aside.readings)
            .sum::<usize>()
}
