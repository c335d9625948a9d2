//! The reader of RT Plans: every encoding, every rule, every attack.

mod attacks;
mod conformance;
mod framing;
mod identifying;
mod inheritance;
mod mutation;
mod plans;
mod raw;
mod round_trip;
mod rules;
mod structure;

use counterfoil::plan::{Effect, NoteKind, Plan, read_plan};

use crate::builder::PlanSpec;

/// The plan that is read from a specification.
fn read(spec: &PlanSpec) -> Plan {
    read_plan(&spec.bytes()).expect("a readable plan")
}

/// Effects of the notes of a kind whose place contains a text.
fn effects(plan: &Plan, kind: NoteKind, place: &str) -> Vec<Effect> {
    plan.notes
        .iter()
        .filter(|note| note.kind == kind && note.place.contains(place))
        .map(|note| note.effect)
        .collect()
}

/// Whether anything stops the whole plan, a group or a beam.
fn blocked(plan: &Plan) -> bool {
    plan.notes.iter().any(|note| note.effect > Effect::None)
}
