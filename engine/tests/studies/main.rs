//! Studies of invented readings: what must not change them, thin and flat data, and what is refused.

#![allow(clippy::unwrap_used, reason = "a test stops at its first surprise")]

mod invariances;
mod invented;
mod pooling;
mod record;
mod refused;
mod risk;
mod sound;
mod thin;
mod tolerances;
mod unequal;
