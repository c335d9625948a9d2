//! Names of attributes for messages: keyword and tag, and the paths made of
//! them. Item numbers in paths count from 0. Nothing here reads a value.

use std::fmt::Write as _;

use dicom_core::Tag;
use dicom_core::VR;
use dicom_core::dictionary::{DataDictionary, DataDictionaryEntry};
use dicom_dictionary_std::StandardDataDictionary;

/// The standard's value representation of an attribute, if it knows the attribute.
pub(super) fn standard_vr(tag: Tag) -> Option<VR> {
    StandardDataDictionary
        .by_tag(tag)
        .map(|entry| entry.vr().relaxed())
}

/// The keyword of an attribute, `PrivateAttribute` or `UnknownAttribute`.
pub(super) fn keyword(tag: Tag) -> &'static str {
    if tag.group() % 2 == 1 {
        return "PrivateAttribute";
    }
    match tag {
        Tag(0xFFFE, 0xE000) => "Item",
        Tag(0xFFFE, 0xE00D) => "ItemDelimitationItem",
        Tag(0xFFFE, 0xE0DD) => "SequenceDelimitationItem",
        _ => match StandardDataDictionary.by_tag(tag) {
            Some(entry) => entry.alias(),
            None => "UnknownAttribute",
        },
    }
}

/// `GantryAngle (300A,011E)`.
pub(super) fn named(tag: Tag) -> String {
    format!("{} ({:04X},{:04X})", keyword(tag), tag.0, tag.1)
}

/// Appends `BeamSequence[2].` to a path.
pub(super) fn push_step(path: &mut String, sequence: Tag, item: usize) {
    let _ = write!(path, "{}[{item}].", keyword(sequence));
}

/// `BeamSequence[2].BeamNumber (300A,00C0)`.
pub(super) fn place_of(steps: &[(Tag, usize)], tag: Tag) -> String {
    let mut path = String::new();
    for &(sequence, item) in steps {
        push_step(&mut path, sequence, item);
    }
    path.push_str(&named(tag));
    path
}
