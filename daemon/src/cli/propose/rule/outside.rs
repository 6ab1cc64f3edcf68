//! The keys about the export as a whole: form, sheet, headings, delimiter, encoding, decimal mark.

use super::Drafted;
use crate::cli::propose::draft::{Trust, quoted, shown};
use crate::cli::propose::number::Mark;
use crate::cli::propose::sample::{Dress, Header, Place, Sample};
use crate::cli::propose::words::Meaning;

impl Drafted<'_> {
    pub(super) fn form(&mut self) {
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
    pub(super) fn encoding(&mut self, label: Option<&str>) {
        if let Some(label) = label {
            let note =
                "not UTF-8; other encodings may fit too: are all letters right in `preview`?";
            self.put("encoding", quoted(label), Trust::Check, note);
        }
    }

    pub(super) fn sheet(&mut self) {
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

    pub(super) fn header(&mut self) {
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

    pub(super) fn delimiter(&mut self) {
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

    pub(super) fn decimal(&mut self, mark: &Mark) {
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
            Mark::NotShown if self.roles.has_only_cells() => self.put(
                "decimal",
                value,
                Trust::Seen,
                "of no matter: the numbers are the workbook's own",
            ),
            Mark::NotShown => {
                self.put("decimal", value, Trust::Check, "no number shows one");
            }
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
}
