//! XML of unknown layout: the element that repeats once a reading, and the texts in and about it.
//!
//! The record is the outermost element of those that are met most often and hold a value: a leaf that a word of
//! the trade calls one, else any number. A leaf belongs to a record when it is met no more often than that.

use std::collections::BTreeMap;

use quick_xml::events::{BytesStart, Event};
use quick_xml::reader::Reader;
use restudy_parsers::Refused;

use super::number::is_number;
use super::sample::{Datum, Dress, Place, Sample, Spot};
use super::words::{self, Meaning};

/// Elements may nest so deep.
const DEPTH_MAX: usize = 64;
/// Different paths that are kept.
const PATHS_MAX: usize = 4096;

/// Everything met at one path.
#[derive(Debug, Default)]
struct Met {
    count: usize,
    /// Texts of leaf elements or attributes.
    texts: Vec<String>,
    /// Beside each text, the ordinals of the elements it stands in, from the root.
    within: Vec<Vec<usize>>,
    /// First met as the so-manieth path.
    order: usize,
}

/// An element that has not ended yet.
#[derive(Debug, Default)]
struct Open {
    name: String,
    text: String,
    has_children: bool,
    /// Among the elements at its path, from 0.
    ordinal: usize,
}

type Paths = BTreeMap<Vec<String>, Met>;

pub(super) fn sample(
    file: &str,
    text: &str,
    encoding: Option<&'static str>,
) -> Result<Sample, Refused> {
    let paths = walk(text)?;
    let Some(each) = record(&paths) else {
        return Err(refusal("no element of this XML holds a number".into()));
    };
    let records = paths.get(&each).map_or(0, |met| met.count);
    Ok(Sample {
        file: file.to_owned(),
        spots: spots(&paths, &each, records),
        dress: Dress::Xml {
            each: shown(&each),
            records,
            encoding,
        },
        end: None,
    })
}

fn refusal(sentence: String) -> Refused {
    Refused {
        sentence,
        hint: None,
        perhaps_unfinished: false,
    }
}

/// Paths of local names with what was met there; an attribute's name begins with `@`.
fn walk(text: &str) -> Result<Paths, Refused> {
    let mut reader = Reader::from_str(text);
    let mut paths = Paths::new();
    let mut open: Vec<Open> = Vec::new();
    loop {
        let event = reader
            .read_event()
            .map_err(|e| refusal(format!("this is no well-formed XML: {e}")))?;
        match event {
            Event::Start(element) => enter(&element, &mut open, &mut paths)?,
            Event::Empty(element) => {
                enter(&element, &mut open, &mut paths)?;
                leave(&mut open, &mut paths);
            }
            Event::End(_) => leave(&mut open, &mut paths),
            Event::Text(piece) => {
                if let Some(own) = open.last_mut() {
                    own.text.push_str(&piece.xml10_content());
                }
            }
            Event::CData(piece) => {
                if let Some(own) = open.last_mut() {
                    own.text.push_str(&piece.xml10_content());
                }
            }
            Event::GeneralRef(name) => {
                let known = match &*name {
                    "lt" => Some('<'),
                    "gt" => Some('>'),
                    "amp" => Some('&'),
                    "apos" => Some('\''),
                    "quot" => Some('"'),
                    _ => name.resolve_char_ref().ok().flatten(),
                };
                if let (Some(own), Some(known)) = (open.last_mut(), known) {
                    own.text.push(known);
                }
            }
            Event::DocType(_) => {
                return Err(refusal(
                    "it declares a document type, which is never read".into(),
                ));
            }
            Event::Eof => break,
            Event::Comment(_) | Event::Decl(_) | Event::PI(_) => {}
        }
    }
    match open.last() {
        Some(Open { name, .. }) => Err(refusal(format!(
            "it ends inside the element `{name}`: is it whole?"
        ))),
        None => Ok(paths),
    }
}

