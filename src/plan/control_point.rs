//! Control points after inheritance: every value says whether this control
//! point stated it or an earlier one did.

use std::sync::Arc;

use serde::Serialize;

use super::{DeviceKind, PointDepth};
use crate::quantity::{Given, Patient, Point};

/// One item of Control Point Sequence (300A,0111).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct ControlPoint {
    /// Control Point Index (300A,0112), as the file says.
    pub index: Given<i32>,
    /// Cumulative Meterset Weight (300A,0134).
    pub cumulative_weight: Given<f64>,
    /// Nominal Beam Energy (300A,0114), MV or MeV.
    pub energy: Given<f64>,
    /// Dose Rate Set (300A,0115), MU/min.
    pub dose_rate_mu_per_min: Given<f64>,
    /// Gantry Angle (300A,011E), 0 <= a < 360.
    pub gantry_deg: Given<f64>,
    /// Gantry Rotation Direction (300A,011F): CW, CC, NONE.
    pub gantry_direction: Given<String>,
    /// Gantry Pitch Angle (300A,014A), degrees.
    pub gantry_pitch_deg: Given<f64>,
    /// Beam Limiting Device Angle (300A,0120), 0 <= a < 360.
    pub collimator_deg: Given<f64>,
    /// Beam Limiting Device Rotation Direction (300A,0121).
    pub collimator_direction: Given<String>,
    /// Patient Support Angle (300A,0122), as the file says (kept, not normalised).
    pub couch_deg: Given<f64>,
    /// Patient Support Rotation Direction (300A,0123).
    pub couch_direction: Given<String>,
    /// Table Top Eccentric Angle (300A,0125), degrees.
    pub eccentric_deg: Given<f64>,
    /// Table Top Eccentric Axis Distance (300A,0124), cm.
    pub eccentric_axis_distance_cm: Given<f64>,
    /// Table Top Pitch Angle (300A,0140), degrees.
    pub couch_pitch_deg: Given<f64>,
    /// Table Top Roll Angle (300A,0144), degrees.
    pub couch_roll_deg: Given<f64>,
    /// Table Top Vertical Position (300A,0128), cm.
    pub couch_vertical_cm: Given<f64>,
    /// Table Top Longitudinal Position (300A,0129), cm.
    pub couch_longitudinal_cm: Given<f64>,
    /// Table Top Lateral Position (300A,012A), cm.
    pub couch_lateral_cm: Given<f64>,
    /// Isocenter Position (300A,012C), cm in the patient frame.
    pub isocentre: Given<Point<Patient>>,
    /// Surface Entry Point (300A,012E), cm in the patient frame.
    pub surface_entry: Given<Point<Patient>>,
    /// Source to Surface Distance (300A,0130), cm.
    pub ssd_cm: Given<f64>,
    /// Source to External Contour Distance (300A,0132), cm; not an SSD.
    pub source_to_external_contour_cm: Given<f64>,
    /// X jaws (X or ASYMX), [x1, x2] cm at the isocentre plane in the collimator system.
    pub jaws_x_cm: Given<[f64; 2]>,
    /// Y jaws (Y or ASYMY), [y1, y2] cm at the isocentre plane in the collimator system.
    pub jaws_y_cm: Given<[f64; 2]>,
    /// Leaf banks, in the order of `Beam::devices`.
    pub leaves: Vec<LeafPositions>,
    /// Wedge positions, in the order of `Beam::wedges`.
    pub wedges: Vec<WedgePosition>,
    /// Items of Referenced Dose Reference Sequence (300C,0050).
    pub referenced_doses: Vec<ReferencedDose>,
}

/// Positions of one leaf bank at one control point.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LeafPositions {
    /// Which bank.
    pub kind: DeviceKind,
    /// 2N positions, cm at the isocentre plane: N of the bank at negative coordinate, then N of the other.
    pub positions_cm: Given<Arc<[f64]>>,
}

/// Wedge position at one control point.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct WedgePosition {
    /// Referenced Wedge Number (300C,00C0).
    pub wedge_number: Given<i32>,
    /// Whether Wedge Position (300A,0118) is IN.
    pub in_beam: Given<bool>,
}

/// One item of a control point's Referenced Dose Reference Sequence (300C,0050).
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ReferencedDose {
    /// Referenced Dose Reference Number (300C,0051).
    pub number: Given<i32>,
    /// Cumulative Dose Reference Coefficient (300A,010C).
    pub cumulative_coefficient: Given<f64>,
    /// Point depths that stand here.
    pub point_depth: Option<PointDepth>,
}
