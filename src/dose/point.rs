//! Which point the dose is calculated at, in this order: the Beam Dose
//! Specification Point of the referenced beam; the Dose Reference that the
//! referenced beam, else the control points, name; the lowest-numbered TARGET
//! Dose Reference with coordinates; the isocentre. The planned dose belongs to
//! its point, so everything that leaves open which point that is comes out as an
//! obstacle. Where the point lies in the beam is the work of `geometry`.

use super::{Obstacle, ObstacleKind, PointBasis};
use crate::plan::{Beam, DoseReference, Plan, ReferencedBeam};
use crate::quantity::{Patient, Point, tolerance};
use crate::settings::PointRules;

/// A point and the rule that gave it.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct ChosenPoint {
    /// Which rule.
    pub(super) basis: PointBasis,
    /// From which attribute or item, in words.
    pub(super) source: String,
    /// In the patient.
    pub(super) patient: Point<Patient>,
}

/// The point, and what was found on the way.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct PointChoice {
    /// The point; `None` when not even an isocentre is given.
    pub(super) chosen: Option<ChosenPoint>,
    /// Why the planned dose may belong to another point.
    pub(super) obstacles: Vec<Obstacle>,
    /// Worth telling.
    pub(super) remarks: Vec<String>,
}

impl PointChoice {
    fn object(&mut self, message: String) {
        self.obstacles.push(Obstacle {
            kind: ObstacleKind::Point,
            message,
        });
    }
}

/// Chooses the point of a beam.
#[must_use]
pub(super) fn choose_point(
    plan: &Plan,
    beam: &Beam,
    reference: Option<&ReferencedBeam>,
    rules: &PointRules,
) -> PointChoice {
    let mut choice = PointChoice::default();
    let named = named_by_beam(plan, reference);
    let specification = reference.and_then(|reference| reference.specification_point.get());
    if let Some(patient) = specification {
        if let Named::At(reference, other) = named
            && !is_same(patient, other)
        {
            choice.object(format!(
                "the plan states two points for the beam's dose: Beam Dose Specification Point (300A,0082) at {patient} and {} at {other}; the dose was calculated at the first",
                title(reference)
            ));
        }
        choice.chosen = Some(ChosenPoint {
            basis: PointBasis::Beam,
            source: "Beam Dose Specification Point (300A,0082)".to_owned(),
            patient,
        });
        return choice;
    }
    match named {
        Named::At(reference, patient) => {
            let by_points = named_by_control_points(plan, beam);
            if !by_points.is_empty() && !by_points.iter().any(|(_, point)| is_same(*point, patient)) {
                choice.object(format!(
                    "the referenced beam names {} at {patient}, the control points name {}: which point the dose belongs to is not certain",
                    title(reference),
                    list(&by_points)
                ));
            }
            choice.chosen = Some(ChosenPoint {
                basis: PointBasis::Reference,
                source: format!("{}, named by Referenced Dose Reference UID (300A,0083)", title(reference)),
                patient,
            });
            return choice;
        }
        Named::WithoutPoint(reference) => choice.object(format!(
            "the beam's dose belongs to {} (300A,0083), which has no coordinates: the dose point is not stated",
            title(reference)
        )),
        Named::Dangling(uid) => choice.object(format!(
            "the beam's dose belongs to a dose reference that is not in the plan (UID {uid}, 300A,0083): the dose point is not stated"
        )),
        Named::Nothing => {}
    }
    if choose_from_control_points(plan, beam, &mut choice) || choose_target(plan, &mut choice) {
        return choice;
    }
    choose_isocentre(plan, beam, rules, &mut choice);
    choice
}

fn is_same(a: Point<Patient>, b: Point<Patient>) -> bool {
    a.distance_cm(b) <= tolerance::SHARED_POINT_CM
}

fn title(reference: &DoseReference) -> String {
    reference.number.get().map_or_else(
        || "a dose reference without number".to_owned(),
        |number| format!("dose reference {number}"),
    )
}

fn list(points: &[(&DoseReference, Point<Patient>)]) -> String {
    let texts: Vec<String> = points
        .iter()
        .map(|(reference, point)| format!("{} at {point}", title(reference)))
        .collect();
    texts.join(", ")
}

