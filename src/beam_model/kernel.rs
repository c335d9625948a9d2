//! A published photon pencil kernel that follows from TPR20,10 alone: what a
//! beam of that quality ought to look like, for plausibility beside a clinic's
//! own tables. It never replaces them, and doses are never calculated from it.
//!
//! T. Nyholm, J. Olofsson, A. Ahnesjo, M. Karlsson, Radiother Oncol 78:347 (2006), corrigendum
//! 98:286 (2011); the coefficients were read in two identical public copies, not in the paper.
//! Not valid in the build-up.

use std::f64::consts::{FRAC_PI_4, TAU};

/// TPR20,10 for which the kernel was published.
pub const QUALITY_RANGE: (f64, f64) = (0.60, 0.81);

/// A parameter's polynomial in TPR20,10, lowest power first.
type Polynomial = [f64; 6];

/// The two terms of the kernel in one depth direction: `x1 (1 - exp(x2 sqrt(d^2 + x5^2))) exp(x3 d + x4 d^2)`.
type Shape = [Polynomial; 5];

#[rustfmt::skip]
const A_SHAPE: Shape = [
    [0.0128018, -0.0577391, 0.1790839, -0.2467955, 0.1328192, -0.0194684],
    [16.7815028, -279.4672663, 839.0016549, -978.4915013, 470.5317337, -69.2485573],
    [-0.0889669, -0.2587584, 0.7069203, -0.3654033, 0.0029760, -0.0003786],
    [0.0017089, -0.0169150, 0.0514650, -0.0639530, 0.0324490, -0.0049121],
    [0.1431447, -0.2134626, 0.5825546, -0.2969273, -0.0011436, 0.0002219],
];
#[rustfmt::skip]
const B_SHAPE: Shape = [
    [-42.7607523, 264.3424720, -633.4540368, 731.5311577, -402.5280374, 82.4936551],
    [0.2428359, -2.5029336, 7.6128101, -9.5273454, 4.8249840, -0.7097852],
    [-0.0910420, -0.2621605, 0.7157244, -0.3664126, 0.0000930, -0.0000232],
    [0.0017284, -0.0172146, 0.0522109, -0.0643946, 0.0322177, -0.0047015],
    [-30.4609625, 354.2866078, -1073.2952368, 1315.2670101, -656.3702845, 96.5983711],
];
#[rustfmt::skip]
const SLOPE_A1: Polynomial = [-0.0065985, 0.0242136, -0.0647001, 0.0265272, 0.0072169, -0.0020479];
#[rustfmt::skip]
const SLOPE_A2: Polynomial = [-26.3337419, 435.6865552, -1359.8342546, 1724.6602381, -972.7565415, 200.3468023];
#[rustfmt::skip]
const SLOPE_B_SHAPE: Shape = [
    [-80.7027159, 668.1710175, -2173.2445309, 3494.2393490, -2784.4670834, 881.2276510],
    [3.4685991, -41.2468479, 124.9729952, -153.2610078, 76.5242757, -11.2624113],
    [-39.6550497, 277.7202038, -777.0749505, 1081.5724508, -747.1056558, 204.5432666],
    [0.6514859, -4.7179961, 13.6742202, -19.7521659, 14.1873606, -4.0478845],
    [0.4695047, -3.6644336, 10.0039321, -5.1195905, -0.0007387, 0.0002360],
];

/// The kernel of one beam quality, `p(r, d) = [A exp(-a r) + B exp(-b r)] / r`, r and d in cm of
/// water, dose per unit energy fluence.
#[derive(Clone, Copy, Debug)]
pub struct PencilKernel {
    primary: [f64; 5],
    scatter: [f64; 5],
    primary_slope: [f64; 2],
    scatter_slope: [f64; 5],
}

/// The kernel's terms at one depth.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct KernelTerms {
    /// A/a: the short-range part integrated over an endless plane, over 2 pi.
    pub primary: f64,
    /// B/b: the long-range part likewise.
    pub scatter: f64,
    /// a, per cm.
    pub primary_per_cm: f64,
    /// b, per cm.
    pub scatter_per_cm: f64,
}

impl PencilKernel {
    /// The kernel for a TPR20,10 put into it; `None` outside [`QUALITY_RANGE`].
    #[must_use]
    pub fn new(tpr20_10: f64) -> Option<Self> {
        let (least, greatest) = QUALITY_RANGE;
        if !(least..=greatest).contains(&tpr20_10) {
            return None;
        }
        let value = |polynomial: &Polynomial| {
            polynomial
                .iter()
                .rev()
                .fold(0.0, |sum, coefficient| sum * tpr20_10 + coefficient)
        };
        let shape = |shape: &Shape| shape.each_ref().map(value);
        Some(Self {
            primary: shape(&A_SHAPE),
            scatter: shape(&B_SHAPE),
            primary_slope: [value(&SLOPE_A1), value(&SLOPE_A2)],
            scatter_slope: shape(&SLOPE_B_SHAPE),
        })
    }

