//! What headings and labels mean, by words of the trade in nine languages (`words.txt`).

use std::collections::HashMap;
use std::sync::LazyLock;

use restudy_parsers::fold;

/// What a place in an export may hold.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) enum Meaning {
    Part,
    Appraiser,
    Trial,
    Taken,
    /// A date that may lack its time of day.
    Date,
    /// A time of day that may lack its date.
    Clock,
    Characteristic,
    Value,
    Unit,
    Nominal,
    Upper,
    Lower,
    Program,
    Stylus,
    Fixture,
    /// A text that ends an export.
    End,
    /// Known, and none of them: a deviation, a remark.
    Neither,
}

/// How well a heading fits a meaning.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Fit {
    /// A word of the list is part of it.
    Contained(usize),
    /// It is a word of the list.
    Whole,
}

static WORDS: LazyLock<Vec<(Meaning, String)>> = LazyLock::new(|| {
    let lines = include_str!("words.txt").lines();
    lines
        .filter_map(|line| {
            let (head, words) = line.split_once(": ")?;
            let meaning = meaning(head.split(' ').next()?)?;
            Some(words.split(',').map(move |word| (meaning, key(word))))
        })
        .flatten()
        .collect()
});

static WHOLE: LazyLock<HashMap<&'static str, Vec<Meaning>>> = LazyLock::new(|| {
    let mut whole: HashMap<&str, Vec<Meaning>> = HashMap::new();
    for (meaning, word) in WORDS.iter() {
        let meanings = whole.entry(word.as_str()).or_default();
        if !meanings.contains(meaning) {
            meanings.push(*meaning);
        }
    }
    whole
});

fn meaning(name: &str) -> Option<Meaning> {
    Some(match name {
        "part" => Meaning::Part,
        "appraiser" => Meaning::Appraiser,
        "trial" => Meaning::Trial,
        "taken" => Meaning::Taken,
        "date" => Meaning::Date,
        "clock" => Meaning::Clock,
        "characteristic" => Meaning::Characteristic,
        "value" => Meaning::Value,
        "unit" => Meaning::Unit,
        "nominal" => Meaning::Nominal,
        "upper" => Meaning::Upper,
        "lower" => Meaning::Lower,
        "program" => Meaning::Program,
        "stylus" => Meaning::Stylus,
        "fixture" => Meaning::Fixture,
        "end" => Meaning::End,
        "neither" => Meaning::Neither,
        _ => return None,
    })
}

/// Folded, without what stands in brackets at its end, points and closing marks.
fn key(text: &str) -> String {
    let (name, _) = unit_behind(text);
    let mut plain = String::with_capacity(name.len());
    let mut before = ' ';
    for c in name.chars() {
        plain.push(match c {
            '.' | ':' | '：' | '_' | '/' | '#' => ' ',
            '-' if before.is_alphanumeric() => ' ',
            '\u{2212}' | '\u{2013}' => '-',
            'º' => '°',
            c => c,
        });
        before = c;
    }
    fold(&plain)
}

/// A heading parted from the unit in brackets at its end: `Actual [mm]`.
pub(super) fn unit_behind(heading: &str) -> (&str, Option<&str>) {
    let heading = heading.trim();
    for (open, close) in [('[', ']'), ('(', ')'), ('（', '）')] {
        if let Some(inner) = heading.strip_suffix(close)
            && let Some((name, unit)) = inner.rsplit_once(open)
            && !name.trim().is_empty()
        {
            return (
                name.trim(),
                Some(unit.trim()).filter(|unit| !unit.is_empty()),
            );
        }
    }
    (heading, None)
}

/// What a heading may mean, the best fit first.
pub(super) fn meanings(heading: &str) -> Vec<(Fit, Meaning)> {
    let key = key(heading);
    if let Some(whole) = WHOLE.get(key.as_str()) {
        return whole.iter().map(|meaning| (Fit::Whole, *meaning)).collect();
    }
    let mut found: Vec<(Fit, Meaning)> = Vec::new();
    for (meaning, word) in WORDS.iter() {
        if !holds(&key, word) || *meaning == Meaning::End {
            continue;
        }
        let fit = Fit::Contained(word.chars().count());
        match found.iter_mut().find(|(_, known)| known == meaning) {
            Some((best, _)) => *best = fit.max(*best),
            None => found.push((fit, *meaning)),
        }
    }
    found.sort_by_key(|(fit, _)| std::cmp::Reverse(*fit));
    let best = found.first().map(|(fit, _)| *fit);
    found.retain(|(fit, _)| Some(*fit) == best);
    found
}

/// True when the word stands in the text as words of its own; scripts without blanks need none.
fn holds(text: &str, word: &str) -> bool {
    let spaced = word.is_ascii() || word.chars().all(|c| (c as u32) < 0x3000);
    if spaced && word.chars().count() < 3 {
        return false;
    }
    text.match_indices(word).any(|(at, _)| {
        let before = text[..at].chars().next_back();
        let after = text[at + word.len()..].chars().next();
        !spaced
            || ![before, after]
                .into_iter()
                .flatten()
                .any(char::is_alphanumeric)
    })
}

