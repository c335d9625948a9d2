//! What must hold before a beam's number can be a verification: readable
//! attributes, a meterset in MU, a model of the machine with this energy and
//! this source-axis distance.

use super::{BeamCalculation, BeamRequest, FieldModel, ModelAnswer, Obstacle, ObstacleKind};
use crate::plan::{Beam, Effect, FractionGroup, NoteScope, RadiationType, ReferencedBeam};
use crate::quantity::tolerance;

fn obstacle(kind: ObstacleKind, message: String) -> Obstacle {
    Obstacle { kind, message }
}

/// So many reading notes are repeated at a beam. A faulty file has thousands,
/// and each of its beams would repeat them all.
const NOTES_REPEATED: usize = 20;

/// Reading notes that stop this beam.
pub(super) fn reading_obstacles(request: &BeamRequest<'_>) -> Vec<Obstacle> {
    let group_index = request.group.map(|(group, _)| group);
    let mut stopping = request
        .plan
        .notes
        .iter()
        .filter(|note| match (note.effect, note.scope) {
            (Effect::None, _) => false,
            (Effect::BlocksPlan, _) => true,
            (Effect::BlocksScope, NoteScope::Plan) => true,
            (Effect::BlocksScope, NoteScope::Beam(index)) => index == request.beam_index,
            (Effect::BlocksScope, NoteScope::FractionGroup(index)) => Some(index) == group_index,
        });
    let mut found: Vec<Obstacle> = stopping
        .by_ref()
        .take(NOTES_REPEATED)
        .map(|note| {
            obstacle(
                ObstacleKind::Reading,
                format!("{}; at {}", note.message, note.place),
            )
        })
        .collect();
    let more = stopping.count();
    if more > 0 {
        found.push(obstacle(
            ObstacleKind::Reading,
            format!("{more} more reading notes stop this beam; `counterfoil read` lists them"),
        ));
    }
    if request.plan.beams.get(request.beam_index).is_none() {
        found.push(obstacle(
            ObstacleKind::Reading,
            format!("the plan has no beam item {}", request.beam_index),
        ));
    }
    found
}

/// A reference that leads nowhere.
pub(super) fn group_obstacles(
    request: &BeamRequest<'_>,
    group: Option<&FractionGroup>,
    reference: Option<&ReferencedBeam>,
) -> Option<Obstacle> {
    let dangling = request.group.is_some() && (group.is_none() || reference.is_none());
    dangling.then(|| {
        obstacle(
            ObstacleKind::Reading,
            "the fraction group's reference to the beam is not in the plan".to_owned(),
        )
    })
}

/// The meterset must be there, above zero, and in MU.
pub(super) fn meterset_obstacle(beam: &Beam, reference: Option<&ReferencedBeam>) -> Vec<Obstacle> {
    let mut found = Vec::new();
    let mut object = |message: String| found.push(obstacle(ObstacleKind::Meterset, message));
    match reference.map(|reference| reference.meterset_mu.get()) {
        None => object("no fraction group references the beam: it has no meterset".to_owned()),
        Some(None) => object("Beam Meterset (300A,0086) is not given".to_owned()),
        Some(Some(meterset_mu)) if meterset_mu.is_nan() || meterset_mu <= 0.0 => {
            object(format!("Beam Meterset (300A,0086) is {meterset_mu} MU"));
        }
        Some(Some(_)) => {}
    }
    if let Some(unit) = beam.dosimeter_unit.value()
        && unit != "MU"
    {
        object(format!(
            "the meterset is in {unit} (300A,00B3), not in MU: the beam model knows dose per MU only"
        ));
    }
    found
}

/// The source-axis distance must be given.
pub(super) fn sad_obstacles(beam: &Beam) -> Option<Obstacle> {
    beam.sad_cm.is_absent().then(|| {
        obstacle(
            ObstacleKind::Reading,
            "Source-Axis Distance (300A,00B4) is not given or not credible".to_owned(),
        )
    })
}

/// The photon beam model for this beam; what is missing becomes an obstacle.
pub(super) fn photon_model<'a>(
    request: &BeamRequest<'a>,
    beam: &Beam,
    result: &mut BeamCalculation,
) -> Option<FieldModel<'a>> {
    let mut object = |message: String| {
        result
            .obstacles
            .push(obstacle(ObstacleKind::Model, message))
    };
    let machine = match &request.model {
        ModelAnswer::Found(machine) => *machine,
        ModelAnswer::Unknown { known_names } => {
            let known = if known_names.is_empty() {
                "none".to_owned()
            } else {
                known_names.join(", ")
            };
            object(match beam.machine.value() {
                Some(name) => {
                    format!("no beam model serves the machine {name:?}; known names: {known}")
                }
                None => format!(
                    "Treatment Machine Name (300A,00B2) is not given, so no beam model can be chosen; known names: {known}"
                ),
            });
            return None;
        }
    };
    if let Some(sad_cm) = beam.sad_cm.get()
        && (sad_cm - machine.sad_cm).abs() > tolerance::SAD_CM
    {
        object(format!(
            "the plan's source-axis distance is {sad_cm} cm, the beam model {} has {} cm",
            machine.name, machine.sad_cm
        ));
    }
    let radiation = beam.radiation.value()?;
    let mut matching = machine
        .beams
        .iter()
        .filter(|candidate| candidate.matches(radiation, &beam.energy));
    let found = matching.next();
    if found.is_none() && *radiation != RadiationType::Electron {
        let labels: Vec<&str> = machine
            .beams
            .iter()
            .map(|candidate| candidate.label.as_str())
            .collect();
        object(match beam.energy.label() {
            Some(label) => format!(
                "the beam model {} has no {} beam of energy {label}; it has {}",
                machine.name,
                radiation.term(),
                labels.join(", ")
            ),
            None => format!(
                "Nominal Beam Energy (300A,0114) is not given; the beam model {} has {}",
                machine.name,
                labels.join(", ")
            ),
        });
    }
    let found = found.filter(|_| *radiation == RadiationType::Photon)?;
    Some(FieldModel {
        beam: found,
        upper_jaws: machine.upper_jaws,
    })
}
