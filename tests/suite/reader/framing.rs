//! How elements may be framed: lengths defined and undefined at every level,
//! elements out of order, repeats, sequences of odd standing.

use counterfoil::plan::{Effect, NoteKind, ReadError, read_plan};

use super::raw::{
    UNDEFINED, implicit, item, item_end, long, plan_then, plan_with, sequence_end, short,
};
use super::{effects, read};
use crate::builder::{Encoding, PlanSpec, data_set_offset};

/// A reference to an object, as an element.
fn uid(text: &str) -> Vec<u8> {
    short(0x0008, 0x1155, "UI", text.as_bytes())
}

/// Every mixture of defined and undefined lengths of a sequence and its items.
#[test]
fn verify_defined_and_undefined_lengths() {
    let length = |bytes: &[u8]| u32::try_from(bytes.len()).expect("short enough");
    let open = [item(UNDEFINED), uid("2.25.71"), item_end()].concat();
    let closed = [item(length(&uid("2.25.72"))), uid("2.25.72")].concat();
    let both = [open, closed].concat();
    let defined = long(0x300C, 0x0080, "SQ", length(&both), &both);
    let undefined = [long(0x300C, 0x0080, "SQ", UNDEFINED, &both), sequence_end()].concat();
    for sequence in [defined, undefined] {
        let plan = read_plan(&plan_then(&sequence)).expect("readable");
        assert_eq!(plan.identity.referenced_dose_uids, ["2.25.71", "2.25.72"]);
    }
}

/// The whole plan with every sequence and item of undefined length, and with none.
#[test]
fn property_lengths_make_no_difference() {
    let whole = super::plans::everything().encoded(Encoding::ImplicitLittle);
    let start = data_set_offset(&whole);
    let expected = read(&super::plans::everything());
    for lengths in [Lengths::Undefined, Lengths::Defined] {
        let mut bytes = whole[..start].to_vec();
        bytes.extend(reframed(&mut &whole[start..], lengths));
        let plan = read_plan(&bytes).expect("readable");
        assert_eq!(plan, expected, "{lengths:?}");
    }
    let both = [Lengths::Undefined, Lengths::Defined].map(|l| reframed(&mut &whole[start..], l));
    assert_ne!(both[0].len(), both[1].len());
}

#[derive(Clone, Copy, Debug, PartialEq)]
enum Lengths {
    Defined,
    Undefined,
}

/// Writes implicit little endian elements anew, up to the end or a delimiter.
fn reframed(rest: &mut &[u8], lengths: Lengths) -> Vec<u8> {
    let mut out = Vec::new();
    while !rest.is_empty() {
        let (group, number, length) = take_header(rest);
        if (group, number) == (0xFFFE, 0xE00D) {
            break;
        }
        // Only sequences begin with an item.
        let sequence = length == UNDEFINED || rest.starts_with(&[0xFE, 0xFF, 0x00, 0xE0]);
        if !sequence {
            let (value, after) = rest.split_at(length as usize);
            *rest = after;
            out.extend(implicit(group, number, length, value));
            continue;
        }
        let mut content = take_content(rest, length);
        let mut items = Vec::new();
        while !content.is_empty() {
            let (_, number, length) = take_header(&mut content);
            if number == 0xE0DD {
                break;
            }
            let inner = if length == UNDEFINED {
                reframed(&mut content, lengths)
            } else {
                reframed(&mut take_content(&mut content, length), lengths)
            };
            items.extend(match lengths {
                Lengths::Defined => [item(size(&inner)), inner].concat(),
                Lengths::Undefined => [item(UNDEFINED), inner, item_end()].concat(),
            });
        }
        if length == UNDEFINED {
            *rest = content;
        }
        out.extend(match lengths {
            Lengths::Defined => implicit(group, number, size(&items), &items),
            Lengths::Undefined => {
                [implicit(group, number, UNDEFINED, &items), sequence_end()].concat()
            }
        });
    }
    out
}

fn size(bytes: &[u8]) -> u32 {
    u32::try_from(bytes.len()).expect("short enough")
}

fn take_header(rest: &mut &[u8]) -> (u16, u16, u32) {
    let (header, after) = rest.split_at(8);
    *rest = after;
    let pair = |at: usize| u16::from_le_bytes([header[at], header[at + 1]]);
    let length = u32::from(pair(4)) | (u32::from(pair(6)) << 16);
    (pair(0), pair(2), length)
}

fn take_content<'b>(rest: &mut &'b [u8], length: u32) -> &'b [u8] {
    if length == UNDEFINED {
        return rest;
    }
    let (content, after) = rest.split_at(length as usize);
    *rest = after;
    content
}

#[test]
fn verify_elements_out_of_order_are_noted() {
    let late = short(0x0010, 0x1010, "AS", b"050Y");
    let plan = read_plan(&plan_then(&late)).expect("readable");
    assert_eq!(
        effects(&plan, NoteKind::Remark, "PatientAge (0010,1010)"),
        [Effect::None]
    );
    assert_eq!(plan.beams, read(&PlanSpec::default()).beams);
}

/// Repeats of what nobody reads are noted; equal repeats of what is read are used.
#[test]
fn verify_repeats() {
    let operator = short(0x0008, 0x1070, "PN", b"Someone ");
    let plan = read_plan(&plan_with(0x0008, 0x1070, &operator)).expect("readable");
    assert_eq!(
        effects(
            &plan,
            NoteKind::RepeatedAttribute,
            "OperatorsName (0008,1070)"
        ),
        [Effect::None]
    );
    let label = short(0x300A, 0x0002, "SH", b"STATIC");
    let plan = read_plan(&plan_with(0x300A, 0x0002, &label)).expect("readable");
    assert_eq!(
        effects(
            &plan,
            NoteKind::RepeatedAttribute,
            "RTPlanLabel (300A,0002)"
        ),
        [Effect::None]
    );
    assert_eq!(plan.identity.plan_label.get().as_deref(), Some("STATIC"));
}

/// In big endian files too, an element of unknown representation and undefined
/// length is implicit little endian inside.
#[test]
fn verify_unknown_sequence_in_big_endian() {
    let mut bytes = PlanSpec::default().encoded(Encoding::ExplicitBig);
    bytes.extend([0x30, 0x0F, 0x10, 0x01]);
    bytes.extend(b"UN\0\0\xFF\xFF\xFF\xFF");
    bytes.extend(item(UNDEFINED));
    bytes.extend(implicit(0x300F, 0x1002, 2, b"AB"));
    bytes.extend(item_end());
    bytes.extend(sequence_end());
    assert_eq!(
        read_plan(&bytes).expect("readable"),
        read(&PlanSpec::default())
    );
}

/// Delimiters and items out of place are damage.
#[test]
fn verify_stray_delimiters_are_refused() {
    for tail in [item(0), item_end(), sequence_end()] {
        let error = read_plan(&plan_then(&tail)).expect_err("stray");
        assert!(matches!(error, ReadError::Unexpected { .. }), "{error}");
    }
    let open = long(0x300C, 0x0080, "SQ", UNDEFINED, &item(0));
    let error = read_plan(&plan_then(&open)).expect_err("not closed");
    assert!(matches!(error, ReadError::NotClosed { .. }), "{error}");
    assert!(
        error
            .to_string()
            .contains("ReferencedDoseSequence (300C,0080)"),
        "{error}"
    );
}
