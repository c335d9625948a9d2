//! A beam's wedges: their line among the facts, and which of their curves are
//! drawn. How curves are drawn is for `curves`.

use super::curves::{Axis, Curve, Plot};
use super::figures::curve;
use crate::beam_model::{BeamModel, Grid, WedgeModel};
use crate::report::number::{fixed, short};

/// The depth and side at which a wedge's factor is listed, cm.
const LISTED_DEPTH_CM: f64 = 10.0;
const LISTED_SIDE_CM: f64 = 10.0;

/// Each wedge with its kind, angle and factor.
pub(super) fn listed(beam: &BeamModel) -> Vec<String> {
    beam.wedges
        .iter()
        .map(|wedge| {
            let ids: Vec<&str> = wedge.ids().collect();
            let head = format!(
                "{} {}, {} degrees",
                ids.join(" = "),
                wedge.kind().term(),
                short(wedge.angle_deg, 1)
            );
            let factor = factor_grid(wedge)
                .and_then(|grid| grid.at(LISTED_DEPTH_CM, LISTED_SIDE_CM).ok())
                .map_or_else(String::new, |found| {
                    format!(
                        ", factor {} ({} cm deep, {} x {})",
                        fixed(found.value, 3),
                        short(LISTED_DEPTH_CM, 1),
                        short(LISTED_SIDE_CM, 1),
                        short(LISTED_SIDE_CM, 1)
                    )
                });
            let sweep = wedge.sweep().map_or_else(String::new, |sweep| {
                format!(
                    ", sweep of a {:?} jaw to {} cm before the other",
                    sweep.moves_along,
                    short(sweep.closing_gap_cm, 2)
                )
            });
            format!("{head}{factor}{sweep}")
        })
        .collect()
}

fn factor_grid(wedge: &WedgeModel) -> Option<&Grid> {
    wedge
        .tables()
        .map(|tables| &tables.factor)
        .or_else(|| wedge.sweep()?.factor.as_ref())
}

/// Factors by depth, profiles, sweeps: those that the beam has, with captions.
pub(super) fn plots(beam: &BeamModel) -> Vec<(String, Plot)> {
    let of_wedges = |pick: fn(&WedgeModel) -> Option<&Grid>| -> Vec<(&WedgeModel, &Grid)> {
        let wedges = beam.wedges.iter();
        wedges
            .filter_map(|wedge| Some((wedge, pick(wedge)?)))
            .collect()
    };
    let parts = [
        (
            of_wedges(factor_grid),
            "Wedge factor on the axis by depth, for the side in the table that is nearest to 10 cm",
            ["depth, cm", "factor"],
        ),
        (
            of_wedges(|wedge| Some(&wedge.tables()?.profile)),
            "Fluence along the wedge at the isocentre plane, relative to the axis; the thin end is on the right",
            ["position towards the thin end, cm", "ratio"],
        ),
        (
            of_wedges(|wedge| Some(&wedge.sweep()?.delivered)),
            "Share of the meterset delivered when the jaw of a dynamic wedge passes; the thin end is on the right",
            ["position towards the thin end, cm", "share"],
        ),
    ];
    parts
        .into_iter()
        .filter(|(wedges, ..)| !wedges.is_empty())
        .map(|(wedges, caption, [x, y])| {
            let curves: Vec<Curve> = wedges
                .into_iter()
                .map(|(wedge, grid)| curve(grid, nearest_column(grid), wedge.id.clone()))
                .collect();
            let plot = Plot {
                x: Axis(x.to_owned()),
                y: Axis(y.to_owned()),
                curves,
            };
            (caption.to_owned(), plot)
        })
        .collect()
}

fn nearest_column(grid: &Grid) -> usize {
    let columns = grid.columns().iter().enumerate();
    columns
        .min_by(|one, other| {
            let away = |side_cm: f64| (side_cm - LISTED_SIDE_CM).abs();
            away(*one.1).total_cmp(&away(*other.1))
        })
        .map_or(0, |(index, _)| index)
}
