//! The normal distribution's share below a number of standard deviations, from
//! a table: penumbras and head scatter ask for it millions of times in a run.

use std::sync::LazyLock;

/// Steps per standard deviation; linear interpolation between them errs by less than 5e-7.
const PER_SIGMA: f64 = 256.0;

/// Beyond this many standard deviations the share is 0 or 1 within 1e-9.
const END_SIGMA: f64 = 6.0;

static SHARES: LazyLock<Vec<f64>> = LazyLock::new(|| {
    let count = (END_SIGMA * PER_SIGMA) as u32 + 1;
    (0..=count)
        .map(|index| 0.5 * (1.0 + libm::erf(f64::from(index) / PER_SIGMA / 2.0_f64.sqrt())))
        .collect()
});

/// Share of a normal distribution below `sigmas` standard deviations from its middle.
#[must_use]
#[inline]
pub fn normal_share(sigmas: f64) -> f64 {
    let size = sigmas.abs();
    if size >= END_SIGMA {
        return if sigmas > 0.0 { 1.0 } else { 0.0 };
    }
    let place = size * PER_SIGMA;
    let low = place as usize;
    let table = &*SHARES;
    // NaN lands on the first cell and stays NaN by its share.
    let (Some(a), Some(b)) = (table.get(low), table.get(low + 1)) else {
        return 1.0;
    };
    let share = a + (b - a) * (place - low as f64);
    if sigmas < 0.0 { 1.0 - share } else { share }
}

/// Integral of [`normal_share`] from minus infinity: u N(u) + exp(-u^2/2)/sqrt(2 pi).
#[must_use]
#[inline]
pub fn normal_share_integral(sigmas: f64) -> f64 {
    if sigmas.abs() >= END_SIGMA {
        return sigmas.max(0.0);
    }
    const PER_ROOT_TWO_PI: f64 = 0.398_942_280_401_432_7;
    sigmas * normal_share(sigmas) + PER_ROOT_TWO_PI * (-0.5 * sigmas * sigmas).exp()
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
