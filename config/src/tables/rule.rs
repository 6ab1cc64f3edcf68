//! `[instrument.read]`: how one instrument's exports are read.

use std::collections::BTreeMap;

use jiff::fmt::strtime;
use restudy_parsers::{
    Bounds, Count, Find, Form, Header, Limit, Role, Rule, Sheet, Taken, Trial, Value,
};

use crate::checked::Site;
use crate::names::fold;
use crate::place::is_each;
use crate::tables::role::{PLACES, Shape, role, role_in, table as role_table};
use crate::tables::site::zone;
use crate::walk::{Node, Table};

/// Names that mean a role of their own and so cannot name a further factor.
const RESERVED: [&str; 6] = [
    "part",
    "appraiser",
    "trial",
    "taken",
    "round",
    "characteristic",
];

pub(crate) fn rule(table: &Table<'_>, site: Option<&Site>) -> Option<Rule> {
    let shape = shape(table);
    let decimal = table
        .get("decimal")
        .map_or(Some('.'), |node| node.word(&[(".", '.'), (",", ',')]));
    let form = form(table, shape, decimal);
    let part = table
        .need("part", "where the part's name comes from")
        .and_then(|node| role(&node, shape));
    let appraiser = optional(table, "appraiser", |node| role(node, shape));
    let trial = optional(table, "trial", |node| trial(node, shape));
    let taken = optional(table, "taken", |node| taken(node, shape, site));
    let round = optional(table, "round", |node| role(node, shape));
    let characteristic = optional(table, "characteristic", |node| role(node, shape));
    let value = table
        .need("value", "where the measured value comes from")
        .and_then(|node| value(&node, shape));
    let nominal = optional(table, "nominal", |node| role(node, shape));
    let has_nominal = table.get("nominal").is_some();
    let lower = optional(table, "lower", |node| limit(node, shape, has_nominal));
    let upper = optional(table, "upper", |node| limit(node, shape, has_nominal));
    let factors = table.get("factors").map_or(Some(BTreeMap::new()), |node| {
        named_roles(&node, shape, &BTreeMap::new())
    });
    let known = factors.clone().unwrap_or_default();
    let same = table.get("same").map_or(Some(BTreeMap::new()), |node| {
        named_roles(&node, shape, &known)
    });
    let end = optional(table, "end", find);
    let no_value = table
        .get("no_value")
        .map_or(Some(Vec::new()), |node| texts(&node));
    let encoding = optional(table, "encoding", encoding);
    table.later(&[
        "skip",
        "keep",
        "fill_down",
        "thousands",
        "bounds",
        "zone",
        "layout",
        "blocks",
        "units_row",
        "repeat_header",
        "units",
        "dates",
        "line_breaks",
    ]);
    table.finish();

    if matches!(trial, Some(Some(Trial::Counted(Count::Taken)))) && table.get("taken").is_none() {
        table.place_of("trial").fault_hint(
            "trials counted by time stamp, and no time stamp",
            "the role `taken`",
            "say where `taken` comes from, or count trials by order",
        );
        return None;
    }
    Some(Rule {
        form: form?,
        part: part?,
        appraiser: appraiser?,
        trial: trial?,
        taken: taken?,
        round: round?,
        characteristic: characteristic?,
        value: value?,
        nominal: nominal?,
        lower: lower?,
        upper: upper?,
        factors: factors?,
        same: same?,
        end: end?,
        decimal: decimal?,
        no_value: no_value?,
        encoding: encoding?,
        bounds: Bounds::default(),
    })
}

