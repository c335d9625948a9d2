//! The two-source head scatter of a beam beside the Sc table that it was fitted
//! to. The fit is made in `beam_model`.

use super::curves::{Axis, Curve, Plot, draw_dashed};
use super::figures::Figure;
use crate::beam_model::{BeamModel, HeadScatterCell, MachineModel};
use crate::report::number::{fixed, short, signed};

/// A line of the table: side, Sc, fit, residual.
pub(super) struct HeadLine {
    pub(super) side: String,
    pub(super) sc: String,
    pub(super) fitted: String,
    pub(super) residual: String,
}

/// The part of a beam.
pub(super) struct HeadPart {
    pub(super) facts: Vec<(String, String)>,
    pub(super) figure: Figure,
    pub(super) lines: Vec<HeadLine>,
}

/// The part; `None` when the model gives no fit.
pub(super) fn of_beam(machine: &MachineModel, beam: &BeamModel, number: usize) -> Option<HeadPart> {
    let head = beam.head_scatter.as_ref()?;
    let cells = head.beside_table(&machine.collimation, beam);
    if cells.is_empty() {
        return None;
    }
    let fact = |name: &str, value: String| (name.to_owned(), value);
    let point = |cell: &HeadScatterCell, value: f64| [cell.side_cm, value];
    let plot = Plot {
        x: Axis("side of the jaws' square at the isocentre plane, cm".to_owned()),
        y: Axis("Sc".to_owned()),
        curves: vec![Curve {
            label: "fit".to_owned(),
            line: cells.iter().map(|cell| point(cell, cell.fitted)).collect(),
            dots: cells.iter().map(|cell| point(cell, cell.sc)).collect(),
        }],
    };
    let caption = format!(
        "Two-source head scatter beside the Sc table: dots the table ({}), line the fit at the table's sides. Only ratios of the fit are used, aperture over jaws, so jaw openings keep the table's Sc",
        beam.output_factors.sc.name()
    );
    Some(HeadPart {
        facts: vec![
            fact(
                "Extra-focal share",
                format!(
                    "{} % of the focal dose with the whole source in view",
                    fixed(100.0 * head.extra_focal, 2)
                ),
            ),
            fact(
                "Extra-focal source",
                format!(
                    "Gaussian of sigma {} cm, {} cm from the focus",
                    fixed(head.sigma_cm, 2),
                    short(head.plane_cm, 2)
                ),
            ),
            fact(
                "Backscatter to the monitor",
                format!(
                    "{} % per cm of the jaws' equivalent square",
                    fixed(100.0 * head.backscatter_per_cm, 4)
                ),
            ),
            fact(
                "Largest residual",
                format!("{} %", fixed(head.residual_percent, 2)),
            ),
        ],
        figure: Figure {
            svg: draw_dashed(&plot, &[], &format!("head-{number}"), &caption),
            caption,
        },
        lines: cells
            .iter()
            .map(|cell| HeadLine {
                side: short(cell.side_cm, 2),
                sc: fixed(cell.sc, 4),
                fitted: fixed(cell.fitted, 4),
                residual: signed(cell.residual_percent(), 2),
            })
            .collect(),
    })
}
