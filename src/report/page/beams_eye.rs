//! The beam's-eye view to scale: jaws, leaf openings, block outlines, axis and
//! dose point at the isocentre plane, seen from the source in the collimator
//! system. What a field with several apertures adds is drawn by `moving`; where
//! things are was worked out in `dose`.

use super::moving;
use super::words::counted;
use crate::dose::{BeamCalculation, BeamView, BlockOutline, LeafOpening, Technique};
use crate::report::number::{short, signed};
use crate::report::svg::{Anchor, Drawing, Scale};

/// Half-widths of the picture, cm: few, so that pictures can be compared.
const HALF_WIDTHS_CM: [f64; 4] = [6.0, 11.0, 16.0, 21.0];
/// An outline with more points is drawn with every second, third ... of them.
const MOST_POINTS: usize = 1000;
/// A bank with more leaf pairs is drawn with the first of them.
const MOST_PAIRS: usize = 400;
pub(super) const PLOT: f64 = 240.0;
pub(super) const LEFT: f64 = 34.0;
pub(super) const TOP: f64 = 24.0;
const WIDTH: f64 = LEFT + PLOT + 8.0;
const HEIGHT: f64 = TOP + PLOT + 36.0;

/// A picture and what stands under it.
#[derive(Clone, Debug)]
pub(super) struct Picture {
    pub(super) svg: String,
    pub(super) caption: String,
}

/// Scales of the picture, and its half-width, cm.
pub(super) struct Axes {
    pub(super) half_cm: f64,
    x: Scale,
    y: Scale,
}

impl Axes {
    pub(super) fn at(&self, point: [f64; 2]) -> [f64; 2] {
        [self.x.at(point[0]), self.y.at(point[1])]
    }
}

/// The picture; `None` when neither jaws, leaves nor blocks are known.
pub(super) fn picture(calculation: &BeamCalculation, id: &str) -> Option<Picture> {
    let view = &calculation.view;
    let nothing = view.jaws_x_cm.is_none()
        && view.jaws_y_cm.is_none()
        && view.leaf_banks.iter().all(Vec::is_empty)
        && view.blocks.is_empty()
        && view.last.is_none();
    if nothing {
        return None;
    }
    let several = matches!(
        calculation.technique,
        Technique::Segmented | Technique::Dynamic | Technique::Arc
    ) || view.last.is_some();
    let shaped = calculation.shaped.as_ref().filter(|_| several);
    let grey = shaped.and_then(|shaped| moving::grey(&shaped.fluence));
    let half_cm = half_width_cm(view, grey.as_ref());
    let axes = Axes {
        half_cm,
        x: Scale::new([-half_cm, half_cm], [LEFT, LEFT + PLOT]),
        y: Scale::new([-half_cm, half_cm], [TOP + PLOT, TOP]),
    };
    let legend_height = if several { moving::LEGEND_HEIGHT } else { 0.0 };
    let mut drawing = Drawing::new(WIDTH, HEIGHT + legend_height);
    match &grey {
        Some(grey) => {
            draw_background(&mut drawing, &axes);
            grey.draw(&mut drawing, &axes);
        }
        None => draw_openings(&mut drawing, &axes, view),
    }
    draw_blocks(&mut drawing, &axes, view);
    if several {
        moving::draw_apertures(&mut drawing, &axes, view);
        moving::draw_legend(&mut drawing, view, grey.as_ref());
    }
    draw_axes(&mut drawing, &axes);
    draw_point(&mut drawing, &axes, view);
    let seen = if several {
        moving::words(view, grey.as_ref())
    } else {
        one_aperture(view)
    };
    let caption = caption(view, half_cm, seen, unplaced_point(calculation));
    let svg = drawing.finish(
        id,
        "bev",
        "Beam's-eye view, seen from the source, collimator system, isocentre plane",
        &caption,
    );
    Some(Picture { svg, caption })
}

fn half_width_cm(view: &BeamView, grey: Option<&moving::Grey>) -> f64 {
    let last = view.last.as_ref();
    let begins = aperture_extents_cm(view.jaws_x_cm, view.jaws_y_cm, &view.leaf_banks);
    let ends =
        last.map(|last| aperture_extents_cm(last.jaws_x_cm, last.jaws_y_cm, &last.leaf_banks));
    let blocks = view.blocks.iter().flat_map(|block| block.outline_cm.iter());
    let extent_cm = begins
        .into_iter()
        .chain(ends.into_iter().flatten())
        .chain(view.point_cm.into_iter().flatten())
        .chain(blocks.flatten().copied())
        .chain(grey.into_iter().flat_map(moving::Grey::edges_cm))
        .filter(|value| value.is_finite())
        .fold(0.0, |extent: f64, value| extent.max(value.abs()));
    let fits = |half: &f64| extent_cm <= half - 0.5;
    HALF_WIDTHS_CM.into_iter().find(fits).unwrap_or(31.0)
}

