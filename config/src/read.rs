//! The whole file: its tables one after the other, and what holds between them.

use std::path::Path;

use toml::de::DeTable;

use crate::checked::Config;
use crate::folders::Folders;
use crate::source::{Findings, Place, Source, shortened};
use crate::tables::{instrument, mail, plan, route, site};
use crate::walk::Table;
use crate::{Disk, Fault};

/// The configuration in `text`, with warnings.
///
/// `file` is what faults call it; relative paths in it start at `folder`, which is absolute. Times carry their unit (`"3s"`),
/// shares and confidences are parts of one, drawing values are in the characteristic's unit.
///
/// # Errors
/// Every fault of the file and of the lists that it names, by file and line. Of a text that is not TOML only
/// the place where it stops to be.
pub fn read(
    text: &str,
    file: &str,
    folder: &Path,
    disk: &dyn Disk,
) -> Result<(Config, Vec<Fault>), Vec<Fault>> {
    let findings = Findings::default();
    let config = {
        let source = Source {
            file,
            text,
            findings: &findings,
        };
        document(
            &source,
            &Folders {
                start: folder,
                disk,
            },
        )
    };
    let (faults, warnings) = findings.sorted(file);
    match config {
        Some(config) if faults.is_empty() => Ok((config, warnings)),
        _ => Err(faults),
    }
}

fn document(source: &Source<'_>, folders: &Folders<'_>) -> Option<Config> {
    let whole = Place {
        source,
        offset: 0,
        key: String::new(),
    };
    let (document, errors) = DeTable::parse_recoverable(source.text);
    for error in errors {
        let place = whole
            .clone()
            .at(error.span().map_or(source.text.len(), |span| span.start));
        if error.message().starts_with(DUPLICATE) {
            let key = error
                .span()
                .and_then(|span| source.text.get(span))
                .unwrap_or_default();
            place
                .below(&shortened(key))
                .fault("the key a second time", "each key once");
        } else {
            // The line itself is not shown: a password may stand in it, and faults are logged.
            place
                .below("the file")
                .fault_hint("a syntax error", "TOML", error.message());
            return None;
        }
    }
    let root = Table::new(whole, document.get_ref());
    let site = site::site(&root);
    let state = site::state(&root, folders);
    let instruments = instrument::instruments(&root, site.as_ref(), state.as_ref(), folders);
    let plans = plan::plans(&root, instruments.as_ref(), folders);
    let mail_node = root.get("mail");
    let mail = match &mail_node {
        None => Some(None),
        Some(node) => mail::mail(node, folders).map(Some),
    };
    let routes = route::routes(&root, plans.as_ref(), mail_node.is_some());
    if let (Some(node), None) = (&mail_node, root.get("route")) {
        node.place.warn(
            "[mail] without a [[route]]",
            "at least one [[route]]",
            "without it no mail is sent; notices are logged",
        );
    }
    root.later(&[
        "calendar",
        "decisions",
        "board",
        "metrics",
        "mirror",
        "webhook",
        "pack",
        "retention",
        "pseudonyms",
        "log",
        "health",
        "limits",
    ]);
    root.finish();
    Some(Config {
        site: site?,
        state: state?,
        instruments: instruments?.checked,
        plans: plans?.checked,
        mail: mail?,
        routes: routes?,
    })
}

/// How the TOML parser's message about a repeated key begins.
const DUPLICATE: &str = "duplicate key";
