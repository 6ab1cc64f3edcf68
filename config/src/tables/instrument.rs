//! `[[instrument]]`: what is watched, and how it is read.

use std::path::PathBuf;

use crate::checked::{Instrument, Site};
use crate::duration::duration;
use crate::folders::{Folders, nested};
use crate::patterns::{overlapping, patterns};
use crate::tables::rule::rule;
use crate::walk::{Node, Table};
use restudy_parsers::fold;

/// The instruments as far as they could be read.
#[derive(Debug, Default)]
pub(crate) struct Instruments {
    /// Every name that is written, of faulty ones too.
    pub(crate) names: Vec<String>,
    /// Those without a fault.
    pub(crate) checked: Vec<Instrument>,
}

pub(crate) fn instruments(
    root: &Table<'_>,
    site: Option<&Site>,
    state: Option<&PathBuf>,
    folders: &Folders<'_>,
) -> Option<Instruments> {
    let node = root.need("instrument", "at least one [[instrument]] table")?;
    let mut instruments = Instruments::default();
    let mut watched: Vec<(PathBuf, usize)> = Vec::new();
    for table in node.tables("instrument", &root.place)? {
        let Some((instrument, own_folders)) =
            instrument(&table, site, state, folders, &mut instruments.names)
        else {
            continue;
        };
        for (node, path) in own_folders {
            for (other, index) in watched.iter().filter(|(other, _)| nested(other, &path)) {
                shared(
                    &node,
                    &instrument,
                    other,
                    instruments.checked.get(*index).unwrap_or(&instrument),
                );
            }
            watched.push((path, instruments.checked.len()));
        }
        instruments.checked.push(instrument);
    }
    Some(instruments)
}

/// Two folders of which one holds the other: no file may belong to both.
fn shared(node: &Node<'_>, ours: &Instrument, other: &std::path::Path, theirs: &Instrument) {
    if ours.name == theirs.name {
        let expected = "folders that do not lie inside one another";
        node.fault_hint(
            expected,
            format!(
                "`{}` is watched already; sub-folders are watched with it",
                other.display()
            ),
        );
    } else if let Some((a, b)) = overlapping(&ours.files, &theirs.files) {
        node.fault_hint(
            format!("files of its own: a file there could match \"{a}\", and \"{b}\" of instrument \"{}\"", theirs.name),
            format!("that instrument watches `{}`: use another folder, or patterns that no file name can match together", other.display()),
        );
    }
}

fn instrument<'a>(
    table: &Table<'a>,
    site: Option<&Site>,
    state: Option<&PathBuf>,
    folders: &Folders<'_>,
    names: &mut Vec<String>,
) -> Option<(Instrument, Vec<(Node<'a>, PathBuf)>)> {
    let name = table
        .need("name", "the instrument's name")
        .and_then(|node| unique(&node, names));
    let watched = table
        .need("folders", "a list of folders to watch")
        .and_then(|node| watched(&node, state, folders));
    let files = table
        .need("files", "a list of file name patterns such as [\"*.xlsx\"]")
        .and_then(|node| patterns(&node));
    let settle_node = table.need_hint(
        "settle",
        "a time such as \"3s\"",
        "how long a file must hold still depends on the exporter",
    );
    let settle = settle_node
        .as_ref()
        .and_then(|node| duration(node, "200ms", "1h"));
    let rescan = table.or("rescan", std::time::Duration::from_secs(30), |node| {
        duration(node, "200ms", "1h")
    });
    if let (Some(settle), Some(rescan), Some(node)) = (settle, rescan, &settle_node)
        && settle > rescan
    {
        node.place.warn(
            node.found(),
            "a time that is not above `rescan`",
            "a file is looked at several times before it can settle",
        );
    }
    let read = table
        .need("read", "an [instrument.read] table")
        .and_then(|node| node.table("an [instrument.read] table"));
    let rule = read.and_then(|read| rule(&read, site));
    table.later(&["calendar", "zone", "calibrated"]);
    table.finish();
    let (watched, rule) = (watched?, rule?);
    let instrument = Instrument {
        name: name?.to_owned(),
        folders: watched.iter().map(|(_, path)| path.clone()).collect(),
        files: files?,
        settle: settle?,
        rescan: rescan?,
        rule_mark: serde_json::to_string(&rule)
            .expect("a rule has only text keys and finite numbers"),
        rule,
    };
    Some((instrument, watched))
}

/// A name that no earlier table of its kind has; kept even when it is a duplicate, so that others may name it.
pub(crate) fn unique<'a>(node: &Node<'a>, names: &mut Vec<String>) -> Option<&'a str> {
    let name = node.name()?;
    if names.iter().any(|other| fold(other) == fold(name)) {
        node.fault("a name that no other has");
        return None;
    }
    names.push(name.to_owned());
    Some(name)
}

fn watched<'a>(
    node: &Node<'a>,
    state: Option<&PathBuf>,
    folders: &Folders<'_>,
) -> Option<Vec<(Node<'a>, PathBuf)>> {
    let mut watched = Vec::new();
    for node in node.list("a list of folders to watch")? {
        let Some(path) = folders.path(&node) else {
            continue;
        };
        if let Some(state) = state.filter(|state| nested(state, &path)) {
            node.fault_hint(
                format!("a folder apart from the state folder `{}`", state.display()),
                "neither may lie inside the other",
            );
        } else if folders.exists(&path) {
            watched.push((node, path));
        } else {
            let hint = format!(
                "make the folder `{}`, mount it, or correct the path",
                path.display()
            );
            node.fault_hint("an existing folder that the service can read", hint);
        }
    }
    Some(watched)
}