fn enter(element: &BytesStart<'_>, open: &mut Vec<Open>, paths: &mut Paths) -> Result<(), Refused> {
    if open.len() >= DEPTH_MAX || paths.len() >= PATHS_MAX {
        return Err(refusal(format!(
            "more than {DEPTH_MAX} elements deep, or more than {PATHS_MAX} different paths"
        )));
    }
    if let Some(about) = open.last_mut() {
        about.has_children = true;
    }
    open.push(Open {
        name: element.local_name().as_ref().to_owned(),
        ..Open::default()
    });
    let path = path_of(open);
    let order = paths.len();
    let met = paths.entry(path.clone()).or_default();
    met.count += 1;
    if met.count == 1 {
        met.order = order;
    }
    let ordinal = met.count - 1;
    if let Some(own) = open.last_mut() {
        own.ordinal = ordinal;
    }
    for attribute in element.attributes() {
        let attribute =
            attribute.map_err(|e| refusal(format!("this is no well-formed XML: {e}")))?;
        let name = attribute.key.as_ref();
        if name.starts_with("xmlns") || name.starts_with("xsi:") {
            continue;
        }
        let mut path = path.clone();
        path.push(format!("@{}", attribute.key.local_name().as_ref()));
        let order = paths.len();
        let met = paths.entry(path).or_default();
        met.count += 1;
        if met.count == 1 {
            met.order = order;
        }
        let value = quick_xml::escape::unescape(&attribute.value);
        met.texts
            .push(value.map_or_else(|_| attribute.value.to_string(), String::from));
        met.within.push(ordinals(open));
    }
    Ok(())
}

fn leave(open: &mut Vec<Open>, paths: &mut Paths) {
    let path = path_of(open);
    let within = ordinals(open);
    if let Some(own) = open.pop()
        && !own.has_children
        && let Some(met) = paths.get_mut(&path)
    {
        met.texts.push(own.text.trim().to_owned());
        met.within.push(within);
    }
}

fn path_of(open: &[Open]) -> Vec<String> {
    open.iter().map(|own| own.name.clone()).collect()
}

fn ordinals(open: &[Open]) -> Vec<usize> {
    open.iter().map(|own| own.ordinal).collect()
}

fn is_leaf(met: &Met) -> bool {
    met.texts.len() == met.count && met.texts.iter().any(|text| !text.is_empty())
}

fn shown(path: &[String]) -> String {
    path.iter().flat_map(|name| ["/", name.as_str()]).collect()
}

/// The path of the element that holds one reading.
fn record(paths: &Paths) -> Option<Vec<String>> {
    let candidates = paths.iter().filter(|(path, _)| !is_attribute(path));
    let holding = |is_value: &dyn Fn(&[String], &Met) -> bool| {
        candidates
            .clone()
            .filter(|(path, own)| {
                paths.iter().any(|(leaf, met)| {
                    leaf.starts_with(path)
                        && (leaf.len() > path.len() || has_attributes(paths, path))
                        && met.count <= own.count
                        && is_leaf(met)
                        && is_value(leaf, met)
                })
            })
            .max_by_key(|(path, met)| (met.count, std::cmp::Reverse(path.len())))
            .map(|(path, _)| path.clone())
    };
    let numeric = |met: &Met| met.texts.iter().any(|text| is_number(text));
    let named = |path: &[String]| {
        names(path).iter().any(|name| {
            words::meanings(name)
                .iter()
                .any(|(_, m)| *m == Meaning::Value)
        })
    };
    holding(&|path, met| named(path) && numeric(met)).or_else(|| holding(&|_, met| numeric(met)))
}

fn has_attributes(paths: &Paths, path: &[String]) -> bool {
    paths.keys().any(|other| {
        is_attribute(other) && other.len() == path.len() + 1 && other.starts_with(path)
    })
}

fn is_attribute(path: &[String]) -> bool {
    path.last().is_some_and(|name| name.starts_with('@'))
}

/// What a leaf may be called: its own name, the one of the element about it, and both.
fn names(path: &[String]) -> Vec<String> {
    let own = path.last().map_or("", |name| name.trim_start_matches('@'));
    let about = path.len().checked_sub(2).and_then(|at| path.get(at));
    let own_words = words::of_name(own);
    match about {
        Some(about) => {
            let about = words::of_name(about);
            vec![own_words.clone(), format!("{about} {own_words}"), about]
        }
        None => vec![own_words],
    }
}

