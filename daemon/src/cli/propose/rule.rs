//! The lines of `[instrument.read]`: from the roles that were found, with what was seen for each.

use super::draft::{Line, Trust, quoted, shown};
use super::limits::{self, Limits};
use super::number::Mark;
use super::path;
use super::roles::{Roles, Taken};
use super::sample::{Datum, Dress, Header, Place, Sample};
use super::stamp::Stamps;
use super::words::{Meaning, unit_behind};

const READ: &str = "instrument.read";

pub(super) fn lines(samples: &[Sample]) -> Vec<Line> {
    let roles = Roles::found(samples);
    let mark = roles.mark();
    let mut drafted = Drafted {
        samples,
        roles: &roles,
        mark: match mark {
            Mark::Seen(mark) => mark,
            Mark::PerhapsThousands | Mark::Both => ',',
            Mark::NotShown => '.',
        },
        lines: Vec::new(),
    };
    drafted.form();
    drafted.decimal(&mark);
    drafted.label(Meaning::Part, "part");
    drafted.label(Meaning::Appraiser, "appraiser");
    drafted.trial();
    drafted.taken();
    drafted.characteristic();
    drafted.value();
    drafted.numbers();
    drafted.no_value();
    drafted.same();
    drafted.end();
    drafted.lines
}

struct Drafted<'a> {
    samples: &'a [Sample],
    roles: &'a Roles,
    mark: char,
    lines: Vec<Line>,
}

impl<'a> Drafted<'a> {
    fn put(
        &mut self,
        key: &'static str,
        value: impl Into<String>,
        trust: Trust,
        note: impl Into<String>,
    ) {
        self.lines.push(Line::new(READ, key, value, trust, note));
    }

    fn of_all(&self, n: usize) -> String {
        seen_in(n, self.samples.len())
    }

    /// Trust and note of a place that was taken.
    fn judged(&self, taken: &Taken) -> (Trust, String) {
        let n = taken.spot.files();
        let mut doubts: Vec<String> = taken.doubt.iter().cloned().collect();
        if !taken.others.is_empty() {
            let others: Vec<String> = taken.others.iter().take(3).map(|o| shown(o)).collect();
            doubts.push(format!("or is it {}?", others.join(", ")));
        }
        if n < self.samples.len() {
            doubts.push("not in every file".into());
        }
        let trust = if doubts.is_empty() {
            Trust::Seen
        } else {
            Trust::Check
        };
        doubts.push(self.of_all(n));
        (trust, doubts.join("; "))
    }

    fn form(&mut self) {
        match self.samples.first().map(|sample| &sample.dress) {
            Some(Dress::Xml {
                each,
                records,
                encoding,
            }) => {
                let (each, records, encoding) = (each.clone(), *records, *encoding);
                let same =
                    |s: &&Sample| matches!(&s.dress, Dress::Xml { each: own, .. } if *own == each);
                let n = self.samples.iter().filter(same).count();
                self.put(
                    "form",
                    quoted("xml"),
                    Trust::Seen,
                    self.of_all(self.samples.len()),
                );
                let trust = if n == self.samples.len() && records > 1 {
                    Trust::Seen
                } else {
                    Trust::Check
                };
                let note = format!(
                    "{}; met {records} times in {}",
                    self.of_all(n),
                    shown(
                        &self
                            .samples
                            .first()
                            .map_or(String::new(), |s| s.file.clone())
                    )
                );
                self.put("each", quoted(&each), trust, note);
                self.encoding(encoding);
            }
            Some(Dress::Table { .. }) => {
                self.put(
                    "form",
                    quoted("table"),
                    Trust::Seen,
                    self.of_all(self.samples.len()),
                );
                self.sheet();
                self.header();
                self.delimiter();
                let named = self.samples.iter().find_map(|sample| match sample.dress {
                    Dress::Table { encoding, .. } => encoding,
                    Dress::Xml { .. } => None,
                });
                self.encoding(named);
            }
            None => {}
        }
    }

    fn encoding(&mut self, label: Option<&str>) {
        if let Some(label) = label {
            let note =
                "not UTF-8; other encodings may fit too: are all letters right in `preview`?";
            self.put("encoding", quoted(label), Trust::Check, note);
        }
    }