    /// The kernel whose own TPR20,10 (10 x 10) is the wanted one: it gives back a value up to 0.02 below the one put
    /// in. `None` when no input in the range does.
    #[must_use]
    pub fn matching(wanted_tpr20_10: f64) -> Option<Self> {
        let (mut low, mut high) = QUALITY_RANGE;
        let given_back = |input: f64| Self::new(input).map(|kernel| kernel.tpr(20.0, 10.0, 10.0));
        if !(given_back(low)?..=given_back(high)?).contains(&wanted_tpr20_10) {
            return None;
        }
        for _ in 0..40 {
            let middle = f64::midpoint(low, high);
            if given_back(middle)? < wanted_tpr20_10 {
                low = middle;
            } else {
                high = middle;
            }
        }
        Self::new(f64::midpoint(low, high))
    }

    /// The terms at a depth, cm.
    #[must_use]
    pub fn terms(&self, depth_cm: f64) -> KernelTerms {
        let [slope, start] = self.primary_slope;
        KernelTerms {
            primary: shape_at(&self.primary, depth_cm),
            scatter: shape_at(&self.scatter, depth_cm),
            primary_per_cm: start + slope * depth_cm,
            scatter_per_cm: shape_at(&self.scatter_slope, depth_cm),
        }
    }

    /// Dose on the axis of a rectangle x by y cm at the depth, per unit energy fluence.
    #[must_use]
    pub fn rectangle_dose(&self, (x_cm, y_cm): (f64, f64), depth_cm: f64) -> f64 {
        let terms = self.terms(depth_cm);
        // Each quadrant is two right-angled triangles with the axis as their common corner.
        4.0 * (terms.triangle(x_cm / 2.0, (y_cm / x_cm).atan())
            + terms.triangle(y_cm / 2.0, (x_cm / y_cm).atan()))
    }

    /// Dose on the axis of a square field at the depth, per unit energy fluence.
    #[must_use]
    pub fn square_dose(&self, side_cm: f64, depth_cm: f64) -> f64 {
        // Eight equal triangles.
        8.0 * self.terms(depth_cm).triangle(side_cm / 2.0, FRAC_PI_4)
    }

    /// Tissue-phantom ratio of a square field, normalised at d0.
    #[must_use]
    pub fn tpr(&self, depth_cm: f64, side_cm: f64, d0_cm: f64) -> f64 {
        self.square_dose(side_cm, depth_cm) / self.square_dose(side_cm, d0_cm)
    }

    /// Phantom scatter factor at d0, 1 at 10 cm.
    #[must_use]
    pub fn sp(&self, side_cm: f64, d0_cm: f64) -> f64 {
        self.square_dose(side_cm, d0_cm) / self.square_dose(10.0, d0_cm)
    }

    /// Percent depth dose in per cent of that at d0, for the side at the surface.
    #[must_use]
    pub fn pdd_percent(&self, depth_cm: f64, side_cm: f64, (ssd_cm, d0_cm): (f64, f64)) -> f64 {
        let dose = |depth: f64| {
            let side_at_depth = side_cm * (ssd_cm + depth) / ssd_cm;
            self.square_dose(side_at_depth, depth) / (ssd_cm + depth).powi(2)
        };
        100.0 * dose(depth_cm) / dose(d0_cm)
    }
}

impl KernelTerms {
    /// Dose on the axis of a circle, per unit energy fluence and per radian.
    fn sector(&self, radius_cm: f64) -> f64 {
        self.primary * (1.0 - (-self.primary_per_cm * radius_cm).exp())
            + self.scatter * (1.0 - (-self.scatter_per_cm * radius_cm).exp())
    }

    /// Dose on the axis of a circle of this radius, per unit energy fluence.
    #[must_use]
    pub fn circle_dose(&self, radius_cm: f64) -> f64 {
        TAU * self.sector(radius_cm)
    }

    /// The sector integral over an angle, the edge being a straight line at this distance (Simpson;
    /// with 32 steps exact to 1e-9 for openings up to 1 to 10).
    fn triangle(&self, distance_cm: f64, angle_rad: f64) -> f64 {
        const STEPS: u32 = 32;
        let step = angle_rad / f64::from(STEPS);
        let at = |index: u32| self.sector(distance_cm / (step * f64::from(index)).cos());
        let inner: f64 = (1..STEPS)
            .map(|index| if index % 2 == 1 { 4.0 } else { 2.0 } * at(index))
            .sum();
        step / 3.0 * (at(0) + inner + at(STEPS))
    }
}

fn shape_at(&[x1, x2, x3, x4, x5]: &[f64; 5], depth_cm: f64) -> f64 {
    x1 * (1.0 - (x2 * depth_cm.hypot(x5)).exp()) * (x3 * depth_cm + x4 * depth_cm.powi(2)).exp()
}
