//! Rules over the machine and over a beam's single numbers: approval, origin,
//! reference conditions, transmissions, coverage, proof.

use super::ModelFinding;
use crate::beam_model::{BeamModel, DataOrigin, MachineModel};
use crate::quantity::tolerance;

/// Coverage that a department needs for most fields: sides and depths, cm (common practice).
const SIDES_CM: (f64, f64) = (4.0, 40.0);
const DEPTH_CM: f64 = 30.0;
const RADIUS_CM: f64 = 20.0;

/// Depth of maximum by nominal MV, 5 x 5 (IAEA handbook for teachers and students, table 6.I, from memory).
const USUAL_D_MAX_CM: &[(f64, f64)] = &[
    (4.0, 1.0),
    (6.0, 1.5),
    (10.0, 2.5),
    (18.0, 3.5),
    (25.0, 5.0),
];
const D_MAX_LIMIT_CM: f64 = 0.8;

/// Published exchange coefficients (common practice).
const EXCHANGE_RANGE: (f64, f64) = (1.0, 2.0);
/// Leaf transmission 0.4 to 2 %, with room (common practice).
const LEAF_RANGE: (f64, f64) = (0.002, 0.03);
/// Trays about 0.97, couches above 0.9 (common practice).
const TRAY_RANGE: (f64, f64) = (0.90, 1.0);
const COUCH_RANGE: (f64, f64) = (0.85, 1.0);

pub(super) fn check(machine: &MachineModel, today: jiff::civil::Date) -> Vec<ModelFinding> {
    let mut findings = Vec::new();
    match &machine.approval {
        None => findings.push(ModelFinding::warning(
            "nobody has approved the model for use",
        )),
        Some(approval) if today < approval.on => findings.push(ModelFinding::warning(format!(
            "the approval by {} holds from {} only",
            approval.by, approval.on
        ))),
        Some(approval) if today > approval.until => findings.push(ModelFinding::warning(format!(
            "the approval by {} ended on {}",
            approval.by, approval.until
        ))),
        Some(approval) => findings.push(ModelFinding::note(format!(
            "approved by {} until {}",
            approval.by, approval.until
        ))),
    }
    match machine.provenance.origin {
        DataOrigin::Measured => {}
        DataOrigin::Published => findings.push(ModelFinding::note(
            "the data are published ones, not measured on the machine that the model serves",
        )),
        DataOrigin::Invented => findings.push(ModelFinding::note(
            "the data are invented: demonstration, not for clinical use; every report says so",
        )),
    }
    if machine.provenance.on > today {
        findings.push(ModelFinding::warning(format!(
            "the data are dated {}, in the future",
            machine.provenance.on
        )));
    }
    for (index, bank) in machine.collimation.leaf_banks.iter().enumerate() {
        let name = format!("transmission of leaf bank {}", index + 1);
        findings.extend(unusual(&name, bank.transmission, LEAF_RANGE));
    }
    findings
}

pub(super) fn check_beam(machine: &MachineModel, beam: &BeamModel) -> Vec<ModelFinding> {
    let mut findings = Vec::new();
    findings.extend(reference_distance(machine, beam));
    findings.extend(depth_of_maximum(beam));
    findings.extend(unusual("exchange_k", beam.exchange_k, EXCHANGE_RANGE));
    for (id, transmission) in &beam.trays {
        let name = format!("transmission of tray `{id}`");
        findings.extend(unusual(&name, *transmission, TRAY_RANGE));
    }
    for arc in &beam.couch {
        let name = format!("couch transmission from {} degrees", arc.from_deg);
        findings.extend(unusual(&name, arc.transmission, COUCH_RANGE));
    }
    findings.extend(spread(beam));
    findings.extend(coverage(beam));
    findings.push(ModelFinding::note(match beam.proof.len() {
        0 => "no measured point proves the beam".to_owned(),
        1 => "one measured point stands as proof".to_owned(),
        count => format!("{count} measured points stand as proof"),
    }));
    findings
}

