//! Which place holds which role: by words first, by what stands there where words leave it open.

use std::collections::BTreeMap;

use super::number::{self, Mark};
use super::sample::{Datum, Place, Sample, Spot};
use super::stamp::{Stamps, stamps};
use super::words::{self, Fit, Meaning};

/// A place as the samples show it together.
#[derive(Debug, Clone)]
pub(super) struct Shared {
    pub(super) place: Place,
    pub(super) names: Vec<String>,
    /// What stands there in each sample that has the place.
    pub(super) by_file: Vec<Vec<Datum>>,
    pub(super) once: bool,
    pub(super) twice: bool,
}

impl Shared {
    pub(super) fn values(&self) -> impl Iterator<Item = &Datum> + Clone {
        self.by_file.iter().flatten()
    }

    fn all(&self) -> Vec<Datum> {
        self.values().cloned().collect()
    }

    pub(super) fn files(&self) -> usize {
        self.by_file.len()
    }

    pub(super) fn stamps(&self) -> Stamps {
        stamps(&self.all())
    }

    pub(super) fn share_of_numbers(&self) -> f64 {
        number::share_of_numbers(&self.all())
    }

    pub(super) fn unit_behind(&self) -> Option<String> {
        number::unit_behind(&self.all())
    }
}

/// A place taken for a role.
#[derive(Debug, Clone)]
pub(super) struct Taken {
    pub(super) spot: Shared,
    /// Why it may be another: what was only nearly known.
    pub(super) doubt: Option<String>,
    /// Other places that could be meant.
    pub(super) others: Vec<String>,
}

/// Every role that was found.
#[derive(Debug, Default)]
pub(super) struct Roles {
    found: BTreeMap<Meaning, Taken>,
    /// Places of numbers that no role took.
    pub(super) numbers_left: Vec<String>,
    /// What stands there.
    rest: Vec<Datum>,
}

impl Roles {
    pub(super) fn get(&self, meaning: Meaning) -> Option<&Taken> {
        self.found.get(&meaning)
    }

    /// The decimal mark of value, nominal and limits.
    pub(super) fn mark(&self) -> Mark {
        let numbers = [
            Meaning::Value,
            Meaning::Nominal,
            Meaning::Upper,
            Meaning::Lower,
        ];
        let spots = numbers.into_iter().filter_map(|role| self.found.get(&role));
        number::mark(spots.flat_map(|taken| taken.spot.values()))
    }

    /// The decimal mark of the numbers that no role took.
    pub(super) fn mark_of_the_rest(&self) -> Mark {
        number::mark(self.rest.iter())
    }

    /// True when value, nominal and limits are all cells with numbers of a workbook.
    pub(super) fn has_only_cells(&self) -> bool {
        let numbers = [
            Meaning::Value,
            Meaning::Nominal,
            Meaning::Upper,
            Meaning::Lower,
        ];
        let mut values = numbers
            .into_iter()
            .filter_map(|role| self.found.get(&role))
            .flat_map(|taken| taken.spot.values())
            .filter(|datum| **datum != Datum::Blank)
            .peekable();
        values.peek().is_some() && values.all(|datum| matches!(datum, Datum::Number(_)))
    }

    pub(super) fn found(samples: &[Sample]) -> Self {
        let shared = shared(samples);
        let mut claims: Vec<(Fit, Meaning, usize)> = Vec::new();
        for (at, spot) in shared.iter().enumerate() {
            for (fit, meaning) in meant(spot) {
                if spot.fits(meaning) {
                    claims.push((fit, meaning, at));
                }
            }
        }
        // The better fit first, then a place met in more samples, then the one that stands first.
        claims.sort_by(|a, b| {
            let files = |at: usize| shared.get(at).map_or(0, Shared::files);
            b.0.cmp(&a.0)
                .then_with(|| files(b.2).cmp(&files(a.2)))
                .then_with(|| a.2.cmp(&b.2))
        });
        let mut roles = Self::default();
        let mut used: Vec<usize> = Vec::new();
        for (fit, meaning, at) in claims {
            let Some(spot) = shared.get(at) else { continue };
            if used.contains(&at) {
                continue;
            }
            if let Some(taken) = roles.found.get_mut(&meaning) {
                taken.others.push(spot.place.shown().to_owned());
                continue;
            }
            used.push(at);
            let doubt = (fit != Fit::Whole)
                .then(|| "the words are only nearly those of this role".to_owned());
            let taken = Taken {
                spot: spot.clone(),
                doubt,
                others: Vec::new(),
            };
            roles.found.insert(meaning, taken);
        }
        roles.value_by_content(&shared, &mut used);
        let is_left = |(at, spot): &(usize, &Shared)| {
            let left_alone = || meant(spot).iter().any(|(_, m)| *m == Meaning::Neither);
            !used.contains(at) && !spot.once && spot.share_of_numbers() > 0.5 && !left_alone()
        };
        for (_, spot) in shared.iter().enumerate().filter(is_left) {
            roles.numbers_left.push(spot.place.shown().to_owned());
            roles.rest.extend(spot.values().cloned());
        }
        roles
    }