/// What a key says, if it is there: `Some(None)` when it is not, `None` when it is faulty.
#[allow(clippy::option_option)]
fn optional<T>(
    table: &Table<'_>,
    key: &'static str,
    read: impl FnOnce(&Node<'_>) -> Option<T>,
) -> Option<Option<T>> {
    match table.get(key) {
        None => Some(None),
        Some(node) => read(&node).map(Some),
    }
}

fn shape(table: &Table<'_>) -> Shape {
    let Some(node) = table.need("form", "\"table\" or \"xml\"") else {
        return Shape::Unknown;
    };
    if let Some(later @ ("crosstab" | "qif")) = node.as_text() {
        node.place.fault(
            format!("`{later}`: not yet"),
            "a form of this version: \"table\" or \"xml\"",
        );
        return Shape::Unknown;
    }
    node.word(&[("table", Shape::Table), ("xml", Shape::Xml)])
        .unwrap_or(Shape::Unknown)
}

fn form(table: &Table<'_>, shape: Shape, decimal: Option<char>) -> Option<Form> {
    for (key, needed) in [
        ("sheet", Shape::Table),
        ("header", Shape::Table),
        ("delimiter", Shape::Table),
        ("each", Shape::Xml),
    ] {
        if let Some(node) = table.get(key)
            && shape != needed
            && shape != Shape::Unknown
        {
            let (form, others) = if needed == Shape::Table {
                ("table", "an XML export")
            } else {
                ("xml", "a table")
            };
            node.place.fault_hint(
                format!("`{key}`"),
                format!("a key of {others}"),
                format!("`{key}` needs form = \"{form}\""),
            );
        }
    }
    match shape {
        Shape::Table => {
            let sheet = table
                .get("sheet")
                .map_or(Some(Sheet::First), |node| sheet(&node));
            let header = table
                .get("header")
                .map_or(Some(Header::Row(1)), |node| header(&node));
            let delimiter = optional(table, "delimiter", |node| delimiter(node, decimal));
            Some(Form::Table {
                sheet: sheet?,
                header: header?,
                delimiter: delimiter?,
            })
        }
        Shape::Xml => {
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
            Some(Form::Xml {
                each: each.to_owned(),
            })
        }
        Shape::Unknown => None,
    }
}

fn sheet(node: &Node<'_>) -> Option<Sheet> {
    if node.as_text() == Some("every") {
        node.place
            .fault("`every`: not yet", "the name of one sheet");
        return None;
    }
    Some(Sheet::Named(node.name()?.to_owned()))
}

fn header(node: &Node<'_>) -> Option<Header> {
    if node.is_number() {
        return node.whole(1..=1 << 20, "a row").map(Header::Row);
    }
    if node.is_table() {
        return find(node).map(|find| Header::Find(find.find));
    }
    node.fault("the row of the headings, or { find = \"a heading\" }");
    None
}

fn find(node: &Node<'_>) -> Option<Find> {
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

fn trial(node: &Node<'_>, shape: Shape) -> Option<Trial> {
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

fn taken(node: &Node<'_>, shape: Shape, site: Option<&Site>) -> Option<Taken> {
    let table = role_table(node)?;
    let role = role_in(&table, shape);
    let format = optional(&table, "format", time_format);
    let own = optional(&table, "zone", zone);
    table.finish();
    let zone = own?.or_else(|| site.map(|site| site.zone.clone()));
    Some(Taken {
        role: role?,
        format: format?,
        zone: zone.and_then(|zone| zone.iana_name().map(str::to_owned)),
    })
}

/// A format that tells date, hour and minute apart: a sample written with it reads back.
fn time_format(node: &Node<'_>) -> Option<String> {
    let format = node.text()?;
    let expected = "a format of date and time such as \"%d.%m.%Y %H:%M\"";
    let sample = jiff::civil::date(2026, 11, 23).at(15, 47, 0, 0);
    let read = strtime::format(
        format,
        &sample.to_zoned_datetime(jiff::tz::TimeZone::UTC).ok()?,
    )
    .and_then(|text| {
        let time = strtime::parse(format, text)?;
        Ok((time.to_datetime(), time.hour().is_some()))
    });
    match read {
        Err(error) => node.fault_hint(expected, error.to_string()),
        Ok((Err(error), _)) => node.fault_hint(expected, error.to_string()),
        Ok((Ok(_), false)) => node.fault_hint(
            expected,
            "a date alone does not put the runs of a day in order",
        ),
        Ok((Ok(time), true)) if time != sample => {
            node.fault_hint(
                expected,
                format!(
                    "{} reads back as {}",
                    sample.strftime("%Y-%m-%d %H:%M"),
                    time.strftime("%Y-%m-%d %H:%M")
                ),
            );
        }
        Ok((Ok(_), true)) => return Some(format.to_owned()),
    }
    None
}

fn value(node: &Node<'_>, shape: Shape) -> Option<Value> {
    let table = role_table(node)?;
    let role = role_in(&table, shape);
    let unit = optional(&table, "unit", |node| unit(node, shape));
    table.finish();
    for key in ["path", "constant"] {
        if table.get(key).is_some() {
            table
                .place
                .fault(format!("`{key}`"), "a place inside the export");
            return None;
        }
    }
    Some(Value {
        role: role?,
        unit: unit?,
    })
}

fn unit(node: &Node<'_>, shape: Shape) -> Option<Role> {
    if node.is_table() {
        return role(node, shape);
    }
    Some(Role::plain(restudy_parsers::Cell::Constant(
        node.name()?.to_owned(),
    )))
}

fn limit(node: &Node<'_>, shape: Shape, has_nominal: bool) -> Option<Limit> {
    let table = role_table(node)?;
    let role = role_in(&table, shape);
    let from = optional(&table, "from", |node| node.word(&[("nominal", ())]));
    table.finish();
    let from = from?;
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
    })
}

/// Roles whose names the user chooses; none is reserved or one of `others`.
fn named_roles(
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
                format!("the name `{name}`"),
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
                format!("the name `{name}` again"),
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

fn texts(node: &Node<'_>) -> Option<Vec<String>> {
    let names = node.names("texts that mean \"no value\", such as [\"---\", \"9999\"]")?;
    Some(names.into_iter().map(|(text, _)| text.to_owned()).collect())
}

fn encoding(node: &Node<'_>) -> Option<String> {
    let label = node.text()?;
    if encoding_rs::Encoding::for_label_no_replacement(label.as_bytes()).is_none() {
        node.fault("the name of an encoding, such as \"windows-1252\"");
        return None;
    }
    Some(label.to_owned())
}
