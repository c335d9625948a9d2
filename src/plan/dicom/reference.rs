//! The joins between the parts of a plan: numbers that stand twice, references
//! that lead nowhere, treatment beams without a meterset. Beams are joined by
//! number only.

use std::collections::BTreeMap;

use dicom_core::Tag;
use dicom_dictionary_std::tags;

use super::name::place_of;
use super::notes::Notes;
use crate::plan::{Effect, NoteKind, NoteScope, Plan, ReadingNote};
use crate::quantity::Given;

/// Notes every join of the plan that does not hold.
pub(super) fn check_references(plan: &Plan, notes: &mut Notes) {
    let beams = count(plan.beams.iter().map(|beam| &beam.number));
    for (index, beam) in plan.beams.iter().enumerate() {
        let place = place_of(&[(tags::BEAM_SEQUENCE, index)], tags::BEAM_NUMBER);
        twice(
            &beams,
            &beam.number,
            (NoteScope::Beam(index), Effect::BlocksScope),
            place,
            "beam number",
            notes,
        );
    }
    check_groups(plan, &beams, notes);
    check_setups(plan, notes);
    check_prescription(plan, notes);
}

type Counts = BTreeMap<i32, usize>;

fn count<'p>(numbers: impl Iterator<Item = &'p Given<i32>>) -> Counts {
    let mut counts = Counts::new();
    for number in numbers.filter_map(Given::value) {
        *counts.entry(*number).or_default() += 1;
    }
    counts
}

fn twice(
    counts: &Counts,
    number: &Given<i32>,
    (scope, effect): (NoteScope, Effect),
    place: String,
    name: &str,
    notes: &mut Notes,
) {
    if let Some(number) = number.value()
        && counts.get(number).is_some_and(|&count| count > 1)
    {
        notes.add(ReadingNote {
            scope,
            kind: NoteKind::RepeatedNumber,
            effect,
            place,
            message: format!("{name} {number} stands more than once"),
            measured: Some(number.to_string()),
            limit: None,
        });
    }
}

fn dangling(
    counts: &Counts,
    number: &Given<i32>,
    (scope, effect): (NoteScope, Effect),
    place: impl FnOnce() -> String,
    name: &str,
    notes: &mut Notes,
) {
    if let Some(number) = number.value()
        && !counts.contains_key(number)
    {
        notes.add(ReadingNote {
            scope,
            kind: NoteKind::DanglingReference,
            effect,
            place: place(),
            message: format!("the plan has no {name} {number}"),
            measured: Some(number.to_string()),
            limit: None,
        });
    }
}

fn check_groups(plan: &Plan, beams: &Counts, notes: &mut Notes) {
    let groups = count(plan.fraction_groups.iter().map(|group| &group.number));
    let doses = count(plan.dose_references.iter().map(|dose| &dose.number));
    for (index, group) in plan.fraction_groups.iter().enumerate() {
        let step = (tags::FRACTION_GROUP_SEQUENCE, index);
        let scope = NoteScope::FractionGroup(index);
        twice(
            &groups,
            &group.number,
            (scope, Effect::BlocksScope),
            place_of(&[step], tags::FRACTION_GROUP_NUMBER),
            "fraction group number",
            notes,
        );
        let referenced = count(group.beams.iter().map(|beam| &beam.beam_number));
        for (item, reference) in group.beams.iter().enumerate() {
            let place = || {
                place_of(
                    &[step, (tags::REFERENCED_BEAM_SEQUENCE, item)],
                    tags::REFERENCED_BEAM_NUMBER,
                )
            };
            // The beam that is missing cannot be named by its index, so the note is the group's
            // and blocks none of the beams that are there.
            let number = &reference.beam_number;
            dangling(beams, number, (scope, Effect::None), place, "beam", notes);
            let scope = number
                .value()
                .and_then(|&number| plan.beam_index_by_number(number))
                .map_or(scope, NoteScope::Beam);
            twice(
                &referenced,
                number,
                (scope, Effect::BlocksScope),
                place(),
                "in one fraction group the reference to beam",
                notes,
            );
        }
        for (item, reference) in group.dose_references.iter().enumerate() {
            let place = || {
                place_of(
                    &[step, (tags::REFERENCED_DOSE_REFERENCE_SEQUENCE, item)],
                    tags::REFERENCED_DOSE_REFERENCE_NUMBER,
                )
            };
            let at = (scope, Effect::None);
            dangling(
                &doses,
                &reference.number,
                at,
                place,
                "dose reference",
                notes,
            );
        }
    }
}

fn check_setups(plan: &Plan, notes: &mut Notes) {
    let setups = count(plan.patient_setups.iter().map(|setup| &setup.number));
    let tables = count(plan.tolerance_tables.iter().map(|table| &table.number));
    for (index, beam) in plan.beams.iter().enumerate() {
        let scope = NoteScope::Beam(index);
        let place = |tag: Tag| place_of(&[(tags::BEAM_SEQUENCE, index)], tag);
        let setup = &beam.patient_setup_number;
        let at = (scope, Effect::BlocksScope);
        let tag = tags::REFERENCED_PATIENT_SETUP_NUMBER;
        dangling(&setups, setup, at, || place(tag), "patient setup", notes);
        twice(
            &setups,
            setup,
            at,
            place(tag),
            "patient setup number",
            notes,
        );
        let table = &beam.tolerance_table_number;
        let at = (scope, Effect::None);
        let tag = tags::REFERENCED_TOLERANCE_TABLE_NUMBER;
        dangling(&tables, table, at, || place(tag), "tolerance table", notes);
    }
}

fn check_prescription(plan: &Plan, notes: &mut Notes) {
    let doses = count(plan.dose_references.iter().map(|dose| &dose.number));
    for (index, dose) in plan.dose_references.iter().enumerate() {
        let path = [(tags::DOSE_REFERENCE_SEQUENCE, index)];
        let place = place_of(&path, tags::DOSE_REFERENCE_NUMBER);
        let at = (NoteScope::Plan, Effect::None);
        twice(
            &doses,
            &dose.number,
            at,
            place,
            "dose reference number",
            notes,
        );
    }
}
