//! End-to-end tests of the built program.
//!
//! Model: an invented plant in a folder of its own (`plant`), exports written into it as machines write them
//! (`export`), the program started as a child process (`program`), and a real mail server on loopback
//! (`mailbox`). A test waits for a state that `status --json` shows, with a deadline; whoever asks for a status
//! also has its accounting added up.
//!
//! Not here: statistics, formats, wording; each is tested beside its own code.

mod broken_exports;
mod commands;
mod demo;
mod export;
mod factors;
mod ledger;
mod mail_server_down;
mod mailbox;
mod ninety_workbooks;
mod plant;
mod program;
mod propose;
mod published;
mod record_keys;
mod revisions;
mod unusable_runs;
mod workbook_reader;
