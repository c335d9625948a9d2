//! The scatter kernel of a beam drawn: the dose of squares by side at some
//! depths, the measured squares as dots, and the form that carries them on to
//! zero field as a dashed line with its numbers. Kernel and form are made in
//! `beam_model`.

use super::curves::{Axis, Curve, Plot, draw_dashed};
use super::figures::Figure;
use crate::beam_model::BeamModel;
use crate::beam_model::scatter::{RadialDose, ScatterRow};
use crate::report::number::{fixed, short};

/// Depths that are drawn besides d_max, cm: the table's nearest.
const DEPTHS_CM: [f64; 3] = [5.0, 10.0, 20.0];

/// Sides are drawn up to here, cm: beyond, nothing is carried on.
const WIDEST_CM: f64 = 20.0;

/// Each depth is drawn relative to this side, cm, so that their curvatures can be compared.
const RELATIVE_TO_CM: f64 = 10.0;

/// Points of a curve.
const STEPS: u32 = 100;

/// A line of the table of zero-field terms.
pub(super) struct FormLine {
    pub(super) depth: String,
    pub(super) dose: String,
    pub(super) rise: String,
    pub(super) half_radius: String,
    pub(super) sides: String,
    pub(super) misfit: String,
    pub(super) residual: String,
}

/// The kernel's part of a beam.
pub(super) struct ScatterPart {
    pub(super) figure: Figure,
    pub(super) lines: Vec<FormLine>,
    pub(super) attenuation: String,
}

/// The part; `None` when the tables give no kernel.
pub(super) fn of_beam(beam: &BeamModel, number: usize) -> Option<ScatterPart> {
    let all: Vec<ScatterRow<'_>> = beam.scatter_rows().collect();
    let mut rows: Vec<&ScatterRow<'_>> = std::iter::once(beam.d_max_cm)
        .chain(DEPTHS_CM)
        .filter_map(|wanted_cm| {
            let apart = |row: &&ScatterRow<'_>| (row.depth_cm - wanted_cm).abs();
            all.iter().min_by(|a, b| apart(a).total_cmp(&apart(b)))
        })
        .collect();
    rows.sort_by(|a, b| a.depth_cm.total_cmp(&b.depth_cm));
    rows.dedup_by(|after, before| after.depth_cm <= before.depth_cm);
    if rows.is_empty() {
        return None;
    }
    let plot = Plot {
        x: Axis("side in the plane of the point, cm".to_owned()),
        y: Axis("TPR \u{d7} Sp, relative to 10 cm".to_owned()),
        curves: rows.iter().map(|row| curve(row)).collect(),
    };
    let dashed: Vec<Vec<[f64; 2]>> = rows.iter().map(|row| carried_on(row)).collect();
    let caption = format!(
        "Dose on the axis of squares per unit in-air fluence, by side, for depths in cm, relative to the side of {} cm: dots the measured squares, line the scatter kernel integrated over a square, dashed the form that carries them on to zero field, drawn up to the largest side that it was fitted to",
        short(RELATIVE_TO_CM, 0)
    );
    Some(ScatterPart {
        figure: Figure {
            svg: draw_dashed(&plot, &dashed, &format!("scatter-{number}"), &caption),
            caption,
        },
        lines: rows.iter().map(|row| line(row)).collect(),
        attenuation: beam.primary_attenuation_per_cm().map_or_else(
            || "The tables do not reach from 10 to 20 cm: no attenuation of the primary.".to_owned(),
            |per_cm| {
                format!(
                    "The zero-field terms imply an attenuation of the primary of {} per cm between 10 and 20 cm, ln(K(10, 0) / K(20, 0)) / 10; what is plausible stands under the check's findings.",
                    fixed(per_cm, 4)
                )
            },
        ),
    })
}

/// From the smallest square on.
fn curve(row: &ScatterRow<'_>) -> Curve {
    let widest_cm = row.squares.last().map_or(0.0, |last| last.0).min(WIDEST_CM);
    let smallest_cm = row.squares.first().map_or(0.0, |first| first.0);
    let unit = row.radial.square(RELATIVE_TO_CM);
    let line = (0..=STEPS).map(|step| {
        let share = f64::from(step) / f64::from(STEPS);
        let side_cm = smallest_cm + (widest_cm - smallest_cm) * share;
        [side_cm, row.radial.square(side_cm) / unit]
    });
    let dots = row.squares.iter().filter(|square| square.0 <= widest_cm);
    Curve {
        label: short(row.depth_cm, 2),
        line: line.collect(),
        dots: dots
            .map(|&(side_cm, dose)| [side_cm, dose / unit])
            .collect(),
    }
}

/// The form from zero field to the largest square that it was fitted to.
fn carried_on(row: &ScatterRow<'_>) -> Vec<[f64; 2]> {
    let to_cm = row.fitted_sides_cm().last().copied().unwrap_or_default();
    let unit = row.radial.square(RELATIVE_TO_CM);
    let at = |step: u32| {
        let side_cm = to_cm * f64::from(step) / f64::from(STEPS);
        let radius_cm = RadialDose::radius_of_square_cm(side_cm);
        [side_cm, row.zero_field().at(radius_cm) / unit]
    };
    (0..=STEPS).map(at).collect()
}

fn line(row: &ScatterRow<'_>) -> FormLine {
    let form = row.zero_field();
    let sides = row.fitted_sides_cm();
    let range = sides.first().zip(sides.last());
    let bound = if form.is_at_bound() { " (bound)" } else { "" };
    FormLine {
        depth: short(row.depth_cm, 2),
        dose: fixed(form.dose, 4),
        rise: fixed(form.rise, 4),
        half_radius: format!("{}{bound}", fixed(form.half_radius_cm, 2)),
        sides: range.map_or_else(String::new, |(first, last)| {
            format!("{} to {}", short(*first, 2), short(*last, 2))
        }),
        misfit: fixed(row.form_residual_percent(), 2),
        residual: fixed(row.worst_residual_percent(), 4),
    }
}
