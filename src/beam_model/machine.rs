//! A machine: identity, geometry, provenance, and its beams.

use serde::Serialize;

use super::BeamModel;
use crate::plan::LeafAxis;

/// Axis of a jaw pair, shared with the plan's apertures.
pub type JawAxis = LeafAxis;

/// All models of a run, by folder name order.
#[derive(Clone, Debug, Default)]
pub struct ModelSet {
    /// The machines.
    pub machines: Vec<MachineModel>,
}

impl ModelSet {
    /// The model that serves this treatment machine name, exactly after trimming.
    #[must_use]
    pub fn machine_for(&self, machine_name: &str) -> Option<&MachineModel> {
        let wanted = machine_name.trim();
        self.machines
            .iter()
            .find(|machine| machine.serves.iter().any(|name| name == wanted))
    }

    /// Every treatment machine name that some model serves, in model order.
    #[must_use]
    pub fn known_names(&self) -> Vec<&str> {
        self.machines
            .iter()
            .flat_map(|machine| machine.serves.iter().map(String::as_str))
            .collect()
    }
}

/// One machine (or several beam-matched ones) with its beams.
#[derive(Clone, Debug)]
pub struct MachineModel {
    /// The model's folder name.
    pub name: String,
    /// Treatment machine names that it serves, trimmed.
    pub serves: Vec<String>,
    /// Source-axis distance, cm.
    pub sad_cm: f64,
    /// Which jaw pair is the upper one (nearer the source).
    pub upper_jaws: JawAxis,
    /// Jaw pairs and leaf banks.
    pub collimation: Collimation,
    /// Where the data come from.
    pub provenance: Provenance,
    /// Who approved the model for use; `None` when nobody did.
    pub approval: Option<Approval>,
    /// The beams.
    pub beams: Vec<BeamModel>,
    /// SHA-256 over every file of the model, hex.
    pub fingerprint: String,
}

/// What shapes the field. Distances and limits that the model does not give are `None`.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Collimation {
    /// The two jaw pairs.
    pub jaws: Vec<JawPair>,
    /// Leaf banks; none when the machine has none or the model does not give them.
    pub leaf_banks: Vec<LeafBank>,
}

/// One jaw pair.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct JawPair {
    /// The axis it limits.
    pub moves_along: JawAxis,
    /// Source to the pair's end on the patient's side, cm.
    pub source_distance_cm: Option<f64>,
    /// Transmission, a share; `None` when not known.
    pub transmission: Option<f64>,
    /// Limits of travel.
    pub travel: Travel,
}

/// One pair of opposed leaf banks.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LeafBank {
    /// The axis its leaves move along.
    pub moves_along: LeafAxis,
    /// Source to the middle of the leaves, cm.
    pub source_distance_cm: Option<f64>,
    /// Boundaries between leaves at the isocentre plane, cm, rising; one more than leaf pairs.
    pub boundaries_cm: Vec<f64>,
    /// Mean transmission through and between leaves, a share.
    pub transmission: f64,
    /// How far the radiation edge lies behind the end of a rounded leaf, cm at the isocentre plane.
    pub leaf_end_offset_cm: f64,
    /// Limits of travel.
    pub travel: Travel,
}

/// Limits of travel of one jaw or leaf at the isocentre plane.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize)]
pub struct Travel {
    /// Furthest from the axis on its own side, cm.
    pub outward_cm: Option<f64>,
    /// Furthest across the axis, cm.
    pub across_cm: Option<f64>,
}

/// Where a model's data come from.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Provenance {
    /// Measured, published or invented.
    pub origin: DataOrigin,
    /// By whom, or the source.
    pub by: String,
    /// Date of the measurement or publication, ISO 8601.
    pub on: jiff::civil::Date,
    /// Free text.
    pub remark: String,
}

/// Origin of a model's data.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, serde::Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum DataOrigin {
    /// Measured on the machine.
    Measured,
    /// Taken from a publication.
    Published,
    /// Invented: stamps every report, not for clinical use.
    Invented,
}

/// Approval of a model for use.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Approval {
    /// Who.
    pub by: String,
    /// When.
    pub on: jiff::civil::Date,
    /// Until when it holds, that day included.
    pub until: jiff::civil::Date,
}

/// A measured point that proves the model: its result is compared by `model check`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ProofPoint {
    /// What was measured, by whom.
    pub label: String,
    /// Opening along x and y at the isocentre plane, cm.
    pub x_cm: f64,
    /// Opening along y, cm.
    pub y_cm: f64,
    /// Source-surface distance on the axis, cm.
    pub ssd_cm: f64,
    /// Depth on the axis, cm.
    pub depth_cm: f64,
    /// Measured dose per MU, cGy/MU.
    pub measured_cgy_per_mu: f64,
}

impl Collimation {
    /// The jaw pair that limits an axis.
    #[must_use]
    pub fn jaw(&self, axis: JawAxis) -> Option<&JawPair> {
        self.jaws.iter().find(|jaw| jaw.moves_along == axis)
    }
}

impl MachineModel {
    /// Whether the model may be used on this day: approved, and the approval still holds.
    #[must_use]
    pub fn is_approved_on(&self, day: jiff::civil::Date) -> bool {
        self.approval
            .as_ref()
            .is_some_and(|approval| approval.on <= day && day <= approval.until)
    }
}