    /// Without a word for the value, the only place of numbers with decimals that no role took.
    fn value_by_content(&mut self, shared: &[Shared], used: &mut Vec<usize>) {
        if self.found.contains_key(&Meaning::Value) {
            return;
        }
        let with_fraction = |spot: &Shared| {
            spot.values().any(|datum| match datum {
                Datum::Number(number) => number.fract() != 0.0,
                Datum::Text(_) => matches!(
                    number::mark(std::iter::once(datum)),
                    Mark::Seen(_) | Mark::PerhapsThousands
                ),
                _ => false,
            })
        };
        let candidates: Vec<(usize, &Shared)> = shared
            .iter()
            .enumerate()
            .filter(|(at, spot)| {
                let left_alone = meant(spot).iter().any(|(_, m)| *m == Meaning::Neither);
                !used.contains(at)
                    && !spot.once
                    && !spot.twice
                    && !left_alone
                    && spot.share_of_numbers() > 0.5
                    && with_fraction(spot)
            })
            .collect();
        if let [(at, spot)] = candidates[..] {
            used.push(at);
            let taken = Taken {
                spot: spot.clone(),
                doubt: Some("no word for it; the only place of numbers with decimals that no other role took".into()),
                others: Vec::new(),
            };
            self.found.insert(Meaning::Value, taken);
        }
    }
}

impl Shared {
    /// Whether what stands there can be what the words say.
    fn fits(&self, meaning: Meaning) -> bool {
        if self.twice {
            return false;
        }
        match meaning {
            Meaning::Value => self.share_of_numbers() > 0.5,
            Meaning::Nominal | Meaning::Upper | Meaning::Lower => self.share_of_numbers() > 0.0,
            Meaning::Taken | Meaning::Date => self.stamps() != Stamps::No,
            Meaning::Part | Meaning::Appraiser | Meaning::Characteristic => {
                self.values().any(|datum| *datum != Datum::Blank)
            }
            Meaning::Trial => !self.counts_rows(),
            Meaning::Neither | Meaning::End => false,
            Meaning::Clock
            | Meaning::Unit
            | Meaning::Program
            | Meaning::Stylus
            | Meaning::Fixture => true,
        }
    }

    /// A number that goes up by one with every row of every sample: it counts rows, not trials.
    fn counts_rows(&self) -> bool {
        let is_counter = |values: &Vec<Datum>| {
            values.len() > 3
                && values
                    .iter()
                    .zip(1_i32..)
                    .all(|(datum, n)| number::value(datum, '.') == Some(f64::from(n)))
        };
        !self.by_file.is_empty() && self.by_file.iter().all(is_counter)
    }
}

impl Place {
    /// The heading, label, cell or path itself.
    pub(super) fn shown(&self) -> &str {
        match self {
            Self::Column(text) | Self::Label(text) | Self::Cell(text, _) | Self::Xml(text) => text,
        }
    }
}

/// The best meanings over all names of a place.
fn meant(spot: &Shared) -> Vec<(Fit, Meaning)> {
    let all = spot.names.iter().map(|name| words::meanings(name));
    all.reduce(|best, next| {
        let fit = |list: &[(Fit, Meaning)]| list.first().map(|(fit, _)| *fit);
        if fit(&next) > fit(&best) { next } else { best }
    })
    .unwrap_or_default()
}

/// The places of all samples, the same place once.
fn shared(samples: &[Sample]) -> Vec<Shared> {
    let same = |a: &Place, b: &Place| match (a, b) {
        (Place::Column(a), Place::Column(b)) | (Place::Label(a), Place::Label(b)) => {
            restudy_parsers::fold(a) == restudy_parsers::fold(b)
        }
        (a, b) => a == b,
    };
    let mut all: Vec<Shared> = Vec::new();
    for sample in samples {
        let mut here: Vec<usize> = Vec::new();
        for Spot {
            place,
            names,
            values,
            once,
            twice,
        } in &sample.spots
        {
            match all.iter().position(|known| same(&known.place, place)) {
                Some(at) => {
                    let Some(known) = all.get_mut(at) else {
                        continue;
                    };
                    known.twice |= *twice;
                    known.once &= *once;
                    if !here.contains(&at) {
                        known.by_file.push(values.clone());
                        here.push(at);
                    }
                }
                None => {
                    here.push(all.len());
                    all.push(Shared {
                        place: place.clone(),
                        names: names.clone(),
                        by_file: vec![values.clone()],
                        once: *once,
                        twice: *twice,
                    });
                }
            }
        }
    }
    all
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::cli::propose::sample::of_text;

    fn roles(text: &str) -> Roles {
        Roles::found(&[of_text("a.csv", text.as_bytes()).unwrap()])
    }

    fn place(roles: &Roles, meaning: Meaning) -> Option<&str> {
        roles.get(meaning).map(|taken| taken.spot.place.shown())
    }

    #[test]
    fn one_word_of_two_meanings_is_decided_by_what_stands_there() {
        let r = roles("part;measured\nP1;1,5\n");
        assert_eq!(place(&r, Meaning::Value), Some("measured"));
        assert_eq!(place(&r, Meaning::Taken), None);
        let r = roles("part;actual;measured\nP1;1,5;2026-06-02T08:00\n");
        assert_eq!(place(&r, Meaning::Taken), Some("measured"));
    }

    #[test]
    fn a_deviation_is_never_the_value_and_a_row_counter_no_trial() {
        let r = roles(
            "run;part;dev;reading x\n1;P1;0,1;1,5\n2;P1;0,2;1,6\n3;P2;0,1;1,5\n4;P2;0,1;1,5\n",
        );
        assert_eq!(place(&r, Meaning::Trial), None);
        assert_eq!(place(&r, Meaning::Value), Some("reading x"));
        assert!(r.get(Meaning::Value).unwrap().doubt.is_some());
    }

    #[test]
    fn several_columns_of_numbers_without_words_are_left_to_a_person() {
        let r = roles("part;bore;pin\nP1;1,5;2,5\nP2;1,6;2,4\n");
        assert_eq!(place(&r, Meaning::Value), None);
        assert_eq!(r.numbers_left, ["bore", "pin"]);
    }
}
