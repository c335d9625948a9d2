//! Where the chosen point lies in this beam, from what the plan states about
//! gantry, collimator, couch, isocentre and patient position. An attribute that
//! is missing is an obstacle and never taken as zero, except tilts, which the
//! standard leaves out when there is none.

use super::geometry::{CouchAngles, HeadAngles, patient_to_collimator, ray_through};
use super::point::ChosenPoint;
use super::technique::tilt_obstacles;
use super::{DosePoint, Obstacle, ObstacleKind, RayPoint, Technique};
use crate::plan::{Beam, ControlPoint, PatientPosition, PatientSetup, Plan};
use crate::quantity::{Collimator, Patient, Point, tolerance};

/// A point in the beam.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Placement {
    /// The point, as far as it could be placed.
    pub(super) point: Option<DosePoint>,
    /// Its ray, when geometry and source distance are known and the beam stands still.
    pub(super) ray: Option<RayPoint>,
    /// Whether the patient setup says FIXED_SSD.
    pub(super) fixed_ssd: bool,
    /// What is missing.
    pub(super) obstacles: Vec<Obstacle>,
    /// Worth telling.
    pub(super) remarks: Vec<String>,
}

impl Placement {
    fn object(&mut self, message: impl Into<String>) {
        self.obstacles.push(Obstacle {
            kind: ObstacleKind::Reading,
            message: message.into(),
        });
    }
}

/// Places the point at a control point's geometry.
pub(super) fn place(
    plan: &Plan,
    beam: &Beam,
    at: &ControlPoint,
    chosen: Option<ChosenPoint>,
    technique: Technique,
) -> Placement {
    let mut placement = Placement::default();
    for (what, angle) in [
        ("Gantry Angle (300A,011E)", &at.gantry_deg),
        ("Beam Limiting Device Angle (300A,0120)", &at.collimator_deg),
        ("Patient Support Angle (300A,0122)", &at.couch_deg),
    ] {
        if angle.is_absent() {
            placement.object(format!(
                "{what} is not given: where the point lies in the beam is not certain"
            ));
        }
    }
    if at.isocentre.is_absent() {
        placement.object("Isocenter Position (300A,012C) is not given");
    }
    let setup = patient_setup(plan, beam, &mut placement);
    placement.fixed_ssd = setup.fixed_ssd;
    let Some(chosen) = chosen else {
        return placement;
    };
    let at_isocentre = at
        .isocentre
        .value()
        .is_some_and(|isocentre| isocentre.distance_cm(chosen.patient) <= tolerance::POSITION_CM);
    if setup.position.is_none() {
        if at_isocentre {
            placement.remarks.push(
                "Patient Position (0018,5100) is not known; the point is the isocentre, so it does not matter".to_owned(),
            );
        } else {
            placement.object(
                "Patient Position (0018,5100) is not known: where the point lies in the beam cannot be said",
            );
        }
    }
    let collimator = match at_isocentre {
        true => Some(Point::origin()),
        false => setup
            .position
            .and_then(|position| in_collimator(at, chosen.patient, position)),
    };
    // While the gantry turns the point has no one place in the beam.
    let collimator = collimator.filter(|_| technique != Technique::Arc);
    let ray = beam
        .sad_cm
        .get()
        .zip(collimator)
        .and_then(|(sad_cm, point)| ray_through(point, sad_cm));
    if collimator.is_some() && !beam.sad_cm.is_absent() && ray.is_none() {
        placement.object("the point is not below the source");
    }
    placement.ray = ray;
    placement.point = Some(DosePoint {
        basis: chosen.basis,
        source: chosen.source,
        patient: chosen.patient,
        collimator,
        spd_cm: ray.map(|ray| ray.spd_cm),
        projected_cm: ray.map(|ray| ray.projected_cm),
        off_axis_cm: ray.map(|ray| ray.off_axis_cm()),
    });
    placement
}

fn in_collimator(
    at: &ControlPoint,
    point: Point<Patient>,
    position: PatientPosition,
) -> Option<Point<Collimator>> {
    if !tilt_obstacles(at).is_empty() {
        return None;
    }
    let couch = CouchAngles {
        support_deg: at.couch_deg.get()?,
        // Optional attributes: absent means not tilted.
        pitch_deg: at.couch_pitch_deg.get().unwrap_or_default(),
        roll_deg: at.couch_roll_deg.get().unwrap_or_default(),
    };
    let head = HeadAngles {
        gantry_deg: at.gantry_deg.get()?,
        collimator_deg: at.collimator_deg.get()?,
    };
    Some(patient_to_collimator(
        point,
        at.isocentre.get()?,
        position,
        couch,
        head,
    ))
}

struct Setup {
    position: Option<PatientPosition>,
    fixed_ssd: bool,
}

/// The setup that the beam references; when it references none, what all setups agree on.
fn patient_setup(plan: &Plan, beam: &Beam, placement: &mut Placement) -> Setup {
    let number = beam.patient_setup_number.value();
    let setups: Vec<&PatientSetup> = plan
        .patient_setups
        .iter()
        .filter(|setup| number.is_none_or(|number| setup.number.value() == Some(number)))
        .collect();
    if number.is_none() && !setups.is_empty() {
        placement.remarks.push(
            "the beam references no patient setup; what the plan's setups agree on is used"
                .to_owned(),
        );
    }
    let first = setups.first().and_then(|setup| setup.position.get());
    let agree = setups.iter().all(|setup| setup.position.get() == first);
    if !agree {
        placement.object(
            "the patient setups that may hold for the beam state different patient positions",
        );
    }
    Setup {
        position: first.filter(|_| agree),
        fixed_ssd: !setups.is_empty()
            && setups
                .iter()
                .all(|setup| setup.technique.value().map(String::as_str) == Some("FIXED_SSD")),
    }
}
