//! A list of characteristics: delimited text with the headings name, nominal, lower, upper, unit, one_sided, special.
//!
//! The delimiter is the semicolon when the heading line has one, else the comma. Numbers have no thousands
//! mark; their decimal mark is the point or, between semicolons, the comma, one of the two throughout the list.

use restudy_engine::OneSided;

use crate::source::{Place, Source, shortened};
use crate::tables::characteristic::Draft;
use crate::tables::judging::{ONE_SIDED, OwnLimits};
use restudy_parsers::{fold, nearest};

const HEADINGS: [&str; 7] = [
    "name",
    "nominal",
    "lower",
    "upper",
    "unit",
    "one_sided",
    "special",
];

/// Every row that can be read, the others are told; `None` when there is none.
pub(crate) fn drafts<'a>(source: &'a Source<'a>) -> Option<Vec<Draft<'a>>> {
    let whole = Place {
        source,
        offset: 0,
        key: "the list of characteristics".to_owned(),
    };
    let text = source.text.strip_prefix('\u{feff}').unwrap_or(source.text);
    let skipped = source.text.len() - text.len();
    let first_line = text.lines().next().unwrap_or_default();
    let delimiter = if first_line.contains(';') { b';' } else { b',' };
    let mut reader = csv::ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .trim(csv::Trim::All)
        .delimiter(delimiter)
        .from_reader(text.as_bytes());
    let mut records = reader.records();
    let Some(Ok(headings)) = records.next() else {
        whole.fault(
            "an empty list",
            format!("a line of headings: {}", HEADINGS.join(", ")),
        );
        return None;
    };
    let columns = columns(&headings, &whole)?;
    let mut mark = (delimiter == b',').then_some('.');
    let mut drafts = Vec::new();
    for record in records {
        let record = match record {
            Ok(record) => record,
            Err(_) => {
                whole.fault("a line that cannot be split into fields", "delimited text");
                continue;
            }
        };
        let offset = record
            .position()
            .map_or(0, |position| usize::try_from(position.byte()).unwrap_or(0));
        // The reader's position is where it began to look: line ends may still stand before the row.
        let begin = text.get(offset..).map_or(0, |rest| {
            rest.len() - rest.trim_start_matches(['\r', '\n']).len()
        });
        let place = whole.clone().at(skipped + offset + begin);
        if record.iter().all(str::is_empty) {
            continue;
        }
        if record.len() > headings.len() || record.iter().any(|field| field.contains(['\n', '\r']))
        {
            place.fault_hint(
                format!("{} fields, the first `{}`", record.len(), shortened(record.get(0).unwrap_or_default())),
                format!("up to {} fields on one line", headings.len()),
                "a quotation mark is closed on its own line, and a field that holds the delimiter stands in quotation marks",
            );
            continue;
        }
        let field = |heading: &str| {
            columns
                .iter()
                .find(|(name, _)| *name == heading)
                .and_then(|(_, index)| record.get(*index))
                .filter(|text| !text.is_empty())
        };
        drafts.extend(row(&place, field, &mut mark));
    }
    if drafts.is_empty() {
        whole.fault("no characteristic", "at least one row below the headings");
        return None;
    }
    Some(drafts)
}

/// Index of each known heading; unknown and repeated ones are told.
fn columns(headings: &csv::StringRecord, place: &Place<'_>) -> Option<Vec<(&'static str, usize)>> {
    let mut columns: Vec<(&str, usize)> = Vec::new();
    let mut sound = true;
    for (index, heading) in headings.iter().enumerate() {
        let known = HEADINGS
            .into_iter()
            .find(|known| fold(known) == fold(heading));
        match known {
            Some(name) if columns.iter().any(|(other, _)| *other == name) => {
                place.fault(format!("the heading `{name}` twice"), "each heading once");
                sound = false;
            }
            Some(name) => columns.push((name, index)),
            None => {
                let found = format!("the heading `{}`", shortened(heading));
                place.fault_nearest(
                    found,
                    format!("one of {}", HEADINGS.join(", ")),
                    nearest(heading, HEADINGS),
                );
                sound = false;
            }
        }
    }
    if sound && !columns.iter().any(|(name, _)| *name == "name") {
        place.fault(
            "no heading `name`",
            format!("the headings {}; `name` at least", HEADINGS.join(", ")),
        );
        sound = false;
    }
    sound.then_some(columns)
}

fn row<'a, 't>(
    place: &Place<'a>,
    field: impl Fn(&str) -> Option<&'t str>,
    mark: &mut Option<char>,
) -> Option<Draft<'a>> {
    let Some(name) = field("name") else {
        place.fault("no name", "the characteristic's name as in the exports");
        return None;
    };
    let place = Place {
        key: format!("characteristic \"{}\"", shortened(name)),
        ..place.clone()
    };
    if name.chars().any(char::is_control) {
        place.fault("a control character in the name", "a text on one line");
        return None;
    }
    let mut number = |heading: &str| number(&place.below(heading), field(heading)?, mark);
    Some(Draft {
        nominal: number("nominal"),
        lower: number("lower"),
        upper: number("upper"),
        name: name.to_owned(),
        unit: field("unit").map(str::to_owned),
        one_sided: field("one_sided")
            .and_then(|text| one_sided(&place.below("one_sided"), text, mark)),
        special: field("special").and_then(|text| special(&place.below("special"), text)),
        limits: OwnLimits::default(),
        process: None,
        places: Vec::new(),
        place,
    })
}

/// A finite number with the list's decimal mark, which the first number that has one decides.
fn number(place: &Place<'_>, text: &str, mark: &mut Option<char>) -> Option<f64> {
    let used = text.chars().find(|c| *c == '.' || *c == ',');
    let decides = mark.is_none() && used.is_some();
    let mark_here = (*mark).or(used).unwrap_or('.');
    let plain = text
        .bytes()
        .all(|b| b.is_ascii_digit() || b"+-eE".contains(&b) || char::from(b) == mark_here);
    let number = Some(text.replace(mark_here, "."))
        .filter(|_| plain)
        .and_then(|text| text.parse::<f64>().ok())
        .filter(|number| number.is_finite());
    match number {
        Some(_) if decides => *mark = used,
        Some(_) => {}
        None => place.fault_hint(
            format!("`{}`", shortened(text)),
            format!("a number; this list's decimal mark is `{mark_here}`"),
            "numbers stand without unit and thousands mark; with a decimal comma the list is delimited by semicolons",
        ),
    }
    number
}

fn one_sided(place: &Place<'_>, text: &str, mark: &mut Option<char>) -> Option<Option<OneSided>> {
    if let Some((_, rule)) = ONE_SIDED.iter().find(|(word, _)| fold(word) == fold(text)) {
        return Some(*rule);
    }
    if let Some(width) = text
        .strip_prefix("width")
        .and_then(|rest| rest.trim_start().strip_prefix('='))
    {
        let width = number(place, width.trim(), mark)?;
        if width > 0.0 {
            return Some(Some(OneSided::Width(width)));
        }
    }
    let known = ONE_SIDED
        .iter()
        .map(|(word, _)| *word)
        .collect::<Vec<_>>()
        .join(", ");
    place.fault(
        format!("`{}`", shortened(text)),
        format!("{known} or width = 0.05"),
    );
    None
}

fn special(place: &Place<'_>, text: &str) -> Option<bool> {
    match fold(text).as_str() {
        "yes" | "true" => Some(true),
        "no" | "false" => Some(false),
        _ => {
            place.fault(format!("`{}`", shortened(text)), "yes or no");
            None
        }
    }
}
