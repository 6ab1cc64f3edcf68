//! `[instrument.read]`: how one instrument's exports are read.

use std::collections::BTreeMap;

use restudy_parsers::{
    Bounds, Cell, Count, Find, Form, Header, Layout, Limit, Reader, Role, Rule, Sheet, Trial,
};

use crate::checked::Site;
use crate::place::{is_each, regex};
use crate::source::shortened;
use crate::tables::bounds::bounds;
use crate::tables::layout::{header, layout};
use crate::tables::qif;
use crate::tables::role::{PLACES, Shape, role, role_in, table as role_table};
use crate::tables::taken::taken;
use crate::tables::value::{count, crosstab, value, with_units_row};
use crate::walk::{Node, Table};
use restudy_parsers::fold;

/// Names that mean a role of their own and so cannot name a further factor.
const RESERVED: [&str; 6] = [
    "part",
    "appraiser",
    "trial",
    "taken",
    "round",
    "characteristic",
];

/// Marks between groups of three digits; blanks and apostrophes are one mark each.
const THOUSANDS: [char; 7] = ['.', ',', ' ', '\u{a0}', '\u{202f}', '\'', '\u{2019}'];

pub(crate) fn rule(table: &Table<'_>, site: Option<&Site>) -> Option<Rule> {
    let shape = shape(table);
    if let Shape::Qif(_) = shape {
        return qif::rule(table, site);
    }
    let decimal = table.or("decimal", '.', |node| node.word(&[(".", '.'), (",", ',')]));
    let form = form(table, shape, decimal);
    let layout = layout(table, shape);
    let bounds = table.or("bounds", Bounds::default(), bounds);
    let part = table
        .need("part", "where the part's name comes from")
        .and_then(|node| role(&node, shape));
    let appraiser = table.optional("appraiser", |node| role(node, shape));
    let trial = table.optional("trial", |node| trial(node, shape));
    let taken = table.optional("taken", |node| taken(node, shape, site));
    let round = table.optional("round", |node| role(node, shape));
    let characteristic = table.optional("characteristic", |node| role(node, shape));
    let value = table
        .need("value", "where the measured value comes from")
        .and_then(|node| value(&node, shape));
    let nominal = table.optional("nominal", |node| role(node, shape));
    let has_nominal = table.get("nominal").is_some();
    let lower = table.optional("lower", |node| limit(node, shape, has_nominal, true));
    let upper = table.optional("upper", |node| limit(node, shape, has_nominal, false));
    let factors = table.or("factors", BTreeMap::new(), |node| {
        named_roles(node, shape, &BTreeMap::new())
    });
    let known = factors.clone().unwrap_or_default();
    let same = table.or("same", BTreeMap::new(), |node| {
        named_roles(node, shape, &known)
    });
    let end = table.optional("end", find);
    let count = table.optional("count", |node| count(node, shape));
    let thousands = table.optional("thousands", |node| thousands(node, decimal));
    let no_value = table.or("no_value", Vec::new(), |node| texts(node));
    let line_breaks = table.or("line_breaks", false, |node| node.flag());
    let encoding = table.optional("encoding", encoding);
    table.never(
        &["format", "zone", "dates"],
        "it belongs to the time, as in taken = { cell = \"B4\", zone = \"Europe/Oslo\" }",
    );
    table.never(
        &["unit", "units"],
        "units behind numbers are read; what numbers without one are in belongs to the value, as in value = { column = \"Actual\", unit = \"mm\" }",
    );
    table.finish();

    if matches!(trial, Some(Some(Trial::Counted(Count::Taken)))) && table.get("taken").is_none() {
        table.place_of("trial").fault_hint(
            "trials counted by time stamp, and no time stamp",
            "the role `taken`",
            "say where `taken` comes from, or count trials by order",
        );
        return None;
    }
    let (part, value) = (part?, value?);
    let is_by_row = |role: Option<&Role>| {
        role.is_some_and(|role| {
            matches!(
                role.from,
                Cell::Column(_) | Cell::Counted(_) | Cell::Joined { .. }
            )
        })
    };
    let by_row = is_by_row(Some(&part)) || is_by_row(characteristic.as_ref()?.as_ref());
    let alone = |cell: &Cell| {
        matches!(
            cell,
            Cell::At { .. } | Cell::Label(_) | Cell::RightOf(_) | Cell::Below(_)
        )
    };
    if by_row && alone(&value.role.from) {
        table.place_of("value").fault_hint(
            "one place for the whole export, beside roles from columns",
            "a column",
            "every row would get the same value",
        );
        return None;
    }
    let (form, further_headings) = form?;
    let value = with_units_row(
        value,
        layout.as_ref().is_some_and(|layout| layout.units_row),
    );
    let rule = Rule {
        form,
        part,
        appraiser: appraiser?,
        trial: trial?,
        taken: taken?,
        round: round?,
        characteristic: characteristic?,
        value,
        nominal: nominal?,
        lower: lower?,
        upper: upper?,
        factors: factors?,
        same: same?,
        end: end?,
        count: count?,
        layout: Layout {
            further_headings,
            ..layout?
        },
        decimal: decimal?,
        thousands: thousands?,
        no_value: no_value?,
        line_breaks: line_breaks?,
        encoding: encoding?,
        bounds: bounds?,
    };
    match Reader::new(&rule) {
        Ok(_) => Some(rule),
        Err(why) => {
            let expected = "places that fit each other";
            table
                .place
                .fault(format!("{}: {}", why.role, why.what), expected);
            None
        }
    }
}

