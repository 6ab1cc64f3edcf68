//! Why readings give no study.

use crate::study::TRIALS_MAX;

/// Why readings give no study. The indices are those of the slices that were handed over, from 0.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum StudyError {
    /// Cells and values differ in number.
    #[error("{cells} cell numbers came with {values} readings; expected one each")]
    Lengths {
        /// Cell numbers.
        cells: usize,
        /// Readings.
        values: usize,
    },
    /// A cell number beyond the design.
    #[error("reading {row} lies in cell {cell}; the design has cells 0 to {last}")]
    NoSuchCell {
        /// Index of the reading.
        row: usize,
        /// The cell it names.
        cell: usize,
        /// The last cell of the design.
        last: usize,
    },
    /// A reading that is not a number.
    #[error("reading {row} is {value}; expected a finite number")]
    NotFinite {
        /// Index of the reading.
        row: usize,
        /// What it is.
        value: f64,
    },
    /// No readings or no trials.
    #[error("there are no readings; expected at least one in every cell")]
    Empty,
    /// Cells with different numbers of readings.
    #[error(
        "cell {cell} ({place}) holds {count} readings; expected {expected} as in the other cells"
    )]
    Unbalanced {
        /// Index of the cell.
        cell: usize,
        /// The cell in words, levels counted from 1.
        place: String,
        /// Its readings.
        count: usize,
        /// Readings of the other cells.
        expected: usize,
    },
    /// A component that the cells with readings cannot tell from the others.
    #[error(
        "the cells that hold readings cannot tell the spread of {0} from the others; expected readings in more cells"
    )]
    NotApart(String),
    /// Readings without an error.
    #[error(
        "the readings follow the factors without any rest, so that nothing is left for repeatability; expected repeats that differ"
    )]
    NoError,
    /// No largest likelihood was found.
    #[error(
        "the likelihood of the components was not maximised; expected readings of a more even design"
    )]
    Unsettled,
    /// More readings in a cell than [`TRIALS_MAX`].
    #[error("every cell has {0} readings; expected at most {TRIALS_MAX}")]
    TooManyTrials(usize),
    /// Fewer than two parts.
    #[error(
        "the design has {0} part; expected at least 2, because the spread of parts is worked out too"
    )]
    TooFewParts(usize),
    /// Readings spread over more orders of magnitude than squares can hold.
    #[error(
        "the readings differ by up to {0:e}; expected differences between 1e-140 and 1e140, or a unit in which they are"
    )]
    Spread(f64),
    /// A setting out of range.
    #[error("{setting} is {value}; expected {expected}")]
    Setting {
        /// Which.
        setting: &'static str,
        /// What it is.
        value: f64,
        /// What it may be.
        expected: &'static str,
    },
}
