//! One crafted file for each known hazard of reading DICOM: each gets its own
//! error or reads right, quickly and without growing.

use std::io::Write as _;

use counterfoil::plan::{FileKind, NoteKind, ReadError, identify, read_plan};
use counterfoil::quantity::Given;
use dicom_core::VR;
use dicom_dictionary_std::tags;

use super::plans::{block, everything};
use super::raw::{
    UNDEFINED, implicit, item, item_end, long, plan_then, plan_with, sequence_end, short,
};
use crate::builder::{BlockSpec, DepthSpec, Encoding, PlanSpec, data_set_offset};

/// 2,000 nested sequences would overflow the stack of a reader without a bound.
#[test]
fn verify_deep_nesting_is_refused() {
    let mut tail = Vec::new();
    for _ in 0..2_000 {
        tail.extend(long(0x300C, 0x0060, "SQ", UNDEFINED, &[]));
        tail.extend(item(UNDEFINED));
    }
    for _ in 0..2_000 {
        tail.extend(item_end());
        tail.extend(sequence_end());
    }
    let bytes = plan_then(&tail);
    let error = read_plan(&bytes).expect_err("too deep");
    assert!(matches!(error, ReadError::TooDeep { .. }), "{error}");
    assert_eq!(identify(&bytes).kind, FileKind::Plan);
}

/// A length of 4 GB must not be believed before the bytes are seen to be there.
#[test]
fn verify_huge_lengths_are_refused() {
    for vr in ["OB", "UN", "SQ", "UT"] {
        for group in [0x300C, 0x300D] {
            let bytes = plan_then(&long(group, 0x1060, vr, 0xFFFF_FFF0, b"abcd"));
            let error = read_plan(&bytes).expect_err("not there");
            assert!(matches!(error, ReadError::Truncated { .. }), "{error}");
        }
    }
    // Inside a sequence of definite length the parent is the limit.
    let mut inner = item(20);
    inner.extend(long(0x0008, 0x1155, "UT", 0xFFFF_FFF0, &[b' '; 8]));
    let tail = long(0x300C, 0x0060, "SQ", 28, &inner);
    let more = [tail, short(0x300E, 0x0008, "PN", b"X ")].concat();
    let error = read_plan(&plan_then(&more)).expect_err("beyond its item");
    assert!(
        matches!(error, ReadError::LengthBeyondParent { .. }),
        "{error}"
    );
}

/// A private element of unknown representation and undefined length holds
/// implicit little endian items, whatever the file is written in (PS3.5, 6.2.2 note 2).
#[test]
fn verify_private_unknown_sequence_is_passed_over() {
    let mut private = long(0x3009, 0x1001, "UN", UNDEFINED, &[]);
    private.extend(item(UNDEFINED));
    private.extend(implicit(0x3009, 0x1002, 4, b"AB\\C"));
    private.extend(implicit(0x3009, 0x1003, UNDEFINED, &[]));
    private.extend(item(10));
    private.extend(implicit(0x3009, 0x1004, 2, b"\xFF\xFE"));
    private.extend(sequence_end());
    private.extend(item_end());
    private.extend(sequence_end());
    let plan = read_plan(&plan_with(0x300A, 0x0002, &private)).expect("readable");
    assert_eq!(plan, super::read(&PlanSpec::default()));
}

/// Private values are not looked into: a sequence of definite length may hold anything.
#[test]
fn verify_private_values_are_not_read() {
    let junk = long(0x3009, 0x1001, "SQ", 6, b"\x01\x02\x03\x04\x05\x06");
    let plan = read_plan(&plan_with(0x300A, 0x0002, &junk)).expect("readable");
    assert_eq!(plan.notes, []);
}

/// A known sequence sent as UN reads as what it is.
#[test]
fn verify_known_sequence_sent_as_unknown() {
    let uid = implicit(0x0008, 0x1155, 6, b"2.25.9");
    let mut value = item(14);
    value.extend(&uid);
    let sequence = long(0x300C, 0x0080, "UN", 22, &value);
    let plan = read_plan(&plan_then(&sequence)).expect("readable");
    assert_eq!(plan.identity.referenced_dose_uids, ["2.25.9"]);
}

#[test]
fn verify_binary_length_must_be_a_multiple() {
    for (vr, length) in [("FL", 3), ("FD", 12), ("US", 1), ("UL", 6)] {
        let value = vec![0; length];
        let bytes = plan_then(&short(0x300E, 0x0100, vr, &value));
        let error = read_plan(&bytes).expect_err("no multiple");
        assert!(matches!(error, ReadError::OddLength { .. }), "{error}");
    }
}

