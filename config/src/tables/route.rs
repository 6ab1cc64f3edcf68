//! `[[route]]`: who gets which notices.

use crate::checked::{NoticeKind, Route};
use crate::tables::mail::addresses;
use crate::tables::plan::Plans;
use crate::walk::{Node, Table};
use restudy_parsers::{fold, nearest};

const KINDS: [(&str, NoticeKind); 2] = [
    ("standing", NoticeKind::Standing),
    ("corrected", NoticeKind::Corrected),
];

/// Kinds that later versions know.
const LATER: [&str; 10] = [
    "back",
    "missing",
    "stalled",
    "closing",
    "held",
    "refused",
    "unreadable",
    "silent",
    "overdue",
    "summary",
];

pub(crate) fn routes(
    root: &Table<'_>,
    plans: Option<&Plans>,
    has_mail: bool,
) -> Option<Vec<Route>> {
    let Some(node) = root.get("route") else {
        return Some(Vec::new());
    };
    let tables = node.tables("route", &root.place)?;
    if !has_mail {
        node.place.fault_hint(
            "a route without [mail]",
            "a [mail] table",
            "without it notices are logged only, and need no route",
        );
    }
    let written = tables.len();
    let routes: Vec<Route> = tables
        .iter()
        .filter_map(|table| route(table, plans))
        .collect();
    (routes.len() == written).then_some(())?;
    for plan in plans
        .map(|plans| plans.names.as_slice())
        .unwrap_or_default()
    {
        let is_of_plan = |route: &Route| route.plans.is_empty() || route.plans.contains(plan);
        let tells_standings =
            |route: &Route| route.kinds.is_empty() || route.kinds.contains(&NoticeKind::Standing);
        if !routes
            .iter()
            .any(|route| is_of_plan(route) && tells_standings(route))
        {
            node.place.warn(
                format!("no route for the standings of plan \"{plan}\""),
                "one for every plan",
                "its alerts are logged only",
            );
        }
    }
    Some(routes)
}

fn route(table: &Table<'_>, plans: Option<&Plans>) -> Option<Route> {
    let named = table.or("plans", Vec::new(), |node| plan_names(node, plans));
    let kinds = table.or("kinds", Vec::new(), |node| kinds(node));
    let to = table
        .need("to", "a list of mail addresses")
        .and_then(|node| addresses(&node));
    table.later(&["instruments", "webhook", "language", "name"]);
    table.finish();
    Some(Route {
        kinds: kinds?,
        plans: named?,
        to: to?,
    })
}

fn plan_names(node: &Node<'_>, plans: Option<&Plans>) -> Option<Vec<String>> {
    let names = node.names("a list of plan names; leave it out for all plans")?;
    if let Some(plans) = plans {
        for (name, node) in &names {
            if !plans.names.iter().any(|other| other == name) {
                node.place.fault_nearest(
                    node.found(),
                    "the name of a [[plan]]",
                    nearest(name, plans.names.iter().map(String::as_str)),
                );
            }
        }
    }
    Some(names.into_iter().map(|(name, _)| name.to_owned()).collect())
}

fn kinds(node: &Node<'_>) -> Option<Vec<NoticeKind>> {
    let names = node.names("a list of kinds of notice; leave it out for all kinds")?;
    let written = names.len();
    let kind = |(name, node): &(&str, Node<'_>)| {
        if LATER.iter().any(|later| fold(later) == fold(name)) {
            node.place.fault(
                format!("`{name}`: not yet"),
                "a kind of this version: \"standing\" or \"corrected\"",
            );
            return None;
        }
        node.word(&KINDS)
    };
    let kinds: Vec<NoticeKind> = names.iter().filter_map(kind).collect();
    (kinds.len() == written).then_some(kinds)
}
