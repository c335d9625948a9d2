//! Beam quality: TPR20,10 of the tables, beside the nominal energy and beside
//! PDD20,10; output per MU at the maximum.

use super::ModelFinding;
use crate::beam_model::{BeamModel, MachineModel};
use crate::quantity::{PointSquare, SurfaceSquare};

/// Usual TPR20,10 of flattened beams by nominal MV (common practice).
const USUAL_TPR20_10: &[(f64, f64)] = &[
    (4.0, 0.620),
    (6.0, 0.670),
    (8.0, 0.705),
    (10.0, 0.735),
    (15.0, 0.762),
    (18.0, 0.778),
    (25.0, 0.800),
];

/// Machines of one nominal energy differ by this much (common practice).
const USUAL_SPREAD: f64 = 0.025;

/// Without flattening filter a beam is softer by up to this much more (common practice).
const UNFLATTENED_SOFTER: f64 = 0.04;

/// The relation of TPR20,10 and PDD20,10 holds within this.
const RELATION_LIMIT: f64 = 0.010;

/// Dose per MU at the maximum, 10 x 10 at the distance of the isocentre, cGy/MU: linacs are adjusted to 1 at the
/// maximum or near it, at the isocentre or at SSD 100 (common practice).
const OUTPUT_RANGE: (f64, f64) = (0.85, 1.35);

/// TPR20,10 of the 10 x 10 field; `None` when the tables do not reach that far.
pub(super) fn tpr20_10(beam: &BeamModel) -> Option<f64> {
    let at = |depth_cm| beam.tpr(depth_cm, PointSquare::new(10.0)).ok();
    Some(at(20.0)?.value / at(10.0)?.value)
}

/// PDD20,10 of the 10 x 10 field at SSD 100.
fn pdd20_10(beam: &BeamModel) -> Option<f64> {
    let at = |depth_cm| {
        let square = SurfaceSquare::new(10.0);
        beam.pdd_percent(depth_cm, square, 100.0).ok()
    };
    Some(at(20.0)?.value / at(10.0)?.value)
}

/// TPR20,10 from PDD20,10 at SSD 100: 1.2661 PDD20,10 - 0.0595 (IAEA TRS-398; Followill et al. 1998).
#[must_use]
pub fn tpr20_10_from_pdd20_10(pdd20_10: f64) -> f64 {
    1.2661 * pdd20_10 - 0.0595
}

pub(super) fn check(machine: &MachineModel, beam: &BeamModel) -> Vec<ModelFinding> {
    let table = &beam.depth_table;
    let Some(tpr20_10) = tpr20_10(beam) else {
        return vec![
            ModelFinding::note(
                "TPR20,10 cannot be worked out: the tables do not reach 20 cm for 10 x 10",
            )
            .in_table(table),
        ];
    };
    let mut findings = vec![
        ModelFinding::note(format!("TPR20,10 is {tpr20_10:.4}"))
            .measured(tpr20_10)
            .in_table(table),
    ];
    if let Some(usual) = usual_tpr20_10(beam.nominal_energy) {
        let softer = if beam.fluence_mode_ids.is_empty() {
            0.0
        } else {
            UNFLATTENED_SOFTER
        };
        let (least, greatest) = (usual - USUAL_SPREAD - softer, usual + USUAL_SPREAD);
        if tpr20_10 < least || tpr20_10 > greatest {
            let limit = if tpr20_10 < least { least } else { greatest };
            findings.push(
                ModelFinding::warning(format!(
                    "TPR20,10 {tpr20_10:.4} is unusual for {} MV ({least:.3} to {greatest:.3}): the table of another energy?",
                    beam.nominal_energy
                ))
                .measured(tpr20_10)
                .limit(limit)
                .in_table(table),
            );
        }
    }
    if let Some(pdd20_10) = pdd20_10(beam) {
        let expected = tpr20_10_from_pdd20_10(pdd20_10);
        let message = format!(
            "PDD20,10 at SSD 100 is {pdd20_10:.4}, for which IAEA TRS-398 gives TPR20,10 {expected:.4}"
        );
        let finding = if (tpr20_10 - expected).abs() > RELATION_LIMIT {
            ModelFinding::warning(message)
        } else {
            ModelFinding::note(message)
        };
        findings.push(finding.measured(tpr20_10).limit(expected).in_table(table));
    }
    findings.extend(output_at_maximum(machine, beam));
    findings
}

/// Linear between the tabulated energies.
fn usual_tpr20_10(nominal_mv: f64) -> Option<f64> {
    USUAL_TPR20_10
        .iter()
        .zip(USUAL_TPR20_10.iter().skip(1))
        .find(|((low, _), (high, _))| (*low..=*high).contains(&nominal_mv))
        .map(|((low, at_low), (high, at_high))| {
            at_low + (at_high - at_low) * (nominal_mv - low) / (high - low)
        })
}

fn output_at_maximum(machine: &MachineModel, beam: &BeamModel) -> Option<ModelFinding> {
    let at_maximum = beam.tpr(beam.d_max_cm, PointSquare::new(10.0)).ok()?.value;
    let output = beam.output;
    let per_mu =
        output.dose_per_mu_cgy * at_maximum * (output.source_distance_cm / machine.sad_cm).powi(2);
    let (least, greatest) = OUTPUT_RANGE;
    let message = format!(
        "D'0 amounts to {per_mu:.3} cGy/MU at the maximum with the point at the isocentre, 10 x 10"
    );
    let unusual = per_mu < least || per_mu > greatest;
    let limit = if per_mu < least { least } else { greatest };
    let finding = if unusual {
        ModelFinding::warning(format!(
            "{message}: unusual; does S_ref belong to the same setup?"
        ))
    } else {
        ModelFinding::note(message)
    };
    Some(finding.measured(per_mu).limit(limit))
}
