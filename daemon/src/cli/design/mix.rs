//! The sources of an assumed gauge's variance, as the command line has them.

use std::str::FromStr;

use restudy_engine::WITHIN_CELLS;
use restudy_parsers::fold;

/// Weights by the word that the command line has for a source.
#[derive(Debug, Clone)]
pub(super) struct Mix(Vec<(&'static str, f64)>);

/// The words for sources, and the engine's lines.
const SOURCES: [(&str, &str); 3] = [
    ("repeatability", WITHIN_CELLS),
    ("interaction", "part × appraiser"),
    ("appraiser", "appraiser"),
];

impl FromStr for Mix {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let mut mix: Vec<(&'static str, f64)> = Vec::new();
        for piece in text.split(',') {
            let (name, weight) = piece
                .split_once('=')
                .ok_or_else(|| format!("`{piece}` is no `SOURCE=WEIGHT`"))?;
            let name = fold(name);
            let (word, _) = SOURCES
                .iter()
                .find(|(word, _)| *word == name)
                .ok_or_else(|| {
                    format!(
                        "`{name}` is no source; expected repeatability, interaction or appraiser"
                    )
                })?;
            if mix.iter().any(|(w, _)| w == word) {
                return Err(format!("`{word}` is given twice"));
            }
            let weight = weight
                .trim()
                .parse::<f64>()
                .ok()
                .filter(|w| w.is_finite() && *w >= 0.0)
                .ok_or_else(|| format!("the weight of {word} is `{weight}`; expected 0 or more"))?;
            mix.push((word, weight));
        }
        if mix.iter().all(|(_, w)| *w == 0.0) {
            return Err("all weights are 0; expected one above 0".into());
        }
        Ok(Self(mix))
    }
}

impl Mix {
    /// Parts of the gauge's variance, which add up to 1.
    pub(super) fn parts(&self) -> impl Iterator<Item = (&'static str, f64)> + '_ {
        let sum: f64 = self.0.iter().map(|(_, w)| w).sum();
        self.0.iter().map(move |(word, w)| (*word, w / sum))
    }
    /// The same by the engine's names.
    pub(super) fn by_line(&self) -> Vec<(String, f64)> {
        let line = |word: &str| {
            SOURCES
                .iter()
                .find(|(w, _)| *w == word)
                .map(|(_, line)| *line)
        };
        self.parts()
            .filter_map(|(word, part)| Some((line(word)?.to_owned(), part)))
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn weights_are_parts_of_their_sum() {
        let mix: Mix = "Repeatability=60, interaction=10,appraiser=30"
            .parse()
            .unwrap();
        let parts: Vec<(&str, f64)> = mix.parts().collect();
        assert_eq!(
            parts,
            [
                ("repeatability", 0.6),
                ("interaction", 0.1),
                ("appraiser", 0.3)
            ]
        );
        assert_eq!(mix.by_line()[1].0, "part × appraiser");
    }

    #[test]
    fn what_is_no_mix_says_why() {
        let table = [
            ("", "no `SOURCE=WEIGHT`"),
            ("part=1", "no source"),
            ("appraiser=1,appraiser=2", "twice"),
            ("appraiser=-1", "0 or more"),
            ("appraiser=NaN", "0 or more"),
            ("appraiser=0", "all weights are 0"),
            ("appraiser=1e999", "0 or more"),
            ("appraiser=1,", "no `SOURCE=WEIGHT`"),
        ];
        for (text, part) in table {
            let sentence = text.parse::<Mix>().unwrap_err();
            assert!(sentence.contains(part), "{text}: {sentence}");
        }
    }
}
