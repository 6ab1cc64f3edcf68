//! Factors against the SI's definitions, spellings, and what follows the value.

use super::*;
use crate::number::Marks;

fn quantity(text: &str) -> Quantity {
    Quantity::read(text, Marks::PLAIN).unwrap()
}

/// The number as it is read under `stated`, and the unit that it is in.
fn read(text: &str, stated: Option<&str>) -> Result<(f64, Option<String>), String> {
    let written = Quantity::read(text, Marks::PLAIN).map_err(|not| not.wrong)?;
    let scale = Scale::new(stated, &written).map_err(|not| not.wrong)?;
    let number = scale.number(&written).map_err(|not| not.wrong)?;
    Ok((number.value, scale.name().map(str::to_owned)))
}

/// Expected values are Rust literals of the exact decimal product. Source of the factors: BIPM, SI
/// brochure, 9th ed.; NIST SP 811, B.6: 1 inch = 2.54 cm exactly.
#[test]
fn lengths_are_scaled_in_decimal() {
    for (value, from, to, scaled) in [
        (1.0, "in", "mm", 25.4),
        (1.0, "inch", "cm", 2.54),
        (0.1, "in", "µm", 2540.0),
        (0.0005, "in", "µm", 12.7),
        (1.968, "in", "mm", 49.9872),
        (25.4, "mm", "in", 1.0),
        (50.8254, "mm", "in", 2.001),
        (12.3, "µm", "mm", 0.0123),
        (12.3, "um", "nm", 12300.0),
        (0.3, "mm", "\u{3bc}m", 300.0),
        (1.1, "m", "mm", 1100.0),
        (7.0, "nm", "mm", 0.000_007),
        (0.07, "cm", "mm", 0.7),
        (-0.0, "in", "mm", 0.0),
        (1e300, "nm", "m", 1e291),
    ] {
        assert_eq!(converted(value, from, to), Some(scaled), "{value} {from}");
    }
    assert_eq!(converted(1e300, "m", "pm"), None);
    assert_eq!(converted(1e306, "m", "nm"), None);
}

/// One divided by 25.4 has no end: 0.0393700787401574803149606299212598425196850…
#[test]
fn a_quotient_without_an_end_is_rounded_once() {
    assert_eq!(converted(1.0, "mm", "in"), Some(0.039_370_078_740_157_48));
    assert_eq!(converted(100.0, "mm", "in"), Some(3.937_007_874_015_748));
    assert_eq!(converted(1.0, "arcsec", "°"), Some(1.0 / 3600.0));
    assert_eq!(converted(10.0, "arcmin", "°"), Some(1.0 / 6.0));
}

/// A degree is π/180 rad, a minute 1/60 of it, a second 1/3600. Source: SI brochure, table 8.
#[test]
fn angles_are_scaled() {
    assert_eq!(converted(1.5, "°", "arcmin"), Some(90.0));
    assert_eq!(converted(0.5, "arcmin", "arcsec"), Some(30.0));
    assert_eq!(converted(90.0, "deg", "\u{ba}"), Some(90.0));
    let near = |found: Option<f64>, expected: f64| {
        let off = (found.unwrap() / expected - 1.0).abs();
        assert!(off <= 2.0 * f64::EPSILON, "{found:?} for {expected}");
    };
    near(converted(180.0, "°", "rad"), std::f64::consts::PI);
    near(converted(1.0, "°", "rad"), 0.017_453_292_519_943_295);
    near(converted(1.0, "arcsec", "rad"), 4.848_136_811_095_36e-6);
    near(converted(std::f64::consts::FRAC_PI_6, "rad", "°"), 30.0);
    near(
        converted(std::f64::consts::FRAC_PI_6, "rad", "arcmin"),
        1800.0,
    );
}

#[test]
fn only_quantities_of_one_kind_are_converted() {
    for (from, to) in [
        ("mm", "°"),
        ("rad", "in"),
        ("HRC", "HRC"),
        ("mm", "HRC"),
        ("\"", "\""),
        ("'", "mm"),
        ("M", "mm"),
        ("Nm", "mm"),
        ("NM", "mm"),
    ] {
        assert_eq!(converted(1.0, from, to), None, "{from} {to}");
    }
    assert_eq!(converted(1.0, "\"", "mm"), Some(25.4));
    assert_eq!(converted(60.0, "\"", "'"), None);
    assert_eq!(converted(60.0, "\"", "arcmin"), Some(1.0));
    assert_eq!(converted(60.0, "°", "'"), Some(3600.0));
}

#[test]
fn every_spelling_means_one_unit() {
    let all: Vec<&str> = UNITS
        .iter()
        .flat_map(|unit| unit.spellings.iter().chain([&unit.name]))
        .copied()
        .collect();
    for text in &all {
        assert_eq!(
            all.iter().filter(|other| other == &text).count(),
            1,
            "{text}"
        );
        assert!(!is_doubtful(text), "{text}");
        let read = quantity(&format!("12.5 {text}"));
        assert_eq!(read.suffix.as_deref(), Some(*text));
        assert_eq!(quantity(&format!("12.5{text}")), read);
    }
}