    fn sheet(&mut self) {
        let mut names: Vec<(String, usize, bool)> = Vec::new();
        for sample in self.samples {
            if let Dress::Table {
                sheet: Some((name, of)),
                first_sheet,
                ..
            } = &sample.dress
            {
                names.push((name.clone(), *of, *first_sheet));
            }
        }
        let Some((name, _, _)) = names.first().cloned() else {
            return;
        };
        let same = names.iter().filter(|(other, _, _)| *other == name).count();
        if same == names.len() {
            let most = names.iter().map(|(_, of, _)| *of).max().unwrap_or(1);
            let others = match most {
                1 => "the only sheet".to_owned(),
                n => format!("of {n} sheets the one with the most known headings"),
            };
            let trust = if most == 1 { Trust::Seen } else { Trust::Check };
            let note = format!("{others}; {}", self.of_all(same));
            self.put("sheet", quoted(&name), trust, note);
        } else {
            let first = names.iter().all(|(_, _, first)| *first);
            let note = if first {
                "its name differs from file to file, so the first sheet is read"
            } else {
                "its name and place differ from file to file; name the sheet to read"
            };
            self.put("sheet", quoted(&name), Trust::Optional, note);
        }
    }

    fn header(&mut self) {
        let headers: Vec<&Header> = self
            .samples
            .iter()
            .filter_map(|sample| match &sample.dress {
                Dress::Table { header, .. } => header.as_ref(),
                Dress::Xml { .. } => None,
            })
            .collect();
        let Some(first) = headers.first() else {
            return;
        };
        let n = headers.len();
        let known = headers.iter().map(|header| header.known).min().unwrap_or(0);
        let all_have = n == self.samples.len();
        let trust = if known > 1 && all_have {
            Trust::Seen
        } else {
            Trust::Check
        };
        let same_row = headers.iter().all(|header| header.row == first.row);
        let rows = if same_row {
            format!("row {}; {}", first.row, self.of_all(n))
        } else {
            let rows = headers.iter().map(|header| header.row);
            let (low, high) = (rows.clone().min().unwrap_or(0), rows.max().unwrap_or(0));
            format!("rows {low} to {high}; {}", self.of_all(n))
        };
        let used: Vec<&str> = [Meaning::Value, Meaning::Characteristic, Meaning::Part]
            .into_iter()
            .filter_map(|meaning| match &self.roles.get(meaning)?.spot.place {
                Place::Column(heading) => Some(heading.as_str()),
                _ => None,
            })
            .collect();
        let in_all = |mark: &str| {
            let is = |other: &String| restudy_parsers::fold(other) == restudy_parsers::fold(mark);
            headers.iter().all(|header| header.marks.iter().any(is))
        };
        let mark = used
            .into_iter()
            .find(|mark| in_all(mark))
            .map(str::to_owned);
        match mark {
            Some(mark) if first.row > 1 || !same_row => {
                self.put(
                    "header",
                    format!("{{ find = {} }}", quoted(&mark)),
                    trust,
                    rows,
                );
            }
            _ if same_row => self.put("header", first.row.to_string(), trust, rows),
            _ => self.put(
                "header",
                first.row.to_string(),
                Trust::Check,
                format!("{rows}; no heading finds it in all"),
            ),
        }
    }

    fn delimiter(&mut self) {
        let marks: Vec<(char, bool)> = self
            .samples
            .iter()
            .filter_map(|sample| match sample.dress {
                Dress::Table { delimiter, .. } => delimiter,
                Dress::Xml { .. } => None,
            })
            .collect();
        let Some((mark, _)) = marks.first().copied() else {
            return;
        };
        if marks.iter().all(|(_, announced)| *announced) {
            return;
        }
        let same = marks.iter().filter(|(other, _)| *other == mark).count();
        let text = if mark == '\t' {
            "\"\\t\"".to_owned()
        } else {
            quoted(&mark.to_string())
        };
        let trust = if same == marks.len() {
            Trust::Seen
        } else {
            Trust::Check
        };
        self.put("delimiter", text, trust, self.of_all(same));
    }

    fn decimal(&mut self, mark: &Mark) {
        let value = quoted(&self.mark.to_string());
        let comma_parts = self
            .lines
            .iter()
            .any(|line| line.key == "delimiter" && line.value == "\",\"");
        match mark {
            _ if comma_parts && self.mark == ',' => {
                self.mark = '.';
                self.put(
                    "decimal",
                    quoted("."),
                    Trust::Check,
                    "commas part the fields and stand in numbers too",
                );
            }
            Mark::Seen(_) => self.put("decimal", value, Trust::Seen, "seen in the numbers"),
            Mark::NotShown => self.put(
                "decimal",
                value,
                Trust::Check,
                "no number in text shows one (a workbook's own numbers need none)",
            ),
            Mark::PerhapsThousands => self.put(
                "decimal",
                value,
                Trust::Check,
                "every number has three digits behind its comma: it could part thousands",
            ),
            Mark::Both => self.put(
                "decimal",
                value,
                Trust::Check,
                "points and commas were both seen; numbers with the other mark will be set aside",
            ),
        }
    }

