//! Every beam in one line, for a first look against the printout: what the
//! first control point holds, and the meterset and dose of each reference in a
//! fraction group. Where each value stands is said further down.

use super::lines::Lines;
use super::units::meterset_unit;
use crate::plan::{Beam, Plan, ReferencedBeam};
use crate::quantity::Given;
use crate::report::plain_text::{one_line, trimmed};

const COLUMNS: usize = 12;
/// Heads of the columns, and whether a column stands at the right, as numbers do.
const HEADER: [(&str, Side); COLUMNS] = [
    ("number", Side::Right),
    ("name", Side::Left),
    ("energy", Side::Left),
    ("gantry deg", Side::Right),
    ("coll. deg", Side::Right),
    ("couch deg", Side::Right),
    ("x cm", Side::Left),
    ("y cm", Side::Left),
    ("SSD cm", Side::Right),
    ("meterset", Side::Right),
    ("dose Gy", Side::Right),
    ("points", Side::Right),
];
/// A name in the overview has at most so many characters.
const NAME_LENGTH: usize = 20;

#[derive(Clone, Copy, PartialEq, Eq)]
enum Side {
    Left,
    Right,
}

/// The overview of the beams.
pub(super) fn beams(lines: &mut Lines, plan: &Plan) {
    lines.heading("Beams, first control point (- absent)");
    if plan.beams.is_empty() {
        lines.plain("none");
        return;
    }
    let mut rows = vec![HEADER.map(|(head, _)| head.to_owned())];
    rows.extend(plan.beams.iter().map(|beam| row(plan, beam)));
    let mut widths = [0; COLUMNS];
    for row in &rows {
        for (width, cell) in widths.iter_mut().zip(row) {
            *width = (*width).max(cell.chars().count());
        }
    }
    for row in &rows {
        let cells: Vec<String> = row
            .iter()
            .zip(widths)
            .zip(HEADER)
            .map(|((cell, width), (_, side))| match side {
                Side::Left => format!("{cell:<width$}"),
                Side::Right => format!("{cell:>width$}"),
            })
            .collect();
        lines.plain(&cells.join("  "));
    }
    lines.plain("meterset and dose are of one fraction; points are control points");
}

fn row(plan: &Plan, beam: &Beam) -> [String; COLUMNS] {
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
        of_references(plan, beam, |reference| {
            let meterset = reference.meterset_mu.get()?;
            let unit = one_line(&meterset_unit(plan, reference));
            Some(format!("{} {unit}", trimmed(meterset, 6)))
        }),
        of_references(plan, beam, |reference| {
            Some(trimmed(reference.beam_dose_gy.get()?, 6))
        }),
        beam.control_points.len().to_string(),
    ]
}

/// What the fraction groups say of a beam, one after the other.
fn of_references(
    plan: &Plan,
    beam: &Beam,
    show: impl Fn(&ReferencedBeam) -> Option<String>,
) -> String {
    let Some(number) = beam.number.get() else {
        return absent();
    };
    let shown: Vec<String> = plan
        .fraction_groups
        .iter()
        .flat_map(|group| &group.beams)
        .filter(|reference| reference.beam_number.get() == Some(number))
        .map(|reference| show(reference).unwrap_or_else(absent))
        .collect();
    if shown.is_empty() {
        absent()
    } else {
        shown.join(", ")
    }
}

fn absent() -> String {
    "-".to_owned()
}
