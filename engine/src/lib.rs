//! Random-effects analysis of variance for gauge studies.
//!
//! Model: readings `y = mu + sum of random effects + error`, one effect for every term that the
//! [`Design`] (factors, crossed or nested) implies. From it follow degrees of freedom, sums of squares,
//! expected mean squares, F tests, variance components and confidence limits; nothing is written out
//! per design.
//!
//! Not here: files, clocks, network, chance without a seed, who measured what (labels stay with the caller).
//!
//! Invariant: a number is finite or absent; an absent one says why.
//!
//! How many digits are right and how often the limits hold the truth: [`accuracy`].

#[doc = include_str!("../ACCURACY.md")]
pub mod accuracy {}
mod basis;
mod chance;
mod combination;
pub mod consistency;
mod design;
mod estimates;
mod fault;
mod figure;
mod figures;
mod generalized;
mod glance;
pub mod ladder;
mod limits;
mod linear;
mod mls;
mod model;
pub mod over_time;
mod percentile;
pub mod planning;
mod pooling;
pub mod quantile;
mod random;
mod record;
mod recorded;
mod remarks;
mod reml;
pub mod risk;
mod root;
mod settings;
mod standing;
mod study;
mod sums;
mod table;
mod tails;
mod tolerance;
mod twofold;

pub use combination::Combination;
pub use design::{CELLS_MAX, Design, DesignError, FACTORS_MAX, Factor, PART};
pub use fault::StudyError;
pub use figure::{Figure, Interval, Open};
pub use generalized::{DRAWS, SEED, Simulation};
pub use glance::Glance;
pub use limits::Quantity;
pub use model::{Line, Model, WITHIN_CELLS};
pub use record::{
    Against, ChanceAbove, Component, ConsumerRisk, Figures, InteractionChoice, Layout, MeanSquare,
    Ndc, OtherReading, ProducerRisk, Remark, Risk, RiskProcess, Spread, Study,
};
pub use recorded::{Recorded, RecordedError};
pub use remarks::{Context, FALSE_ALARMS, Names, REMARKS_MAX, remarks};
pub use reml::{GaugeBootstrap, Reml, reml};
pub use settings::{Interaction, Judge, Limits, OneSided, Process, Settings, Tolerance};
pub use standing::{Standing, standing};
pub use study::{Prepared, TRIALS_MAX, analyse};
