//! How element headers are written: tags, value representations and lengths in
//! the three syntaxes, and what the standard says of sizes. Knows eight bytes
//! at a time; bounds and nesting are the walk's.

use dicom_core::{Tag, VR};

use super::name::standard_vr;
use super::tree::Syntax;

/// An undefined length.
pub(super) const UNDEFINED: u32 = u32::MAX;
pub(super) const ITEM: Tag = Tag(0xFFFE, 0xE000);
pub(super) const ITEM_END: Tag = Tag(0xFFFE, 0xE00D);
pub(super) const SEQUENCE_END: Tag = Tag(0xFFFE, 0xE0DD);

/// An element header.
#[derive(Clone, Copy, Debug)]
pub(super) struct Header {
    pub(super) tag: Tag,
    pub(super) vr: VR,
    pub(super) length: u32,
}

/// What eight bytes say of an element.
pub(super) enum Decoded {
    /// All of the header.
    Whole(Header),
    /// All but the length, whose four bytes follow.
    LengthFollows(Tag, VR),
    /// Two bytes that are no value representation.
    UnknownVr(Tag, [u8; 2]),
}

/// Decodes the first eight bytes of a header.
pub(super) fn decode_header(bytes: [u8; 8], syntax: Syntax) -> Decoded {
    let [a, b, c, d, e, f, g, h] = bytes;
    let (group, number) = match syntax {
        Syntax::ExplicitBig => ([a, b], [c, d]),
        _ => ([b, a], [d, c]),
    };
    let tag = Tag(u16::from_be_bytes(group), u16::from_be_bytes(number));
    // Items and delimiters have no representation in any syntax.
    if tag.group() == 0xFFFE || syntax == Syntax::ImplicitLittle {
        let length = decode_length([e, f, g, h], syntax);
        let vr = if tag.group() == 0xFFFE {
            VR::UN
        } else if length == UNDEFINED {
            VR::SQ
        } else {
            standard_vr(tag).unwrap_or(VR::UN)
        };
        return Decoded::Whole(Header { tag, vr, length });
    }
    let Some(vr) = VR::from_binary([e, f]) else {
        return Decoded::UnknownVr(tag, [e, f]);
    };
    if has_long_length(vr) {
        return Decoded::LengthFollows(tag, vr);
    }
    let length = match syntax {
        Syntax::ExplicitBig => u16::from_be_bytes([g, h]),
        _ => u16::from_le_bytes([g, h]),
    };
    Decoded::Whole(Header {
        tag,
        vr,
        length: u32::from(length),
    })
}

/// Decodes a length of four bytes.
pub(super) const fn decode_length(bytes: [u8; 4], syntax: Syntax) -> u32 {
    match syntax {
        Syntax::ExplicitBig => u32::from_be_bytes(bytes),
        _ => u32::from_le_bytes(bytes),
    }
}

/// Tags that no data set may hold: command and directory groups, the file
/// meta group, delimiters out of place, and groups the standard reserves.
pub(super) const fn is_impossible(tag: Tag) -> bool {
    matches!(
        tag.0,
        0x0000..=0x0003 | 0x0005 | 0x0006 | 0x0007 | 0xFFFE | 0xFFFF
    )
}

/// The standard's representation of a known attribute that was sent as unknown.
pub(super) fn standard_vr_of_unknown(vr: VR, tag: Tag) -> Option<VR> {
    if vr == VR::UN { standard_vr(tag) } else { None }
}

/// Whether an explicit header has two reserved bytes and a 32-bit length.
const fn has_long_length(vr: VR) -> bool {
    matches!(
        vr,
        VR::OB
            | VR::OD
            | VR::OF
            | VR::OL
            | VR::OV
            | VR::OW
            | VR::SQ
            | VR::SV
            | VR::UC
            | VR::UN
            | VR::UR
            | VR::UT
            | VR::UV
    )
}

/// Size of one value of a binary representation; 1 for the others.
pub(super) const fn unit_bytes(vr: VR) -> usize {
    match vr {
        VR::US | VR::SS | VR::OW => 2,
        VR::AT | VR::UL | VR::SL | VR::FL | VR::OF | VR::OL => 4,
        VR::FD | VR::OD | VR::SV | VR::UV | VR::OV => 8,
        _ => 1,
    }
}