/// How far jaws and the leaf openings inside them reach, cm.
fn aperture_extents_cm(
    jaws_x_cm: Option<[f64; 2]>,
    jaws_y_cm: Option<[f64; 2]>,
    leaf_banks: &[Vec<LeafOpening>],
) -> Vec<f64> {
    let unlimited = [f64::NEG_INFINITY, f64::INFINITY];
    let (x, y) = (
        jaws_x_cm.unwrap_or(unlimited),
        jaws_y_cm.unwrap_or(unlimited),
    );
    let leaves = leaf_banks.iter().flatten();
    let openings = leaves.filter_map(|leaf| within(leaf, x, y));
    let jaws = [jaws_x_cm, jaws_y_cm];
    openings
        .flatten()
        .flatten()
        .chain(jaws.into_iter().flatten().flatten())
        .collect()
}

fn draw_background(drawing: &mut Drawing, axes: &Axes) {
    let half = axes.half_cm;
    drawing.rectangle("bev-closed", axes.at([-half, -half]), axes.at([half, half]));
}

fn draw_openings(drawing: &mut Drawing, axes: &Axes, view: &BeamView) {
    let half = axes.half_cm;
    let [x1, x2] = view.jaws_x_cm.unwrap_or([-half, half]);
    let [y1, y2] = view.jaws_y_cm.unwrap_or([-half, half]);
    draw_background(drawing, axes);
    let single_bank = match view.leaf_banks.as_slice() {
        [] => None,
        [bank] => Some(bank.as_slice()),
        _ => None,
    };
    let inside = if single_bank.is_some() {
        "bev-leaves"
    } else {
        "bev-open"
    };
    if x2 > x1 && y2 > y1 {
        drawing.rectangle(inside, axes.at([x1, y1]), axes.at([x2, y2]));
    }
    for leaf in single_bank.unwrap_or_default().iter().take(MOST_PAIRS) {
        if let Some([from, to]) = within(leaf, [x1, x2], [y1, y2]) {
            drawing.rectangle("bev-gap", axes.at(from), axes.at(to));
        }
    }
    if single_bank.is_none() {
        // Several banks are open where all are: outlines, because a fill would show their union.
        for (number, bank) in view.leaf_banks.iter().enumerate() {
            let class = if number == 0 { "bev-bank" } else { "bev-bank2" };
            for leaf in bank.iter().take(MOST_PAIRS) {
                if let Some([from, to]) = within(leaf, [x1, x2], [y1, y2]) {
                    drawing.rectangle(class, axes.at(from), axes.at(to));
                }
            }
        }
    }
    if x2 > x1 && y2 > y1 {
        drawing.rectangle("bev-jaws", axes.at([x1, y1]), axes.at([x2, y2]));
    }
}

/// The part of a leaf pair's opening that the jaws leave open; `None` when nothing is.
fn within(leaf: &LeafOpening, x: [f64; 2], y: [f64; 2]) -> Option<[[f64; 2]; 2]> {
    let from = [leaf.x1_cm.max(x[0]), leaf.y1_cm.max(y[0])];
    let to = [leaf.x2_cm.min(x[1]), leaf.y2_cm.min(y[1])];
    (to[0] > from[0] && to[1] > from[1]).then_some([from, to])
}

fn draw_blocks(drawing: &mut Drawing, axes: &Axes, view: &BeamView) {
    for block in &view.blocks {
        let step = block.outline_cm.len().div_ceil(MOST_POINTS).max(1);
        let points = block.outline_cm.iter().step_by(step);
        let points: Vec<[f64; 2]> = points.map(|point| axes.at(*point)).collect();
        let class = if block.shields_inside {
            "bev-block"
        } else {
            "bev-aperture"
        };
        drawing.outline(class, &points);
    }
}

