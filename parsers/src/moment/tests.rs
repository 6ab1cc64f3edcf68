//! Formats, zones, serial numbers.

use super::*;
use crate::grid::Place;
use crate::rule::{Cell, Role};

fn clock(format: Option<&str>, written_in: Option<&str>, shown_in: Option<&str>) -> Clock {
    Clock::new(&taken(format, written_in, shown_in), Marks::PLAIN).unwrap()
}

fn taken(format: Option<&str>, written_in: Option<&str>, shown_in: Option<&str>) -> Taken {
    Taken {
        role: Role::plain(Cell::Column("taken".to_owned())),
        format: format.map(str::to_owned),
        dates: None,
        written_in: written_in.map(str::to_owned),
        shown_in: shown_in.map(str::to_owned),
    }
}

fn read(format: Option<&str>, shown_in: Option<&str>, text: &str) -> String {
    read_by(&clock(format, None, shown_in), text)
}

fn read_by(clock: &Clock, text: &str) -> String {
    let content = Content::Text(text.into());
    let field = Field {
        place: Place::Field { line: 3, field: 2 },
        content: &content,
    };
    match clock.read(field, Some(text)) {
        Ok(time) => time.to_string(),
        Err(fault) => fault.sentence(),
    }
}

#[test]
fn iso_times_need_no_format() {
    assert_eq!(
        read(None, None, "2026-06-02T14:20:05"),
        "2026-06-02T14:20:05"
    );
    assert_eq!(
        read(None, None, "2026-06-02 14:20:05.1234567"),
        "2026-06-02T14:20:05.123"
    );
    assert_eq!(
        read(None, None, "2026-06-02T14:20:05+02:00"),
        "2026-06-02T14:20:05"
    );
    assert_eq!(read(None, None, "2026-06-02"), "2026-06-02T00:00:00");
}

/// Oslo is one hour ahead of UTC in winter, two in summer.
#[test]
fn an_offset_is_shown_in_the_named_zone() {
    let oslo = Some("Europe/Oslo");
    assert_eq!(
        read(None, oslo, "2026-06-02T12:20:05Z"),
        "2026-06-02T14:20:05"
    );
    assert_eq!(
        read(None, oslo, "2026-01-02T12:20:05Z"),
        "2026-01-02T13:20:05"
    );
    assert_eq!(
        read(None, oslo, "2026-06-02T14:20:05"),
        "2026-06-02T14:20:05"
    );
    let format = Some("%d.%m.%Y %H:%M %z");
    assert_eq!(
        read(format, oslo, "02.06.2026 12:20 +0000"),
        "2026-06-02T14:20:00"
    );
}

#[test]
fn the_format_decides_what_comes_first() {
    assert_eq!(
        read(Some("%d/%m/%Y %H:%M"), None, "03/04/2026 09:12"),
        "2026-04-03T09:12:00"
    );
    assert_eq!(
        read(Some("%m/%d/%Y %H:%M"), None, "03/04/2026 09:12"),
        "2026-03-04T09:12:00"
    );
    assert_eq!(
        read(Some("%d.%m.%y"), None, "03.04.26"),
        "2026-04-03T00:00:00"
    );
}

#[test]
fn a_year_of_two_digits_under_a_four_digit_format_is_no_year() {
    let answer = read(Some("%d.%m.%Y"), None, "03.04.26");
    assert!(
        answer.contains("outside the years 1990 to 2100"),
        "{answer}"
    );
}

/// Oslo is two hours ahead of UTC in summer, Tokyo nine all the year.
#[test]
fn a_stamp_without_offset_is_read_by_the_clock_that_wrote_it() {
    let utc = clock(None, Some("UTC"), Some("Europe/Oslo"));
    assert_eq!(read_by(&utc, "2026-06-02T12:20:05"), "2026-06-02T14:20:05");
    assert_eq!(
        read_by(&utc, "2026-06-02T12:20:05+09:00"),
        "2026-06-02T05:20:05"
    );
    let tokyo = clock(
        Some("%d.%m.%Y %H:%M"),
        Some("Asia/Tokyo"),
        Some("Europe/Oslo"),
    );
    assert_eq!(read_by(&tokyo, "02.06.2026 03:00"), "2026-06-01T20:00:00");
    let cell = Content::Date(civil::date(2026, 6, 2).at(12, 20, 5, 0));
    let field = Field {
        place: Place::Rule,
        content: &cell,
    };
    assert_eq!(
        utc.read(field, None).unwrap().to_string(),
        "2026-06-02T14:20:05"
    );
    let unzoned = clock(None, None, Some("Europe/Oslo"));
    assert_eq!(
        read_by(&unzoned, "2026-06-02T12:20:05"),
        "2026-06-02T12:20:05"
    );
}

#[test]
fn a_day_alone_is_that_day_in_every_zone() {
    let tokyo = clock(None, Some("Asia/Tokyo"), Some("Europe/Oslo"));
    assert_eq!(read_by(&tokyo, "2026-06-02"), "2026-06-02T00:00:00");
    let tokyo = clock(Some("%d.%m.%Y"), Some("Asia/Tokyo"), Some("Europe/Oslo"));
    assert_eq!(read_by(&tokyo, "02.06.2026"), "2026-06-02T00:00:00");
}

