//! The one reader of DICOM: bytes in, a `Plan` or the reason for none out.
//! This folder is the only place that knows tags, and no DICOM type leaves it.
//! A bounded walk frames the bytes first; then the parts of a plan are read
//! from its tree, each value with its standing. Nothing here calculates.

mod aperture;
mod beam;
mod complete;
mod control_point;
mod device;
mod error;
mod escape;
mod file_kind;
mod fraction;
mod framing;
mod identity;
mod inherit;
mod kind;
mod limits;
mod modifier;
mod name;
mod node;
mod notes;
mod number;
mod reference;
mod retired;
mod source;
mod text;
mod tree;
mod walk;
mod wedge_position;

pub use error::ReadError;
pub use file_kind::FileKind;
pub use kind::{Identified, identify};

use dicom_dictionary_std::tags;

use self::node::Node;
use self::notes::Notes;
use self::source::{Envelope, InflateLimit, MAX_PLAN_BYTES, open_data_set, open_envelope};
use self::text::Charset;
use self::tree::{DataSet, Value};
use self::walk::{Irregularity, Walk};
use super::{Effect, NoteKind, NoteScope, Plan, ReadingNote};

/// Reads an RT Plan from the bytes of a file.
///
/// # Errors
///
/// When the file is no RT Plan, is damaged or truncated anywhere, or exceeds
/// what any plan has. A plan is read whole or not at all; what is wrong with a
/// single value stands in `Plan::notes` instead.
pub fn read_plan(bytes: &[u8]) -> Result<Plan, ReadError> {
    if bytes.len() > MAX_PLAN_BYTES {
        return Err(ReadError::TooLarge {
            size_bytes: bytes.len(),
            limit_bytes: MAX_PLAN_BYTES,
        });
    }
    let envelope = open_envelope(bytes);
    let source = open_data_set(bytes, &envelope, InflateLimit::Refuse(MAX_PLAN_BYTES))?;
    let mut walk = Walk::new(&source.bytes, source.start);
    let set = walk.whole(source.syntax)?;
    let charset = charset_of(&set);
    let root = Node::root(&set, &charset);
    let mut notes = Notes::default();
    let identity = identity::read_identity(&root, &mut notes);
    check_kind(&set, &envelope, identity.sop_class_uid.value())?;
    limits::check_limits(&set)?;

    let beams = beam::read_beams(&root, &mut notes);
    let fraction_groups = fraction::read_fraction_groups(&root, &beams, &mut notes);
    limits::check_references(&fraction_groups, &beams)?;
    let mut plan = Plan {
        identity,
        patient_setups: identity::read_patient_setups(&root, &mut notes),
        tolerance_tables: identity::read_tolerance_tables(&root, &mut notes),
        dose_references: identity::read_dose_references(&root, &mut notes),
        fraction_groups,
        beams,
        notes: Vec::new(),
    };
    reference::check_references(&plan, &mut notes);
    note_file(&set, &envelope, source.remark, &mut notes);
    note_irregularities(walk.irregularities, &mut notes);
    plan.notes = notes.finish();
    Ok(plan)
}

fn charset_of(set: &DataSet<'_>) -> Charset {
    match set
        .first(tags::SPECIFIC_CHARACTER_SET)
        .map(|element| &element.value)
    {
        Some(Value::Bytes(value)) => Charset::from_value(value),
        _ => Charset::undeclared(),
    }
}

/// Whether the data set is an RT Plan with external beams, by class, then by content.
fn check_kind(
    set: &DataSet<'_>,
    envelope: &Envelope,
    stated_class: Option<&String>,
) -> Result<(), ReadError> {
    let beams = set.item_count(tags::BEAM_SEQUENCE);
    let class = stated_class.or(envelope.sop_class_uid.as_ref());
    let kind = match class {
        Some(uid) => kind::kind_of_class(uid).0,
        None if beams > 0 => FileKind::Plan,
        None if set.item_count(tags::ION_BEAM_SEQUENCE) > 0 => FileKind::IonPlan,
        None => FileKind::OtherDicom,
    };
    if kind != FileKind::Plan {
        return Err(ReadError::NotAPlan {
            kind,
            sop_class_uid: class.map_or("not stated", String::as_str).to_owned(),
        });
    }
    match (beams, set.item_count(tags::APPLICATION_SETUP_SEQUENCE)) {
        (0, 0) => Err(ReadError::NoBeams),
        (0, _) => Err(ReadError::BrachyOnly),
        _ => Ok(()),
    }
}

/// Notes on the file as a whole.
fn note_file(
    set: &DataSet<'_>,
    envelope: &Envelope,
    syntax_remark: Option<String>,
    notes: &mut Notes,
) {
    let mut add = |kind, tag, message: String| {
        notes.add(ReadingNote {
            scope: NoteScope::Plan,
            kind,
            effect: Effect::None,
            place: name::named(tag),
            message,
            measured: None,
            limit: None,
        });
    };
    if let Some(remark) = syntax_remark {
        add(NoteKind::Remark, tags::TRANSFER_SYNTAX_UID, remark);
    }
    if !envelope.marked {
        let message = "the file has no DICM marker and no file meta group";
        add(
            NoteKind::Remark,
            tags::TRANSFER_SYNTAX_UID,
            message.to_owned(),
        );
    }
    if set.first(tags::SOP_CLASS_UID).is_none() {
        let message = "no SOP class is stated in the data set";
        add(
            NoteKind::MissingValue,
            tags::SOP_CLASS_UID,
            message.to_owned(),
        );
    }
    if set.item_count(tags::APPLICATION_SETUP_SEQUENCE) > 0 {
        let message = "the plan also has brachytherapy application setups; they are not read";
        let tag = tags::APPLICATION_SETUP_SEQUENCE;
        add(NoteKind::Unsupported, tag, message.to_owned());
    }
}

/// Repeated attributes that nothing above had to read, and elements out of order.
fn note_irregularities(irregularities: Vec<Irregularity>, notes: &mut Notes) {
    let mut out_of_order: Option<(String, usize)> = None;
    for irregularity in irregularities {
        match irregularity {
            Irregularity::Repeated { place } if !notes.speak_of(&place) => {
                notes.add(ReadingNote {
                    scope: NoteScope::Plan,
                    kind: NoteKind::RepeatedAttribute,
                    effect: Effect::None,
                    place,
                    message: "the attribute stands more than once; it is not used".to_owned(),
                    measured: None,
                    limit: None,
                });
            }
            Irregularity::Repeated { .. } => {}
            Irregularity::OutOfOrder { place } => {
                out_of_order = Some(match out_of_order {
                    Some((first, count)) => (first, count + 1),
                    None => (place, 1),
                });
            }
        }
    }
    if let Some((place, count)) = out_of_order {
        notes.add(ReadingNote {
            scope: NoteScope::Plan,
            kind: NoteKind::Remark,
            effect: Effect::None,
            place,
            message: format!("{count} elements stand out of order, this one first"),
            measured: Some(count.to_string()),
            limit: None,
        });
    }
}
