//! Captions, labels and advice that a reader can use.

use super::plant::{Drawn, Plant};
use super::{plain, rendered, rendered_with};

fn alone(drawn: Drawn) -> Plant {
    Plant {
        drawn: vec![drawn],
        ..Plant::halden()
    }
}

/// Readings about 50: parts a step apart, the last loading a little higher, repeats of plus and minus `repeat`.
fn page(step: f64, tilt: f64, repeat: f64) -> String {
    let plant = alone(Drawn::named("bore A"));
    let worked = plant.worked_with(&|levels, slot| {
        let loading = if levels[1] == 2 { tilt } else { 0.0 };
        50.0 + step * (levels[0] as f64 - 4.5) + loading + repeat * (slot as f64 - 1.0)
    });
    plain(&rendered_with(&plant, &worked))
}

#[test]
fn a_step_down_that_numbers_do_not_show_is_no_advice() {
    // EV 0.23 µm: 1.38 % of 0.1 mm; the mean of two readings 0.98 %.
    let same = page(0.01, 0.0, 0.000_23);
    assert!(same.contains("loaded and measured twice: 1 %"));
    assert!(!same.contains("1 % instead of 1 %") && !same.contains("The longest step down"));
    assert!(!same.contains("class=\"advice\""));
    let seen = page(0.01, 0.002, 0.0005);
    assert!(
        seen.contains(
            "The longest step down is without the loading differences, 3 % instead of 8 %"
        )
    );
}

#[test]
fn part_means_outside_the_tolerance_are_counted() {
    // 9 × 0.01 mm of 0.1 mm; then parts at ±0.0525 and ±0.0675 mm, of limits at ±0.05 mm.
    assert!(
        page(0.01, 0.0, 0.0005)
            .contains("of the 10 study parts; they cover 90 % of the tolerance.")
    );
    assert!(page(0.015, 0.0, 0.0005).contains(
        "of the 10 study parts; their spread is 135 % of the tolerance's width; 4 of them lie outside the tolerance."
    ));
    let one = alone(Drawn::named("bore A"));
    let worked = one.worked_with(&|levels, slot| {
        50.026 + 0.005 * (levels[0] as f64 - 4.0) + 0.0005 * (slot as f64 - 1.0)
    });
    assert!(
        plain(&rendered_with(&one, &worked)).contains("; 1 of them lies outside the tolerance.")
    );
}

#[test]
fn the_line_within_cells_has_one_name_everywhere() {
    let page = rendered(&Plant::halden());
    assert!(page.contains("<th scope=\"row\">within cells (repeatability)</th>"));
    assert!(!page.contains("<th scope=\"row\">repeatability</th>"));
}

#[test]
fn dates_have_one_form() {
    let page = plain(&rendered(&Plant::halden()));
    assert!(page.contains("1 June 2026 07:30 to "));
    assert!(page.contains("P04 MO of 2 June 2026 09:40: surplus"));
}
