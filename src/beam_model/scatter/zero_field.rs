//! What the dose on the axis tends to when the field shrinks to nothing: the
//! primary part. It is the one extrapolation of the program, so its form is
//! bounded: K = G0 + A r/(r + B) through the smallest fields. What becomes of the
//! larger fields is the work of `radial`.

/// So many of the smallest fields are fitted.
const FITTED: usize = 4;

/// Bounds of B, cm: the scatter of megavoltage beams saturates over some centimetres of radius; a
/// table that asks for less or more does so by its noise.
const LEAST_B_CM: f64 = 2.0;
const GREATEST_B_CM: f64 = 40.0;

/// Least G0 as a share of the smallest field's dose: no primary of a megavoltage beam is less than
/// this part of what a field of some centimetres gets.
const LEAST_SHARE: f64 = 0.5;

/// The bounded form at small fields.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ZeroField {
    /// G0: dose of a field of radius 0, per unit in-air fluence.
    pub dose: f64,
    /// A: what scatter adds at most.
    pub rise: f64,
    /// B: radius at which half of it is there, cm.
    pub half_radius_cm: f64,
}

impl ZeroField {
    /// So many of the smallest fields are fitted.
    pub const FITTED: usize = FITTED;

    /// Whether the fit was held at a bound of B: the table does not tell more.
    #[must_use]
    pub fn is_at_bound(&self) -> bool {
        let near = |bound_cm: f64| (self.half_radius_cm / bound_cm - 1.0).abs() < 1e-6;
        near(LEAST_B_CM) || near(GREATEST_B_CM)
    }

    /// The dose at a radius, cm.
    #[must_use]
    pub fn at(&self, radius_cm: f64) -> f64 {
        self.dose + self.rise * radius_cm / (radius_cm + self.half_radius_cm)
    }
}

/// Fits the form to the smallest of (radius, dose) pairs, which rise in radius: B by a search
/// between its bounds, G0 and A by least squares, A not negative.
pub(super) fn fit(radii_cm: &[f64], doses: &[f64]) -> ZeroField {
    let count = radii_cm.len().min(doses.len()).min(FITTED);
    let (radii_cm, doses) = (&radii_cm[..count], &doses[..count]);
    let mut best = (f64::INFINITY, line(radii_cm, doses, GREATEST_B_CM));
    // The residual is smooth in log B: a fine scan cannot miss its minimum by anything that matters.
    const STEPS: u32 = 60;
    for step in 0..=STEPS {
        let share = f64::from(step) / f64::from(STEPS);
        let half_radius_cm = LEAST_B_CM * (GREATEST_B_CM / LEAST_B_CM).powf(share);
        let form = line(radii_cm, doses, half_radius_cm);
        let residual: f64 = radii_cm
            .iter()
            .zip(doses)
            .map(|(&radius_cm, dose)| (form.at(radius_cm) - dose).powi(2))
            .sum();
        if residual < best.0 {
            best = (residual, form);
        }
    }
    let mut form = best.1;
    let smallest = doses.first().copied().unwrap_or_default();
    // A dose that is not positive stands in a damaged table only, and bounds nothing.
    if smallest > 0.0 {
        form.dose = form.dose.clamp(LEAST_SHARE * smallest, smallest);
    }
    form
}

/// G0 and A by least squares for one B.
fn line(radii_cm: &[f64], doses: &[f64], half_radius_cm: f64) -> ZeroField {
    let mut sums = [0.0; 5];
    for (&radius_cm, &dose) in radii_cm.iter().zip(doses) {
        let share = radius_cm / (radius_cm + half_radius_cm);
        for (sum, term) in sums
            .iter_mut()
            .zip([1.0, share, share * share, dose, share * dose])
        {
            *sum += term;
        }
    }
    let [count, share, share2, dose, share_dose] = sums;
    let determinant = count * share2 - share * share;
    let rise = if determinant > 1e-12 {
        ((count * share_dose - share * dose) / determinant).max(0.0)
    } else {
        0.0
    };
    ZeroField {
        dose: (dose - rise * share) / count.max(1.0),
        rise,
        half_radius_cm,
    }
}

#[cfg(test)]
mod tests {
    use super::{ZeroField, fit};

    /// A hyperbola comes back as itself.
    #[test]
    fn verify_the_form_is_recovered() {
        let form = ZeroField {
            dose: 0.75,
            rise: 0.4,
            half_radius_cm: 7.0,
        };
        let radii_cm = [1.7, 2.2, 2.8, 3.4, 4.5];
        let found = fit(&radii_cm, &radii_cm.map(|radius_cm| form.at(radius_cm)));
        assert!((found.dose - 0.75).abs() < 5e-4, "{found:?}");
    }

    /// Doses that are not positive (a damaged table) stop nothing.
    #[test]
    fn verify_doses_that_are_not_positive_give_a_form() {
        for doses in [[-0.01, -0.02, 0.5, 0.6], [0.0; 4], [f64::NAN; 4]] {
            assert!(fit(&[1.7, 2.2, 2.8, 3.4], &doses).half_radius_cm > 0.0);
        }
    }

    /// Falling doses (a damaged table) give a constant, never a rise towards zero field.
    #[test]
    fn verify_a_falling_table_gives_a_constant() {
        let found = fit(&[1.7, 2.2, 2.8, 3.4], &[0.90, 0.89, 0.88, 0.87]);
        assert_eq!(found.rise, 0.0);
        assert!(found.dose <= 0.90);
    }
}