#[test]
fn verify_unknown_representation_is_refused() {
    let bytes = plan_then(&short(0x300E, 0x0100, "ZZ", b"ab"));
    let error = read_plan(&bytes).expect_err("unknown");
    assert!(matches!(error, ReadError::UnknownVr { .. }), "{error}");
    assert!(error.to_string().contains("ZZ"), "{error}");
}

/// A plan that is cut anywhere is never read as a smaller one.
#[test]
fn property_truncation_never_gives_a_smaller_plan() {
    for encoding in Encoding::ALL {
        let whole = everything().encoded(encoding);
        let plan = read_plan(&whole).expect("readable");
        for length in 0..whole.len() {
            let cut = &whole[..length];
            let kind = identify(cut).kind;
            match read_plan(cut) {
                Err(_) => {}
                // A cut between outermost elements behind the beams cannot be seen as such; what
                // is lost there (patient setups) then stops every beam that refers to it.
                Ok(part) => {
                    assert_eq!(part.beams, plan.beams, "{encoding:?} {length}");
                    assert!(super::blocked(&part) || part.patient_setups == plan.patient_setups);
                    assert_eq!(kind, FileKind::Plan);
                }
            }
        }
    }
}

#[test]
fn verify_trailing_bytes_are_refused() {
    for tail in [
        &b"\0\0\0\0\0\0\0\0\0\0"[..],
        b"\r\n",
        b"<html>not found</html>",
        &[0xFF; 64],
    ] {
        let bytes = plan_then(tail);
        assert!(read_plan(&bytes).is_err(), "{}", tail.escape_ascii());
        let mut implicit = PlanSpec::default().encoded(Encoding::ImplicitLittle);
        implicit.extend(tail);
        assert!(read_plan(&implicit).is_err(), "{}", tail.escape_ascii());
    }
    // Data Set Trailing Padding is the standard's own (PS3.10, 7.2).
    let padding = long(0xFFFC, 0xFFFC, "OB", 8, &[0; 8]);
    assert!(read_plan(&plan_then(&padding)).is_ok());
}

/// Without a marker the first elements decide; a marker with a wrong transfer syntax too.
#[test]
fn verify_missing_marker_and_wrong_syntax() {
    for encoding in [Encoding::BareExplicit, Encoding::BareImplicit] {
        let plan = read_plan(&PlanSpec::default().encoded(encoding)).expect("readable");
        assert!(plan.notes.iter().any(|note| note.message.contains("DICM")));
    }
    let implicit = PlanSpec::default().encoded(Encoding::ImplicitLittle);
    let mut lying = PlanSpec::default().bytes();
    lying.truncate(data_set_offset(&lying));
    lying.extend(&implicit[data_set_offset(&implicit)..]);
    let plan = read_plan(&lying).expect("readable");
    assert_eq!(plan.beams, super::read(&PlanSpec::default()).beams);
    assert!(
        plan.notes
            .iter()
            .any(|note| note.kind == NoteKind::Remark && note.message.contains("is declared"))
    );
    // A wrong group length of the meta group changes nothing.
    let mut wrong = PlanSpec::default().bytes();
    wrong[140] ^= 0x55;
    assert_eq!(
        read_plan(&wrong).expect("readable"),
        super::read(&PlanSpec::default())
    );
}

#[test]
fn verify_strings_that_only_some_parsers_take() {
    let path = [(tags::BEAM_SEQUENCE, 0)];
    let tag = tags::SOURCE_AXIS_DISTANCE;
    for text in ["NaN", "inf", "1000,0", "1e999", "1000mm", "0x3E8"] {
        let bytes = PlanSpec::default().with_text(&path, tag, VR::DS, text);
        let plan = read_plan(&bytes).expect("readable");
        assert_eq!(plan.beams[0].sad_cm, Given::Absent, "{text}");
        assert!(super::blocked(&plan), "{text}");
    }
    for (text, sad_cm) in [("1.0E3", 100.0), ("1000.00000000000000000", 100.0)] {
        let bytes = PlanSpec::default().with_text(&path, tag, VR::DS, text);
        let plan = read_plan(&bytes).expect("readable");
        assert_eq!(plan.beams[0].sad_cm, Given::stated(sad_cm), "{text}");
        assert_eq!(plan.notes, []);
    }
    let bytes = PlanSpec::default().with_text(&path, tag, VR::DS, "");
    let plan = read_plan(&bytes).expect("readable");
    assert_eq!(plan.beams[0].sad_cm, Given::Absent);
    assert!(
        plan.notes
            .iter()
            .all(|note| note.kind == NoteKind::MissingValue)
    );
}