#[test]
fn a_unit_behind_the_number_is_read() {
    let in_unit = |value, unit: &str| Ok((value, Some(unit.to_owned())));
    assert_eq!(read("12.0034 mm", None), in_unit(12.0034, "mm"));
    assert_eq!(read("12.0034\u{a0}mm", None), in_unit(12.0034, "mm"));
    assert_eq!(read("4\u{3bc}m", None), in_unit(4.0, "µm"));
    assert_eq!(read("1.97 in", Some("MM")), in_unit(50.038, "mm"));
    assert_eq!(read("1.97\"", Some("mm")), in_unit(50.038, "mm"));
    assert_eq!(read("90\"", Some("arcmin")), in_unit(1.5, "arcmin"));
    assert_eq!(read("30'", Some("°")), in_unit(0.5, "°"));
    assert_eq!(read("1e-3 m", Some("mm")), in_unit(1.0, "mm"));
    assert_eq!(read("58.2 HRC", Some("hrc")), in_unit(58.2, "hrc"));
    assert_eq!(read("58.2", Some("HRC")), in_unit(58.2, "HRC"));
    assert_eq!(read("210 N/mm2", Some("N/mm2")), in_unit(210.0, "N/mm2"));
    assert_eq!(read("12.5", None), Ok((12.5, None)));
}

#[test]
fn a_unit_that_is_not_known_or_not_clear_is_refused() {
    let wrong = |text, stated| read(text, stated).unwrap_err();
    assert_eq!(
        wrong("58.2 HRC", None),
        "`HRC` behind the number is no unit that is known here"
    );
    assert_eq!(
        wrong("58.2 mmm", Some("mm")),
        "`mmm` behind the number is no unit that is known here"
    );
    assert_eq!(
        wrong("12\"", None),
        "`\"` behind the number can mean a length and an angle"
    );
    assert_eq!(
        wrong("12'", Some("mm")),
        "`'` behind the number can mean a length and an angle"
    );
    assert_eq!(
        wrong("12 °", Some("mm")),
        "it is in `°`, which cannot be converted to mm"
    );
    assert_eq!(
        wrong("12 mm", Some("HRC")),
        "it is in `mm`, which cannot be converted to HRC"
    );
    for text in [
        "12.5 -",
        "12.5*",
        "12.5:30",
        "1'234",
        "12.5 5",
        "5 '6\"",
        "12.5 mm 3'",
    ] {
        assert!(read(text, None).is_err(), "{text}");
    }
}

/// 12 + 30/60 + 15/3600 = 12.5041666…
#[test]
fn degrees_minutes_and_seconds_are_one_number() {
    let degrees = |text: &str| read(text, None).map(|(value, _)| value);
    for (text, value) in [
        ("12°30'15\"", 12.504_166_666_666_667),
        ("12° 30' 15''", 12.504_166_666_666_667),
        ("12\u{ba}30\u{2032}15\u{2033}", 12.504_166_666_666_667),
        ("12°30'15.6\"", 12.504_333_333_333_333),
        ("-0°30'", -0.5),
        ("\u{2212}0°0'36\"", -0.01),
        ("45°7.5'", 45.125),
        ("359°59'59.9999\"", 359.999_999_972_222_2),
    ] {
        assert_eq!(degrees(text), Ok(value), "{text}");
    }
    assert_eq!(
        read("12°30'", Some("arcmin")),
        Ok((750.0, Some("arcmin".to_owned())))
    );
    let comma = Marks {
        decimal: ',',
        thousands: Some('.'),
    };
    assert_eq!(
        Quantity::read("1°0'1,8\"", comma).unwrap().number.value,
        1.0005
    );
    for text in [
        "12°60'",
        "12°30'60\"",
        "12.5°30'",
        "12°30.5'15\"",
        "12°30",
        "12°30\"",
        "12°15\"30'",
        "12°30'15\"5",
        "12°-30'",
        "12°3e1'",
        "12°30'15\" mm",
    ] {
        assert!(degrees(text).is_err(), "{text}");
    }
}

#[test]
fn nominal_and_limits_follow_the_value() {
    let follows = |value: &str, stated, other: &str| {
        let scale = Scale::new(stated, &quantity(value)).unwrap();
        scale
            .number(&quantity(other))
            .map(|number| number.value)
            .map_err(|not| not.wrong)
    };
    assert_eq!(follows("50.01 mm", None, "2 in"), Ok(50.8));
    assert_eq!(follows("50.01", Some("mm"), "2 in"), Ok(50.8));
    assert_eq!(follows("2 in", Some("mm"), "50"), Ok(50.0));
    assert_eq!(follows("50.01 mm", None, "0"), Ok(0.0));
    assert_eq!(
        follows("50.01 mm", None, "50").unwrap_err(),
        "`50` has no unit, where the value is in mm"
    );
    assert_eq!(
        follows("50.01", None, "50 mm").unwrap_err(),
        "it is in mm, where the value has no unit"
    );
}