fn draw_axes(drawing: &mut Drawing, axes: &Axes) {
    let half = axes.half_cm;
    drawing.line("bev-axis", axes.at([-half, 0.0]), axes.at([half, 0.0]));
    drawing.line("bev-axis", axes.at([0.0, -half]), axes.at([0.0, half]));
    drawing.rectangle("bev-frame", axes.at([-half, -half]), axes.at([half, half]));
    for tick_cm in axes.x.ticks(1.0) {
        let labelled = (tick_cm / 5.0).fract() == 0.0;
        let length = if labelled { 7.0 } else { 3.5 };
        let along_x = axes.at([tick_cm, -half]);
        let along_y = axes.at([-half, tick_cm]);
        drawing.line("tick", along_x, [along_x[0], along_x[1] + length]);
        drawing.line("tick", along_y, [along_y[0] - length, along_y[1]]);
        if labelled {
            let label = short(tick_cm, 0);
            drawing.text(
                "label",
                [along_x[0], along_x[1] + 19.0],
                Anchor::Middle,
                &label,
            );
            drawing.text(
                "label",
                [along_y[0] - 10.0, along_y[1] + 3.5],
                Anchor::End,
                &label,
            );
        }
    }
    drawing.text(
        "label",
        [LEFT + PLOT, TOP + PLOT + 32.0],
        Anchor::End,
        "x_b / cm",
    );
    drawing.text("label", [2.0, TOP - 10.0], Anchor::Start, "y_b / cm");
    let five_cm = PLOT * 5.0 / (2.0 * half);
    let end = LEFT + PLOT;
    let at = TOP - 13.0;
    drawing.line("scale-bar", [end - five_cm, at], [end, at]);
    for x in [end - five_cm, end] {
        drawing.line("scale-bar", [x, at - 3.0], [x, at + 3.0]);
    }
    drawing.text(
        "label",
        [end - five_cm - 5.0, at + 3.5],
        Anchor::End,
        "5 cm",
    );
}

fn draw_point(drawing: &mut Drawing, axes: &Axes, view: &BeamView) {
    let Some(point) = view.point_cm else { return };
    if !(axes.x.holds(point[0]) && axes.y.holds(point[1])) {
        return;
    }
    let [x, y] = axes.at(point);
    drawing.circle("bev-point-halo", [x, y], 6.5);
    drawing.circle("bev-point", [x, y], 4.5);
    drawing.line("bev-point", [x - 8.0, y], [x + 8.0, y]);
    drawing.line("bev-point", [x, y - 8.0], [x, y + 8.0]);
}

/// What the caption says of leaves that stand still.
fn one_aperture(view: &BeamView) -> Vec<String> {
    match view.leaf_banks.len() {
        0 => Vec::new(),
        1 => vec!["leaf openings of the first control point".to_owned()],
        banks => vec![format!(
            "leaf openings of {banks} banks, first control point; the field is where all are open"
        )],
    }
}

/// What the caption says of a point that is not drawn.
const fn unplaced_point(calculation: &BeamCalculation) -> &'static str {
    match (&calculation.point, calculation.technique) {
        (Some(_), Technique::Arc) => {
            "the dose point is not drawn: it moves across this view as the gantry turns"
        }
        (Some(_), _) => "the dose point's place in this view is not known",
        (None, _) => "no dose point",
    }
}

fn caption(
    view: &BeamView,
    half_cm: f64,
    seen: Vec<String>,
    unplaced_point: &'static str,
) -> String {
    let range = |name: &str, sides: [f64; 2]| {
        format!(
            "{name} {} to {} cm",
            signed(sides[0], 2),
            signed(sides[1], 2)
        )
    };
    let mut parts = Vec::new();
    let axes = [
        (
            "X jaws",
            view.jaws_x_cm,
            view.last.as_ref().map(|last| last.jaws_x_cm),
        ),
        (
            "Y jaws",
            view.jaws_y_cm,
            view.last.as_ref().map(|last| last.jaws_y_cm),
        ),
    ];
    for (name, first, last) in axes {
        let first = first.map(|sides| range(name, sides));
        let moved = last
            .flatten()
            .map(|sides| range(name, sides))
            .filter(|last| first.as_ref() != Some(last));
        parts.extend(first);
        parts.extend(moved.map(|last| format!("at the end {last}")));
    }
    parts.extend(seen);
    let shields = view.blocks.iter().filter(|block| block.shields_inside);
    let shields = shields.count();
    let apertures = view.blocks.len() - shields;
    if shields > 0 {
        let outlines = counted(shields as u64, "block outline", "block outlines");
        parts.push(format!("{outlines}, shielded inside"));
    }
    if apertures > 0 {
        let outlines = counted(apertures as u64, "aperture outline", "aperture outlines");
        parts.push(format!("{outlines}, shielded outside"));
    }
    let coarse = |block: &BlockOutline| block.outline_cm.len() > MOST_POINTS;
    let last = view.last.as_ref().map(|last| last.leaf_banks.as_slice());
    let abridged = moving::is_abridged(&view.leaf_banks)
        || moving::is_abridged(last.unwrap_or_default())
        || view.leaf_banks.iter().any(|bank| bank.len() > MOST_PAIRS);
    if abridged || view.blocks.iter().any(coarse) {
        parts.push("drawn with a part of its points".to_owned());
    }
    if let Some([x, y]) = view.point_cm {
        let place = format!("dose point at ({}, {}) cm", signed(x, 2), signed(y, 2));
        let outside = !(x.abs() <= half_cm && y.abs() <= half_cm);
        parts.push(if outside {
            format!("{place}, outside the picture")
        } else {
            place
        });
    } else {
        parts.push(unplaced_point.to_owned());
    }
    parts.join("; ")
}
