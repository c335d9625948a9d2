//! What a scatter integration found besides the dose: shares, the mean leaf
//! gap, the steps that it took, and the doses of the control points, so that a
//! person can follow it.

use serde::Serialize;

use super::{FluenceImage, StepLimits};

/// Where the dose at the point comes from, per cent of it; they sum to 100.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize)]
pub struct Shares {
    /// Primary through the opening.
    pub open_primary_percent: f64,
    /// Phantom scatter of what came through the opening.
    pub open_scatter_percent: f64,
    /// Primary and scatter through leaves and blocks.
    pub transmission_percent: f64,
}

impl Shares {
    /// Phantom scatter of the open fluence and what came through leaves and blocks count apart.
    #[must_use]
    pub(super) fn new([open_primary, leak_primary, open_scatter, leak_scatter]: [f64; 4]) -> Self {
        let total = open_primary + leak_primary + open_scatter + leak_scatter;
        let percent = |part: f64| 100.0 * part / total;
        Self {
            open_primary_percent: percent(open_primary),
            open_scatter_percent: percent(open_scatter),
            transmission_percent: percent(leak_primary + leak_scatter),
        }
    }
}

/// What one interval between control points adds.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct ControlPointDose {
    /// Item index of the control point that begins the interval; of a sweep that the plan does not state, the index of
    /// its stretch.
    pub from_control_point: usize,
    /// Its share of the meterset, per cent.
    pub meterset_percent: f64,
    /// Gantry angle in the middle, degrees.
    pub gantry_deg: Option<f64>,
    /// Effective depth in the middle, cm.
    pub effective_depth_cm: f64,
    /// Source-point distance along the axis, cm.
    pub spd_cm: f64,
    /// Open and transmitted primary fluence at the point, 1 in an open field on the axis.
    pub point_fluence: f64,
    /// Head scatter factor of the aperture.
    pub head_scatter: f64,
    /// F(A): dose in phantom per unit in-air fluence, primary and scatter.
    pub in_phantom: f64,
    /// Dose per MU of the whole beam that this interval adds, cGy/MU.
    pub dose_per_mu_cgy: f64,
}

/// What the intervals of a result are intervals of.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum IntervalSource {
    /// The plan's control points.
    #[default]
    ControlPoints,
    /// The sweep of a jaw that the beam model has and the plan does not state.
    ModelSweep,
}

/// Everything about the integration of one beam.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ShapedResult {
    /// Where the dose comes from.
    pub shares: Shares,
    /// Mean open leaf gap over meterset and leaf width, cm at the isocentre plane; `None` without leaves.
    pub mean_leaf_gap_cm: Option<f64>,
    /// Greatest change of the open fluence within the margin around the point, per cent of that at the point.
    pub fluence_change_percent: f64,
    /// Moments that were summed.
    pub moments: usize,
    /// How finely it stepped.
    pub steps: StepLimits,
    /// What `intervals` are intervals of.
    pub intervals_from: IntervalSource,
    /// Intervals in which meterset accrues.
    pub intervals: Vec<ControlPointDose>,
    /// Meterset-weighted open fluence.
    pub fluence: FluenceImage,
}
