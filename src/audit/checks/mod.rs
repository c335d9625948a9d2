//! Plan checks: what the plan says of itself. One file a check; `registry` is
//! the one list. A finding is what is wrong with the plan; what stopped us
//! from looking is a reason of the beam's row.

mod check;
#[cfg(test)]
mod example;
mod registry;

mod aperture_unusable;
mod beam_not_referenced;
mod count_mismatch;
mod dangling_reference;
mod depth_bases_disagree;
mod equal_beam_doses;
mod malformed_value;
mod meterset_missing;
mod meterset_weights;
mod missing_value;
mod point_in_build_up;
mod point_near_edge;
mod point_under_device;
mod repeated_attribute;
mod repeated_number;
mod setup_beam_with_meterset;
mod several_prescriptions;
mod uid_not_unique;
mod value_out_of_range;

pub use check::{Check, CheckInput, Observation};
pub use registry::{CHECKS, run_checks, unknown_names};
