//! What is nested in what, and what is left out, in the factors of the files.
//!
//! Not here: levels and readings (`structure`).
//!
//! Invariant: every place is that of a factor of the files, the part is not left out, and no factor contains itself.

use std::collections::BTreeSet;

use restudy_parsers::fold;

use super::asked::Asked;
use super::fault::Fault;

/// The factors of all files and what was asked of them; places are those of [`Row::labels`].
#[derive(Debug)]
pub(super) struct Nesting {
    pub(super) factors: Vec<String>,
    /// The containers of each factor as asked for.
    pub(super) within: Vec<Vec<usize>>,
    /// The containers of containers too.
    pub(super) all_within: Vec<BTreeSet<usize>>,
    pub(super) left_out: Vec<bool>,
}

impl Nesting {
    /// Finds the asked factors among those of the files.
    pub(super) fn of(factors: &[String], asked: &Asked) -> Result<Self, Fault> {
        let find = |name: &str, option: &str| {
            let place = factors.iter().position(|f| fold(f) == fold(name));
            place.ok_or_else(|| {
                Fault::hinted(
                    format!(
                        "{option}: there is no factor `{name}`; the factors are {}",
                        factors.join(", ")
                    ),
                    "name further columns with --factor",
                )
            })
        };
        let mut left_out = vec![false; factors.len()];
        for name in &asked.left_out {
            let place = find(name, "--leave-out")?;
            if place == 0 {
                return Err(Fault::new(
                    "--leave-out: a study cannot do without the part",
                ));
            }
            left_out[place] = true;
        }
        let mut within = vec![Vec::new(); factors.len()];
        for nested in &asked.within {
            let inner = find(&nested.factor, "--within")?;
            for container in &nested.containers {
                let outer = find(container, "--within")?;
                if let Some(&out) = [inner, outer].iter().find(|&&f| left_out[f]) {
                    let name = &factors[out];
                    return Err(Fault::new(format!(
                        "--within names `{name}`, which --leave-out leaves out"
                    )));
                }
                if !within[inner].contains(&outer) {
                    within[inner].push(outer);
                }
            }
        }
        let all_within: Vec<BTreeSet<usize>> =
            (0..factors.len()).map(|f| closure(&within, f)).collect();
        if let Some(f) = (0..factors.len()).find(|&f| all_within[f].contains(&f)) {
            return Err(Fault::hinted(
                format!("--within: `{}` ends up within itself", factors[f]),
                "the containers of a factor are those it changes with, as in --within part=appraiser",
            ));
        }
        Ok(Self {
            factors: factors.to_vec(),
            within,
            all_within,
            left_out,
        })
    }
}

fn closure(within: &[Vec<usize>], factor: usize) -> BTreeSet<usize> {
    let mut reached = BTreeSet::new();
    let mut next = within[factor].clone();
    while let Some(f) = next.pop() {
        if reached.insert(f) {
            next.extend(&within[f]);
        }
    }
    reached
}
