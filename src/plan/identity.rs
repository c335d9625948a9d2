//! Who, what and when: identification, approval, patient setup and tolerance
//! tables. All text is raw (decoded, control characters removed): anonymised
//! files hold junk in dates and identifiers, and that never stops a calculation.

use serde::Serialize;

use crate::quantity::Given;

/// Identification of the plan and of what it refers to.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Identity {
    /// SOP Class UID (0008,0016).
    pub sop_class_uid: Given<String>,
    /// SOP Instance UID (0008,0018).
    pub sop_instance_uid: Given<String>,
    /// Study Instance UID (0020,000D).
    pub study_instance_uid: Given<String>,
    /// Series Instance UID (0020,000E).
    pub series_instance_uid: Given<String>,
    /// Frame of Reference UID (0020,0052).
    pub frame_of_reference_uid: Given<String>,
    /// Patient's Name (0010,0010).
    pub patient_name: Given<String>,
    /// Patient ID (0010,0020).
    pub patient_id: Given<String>,
    /// RT Plan Label (300A,0002).
    pub plan_label: Given<String>,
    /// RT Plan Name (300A,0003).
    pub plan_name: Given<String>,
    /// RT Plan Date (300A,0006).
    pub plan_date: Given<String>,
    /// RT Plan Time (300A,0007).
    pub plan_time: Given<String>,
    /// Plan Intent (300A,000A).
    pub plan_intent: Given<String>,
    /// Treatment Sites (300A,000B).
    pub treatment_sites: Given<String>,
    /// RT Plan Geometry (300A,000C).
    pub plan_geometry: Given<String>,
    /// Manufacturer (0008,0070) of the planning system.
    pub manufacturer: Given<String>,
    /// Manufacturer's Model Name (0008,1090) of the planning system.
    pub model_name: Given<String>,
    /// Software Versions (0018,1020).
    pub software_versions: Given<String>,
    /// SOP Instance UIDs of Referenced Structure Set Sequence (300C,0060).
    pub structure_set_uids: Vec<String>,
    /// SOP Instance UIDs of Referenced RT Plan Sequence (300C,0002).
    pub referenced_plan_uids: Vec<String>,
    /// SOP Instance UIDs of Referenced Dose Sequence (300C,0080).
    pub referenced_dose_uids: Vec<String>,
    /// Approval.
    pub approval: Approval,
}

/// Approval attributes.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Approval {
    /// Approval Status (300E,0002).
    pub status: Given<String>,
    /// Review Date (300E,0004).
    pub review_date: Given<String>,
    /// Review Time (300E,0005).
    pub review_time: Given<String>,
    /// Reviewer Name (300E,0008).
    pub reviewer: Given<String>,
}

/// Patient Position (0018,5100), the eight of the linac couch.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub enum PatientPosition {
    /// Head first, supine.
    #[serde(rename = "HFS")]
    HeadFirstSupine,
    /// Head first, prone.
    #[serde(rename = "HFP")]
    HeadFirstProne,
    /// Head first, lying on the left side.
    #[serde(rename = "HFDL")]
    HeadFirstDecubitusLeft,
    /// Head first, lying on the right side.
    #[serde(rename = "HFDR")]
    HeadFirstDecubitusRight,
    /// Feet first, supine.
    #[serde(rename = "FFS")]
    FeetFirstSupine,
    /// Feet first, prone.
    #[serde(rename = "FFP")]
    FeetFirstProne,
    /// Feet first, lying on the left side.
    #[serde(rename = "FFDL")]
    FeetFirstDecubitusLeft,
    /// Feet first, lying on the right side.
    #[serde(rename = "FFDR")]
    FeetFirstDecubitusRight,
}

impl PatientPosition {
    /// The eight positions.
    pub const ALL: [Self; 8] = [
        Self::HeadFirstSupine,
        Self::HeadFirstProne,
        Self::HeadFirstDecubitusLeft,
        Self::HeadFirstDecubitusRight,
        Self::FeetFirstSupine,
        Self::FeetFirstProne,
        Self::FeetFirstDecubitusLeft,
        Self::FeetFirstDecubitusRight,
    ];

    /// The DICOM code string.
    #[must_use]
    pub const fn code(self) -> &'static str {
        match self {
            Self::HeadFirstSupine => "HFS",
            Self::HeadFirstProne => "HFP",
            Self::HeadFirstDecubitusLeft => "HFDL",
            Self::HeadFirstDecubitusRight => "HFDR",
            Self::FeetFirstSupine => "FFS",
            Self::FeetFirstProne => "FFP",
            Self::FeetFirstDecubitusLeft => "FFDL",
            Self::FeetFirstDecubitusRight => "FFDR",
        }
    }

    /// From the DICOM code string, exactly.
    #[must_use]
    pub fn from_code(code: &str) -> Option<Self> {
        Self::ALL
            .into_iter()
            .find(|position| position.code() == code)
    }
}

/// One item of Patient Setup Sequence (300A,0180).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct PatientSetup {
    /// Patient Setup Number (300A,0182).
    pub number: Given<i32>,
    /// Patient Position (0018,5100); absent with a note when it is none of the eight.
    pub position: Given<PatientPosition>,
    /// Patient Additional Position (300A,0184), free text.
    pub additional_position: Given<String>,
    /// Setup Technique (300A,01B0): ISOCENTRIC, FIXED_SSD ...
    pub technique: Given<String>,
}

/// One item of Tolerance Table Sequence (300A,0040).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct ToleranceTable {
    /// Tolerance Table Number (300A,0042).
    pub number: Given<i32>,
    /// Tolerance Table Label (300A,0043).
    pub label: Given<String>,
}
