//! A beam: what does not change from control point to control point.

use serde::{Serialize, Serializer};

use super::{Accessory, Applicator, Block, Bolus, Compensator, ControlPoint, Wedge};
use crate::quantity::{Given, tolerance};

/// One item of Beam Sequence (300A,00B0).
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Beam {
    /// Beam Number (300A,00C0).
    pub number: Given<i32>,
    /// Beam Name (300A,00C2).
    pub name: Given<String>,
    /// Beam Description (300A,00C3).
    pub description: Given<String>,
    /// Beam Type (300A,00C4): STATIC or DYNAMIC, as the file says.
    pub beam_type: Given<String>,
    /// Radiation Type (300A,00C6).
    pub radiation: Given<RadiationType>,
    /// High-Dose Technique Type (300A,00C7).
    pub high_dose_technique: Given<String>,
    /// Treatment Machine Name (300A,00B2), trimmed.
    pub machine: Given<String>,
    /// Manufacturer (0008,0070) of the machine.
    pub machine_manufacturer: Given<String>,
    /// Manufacturer's Model Name (0008,1090) of the machine.
    pub machine_model: Given<String>,
    /// Primary Dosimeter Unit (300A,00B3): MU or MINUTE.
    pub dosimeter_unit: Given<String>,
    /// Source-Axis Distance (300A,00B4), cm.
    pub sad_cm: Given<f64>,
    /// Treatment Delivery Type (300A,00CE).
    pub delivery: Given<DeliveryType>,
    /// Energy and fluence mode.
    pub energy: BeamEnergy,
    /// Beam limiting devices that are declared *and* positioned at some control point.
    pub devices: Vec<LimitingDevice>,
    /// Devices that are declared but never positioned: shown, not counted.
    pub unused_devices: Vec<LimitingDevice>,
    /// Items of Wedge Sequence (300A,00D1).
    pub wedges: Vec<Wedge>,
    /// Items of Block Sequence (300A,00F4).
    pub blocks: Vec<Block>,
    /// Total Block Tray Factor (300A,00F2), the planning system's word.
    pub total_block_tray_factor: Given<f64>,
    /// Items of Compensator Sequence (300A,00E3).
    pub compensators: Vec<Compensator>,
    /// Items of Applicator Sequence (300A,0107).
    pub applicators: Vec<Applicator>,
    /// Items of General Accessory Sequence (300A,0420).
    pub accessories: Vec<Accessory>,
    /// Items of Referenced Bolus Sequence (300C,00B0).
    pub boluses: Vec<Bolus>,
    /// Final Cumulative Meterset Weight (300A,010E).
    pub final_cumulative_weight: Given<f64>,
    /// Referenced Patient Setup Number (300C,006A).
    pub patient_setup_number: Given<i32>,
    /// Referenced Tolerance Table Number (300C,00A0).
    pub tolerance_table_number: Given<i32>,
    /// Control points with inheritance carried out, by item order.
    pub control_points: Vec<ControlPoint>,
}

/// Radiation Type (300A,00C6).
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "SCREAMING_SNAKE_CASE")]
pub enum RadiationType {
    /// Photons.
    Photon,
    /// Electrons.
    Electron,
    /// Anything else, as the file says.
    #[serde(untagged)]
    Other(String),
}

impl RadiationType {
    /// The DICOM term.
    #[must_use]
    pub fn term(&self) -> &str {
        match self {
            Self::Photon => "PHOTON",
            Self::Electron => "ELECTRON",
            Self::Other(text) => text,
        }
    }
}

/// Treatment Delivery Type (300A,00CE). Absent counts as treatment.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "SCREAMING_SNAKE_CASE")]
pub enum DeliveryType {
    /// TREATMENT.
    Treatment,
    /// CONTINUATION of an interrupted treatment.
    Continuation,
    /// SETUP.
    Setup,
    /// OPEN_PORTFILM.
    OpenPortfilm,
    /// TRMT_PORTFILM.
    TrmtPortfilm,
    /// VERIFICATION.
    Verification,
    /// Anything else: treated as treatment, with a note, so that it is never silently left out.
    #[serde(untagged)]
    Other(String),
}

/// The beam's quality as the plan states it: nominal energy of the first control point and fluence mode.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct BeamEnergy {
    /// Nominal Beam Energy (300A,0114), MV for photons, MeV for electrons.
    pub nominal: Given<f64>,
    /// Fluence Mode (3002,0051): STANDARD or NON_STANDARD; absent means not stated.
    pub fluence_mode: Given<String>,
    /// Fluence Mode ID (3002,0052), such as FFF.
    pub fluence_mode_id: Given<String>,
    /// Whether the energy changes between control points (not supported).
    pub changes: bool,
}

impl DeliveryType {
    /// From the DICOM term.
    #[must_use]
    pub fn from_term(term: &str) -> Self {
        match term {
            "TREATMENT" => Self::Treatment,
            "CONTINUATION" => Self::Continuation,
            "SETUP" => Self::Setup,
            "OPEN_PORTFILM" => Self::OpenPortfilm,
            "TRMT_PORTFILM" => Self::TrmtPortfilm,
            "VERIFICATION" => Self::Verification,
            other => Self::Other(other.to_owned()),
        }
    }

    /// The DICOM term.
    #[must_use]
    pub fn term(&self) -> &str {
        match self {
            Self::Treatment => "TREATMENT",
            Self::Continuation => "CONTINUATION",
            Self::Setup => "SETUP",
            Self::OpenPortfilm => "OPEN_PORTFILM",
            Self::TrmtPortfilm => "TRMT_PORTFILM",
            Self::Verification => "VERIFICATION",
            Self::Other(text) => text,
        }
    }