enum Named<'a> {
    At(&'a DoseReference, Point<Patient>),
    WithoutPoint(&'a DoseReference),
    Dangling(&'a str),
    Nothing,
}

fn named_by_beam<'a>(plan: &'a Plan, reference: Option<&'a ReferencedBeam>) -> Named<'a> {
    let Some(uid) = reference.and_then(|reference| reference.dose_reference_uid.value()) else {
        return Named::Nothing;
    };
    let found = plan
        .dose_references
        .iter()
        .find(|candidate| candidate.uid.value() == Some(uid));
    match found {
        None => Named::Dangling(uid),
        Some(found) => found
            .point
            .get()
            .map_or(Named::WithoutPoint(found), |point| Named::At(found, point)),
    }
}

/// Dose references with coordinates that the control points name, each once.
fn named_by_control_points<'a>(
    plan: &'a Plan,
    beam: &Beam,
) -> Vec<(&'a DoseReference, Point<Patient>)> {
    let mut numbers: Vec<i32> = beam
        .control_points
        .iter()
        .flat_map(|point| &point.referenced_doses)
        .filter_map(|dose| dose.number.get())
        .collect();
    numbers.sort_unstable();
    numbers.dedup();
    plan.dose_references
        .iter()
        .filter(|reference| {
            reference
                .number
                .value()
                .is_some_and(|number| numbers.contains(number))
        })
        .filter_map(|reference| Some((reference, reference.point.get()?)))
        .collect()
}

fn choose_from_control_points(plan: &Plan, beam: &Beam, choice: &mut PointChoice) -> bool {
    let mut named = named_by_control_points(plan, beam);
    // Targets before organs, then by number.
    named.sort_by_key(|(reference, _)| (!is_target(reference), reference.number.get()));
    let Some(&(reference, patient)) = named.first() else {
        return false;
    };
    if named.iter().any(|(_, point)| !is_same(*point, patient)) {
        choice.object(format!(
            "the control points name several points ({}): which of them the beam's dose belongs to is not stated",
            list(&named)
        ));
    }
    choice.chosen = Some(ChosenPoint {
        basis: PointBasis::Reference,
        source: format!(
            "{}, named by the control points (300C,0051)",
            title(reference)
        ),
        patient,
    });
    true
}

fn is_target(reference: &DoseReference) -> bool {
    reference.reference_type.value().map(String::as_str) == Some("TARGET")
}

fn choose_target(plan: &Plan, choice: &mut PointChoice) -> bool {
    let mut targets: Vec<(&DoseReference, Point<Patient>)> = plan
        .dose_references
        .iter()
        .filter(|reference| is_target(reference))
        .filter_map(|reference| Some((reference, reference.point.get()?)))
        .collect();
    targets.sort_by_key(|(reference, _)| (reference.number.is_absent(), reference.number.get()));
    let Some(&(reference, patient)) = targets.first() else {
        return false;
    };
    if targets.iter().any(|(_, point)| !is_same(*point, patient)) {
        choice.remarks.push(format!(
            "several TARGET dose references have coordinates ({}); the lowest number is used",
            list(&targets)
        ));
    }
    choice.chosen = Some(ChosenPoint {
        basis: PointBasis::Target,
        source: format!("{} of type TARGET (300A,0018)", title(reference)),
        patient,
    });
    true
}

fn choose_isocentre(plan: &Plan, beam: &Beam, rules: &PointRules, choice: &mut PointChoice) {
    let isocentre = beam
        .control_points
        .iter()
        .find_map(|point| point.isocentre.get());
    let planning_system = plan.identity.model_name.value();
    let serves = planning_system.is_some_and(|name| {
        rules
            .isocentre_serves_for
            .iter()
            .any(|allowed| allowed == name)
    });
    if !serves {
        choice.object(
            "the dose point is not stated; a number at the isocentre is shown, but nothing says that the planned dose belongs there (the site file may allow it for a planning system)"
                .to_owned(),
        );
    }
    choice.chosen = isocentre.map(|patient| ChosenPoint {
        basis: PointBasis::Isocentre,
        source: match (serves, planning_system) {
            (true, Some(name)) => {
                format!("isocentre (300A,012C), allowed by the site file for {name}")
            }
            _ => "isocentre (300A,012C), for showing a number only".to_owned(),
        },
        patient,
    });
}
