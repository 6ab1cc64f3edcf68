//! Rules about the text of the sources.

use std::path::Path;

use super::{files, root};

/// Every source file below a folder, with its path below the root.
fn sources(folder: &str) -> Vec<(String, String)> {
    files(&root().join(folder))
        .into_iter()
        .filter(|p| p.extension().is_some_and(|e| e == "rs"))
        .map(|p| {
            let shown = p.strip_prefix(root()).unwrap().to_str().unwrap().to_owned();
            (shown, fs_err::read_to_string(p).unwrap())
        })
        .collect()
}

fn only_in(folder: &str, word: &str, allowed: &[&str]) {
    let mut met = 0;
    for (path, text) in sources(folder) {
        if text.contains(word) {
            met += 1;
            assert!(
                allowed.iter().any(|a| path.starts_with(a)),
                "`{word}` stands in {path}"
            );
        }
    }
    assert!(
        met > 0 || allowed.is_empty(),
        "`{word}` stands nowhere any more: this rule can go"
    );
}

#[test]
fn the_only_sql_is_the_ledgers() {
    only_in("daemon/src", "rusqlite", &["daemon/src/ledger"]);
}

#[test]
fn the_wall_clock_is_read_in_one_place() {
    only_in("daemon/src", "Timestamp::now", &["daemon/src/now.rs"]);
    only_in("daemon/src", "SystemTime::now", &[]);
}

#[test]
fn the_core_touches_no_disk_clock_or_network() {
    for folder in ["engine/src", "parsers/src", "config/src"] {
        for word in [
            "std::fs",
            "fs_err",
            "std::net",
            "Instant::now",
            "SystemTime",
            "Timestamp::now",
            "std::env",
        ] {
            only_in(folder, word, &[]);
        }
    }
}

#[test]
fn nothing_is_left_open() {
    let words = [
        ["TO", "DO"].concat(),
        ["FIX", "ME"].concat(),
        ["#[ign", "ore"].concat(),
    ];
    for folder in ["engine", "parsers", "config", "daemon", "tests"] {
        for (path, text) in sources(folder) {
            for word in &words {
                assert!(!text.contains(word.as_str()), "`{word}` stands in {path}");
            }
        }
    }
}

#[test]
fn no_file_knows_the_machine_it_was_written_on() {
    let homes = [
        ["/ro", "ot/"].concat(),
        ["/wo", "rk/"].concat(),
        ["/ho", "me/"].concat(),
        ["/Us", "ers/"].concat(),
    ];
    for file in files(&root()) {
        let Ok(text) = fs_err::read_to_string(&file) else {
            continue;
        };
        if file.ends_with("Cargo.lock") || built(&file) {
            continue;
        }
        for home in &homes {
            assert!(
                !text.contains(home.as_str()),
                "`{home}` stands in {}",
                file.display()
            );
        }
    }
}

fn built(file: &Path) -> bool {
    file.components()
        .any(|c| c.as_os_str() == "target" || c.as_os_str() == ".git")
}