    /// Whether such a beam is delivered for treatment. Unknown terms count as treatment.
    #[must_use]
    pub const fn is_treatment(&self) -> bool {
        matches!(self, Self::Treatment | Self::Continuation | Self::Other(_))
    }
}

impl Beam {
    /// Whether the beam is delivered for treatment; a beam that does not say is.
    #[must_use]
    pub fn is_treatment(&self) -> bool {
        self.delivery.value().is_none_or(DeliveryType::is_treatment)
    }
}

impl BeamEnergy {
    /// Energy as in outputs: `6`, `6-FFF`, `9`; `None` when not stated.
    #[must_use]
    pub fn label(&self) -> Option<String> {
        let nominal = self.nominal.get()?;
        let rounded = nominal.round();
        let number = if (nominal - rounded).abs() < tolerance::ENERGY {
            format!("{rounded:.0}")
        } else {
            format!("{nominal}")
        };
        let standard = self
            .fluence_mode
            .value()
            .is_none_or(|mode| mode == "STANDARD");
        if standard {
            return Some(number);
        }
        let id = self
            .fluence_mode_id
            .value()
            .map_or("NON_STANDARD", String::as_str);
        Some(format!("{number}-{id}"))
    }
}

/// RT Beam Limiting Device Type (300A,00B8). Serialised as the DICOM term.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum DeviceKind {
    /// Symmetric X jaws.
    X,
    /// Symmetric Y jaws.
    Y,
    /// Asymmetric X jaws.
    AsymX,
    /// Asymmetric Y jaws.
    AsymY,
    /// Leaves that move along x; `layer` 0 for MLCX, 1 and 2 for MLCX1 and MLCX2.
    Mlcx {
        /// Layer of a stacked bank.
        layer: u8,
    },
    /// Leaves that move along y; `layer` 0 for MLCY, 1 and 2 for MLCY1 and MLCY2.
    Mlcy {
        /// Layer of a stacked bank.
        layer: u8,
    },
    /// Anything else, as the file says: makes the beam not verifiable.
    Other(String),
}

/// The axis that leaves or jaws move along, in the collimator system.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum LeafAxis {
    /// Along `x_b`.
    X,
    /// Along `y_b`.
    Y,
}

impl DeviceKind {
    /// From the DICOM term.
    #[must_use]
    pub fn from_term(term: &str) -> Self {
        match term {
            "X" => Self::X,
            "Y" => Self::Y,
            "ASYMX" => Self::AsymX,
            "ASYMY" => Self::AsymY,
            "MLCX" => Self::Mlcx { layer: 0 },
            "MLCX1" => Self::Mlcx { layer: 1 },
            "MLCX2" => Self::Mlcx { layer: 2 },
            "MLCY" => Self::Mlcy { layer: 0 },
            "MLCY1" => Self::Mlcy { layer: 1 },
            "MLCY2" => Self::Mlcy { layer: 2 },
            other => Self::Other(other.to_owned()),
        }
    }

    /// The DICOM term.
    #[must_use]
    pub fn term(&self) -> &str {
        match self {
            Self::X => "X",
            Self::Y => "Y",
            Self::AsymX => "ASYMX",
            Self::AsymY => "ASYMY",
            Self::Mlcx { layer: 1 } => "MLCX1",
            Self::Mlcx { layer: 2 } => "MLCX2",
            Self::Mlcx { .. } => "MLCX",
            Self::Mlcy { layer: 1 } => "MLCY1",
            Self::Mlcy { layer: 2 } => "MLCY2",
            Self::Mlcy { .. } => "MLCY",
            Self::Other(text) => text,
        }
    }

    /// Whether the device is a leaf bank, and along which axis its leaves move.
    #[must_use]
    pub const fn leaf_axis(&self) -> Option<LeafAxis> {
        match self {
            Self::Mlcx { .. } => Some(LeafAxis::X),
            Self::Mlcy { .. } => Some(LeafAxis::Y),
            _ => None,
        }
    }

    /// Number of the layer of a stacked leaf bank, 1 or 2; 0 for a bank that is not stacked and for jaws.
    #[must_use]
    pub const fn leaf_layer(&self) -> u8 {
        match self {
            Self::Mlcx { layer } | Self::Mlcy { layer } => *layer,
            _ => 0,
        }
    }

    /// Whether the device is a jaw pair, and which axis it limits.
    #[must_use]
    pub const fn jaw_axis(&self) -> Option<LeafAxis> {
        match self {
            Self::X | Self::AsymX => Some(LeafAxis::X),
            Self::Y | Self::AsymY => Some(LeafAxis::Y),
            _ => None,
        }
    }
}

impl Serialize for DeviceKind {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.serialize_str(self.term())
    }
}

/// One item of Beam Limiting Device Sequence (300A,00B6).
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LimitingDevice {
    /// Type.
    pub kind: DeviceKind,
    /// Number of Leaf/Jaw Pairs (300A,00BC).
    pub pairs: Given<i32>,
    /// Source to Beam Limiting Device Distance (300A,00BA), cm.
    pub source_distance_cm: Given<f64>,
    /// Leaf Position Boundaries (300A,00BE), cm at the isocentre plane; pairs + 1 of them.
    pub boundaries_cm: Given<Vec<f64>>,
}
