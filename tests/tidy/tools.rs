//! fmt, clippy, docs and the dependency tree, by the toolchain's own tools.
//!
//! A tool that is not installed is named and skipped; with `CI=true` nothing may be skipped.

use std::process::{Command, Output};

use super::root;

fn cargo(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO"))
        .args(arguments)
        .current_dir(root())
        .output()
        .unwrap()
}

fn installed(tool: &str) -> bool {
    let here = cargo(&[tool, "--version"]).status.success();
    if !here {
        assert!(
            std::env::var_os("CI").is_none(),
            "`cargo {tool}` must be installed here"
        );
        #[allow(clippy::print_stderr)]
        {
            eprintln!("skipped: `cargo {tool}` is not installed");
        }
    }
    here
}

fn must_succeed(output: &Output) {
    let text = String::from_utf8_lossy(&output.stderr);
    let more = String::from_utf8_lossy(&output.stdout);
    assert!(output.status.success(), "{text}\n{more}");
}

#[test]
fn the_code_is_formatted() {
    if installed("fmt") {
        must_succeed(&cargo(&["fmt", "--all", "--check"]));
    }
}

#[test]
fn clippy_and_the_docs_are_silent() {
    if installed("clippy") {
        must_succeed(&cargo(&[
            "clippy",
            "--workspace",
            "--all-targets",
            "--",
            "-D",
            "warnings",
        ]));
    }
    let docs = Command::new(env!("CARGO"))
        .args(["doc", "--workspace", "--no-deps"])
        .env("RUSTDOCFLAGS", "-D warnings")
        .current_dir(root())
        .output()
        .unwrap();
    must_succeed(&docs);
}

#[test]
fn the_dependency_tree_is_sound() {
    if !installed("deny") {
        return;
    }
    must_succeed(&cargo(&["deny", "check", "bans", "licenses", "sources"]));
    let advisories = cargo(&["deny", "check", "advisories"]);
    let text = String::from_utf8_lossy(&advisories.stderr);
    let unreachable =
        text.contains("failed to fetch") || text.contains("failed to load advisory database");
    assert!(advisories.status.success() || unreachable, "{text}");
}