fn shape(table: &Table<'_>) -> Shape {
    let Some(node) = table.need("form", "\"table\", \"crosstab\", \"xml\" or \"qif\"") else {
        return Shape::Unknown;
    };
    if node.as_text() == Some("crosstab") {
        crosstab(table);
    }
    let depth = |each: &str| each.split('/').filter(|name| !name.is_empty()).count();
    let each = table.get("each").and_then(|node| node.as_text());
    let xml = Shape::Xml(each.filter(|each| is_each(each)).map_or(usize::MAX, depth));
    node.word(&[
        ("table", Shape::Table),
        ("crosstab", Shape::Table),
        ("xml", xml),
        ("qif", Shape::Qif(None)),
    ])
    .unwrap_or(Shape::Unknown)
}

/// The form, and the rows of headings below the first.
fn form(table: &Table<'_>, shape: Shape, decimal: Option<char>) -> Option<(Form, u32)> {
    let of_tables = ("table", "an XML export");
    let of_xml = ("xml", "a table");
    for (key, (form, others)) in [
        ("sheet", of_tables),
        ("header", of_tables),
        ("delimiter", of_tables),
        ("line_breaks", of_tables),
        ("each", of_xml),
    ] {
        let fits = match shape {
            Shape::Table => form == "table",
            Shape::Xml(_) => form == "xml",
            Shape::Qif(_) | Shape::Unknown => true,
        };
        if let Some(node) = table.get(key)
            && !fits
        {
            node.place.fault_hint(
                format!("`{key}`"),
                format!("a key of {others}"),
                format!("`{key}` needs form = \"{form}\""),
            );
        }
    }
    match shape {
        Shape::Table => {
            let sheet = table.or("sheet", Sheet::First, |node| sheet(node));
            let header = table.or("header", (Header::Row(1), 0), |node| header(node));
            let delimiter = table.optional("delimiter", |node| delimiter(node, decimal));
            let (header, further_headings) = header?;
            let form = Form::Table {
                sheet: sheet?,
                header,
                delimiter: delimiter?,
            };
            Some((form, further_headings))
        }
        Shape::Xml(_) => {
            let node = table.need(
                "each",
                "the path of the element that holds one reading, such as \"/export/run/feature\"",
            )?;
            let each = node.text()?;
            if !is_each(each) {
                node.fault_hint(
                    "an absolute path of element names such as \"/export/run/feature\"",
                    "element names stand without a prefix",
                );
                return None;
            }
            let each = each.to_owned();
            Some((Form::Xml { each }, 0))
        }
        Shape::Qif(_) | Shape::Unknown => None,
    }
}

fn sheet(node: &Node<'_>) -> Option<Sheet> {
    if node.is_table() {
        let table = node.table("a table such as { matches = '^bore' }")?;
        let regex = table
            .need(
                "matches",
                "a regular expression for the names of the sheets",
            )
            .and_then(|node| regex(&node, usize::MAX));
        table.finish();
        return Some(Sheet::Matching(regex?.as_str().to_owned()));
    }
    Some(match node.name()? {
        "every" => Sheet::Every,
        name => Sheet::Named(name.to_owned()),
    })
}

pub(crate) fn find(node: &Node<'_>) -> Option<Find> {
    let table = node.table("a table such as { find = \"End of report\" }")?;
    let text = table
        .need("find", "the text to look for")
        .and_then(|node| node.name());
    table.finish();
    Some(Find {
        find: text?.to_owned(),
    })
}

fn delimiter(node: &Node<'_>, decimal: Option<char>) -> Option<char> {
    let text = node.text()?;
    let mut characters = text.chars();
    let one = characters.next().filter(|_| characters.next().is_none());
    let sound = one.filter(|c| {
        *c == '\t' || (c.is_ascii_punctuation() && !"\"'.-+".contains(*c)) || *c == ' '
    });
    if sound.is_none() {
        node.fault("one character such as \";\", \",\" or \"\\t\"");
    } else if sound == decimal {
        node.fault_hint(
            "another character than the decimal mark",
            "with a decimal comma, fields are mostly delimited by \";\"",
        );
        return None;
    }
    sound
}

