//! The role `taken`: when a run was measured.

use jiff::fmt::strtime;
use restudy_parsers::Taken;

use crate::checked::Site;
use crate::tables::role::{Shape, role_in, table as role_table};
use crate::tables::site::zone;
use crate::walk::Node;

/// The role with its format and zone; times with an offset are shown in the site's zone unless another is named.
pub(crate) fn taken(node: &Node<'_>, shape: Shape, site: Option<&Site>) -> Option<Taken> {
    let table = role_table(node)?;
    let role = role_in(&table, shape);
    let format = table.optional("format", time_format);
    let own = table.optional("zone", zone);
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