fn spots(paths: &Paths, each: &[String], records: usize) -> Vec<Spot> {
    let mut leaves: Vec<(&Vec<String>, &Met)> =
        paths.iter().filter(|(_, met)| is_leaf(met)).collect();
    leaves.sort_by_key(|(_, met)| met.order);
    leaves
        .into_iter()
        .filter_map(|(path, met)| {
            let shared = path.iter().zip(each).take_while(|(a, b)| a == b).count();
            let owner = each.get(..shared)?;
            let owners = paths.get(owner)?.count;
            if met.count > owners {
                return None;
            }
            let rest = path.get(shared..)?.join("/");
            let place = match each.len() - shared {
                0 if rest.is_empty() => ".".to_owned(),
                0 => rest,
                up if shared > 1 => format!("{}{rest}", "../".repeat(up)),
                _ => shown(path),
            };
            Some(Spot {
                place: Place::Xml(place),
                names: names(path),
                values: values(met, each, shared, records),
                once: met.count == 1 && records > 1,
                twice: false,
            })
        })
        .collect()
}

/// What stands there: one content a record when it stands within the record, else as met.
fn values(met: &Met, each: &[String], shared: usize, records: usize) -> Vec<Datum> {
    let datum = |text: &String| match text.trim() {
        "" => Datum::Blank,
        text => Datum::Text(text.to_owned()),
    };
    if shared < each.len() {
        return met.texts.iter().map(datum).collect();
    }
    let mut values = vec![Datum::Blank; records];
    for (text, within) in met.texts.iter().zip(&met.within) {
        let record = within.get(each.len() - 1).copied();
        if let Some(place) = record.and_then(|record| values.get_mut(record)) {
            *place = datum(text);
        }
    }
    values
}

#[cfg(test)]
mod tests {
    use super::*;

    fn places(text: &str) -> (String, Vec<String>) {
        let sample = sample("a.xml", text, None).unwrap();
        let Dress::Xml { each, .. } = sample.dress else {
            panic!("no XML")
        };
        let place = |spot: Spot| match spot.place {
            Place::Xml(path) => path,
            other => panic!("{other:?}"),
        };
        (each, sample.spots.into_iter().map(place).collect())
    }

    #[test]
    fn the_record_is_what_repeats_with_a_value() {
        let text = r#"<e xmlns:a="urn:a" id="3"><head><who>K &amp; L</who></head>
            <a:run part="P1"><f name="bore"><v><value>1.5</value></v></f><f name="pin"><v><value>2.5</value></v></f>
              <points><p>1</p><p>2</p><p>3</p></points></a:run></e>"#;
        let (each, spots) = places(text);
        assert_eq!(each, "/e/run/f");
        assert_eq!(
            spots,
            ["/e/@id", "/e/head/who", "../@part", "@name", "v/value"]
        );
    }

    #[test]
    fn without_a_word_the_most_repeated_number_decides() {
        let (each, _) = places("<a><b><q>1.5</q></b><b><q>1.6</q></b><c>x</c><c>y</c><c>z</c></a>");
        assert_eq!(each, "/a/b");
    }

    #[test]
    fn a_record_may_be_the_value_itself() {
        let (each, spots) = places("<a><m part='P1'>1.5</m><m part='P2'>1.6</m></a>");
        assert_eq!(
            (each.as_str(), spots),
            ("/a/m", vec![".".to_owned(), "@part".to_owned()])
        );
    }

    #[test]
    fn contents_stand_beside_their_record() {
        let text = "<a><r><value>1</value></r><r id='b'><value>2</value><up>3</up></r></a>";
        let sample = sample("a.xml", text, None).unwrap();
        for (at, place, text) in [(1, "@id", "b"), (2, "up", "3")] {
            assert_eq!(sample.spots[at].place, Place::Xml(place.into()));
            let expected = [Datum::Blank, Datum::Text(text.into())];
            assert_eq!(sample.spots[at].values, expected);
        }
    }

    #[test]
    fn what_is_no_whole_document_is_refused() {
        for text in [
            "<a><b>1</b>",
            "<a>x</a>",
            "<!DOCTYPE a><a>1</a>",
            "<a><b></a>",
        ] {
            assert!(sample("a.xml", text, None).is_err(), "{text}");
        }
        let deep = "<a>".repeat(100);
        assert!(sample("a.xml", &deep, None).is_err());
    }
}
