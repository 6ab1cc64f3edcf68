//! The lines of `[instrument.read]`: from the roles that were found, with what was seen for each.

mod measured;
mod outside;

use super::draft::{Line, Trust, quoted, shown};
use super::number::Mark;
use super::path;
use super::roles::{Roles, Taken};
use super::sample::{Datum, Dress, Place, Sample};
use super::stamp::Stamps;
use super::words::Meaning;

const READ: &str = "instrument.read";

pub(super) fn lines(samples: &[Sample]) -> Vec<Line> {
    let roles = Roles::found(samples);
    let mark = match roles.mark() {
        Mark::NotShown => roles.mark_of_the_rest(),
        mark => mark,
    };
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
        format!("seen in {n} of {}", counted(self.samples.len(), "file"))
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
        self.in_path(meaning, key, trust);
    }

    /// A role that may stand in the file names.
    fn in_path(&mut self, meaning: Meaning, key: &'static str, otherwise: Trust) {
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
            self.in_path(Meaning::Trial, "trial", Trust::Optional);
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
        let elsewhere = self
            .samples
            .iter()
            .flat_map(|sample| &sample.spots)
            .any(|spot| {
                spot.values.iter().any(|datum| match datum {
                    Datum::Text(text) => {
                        restudy_parsers::fold(text).contains(&restudy_parsers::fold(first))
                    }
                    _ => false,
                })
            });
        let (trust, note) = if elsewhere {
            (
                Trust::Optional,
                "it ends the files, but stands within other texts too".to_owned(),
            )
        } else if same == self.samples.len() {
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

/// `1 file`, `2 files`.
pub(super) fn counted(n: usize, what: &str) -> String {
    format!("{n} {what}{}", if n == 1 { "" } else { "s" })
}
