//! Is there an attribute whose absence could end in "within"? Each attribute
//! of a plan that is within is taken out, one at a time; what may be missing
//! without harm is listed here by name, and nothing else may.

use counterfoil::audit::{Rivals, Verdict};
use counterfoil::settings::Site;
use dicom_core::Tag;
use dicom_core::dictionary::{DataDictionary, DataDictionaryEntry};
use dicom_core::header::Header;
use dicom_dictionary_std::StandardDataDictionary;
use dicom_object::InMemDicomObject;
use dicom_object::mem::InMemElement;

use super::{audit_bytes, reference_plan};

/// Attributes that say nothing about the dose of a jaw-limited photon beam, or
/// that the standard lets a plan leave out with a meaning of its own.
const MAY_BE_MISSING: &[&str] = &[
    // Who, what, when.
    "SpecificCharacterSet",
    "InstanceCreationDate",
    "InstanceCreationTime",
    "SOPInstanceUID",
    "StudyDate",
    "SeriesDate",
    "StudyTime",
    "SeriesTime",
    "AccessionNumber",
    "Modality",
    "Manufacturer",
    "ManufacturerModelName",
    "ReferringPhysicianName",
    "OperatorsName",
    "PatientName",
    "PatientID",
    "PatientBirthDate",
    "PatientSex",
    "SoftwareVersions",
    "StudyInstanceUID",
    "SeriesInstanceUID",
    "StudyID",
    "SeriesNumber",
    "FrameOfReferenceUID",
    "PositionReferenceIndicator",
    "RTPlanLabel",
    "RTPlanName",
    "RTPlanDate",
    "RTPlanTime",
    "PlanIntent",
    "RTPlanGeometry",
    "ApprovalStatus",
    "ReviewDate",
    "ReviewTime",
    "ReviewerName",
    "ReferencedStructureSetSequence",
    "ReferencedSOPClassUID",
    "ReferencedSOPInstanceUID",
    "InstitutionName",
    // What is prescribed: another question than what the beam gives. The beam states its own point.
    "DoseReferenceSequence",
    "DoseReferenceUID",
    "DoseReferenceStructureType",
    "DoseReferenceDescription",
    "DoseReferenceType",
    "DoseReferencePointCoordinates",
    "TargetPrescriptionDose",
    "FractionGroupNumber",
    "NumberOfFractionsPlanned",
    "ReferencedDoseReferenceUID",
    "ReferencedDoseReferenceSequence",
    "ReferencedDoseReferenceNumber",
    // The dose point also stands at the dose reference that the beam names.
    "BeamDoseSpecificationPoint",
    "DoseReferenceNumber",
    // The file meta group and the contents tell what the file is.
    "SOPClassUID",
    // The positions of the jaws name their own device type.
    "BeamLimitingDeviceSequence",
    // Counts: the items are counted.
    "NumberOfBeams",
    "NumberOfBrachyApplicationSetups",
    "NumberOfControlPoints",
    "NumberOfWedges",
    "NumberOfCompensators",
    "NumberOfBoli",
    "NumberOfBlocks",
    // Names and remarks of the beam.
    "BeamName",
    "BeamDescription",
    "BeamType",
    "SetupTechnique",
    "DoseRateSet",
    "ControlPointIndex",
    "SourceToBeamLimitingDeviceDistance",
    "NumberOfLeafJawPairs",
    // Absent has a meaning of its own in the standard (type 3): MU, treatment, a standard fluence; each is remarked.
    "PrimaryDosimeterUnit",
    "TreatmentDeliveryType",
    "PrimaryFluenceModeSequence",
    "FluenceMode",
    // The point is the isocentre: where the patient lies does not move it.
    "PatientSetupSequence",
    "PatientSetupNumber",
    "PatientPosition",
    "ReferencedPatientSetupNumber",
    // A resting gantry, collimator and couch need no direction; a level table top no eccentric.
    "GantryRotationDirection",
    "BeamLimitingDeviceRotationDirection",
    "PatientSupportRotationDirection",
    "TableTopEccentricAngle",
    "TableTopEccentricRotationDirection",
    "TableTopVerticalPosition",
    "TableTopLongitudinalPosition",
    "TableTopLateralPosition",
    "TableTopPitchAngle",
    "TableTopPitchRotationDirection",
    "TableTopRollAngle",
    "TableTopRollRotationDirection",
];

/// Paths to every attribute: sequences and item indices, then the attribute.
fn places(
    object: &InMemDicomObject,
    path: &[(Tag, usize)],
    into: &mut Vec<(Vec<(Tag, usize)>, Tag)>,
) {
    for element in object {
        let element: &InMemElement = element;
        into.push((path.to_vec(), element.tag()));
        for (index, item) in element.items().unwrap_or_default().iter().enumerate() {
            let mut deeper = path.to_vec();
            deeper.push((element.tag(), index));
            places(item, &deeper, into);
        }
    }
}

fn keyword(tag: Tag) -> &'static str {
    StandardDataDictionary
        .by_tag(tag)
        .map_or("unknown", |entry| entry.alias())
}

#[test]
fn verify_no_missing_attribute_ends_in_within() {
    let spec = reference_plan();
    let mut all = Vec::new();
    places(&spec.object(), &[], &mut all);
    assert!(all.len() > 100, "only {} attributes", all.len());
    let mut passed = Vec::new();
    let mut barred = 0;
    for (path, tag) in all {
        let bytes = spec.without(&path, tag);
        let Ok(plan) = counterfoil::plan::read_plan(&bytes) else {
            barred += 1;
            continue;
        };
        drop(plan);
        let entry = audit_bytes(&bytes, &Site::default(), &Rivals::default(), &[]);
        if entry.verdict == Verdict::Within {
            passed.push(keyword(tag));
        } else {
            barred += 1;
        }
    }
    passed.sort_unstable();
    passed.dedup();
    let unlisted: Vec<_> = passed
        .iter()
        .filter(|name| !MAY_BE_MISSING.contains(name))
        .collect();
    assert!(unlisted.is_empty(), "within without {unlisted:?}");
    assert!(barred > 15, "only {barred} absences were noticed");
}
