//! Every beam in one line, for a first look against the printout: what the
//! first control point holds. Where each value stands is said further down.

use super::lines::Lines;
use crate::plan::Beam;
use crate::quantity::Given;
use crate::report::plain_text::{one_line, trimmed};

const HEADER: [&str; 10] = [
    "number", "name", "energy", "gantry", "coll.", "couch", "x cm", "y cm", "SSD cm", "points",
];
/// A name in the overview has at most so many characters.
const NAME_LENGTH: usize = 20;

/// The overview of the beams.
pub(super) fn beams(lines: &mut Lines, beams: &[Beam]) {
    lines.heading("Beams, first control point (- absent)");
    if beams.is_empty() {
        lines.plain("none");
        return;
    }
    let mut rows = vec![HEADER.map(str::to_owned)];
    rows.extend(beams.iter().map(row));
    let mut widths = [0; HEADER.len()];
    for row in &rows {
        for (width, cell) in widths.iter_mut().zip(row) {
            *width = (*width).max(cell.chars().count());
        }
    }
    for row in &rows {
        let cells: Vec<String> = row
            .iter()
            .zip(widths)
            .map(|(cell, width)| format!("{cell:<width$}"))
            .collect();
        lines.plain(&cells.join("  "));
    }
}

fn row(beam: &Beam) -> [String; HEADER.len()] {
    let first = beam.control_points.first();
    let number = |value: Option<&Given<f64>>| {
        value
            .and_then(Given::get)
            .map_or_else(absent, |value| trimmed(value, 2))
    };
    let sides = |value: Option<&Given<[f64; 2]>>| {
        value
            .and_then(Given::get)
            .map_or_else(absent, |[from, to]| {
                format!("{} to {}", trimmed(from, 2), trimmed(to, 2))
            })
    };
    let name = beam.name.value().map_or_else(absent, |name| {
        one_line(name).chars().take(NAME_LENGTH).collect()
    });
    [
        beam.number.value().map_or_else(absent, ToString::to_string),
        name,
        beam.energy
            .label()
            .map_or_else(absent, |label| one_line(&label)),
        number(first.map(|point| &point.gantry_deg)),
        number(first.map(|point| &point.collimator_deg)),
        number(first.map(|point| &point.couch_deg)),
        sides(first.map(|point| &point.jaws_x_cm)),
        sides(first.map(|point| &point.jaws_y_cm)),
        number(first.map(|point| &point.ssd_cm)),
        beam.control_points.len().to_string(),
    ]
}

fn absent() -> String {
    "-".to_owned()
}
