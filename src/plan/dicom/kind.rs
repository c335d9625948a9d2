//! What kind of file this is: SOP class first, then content where the class
//! does not say enough. Reads no further than it must; never fails.

use dicom_dictionary_std::{tags, uids};
use serde::Serialize;

use super::file_kind::FileKind;
use super::source::{Envelope, IDENTIFY_BYTES, InflateLimit, open_data_set, open_envelope};
use super::text::Charset;
use super::tree::{Element, Value};
use super::walk::Walk;

/// What a file turned out to be.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Identified {
    /// Its kind.
    pub kind: FileKind,
    /// SOP Class UID, as far as it could be read.
    pub sop_class_uid: Option<String>,
    /// SOP Instance UID, as far as it could be read.
    pub sop_instance_uid: Option<String>,
    /// Why it is not supported, or what is wrong with it, when there is something to say.
    pub message: Option<String>,
    /// Whether the file is damaged before it says what it is, so that it may be a plan.
    pub may_be_plan: bool,
}

/// Plan classes of vendors that are RT Plans in all but their UID. A class
/// belongs here only when its content was seen to follow the RT Plan IOD.
const PRIVATE_PLAN_CLASSES: &[&str] = &[];

/// The kind that a SOP Class UID alone gives, and why it is not supported.
pub(super) fn kind_of_class(uid: &str) -> (FileKind, Option<&'static str>) {
    const SECOND_GENERATION: &str =
        "second-generation radiotherapy object: not supported; export the plan as RT Plan";
    match uid {
        uids::RT_PLAN_STORAGE => (FileKind::Plan, None),
        uids::RT_ION_PLAN_STORAGE => (
            FileKind::IonPlan,
            Some("RT Ion Plan: not supported, only photon and electron beams of an RT Plan are"),
        ),
        uids::RT_STRUCTURE_SET_STORAGE => (FileKind::StructureSet, None),
        uids::CT_IMAGE_STORAGE => (FileKind::Ct, None),
        uids::RT_DOSE_STORAGE => (FileKind::Dose, None),
        uids::RT_BEAMS_TREATMENT_RECORD_STORAGE
        | uids::RT_BRACHY_TREATMENT_RECORD_STORAGE
        | uids::RT_TREATMENT_SUMMARY_RECORD_STORAGE
        | uids::RT_ION_BEAMS_TREATMENT_RECORD_STORAGE => (FileKind::Record, None),
        uids::RT_RADIATION_RECORD_SET_STORAGE
        | uids::RT_RADIATION_SALVAGE_RECORD_STORAGE
        | uids::TOMOTHERAPEUTIC_RADIATION_RECORD_STORAGE
        | uids::C_ARM_PHOTON_ELECTRON_RADIATION_RECORD_STORAGE
        | uids::ROBOTIC_RADIATION_RECORD_STORAGE => (FileKind::Record, Some(SECOND_GENERATION)),
        uids::RT_PHYSICIAN_INTENT_STORAGE
        | uids::RT_SEGMENT_ANNOTATION_STORAGE
        | uids::RT_RADIATION_SET_STORAGE
        | uids::C_ARM_PHOTON_ELECTRON_RADIATION_STORAGE
        | uids::TOMOTHERAPEUTIC_RADIATION_STORAGE
        | uids::ROBOTIC_ARM_RADIATION_STORAGE
        | uids::RT_RADIATION_SET_DELIVERY_INSTRUCTION_STORAGE
        | uids::RT_TREATMENT_PREPARATION_STORAGE => (FileKind::OtherDicom, Some(SECOND_GENERATION)),
        _ if PRIVATE_PLAN_CLASSES.contains(&uid) => (FileKind::Plan, None),
        _ => (FileKind::OtherDicom, None),
    }
}

