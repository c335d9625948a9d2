//! Telling what a file is, also when it is damaged.

use counterfoil::plan::{FileKind, ReadError, identify, read_plan};
use dicom_core::{DataElement, PrimitiveValue, VR};
use dicom_dictionary_std::tags;
use dicom_object::InMemDicomObject;

use crate::builder::{Encoding, PlanSpec, encode};

fn object_of_class(class: &str) -> InMemDicomObject {
    let mut object = PlanSpec::default().object();
    object.put(DataElement::new(
        tags::SOP_CLASS_UID,
        VR::UI,
        PrimitiveValue::from(class),
    ));
    object
}

/// UIDs from PS3.6 table A-1.
#[test]
fn verify_kinds_by_sop_class() {
    let root = "1.2.840.10008.5.1.4.1.1.";
    for (class, kind, says_why) in [
        ("481.5", FileKind::Plan, false),
        ("481.8", FileKind::IonPlan, true),
        ("481.3", FileKind::StructureSet, false),
        ("2", FileKind::Ct, false),
        ("481.2", FileKind::Dose, false),
        ("481.4", FileKind::Record, false),
        ("481.1", FileKind::OtherDicom, false),
        ("481.13", FileKind::OtherDicom, true),
        ("128", FileKind::OtherDicom, false),
    ] {
        for encoding in Encoding::ALL {
            let bytes = encode(&object_of_class(&format!("{root}{class}")), encoding);
            let identified = identify(&bytes);
            assert_eq!(identified.kind, kind, "{class} {encoding:?}");
            assert_eq!(identified.message.is_some(), says_why, "{identified:?}");
            assert_eq!(
                identified.sop_instance_uid.as_deref(),
                Some("2.25.20240105.1")
            );
            let outcome = read_plan(&bytes);
            assert_eq!(outcome.is_ok(), kind == FileKind::Plan);
            if let Err(error) = outcome {
                assert!(matches!(error, ReadError::NotAPlan { .. }), "{error}");
            }
        }
    }
}

#[test]
fn verify_brachytherapy_is_not_applicable() {
    let mut spec = PlanSpec::default();
    spec.beams.clear();
    let mut object = spec.object();
    let setup = InMemDicomObject::from_element_iter([DataElement::new(
        tags::APPLICATION_SETUP_NUMBER,
        VR::IS,
        PrimitiveValue::from("1"),
    )]);
    object.put(DataElement::new(
        tags::APPLICATION_SETUP_SEQUENCE,
        VR::SQ,
        dicom_core::value::DataSetSequence::from(vec![setup]),
    ));
    let bytes = encode(&object, Encoding::ExplicitLittle);
    let identified = identify(&bytes);
    assert_eq!(identified.kind, FileKind::BrachyPlan);
    assert_eq!(identified.kind.term(), "brachy-plan");
    assert!(identified.message.is_some());
    assert_eq!(read_plan(&bytes), Err(ReadError::BrachyOnly));
}

#[test]
fn verify_a_plan_without_beams_says_so() {
    let mut spec = PlanSpec::default();
    spec.beams.clear();
    spec.groups.clear();
    assert_eq!(identify(&spec.bytes()).kind, FileKind::Plan);
    assert_eq!(read_plan(&spec.bytes()), Err(ReadError::NoBeams));
}

#[test]
fn verify_other_files_are_not_dicom() {
    for bytes in [
        &b""[..],
        b"DI",
        b"beam,dose\n1,2\n",
        b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR",
        &[0; 4096],
        &[0xFF; 4096],
    ] {
        let identified = identify(bytes);
        assert_eq!(identified.kind, FileKind::NotDicom);
        let said = bytes.is_empty().then(|| "the file is empty".to_owned());
        assert_eq!(identified.message, said);
        assert!(!identified.may_be_plan);
        assert_eq!(read_plan(bytes), Err(ReadError::NotDicom));
    }
}

#[test]
fn verify_a_damaged_plan_is_still_a_plan() {
    let bytes = PlanSpec::default().bytes();
    let cut = &bytes[..bytes.len() - 100];
    assert_eq!(identify(cut).kind, FileKind::Plan);
    let error = read_plan(cut).expect_err("truncated");
    assert!(error.to_string().contains("truncated"), "{error}");
}

/// Only the data set says what it is when the meta group is missing, and the other way round.
#[test]
fn verify_class_from_content_or_meta_group() {
    let mut object = PlanSpec::default().object();
    object.remove_element(tags::SOP_CLASS_UID);
    let bare = encode(
        &object_of_class("1.2.840.10008.5.1.4.1.1.481.5"),
        Encoding::BareExplicit,
    );
    assert_eq!(identify(&bare).kind, FileKind::Plan);
    let mut classless = encode(&PlanSpec::default().object(), Encoding::BareImplicit);
    // (0008,0016) becomes (0008,0017), an attribute that nobody reads.
    let at = classless
        .windows(4)
        .position(|window| window == [8, 0, 0x16, 0])
        .expect("SOP class");
    classless[at + 2] = 0x17;
    assert_eq!(identify(&classless).kind, FileKind::Plan, "by its beams");
    assert!(read_plan(&classless).is_ok());
}
