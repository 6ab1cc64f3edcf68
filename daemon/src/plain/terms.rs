//! Which terms the lines of a study's table hold, and which of them the error line has taken in.

use restudy_engine::{Design, Line, Model, PART, Study, WITHIN_CELLS};

/// The term that one trial leaves in the line within cells; `None` when cells have repeats.
pub(crate) fn in_error(study: &Study) -> Option<Line> {
    let full = Model::full(&design(study)?, study.design.trials);
    let largest = full
        .lines()
        .iter()
        .rfind(|line| line.df > 0 && line.name != WITHIN_CELLS)?;
    (full.error().df == 0).then(|| largest.clone())
}

/// The interactions of the part that the readings can tell apart, the largest last.
pub(crate) fn interactions(study: &Study) -> Vec<Line> {
    let model = design(study).map(|design| Model::estimable(&design, study.design.trials));
    let lines = model.iter().flat_map(|model| model.lines());
    lines
        .filter(|line| is_interaction(&line.of))
        .cloned()
        .collect()
}

/// The interactions of the part that were pooled into the error.
pub(crate) fn pooled(study: &Study) -> Vec<Line> {
    let mut pooled = interactions(study);
    pooled.retain(|line| study.mean_squares.iter().all(|kept| kept.name != line.name));
    pooled
}

/// Whether these inner factors make an interaction of the part.
pub(crate) fn is_interaction(of: &[String]) -> bool {
    of.len() > 1 && of.iter().any(|name| name == PART)
}

/// Whether a study's table has exactly these lines.
pub(crate) fn same_model(study: &Study, lines: &[String]) -> bool {
    study.mean_squares.iter().map(|l| l.name.as_ref()).eq(lines)
}

fn design(study: &Study) -> Option<Design> {
    Design::new(study.design.factors.clone()).ok()
}

#[cfg(test)]
mod tests {
    use restudy_engine::{Factor, Interaction, Judge, Settings, Tolerance, analyse};

    use super::*;

    /// Three crossed factors of two levels; what differs is part × appraiser, beside a small part × fixture and
    /// repeats of ± 1.
    fn study(trials: usize) -> Study {
        let factors = ["part", "appraiser", "fixture"].map(|name| Factor::crossed(name, 2));
        let design = Design::new(factors.to_vec()).unwrap();
        let cells: Vec<usize> = (0..8).flat_map(|cell| vec![cell; trials]).collect();
        let sign = |bit: usize| if bit == 0 { -1.0 } else { 1.0 };
        let value = |(row, cell): (usize, &usize)| {
            let (part, appraiser, fixture) = (cell / 4, cell / 2 % 2, cell % 2);
            let repeat = if trials > 1 { sign(row % trials) } else { 0.0 };
            let crossed = 20.0 * sign(part) * sign(appraiser) + 0.2 * sign(part) * sign(fixture);
            crossed + 0.1 * sign(part) * sign(appraiser) * sign(fixture) + repeat
        };
        let values: Vec<f64> = cells.iter().enumerate().map(value).collect();
        let settings = Settings {
            confidence: 0.95,
            spread_sds: 6.0,
            interaction: Interaction::PoolAbove(0.25),
            process: None,
            limits: None,
            judge: Judge::Estimate,
        };
        analyse(&design, &cells, &values, &Tolerance::default(), &settings).unwrap()
    }

    fn names(lines: &[Line]) -> Vec<&str> {
        lines.iter().map(|line| line.name.as_str()).collect()
    }

    #[test]
    fn pooled_terms_are_those_that_the_table_lacks() {
        let study = study(2);
        assert_eq!(in_error(&study), None);
        assert_eq!(
            names(&pooled(&study)),
            ["part × fixture", "part × appraiser × fixture"]
        );
        assert!(
            study
                .mean_squares
                .iter()
                .any(|l| l.name == "part × appraiser")
        );
    }

    #[test]
    fn one_trial_leaves_the_largest_term_in_the_error() {
        let study = study(1);
        let taken_in = in_error(&study).map(|line| line.name);
        assert_eq!(taken_in.as_deref(), Some("part × appraiser × fixture"));
        assert_eq!(
            names(&interactions(&study)),
            ["part × appraiser", "part × fixture"]
        );
    }
}
