//! `machine.toml` as written: its keys. The range of each value is in
//! `machine_value`; rules over several keys, and the tables, are for
//! `load_machine`, `load_beam` and `load_tables`.

use serde::Deserialize;

use super::machine_value::{
    date, device_distance, device_travel, exchange_k, extra_focal, gantry, jaw_transmission,
    leaf_end_offset, open_transmission, opening, penumbra, penumbra_share, photon_energy,
    positive_depth, proof_dose, reference_output, source_axis_distance, source_surface_distance,
    spread, surface_distance, text, texts, transmission, wedge_angle, wedge_gap,
};
use super::{DataOrigin, DepthInterpolation, JawAxis, OffAxisKind, WedgeModelKind};

/// The schema that this program reads.
pub(super) const SCHEMA: i64 = 1;

/// Read first, so that a file of a later schema says so instead of naming an unknown key.
#[derive(Deserialize)]
pub(super) struct SchemaOnly {
    pub(super) schema: Option<i64>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct MachineFile {
    #[serde(rename = "schema")]
    pub(super) _schema: i64,
    #[serde(deserialize_with = "texts")]
    pub(super) serves: Vec<String>,
    #[serde(deserialize_with = "source_axis_distance")]
    pub(super) sad_cm: f64,
    pub(super) provenance: ProvenanceEntry,
    pub(super) approval: Option<ApprovalEntry>,
    pub(super) jaws: Vec<JawEntry>,
    #[serde(default)]
    pub(super) leaf_banks: Vec<LeafBankEntry>,
    pub(super) beams: Vec<BeamEntry>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ProvenanceEntry {
    pub(super) origin: DataOrigin,
    #[serde(deserialize_with = "text")]
    pub(super) by: String,
    #[serde(deserialize_with = "date")]
    pub(super) on: jiff::civil::Date,
    #[serde(default)]
    pub(super) remark: String,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ApprovalEntry {
    #[serde(deserialize_with = "text")]
    pub(super) by: String,
    #[serde(deserialize_with = "date")]
    pub(super) on: jiff::civil::Date,
    #[serde(deserialize_with = "date")]
    pub(super) until: jiff::civil::Date,
}

#[derive(Clone, Copy, Deserialize, PartialEq, Eq)]
#[serde(rename_all = "lowercase")]
pub(super) enum AxisEntry {
    X,
    Y,
}

impl AxisEntry {
    pub(super) const fn axis(self) -> JawAxis {
        match self {
            Self::X => JawAxis::X,
            Self::Y => JawAxis::Y,
        }
    }
}

#[derive(Clone, Copy, Deserialize, PartialEq, Eq)]
#[serde(rename_all = "lowercase")]
pub(super) enum JawPlace {
    Upper,
    Lower,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct JawEntry {
    pub(super) moves_along: AxisEntry,
    pub(super) place: JawPlace,
    #[serde(default, deserialize_with = "device_distance")]
    pub(super) source_distance_cm: Option<f64>,
    #[serde(default, deserialize_with = "jaw_transmission")]
    pub(super) transmission: Option<f64>,
    #[serde(default, deserialize_with = "device_travel")]
    pub(super) outward_limit_cm: Option<f64>,
    #[serde(default, deserialize_with = "device_travel")]
    pub(super) across_limit_cm: Option<f64>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct LeafBankEntry {
    pub(super) moves_along: AxisEntry,
    #[serde(default, deserialize_with = "device_distance")]
    pub(super) source_distance_cm: Option<f64>,
    pub(super) boundaries_cm: Vec<f64>,
    #[serde(deserialize_with = "transmission")]
    pub(super) transmission: f64,
    #[serde(deserialize_with = "leaf_end_offset")]
    pub(super) leaf_end_offset_cm: f64,
    #[serde(default, deserialize_with = "device_travel")]
    pub(super) outward_limit_cm: Option<f64>,
    #[serde(default, deserialize_with = "device_travel")]
    pub(super) across_limit_cm: Option<f64>,
}

#[derive(Clone, Copy, Deserialize)]
#[serde(rename_all = "UPPERCASE")]
pub(super) enum RadiationEntry {
    Photon,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct BeamEntry {
    #[serde(deserialize_with = "text")]
    pub(super) label: String,
    pub(super) radiation: RadiationEntry,
    #[serde(deserialize_with = "photon_energy")]
    pub(super) energy_mv: f64,
    #[serde(default, deserialize_with = "texts")]
    pub(super) fluence_mode_ids: Vec<String>,
    #[serde(deserialize_with = "exchange_k")]
    pub(super) exchange_k: f64,
    #[serde(default, deserialize_with = "penumbra")]
    pub(super) penumbra_sigma_cm: Option<f64>,
    #[serde(default, deserialize_with = "penumbra_share")]
    pub(super) penumbra_tail_share: Option<f64>,
    #[serde(default, deserialize_with = "penumbra")]
    pub(super) penumbra_tail_sigma_cm: Option<f64>,
    #[serde(default, deserialize_with = "extra_focal")]
    pub(super) extra_focal_distance_cm: Option<f64>,
    pub(super) reference: ReferenceEntry,
    pub(super) depth_table: DepthTableEntry,
    pub(super) output_factors: OutputEntry,
    pub(super) off_axis: OffAxisEntry,
    #[serde(default)]
    pub(super) trays: Vec<TrayEntry>,
    #[serde(default)]
    pub(super) wedges: Vec<WedgeEntry>,
    #[serde(default)]
    pub(super) couch: Vec<CouchEntry>,
    pub(super) uncertainty: UncertaintyEntry,
    #[serde(default)]
    pub(super) proof: Vec<ProofEntry>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ReferenceEntry {
    #[serde(deserialize_with = "reference_output")]
    pub(super) dose_per_mu_cgy: f64,
    #[serde(deserialize_with = "positive_depth")]
    pub(super) depth_cm: f64,
    #[serde(deserialize_with = "source_axis_distance")]
    pub(super) source_distance_cm: f64,
}

#[derive(Clone, Copy, Deserialize, PartialEq, Eq)]
#[serde(rename_all = "lowercase")]
pub(super) enum DepthKindEntry {
    Tpr,
    Tmr,
    Pdd,
}

#[derive(Clone, Copy, Deserialize, PartialEq, Eq)]
#[serde(rename_all = "snake_case")]
pub(super) enum NormalisedAt {
    D0,
    DMax,
}

#[derive(Clone, Copy, Deserialize, PartialEq, Eq)]
#[serde(rename_all = "lowercase")]
pub(super) enum ValuesIn {
    Percent,
    Share,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct DepthTableEntry {
    pub(super) file: String,
    pub(super) kind: DepthKindEntry,
    #[serde(default, deserialize_with = "source_surface_distance")]
    pub(super) ssd_cm: Option<f64>,
    pub(super) normalised_at: NormalisedAt,
    pub(super) values_in: ValuesIn,
    pub(super) interpolation: DepthInterpolation,
    #[serde(deserialize_with = "positive_depth")]
    pub(super) d_max_cm: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct OutputEntry {
    pub(super) file: String,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct OffAxisEntry {
    pub(super) file: String,
    pub(super) kind: OffAxisKind,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct TrayEntry {
    #[serde(deserialize_with = "text")]
    pub(super) id: String,
    #[serde(deserialize_with = "open_transmission")]
    pub(super) transmission: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct WedgeEntry {
    #[serde(deserialize_with = "text")]
    pub(super) id: String,
    #[serde(default, deserialize_with = "texts")]
    pub(super) further_ids: Vec<String>,
    pub(super) kind: WedgeModelKind,
    #[serde(deserialize_with = "wedge_angle")]
    pub(super) angle_deg: f64,
    pub(super) factor_file: Option<String>,
    pub(super) profile_file: Option<String>,
    pub(super) segments_file: Option<String>,
    pub(super) moves_along: Option<AxisEntry>,
    #[serde(default, deserialize_with = "wedge_gap")]
    pub(super) closing_gap_cm: Option<f64>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct CouchEntry {
    #[serde(deserialize_with = "gantry")]
    pub(super) from_gantry_deg: f64,
    #[serde(deserialize_with = "gantry")]
    pub(super) to_gantry_deg: f64,
    #[serde(deserialize_with = "open_transmission")]
    pub(super) transmission: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct UncertaintyEntry {
    #[serde(deserialize_with = "spread")]
    pub(super) output_percent: f64,
    #[serde(deserialize_with = "spread")]
    pub(super) depth_table_percent: f64,
    #[serde(deserialize_with = "spread")]
    pub(super) head_scatter_percent: f64,
    #[serde(deserialize_with = "spread")]
    pub(super) phantom_scatter_percent: f64,
    #[serde(deserialize_with = "spread")]
    pub(super) off_axis_percent: f64,
    #[serde(deserialize_with = "spread")]
    pub(super) transmission_percent: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ProofEntry {
    #[serde(deserialize_with = "text")]
    pub(super) label: String,
    #[serde(deserialize_with = "opening")]
    pub(super) x_cm: f64,
    #[serde(deserialize_with = "opening")]
    pub(super) y_cm: f64,
    #[serde(deserialize_with = "surface_distance")]
    pub(super) ssd_cm: f64,
    #[serde(deserialize_with = "positive_depth")]
    pub(super) depth_cm: f64,
    #[serde(deserialize_with = "proof_dose")]
    pub(super) measured_cgy_per_mu: f64,
}
