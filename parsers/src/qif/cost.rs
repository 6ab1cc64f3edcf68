//! What keeps a measured characteristic from being used, and whom that costs.
//!
//! A run is whole or it is not used: a value that failed costs its run. What was never to be a number,
//! and what only repeats another run, costs itself alone.

use super::links::Broken;
use super::results::{Measured, Results, kind};
use super::say::status;
use crate::fault::Fault;
use crate::grid::Place;
use crate::names::shorten;

/// Statuses that stand in place of a value where none was to be measured: go/no-go, basic dimensions.
const VERDICTS: [&str; 6] = [
    "PASS",
    "FAIL",
    "REWORK",
    "UNDEFINED",
    "BASIC",
    "BASIC_OR_TED",
];

/// Whom an unusable value costs.
pub(super) enum Cost {
    /// It alone: it is no measured value.
    Itself(Fault),
    Run(Fault),
}

impl Results<'_> {
    /// What keeps a value from being used, and whom that costs.
    pub(super) fn cost(&self, measured: &Measured) -> Option<Cost> {
        let tree = self.tree;
        let at = |line: u32, path: &'static str| Place::Element { line, path };
        let here = |expected: &str, wrong: String| {
            Fault::new(
                at(measured.line, "CharacteristicMeasurement"),
                "",
                expected,
                wrong,
            )
        };
        let run = &self.runs[measured.run];
        if let Some(first) = run.copy_of {
            let wrong = format!(
                "the run in line {} is the one in line {first} once more, with the same identifier",
                run.line
            );
            return Some(Cost::Itself(
                here("each run once", wrong).hint("the first is used"),
            ));
        }
        let of_broken = |broken: &Broken, expected: &str| {
            let mut fault = Fault::new(
                at(broken.line, "CharacteristicMeasurement"),
                broken.found.clone(),
                expected,
                broken.wrong.clone(),
            );
            fault.hint = Some(broken.hint.to_owned());
            Cost::Run(fault)
        };
        if self.value.is_some() {
            let kind = kind(tree, measured.node);
            if kind == "UserDefinedAttribute" {
                let wrong = "a user-defined attribute has a text, no number".to_owned();
                return Some(Cost::Itself(
                    here("a measured value", wrong).hint("it is not studied"),
                ));
            }
            if let Some(cost) = self.without_value(measured, &here) {
                return Some(cost);
            }
        }
        if let Err(broken) = &measured.item {
            return Some(of_broken(broken, "a characteristic of this document"));
        }
        if self.asks_for_unit
            && let Some(wrong) = &measured.unusable_unit
        {
            let fault = Fault::new(
                at(measured.line, "CharacteristicMeasurement/Value"),
                "",
                "a unit of this document",
                wrong.clone(),
            );
            return Some(Cost::Run(
                fault.hint("correct the units where the export is made"),
            ));
        }
        match &measured.bounding {
            Err(broken) => {
                let mut cost = of_broken(broken, "nominal and limits that can be read");
                if let Cost::Run(fault) = &mut cost {
                    fault.place = at(broken.line, "CharacteristicDefinition").to_string();
                }
                Some(cost)
            }
            Ok(_) => None,
        }
    }

    fn without_value(
        &self,
        measured: &Measured,
        here: &dyn Fn(&str, String) -> Fault,
    ) -> Option<Cost> {
        if measured.value.is_some() {
            return None;
        }
        let tree = self.tree;
        let others: Vec<&str> = ["Value", "MaxValue", "MinValue"]
            .into_iter()
            .filter(|name| tree.child(measured.node, name).is_some())
            .collect();
        if !others.is_empty() {
            let wrong = format!(
                "there is no {}, only {}",
                self.value_name(),
                others.join(" and ")
            );
            let fault = here("a measured value", wrong).hint(
                "if one of them is what is studied, say so, as in `value = { qif = \"max\" }`",
            );
            return Some(Cost::Run(fault));
        }
        let status = status(tree, measured.node).unwrap_or("");
        let reference = tree
            .child(measured.node, "CharacteristicItemId")
            .and_then(|item| tree.text(item));
        let elsewhere = reference.is_some_and(|item| self.measured_items.contains(item));
        let wrong = format!("there is no value, only the status `{}`", shorten(status));
        Some(match VERDICTS.contains(&status) && !elsewhere {
            true => Cost::Itself(
                here("a measured value", wrong)
                    .hint("a go/no-go result cannot be studied as a measured value"),
            ),
            false => Cost::Run(here("a measured value", wrong).hint("measure this run again")),
        })
    }
}
