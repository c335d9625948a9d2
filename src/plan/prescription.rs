//! Prescription items of the RT Prescription module.

use serde::Serialize;

use crate::quantity::{Given, Patient, Point};

/// One item of Dose Reference Sequence (300A,0010).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct DoseReference {
    /// Dose Reference Number (300A,0012).
    pub number: Given<i32>,
    /// Dose Reference UID (300A,0013).
    pub uid: Given<String>,
    /// Dose Reference Structure Type (300A,0014): POINT, VOLUME, COORDINATES, SITE.
    pub structure_type: Given<String>,
    /// Dose Reference Description (300A,0016).
    pub description: Given<String>,
    /// Dose Reference Type (300A,0020): TARGET, ORGAN_AT_RISK.
    pub reference_type: Given<String>,
    /// Dose Reference Point Coordinates (300A,0018), cm in the patient frame.
    pub point: Given<Point<Patient>>,
    /// Referenced ROI Number (3006,0084).
    pub roi_number: Given<i32>,
    /// Target Prescription Dose (300A,0026), Gy for the whole course.
    pub target_prescription_dose_gy: Given<f64>,
}