/// APPROVED behind UNAPPROVED: the last one must not win, nor the first silently.
#[test]
fn verify_repeated_approval_is_seen() {
    let spec = PlanSpec {
        approval: Some("UNAPPROVED".to_owned()),
        ..PlanSpec::default()
    };
    let mut bytes = spec.bytes();
    bytes.extend(short(0x300E, 0x0002, "CS", b"APPROVED"));
    let plan = read_plan(&bytes).expect("readable");
    assert_eq!(plan.identity.approval.status, Given::Absent);
    let notes = super::effects(
        &plan,
        NoteKind::RepeatedAttribute,
        "ApprovalStatus (300E,0002)",
    );
    assert_eq!(notes.len(), 1);
}

#[test]
fn verify_text_of_any_character_set_is_read() {
    for (set, name, shown) in [
        ("ISO_IR 192", &b"M\xC3\xBCller^X"[..], "M\u{fc}ller^X"),
        ("ISO_IR 100", b"M\xFCller^Y ", "M\u{fc}ller^Y"),
        ("ISO_IR 999", b"M\xFCller^Z ", "M\u{fc}ller^Z"),
        (
            "ISO 2022 IR 6\\ISO 2022 IR 87",
            b"A^\x1B$B;3\x1B(B\xFF ",
            "",
        ),
        ("ISO_IR 192", b"\xFF\xFE\xFD\x00\x1B ", ""),
    ] {
        let spec = PlanSpec {
            character_set: set.to_owned(),
            ..PlanSpec::default()
        };
        let mut bytes = spec.bytes();
        let old = short(0x0010, 0x0010, "PN", b"Invented^Patient");
        let at = bytes
            .windows(old.len())
            .position(|window| window == old)
            .expect("the name");
        bytes.splice(at..at + old.len(), short(0x0010, 0x0010, "PN", name));
        let plan = read_plan(&bytes).expect("readable");
        let read = plan.identity.patient_name.get().unwrap_or_default();
        assert!(!read.contains(char::is_control), "{read:?}");
        if !shown.is_empty() {
            assert_eq!(read, shown);
        }
    }
}

/// 100 MB of zeros deflate to 100 kB.
#[test]
fn verify_deflate_bomb_is_refused() {
    let deflated = PlanSpec::default().encoded(Encoding::Deflated);
    let offset = data_set_offset(&deflated);
    let mut content = PlanSpec::default().bytes();
    content.drain(..data_set_offset(&content));
    content.extend(long(0x300E, 0x1000, "UT", 100 << 20, &[]));
    content.resize(content.len() + (100 << 20), b' ');
    let mut encoder = flate2::write::DeflateEncoder::new(Vec::new(), flate2::Compression::fast());
    encoder.write_all(&content).expect("deflated");
    let bomb = [&deflated[..offset], &encoder.finish().expect("deflated")].concat();
    assert!(bomb.len() < 2 << 20);
    let error = read_plan(&bomb).expect_err("too large");
    assert!(
        matches!(error, ReadError::InflatesTooLarge { .. }),
        "{error}"
    );
    assert_eq!(identify(&bomb).kind, FileKind::Plan);
}

#[test]
fn verify_counts_beyond_any_plan_are_refused() {
    let many = |count: usize| -> Vec<u8> {
        let items: Vec<u8> = (0..count).flat_map(|_| item(0)).collect();
        let length = u32::try_from(items.len()).expect("short enough");
        long(0x300C, 0x0080, "SQ", length, &items)
    };
    assert!(read_plan(&plan_then(&many(10_000))).is_ok());
    let error = read_plan(&plan_then(&many(10_001))).expect_err("too many");
    assert!(matches!(error, ReadError::TooMany { .. }), "{error}");
    let elements: Vec<u8> = (0..250_001)
        .flat_map(|_| short(0x300E, 0x0100, "LO", &[]))
        .collect();
    let error = read_plan(&plan_then(&elements)).expect_err("too many");
    assert!(matches!(error, ReadError::TooMany { .. }), "{error}");
    let error = read_plan(&vec![0; (32 << 20) + 1]).expect_err("too large");
    assert!(matches!(error, ReadError::TooLarge { .. }), "{error}");
}

