//! The normal distribution's share below a number of standard deviations, from
//! a table: penumbras and head scatter ask for it millions of times in a run.

use std::sync::LazyLock;

/// Places of the table per standard deviation; the parabola around each errs by less than 4e-8.
const PER_SIGMA: f64 = 64.0;

/// Beyond this many standard deviations the share is 0 or 1 within 1e-9.
const END_SIGMA: f64 = 6.0;

/// Places of the table, 0 to `END_SIGMA`.
const PLACES: usize = 385;

/// What holds at a place of the table.
#[derive(Clone, Copy, Default)]
struct Entry {
    /// The density.
    density: f64,
    /// The share below.
    share: f64,
    /// The integral of the share.
    integral: f64,
}

static TABLE: LazyLock<[Entry; PLACES]> = LazyLock::new(|| {
    const PER_ROOT_TWO_PI: f64 = 0.398_942_280_401_432_7;
    let mut table = [Entry::default(); PLACES];
    for (index, entry) in (0_u32..).zip(&mut table) {
        let sigmas = f64::from(index) / PER_SIGMA;
        let density = PER_ROOT_TWO_PI * (-0.5 * sigmas * sigmas).exp();
        let share = 0.5 * (1.0 + libm::erf(sigmas / 2.0_f64.sqrt()));
        *entry = Entry {
            density,
            share,
            integral: sigmas * share + density,
        };
    }
    table
});

/// The nearest place of the table below the end, and how far it is from there, sigmas; NaN stays NaN.
#[inline]
fn nearest(size: f64) -> (Entry, f64) {
    let place = (size * PER_SIGMA + 0.5) as usize;
    let place = place.min(PLACES - 1);
    (TABLE[place], size - place as f64 / PER_SIGMA)
}

/// Share of a normal distribution below `sigmas` standard deviations from its middle.
#[must_use]
#[inline]
pub fn normal_share(sigmas: f64) -> f64 {
    let size = sigmas.abs();
    if size >= END_SIGMA {
        return if sigmas > 0.0 { 1.0 } else { 0.0 };
    }
    let (entry, beyond) = nearest(size);
    // The density's slope at u is -u times the density.
    let above = beyond * entry.density * (1.0 - 0.5 * beyond * (size - beyond));
    let share = entry.share + above;
    if sigmas < 0.0 { 1.0 - share } else { share }
}

/// Integral of [`normal_share`] from minus infinity: u N(u) + exp(-u^2/2)/sqrt(2 pi).
#[must_use]
#[inline]
pub fn normal_share_integral(sigmas: f64) -> f64 {
    let size = sigmas.abs();
    if size >= END_SIGMA {
        return sigmas.max(0.0);
    }
    let (entry, beyond) = nearest(size);
    let integral = entry.integral + beyond * (entry.share + 0.5 * beyond * entry.density);
    if sigmas < 0.0 {
        integral - size
    } else {
        integral
    }
}

/// Share between two bounds of a distribution of this sigma around 0; 0 when they are the wrong way round.
#[must_use]
#[inline]
pub fn normal_between([low, high]: [f64; 2], sigma: f64) -> f64 {
    (normal_share(high / sigma) - normal_share(low / sigma)).max(0.0)
}

#[cfg(test)]
mod tests {
    use super::{normal_between, normal_share, normal_share_integral};

    /// By the trapezoidal rule over the shares.
    #[test]
    fn verify_the_integral_of_the_share() {
        let step = 0.001;
        let sum: f64 = (0..7000)
            .map(|index| normal_share(-6.0 + (f64::from(index) + 0.5) * step) * step)
            .sum();
        assert!((normal_share_integral(1.0) - sum).abs() < 1e-5);
        for sigmas in [-5.9, -2.503, -0.0042, 0.0, 0.311, 4.7] {
            // By its definition, with the error function itself.
            let u: f64 = sigmas;
            let share = 0.5 * (1.0 + libm::erf(u / 2.0_f64.sqrt()));
            let density = (-0.5 * u * u).exp() / std::f64::consts::TAU.sqrt();
            assert!((normal_share(u) - share).abs() < 5e-8, "{sigmas}");
            let integral = normal_share_integral(u);
            assert!((integral - (u * share + density)).abs() < 1e-8, "{sigmas}");
        }
        assert!(normal_share(f64::NAN).is_nan() && normal_share_integral(f64::NAN).is_nan());
        assert_eq!(normal_share_integral(7.0), 7.0);
        assert_eq!(normal_share_integral(-7.0), 0.0);
    }

    /// Tables of the normal distribution: 0.8413, 0.9772, 0.99865 at 1, 2, 3 sigma.
    #[test]
    fn verify_shares_of_the_normal_distribution() {
        for (sigmas, share) in [
            (0.0, 0.5),
            (1.0, 0.841_344_746),
            (2.0, 0.977_249_868),
            (3.0, 0.998_650_102),
            (-1.0, 0.158_655_254),
        ] {
            assert!((normal_share(sigmas) - share).abs() < 1e-6, "{sigmas}");
        }
        assert_eq!(normal_share(f64::INFINITY), 1.0);
        assert_eq!(normal_share(f64::NEG_INFINITY), 0.0);
        assert!((normal_between([-1.96, 1.96], 1.0) - 0.95).abs() < 1e-4);
        assert_eq!(normal_between([1.0, -1.0], 1.0), 0.0);
    }
}
