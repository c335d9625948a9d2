//! Where a point of the patient lies in the beam: IEC 61217 transformations
//! from the DICOM patient system over the fixed and the gantry system to the
//! collimator system, and the projection from there onto the isocentre plane.
//!
//! All systems are right-handed and have the isocentre as origin here (IEC 61217
//! puts the collimator system's origin at the source; only that shift differs).
//!
//! - Fixed F: X to the right for an observer who faces the gantry, Y toward the
//!   gantry, Z up. Patient support angle: about Z, counter-clockwise from above.
//! - Table top tilt: IEC 61217 turns the table top system about its own X (pitch)
//!   and then about its own, already pitched Y (roll), inside the patient support
//!   system (from memory of IEC 61217, clause on the table top system). Coordinates
//!   therefore go p_F = Rz(support) Rx(pitch) Ry(roll) p. The tilt axes need not
//!   pass through the isocentre: the plan states where the isocentre is in the
//!   patient, so a tilt changes directions only.
//! - Gantry G: Y as in F, Z from the isocentre to the source.
//! - Collimator b: about Z of G, counter-clockwise seen from the source.
//!
//! A turned eccentric table top or a pitched gantry is not covered; the caller
//! refuses those. Which point is wanted is decided in `point`.

use super::RayPoint;
use crate::plan::PatientPosition;
use crate::quantity::{Collimator, Fixed, Gantry, Patient, Point, Vector};

/// Angles of the patient support, degrees.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct CouchAngles {
    /// Patient support angle, counter-clockwise from above.
    pub support_deg: f64,
    /// Table top pitch, about X.
    pub pitch_deg: f64,
    /// Table top roll, about the pitched Y.
    pub roll_deg: f64,
}

/// Angles of gantry and collimator, degrees.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct HeadAngles {
    /// Gantry angle.
    pub gantry_deg: f64,
    /// Beam limiting device angle, counter-clockwise seen from the source.
    pub collimator_deg: f64,
}

/// A vector from the isocentre in the patient, as a point of the fixed system.
#[must_use]
pub fn patient_to_fixed(
    from_isocentre: Vector<Patient>,
    position: PatientPosition,
    couch: CouchAngles,
) -> Point<Fixed> {
    let [x, y, z] = on_level_couch(from_isocentre, position);
    let (sin_roll, cos_roll) = couch.roll_deg.to_radians().sin_cos();
    let (x, z) = (x * cos_roll + z * sin_roll, z * cos_roll - x * sin_roll);
    let (sin_pitch, cos_pitch) = couch.pitch_deg.to_radians().sin_cos();
    let (y, z) = (y * cos_pitch - z * sin_pitch, y * sin_pitch + z * cos_pitch);
    let (sin, cos) = couch.support_deg.to_radians().sin_cos();
    Point::new(x * cos - y * sin, x * sin + y * cos, z)
}

/// Patient axes (x left, y posterior, z superior) on a level, unturned couch.
const fn on_level_couch(vector: Vector<Patient>, position: PatientPosition) -> [f64; 3] {
    let Vector {
        x_cm: x,
        y_cm: y,
        z_cm: z,
        ..
    } = vector;
    match position {
        PatientPosition::HeadFirstSupine => [x, z, -y],
        PatientPosition::HeadFirstProne => [-x, z, y],
        PatientPosition::HeadFirstDecubitusLeft => [-y, z, -x],
        PatientPosition::HeadFirstDecubitusRight => [y, z, x],
        PatientPosition::FeetFirstSupine => [-x, -z, -y],
        PatientPosition::FeetFirstProne => [x, -z, y],
        PatientPosition::FeetFirstDecubitusLeft => [y, -z, -x],
        PatientPosition::FeetFirstDecubitusRight => [-y, -z, x],
    }
}

/// From the fixed to the gantry system.
#[must_use]
pub fn fixed_to_gantry(point: Point<Fixed>, gantry_deg: f64) -> Point<Gantry> {
    let (sin, cos) = gantry_deg.to_radians().sin_cos();
    Point::new(
        point.x_cm * cos - point.z_cm * sin,
        point.y_cm,
        point.x_cm * sin + point.z_cm * cos,
    )
}

/// From the gantry to the collimator system.
#[must_use]
pub fn gantry_to_collimator(point: Point<Gantry>, collimator_deg: f64) -> Point<Collimator> {
    let (sin, cos) = collimator_deg.to_radians().sin_cos();
    Point::new(
        point.x_cm * cos + point.y_cm * sin,
        point.y_cm * cos - point.x_cm * sin,
        point.z_cm,
    )
}

/// From the patient to the collimator system, all steps.
#[must_use]
pub fn patient_to_collimator(
    point: Point<Patient>,
    isocentre: Point<Patient>,
    position: PatientPosition,
    couch: CouchAngles,
    head: HeadAngles,
) -> Point<Collimator> {
    let fixed = patient_to_fixed(point - isocentre, position, couch);
    gantry_to_collimator(fixed_to_gantry(fixed, head.gantry_deg), head.collimator_deg)
}

/// The source in the fixed system.
#[must_use]
pub fn source_in_fixed(gantry_deg: f64, sad_cm: f64) -> Point<Fixed> {
    let (sin, cos) = gantry_deg.to_radians().sin_cos();
    Point::new(sad_cm * sin, 0.0, sad_cm * cos)
}

/// The ray from the source through a point; `None` when the point is not below the source.
#[must_use]
pub fn ray_through(point: Point<Collimator>, sad_cm: f64) -> Option<RayPoint> {
    let spd_cm = sad_cm - point.z_cm;
    if spd_cm.is_nan() || spd_cm <= 0.0 || sad_cm <= 0.0 {
        return None;
    }
    let magnification = sad_cm / spd_cm;
    Some(RayPoint {
        projected_cm: [point.x_cm * magnification, point.y_cm * magnification],
        spd_cm,
        sad_cm,
    })
}
