//! Single cells that stand out from a smooth table. Which smooth quantity is
//! looked at (a ratio to a kernel, a logarithm) is for the callers.

/// A cell that its neighbours do not predict.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Outlier {
    pub(super) row: usize,
    pub(super) column: usize,
    /// Value less prediction.
    pub(super) residual: f64,
}

/// Cells of a row-major table that differ from the prediction of their neighbours both down the column and along the row
/// by more than the threshold of their row. In each direction the two nearest neighbours predict by a straight line. A wrong cell spoils the
/// prediction of its neighbours in one direction only, so they are not taken for it.
pub(super) fn in_table(
    rows: &[f64],
    columns: &[f64],
    cells: &[f64],
    threshold: impl Fn(f64) -> f64,
) -> Vec<Outlier> {
    let width = columns.len();
    let cell = |row: usize, column: usize| cells.get(row * width + column).copied();
    let mut found = Vec::new();
    for (row, &row_at) in rows.iter().enumerate() {
        for column in 0..width {
            let down = residual(rows, row, |index| cell(index, column));
            let along = residual(columns, column, |index| cell(row, index));
            let smaller = match (down, along) {
                (Some(down), Some(along)) if down * along <= 0.0 => 0.0,
                (Some(down), Some(along)) if along.abs() < down.abs() => along,
                (Some(one), _) | (None, Some(one)) => one,
                (None, None) => 0.0,
            };
            if smaller.abs() > threshold(row_at) {
                found.push(Outlier {
                    row,
                    column,
                    residual: smaller,
                });
            }
        }
    }
    found
}

/// Points of a curve that stand out. With one direction only, a wrong point makes its neighbours look wrong too: of those beyond the
/// threshold the one is taken whose removal leaves the smoothest curve, and so on, at most three. At the ends, where neighbours lie on one side
/// only, the threshold is twice as high.
pub(super) fn in_curve(at: &[f64], values: &[f64], threshold: f64) -> Vec<Outlier> {
    let mut left: Vec<usize> = (0..at.len().min(values.len())).collect();
    let mut found = Vec::new();
    while found.len() < 3 {
        let now = residuals(at, values, &left);
        let worst = (0..left.len())
            .filter(|&position| {
                let at_end = position == 0 || position + 1 == left.len();
                let limit = if at_end { 2.0 * threshold } else { threshold };
                now.get(position).is_some_and(|value| value.abs() > limit)
            })
            .map(|position| {
                let mut rest = left.clone();
                rest.remove(position);
                let roughness: f64 = residuals(at, values, &rest)
                    .iter()
                    .map(|value| value * value)
                    .sum();
                (position, roughness)
            })
            .min_by(|one, other| one.1.total_cmp(&other.1));
        let Some((position, _)) = worst else { break };
        found.push(Outlier {
            row: left.remove(position),
            column: 0,
            residual: now.get(position).copied().unwrap_or(0.0),
        });
    }
    found
}

fn residuals(at: &[f64], values: &[f64], left: &[usize]) -> Vec<f64> {
    let pick = |from: &[f64]| -> Vec<f64> {
        left.iter()
            .filter_map(|&index| from.get(index).copied())
            .collect()
    };
    let (at, values) = (pick(at), pick(values));
    (0..at.len())
        .map(|index| residual(&at, index, |other| values.get(other).copied()).unwrap_or(0.0))
        .collect()
}

/// Value less the straight line through the nearest neighbour on each side, or through the two nearest on one side at an end.
fn residual(at: &[f64], index: usize, value: impl Fn(usize) -> Option<f64>) -> Option<f64> {
    let (one, other) = if index == 0 {
        (1, 2)
    } else if index + 1 == at.len() {
        (index.checked_sub(2)?, index - 1)
    } else {
        (index - 1, index + 1)
    };
    let place = |index: usize| at.get(index).copied();
    let share = (place(index)? - place(one)?) / (place(other)? - place(one)?);
    let predicted = value(one)? + (value(other)? - value(one)?) * share;
    Some(value(index)? - predicted)
}

/// The middle value; 0 for none.
pub(super) fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let middle = values.len() / 2;
    let upper = values.get(middle).copied().unwrap_or(0.0);
    if values.len() % 2 == 1 {
        return upper;
    }
    let lower = middle.checked_sub(1).and_then(|index| values.get(index));
    f64::midpoint(lower.copied().unwrap_or(upper), upper)
}
