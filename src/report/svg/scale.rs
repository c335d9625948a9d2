//! Linear scales and tick steps.

/// Takes values of a range to picture coordinates.
#[derive(Clone, Copy, Debug)]
pub(in crate::report) struct Scale {
    least: f64,
    greatest: f64,
    at_least: f64,
    at_greatest: f64,
}

impl Scale {
    /// From the ends of the range and where they lie in the picture.
    pub(in crate::report) const fn new(values: [f64; 2], picture: [f64; 2]) -> Self {
        Self {
            least: values[0],
            greatest: values[1],
            at_least: picture[0],
            at_greatest: picture[1],
        }
    }

    /// The picture coordinate of a value, held within the picture.
    pub(in crate::report) fn at(self, value: f64) -> f64 {
        let share = (value - self.least) / (self.greatest - self.least);
        let share = if share.is_nan() {
            0.0
        } else {
            share.clamp(0.0, 1.0)
        };
        self.at_least + share * (self.at_greatest - self.at_least)
    }

    /// Whether a value lies in the range.
    pub(in crate::report) fn holds(self, value: f64) -> bool {
        value >= self.least && value <= self.greatest
    }

    /// The multiples of `step` within the range.
    pub(in crate::report) fn ticks(self, step: f64) -> Vec<f64> {
        let first = (self.least / step).ceil();
        let count = ((self.greatest / step).floor() - first).clamp(0.0, 1000.0);
        let mut ticks = Vec::new();
        let mut number = 0.0;
        while number <= count {
            ticks.push((first + number) * step);
            number += 1.0;
        }
        ticks
    }
}

/// The step of 1, 2 or 5 times a power of ten that gives at most `most` steps over `extent`.
pub(in crate::report) fn tick_step(extent: f64, most: f64) -> f64 {
    let least = extent / most;
    if !(least.is_finite() && least > 0.0) {
        return 1.0;
    }
    let power = 10f64.powf(least.log10().floor());
    [1.0, 2.0, 5.0]
        .into_iter()
        .map(|digit| digit * power)
        .find(|step| *step >= least * (1.0 - 1e-9))
        .unwrap_or(10.0 * power)
}

#[cfg(test)]
mod tests {
    use super::{Scale, tick_step};

    #[test]
    fn verify_scale_and_ticks() {
        // By hand: halfway between -10 and 10 is halfway between 0 and 200; 20 in at most 8 steps is 2.5, next 5.
        let scale = Scale::new([-10.0, 10.0], [0.0, 200.0]);
        assert_eq!(scale.at(0.0).to_bits(), 100f64.to_bits());
        assert_eq!(scale.at(99.0).to_bits(), 200f64.to_bits());
        assert_eq!(scale.at(f64::NAN).to_bits(), 0f64.to_bits());
        assert_eq!(tick_step(20.0, 8.0).to_bits(), 5f64.to_bits());
        assert_eq!(tick_step(20.0, 10.0).to_bits(), 2f64.to_bits());
        assert_eq!(scale.ticks(5.0), [-10.0, -5.0, 0.0, 5.0, 10.0]);
        assert!(scale.holds(10.0) && !scale.holds(10.1));
    }
}
