//! What the command line says in words of its own.

use std::str::FromStr;

use restudy_engine::{OneSided, Process};
use restudy_parsers::{Plain, fold};

use super::fault::Fault;

/// What the command line says of the factors.
#[derive(Debug, Clone, Default, clap::Args)]
pub(super) struct Asked {
    /// A further factor by its column's heading, or under a name of its own; may be repeated
    #[arg(long = "factor", value_name = "NAME[=COLUMN]")]
    pub(super) further: Vec<FactorText>,
    /// Nest a factor in others: its levels are counted afresh in each of theirs; may be repeated
    #[arg(long, value_name = "FACTOR=CONTAINER[,CONTAINER]")]
    pub(super) within: Vec<WithinText>,
    /// Leave a factor out of the design: what it adds counts as repeatability; may be repeated
    #[arg(long = "leave-out", value_name = "FACTOR")]
    pub(super) left_out: Vec<String>,
    /// Answered with the reason why there is no such thing.
    #[arg(long, hide = true, num_args = 0..=1, require_equals = true, default_missing_value = "a factor")]
    pub(super) fixed: Option<String>,
}

/// Headings that are read already and are no factors.
const NO_FACTORS: [&str; 8] = [
    "trial",
    "characteristic",
    "value",
    "nominal",
    "lower",
    "upper",
    "unit",
    "taken",
];

impl Asked {
    /// Refuses what no file could satisfy.
    pub(super) fn check(&self) -> Result<(), Fault> {
        if let Some(factor) = &self.fixed {
            return Err(Fault::hinted(
                format!(
                    "--fixed: {factor} cannot be taken as fixed; all factors are random here, and limits beside a \
                     fixed one need methods that this program does not have"
                ),
                "study each of its levels alone, or leave it random if its levels stand for others like them",
            ));
        }
        let mut names = vec!["part".to_owned(), "appraiser".to_owned()];
        let mut columns = names.clone();
        for further in &self.further {
            let (name, column) = (fold(&further.name), fold(&further.column));
            if NO_FACTORS.contains(&column.as_str()) {
                return Err(Fault::new(format!(
                    "--factor: the column `{}` has a meaning of its own and is no factor",
                    further.column
                )));
            }
            if names.contains(&name) || columns.contains(&column) {
                return Err(Fault::hinted(
                    format!(
                        "--factor {}: that factor is in the design already",
                        further.name
                    ),
                    "each further factor has a name and a column of its own",
                ));
            }
            names.push(name);
            columns.push(column);
        }
        Ok(())
    }

    /// What is asked of an export with plain headings.
    pub(super) fn plain(&self) -> Plain {
        Plain {
            factors: self.further.iter().map(|f| f.column.clone()).collect(),
        }
    }

    /// What the factor of a column is called.
    pub(super) fn name_of<'a>(&'a self, column: &'a str) -> &'a str {
        let further = self.further.iter().find(|f| f.column == column);
        further.map_or(column, |f| &f.name)
    }
}

/// A further factor and where it stands.
#[derive(Debug, Clone)]
pub(super) struct FactorText {
    pub(super) name: String,
    pub(super) column: String,
}

impl FromStr for FactorText {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let (name, column) = text.split_once('=').unwrap_or((text, text));
        let (name, column) = (name.trim().to_owned(), column.trim().to_owned());
        if name.is_empty() || column.is_empty() {
            return Err("expected `NAME` or `NAME=COLUMN`".into());
        }
        Ok(Self { name, column })
    }
}

/// A nested factor and its containers.
#[derive(Debug, Clone)]
pub(super) struct WithinText {
    pub(super) factor: String,
    pub(super) containers: Vec<String>,
}

impl FromStr for WithinText {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let expected =
            "expected `FACTOR=CONTAINER` or `FACTOR=CONTAINER,CONTAINER`, as in `part=appraiser`";
        let (factor, containers) = text.split_once('=').ok_or(expected)?;
        let factor = factor.trim().to_owned();
        let containers: Vec<String> = containers.split(',').map(|c| c.trim().to_owned()).collect();
        if factor.is_empty() || containers.iter().any(String::is_empty) {
            return Err(expected.into());
        }
        Ok(Self { factor, containers })
    }
}

#[derive(Debug, Clone, Copy)]
pub(super) struct OneSidedText(pub(super) OneSided);

impl FromStr for OneSidedText {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let folded = fold(&text.replace('-', " "));
        match folded.as_str() {
            "from zero" => return Ok(Self(OneSided::FromZero)),
            "to process mean" => return Ok(Self(OneSided::ToProcessMean)),
            "to study mean" => return Ok(Self(OneSided::ToStudyMean)),
            _ => {}
        }
        folded
            .strip_prefix("width")
            .and_then(|rest| rest.trim_start_matches([' ', '=']).parse::<f64>().ok())
            .filter(|w| w.is_finite() && *w > 0.0)
            .map(|w| Self(OneSided::Width(w)))
            .ok_or_else(|| {
                "expected `from zero`, `width=NUMBER`, `to process mean` or `to study mean`".into()
            })
    }
}

#[derive(Debug, Clone, Copy)]
pub(super) struct ProcessText(pub(super) Process);

impl FromStr for ProcessText {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        if fold(&text.replace('-', " ")) == "study parts" {
            return Ok(Self(Process::StudyParts));
        }
        let numbers = text.split_once(',').and_then(|(mean, sd)| {
            Some((
                mean.trim().parse::<f64>().ok()?,
                sd.trim().parse::<f64>().ok()?,
            ))
        });
        numbers
            .filter(|(mean, sd)| mean.is_finite() && sd.is_finite() && *sd > 0.0)
            .map(|(mean, sd)| Self(Process::Stated { mean, sd }))
            .ok_or_else(|| "expected `MEAN,SD` with an sd above 0, or `study parts`".into())
    }
}
