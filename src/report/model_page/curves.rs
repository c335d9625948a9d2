//! Curves on two axes, each named at its end. What they are is for `figures`.

use crate::report::number::short;
use crate::report::svg::{Anchor, Drawing, Scale, tick_step};

/// An axis by its name.
pub(super) struct Axis(pub(super) String);

/// A curve with its name and the values it goes through.
pub(super) struct Curve {
    pub(super) label: String,
    pub(super) line: Vec<[f64; 2]>,
    pub(super) dots: Vec<[f64; 2]>,
}

/// Curves over common axes.
pub(super) struct Plot {
    pub(super) x: Axis,
    pub(super) y: Axis,
    pub(super) curves: Vec<Curve>,
}

const WIDTH: f64 = 560.0;
const HEIGHT: f64 = 300.0;
const LEFT: f64 = 48.0;
const RIGHT: f64 = WIDTH - 44.0;
const TOP: f64 = 20.0;
const BOTTOM: f64 = HEIGHT - 38.0;
/// Names closer than this are moved apart.
const LABEL_HEIGHT: f64 = 12.0;

/// The picture.
pub(super) fn draw(plot: &Plot, id: &str, description: &str) -> String {
    draw_dashed(plot, &[], id, description)
}

/// The picture with dashed lines without a name over the same axes.
pub(super) fn draw_dashed(
    plot: &Plot,
    dashed: &[Vec<[f64; 2]>],
    id: &str,
    description: &str,
) -> String {
    let points = || {
        let lines = plot.curves.iter().map(|curve| &curve.line);
        lines.chain(dashed).flatten()
    };
    let x_range = extent(points().map(|point| point[0]));
    let y_range = extent(points().map(|point| point[1]));
    let y_step = tick_step(y_range[1] - y_range[0], 6.0);
    let y_range = [
        (y_range[0] / y_step).floor() * y_step,
        (y_range[1] / y_step).ceil() * y_step,
    ];
    let x = Scale::new(x_range, [LEFT, RIGHT]);
    let y = Scale::new(y_range, [BOTTOM, TOP]);
    let mut drawing = Drawing::new(WIDTH, HEIGHT);
    for tick in x.ticks(tick_step(x_range[1] - x_range[0], 10.0)) {
        let at = x.at(tick);
        drawing.line("grid", [at, TOP], [at, BOTTOM]);
        drawing.text(
            "label",
            [at, BOTTOM + 14.0],
            Anchor::Middle,
            &short(tick, 3),
        );
    }
    for tick in y.ticks(y_step) {
        let at = y.at(tick);
        drawing.line("grid", [LEFT, at], [RIGHT, at]);
        drawing.text(
            "label",
            [LEFT - 6.0, at + 3.5],
            Anchor::End,
            &short(tick, 3),
        );
    }
    drawing.line("rule", [LEFT, BOTTOM], [RIGHT, BOTTOM]);
    drawing.line("rule", [LEFT, TOP], [LEFT, BOTTOM]);
    drawing.text(
        "label",
        [f64::midpoint(LEFT, RIGHT), HEIGHT - 6.0],
        Anchor::Middle,
        &plot.x.0,
    );
    drawing.text("label", [4.0, TOP - 8.0], Anchor::Start, &plot.y.0);
    let mut names: Vec<(f64, &str)> = Vec::new();
    for curve in &plot.curves {
        let line: Vec<[f64; 2]> = curve
            .line
            .iter()
            .map(|point| [x.at(point[0]), y.at(point[1])])
            .collect();
        if let Some(end) = line.last() {
            names.push((end[1], &curve.label));
        }
        drawing.curve("curve", &line);
        for dot in &curve.dots {
            drawing.circle("dot", [x.at(dot[0]), y.at(dot[1])], 1.4);
        }
    }
    for points in dashed {
        let points: Vec<[f64; 2]> = points
            .iter()
            .map(|point| [x.at(point[0]), y.at(point[1])])
            .collect();
        drawing.curve("curve-dashed", &points);
    }
    for (at, name) in spread(names) {
        drawing.text("label", [RIGHT + 5.0, at + 3.5], Anchor::Start, name);
    }
    drawing.finish(
        id,
        "curves",
        &format!("{} by {}", plot.y.0, plot.x.0),
        description,
    )
}

fn extent(values: impl Iterator<Item = f64>) -> [f64; 2] {
    let [least, greatest] = values.fold(
        [f64::INFINITY, f64::NEG_INFINITY],
        |[least, greatest], value| [least.min(value), greatest.max(value)],
    );
    if greatest > least {
        [least, greatest]
    } else {
        [0.0, 1.0]
    }
}

/// Names at least a line apart, within the picture, in the order of their curves.
fn spread(mut names: Vec<(f64, &str)>) -> Vec<(f64, &str)> {
    names.sort_by(|one, other| one.0.total_cmp(&other.0));
    let mut free = TOP;
    for name in &mut names {
        name.0 = name.0.max(free);
        free = name.0 + LABEL_HEIGHT;
    }
    let mut limit = BOTTOM;
    for name in names.iter_mut().rev() {
        name.0 = name.0.min(limit);
        limit = name.0 - LABEL_HEIGHT;
    }
    names
}

#[cfg(test)]
mod tests {
    use super::spread;

    #[test]
    fn verify_names_are_moved_apart() {
        // By hand: 12 units a line, the last at most at the lower edge, 262.
        let placed = spread(vec![(261.0, "a"), (100.0, "b"), (105.0, "c"), (262.0, "d")]);
        assert_eq!(
            placed,
            [(100.0, "b"), (112.0, "c"), (250.0, "a"), (262.0, "d")]
        );
    }
}