/// Tells what a file is from its bytes. Never fails and never panics: a
/// damaged file is what the readable part of it says, with a message.
#[must_use]
pub fn identify(bytes: &[u8]) -> Identified {
    let envelope = open_envelope(bytes);
    let mut seen = Seen::default();
    let message = look(bytes, &envelope, &mut seen).err();
    let sop_class_uid = seen.sop_class_uid.or(envelope.sop_class_uid);
    let sop_instance_uid = seen.sop_instance_uid.or(envelope.sop_instance_uid);
    let (kind, reason) = match sop_class_uid.as_deref() {
        Some(uid) => kind_of_class(uid),
        None if seen.beams => (FileKind::Plan, None),
        None if seen.ion_beams => (
            FileKind::IonPlan,
            Some("RT Ion Plan without SOP class: not supported"),
        ),
        None if envelope.marked || seen.elements > 3 => (
            FileKind::OtherDicom,
            Some("the data set has no SOP Class UID (0008,0016)"),
        ),
        None => (FileKind::NotDicom, None),
    };
    let (kind, reason) = match kind {
        FileKind::Plan if seen.brachy && !seen.beams => (
            FileKind::BrachyPlan,
            Some("brachytherapy plan without external beams: not applicable"),
        ),
        other => (other, reason),
    };
    let may_be_plan = kind == FileKind::OtherDicom && sop_class_uid.is_none() && message.is_some();
    let message = match kind {
        FileKind::NotDicom => packed(bytes).map(str::to_owned),
        _ => message.or_else(|| reason.map(str::to_owned)),
    };
    Identified {
        kind,
        sop_class_uid,
        sop_instance_uid,
        message,
        may_be_plan,
    }
}

/// What may hide a plan from a look at the first bytes, in words.
fn packed(bytes: &[u8]) -> Option<&'static str> {
    const ARCHIVE: &str =
        "a compressed file or archive: what it holds was not looked at, unpack it";
    match bytes {
        [] => Some("the file is empty"),
        [0x1F, 0x8B, ..] | [b'P', b'K', 3, 4, ..] | [b'7', b'z', 0xBC, 0xAF, ..] => Some(ARCHIVE),
        [b'B', b'Z', b'h', ..] | [0xFD, b'7', b'z', b'X', b'Z', ..] => Some(ARCHIVE),
        [0x28, 0xB5, 0x2F, 0xFD, ..] => Some(ARCHIVE),
        _ => None,
    }
}

/// What has been seen of a data set so far.
#[derive(Debug, Default)]
struct Seen {
    sop_class_uid: Option<String>,
    sop_instance_uid: Option<String>,
    elements: usize,
    beams: bool,
    ion_beams: bool,
    brachy: bool,
}

/// Steps through the outermost elements until the kind is known.
fn look(bytes: &[u8], envelope: &Envelope, seen: &mut Seen) -> Result<(), String> {
    let source = open_data_set(bytes, envelope, InflateLimit::Stop(IDENTIFY_BYTES))
        .map_err(|error| error.to_string())?;
    let mut walk = Walk::new(&source.bytes, source.start);
    while let Some(header) = walk
        .peek(source.syntax)
        .map_err(|error| error.to_string())?
    {
        let not_empty = header.length != 0;
        match header.tag {
            tags::BEAM_SEQUENCE if not_empty => {
                seen.beams = true;
                return Ok(());
            }
            tags::ION_BEAM_SEQUENCE if not_empty => {
                seen.ion_beams = true;
                return Ok(());
            }
            tags::APPLICATION_SETUP_SEQUENCE if not_empty => seen.brachy = true,
            tags::PIXEL_DATA => return Ok(()),
            // Past both identifiers, and no plan: the rest tells nothing more.
            tag if tag > tags::SOP_INSTANCE_UID
                && let Some(uid) = seen.sop_class_uid.as_deref()
                && kind_of_class(uid).0 != FileKind::Plan =>
            {
                return Ok(());
            }
            _ => {}
        }
        let element = walk
            .step(source.syntax)
            .map_err(|error| error.to_string())?;
        seen.elements += 1;
        match element {
            Some(element) if element.tag == tags::SOP_CLASS_UID => {
                seen.sop_class_uid = seen.sop_class_uid.take().or_else(|| uid_of(&element));
            }
            Some(element) if element.tag == tags::SOP_INSTANCE_UID => {
                seen.sop_instance_uid = seen.sop_instance_uid.take().or_else(|| uid_of(&element));
            }
            _ => {}
        }
    }
    Ok(())
}

fn uid_of(element: &Element<'_>) -> Option<String> {
    let Value::Bytes(bytes) = element.value else {
        return None;
    };
    let text = Charset::undeclared().decode(element.vr, bytes);
    (!text.is_empty()).then_some(text)
}