    fn label(&mut self, meaning: Meaning, key: &'static str) {
        if let Some(taken) = self.roles.get(meaning) {
            let (trust, note) = self.judged(taken);
            self.put(key, role(&taken.spot.place, &[]), trust, note);
            return;
        }
        let trust = if key == "part" {
            Trust::Missing
        } else {
            Trust::Optional
        };
        self.from_path(meaning, key, trust);
    }

    /// A role that may stand in the file names.
    fn from_path(&mut self, meaning: Meaning, key: &'static str, otherwise: Trust) {
        let files: Vec<&str> = self
            .samples
            .iter()
            .map(|sample| sample.file.as_str())
            .collect();
        match path::found(meaning, &files) {
            Some((regex, example)) => {
                let note = format!(
                    "no column or label; in the file name: {} from {}",
                    shown(&example),
                    shown(files.first().unwrap_or(&""))
                );
                self.put(
                    key,
                    format!("{{ path = {} }}", quoted(&regex)),
                    Trust::Check,
                    note,
                );
            }
            None => {
                let (value, note) = match (otherwise, self.samples.first().map(|s| &s.dress)) {
                    (_, Some(Dress::Xml { .. })) => (
                        "{ xml = \"\" }",
                        "write the path to it, or { path = 'a regex on folder and file name' }",
                    ),
                    _ => (
                        "{ column = \"\" }",
                        "write its heading; or { label = \"…\" }, { cell = \"B2\" }, { path = 'a regex on folder and file name' }",
                    ),
                };
                self.put(key, value, otherwise, note);
            }
        }
    }

    fn trial(&mut self) {
        if let Some(taken) = self.roles.get(Meaning::Trial) {
            let (trust, note) = self.judged(taken);
            self.put("trial", role(&taken.spot.place, &[]), trust, note);
            return;
        }
        let files: Vec<&str> = self
            .samples
            .iter()
            .map(|sample| sample.file.as_str())
            .collect();
        if path::found(Meaning::Trial, &files).is_some() {
            self.from_path(Meaning::Trial, "trial", Trust::Optional);
        } else if self.format().is_some() {
            self.put(
                "trial",
                "{ count = \"taken\" }",
                Trust::Check,
                "no label for the trial was found; counted by time stamp",
            );
        } else {
            self.put(
                "trial",
                "{ count = \"order\" }",
                Trust::Check,
                "no label for the trial was found; counted by order within a file",
            );
        }
    }

    /// The stamps of the role `taken`: the place, its format if one is needed, what else it could be.
    fn format(&self) -> Option<(&'a Taken, Option<&'static str>, Vec<&'static str>)> {
        let taken = self
            .roles
            .get(Meaning::Taken)
            .or_else(|| self.roles.get(Meaning::Date))?;
        match taken.spot.stamps() {
            Stamps::Plain => Some((taken, None, Vec::new())),
            Stamps::Format(formats) => {
                let mut formats = formats.into_iter();
                let first = formats.next()?;
                Some((taken, Some(first), formats.collect()))
            }
            Stamps::DateOnly | Stamps::No => None,
        }
    }

    fn taken(&mut self) {
        let Some((taken, format, others)) = self.format() else {
            let dated = self
                .roles
                .get(Meaning::Taken)
                .or_else(|| self.roles.get(Meaning::Date));
            let (value, note) = match (dated, self.roles.get(Meaning::Clock)) {
                (Some(date), Some(clock)) => (role(&date.spot.place, &[]), format!("date and time of day stand apart ({} and {}); have them exported together", shown(date.spot.place.shown()), shown(clock.spot.place.shown()))),
                (Some(date), None) => (role(&date.spot.place, &[]), "only a date was seen, without a time of day: it cannot tell the runs of a day apart".to_owned()),
                _ => match self.samples.first().map(|s| &s.dress) {
                    Some(Dress::Xml { .. }) => ("{ xml = \"\" }".to_owned(), "when a run was measured; `repeat_every` needs it".to_owned()),
                    _ => ("{ column = \"\" }".to_owned(), "when a run was measured; `repeat_every` needs it".to_owned()),
                },
            };
            self.put("taken", value, Trust::Optional, note);
            return;
        };
        let (mut trust, mut note) = self.judged(taken);
        let extra: Vec<(&str, String)> = format.iter().map(|f| ("format", quoted(f))).collect();
        if !others.is_empty() {
            trust = Trust::Check;
            note = format!("{} fits all stamps as well; {note}", others.join(" or "));
        }
        let value = role(&taken.spot.place, &extra);
        self.put("taken", value, trust, note);
    }

