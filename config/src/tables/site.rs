//! `[site]` and `[state]`.

use std::path::PathBuf;

use crate::checked::Site;
use crate::folders::Folders;
use crate::walk::{Node, Table};

pub(crate) fn site(root: &Table<'_>) -> Option<Site> {
    let table = root
        .need("site", "a [site] table with the plant's name and zone")?
        .table("a [site] table")?;
    let name = table
        .need("name", "the plant's name")
        .and_then(|node| node.name());
    let zone = table
        .need("zone", "the plant's time zone, such as \"Europe/Oslo\"")
        .and_then(|node| zone(&node));
    table.later(&["language", "pseudonyms"]);
    table.finish();
    Some(Site {
        name: name?.to_owned(),
        zone: zone?,
    })
}

/// A time zone by its IANA name, from the tables that are built in: the same answer on every machine.
pub(crate) fn zone(node: &Node<'_>) -> Option<jiff::tz::TimeZone> {
    let zone = jiff::tz::TimeZoneDatabase::bundled().get(node.text()?).ok();
    if zone.is_none() {
        node.fault("an IANA time zone such as \"Europe/Oslo\"");
    }
    zone
}

/// The state folder: it exists, or its parent does, so that it can be made.
pub(crate) fn state(root: &Table<'_>, folders: &Folders<'_>) -> Option<PathBuf> {
    let table = root
        .need("state", "a [state] table with the service's own folder")?
        .table("a [state] table")?;
    let folder = table
        .need("folder", "the service's own folder, on a local disk")
        .and_then(|node| {
            let path = folders.path(&node)?;
            let parent_exists = path.parent().is_some_and(|parent| folders.exists(parent));
            if !folders.exists(&path) && !parent_exists {
                node.fault_hint(
                    "a folder, or one that can be made in an existing folder",
                    "it must be on a local disk",
                );
                return None;
            }
            Some(path)
        });
    table.later(&["keep", "retention"]);
    table.finish();
    folder
}
