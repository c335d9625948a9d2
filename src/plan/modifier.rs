//! What stands in the beam: wedges, blocks, compensators, applicators,
//! accessories, bolus. Factors in the file are the planning system's word and
//! are only ever compared, never used.

use std::sync::Arc;

use serde::Serialize;

use crate::quantity::Given;

/// Wedge Type (300A,00D3).
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "SCREAMING_SNAKE_CASE")]
pub enum WedgeKind {
    /// Fixed.
    Standard,
    /// Moving jaw.
    Dynamic,
    /// One angle, in for part of the meterset.
    Motorized,
    /// Partial wedge that does not reach the axis.
    PartialStandard,
    /// Partial wedge that does not reach the axis, motorised.
    #[serde(rename = "PARTIAL_MOTORIZ")]
    PartialMotorized,
    /// Anything else, as the file says.
    #[serde(untagged)]
    Other(String),
}

/// One item of Wedge Sequence (300A,00D1).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Wedge {
    /// Wedge Number (300A,00D2).
    pub number: Given<i32>,
    /// Wedge Type (300A,00D3).
    pub kind: Given<WedgeKind>,
    /// Wedge ID (300A,00D4).
    pub id: Given<String>,
    /// Accessory Code (300A,00F9).
    pub accessory_code: Given<String>,
    /// Wedge Angle (300A,00D5), degrees.
    pub angle_deg: Given<f64>,
    /// Wedge Factor (300A,00D6), the planning system's word.
    pub factor: Given<f64>,
    /// Wedge Orientation (300A,00D8), degrees.
    pub orientation_deg: Given<f64>,
    /// Source to Wedge Tray Distance (300A,00DA), cm.
    pub source_to_tray_cm: Given<f64>,
}

/// Block Type (300A,00F8).
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "SCREAMING_SNAKE_CASE")]
pub enum BlockType {
    /// Blocks inside the outline.
    Shielding,
    /// Blocks outside the outline.
    Aperture,
    /// Anything else, as the file says.
    #[serde(untagged)]
    Other(String),
}

/// One item of Block Sequence (300A,00F4).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Block {
    /// Block Number (300A,00FC).
    pub number: Given<i32>,
    /// Block Name (300A,00FE).
    pub name: Given<String>,
    /// Block Type (300A,00F8).
    pub block_type: Given<BlockType>,
    /// Block Divergence (300A,00FA) is PRESENT.
    pub divergent: Given<bool>,
    /// Block Mounting Position (300A,00FB).
    pub mounting: Given<String>,
    /// Block Tray ID (300A,00F5).
    pub tray_id: Given<String>,
    /// Accessory Code (300A,00F9).
    pub accessory_code: Given<String>,
    /// Material ID (300A,00E1).
    pub material: Given<String>,
    /// Block Thickness (300A,0100), cm.
    pub thickness_cm: Given<f64>,
    /// Block Transmission (300A,0102), a share.
    pub transmission: Given<f64>,
    /// Source to Block Tray Distance (300A,00F6), cm.
    pub source_to_tray_cm: Given<f64>,
    /// Block Data (300A,0106): outline points [x, y], cm at the isocentre plane in the collimator system.
    pub outline_cm: Given<Arc<[[f64; 2]]>>,
}

/// One item of Compensator Sequence (300A,00E3).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Compensator {
    /// Compensator Number (300A,00E4).
    pub number: Given<i32>,
    /// Compensator ID (300A,00E5).
    pub id: Given<String>,
    /// Compensator Type (300A,00EE).
    pub kind: Given<String>,
    /// Material ID (300A,00E1).
    pub material: Given<String>,
    /// Compensator Tray ID (300A,00EF).
    pub tray_id: Given<String>,
    /// Whether Compensator Transmission Data (300A,00EB) is there.
    pub has_transmission: bool,
    /// Whether Compensator Thickness Data (300A,00EC) is there.
    pub has_thickness: bool,
}

/// One item of Applicator Sequence (300A,0107).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Applicator {
    /// Applicator ID (300A,0108).
    pub id: Given<String>,
    /// Applicator Type (300A,0109).
    pub kind: Given<String>,
    /// Applicator Description (300A,010A).
    pub description: Given<String>,
    /// Accessory Code (300A,00F9).
    pub accessory_code: Given<String>,
    /// Source to Applicator Mounting Position Distance (300A,0436), cm.
    pub source_to_mounting_cm: Given<f64>,
}

/// One item of General Accessory Sequence (300A,0420).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Accessory {
    /// General Accessory Number (300A,0424).
    pub number: Given<i32>,
    /// General Accessory ID (300A,0421).
    pub id: Given<String>,
    /// General Accessory Type (300A,0423).
    pub kind: Given<String>,
    /// General Accessory Description (300A,0422).
    pub description: Given<String>,
    /// Accessory Code (300A,00F9).
    pub accessory_code: Given<String>,
}

/// One item of Referenced Bolus Sequence (300C,00B0).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Bolus {
    /// Referenced ROI Number (3006,0084).
    pub roi_number: Given<i32>,
    /// Bolus ID (300A,00DC).
    pub id: Given<String>,
    /// Bolus Description (300A,00DD).
    pub description: Given<String>,
    /// Accessory Code (300A,00F9).
    pub accessory_code: Given<String>,
}

#[cfg(test)]
mod tests {
    use super::WedgeKind;

    /// PS3.3 C.8.8.14: the term is cut to the 16 characters of a code string.
    #[test]
    fn verify_a_partial_motorised_wedge_is_shown_by_its_dicom_term() {
        let shown = serde_json::to_string(&WedgeKind::PartialMotorized).unwrap();
        assert_eq!(shown, "\"PARTIAL_MOTORIZ\"");
    }
}
