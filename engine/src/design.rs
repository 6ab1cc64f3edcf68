//! The planned design as data.

/// One factor: how many levels it has *within one combination of the factors it is nested in*.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Factor { pub name: String, pub levels: usize, pub within: Vec<String> }
