//! The square that scatters in the head as an opening of the jaws does.

use super::JawAxis;
use crate::quantity::CollimatorSquare;

/// Square equivalent to a jaw opening for collimator scatter, (1 + k) L U / (k L + U),
/// U the opening of the upper jaws, L of the lower ones, cm at the isocentre plane (Vadash & Bjarngard 1993).
#[must_use]
pub fn collimator_square(
    x_cm: f64,
    y_cm: f64,
    upper_jaws: JawAxis,
    exchange_k: f64,
) -> CollimatorSquare {
    let (upper, lower) = match upper_jaws {
        JawAxis::X => (x_cm, y_cm),
        JawAxis::Y => (y_cm, x_cm),
    };
    CollimatorSquare::new((1.0 + exchange_k) * lower * upper / (exchange_k * lower + upper))
}
