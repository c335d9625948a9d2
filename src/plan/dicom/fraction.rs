//! Fraction groups and their referenced beams. Whether the numbers that join
//! them to beams are unique is checked elsewhere.

use dicom_dictionary_std::tags;

use super::node::{Node, length, plain, quantity};
use super::notes::Notes;
use super::retired;
use crate::plan::{
    Beam, DoseMeaning, DoseType, Effect, FractionGroup, GroupDoseReference, NoteKind, NoteScope,
    PointDepth, PointDepthPlace, ReferencedBeam,
};
use crate::quantity::{Given, Quantity};

/// Fraction groups, by item order.
pub(super) fn read_fraction_groups(
    root: &Node<'_, '_>,
    beams: &[Beam],
    notes: &mut Notes,
) -> Vec<FractionGroup> {
    root.items(tags::FRACTION_GROUP_SEQUENCE, Effect::BlocksPlan, notes)
        .enumerate()
        .map(|(index, item)| {
            let item = item.about(NoteScope::FractionGroup(index));
            read_group(&item, beams, notes)
        })
        .collect()
}

fn read_group(item: &Node<'_, '_>, beams: &[Beam], notes: &mut Notes) -> FractionGroup {
    let group = FractionGroup {
        number: item.integer(tags::FRACTION_GROUP_NUMBER, Effect::BlocksScope, notes),
        description: item.text(tags::FRACTION_GROUP_DESCRIPTION, Effect::None, notes),
        fractions_planned: read_fractions(item, notes),
        beams: item
            .items(tags::REFERENCED_BEAM_SEQUENCE, Effect::BlocksScope, notes)
            .map(|reference| read_referenced_beam(&reference, beams, notes))
            .collect(),
        brachy_setups: item.integer(
            tags::NUMBER_OF_BRACHY_APPLICATION_SETUPS,
            Effect::None,
            notes,
        ),
        dose_references: item
            .items(
                tags::REFERENCED_DOSE_REFERENCE_SEQUENCE,
                Effect::None,
                notes,
            )
            .map(|reference| GroupDoseReference {
                number: reference.integer(
                    tags::REFERENCED_DOSE_REFERENCE_NUMBER,
                    Effect::None,
                    notes,
                ),
                target_prescription_dose_gy: reference.number(
                    tags::TARGET_PRESCRIPTION_DOSE,
                    quantity(Quantity::PrescribedDose, Effect::None),
                    notes,
                ),
            })
            .collect(),
    };
    item.check_count(
        tags::NUMBER_OF_BEAMS,
        group.beams.len(),
        Effect::None,
        notes,
    );
    group
}

fn read_fractions(item: &Node<'_, '_>, notes: &mut Notes) -> Given<i32> {
    let tag = tags::NUMBER_OF_FRACTIONS_PLANNED;
    let fractions = item.integer(tag, Effect::None, notes);
    match fractions
        .value()
        .and_then(|&number| Quantity::Fractions.objection(f64::from(number)))
    {
        Some(objection) => {
            item.note(
                notes,
                tag,
                NoteKind::IncredibleValue,
                Effect::None,
                objection,
            );
            Given::Absent
        }
        None => fractions,
    }
}

fn read_referenced_beam(item: &Node<'_, '_>, beams: &[Beam], notes: &mut Notes) -> ReferencedBeam {
    let beam_number = item.integer(tags::REFERENCED_BEAM_NUMBER, Effect::BlocksScope, notes);
    if beam_number.is_absent() {
        item.note(
            notes,
            tags::REFERENCED_BEAM_NUMBER,
            NoteKind::MissingValue,
            Effect::BlocksScope,
            "a referenced beam has no number, so it cannot be told which beam it is",
        );
    }
    // Notes on what the reference says belong to the beam, where there is just one of that number.
    let mut same = beams
        .iter()
        .enumerate()
        .filter(|(_, beam)| !beam_number.is_absent() && beam.number == beam_number);
    let item = &match (same.next(), same.next()) {
        (Some((index, _)), None) => item.about(NoteScope::Beam(index)),
        _ => *item,
    };
    ReferencedBeam {
        beam_number,
        meterset_mu: item.number(
            tags::BEAM_METERSET,
            quantity(Quantity::BeamMeterset, Effect::BlocksScope),
            notes,
        ),
        beam_dose_gy: item.number(
            tags::BEAM_DOSE,
            quantity(Quantity::BeamDose, Effect::BlocksScope),
            notes,
        ),
        dose_meaning: read_term(item, tags::BEAM_DOSE_MEANING, notes, |term| match term {
            "BEAM_LEVEL" => Some(DoseMeaning::BeamLevel),
            "FRACTION_LEVEL" => Some(DoseMeaning::FractionLevel),
            _ => None,
        }),
        dose_type: read_term(item, tags::BEAM_DOSE_TYPE, notes, |term| match term {
            "PHYSICAL" => Some(DoseType::Physical),
            "EFFECTIVE" => Some(DoseType::Effective),
            _ => None,
        }),
        specification_point: item
            .point_reading(
                retired::BEAM_DOSE_SPECIFICATION_POINT,
                Effect::BlocksScope,
                notes,
            )
            .given(),
        dose_reference_uid: item.text(
            tags::REFERENCED_DOSE_REFERENCE_UID,
            Effect::BlocksScope,
            notes,
        ),
        point_depths: read_point_depths(item, notes),
    }
}

