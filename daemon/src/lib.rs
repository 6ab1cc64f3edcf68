//! Restudy: the service and the command line.
//!
//! Model: every stage reconciles the ledger. Folders are watched (`watch`), files settle (`settle`), become
//! exports, runs and readings (`intake`), fill rounds (`rounds`), are worked out (`analyse`), written up
//! (`report`) and told (`notice`, `deliver`). A stage sees the ledger, never another stage; a pass may be killed
//! at any point and run again.
//!
//! Not here: statistics (`restudy-engine`), formats (`restudy-parsers`), settings (`restudy-config`).

pub mod analyse;
pub mod causes;
pub mod cli;
pub mod deliver;
pub mod evidence;
pub mod figures;
pub mod intake;
pub mod ledger;
pub mod natural;
pub mod notice;
pub mod now;
mod plain;
pub mod record;
pub mod report;
pub mod rounds;
pub mod service;
pub mod settle;
pub mod stop;
pub mod watch;
