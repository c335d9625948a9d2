//! The plans in `sample-plans/`: what they are, that the files there are
//! exactly these, and what the audit says of each.

mod arcs;
mod clean;
mod course;
mod faulty;
mod faulty_shaped;
mod files;
mod geometry_shown;
mod judged;
mod not_yet;
mod sample;
mod shaped;
mod shapes;
mod wedges;

use self::sample::Sample;

/// Every sample plan.
fn all() -> Vec<Sample> {
    let mut samples = clean::samples();
    samples.extend(geometry_shown::samples());
    samples.extend(shaped::samples());
    samples.extend(arcs::samples());
    samples.extend(wedges::samples());
    samples.extend(faulty::samples());
    samples.extend(faulty_shaped::samples());
    samples.extend(wedges::faulty_samples());
    samples.extend(not_yet::samples());
    samples
}
