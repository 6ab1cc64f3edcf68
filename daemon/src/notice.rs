//! Notices.
