//! One set of readings written in every dress of a table; the rule for that dress reads it back exactly.

use std::collections::BTreeSet;

use restudy_parsers::{
    Across, Cell, Column, Count, Export, Filter, Find, Form, Header, Layout, Role, Rule, Sheet,
    Test, Trial, Until, Value,
};

use crate::shared::{column, label, table};

/// A small generator (Numerical Recipes' 64-bit linear congruence), so that every failure comes back.
struct Chance(u64);

impl Chance {
    fn below(&mut self, most: usize) -> usize {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) as usize % most
    }

    fn is(&mut self) -> bool {
        self.below(2) == 0
    }
}

/// Part, appraiser, trial, characteristic and the bits of the value.
type Known = BTreeSet<(String, String, String, String, u64)>;

struct Study {
    parts: Vec<String>,
    appraisers: Vec<String>,
    trials: Vec<String>,
    features: Vec<String>,
    values: Vec<f64>,
}

impl Study {
    fn new(chance: &mut Chance) -> Self {
        let names = |chance: &mut Chance, words: &[&str], most: usize| -> Vec<String> {
            (0..=chance.below(most))
                .map(|n| format!("{}{}", words[n % words.len()], n + 1))
                .collect()
        };
        let parts = names(chance, &["P-", "HP ", "=1+", "<b>", "ø"], 5);
        let appraisers = names(chance, &["KL", "M. Ø.", "\"TS\""], 3);
        let trials = (0..=chance.below(3)).map(|n| (n + 1).to_string()).collect();
        let features = names(chance, &["bore ", "face; C", "slot, D"], 3);
        let values = (0..5 * 3 * 3 * 3)
            .map(|_| {
                let digits = chance.below(1 << 30) as f64 - f64::from(1 << 29);
                digits / 10_f64.powi(chance.below(9) as i32)
            })
            .collect();
        Self {
            parts,
            appraisers,
            trials,
            features,
            values,
        }
    }

    fn value(&self, [p, a, t, f]: [usize; 4]) -> f64 {
        self.values[((p * 3 + a) * 3 + t) * 3 + f]
    }

    fn known(&self) -> Known {
        let mut known = Known::new();
        for (p, part) in self.parts.iter().enumerate() {
            for (a, appraiser) in self.appraisers.iter().enumerate() {
                for (t, trial) in self.trials.iter().enumerate() {
                    for (f, feature) in self.features.iter().enumerate() {
                        known.insert((
                            part.clone(),
                            appraiser.clone(),
                            trial.clone(),
                            feature.clone(),
                            self.value([p, a, t, f]).to_bits(),
                        ));
                    }
                }
            }
        }
        known
    }
}

/// How the text is written, whatever stands in it.
struct Pen {
    delimiter: char,
    decimal: char,
    end: &'static str,
    quotes_all: bool,
}

impl Pen {
    fn new(chance: &mut Chance) -> Self {
        let decimal = if chance.is() { '.' } else { ',' };
        let delimiters = if decimal == ',' {
            [';', '\t', '|']
        } else {
            [',', ';', '\t']
        };
        Self {
            delimiter: delimiters[chance.below(3)],
            decimal,
            end: ["\n", "\r\n", "\r"][chance.below(3)],
            quotes_all: chance.is(),
        }
    }

    fn number(&self, value: f64) -> String {
        value.to_string().replace('.', &self.decimal.to_string())
    }

    fn text(&self, rows: &[Vec<String>]) -> String {
        let field = |field: &String| {
            if self.quotes_all || field.contains([self.delimiter, '"']) {
                format!("\"{}\"", field.replace('"', "\"\""))
            } else {
                field.clone()
            }
        };
        let line = |row: &Vec<String>| {
            let fields: Vec<String> = row.iter().map(field).collect();
            fields.join(&self.delimiter.to_string()) + self.end
        };
        rows.iter().map(line).collect()
    }
}

fn row<const N: usize>(fields: [&str; N]) -> Vec<String> {
    fields.map(str::to_owned).to_vec()
}

