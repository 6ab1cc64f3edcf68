//! What the command line says in words of its own.

use std::str::FromStr;

use restudy_engine::{OneSided, Process};
use restudy_parsers::fold;

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
