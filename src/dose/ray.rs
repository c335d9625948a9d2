//! The ray from the source to the calculation point as plain numbers: where it
//! crosses the isocentre plane, how far down the point is, how oblique it is.

/// A point on its ray from the source.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RayPoint {
    /// Where the ray crosses the isocentre plane, [x, y] in the collimator system, cm.
    pub projected_cm: [f64; 2],
    /// Source-point distance along the axis, cm; above 0.
    pub spd_cm: f64,
    /// Source-axis distance, cm; above 0.
    pub sad_cm: f64,
}

impl RayPoint {
    /// A point on the axis.
    #[must_use]
    pub const fn on_axis(spd_cm: f64, sad_cm: f64) -> Self {
        Self {
            projected_cm: [0.0, 0.0],
            spd_cm,
            sad_cm,
        }
    }

    /// Off-axis radius, projected onto the isocentre plane, cm.
    #[must_use]
    pub fn off_axis_cm(&self) -> f64 {
        let [x_cm, y_cm] = self.projected_cm;
        x_cm.hypot(y_cm)
    }

    /// Cosine of the angle between ray and axis.
    #[must_use]
    pub fn cosine(&self) -> f64 {
        self.sad_cm / self.sad_cm.hypot(self.off_axis_cm())
    }

    /// Source-point distance along the ray, cm.
    #[must_use]
    pub fn slant_distance_cm(&self) -> f64 {
        self.spd_cm / self.cosine()
    }

    /// How much larger things are in the point's plane than in the isocentre plane.
    #[must_use]
    pub fn scale(&self) -> f64 {
        self.spd_cm / self.sad_cm
    }
}
