//! Units that depend on the beam.

use crate::plan::{Beam, Plan, RadiationType, ReferencedBeam};

pub(super) const fn energy_unit(beam: &Beam) -> &'static str {
    match beam.radiation.value() {
        Some(RadiationType::Photon) => "MV",
        Some(RadiationType::Electron) => "MeV",
        _ => "MV or MeV",
    }
}

/// The unit of a meterset: what the beam of that number names, MU where it names none.
pub(super) fn meterset_unit(plan: &Plan, reference: &ReferencedBeam) -> String {
    plan.beams
        .iter()
        .find(|beam| {
            beam.number.get().is_some() && beam.number.get() == reference.beam_number.get()
        })
        .and_then(|beam| beam.dosimeter_unit.value().cloned())
        .unwrap_or_else(|| "MU".to_owned())
}
