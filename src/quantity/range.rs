//! One table of credible ranges: it feeds the reader's checks, the model
//! loader's checks, error texts and the generators of property tests. A value
//! outside is named with the unit slip that would explain it; nothing is
//! rescaled.

/// A quantity that has a credible range.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Quantity {
    /// Source-axis distance, cm.
    SourceAxisDistance,
    /// Source-surface distance, cm.
    SourceSurfaceDistance,
    /// Depth of a point, cm.
    Depth,
    /// Jaw or leaf position at the isocentre plane, cm.
    DevicePosition,
    /// Distance from the source to a beam limiting device, cm.
    DeviceDistance,
    /// Coordinate of a point in the patient, cm.
    Coordinate,
    /// Beam meterset, MU.
    BeamMeterset,
    /// Dose of one beam in one fraction, Gy.
    BeamDose,
    /// Prescribed dose of a whole course, Gy.
    PrescribedDose,
    /// Nominal photon energy, MV.
    PhotonEnergy,
    /// Nominal electron energy, MeV.
    ElectronEnergy,
    /// Number of fractions.
    Fractions,
    /// Dose per MU at the normalisation point, cGy/MU.
    ReferenceOutput,
    /// Angle as written in a file, degrees.
    Angle,
    /// Transmission of a tray, block, couch or leaf, as a share.
    Transmission,
}

/// The credible range of a quantity, both ends included.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CredibleRange {
    /// Name for messages.
    pub name: &'static str,
    /// Unit for messages.
    pub unit: &'static str,
    /// Least credible value.
    pub least: f64,
    /// Greatest credible value.
    pub greatest: f64,
}

impl Quantity {
    /// Every quantity of the table.
    pub const ALL: &'static [Self] = &[
        Self::SourceAxisDistance,
        Self::SourceSurfaceDistance,
        Self::Depth,
        Self::DevicePosition,
        Self::DeviceDistance,
        Self::Coordinate,
        Self::BeamMeterset,
        Self::BeamDose,
        Self::PrescribedDose,
        Self::PhotonEnergy,
        Self::ElectronEnergy,
        Self::Fractions,
        Self::ReferenceOutput,
        Self::Angle,
        Self::Transmission,
    ];

    /// The credible range. Bounds are common practice for C-arm linacs and cobalt units.
    #[must_use]
    pub const fn range(self) -> CredibleRange {
        let (name, unit, least, greatest) = match self {
            Self::SourceAxisDistance => ("source-axis distance", "cm", 60.0, 150.0),
            Self::SourceSurfaceDistance => ("source-surface distance", "cm", 30.0, 500.0),
            Self::Depth => ("depth", "cm", 0.0, 60.0),
            Self::DevicePosition => ("jaw or leaf position", "cm", -30.0, 30.0),
            Self::DeviceDistance => ("source-device distance", "cm", 5.0, 120.0),
            Self::Coordinate => ("coordinate", "cm", -500.0, 500.0),
            Self::BeamMeterset => ("beam meterset", "MU", 0.0, 20_000.0),
            Self::BeamDose => ("beam dose", "Gy", 0.0, 50.0),
            Self::PrescribedDose => ("prescribed dose", "Gy", 0.0, 200.0),
            Self::PhotonEnergy => ("photon energy", "MV", 1.0, 50.0),
            Self::ElectronEnergy => ("electron energy", "MeV", 2.0, 50.0),
            Self::Fractions => ("fractions", "", 1.0, 100.0),
            Self::ReferenceOutput => ("dose per MU", "cGy/MU", 0.3, 3.0),
            Self::Angle => ("angle", "degrees", -720.0, 720.0),
            Self::Transmission => ("transmission", "", 0.0, 1.0),
        };
        CredibleRange {
            name,
            unit,
            least,
            greatest,
        }
    }

    /// `None` when the value is credible, else a sentence that says why it is
    /// not and which unit slip would explain it. NaN and infinity are never credible.
    #[must_use]
    pub fn objection(self, value: f64) -> Option<String> {
        let range = self.range();
        if value.is_finite() && value >= range.least && value <= range.greatest {
            return None;
        }
        let mut text = format!(
            "{} {value} {} is outside the credible range {} to {} {}",
            range.name, range.unit, range.least, range.greatest, range.unit
        );
        if let Some(slip) = self.unit_slip(value) {
            text.push_str("; ");
            text.push_str(slip);
        }
        Some(text)
    }

    /// The unit slip that would bring an incredible value into range.
    fn unit_slip(self, value: f64) -> Option<&'static str> {
        let range = self.range();
        // Zero is in no unit's range by a slip.
        let would_fit = |factor: f64| {
            let scaled = value * factor;
            value != 0.0 && scaled >= range.least && scaled <= range.greatest
        };
        match (range.unit, self) {
            ("cm", _) if would_fit(10.0) => {
                Some("ten times as much would be: was it written in cm where mm are wanted?")
            }
            ("cm", _) if would_fit(0.1) => {
                Some("a tenth would be: was it written in mm where cm are wanted?")
            }
            ("Gy", _) if would_fit(0.01) => Some("was it written in cGy where DICOM has Gy?"),
            (_, Self::PhotonEnergy | Self::ElectronEnergy) if would_fit(0.001) => {
                Some("was it written in kV or keV where DICOM has MV or MeV?")
            }
            (_, Self::ReferenceOutput) if would_fit(100.0) => {
                Some("was it written in Gy/MU where cGy/MU is wanted?")
            }
            (_, Self::Transmission) if would_fit(0.01) => {
                Some("was it written in per cent where a share of 1 is wanted?")
            }
            _ => None,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::Quantity;

    #[test]
    fn verify_objection_names_the_unit_slip() {
        // A SAD of 1000 mm written as 100: the reader has divided by ten already.
        let text = Quantity::SourceAxisDistance.objection(10.0).unwrap();
        assert!(text.contains("in cm where mm are wanted"), "{text}");
        assert!(Quantity::BeamDose.objection(200.0).unwrap().contains("cGy"));
        assert_eq!(Quantity::SourceAxisDistance.objection(100.0), None);
        assert!(Quantity::Depth.objection(f64::NAN).is_some());
    }
}
