//! Fraction groups: how often which beam is given with which meterset, and
//! what the planning system claims each adds at its dose point.

use serde::Serialize;

use crate::quantity::{Given, Patient, Point};

/// One item of Fraction Group Sequence (300A,0070).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct FractionGroup {
    /// Fraction Group Number (300A,0071).
    pub number: Given<i32>,
    /// Fraction Group Description (300A,0072).
    pub description: Given<String>,
    /// Number of Fractions Planned (300A,0078).
    pub fractions_planned: Given<i32>,
    /// Items of Referenced Beam Sequence (300C,0004), by item order.
    pub beams: Vec<ReferencedBeam>,
    /// Number of Brachy Application Setups (300A,00A0).
    pub brachy_setups: Given<i32>,
    /// Items of Referenced Dose Reference Sequence (300C,0050): number and the target prescription dose stated there, Gy.
    pub dose_references: Vec<GroupDoseReference>,
}

/// One item of a fraction group's Referenced Dose Reference Sequence (300C,0050).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct GroupDoseReference {
    /// Referenced Dose Reference Number (300C,0051).
    pub number: Given<i32>,
    /// Target Prescription Dose (300A,0026) when it stands here, Gy.
    pub target_prescription_dose_gy: Given<f64>,
}

/// Beam Dose Meaning (300A,008B).
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "SCREAMING_SNAKE_CASE")]
pub enum DoseMeaning {
    /// The beam's own dose.
    BeamLevel,
    /// A share of the fraction's dose: only the sum over the beams has a meaning.
    FractionLevel,
}

/// Beam Dose Type (300A,0090).
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "SCREAMING_SNAKE_CASE")]
pub enum DoseType {
    /// Physical dose.
    Physical,
    /// Biologically effective dose.
    Effective,
}

/// One item of Referenced Beam Sequence (300C,0004).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct ReferencedBeam {
    /// Referenced Beam Number (300C,0006).
    pub beam_number: Given<i32>,
    /// Beam Meterset (300A,0086), MU when the beam's dosimeter unit is MU.
    pub meterset_mu: Given<f64>,
    /// Beam Dose (300A,0084), Gy in one fraction: the planning system's claim.
    pub beam_dose_gy: Given<f64>,
    /// Beam Dose Meaning (300A,008B); absent means the beam's own dose.
    pub dose_meaning: Given<DoseMeaning>,
    /// Beam Dose Type (300A,0090); absent means physical.
    pub dose_type: Given<DoseType>,
    /// Beam Dose Specification Point (300A,0082), cm in the patient frame.
    pub specification_point: Given<Point<Patient>>,
    /// Referenced Dose Reference UID (300A,0083).
    pub dose_reference_uid: Given<String>,
    /// Point depths that stand at this reference or in its verification control points.
    pub point_depths: Vec<PointDepth>,
}

/// Where a set of point depths was found.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum PointDepthPlace {
    /// At the referenced beam itself.
    ReferencedBeam,
    /// At the referenced beam, as averages over the beam (300A,008D to 008F, retired, and 0131).
    RetiredAverage,
    /// In Beam Dose Verification Control Point Sequence (300A,008C), item index from 0.
    VerificationControlPoint(usize),
    /// In a control point's Referenced Dose Reference Sequence (300C,0050).
    ControlPoint,
}

/// A set of point depth attributes that belong together: a point's SSD goes with its own depth.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PointDepth {
    /// Where the set stands.
    pub place: PointDepthPlace,
    /// Cumulative Meterset Weight (300A,0134) of a verification control point.
    pub cumulative_weight: Given<f64>,
    /// Beam Dose Point Depth (300A,0088), cm, along the ray from the source to the point.
    pub depth_cm: Given<f64>,
    /// Beam Dose Point Equivalent Depth (300A,0089), cm, radiological along that ray.
    pub equivalent_depth_cm: Given<f64>,
    /// Beam Dose Point SSD (300A,008A), cm, along that ray.
    pub ssd_cm: Given<f64>,
    /// Beam Dose Point Source to External Contour Distance (300A,0094; its average 0131 in a set of averages), cm; not an SSD.
    pub source_to_external_contour_cm: Given<f64>,
    /// Depth Value Averaging Flag (300A,0093): whether the values are averages over the beam.
    pub averaged: Given<bool>,
}
