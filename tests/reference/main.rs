//! The engine against values from outside: published worked examples, certified data sets, exact rational
//! arithmetic and 40-digit evaluations of the formulas in the papers that the engine names.
//!
//! Where each value comes from stands in `fixtures/reference/ORIGIN.md`.

#![allow(clippy::unwrap_used, reason = "a test stops at its first surprise")]

mod accuracy;
mod check;
mod comparison;
mod consistency;
mod data;
mod degenerate;
mod design_rules;
mod generalized;
mod ladder;
mod leaves;
mod limits;
mod offsets;
mod point_values;
mod published;
mod quantiles;
mod reml;
mod risk;
mod study_values;
