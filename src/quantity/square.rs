//! The four squares of a hand calculation, one type each, because the same
//! field has a different side at the isocentre plane, at the surface, at the
//! normalisation depth and at the point, and taking one for another is a
//! classic error. Which square a rectangle is equivalent to for collimator
//! scatter depends on the machine and lives with the formalism.

use serde::Serialize;

macro_rules! squares {
    ($($(#[$doc:meta])* $name:ident;)*) => {$(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq, PartialOrd, Serialize)]
        #[serde(transparent)]
        pub struct $name(f64);

        impl $name {
            /// From the side, cm.
            #[must_use]
            pub const fn new(side_cm: f64) -> Self {
                Self(side_cm)
            }

            /// The side, cm.
            #[must_use]
            pub const fn side_cm(self) -> f64 {
                self.0
            }
        }
    )*};
}

squares! {
    /// Equivalent square of the collimator opening for head scatter, at the isocentre plane.
    CollimatorSquare;
    /// Equivalent square of the irradiated field at the plane of the calculation point (perpendicular to the axis).
    PointSquare;
    /// Equivalent square of the irradiated field at the normalisation depth d0.
    ReferenceDepthSquare;
    /// Equivalent square of the irradiated field at the surface.
    SurfaceSquare;
}

impl PointSquare {
    /// The same field projected onto the surface: s = s_d * SSD / SPD.
    #[must_use]
    pub fn at_surface(self, ssd_cm: f64, spd_cm: f64) -> SurfaceSquare {
        SurfaceSquare(self.0 * ssd_cm / spd_cm)
    }

    /// The same field projected onto the normalisation depth: s_d0 = s_d * (SSD + d0) / SPD.
    #[must_use]
    pub fn at_reference_depth(self, ssd_cm: f64, d0_cm: f64, spd_cm: f64) -> ReferenceDepthSquare {
        ReferenceDepthSquare(self.0 * (ssd_cm + d0_cm) / spd_cm)
    }
}

/// Side of the square equivalent to an a x b rectangle for phantom scatter,
/// 2ab/(a+b), cm (Sterling, Perry & Katz 1964). Zero when either side is zero.
#[must_use]
pub fn sterling_side_cm(a_cm: f64, b_cm: f64) -> f64 {
    if a_cm <= 0.0 || b_cm <= 0.0 {
        return 0.0;
    }
    2.0 * a_cm * b_cm / (a_cm + b_cm)
}