    fn characteristic(&mut self) {
        match self.roles.get(Meaning::Characteristic) {
            Some(taken) => {
                let (trust, note) = self.judged(taken);
                self.put("characteristic", role(&taken.spot.place, &[]), trust, note);
            }
            None => self.put(
                "characteristic",
                "{ column = \"\" }",
                Trust::Optional,
                "without it there is one characteristic, called `value`",
            ),
        }
    }

    fn value(&mut self) {
        let Some(taken) = self.roles.get(Meaning::Value) else {
            let left: Vec<String> = self
                .roles
                .numbers_left
                .iter()
                .take(4)
                .map(|name| shown(name))
                .collect();
            let note = match left.len() {
                0 => "no place of measured values was found".to_owned(),
                1 => format!("is it {}?", left.concat()),
                _ => format!(
                    "several places hold numbers ({}): which one, or are these values across?",
                    left.join(", ")
                ),
            };
            let value = match self.samples.first().map(|s| &s.dress) {
                Some(Dress::Xml { .. }) => "{ xml = \"\", unit = \"mm\" }",
                _ => "{ column = \"\", unit = \"mm\" }",
            };
            self.put("value", value, Trust::Missing, note);
            return;
        };
        let (mut trust, mut note) = self.judged(taken);
        let mut extra: Vec<(&str, String)> = Vec::new();
        let behind = taken.spot.unit_behind();
        if behind.is_some() {
            extra.push(("find", quoted(NUMBER)));
            trust = Trust::Check;
            note = format!("the unit behind each number is cut off; {note}");
        }
        let in_heading = taken
            .spot
            .names
            .first()
            .and_then(|name| unit_behind(name).1);
        match (self.roles.get(Meaning::Unit), behind, in_heading) {
            (Some(unit), _, _) => {
                extra.push(("unit", role(&unit.spot.place, &[])));
                if unit.spot.files() < self.samples.len() {
                    trust = Trust::Check;
                }
            }
            (None, Some(unit), _) => extra.push(("unit", quoted(&unit))),
            (None, None, Some(unit)) => extra.push(("unit", quoted(unit))),
            (None, None, None) => {
                trust = Trust::Check;
                note = format!("no unit was seen: add unit = \"…\"; {note}");
            }
        }
        let value = role(&taken.spot.place, &extra);
        self.put("value", value, trust, note);
    }

    fn numbers(&mut self) {
        let spot = |meaning| self.roles.get(meaning).map(|taken| &taken.spot);
        let (nominal, lower, upper) = (
            spot(Meaning::Nominal),
            spot(Meaning::Lower),
            spot(Meaning::Upper),
        );
        let limits = limits::judge(nominal, lower, upper, self.mark);
        if let Some(taken) = self.roles.get(Meaning::Nominal) {
            let (trust, note) = self.judged(taken);
            self.put("nominal", role(&taken.spot.place, &[]), trust, note);
        }
        for (meaning, key) in [(Meaning::Lower, "lower"), (Meaning::Upper, "upper")] {
            let Some(taken) = self.roles.get(meaning) else {
                continue;
            };
            let (mut trust, mut note) = self.judged(taken);
            let has_nominal = self.roles.get(Meaning::Nominal).is_some();
            let (from, told, sure) = told(limits, has_nominal);
            if !sure {
                trust = Trust::Check;
            }
            note = format!("{told}; {note}");
            let extra = if from {
                vec![("from", quoted("nominal"))]
            } else {
                Vec::new()
            };
            self.put(key, role(&taken.spot.place, &extra), trust, note);
        }
        if lower.is_none() && upper.is_none() {
            self.put(
                "upper",
                "{ column = \"\" }",
                Trust::Optional,
                "no limits were seen; the plan can state them",
            );
        }
    }

