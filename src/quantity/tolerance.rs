//! Every numerical tolerance of the program, named, with what it is for and
//! the largest difference seen where one was measured. Action levels are not
//! here: they belong to the site file.

/// Two metersets agree when they differ by less than this share (planning
/// systems write 20.000000000001).
pub const METERSET_RELATIVE: f64 = 1e-4;

/// Cumulative meterset weights are equal, or one falls below another, beyond this share of the final weight.
pub const METERSET_WEIGHT_RELATIVE: f64 = 1e-5;

/// Two positions (jaws, leaves, points, isocentres) are the same within this, cm: a tenth of the last digit that planning systems print.
pub const POSITION_CM: f64 = 0.001;

/// Two angles are the same within this, degrees.
pub const ANGLE_DEG: f64 = 0.01;

/// Two nominal energies are the same within this, MV or MeV.
pub const ENERGY: f64 = 0.01;

/// A plan's SAD equals the model's within this, cm.
pub const SAD_CM: f64 = 0.01;

/// Two dose points are one point within this, cm.
pub const SHARED_POINT_CM: f64 = 0.05;

/// A table look-up this close to a grid line or to the table's edge counts as on it, cm (float noise of projections).
pub const TABLE_EDGE_CM: f64 = 1e-9;

/// A depth table counts as normalised where its file says when it is 1 there within this share: the rounding of a clinic's PDD (0.1 in 66) and of interpolated maxima.
pub const TABLE_NORM_RELATIVE: f64 = 5e-3;

/// Sc and Sp at 10 cm, and off-axis ratios on the axis, are 1 within this share (rounding to three decimals, with room).
pub const FACTOR_NORM_RELATIVE: f64 = 2e-3;