/// The mark between groups of three digits.
fn thousands(node: &Node<'_>, decimal: Option<char>) -> Option<char> {
    let mut characters = node.text()?.chars();
    let one = characters.next().filter(|_| characters.next().is_none());
    let Some(mark) = one.filter(|mark| THOUSANDS.contains(mark)) else {
        node.fault_hint(
            r#"one of ".", ",", " " and "'""#,
            "a blank stands for any blank, no-break and narrow ones too",
        );
        return None;
    };
    if Some(mark) == decimal {
        node.fault("another mark than the decimal mark");
        return None;
    }
    Some(mark)
}

pub(crate) fn trial(node: &Node<'_>, shape: Shape) -> Option<Trial> {
    let table = role_table(node)?;
    let Some(count) = table.get("count") else {
        let role = role_in(&table, shape);
        table.finish();
        return role.map(Trial::Stated);
    };
    if let Some(place) = PLACES.into_iter().find(|place| table.get(place).is_some()) {
        count
            .place
            .fault(format!("`count` beside `{place}`"), "one of the two");
        return None;
    }
    table.finish();
    count
        .word(&[("taken", Count::Taken), ("order", Count::Order)])
        .map(Trial::Counted)
}

pub(crate) fn limit(
    node: &Node<'_>,
    shape: Shape,
    has_nominal: bool,
    is_lower: bool,
) -> Option<Limit> {
    let table = role_table(node)?;
    let role = role_in(&table, shape);
    let from = table.optional("from", |node| node.word(&[("nominal", ())]));
    let sign = table.optional("sign", |node| node.word(&[("left out", ())]));
    table.finish();
    let (from, sign) = (from?, sign?);
    if let Some(node) = table.get("sign")
        && (from.is_none() || !is_lower)
    {
        node.fault_hint(
            "the sign of a lower limit with from = \"nominal\"",
            "it says that 0.01 means 0.01 below the nominal",
        );
        return None;
    }
    if let Some(node) = table.get("from")
        && !has_nominal
    {
        node.fault_hint(
            "the role `nominal` beside it",
            "say where `nominal` comes from",
        );
        return None;
    }
    Some(Limit {
        role: role?,
        from_nominal: from.is_some(),
        unsigned: sign.is_some(),
    })
}

/// Roles whose names the user chooses; none is reserved or one of `others`.
pub(crate) fn named_roles(
    node: &Node<'_>,
    shape: Shape,
    others: &BTreeMap<String, Role>,
) -> Option<BTreeMap<String, Role>> {
    let table = node.table(
        "a table of names and where each comes from, such as { fixture = { cell = \"B7\" } }",
    )?;
    let mut roles: BTreeMap<String, Role> = BTreeMap::new();
    let mut sound = true;
    for (name, node) in table.named() {
        let is_same = |other: &str| fold(other) == fold(name);
        if fold(name).is_empty()
            || name.chars().any(char::is_control)
            || RESERVED.into_iter().any(is_same)
        {
            node.place.fault(
                format!("the name `{}`", shortened(name)),
                "a name that is not a role's own",
            );
            sound = false;
        }
        if roles
            .keys()
            .chain(others.keys())
            .any(|other| is_same(other))
        {
            node.place.fault(
                format!("the name `{}` again", shortened(name)),
                "each name once among `factors` and `same`",
            );
            sound = false;
        }
        match role(&node, shape) {
            Some(role) => {
                roles.insert(name.to_owned(), role);
            }
            None => sound = false,
        }
    }
    sound.then_some(roles)
}

pub(crate) fn texts(node: &Node<'_>) -> Option<Vec<String>> {
    let expected = "texts that mean \"no value\", such as [\"---\", \"9999\"]; \"\" is a blank";
    let mut texts: Vec<String> = Vec::new();
    for node in node.list(expected)? {
        let text = node.text()?;
        if texts.iter().any(|other| fold(other) == fold(text)) {
            node.fault("each entry once");
        } else {
            texts.push(text.to_owned());
        }
    }
    Some(texts)
}

pub(crate) fn encoding(node: &Node<'_>) -> Option<String> {
    let label = node.text()?;
    if encoding_rs::Encoding::for_label_no_replacement(label.as_bytes()).is_none() {
        node.fault("the name of an encoding, such as \"windows-1252\"");
        return None;
    }
    Some(label.to_owned())
}
