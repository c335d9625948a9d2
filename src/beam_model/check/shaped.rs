//! What shaped and moving fields rest on: whether the scatter kernel gives its
//! squares back, whether its zero-field end attenuates like a primary beam, and
//! how well the two-source head scatter meets the Sc table.

use super::ModelFinding;
use crate::beam_model::scatter::ScatterRow;
use crate::beam_model::{BeamModel, HeadScatterCell, MachineModel};

/// Attenuation of a 6 MV primary in water between 10 and 20 cm, per cm: that of photons of 1.8 to 2.4 MeV by the
/// coefficients of NIST (1.5 MeV 0.0575, 2 MeV 0.0494, 3 MeV 0.0397 cm2/g), which the spectra of flattened 6 MV beams
/// come to at these depths.
const ATTENUATION_6_MV: (f64, f64) = (0.045, 0.053);

pub(super) fn check(machine: &MachineModel, beam: &BeamModel) -> Vec<ModelFinding> {
    let mut findings = vec![kernel(beam)];
    findings.extend(attenuation(beam));
    findings.push(head_scatter(machine, beam));
    findings
}

fn kernel(beam: &BeamModel) -> ModelFinding {
    let table = &beam.depth_table;
    let rows: Vec<ScatterRow<'_>> = beam.scatter_rows().collect();
    let worst = rows
        .iter()
        .map(|row| (row.worst_residual_percent(), row))
        .max_by(|one, other| one.0.total_cmp(&other.0));
    let Some((percent, row)) = worst else {
        return ModelFinding::note(
            "no depth has squares enough to tell scatter from primary; shaped and moving fields will not be verifiable",
        )
        .in_table(table);
    };
    let form = rows
        .iter()
        .map(|row| (row.form_residual_percent(), row.depth_cm))
        .max_by(|one, other| one.0.total_cmp(&other.0));
    let form = form.map_or_else(String::new, |(percent, depth_cm)| {
        format!(
            "; towards zero field the bounded form misses the smallest squares by at most {percent:.2} % (depth {depth_cm} cm)"
        )
    });
    ModelFinding::note(format!(
        "the scatter kernel gives the squares of {} depths back within {percent:.3} % (worst at depth {} cm){form}",
        rows.len(),
        row.depth_cm
    ))
    .measured(percent)
    .in_table(table)
}

fn attenuation(beam: &BeamModel) -> Option<ModelFinding> {
    let per_cm = beam.primary_attenuation_per_cm()?;
    let message = format!(
        "the zero-field terms imply an attenuation of the primary of {per_cm:.4} per cm between 10 and 20 cm"
    );
    let table = &beam.depth_table;
    let (least, greatest) = ATTENUATION_6_MV;
    let flattened_6_mv =
        (beam.nominal_energy - 6.0).abs() < 0.5 && beam.fluence_mode_ids.is_empty();
    let finding = if !flattened_6_mv {
        ModelFinding::note(message)
    } else if (least..=greatest).contains(&per_cm) {
        ModelFinding::note(format!(
            "{message}, plausible for 6 MV ({least} to {greatest})"
        ))
    } else {
        let limit = if per_cm < least { least } else { greatest };
        ModelFinding::note(format!(
            "{message}, outside what is plausible for 6 MV ({least} to {greatest}): look at the smallest squares of the table, from which they are carried on"
        ))
        .limit(limit)
    };
    Some(finding.measured(per_cm).in_table(table))
}

fn head_scatter(machine: &MachineModel, beam: &BeamModel) -> ModelFinding {
    let table = &beam.output_factors.sc;
    let cells = beam
        .head_scatter
        .as_ref()
        .map(|head| head.beside_table(&machine.collimation, beam))
        .unwrap_or_default();
    let worst = cells.iter().max_by(|one, other| {
        let size = |cell: &HeadScatterCell| cell.residual_percent().abs();
        size(one).total_cmp(&size(other))
    });
    let Some(worst) = worst else {
        return ModelFinding::note(
            "no two-source head scatter: the model gives no extra_focal_distance_cm or no distances of the jaws; leaf-shaped fields will not be verifiable",
        )
        .in_table(table);
    };
    let percent = worst.residual_percent();
    ModelFinding::note(format!(
        "the two-source head scatter meets the Sc table within {:.2} % (worst {percent:+.2} % at side {} cm)",
        percent.abs(),
        worst.side_cm
    ))
    .measured(percent)
    .in_table(table)
}
