//! Scatter integration from a beam's own square-field tables: K(d, r), the dose
//! on the axis of a circular field per unit in-air fluence, its zero-field term,
//! and the integrals of the differential scatter kernel over quadrants.
//!
//! With T(d, s) = TPR(d, s) Sp(s) for squares,
//!
//! ```text
//! T(d, s) = (4/pi) * integral over 0 .. pi/4 of K(d, s / (2 cos t)) dt
//! k_d(r)  = (dK/dr) / (2 pi r)
//! Q_d(x, y) = integral of k_d over 0 .. x by 0 .. y
//! ```
//!
//! (J. R. Clarkson, Br J Radiol 14:265 (1941); J. R. Cunningham, Phys Med Biol 17:42 (1972).) Which
//! openings are integrated, and with what fluence, is the work of `dose`.

mod at_depth;
mod quadrant;
mod radial;
mod table_row;
mod zero_field;

pub use at_depth::{NoKernel, ScatterAtDepth, ScatterKernel, ScatterSum};
pub use quadrant::Place;
pub use radial::RadialDose;
pub use table_row::ScatterRow;
pub use zero_field::ZeroField;