/// A code string of which only some terms are known. An unknown one is noted
/// and blocks, because it may change what the dose means.
fn read_term<T>(
    item: &Node<'_, '_>,
    tag: dicom_core::Tag,
    notes: &mut Notes,
    known: impl Fn(&str) -> Option<T>,
) -> Given<T> {
    let Some(term) = item.text(tag, Effect::BlocksScope, notes).get() else {
        return Given::Absent;
    };
    if let Some(value) = known(&term) {
        return Given::stated(value);
    }
    item.note_values(
        notes,
        tag,
        NoteKind::Unsupported,
        Effect::BlocksScope,
        format!("'{term}' is a term this program does not know"),
        (Some(term.clone()), None),
    );
    Given::Absent
}

fn read_point_depths(item: &Node<'_, '_>, notes: &mut Notes) -> Vec<PointDepth> {
    let mut all = Vec::new();
    all.extend(read_depth_set(item, PointDepthPlace::ReferencedBeam, notes));
    all.extend(read_average_set(item, notes));
    let sequence = tags::BEAM_DOSE_VERIFICATION_CONTROL_POINT_SEQUENCE;
    for (index, verification) in item.items(sequence, Effect::BlocksScope, notes).enumerate() {
        let place = PointDepthPlace::VerificationControlPoint(index);
        if let Some(mut set) = read_depth_set(&verification, place, notes) {
            set.cumulative_weight = verification.number(
                tags::CUMULATIVE_METERSET_WEIGHT,
                plain(Effect::BlocksScope),
                notes,
            );
            all.push(set);
        }
    }
    all
}

/// The depth attributes that stand in one item; `None` when none does.
pub(super) fn read_depth_set(
    item: &Node<'_, '_>,
    place: PointDepthPlace,
    notes: &mut Notes,
) -> Option<PointDepth> {
    let set = PointDepth {
        place,
        cumulative_weight: Given::Absent,
        depth_cm: item.number(tags::BEAM_DOSE_POINT_DEPTH, DEPTH, notes),
        equivalent_depth_cm: item.number(tags::BEAM_DOSE_POINT_EQUIVALENT_DEPTH, DEPTH, notes),
        ssd_cm: item.number(tags::BEAM_DOSE_POINT_SSD, SSD, notes),
        source_to_external_contour_cm: item.number(
            tags::BEAM_DOSE_POINT_SOURCE_TO_EXTERNAL_CONTOUR_DISTANCE,
            CONTOUR,
            notes,
        ),
        averaged: read_term(
            item,
            tags::DEPTH_VALUE_AVERAGING_FLAG,
            notes,
            |term| match term {
                "YES" => Some(true),
                "NO" => Some(false),
                _ => None,
            },
        ),
    };
    has_values(&set).then_some(set)
}

const DEPTH: super::node::Wanted = length(Quantity::Depth, Effect::BlocksScope);
const SSD: super::node::Wanted = length(Quantity::SourceSurfaceDistance, Effect::BlocksScope);
const CONTOUR: super::node::Wanted = length(Quantity::SourceSurfaceDistance, Effect::None);

/// The averages over the beam that stand at the referenced beam: retired, and still sent.
fn read_average_set(item: &Node<'_, '_>, notes: &mut Notes) -> Option<PointDepth> {
    let set = PointDepth {
        place: PointDepthPlace::RetiredAverage,
        cumulative_weight: Given::Absent,
        depth_cm: item.number(retired::AVERAGE_BEAM_DOSE_POINT_DEPTH, DEPTH, notes),
        equivalent_depth_cm: item.number(
            retired::AVERAGE_BEAM_DOSE_POINT_EQUIVALENT_DEPTH,
            DEPTH,
            notes,
        ),
        ssd_cm: item.number(retired::AVERAGE_BEAM_DOSE_POINT_SSD, SSD, notes),
        source_to_external_contour_cm: item.number(
            tags::AVERAGE_BEAM_DOSE_POINT_SOURCE_TO_EXTERNAL_CONTOUR_DISTANCE,
            CONTOUR,
            notes,
        ),
        averaged: Given::derived(true, "the attributes are averages by definition"),
    };
    has_values(&set).then_some(set)
}

fn has_values(set: &PointDepth) -> bool {
    [
        &set.depth_cm,
        &set.equivalent_depth_cm,
        &set.ssd_cm,
        &set.source_to_external_contour_cm,
    ]
    .into_iter()
    .any(|value| !value.is_absent())
}
