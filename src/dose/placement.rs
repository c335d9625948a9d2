//! Where the chosen point lies in this beam, from what the plan states about
//! gantry, collimator, couch, isocentre and patient position. An attribute that
//! is missing is an obstacle and never taken as zero, except tilts, which the
//! standard leaves out when there is none.

use super::geometry::{
    CouchAngles, fixed_to_gantry, gantry_to_collimator, patient_to_fixed, ray_through,
};
use super::point::ChosenPoint;
use super::technique::tilt_obstacles;
use super::{DosePoint, Obstacle, ObstacleKind, RayPoint, Technique};
use crate::plan::{Beam, ControlPoint, PatientPosition, PatientSetup, Plan};
use crate::quantity::{Collimator, Fixed, Patient, Point, tolerance};

/// A point in the beam.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Placement {
    /// The point, as far as it could be placed.
    pub(super) point: Option<DosePoint>,
    /// Its ray, when geometry and source distance are known and the beam stands still.
    pub(super) ray: Option<RayPoint>,
    /// Where the point lies for any gantry angle, when all else is known.
    pub(super) geometry: Option<BeamGeometry>,
    /// Whether the patient setup says FIXED_SSD.
    pub(super) fixed_ssd: bool,
    /// What is missing.
    pub(super) obstacles: Vec<Obstacle>,
    /// Worth telling.
    pub(super) remarks: Vec<String>,
}

/// A point and everything about a beam's geometry but the gantry angle.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct BeamGeometry {
    fixed: Point<Fixed>,
    collimator_deg: f64,
    sad_cm: f64,
}

impl BeamGeometry {
    /// The point's ray at a gantry angle; `None` when the point is not below the source.
    pub(super) fn ray_at(&self, gantry_deg: f64) -> Option<RayPoint> {
        let gantry = fixed_to_gantry(self.fixed, gantry_deg);
        ray_through(
            gantry_to_collimator(gantry, self.collimator_deg),
            self.sad_cm,
        )
    }
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
    placement.geometry = match at_isocentre {
        true => Some(Point::origin()),
        false => setup
            .position
            .and_then(|position| in_fixed(at, chosen.patient, position)),
    }
    .zip(at.collimator_deg.get())
    .zip(beam.sad_cm.get())
    .map(|((fixed, collimator_deg), sad_cm)| BeamGeometry {
        fixed,
        collimator_deg,
        sad_cm,
    });
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
    let fixed = in_fixed(at, point, position)?;
    let gantry = fixed_to_gantry(fixed, at.gantry_deg.get()?);
    Some(gantry_to_collimator(gantry, at.collimator_deg.get()?))
}

fn in_fixed(
    at: &ControlPoint,
    point: Point<Patient>,
    position: PatientPosition,
) -> Option<Point<Fixed>> {
    if !tilt_obstacles(at).is_empty() {
        return None;
    }
    let couch = CouchAngles {
        support_deg: at.couch_deg.get()?,
        // Optional attributes: absent means not tilted.
        pitch_deg: at.couch_pitch_deg.get().unwrap_or_default(),
        roll_deg: at.couch_roll_deg.get().unwrap_or_default(),
    };
    Some(patient_to_fixed(
        point - at.isocentre.get()?,
        position,
        couch,
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