fn heading(find: &str) -> Role {
    Role {
        find: Some(find.to_owned()),
        ..Role::plain(Cell::Heading)
    }
}

fn across(regex: &str) -> Value {
    Value {
        role: Role::plain(Cell::Across(Across::Matching(regex.to_owned()))),
        unit: None,
    }
}

fn form(pen: &Pen, header: Header) -> Form {
    Form::Table {
        sheet: Sheet::First,
        header,
        delimiter: Some(pen.delimiter),
    }
}

/// One row a reading; title rows, blank rows, repeated headings and void rows among them.
fn long(study: &Study, pen: &Pen, chance: &mut Chance) -> (Vec<Vec<String>>, Rule) {
    let head = row(["Part", "By", "Trial", "Feature", "Actual", "State"]);
    let mut rows = vec![row(["Halden Pump Works"]), row([""]), head.clone()];
    for (p, part) in study.parts.iter().enumerate() {
        for (a, by) in study.appraisers.iter().enumerate() {
            for (t, trial) in study.trials.iter().enumerate() {
                for (f, feature) in study.features.iter().enumerate() {
                    match chance.below(6) {
                        0 => rows.push(head.clone()),
                        1 => rows.push(row([""])),
                        2 => rows.push(row([part, by, trial, feature, "99", "Void"])),
                        _ => {}
                    }
                    let value = pen.number(study.value([p, a, t, f]));
                    rows.push(row([part, by, trial, feature, &value, "ok"]));
                }
            }
        }
    }
    let rule = Rule {
        form: form(pen, Header::Find("part".to_owned())),
        part: column("Part"),
        appraiser: Some(column("By")),
        trial: Some(Trial::Stated(column("Trial"))),
        characteristic: Some(column("Feature")),
        value: Value {
            role: column("Actual"),
            unit: None,
        },
        layout: Layout {
            skip: vec![Filter {
                column: Column::Headed("State".to_owned()),
                test: Test::Is(vec!["void".to_owned()]),
            }],
            ..Layout::default()
        },
        decimal: pen.decimal,
        ..table()
    };
    (rows, rule)
}

/// Trials across, the part once above its rows, a footer below a blank row.
fn trials_across(study: &Study, pen: &Pen, _: &mut Chance) -> (Vec<Vec<String>>, Rule) {
    let mut head = row(["Part", "By", "Feature"]);
    head.extend(study.trials.iter().map(|trial| format!("T{trial}")));
    let mut rows = vec![head];
    for (p, part) in study.parts.iter().enumerate() {
        let mut shown = part.as_str();
        for (a, by) in study.appraisers.iter().enumerate() {
            for (f, feature) in study.features.iter().enumerate() {
                let mut cells = row([shown, by, feature]);
                shown = "";
                cells
                    .extend((0..study.trials.len()).map(|t| pen.number(study.value([p, a, t, f]))));
                rows.push(cells);
            }
        }
    }
    rows.extend([row([""]), row(["Mean", "", "", "1", "2"])]);
    let rule = Rule {
        form: form(pen, Header::Row(1)),
        part: column("Part"),
        appraiser: Some(column("By")),
        trial: Some(Trial::Stated(heading(r"^T(\d+)$"))),
        characteristic: Some(column("Feature")),
        value: across(r"^T\d+$"),
        layout: Layout {
            until: Some(Until::BlankRow),
            fill_down: vec![Column::Headed("part".to_owned())],
            ..Layout::default()
        },
        decimal: pen.decimal,
        ..table()
    };
    (rows, rule)
}

