//! `machine.toml` as written: its keys, units and ranges. Joining it with the
//! tables, and rules over several keys, are for `load_machine` and `load_beam`.

use serde::{Deserialize, Deserializer, de};

use super::{DataOrigin, DepthInterpolation, JawAxis, OffAxisKind};
use crate::quantity::Quantity;

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
    #[serde(default)]
    pub(super) fluence_mode_ids: Vec<String>,
    #[serde(deserialize_with = "exchange_k")]
    pub(super) exchange_k: f64,
    pub(super) reference: ReferenceEntry,
    pub(super) depth_table: DepthTableEntry,
    pub(super) output_factors: OutputEntry,
    pub(super) off_axis: OffAxisEntry,
    #[serde(default)]
    pub(super) trays: Vec<TrayEntry>,
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

/// A non-empty text, trimmed.
fn text<'de, D: Deserializer<'de>>(input: D) -> Result<String, D::Error> {
    let text = String::deserialize(input)?.trim().to_owned();
    if text.is_empty() {
        return Err(de::Error::custom("the text is empty"));
    }
    Ok(text)
}

/// A TOML date without a time, such as 2026-11-02.
fn date<'de, D: Deserializer<'de>>(input: D) -> Result<jiff::civil::Date, D::Error> {
    let stamp = toml::value::Datetime::deserialize(input)?;
    let (Some(date), None) = (stamp.date, stamp.time) else {
        return Err(de::Error::custom("a date such as 2026-11-02 is wanted"));
    };
    i16::try_from(date.year)
        .ok()
        .zip(i8::try_from(date.month).ok())
        .zip(i8::try_from(date.day).ok())
        .and_then(|((year, month), day)| jiff::civil::Date::new(year, month, day).ok())
        .ok_or_else(|| de::Error::custom(format!("{date} is not a date")))
}

fn within<E: de::Error>(value: f64, (least, greatest): (f64, f64), unit: &str) -> Result<f64, E> {
    if value >= least && value <= greatest {
        return Ok(value);
    }
    Err(E::custom(format!(
        "{value} {unit} is outside the credible range {least} to {greatest} {unit}"
    )))
}

macro_rules! credible {
    ($($name:ident: $quantity:expr, $zero:ident;)*) => {$(
        fn $name<'de, D: Deserializer<'de>>(input: D) -> Result<f64, D::Error> {
            let value = f64::deserialize(input)?;
            if Zero::$zero == Zero::Refused && value == 0.0 {
                return Err(de::Error::custom("0 is not possible here"));
            }
            $quantity.objection(value).map_or(Ok(value), |text| Err(de::Error::custom(text)))
        }
    )*};
}

macro_rules! optional {
    ($($name:ident: $of:ident;)*) => {$(
        fn $name<'de, D: Deserializer<'de>>(input: D) -> Result<Option<f64>, D::Error> {
            $of(input).map(Some)
        }
    )*};
}

macro_rules! bounded {
    ($($(#[$why:meta])* $name:ident: $least:expr, $greatest:expr, $unit:expr;)*) => {$(
        $(#[$why])*
        fn $name<'de, D: Deserializer<'de>>(input: D) -> Result<f64, D::Error> {
            within(f64::deserialize(input)?, ($least, $greatest), $unit)
        }
    )*};
}

/// Whether zero is a possible value of a quantity whose range starts at it.
#[derive(PartialEq, Eq)]
enum Zero {
    Possible,
    Refused,
}

credible! {
    source_axis_distance: Quantity::SourceAxisDistance, Refused;
    surface_distance: Quantity::SourceSurfaceDistance, Refused;
    mounted_distance: Quantity::DeviceDistance, Refused;
    positive_depth: Quantity::Depth, Refused;
    photon_energy: Quantity::PhotonEnergy, Refused;
    reference_output: Quantity::ReferenceOutput, Refused;
    transmission: Quantity::Transmission, Possible;
    /* A tray or couch that stops the beam is a mistake. */
    open_transmission: Quantity::Transmission, Refused;
}

optional! {
    source_surface_distance: surface_distance;
    device_distance: mounted_distance;
    device_travel: travel;
}

bounded! {
    /// Travel from the axis, as the credible device positions.
    travel: 0.0, Quantity::DevicePosition.range().greatest, "cm";
    /// An opening: both jaws fully out.
    opening: 0.5, 2.0 * Quantity::DevicePosition.range().greatest, "cm";
    /// Published values lie between 1 and 1.9 (common practice); this only catches slips.
    exchange_k: 0.3, 4.0, "";
    /// Dosimetric leaf gaps of 0.7 to 2.3 mm are in use, so half of that per leaf end (common practice).
    leaf_end_offset: -0.2, 0.5, "cm";
    gantry: 0.0, 360.0, "degrees";
    /// Above 10 per cent no beam could be verified with it.
    spread: 0.0, 10.0, "per cent";
    proof_dose: 0.01, 3.0, "cGy/MU";
}
