//! The shape of the tree and of the dependencies.

use std::collections::BTreeSet;
use std::process::Command;

use super::{files, root};

#[test]
fn the_top_level_stays_short() {
    let allowed: BTreeSet<&str> = [
        "Cargo.toml",
        "Cargo.lock",
        "README.md",
        "DEVELOPERS.md",
        "CHANGELOG.md",
        "LICENSE-MIT",
        "LICENSE-APACHE",
        "rust-toolchain.toml",
        "clippy.toml",
        "deny.toml",
        "engine",
        "parsers",
        "config",
        "daemon",
        "tests",
        "fixtures",
        "target",
    ]
    .into();
    for entry in fs_err::read_dir(root()).unwrap() {
        let name = entry.unwrap().file_name().into_string().unwrap();
        assert!(
            name.starts_with('.') || allowed.contains(name.as_str()),
            "`{name}` lies at the top level"
        );
    }
}

/// Normal dependencies on crates of this workspace.
fn workspace_imports(package: &str) -> BTreeSet<String> {
    let output = Command::new(env!("CARGO"))
        .args(["metadata", "--format-version", "1", "--no-deps"])
        .current_dir(root())
        .output()
        .unwrap();
    let metadata: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let packages = metadata["packages"].as_array().unwrap();
    let found = packages.iter().find(|p| p["name"] == package).unwrap();
    found["dependencies"]
        .as_array()
        .unwrap()
        .iter()
        .filter_map(|d| d["name"].as_str())
        .filter(|name| name.starts_with("restudy"))
        .map(str::to_owned)
        .collect()
}

#[test]
fn the_core_imports_no_rim() {
    assert_eq!(workspace_imports("restudy-engine"), BTreeSet::new());
    assert_eq!(workspace_imports("restudy-parsers"), BTreeSet::new());
    let both: BTreeSet<String> = ["restudy-engine".into(), "restudy-parsers".into()].into();
    assert_eq!(workspace_imports("restudy-config"), both);
}

#[test]
fn every_fixture_names_its_origin() {
    let fixtures = root().join("fixtures");
    for file in files(&fixtures) {
        if file.ends_with("ORIGIN.md") {
            continue;
        }
        let origin = file
            .ancestors()
            .skip(1)
            .take_while(|folder| folder.starts_with(&fixtures))
            .map(|folder| folder.join("ORIGIN.md"))
            .find(|origin| origin.exists())
            .unwrap_or_else(|| panic!("no ORIGIN.md for {}", file.display()));
        let text = fs_err::read_to_string(&origin).unwrap();
        let below = file.strip_prefix(origin.parent().unwrap()).unwrap();
        let below = below.to_str().unwrap();
        let stem = below.split('.').next().unwrap();
        assert!(
            text.contains(below)
                || text.contains(&format!("`{stem}`"))
                || listed_by_pattern(&text, below),
            "{} does not name `{below}`",
            origin.display()
        );
    }
}

/// `d_strd_*` or `faults/*.txt` in an ORIGIN.md names every file that starts and ends so.
fn listed_by_pattern(text: &str, name: &str) -> bool {
    text.split('`').any(|word| {
        word.split_once('*').is_some_and(|(start, end)| {
            start.len() >= 2 && name.starts_with(start) && name.ends_with(end)
        })
    })
}
