//! Mayneord's F: an estimate of a depth dose at another SSD that changes the
//! inverse square alone. A check, and an option for a field typed by hand; the
//! calculation itself goes by the tissue-phantom ratio (see `factors`).

/// A depth dose taken to another SSD.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Mayneord {
    /// F, the ratio of the two depth doses.
    pub factor: f64,
    /// The depth dose at the new SSD, per cent.
    pub pdd_percent: f64,
}

/// F = ((SSD2 + d0)/(SSD1 + d0))^2 * ((SSD1 + d)/(SSD2 + d))^2 (Mayneord & Lamerton 1941),
/// d0 the depth that the depth dose is normalised at. Lengths in cm, all above 0 but the depths, which may be 0.
#[must_use]
pub fn mayneord(
    pdd_percent: f64,
    from_ssd_cm: f64,
    to_ssd_cm: f64,
    depth_cm: f64,
    normalisation_depth_cm: f64,
) -> Mayneord {
    let normalisation =
        (to_ssd_cm + normalisation_depth_cm) / (from_ssd_cm + normalisation_depth_cm);
    let point = (from_ssd_cm + depth_cm) / (to_ssd_cm + depth_cm);
    let factor = (normalisation * point).powi(2);
    Mayneord {
        factor,
        pdd_percent: pdd_percent * factor,
    }
}
