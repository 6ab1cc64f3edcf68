//! One module for each kind of table in the file.

pub(crate) mod bounds;
pub(crate) mod characteristic;
pub(crate) mod instrument;
pub(crate) mod judging;
pub(crate) mod layout;
pub(crate) mod levels;
pub(crate) mod list;
pub(crate) mod mail;
pub(crate) mod plan;
pub(crate) mod plan_instruments;
pub(crate) mod qif;
pub(crate) mod role;
pub(crate) mod route;
pub(crate) mod rule;
pub(crate) mod site;
pub(crate) mod taken;
pub(crate) mod value;