/// Oslo sets its clocks forward at 02:00 on 2026-03-29 and back at 03:00 on 2026-10-25: the last
/// Sundays of March and October at 01:00 UTC (Directive 2000/84/EC).
#[test]
fn a_clock_that_was_set_back_means_the_earlier_time_and_one_set_forward_the_later() {
    let oslo = clock(None, Some("Europe/Oslo"), Some("UTC"));
    assert_eq!(read_by(&oslo, "2026-10-25T01:59"), "2026-10-24T23:59:00");
    assert_eq!(read_by(&oslo, "2026-10-25T02:30"), "2026-10-25T00:30:00");
    assert_eq!(read_by(&oslo, "2026-10-25T03:00"), "2026-10-25T02:00:00");
    assert_eq!(read_by(&oslo, "2026-03-29T02:30"), "2026-03-29T01:30:00");
}

#[test]
fn other_texts_are_named_in_our_own_words() {
    assert_eq!(
        read(None, None, "2 June 2026"),
        "line 3, field 2: `2 June 2026` is not a time as `2026-06-02T14:20:05`"
    );
    assert_eq!(
        read(Some("%d.%m.%Y %H:%M"), None, "2026-06-02 14:20"),
        "line 3, field 2: `2026-06-02 14:20` is not a time as `%d.%m.%Y %H:%M`, such as `02.06.2026 14:20`"
    );
    assert_eq!(
        read(Some("%d.%m.%Y %H:%M"), None, "31.02.2026 14:20"),
        "line 3, field 2: `31.02.2026 14:20` is not a time as `%d.%m.%Y %H:%M`, such as `02.06.2026 14:20`"
    );
}

#[test]
fn zones_that_cannot_be_used() {
    let wrong = |written_in, shown_in| {
        Clock::new(&taken(None, written_in, shown_in), Marks::PLAIN).is_err()
    };
    assert!(wrong(None, Some("Europe/Halden")));
    assert!(wrong(Some("Europe/Halden"), Some("UTC")));
    assert!(wrong(Some("UTC"), None));
}

fn by_number(dates: Epoch, content: &Content) -> String {
    let taken = Taken {
        dates: Some(dates),
        ..taken(None, None, None)
    };
    let comma = Marks {
        decimal: ',',
        thousands: None,
    };
    let field = Field {
        place: Place::Rule,
        content,
    };
    let text = match content {
        Content::Number(number) => Some(number.to_string()),
        Content::Text(text) => Some(text.to_string()),
        _ => None,
    };
    match Clock::new(&taken, comma)
        .unwrap()
        .read(field, text.as_deref())
    {
        Ok(time) => time.to_string(),
        Err(fault) => fault.wrong,
    }
}

/// 39448 is 1 January 2008 in the 1900 system; the 1904 system counts 1,462 days fewer. Source:
/// Microsoft's description of the function DATE and of the two date systems.
#[test]
fn a_serial_number_counts_from_the_year_that_the_rule_says() {
    let number = Content::Number;
    for (dates, serial, time) in [
        (Epoch::Of1900, 39448.0, "2008-01-01T00:00:00"),
        (Epoch::Of1904, 37986.0, "2008-01-01T00:00:00"),
        (Epoch::Of1900, 39448.75, "2008-01-01T18:00:00"),
        (
            Epoch::Of1900,
            39448.0 + 1.0 / 86400.0,
            "2008-01-01T00:00:01",
        ),
    ] {
        assert_eq!(by_number(dates, &number(serial)), time);
    }
    let text = |text: &str| Content::Text(text.into());
    assert_eq!(
        by_number(Epoch::Of1900, &text("39448,5")),
        "2008-01-01T12:00:00"
    );
    let date = civil::date(2026, 6, 2).at(14, 20, 5, 0);
    assert_eq!(
        by_number(Epoch::Of1904, &Content::Date(date)),
        "2026-06-02T14:20:05"
    );
    for (content, wrong) in [
        (number(60.0), "`60` is not a number of days"),
        (number(0.5), "is not a number of days"),
        (number(32000.0), "outside the years 1990 to 2100"),
        (number(80000.0), "outside the years 1990 to 2100"),
        (number(1e300), "is not a number of days"),
        (text("39448.5"), "is not a number of days"),
        (text("2026-06-02"), "is not a number of days"),
    ] {
        let told = by_number(Epoch::Of1900, &content);
        assert!(told.contains(wrong), "{told}");
    }
}

#[test]
fn a_number_is_no_time_unless_the_rule_says_so() {
    let clock = clock(None, None, None);
    let content = Content::Number(46175.5);
    let field = Field {
        place: Place::Rule,
        content: &content,
    };
    let fault = clock.read(field, Some("46175.5")).unwrap_err();
    assert!(fault.hint.unwrap().contains("`dates = \"1900\"`"));
}

#[test]
fn twelve_hours_and_ordinal_days_by_their_format() {
    assert_eq!(
        read(Some("%m/%d/%y %I:%M:%S %p"), None, "06/02/26 02:20:05 PM"),
        "2026-06-02T14:20:05"
    );
    assert_eq!(
        read(Some("%Y-%j %H:%M"), None, "2026-153 14:20"),
        "2026-06-02T14:20:00"
    );
    assert_eq!(
        read(Some("%G-W%V-%u %H:%M"), None, "2026-W23-2 14:20"),
        "2026-06-02T14:20:00"
    );
    assert_eq!(read(None, None, "20260602T142005"), "2026-06-02T14:20:05");
    assert_eq!(
        read(None, None, "2026-06-02T14:20:05,25"),
        "2026-06-02T14:20:05.25"
    );
}
