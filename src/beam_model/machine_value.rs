//! Readers of single values of `machine.toml`: each holds its value to a range
//! or form, so that the parser's message carries the line. The keys are in
//! `machine_file`.

use serde::{Deserialize, Deserializer, de};

use crate::quantity::Quantity;

/// A non-empty text, trimmed.
pub(super) fn text<'de, D: Deserializer<'de>>(input: D) -> Result<String, D::Error> {
    let text = String::deserialize(input)?.trim().to_owned();
    if text.is_empty() {
        return Err(de::Error::custom("the text is empty"));
    }
    Ok(text)
}

/// Non-empty texts, trimmed, none twice.
pub(super) fn texts<'de, D: Deserializer<'de>>(input: D) -> Result<Vec<String>, D::Error> {
    let mut texts: Vec<String> = Vec::new();
    for written in Vec::<String>::deserialize(input)? {
        let text = written.trim();
        if text.is_empty() {
            return Err(de::Error::custom("a text in the list is empty"));
        }
        if texts.iter().any(|known| known == text) {
            return Err(de::Error::custom(format!("`{text}` is given twice")));
        }
        texts.push(text.to_owned());
    }
    Ok(texts)
}

/// A TOML date without a time, such as 2026-11-02.
pub(super) fn date<'de, D: Deserializer<'de>>(input: D) -> Result<jiff::civil::Date, D::Error> {
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

/// The quantity's credible range. Lengths here are written in cm, so the slip to name is mm.
fn credible<E: de::Error>(value: f64, quantity: Quantity) -> Result<f64, E> {
    let range = quantity.range();
    let in_mm = value * 0.1;
    if range.unit == "cm" && in_mm >= range.least && in_mm <= range.greatest {
        return within(value, (range.least, range.greatest), "cm")
            .map_err(|error: E| E::custom(format!("{error}; was it written in mm?")));
    }
    quantity
        .objection(value)
        .map_or(Ok(value), |text| Err(E::custom(text)))
}

macro_rules! credible {
    ($($name:ident: $quantity:expr, $zero:ident;)*) => {$(
        pub(super) fn $name<'de, D: Deserializer<'de>>(input: D) -> Result<f64, D::Error> {
            let value = f64::deserialize(input)?;
            if Zero::$zero == Zero::Refused && value == 0.0 {
                return Err(de::Error::custom("0 is not possible here"));
            }
            credible(value, $quantity)
        }
    )*};
}

macro_rules! optional {
    ($($name:ident: $of:ident;)*) => {$(
        pub(super) fn $name<'de, D: Deserializer<'de>>(input: D) -> Result<Option<f64>, D::Error> {
            $of(input).map(Some)
        }
    )*};
}

macro_rules! bounded {
    ($($(#[$why:meta])* $name:ident: $least:expr, $greatest:expr, $unit:expr;)*) => {$(
        $(#[$why])*
        pub(super) fn $name<'de, D: Deserializer<'de>>(input: D) -> Result<f64, D::Error> {
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
    jaw_transmission: transmission;
    penumbra: penumbra_sigma;
    penumbra_share: penumbra_tail;
    extra_focal: extra_focal_distance;
    wedge_gap: closing_gap;
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
    /// Gaussian widths of 0.1 to 0.4 cm fit measured penumbras (common practice); wider is a slip of unit.
    penumbra_sigma: 0.001, 1.0, "cm";
    /// More than half of it would be the main part.
    penumbra_tail: 0.0, 0.5, "of the penumbra";
    /// Flattening filters and their like sit between target and monitor chamber (common practice).
    extra_focal_distance: 2.0, 25.0, "cm";
    gantry: 0.0, 360.0, "degrees";
    /// Wedges of 15 to 60 degrees are in use (common practice).
    wedge_angle: 1.0, 75.0, "degrees";
    /// Opposed jaws stop a few millimetres before they meet (common practice).
    closing_gap: 0.0, 2.0, "cm";
    /// Above 10 per cent no beam could be verified with it.
    spread: 0.0, 10.0, "per cent";
    proof_dose: 0.01, 3.0, "cGy/MU";
}
