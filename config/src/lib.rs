//! Restudy's configuration: TOML in, checked settings out.
//!
//! Model: [`read`] takes the text of one file and a [`Disk`] (so that this crate touches none) and answers
//! with a [`Config`] or with every [`Fault`] of the file at once.
//!
//! Not here: files, clocks, what the settings are used for.
//!
//! Invariant: what leaves this crate is consistent; nothing downstream checks it again.

mod address;
mod checked;
mod duration;
mod fault;
mod folders;
mod patterns;
mod place;
mod read;
mod source;
mod tables;
mod walk;

pub use checked::{
    Appraisers, Characteristic, Config, FactorLevels, FilePatterns, Instrument, Label, Mail,
    NoticeKind, Password, Plan, PlanFactor, Route, Site, Tls,
};
pub use fault::Fault;

pub use read::read;

/// The few things that checking asks of the disk.
pub trait Disk {
    /// True when the path is an existing folder.
    fn is_folder(&self, path: &std::path::Path) -> bool;
    /// The text of a file that the configuration names (a list of characteristics).
    ///
    /// # Errors
    /// One sentence when it cannot be read.
    fn text(&self, path: &std::path::Path) -> Result<String, String>;
}
