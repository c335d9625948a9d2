//! What stands in a photon beam besides jaws and leaves: trays, couch, bolus,
//! and what no table covers (compensators, applicators, other accessories).
//! Factors that the plan states are the planning system's word and are not used.

use super::delivery::turn_between_deg;
use super::depth_question::DepthFindings;
use super::sweep::PlannedSweep;
use super::{DepthBasis, FieldWedge, Obstacle, ObstacleKind, Tray};
use crate::beam_model::{BeamModel, CouchArc};
use crate::plan::Beam;
use crate::quantity::{Given, tolerance};

/// What the devices in the beam come to.
#[derive(Clone, Debug, Default)]
pub(super) struct Modifiers<'a> {
    /// A tray that the model knows.
    pub(super) tray: Option<Tray>,
    /// A wedge that the model knows; filled in by the caller, who knows where meterset accrues.
    pub(super) wedge: Option<FieldWedge<'a>>,
    /// A dynamic wedge that a sweep of the model makes, with its name in words; filled in likewise.
    pub(super) swept: Option<(PlannedSweep<'a>, String)>,
    /// The couch, where the model has it in the beam.
    pub(super) couch: Option<CouchArc>,
    /// Hardware that no table covers: with one of these no number is calculated.
    pub(super) uncovered: Vec<Obstacle>,
    /// Worth telling.
    pub(super) remarks: Vec<String>,
}

fn named(id: &Given<String>) -> String {
    id.value()
        .map_or_else(|| "without ID".to_owned(), |id| format!("{id:?}"))
}

fn uncovered(message: String) -> Obstacle {
    Obstacle {
        kind: ObstacleKind::Technique,
        message: format!("{message}: no table covers it, and jaws alone would be wrong"),
    }
}

/// Trays, accessories, applicators, compensators.
pub(super) fn hardware<'a>(beam: &Beam, model: Option<&BeamModel>) -> Modifiers<'a> {
    let mut found = Modifiers::default();
    for compensator in &beam.compensators {
        found.uncovered.push(uncovered(format!(
            "a compensator ({}) is in the beam",
            named(&compensator.id)
        )));
    }
    for applicator in &beam.applicators {
        found.uncovered.push(uncovered(format!(
            "an applicator ({}) is on a photon beam",
            named(&applicator.id)
        )));
    }
    let mut trays: Vec<&Given<String>> = Vec::new();
    for accessory in &beam.accessories {
        let kind = accessory.kind.value().map_or("", String::as_str);
        if kind.eq_ignore_ascii_case("TRAY") {
            trays.push(&accessory.id);
        } else {
            let kind = if kind.is_empty() { "not stated" } else { kind };
            found.uncovered.push(uncovered(format!(
                "an accessory ({}, type {kind}) is in the beam",
                named(&accessory.id)
            )));
        }
    }
    trays.extend(
        beam.blocks
            .iter()
            .map(|block| &block.tray_id)
            .filter(|id| !id.is_absent()),
    );
    place_trays(&trays, model, &mut found);
    if trays.is_empty()
        && let Some(&factor) = beam.total_block_tray_factor.value()
        && (factor - 1.0).abs() > f64::EPSILON
    {
        found.remarks.push(format!(
            "the plan states a total block tray factor of {factor} (300A,00F2) but names no tray: no tray factor is applied"
        ));
    }
    found
}

fn place_trays(trays: &[&Given<String>], model: Option<&BeamModel>, found: &mut Modifiers<'_>) {
    let Some((first, others)) = trays.split_first() else {
        return;
    };
    let trimmed = |id: &Given<String>| id.value().map(|id| id.trim().to_owned());
    if others.iter().any(|other| trimmed(other) != trimmed(first)) {
        let ids: Vec<String> = trays.iter().map(|id| named(id)).collect();
        found.uncovered.push(uncovered(format!(
            "several trays ({}) are in the beam",
            ids.join(", ")
        )));
        return;
    }
    let Some(model) = model else {
        return;
    };
    let known = trimmed(first).and_then(|id| {
        let transmission = model.tray_transmission(&id)?;
        Some(Tray { id, transmission })
    });
    match known {
        Some(tray) => found.tray = Some(tray),
        None => found.uncovered.push(uncovered(format!(
            "the beam model does not know the tray {}",
            named(first)
        ))),
    }
}

/// The couch at this gantry angle: applied once when the model has it in the beam.
pub(super) fn couch(
    beam: &BeamModel,
    gantry_deg: f64,
    couch_deg: f64,
    depths: &DepthFindings,
    found: &mut Modifiers<'_>,
) {
    let gantry_deg = gantry_deg.rem_euclid(360.0);
    let Some(arc) = beam.couch_arc(gantry_deg) else {
        return;
    };
    found.couch = Some(arc);
    let doubts = couch_doubts(couch_deg, depths);
    found.remarks.push(format!(
        "couch transmission {} applied from the beam model (gantry {gantry_deg:.1} degrees); whether the planning system has the couch in its dose is not stated in the plan{doubts}",
        arc.transmission
    ));
}

/// What stands against the couch of the model: clauses that follow a remark, or nothing.
pub(super) fn couch_doubts(couch_deg: f64, depths: &DepthFindings) -> String {
    let twice = if used_radiological(depths) {
        "; the effective depth may already contain the couch, then it counts twice"
    } else {
        ""
    };
    let turned = if turn_between_deg(couch_deg, 0.0) > tolerance::ANGLE_DEG {
        "; the arc is by gantry angle and does not look at the turned couch"
    } else {
        ""
    };
    format!("{twice}{turned}")
}

/// Whether the depth in use is a radiological one.
fn used_radiological(depths: &DepthFindings) -> bool {
    depths
        .candidates
        .first()
        .is_some_and(|depth| depths.radiological.contains(&depth.basis))
}

/// What bolus does to the depth in use: nothing says in a plan whether SSD and
/// depth are meant with it or without.
pub(super) fn bolus(beam: &Beam, depths: &DepthFindings) -> (Option<Obstacle>, Option<String>) {
    if beam.boluses.is_empty() {
        return (None, None);
    }
    let ids: Vec<String> = beam.boluses.iter().map(|bolus| named(&bolus.id)).collect();
    let ids = ids.join(", ");
    let Some(depth) = depths.candidates.first() else {
        return (None, Some(format!("bolus {ids} is in the beam")));
    };
    match depth.basis {
        DepthBasis::Table => (
            None,
            Some(format!(
                "bolus {ids} is in the beam; the depth table's depth is used as it stands, so it must include the bolus"
            )),
        ),
        DepthBasis::Plan if used_radiological(depths) => (
            None,
            Some(format!(
                "bolus {ids} is in the beam; the plan's equivalent depth (300A,0089) is taken to include it"
            )),
        ),
        DepthBasis::Plan | DepthBasis::Ssd => (
            Some(Obstacle {
                kind: ObstacleKind::Depth,
                message: format!(
                    "bolus {ids} is in the beam and whether the depth includes it is not stated: give the depth in the depth table"
                ),
            }),
            None,
        ),
    }
}