/// Parts across under merged headings of the characteristic; appraiser down, trials by order.
fn crosstab(study: &Study, pen: &Pen, _: &mut Chance) -> (Vec<Vec<String>>, Rule) {
    let mut top = row(["By"]);
    let mut low = row([""]);
    for feature in &study.features {
        for (p, part) in study.parts.iter().enumerate() {
            top.push(if p == 0 {
                feature.clone()
            } else {
                String::new()
            });
            low.push(format!("@{part}"));
        }
    }
    let mut rows = vec![top, low];
    for (a, by) in study.appraisers.iter().enumerate() {
        for t in 0..study.trials.len() {
            let mut cells = row([by]);
            for f in 0..study.features.len() {
                for p in 0..study.parts.len() {
                    cells.push(pen.number(study.value([p, a, t, f])));
                }
            }
            rows.push(cells);
        }
    }
    let rule = Rule {
        form: form(pen, Header::Row(1)),
        part: heading("@(.*)$"),
        appraiser: Some(column("By")),
        trial: Some(Trial::Counted(Count::Order)),
        characteristic: Some(heading("^(.*) @")),
        value: across("@"),
        layout: Layout {
            further_headings: 1,
            ..Layout::default()
        },
        decimal: pen.decimal,
        ..table()
    };
    (rows, rule)
}

/// A table a part, one under the other, with its label above its headings; an end text.
fn blocks(study: &Study, pen: &Pen, _: &mut Chance) -> (Vec<Vec<String>>, Rule) {
    let mut rows = Vec::new();
    for (p, part) in study.parts.iter().enumerate() {
        rows.push(row(["Serial", part, ""]));
        let mut head = row(["By", "Trial"]);
        head.extend(study.features.iter().map(|feature| format!("#{feature}")));
        rows.push(head);
        for (a, by) in study.appraisers.iter().enumerate() {
            for (t, trial) in study.trials.iter().enumerate() {
                let mut cells = row([by, trial]);
                cells.extend(
                    (0..study.features.len()).map(|f| pen.number(study.value([p, a, t, f]))),
                );
                rows.push(cells);
            }
        }
        rows.push(row([""]));
    }
    rows.push(row(["-- end of report --"]));
    let count = study.features.len().to_string();
    let rule = Rule {
        form: form(pen, Header::Find("by".to_owned())),
        part: label("Serial"),
        appraiser: Some(Role::plain(Cell::Counted(0))),
        trial: Some(Trial::Stated(column("Trial"))),
        characteristic: Some(heading("^#(.*)$")),
        value: across("^#"),
        count: Some(Role::plain(Cell::Constant(count))),
        layout: Layout {
            blocks: true,
            until: Some(Until::BlankRow),
            ..Layout::default()
        },
        end: Some(Find {
            find: "end of report".to_owned(),
        }),
        decimal: pen.decimal,
        ..table()
    };
    (rows, rule)
}

type Dress = fn(&Study, &Pen, &mut Chance) -> (Vec<Vec<String>>, Rule);

#[test]
fn what_was_written_in_any_dress_is_read_back_to_the_last_bit() {
    const DRESSES: [Dress; 4] = [long, trials_across, crosstab, blocks];
    for seed in 0..120 {
        let mut chance = Chance(seed);
        let study = Study::new(&mut chance);
        let pen = Pen::new(&mut chance);
        for (dress, write) in DRESSES.iter().enumerate() {
            let (rows, rule) = write(&study, &pen, &mut chance);
            let text = pen.text(&rows);
            let export = Export {
                path: "export.csv",
                bytes: text.as_bytes(),
            };
            let parsed = restudy_parsers::read(export, &rule)
                .unwrap_or_else(|refused| panic!("seed {seed}, dress {dress}: {refused}\n{text}"));
            let aside: Vec<&str> = parsed
                .set_aside
                .iter()
                .map(|aside| &*aside.reason)
                .collect();
            assert!(
                aside.is_empty(),
                "seed {seed}, dress {dress}: {aside:?}\n{text}"
            );
            let read: Known = parsed
                .readings
                .iter()
                .map(|reading| {
                    let run = &parsed.runs[reading.run];
                    (
                        run.part.clone(),
                        run.appraiser.clone().unwrap(),
                        run.trial.clone().unwrap(),
                        reading.characteristic.clone(),
                        reading.value.to_bits(),
                    )
                })
                .collect();
            assert_eq!(read, study.known(), "seed {seed}, dress {dress}:\n{text}");
            assert_eq!(read.len(), parsed.readings.len());
        }
    }
}