fn unusual(name: &str, value: f64, (least, greatest): (f64, f64)) -> Option<ModelFinding> {
    let limit = if value < least { least } else { greatest };
    (value < least || value > greatest).then(|| {
        ModelFinding::warning(format!(
            "{name} is {value}, outside the usual range {least} to {greatest}"
        ))
        .measured(value)
        .limit(limit)
    })
}

fn reference_distance(machine: &MachineModel, beam: &BeamModel) -> Option<ModelFinding> {
    let stated_cm = beam.output.source_distance_cm;
    let isocentric_cm = machine.sad_cm;
    let fixed_cm = machine.sad_cm + beam.output.depth_cm;
    let fits = |wanted: f64| (stated_cm - wanted).abs() <= tolerance::SAD_CM;
    if fits(isocentric_cm) || fits(fixed_cm) {
        return None;
    }
    Some(
        ModelFinding::warning(format!(
            "S_ref {stated_cm} cm is neither the isocentre's distance {isocentric_cm} nor SSD {isocentric_cm} plus d0, {fixed_cm}: an inverse-square slip?"
        ))
        .measured(stated_cm)
        .limit(isocentric_cm),
    )
}

fn depth_of_maximum(beam: &BeamModel) -> Option<ModelFinding> {
    let usual_cm = USUAL_D_MAX_CM
        .iter()
        .zip(USUAL_D_MAX_CM.iter().skip(1))
        .find(|((low, _), (high, _))| (*low..=*high).contains(&beam.nominal_energy))
        .map(|((low, at_low), (high, at_high))| {
            at_low + (at_high - at_low) * (beam.nominal_energy - low) / (high - low)
        })?;
    ((beam.d_max_cm - usual_cm).abs() > D_MAX_LIMIT_CM).then(|| {
        ModelFinding::warning(format!(
            "d_max {} cm is unusual for {} MV (about {usual_cm:.1} cm)",
            beam.d_max_cm, beam.nominal_energy
        ))
        .measured(beam.d_max_cm)
        .limit(usual_cm)
    })
}

/// A zero spread would let every deviation look inexplicable.
fn spread(beam: &BeamModel) -> Vec<ModelFinding> {
    let given = &beam.uncertainty;
    let parts = [
        ("output_percent", given.output_percent),
        ("depth_table_percent", given.depth_table_percent),
        ("head_scatter_percent", given.head_scatter_percent),
        ("phantom_scatter_percent", given.phantom_scatter_percent),
        ("off_axis_percent", given.off_axis_percent),
    ];
    parts
        .into_iter()
        .filter(|(_, percent)| *percent <= 0.0)
        .map(|(name, percent)| {
            ModelFinding::warning(format!("uncertainty.{name} is 0, which no measurement is"))
                .measured(percent)
        })
        .collect()
}

fn coverage(beam: &BeamModel) -> Vec<ModelFinding> {
    let mut findings = Vec::new();
    let (least_cm, greatest_cm) = SIDES_CM;
    let table = &beam.depth_table;
    let factors = &beam.output_factors;
    let sides = [
        (table, table.columns()),
        (&factors.sc, factors.sc.rows()),
        (&factors.sp, factors.sp.rows()),
    ];
    for (grid, covered) in sides {
        if let (Some(&first), Some(&last)) = (covered.first(), covered.last())
            && (first > least_cm || last < greatest_cm)
        {
            findings.push(
                ModelFinding::note(format!(
                    "covers sides {first} to {last} cm; fields beyond will not be verifiable"
                ))
                .in_table(grid),
            );
        }
    }
    let depths = [
        (table, table.rows()),
        (&beam.off_axis.grid, beam.off_axis.grid.columns()),
    ];
    for (grid, covered) in depths {
        if let [_, .., last] = *covered
            && last < DEPTH_CM
        {
            findings.push(
                ModelFinding::note(format!(
                    "reaches a depth of {last} cm; deeper points will not be verifiable"
                ))
                .in_table(grid),
            );
        }
    }
    let off_axis = &beam.off_axis.grid;
    if let Some(&last) = off_axis.rows().last()
        && last < RADIUS_CM
    {
        findings.push(
            ModelFinding::note(format!(
                "reaches {last} cm off the axis; points further out will not be verifiable"
            ))
            .in_table(off_axis),
        );
    }
    findings
}
