//! Elements written byte by byte, for files that no library would write.

use crate::builder::{PlanSpec, data_set_offset};

/// Undefined length.
pub(super) const UNDEFINED: u32 = 0xFFFF_FFFF;

/// An explicit little endian element header with a short length.
pub(super) fn short(group: u16, number: u16, vr: &str, value: &[u8]) -> Vec<u8> {
    let length = u16::try_from(value.len()).expect("a short value");
    let mut out = header(group, number, vr);
    out.extend(length.to_le_bytes());
    out.extend(value);
    out
}

/// An explicit little endian element with a long length, which need not be true.
pub(super) fn long(group: u16, number: u16, vr: &str, length: u32, value: &[u8]) -> Vec<u8> {
    let mut out = header(group, number, vr);
    out.extend([0, 0]);
    out.extend(length.to_le_bytes());
    out.extend(value);
    out
}

fn header(group: u16, number: u16, vr: &str) -> Vec<u8> {
    let mut out = Vec::new();
    out.extend(group.to_le_bytes());
    out.extend(number.to_le_bytes());
    out.extend(vr.as_bytes());
    out
}

/// An implicit little endian element, an item or a delimiter.
pub(super) fn implicit(group: u16, number: u16, length: u32, value: &[u8]) -> Vec<u8> {
    let mut out = Vec::new();
    out.extend(group.to_le_bytes());
    out.extend(number.to_le_bytes());
    out.extend(length.to_le_bytes());
    out.extend(value);
    out
}

/// Start of an item of this length.
pub(super) fn item(length: u32) -> Vec<u8> {
    implicit(0xFFFE, 0xE000, length, &[])
}

/// End of an item of undefined length.
pub(super) fn item_end() -> Vec<u8> {
    implicit(0xFFFE, 0xE00D, 0, &[])
}

/// End of a sequence of undefined length.
pub(super) fn sequence_end() -> Vec<u8> {
    implicit(0xFFFE, 0xE0DD, 0, &[])
}

/// The default plan with these bytes behind its last element.
pub(super) fn plan_then(tail: &[u8]) -> Vec<u8> {
    let mut bytes = PlanSpec::default().bytes();
    bytes.extend(tail);
    bytes
}

/// The default plan with these bytes before the element of this tag in its outermost data set.
pub(super) fn plan_with(group: u16, number: u16, inserted: &[u8]) -> Vec<u8> {
    let mut bytes = PlanSpec::default().bytes();
    let mut wanted = group.to_le_bytes().to_vec();
    wanted.extend(number.to_le_bytes());
    let start = data_set_offset(&bytes);
    let at = start
        + bytes[start..]
            .windows(4)
            .position(|window| window == wanted)
            .expect("the element is there");
    bytes.splice(at..at, inserted.iter().copied());
    bytes
}
