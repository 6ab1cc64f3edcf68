//! The role `taken`: when a run was measured.

use jiff::fmt::strtime;
use jiff::tz::TimeZone;
use restudy_parsers::{Epoch, Taken};

use crate::checked::Site;
use crate::tables::role::{Shape, role_in, table as role_table};
use crate::tables::site::zone;
use crate::walk::Node;

/// The role with its format, or the year its numbers count from, and the zone that the instrument writes in; times are shown in the site's.
pub(crate) fn taken(node: &Node<'_>, shape: Shape, site: Option<&Site>) -> Option<Taken> {
    let table = role_table(node)?;
    let role = role_in(&table, shape);
    let format = table.optional("format", time_format);
    let dates = table.optional("dates", |node| {
        node.word(&[("1900", Epoch::Of1900), ("1904", Epoch::Of1904)])
    });
    let written_in = table.optional("zone", zone);
    table.finish();
    if let Some(dates) = table.get("dates")
        && table.get("format").is_some()
    {
        dates.place.fault(
            "`dates` beside `format`",
            "one of the two: numbers of days, or texts",
        );
        return None;
    }
    let name = |zone: &TimeZone| zone.iana_name().map(str::to_owned);
    Some(Taken {
        role: role?,
        format: format?,
        dates: dates?,
        written_in: written_in?.as_ref().and_then(name),
        shown_in: name(&site?.zone),
    })
}

/// A format that tells date, hour and minute apart: a sample written with it reads back.
fn time_format(node: &Node<'_>) -> Option<String> {
    let format = node.text()?;
    let expected = "a format of date and time such as \"%d.%m.%Y %H:%M\"";
    let sample = jiff::civil::date(2026, 11, 23).at(15, 47, 0, 0);
    let Ok(text) = strtime::format(format, &sample.to_zoned_datetime(TimeZone::UTC).ok()?) else {
        node.fault_hint(expected, "`%` stands before a letter that means a part of the time: %d day, %m month, %Y year, %H hour, %M minute, %S second");
        return None;
    };
    let read = strtime::parse(format, &text).ok();
    let time = read.as_ref().and_then(|read| read.to_datetime().ok());
    let has_hour = read.is_some_and(|read| read.hour().is_some());
    match time {
        Some(time) if has_hour && time == sample => return Some(format.to_owned()),
        Some(_) if !has_hour => {
            node.fault_hint(
                expected,
                "a date alone does not put the runs of a day in order",
            );
        }
        Some(time) => node.fault_hint(
            expected,
            format!(
                "{} reads back as {}",
                sample.strftime("%Y-%m-%d %H:%M"),
                time.strftime("%Y-%m-%d %H:%M")
            ),
        ),
        None => node.fault_hint(
            expected,
            format!("`{text}`, written with it, does not tell year, month, day, hour and minute"),
        ),
    }
    None
}
