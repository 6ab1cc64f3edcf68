//! The readings against the clock: drift between repeats, and trials that follow one another directly.

use super::LEVEL;
use super::luck::f_above;
use super::material::{self, Material};
use super::words::{duration, number};
use crate::quantile::{Side, f};
use crate::record::Remark;

const HOUR: f64 = 3600.0;
/// Trials count as back to back when at least this part of them directly follow one of the same cell.
const BACK_TO_BACK: f64 = 0.9;

/// Repeats of one cell that rise or fall with time.
pub(super) fn drift(material: &Material<'_>) -> Option<Remark> {
    let taken = material.taken()?;
    let (squares, df) = material.within();
    if df < 2 {
        return None;
    }
    let cells = material.brief.len();
    let (mut sums, mut first, mut last) = (
        vec![0.0; cells],
        vec![f64::MAX; cells],
        vec![f64::MIN; cells],
    );
    for (&cell, &t) in material.cells.iter().zip(&taken) {
        sums[cell] += t - taken[0];
        first[cell] = first[cell].min(t);
        last[cell] = last[cell].max(t);
    }
    let (mut times, mut products) = (0.0, 0.0);
    for ((&cell, &t), own) in material
        .cells
        .iter()
        .zip(&taken)
        .zip(material.within_cells())
    {
        let centred = t - taken[0] - sums[cell] / material.brief[cell].count as f64;
        times += centred * centred;
        products += centred * own;
    }
    if times <= 0.0 {
        return None;
    }
    let slope = products / times;
    let explained = products * slope;
    let rest = (squares - explained).max(0.0) / (df - 1) as f64;
    let p = f_above(explained / rest, 1.0, (df - 1) as f64);
    if p > LEVEL {
        return None;
    }
    let outside = 1.0 - material.study.confidence;
    let reach = (rest / times * f(Side::Above, outside, 1.0, (df - 1) as f64)).sqrt();
    let repeated = (0..cells).filter(|&c| material.brief[c].count > 1);
    let spans: Vec<f64> = repeated.map(|c| last[c] - first[c]).collect();
    let span = spans.iter().sum::<f64>() / spans.len() as f64;
    let way = if slope > 0.0 { "rise" } else { "fall" };
    let steepness = slope.abs() * HOUR;
    let text = format!(
        "Repeats {way} with time: by {} from the first to the last trial of a cell ({} apart on average), which is {} \
         an hour ({} limits {}). Look at soak, warm-up and temperature; nothing was corrected.",
        material.length(slope.abs() * span),
        duration(span),
        material.length(steepness),
        material.confidence(),
        material.lengths(steepness - reach * HOUR, steepness + reach * HOUR),
    );
    let figures = [
        ("drift per hour", slope * HOUR),
        ("lower", (slope - reach) * HOUR),
        ("upper", (slope + reach) * HOUR),
        ("p", p),
    ];
    Some(material::remark("drift", text, &figures))
}

/// Trials of one cell, or all readings of one part, taken one after the other without another part in between.
pub(super) fn back_to_back(material: &Material<'_>) -> Option<Remark> {
    let taken = material.taken()?;
    let order = order(material, &taken)?;
    let part = material.design.part();
    let parts: Vec<u32> = material.design.projection(material.design.part_term());
    let filled = material.brief.iter().filter(|c| c.count > 0).count();
    let repeats = order.len() - filled;
    if repeats == 0 || material.design.factors()[part].levels < 2 {
        return None;
    }
    let pairs = || order.windows(2).map(|w| (w[0], w[1]));
    let one_cell = |&(a, b): &(usize, usize)| material.cells[a] == material.cells[b];
    let one_part = |&(a, b): &(usize, usize)| parts[material.cells[a]] == parts[material.cells[b]];
    let in_cell = pairs().filter(one_cell).count();
    let in_part = pairs().filter(one_part).count();
    let blocks = material.design.combinations(material.design.part_term());
    let whole_parts = filled > blocks && often(in_part, order.len() - blocks);
    if !whole_parts && !often(in_cell, repeats) {
        return None;
    }
    let (what, count, of, went) = if whole_parts {
        (
            "readings of one part",
            in_part,
            order.len() - blocks,
            "the error of loading it went into the part variation and is missing from the gauge"
                .to_owned(),
        )
    } else {
        ("trials of one cell", in_cell, repeats, went_into(material))
    };
    let gaps = pairs().filter(|pair| {
        if whole_parts {
            one_part(pair)
        } else {
            one_cell(pair)
        }
    });
    let mut gaps: Vec<f64> = gaps.map(|(a, b)| taken[b] - taken[a]).collect();
    gaps.sort_by(f64::total_cmp);
    let gap = gaps[gaps.len() / 2];
    let text = format!(
        "The {what} follow one another directly, {count} of {of} times (typically {} apart). If the part was not \
         taken out in between, {went}.",
        duration(gap),
    );
    let figures = [
        ("share back to back", count as f64 / of as f64),
        ("typical gap in seconds", gap),
    ];
    Some(material::remark("back to back", text, &figures))
}

fn often(count: usize, of: usize) -> bool {
    of > 0 && count as f64 >= BACK_TO_BACK * of as f64
}

/// Where the error of loading ends up when each cell is loaded once.
fn went_into(material: &Material<'_>) -> String {
    let factors = material.design.factors().len();
    let into = match (material.square(), factors) {
        (_, 1) => return
            "the error of loading it went into the part variation and is missing from the gauge".to_owned(),
        (Some(square), _) => format!("part × {}", material.word(square.factor)),
        (None, _) => "the interaction".to_owned(),
    };
    let (_, df) = material.within();
    format!(
        "the error of loading it went into {into}: the gauge is about right, the repeatability too good, and its {} \
         degrees of freedom are not earned",
        number(df as f64)
    )
}

/// Rows by time; `None` when equal times leave the order open. Equal times of several cells go by trial.
fn order(material: &Material<'_>, taken: &[f64]) -> Option<Vec<usize>> {
    let trial = material.trial_of_row();
    let mut rows: Vec<usize> = (0..taken.len()).collect();
    let of = |row: usize| trial.map_or(0, |trial| trial[row]);
    rows.sort_by(|&a, &b| {
        taken[a]
            .total_cmp(&taken[b])
            .then(of(a).cmp(&of(b)))
            .then(material.cells[a].cmp(&material.cells[b]))
    });
    let open = rows
        .windows(2)
        .any(|w| taken[w[0]] == taken[w[1]] && material.cells[w[0]] != material.cells[w[1]]);
    (trial.is_some() || !open).then_some(rows)
}
