//! How many readings a run says that it has, and whether it has them.

use crate::fault::{Fault, shown};
use crate::grid::Field;
use crate::reader::Roles;

/// Largest number of readings that a run may be said to have.
const COUNT_MAX: u32 = 1 << 20;

/// A stated number of readings, with the place that states it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Stated {
    count: u32,
    place: String,
}

impl Stated {
    /// Notes what one record states of its run, when the rule asks for it.
    pub(crate) fn note(
        before: &mut Option<Self>,
        roles: &Roles,
        fields: &[Field<'_>],
    ) -> Result<(), Fault> {
        let Some(source) = roles.count else {
            return Ok(());
        };
        let (source, field) = (&roles.sources[source], fields[source]);
        let written = source
            .quantity(field, roles.marks)?
            .ok_or_else(|| source.blank(field.place))?;
        let number = written.number.value;
        let is_count = number.fract() == 0.0 && (1.0..=f64::from(COUNT_MAX)).contains(&number);
        if !is_count || written.suffix.is_some() {
            return Err(Fault::new(
                field.place,
                shown(field.content),
                "how many readings the run has",
                format!("`{}` is no number of readings", shown(field.content)),
            )
            .hint("correct where `count` is read"));
        }
        let count = number as u32;
        match before {
            Some(before) if before.count != count => Err(Fault::new(
                field.place,
                shown(field.content),
                format!("{}, as before in this run", before.count),
                format!(
                    "the run has {count} readings here and {} by {}",
                    before.count, before.place
                ),
            )
            .hint("a run has one number of readings: export it again")),
            Some(_) => Ok(()),
            None => {
                let place = field.place.to_string();
                *before = Some(Self { count, place });
                Ok(())
            }
        }
    }

    /// What is wrong with a run of so many readings.
    pub(crate) fn fault(&self, readings: usize) -> Option<Fault> {
        let stated = self.count as usize;
        let hint = match readings.cmp(&stated) {
            std::cmp::Ordering::Equal => return None,
            std::cmp::Ordering::Less => {
                "a run that was broken off looks like this: measure it again"
            }
            std::cmp::Ordering::Greater => {
                "are there two runs in one? say where their trial or time stands"
            }
        };
        Some(Fault {
            place: self.place.clone(),
            found: counted(readings),
            expected: counted(stated),
            hint: Some(hint.to_owned()),
            wrong: format!("the run has {readings} of {stated} readings"),
        })
    }
}

fn counted(readings: usize) -> String {
    match readings {
        1 => "1 reading".to_owned(),
        several => format!("{several} readings"),
    }
}