/// The words of one meaning.
pub(super) fn words_of(meaning: Meaning) -> impl Iterator<Item = &'static str> {
    WORDS
        .iter()
        .filter(move |(own, _)| *own == meaning)
        .map(|(_, word)| word.as_str())
}

/// True when the text as a whole is one of the words that end an export.
pub(super) fn ends(text: &str) -> bool {
    WHOLE
        .get(key(text).as_str())
        .is_some_and(|meanings| meanings.contains(&Meaning::End))
}

/// An XML name as a heading: `NominalValue`, `nominal_value` and `nominal-value` are `Nominal Value`.
pub(super) fn of_name(name: &str) -> String {
    let mut words = String::new();
    let mut last_lower = false;
    for c in name.chars() {
        if matches!(c, '_' | '-' | '.') {
            words.push(' ');
        } else {
            if c.is_uppercase() && last_lower {
                words.push(' ');
            }
            words.push(c);
        }
        last_lower = c.is_lowercase();
    }
    words
}

#[cfg(test)]
mod tests {
    use super::*;

    fn best(heading: &str) -> Vec<Meaning> {
        meanings(heading).into_iter().map(|(_, m)| m).collect()
    }

    #[test]
    fn words_of_nine_languages_mean_the_same() {
        for (meaning, words) in [
            (
                Meaning::Part,
                [
                    "Serial no.",
                    "Werkstück-Nr.",
                    "N° de pièce",
                    "Nº de pieza",
                    "Matricola",
                    "Číslo dílu",
                    "Nr części",
                    "部品番号",
                    "零件编号",
                ],
            ),
            (
                Meaning::Appraiser,
                [
                    "Loaded by:",
                    "PRÜFER",
                    "Opérateur",
                    "Operador",
                    "Operatore",
                    "Kontrolor",
                    "Kontroler",
                    "測定者",
                    "检验员",
                ],
            ),
            (
                Meaning::Nominal,
                [
                    "Nominal (mm)",
                    "Nennmaß",
                    "Valeur nominale",
                    "Valor nominal",
                    "Valore nominale",
                    "Jmenovitá hodnota",
                    "Wymiar nominalny",
                    "設計値",
                    "名义值",
                ],
            ),
            (
                Meaning::Upper,
                [
                    "Upper tol.",
                    "Oberes Abmaß",
                    "Tol. sup.",
                    "Límite superior",
                    "Toll. sup.",
                    "Horní mez",
                    "Odchyłka górna",
                    "上限公差",
                    "上公差",
                ],
            ),
            (
                Meaning::Value,
                [
                    "Actual [mm]",
                    "Istwert",
                    "Valeur mesurée",
                    "Valor medido",
                    "Valore misurato",
                    "Naměřená hodnota",
                    "Wynik pomiaru",
                    "実測値",
                    "测量值",
                ],
            ),
        ] {
            for word in words {
                assert_eq!(best(word), [meaning], "{word}");
            }
        }
    }

    #[test]
    fn a_word_within_a_heading_counts_and_the_longest_decides() {
        assert_eq!(best("Actual bore diameter"), [Meaning::Value]);
        assert_eq!(best("Measured value, corrected"), [Meaning::Value]);
        assert_eq!(best("Deviation from nominal"), [Meaning::Neither]);
        assert_eq!(best("particle"), []);
        assert_eq!(best("bore A"), []);
    }

    #[test]
    fn units_and_names_are_taken_apart() {
        assert_eq!(unit_behind("Actual [mm]"), ("Actual", Some("mm")));
        assert_eq!(unit_behind("(mm)"), ("(mm)", None));
        assert_eq!(of_name("NominalValue"), "Nominal Value");
        assert_eq!(of_name("upper_tol"), "upper tol");
        assert_eq!(best("Werkstück-Nr."), best("Werkstück Nr"));
        assert_eq!(best("Tol -"), [Meaning::Lower]);
        assert!(ends("Ende") && ends("End of report.") && !ends("Endmaß"));
    }

    #[test]
    fn every_line_of_the_list_is_of_a_meaning_and_a_word_of_one_language_has_one_but_measured() {
        for line in include_str!("words.txt").lines() {
            if line.is_empty() || line.starts_with('#') {
                continue;
            }
            let (head, words) = line.split_once(": ").unwrap();
            let (name, language) = head.split_once(' ').unwrap();
            let own = meaning(name).unwrap();
            for word in words.split(',').map(key).filter(|word| word != "measured") {
                let clash = include_str!("words.txt").lines().find(|other| {
                    other.split_once(": ").is_some_and(|(head, words)| {
                        head.split_once(' ')
                            .is_some_and(|(other, l)| l == language && meaning(other) != Some(own))
                            && words.split(',').any(|w| key(w) == word)
                    })
                });
                assert_eq!(clash, None, "{line}: {word}");
            }
        }
    }
}