/// What references times beams that bear the same number would come to: rows,
/// control points (30 x 40 x 100), point depths (2 x 40 x 2,000), coordinates of outlines (300 x 20,000).
#[test]
fn verify_references_that_multiply_beams_are_refused() {
    let plan = |spec: PlanSpec, references: usize, beams: usize| {
        let mut spec = spec;
        spec.beams = vec![spec.beams[0].clone(); beams];
        spec.groups[0].beams = vec![spec.groups[0].beams[0].clone(); references];
        read_plan(&spec.bytes())
    };
    let arc = |points| PlanSpec::default().map_beam(|beam| beam.with_arc(90.0, "CW", points));
    let mut depths = PlanSpec::default();
    let depth = DepthSpec {
        depth_cm: Some(10.0),
        ..DepthSpec::default()
    };
    depths.groups[0].beams[0].verification = vec![depth; 2_000];
    let mut outline = PlanSpec::default();
    outline.beams[0].blocks = vec![BlockSpec {
        outline_cm: vec![[1.0, 2.0]; 10_000],
        ..block()
    }];

    assert!(plan(arc(2), 40, 40).is_ok());
    assert!(plan(depths.clone(), 1, 40).is_ok());
    assert!(plan(outline.clone(), 200, 1).is_ok());
    for (spec, references, beams) in [
        (arc(2), 60, 40),
        (arc(100), 30, 40),
        (depths, 2, 40),
        (outline, 300, 1),
    ] {
        let error = plan(spec, references, beams).expect_err("too many");
        assert!(matches!(error, ReadError::TooManyParts { .. }), "{error}");
    }
}

/// 160 outlines of 10,000 points each are 3.2 million coordinates; every one alone would be read.
#[test]
fn verify_outlines_beyond_any_plan_are_refused() {
    let plan = |beams: usize| {
        let mut spec = PlanSpec::default();
        let block = BlockSpec {
            outline_cm: vec![[1.0, 2.0]; 10_000],
            ..block()
        };
        spec.beams[0].blocks = vec![block; 40];
        spec.beams = vec![spec.beams[0].clone(); beams];
        read_plan(&spec.bytes())
    };
    assert!(plan(3).is_ok());
    let error = plan(4).expect_err("too many");
    assert!(matches!(error, ReadError::TooManyParts { .. }), "{error}");
}

/// A name of 60 kB would stand in every row of the report.
#[test]
fn verify_text_far_beyond_the_standard_counts_as_absent() {
    let read_with = |length: usize| {
        let bytes = PlanSpec::default().with_label(&"L".repeat(length)).bytes();
        read_plan(&bytes).expect("readable")
    };
    assert_eq!(
        read_with(4_000).identity.plan_label.get(),
        Some("L".repeat(4_000))
    );
    let plan = read_with(60_000);
    assert_eq!(plan.identity.plan_label, Given::Absent);
    let note = plan
        .notes
        .iter()
        .find(|note| note.place.contains("300A,0002"));
    let note = note.expect("a note");
    assert_eq!(note.kind, NoteKind::MalformedValue);
    assert!(note.message.contains("longer"), "{}", note.message);
    assert!(note.message.len() < 200);
}

/// An item may state a character set of its own: UTF-8 in a plan of Latin-1.
#[test]
fn verify_a_character_set_within_an_item_holds_for_it() {
    let mut spec = PlanSpec {
        character_set: "ISO_IR 100".to_owned(),
        ..PlanSpec::default()
    };
    spec.beams[0].description = Some("X".repeat(8));
    let beam = [(tags::BEAM_SEQUENCE, 0)];
    let mut bytes = spec.with_text(&beam, tags::SPECIFIC_CHARACTER_SET, VR::CS, "ISO_IR 192");
    let at = bytes
        .windows(8)
        .position(|window| window == b"XXXXXXXX")
        .expect("the description");
    // U+0141 L with stroke and U+017A z with acute are C5 81 and C5 BA in UTF-8 (RFC 3629).
    bytes[at..at + 8].copy_from_slice(b"\xC5\x81odz\xC5\xBA ");
    let plan = read_plan(&bytes).expect("readable");
    assert_eq!(
        plan.beams[0].description.get().as_deref(),
        Some("\u{141}odz\u{17a}")
    );
}
