//! Rows owed.