    /// Texts that stand where values should.
    fn no_value(&mut self) {
        let Some(taken) = self.roles.get(Meaning::Value) else {
            return;
        };
        const MOST: usize = 6;
        const LONGEST: usize = 8;
        let mut texts: Vec<&str> = taken
            .spot
            .values()
            .filter_map(|datum| match datum {
                Datum::Text(text) if !super::number::is_number(text) => Some(text.as_str()),
                _ => None,
            })
            .filter(|text| text.chars().count() <= LONGEST)
            .collect();
        texts.sort_unstable();
        texts.dedup();
        // What holds a digit may be a damaged number.
        texts.retain(|text| !text.chars().any(|c| c.is_numeric()));
        if texts.is_empty() || texts.len() > MOST {
            return;
        }
        let list: Vec<String> = texts.iter().map(|text| quoted(text)).collect();
        self.put(
            "no_value",
            format!("[{}]", list.join(", ")),
            Trust::Check,
            "seen in place of a value: do these mean that nothing was measured?",
        );
    }

    fn same(&mut self) {
        let named = [
            (Meaning::Program, "program"),
            (Meaning::Stylus, "stylus"),
            (Meaning::Fixture, "fixture"),
        ];
        let found: Vec<String> = named
            .into_iter()
            .filter_map(|(meaning, name)| {
                let taken = self.roles.get(meaning)?;
                Some(format!("{name} = {}", role(&taken.spot.place, &[])))
            })
            .collect();
        if !found.is_empty() {
            self.lines.push(Line::new(
                READ,
                "same",
                format!("{{ {} }}", found.join(", ")),
                Trust::Check,
                "must stay the same within a round; leave out what may differ",
            ));
        }
    }

    fn end(&mut self) {
        let ends: Vec<&str> = self
            .samples
            .iter()
            .filter_map(|sample| sample.end.as_deref())
            .collect();
        let Some(first) = ends.first() else { return };
        let same = ends
            .iter()
            .filter(|end| restudy_parsers::fold(end) == restudy_parsers::fold(first))
            .count();
        let (trust, note) = if same == self.samples.len() {
            (
                Trust::Check,
                format!(
                    "a file without it counts as cut short; {}",
                    self.of_all(same)
                ),
            )
        } else {
            (
                Trust::Optional,
                format!(
                    "{}; a file without it would count as cut short",
                    self.of_all(same)
                ),
            )
        };
        self.put(
            "end",
            format!("{{ find = {} }}", quoted(first)),
            trust,
            note,
        );
    }
}

/// What cuts a number out of a text with a unit behind it.
const NUMBER: &str = r"^\s*([+\-\u{2212}]?[0-9.,]+)";

/// True when the limits are deviations; why; and whether that is sure.
fn told(limits: Limits, has_nominal: bool) -> (bool, String, bool) {
    let rows = |n: usize| {
        if n == 1 {
            "1 reading".to_owned()
        } else {
            format!("{n} readings")
        }
    };
    match limits {
        Limits::Absolute(n) => (false, format!("the limits themselves: they lie about the nominal in {}", rows(n)), true),
        Limits::Relative(n) => (true, format!("a deviation: it lies about zero, not about the nominal, in {}", rows(n)), true),
        Limits::PerhapsRelative(n) => (true, format!("both limits far from the nominal and of one sign in {}: deviations? if a minus sign is left out, this reads wrong", rows(n)), false),
        Limits::Mixed => (false, "some rows look like limits, some like deviations".to_owned(), false),
        Limits::Open if has_nominal => (false, "nothing shows whether this is the limit itself or a deviation (then add from = \"nominal\")".to_owned(), false),
        Limits::Open => (false, "taken as the limit itself; no nominal was seen to compare with".to_owned(), false),
    }
}

/// A role as TOML.
fn role(place: &Place, extra: &[(&str, String)]) -> String {
    let mut keys = match place {
        Place::Column(heading) => vec![format!("column = {}", quoted(heading))],
        Place::Label(label) => vec![format!("label = {}", quoted(label))],
        Place::Cell(cell, find) => vec![
            format!("cell = {}", quoted(cell)),
            format!("find = {}", quoted(find)),
        ],
        Place::Xml(path) => vec![format!("xml = {}", quoted(path))],
    };
    keys.extend(extra.iter().map(|(key, value)| format!("{key} = {value}")));
    format!("{{ {} }}", keys.join(", "))
}

pub(super) fn seen_in(n: usize, of: usize) -> String {
    format!(
        "seen in {n} of {of} {}",
        if of == 1 { "file" } else { "files" }
    )
}
