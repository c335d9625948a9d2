//! Why a file as a whole could not be read as a plan. What is wrong with a
//! single value is no error but a reading note, and stands elsewhere.

use thiserror::Error;

use super::file_kind::FileKind;

/// Why no plan came out of a file. Offsets are bytes from the start of the
/// file, or of the inflated data set when the message says so.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
#[non_exhaustive]
pub enum ReadError {
    /// No DICOM marker, and the bytes do not begin like a DICOM data set.
    #[error("not a DICOM file: no DICM marker at byte 128 and no data set at the start")]
    NotDicom,
    /// DICOM, but not an RT Plan.
    #[error(
        "not an RT Plan but {} (SOP class {sop_class_uid}); only RT Plan objects are read",
        kind.description()
    )]
    NotAPlan {
        /// What it is.
        kind: FileKind,
        /// SOP Class UID as the file has it; `not stated` when it has none.
        sop_class_uid: String,
    },
    /// An RT Plan without external beams.
    #[error(
        "RT Plan with brachytherapy application setups (300A,0230) and no external beam: nothing to recompute here"
    )]
    BrachyOnly,
    /// An RT Plan with neither beams nor brachytherapy. A file cut off between
    /// two elements looks just like it, so it is not passed over as empty.
    #[error(
        "the RT Plan has no Beam Sequence (300A,00B0), or an empty one; if it should have beams, the file is cut off: send the plan again"
    )]
    NoBeams,
    /// Larger than any plan that is read.
    #[error("{size_bytes} bytes are more than the {limit_bytes} a plan may have; is this a plan?")]
    TooLarge {
        /// Size found.
        size_bytes: usize,
        /// Limit.
        limit_bytes: usize,
    },
    /// A deflated data set inflates beyond the limit.
    #[error(
        "the deflated data set at byte {offset} inflates to more than {limit_bytes} bytes; refused"
    )]
    InflatesTooLarge {
        /// Where the deflated data begin.
        offset: usize,
        /// Limit.
        limit_bytes: usize,
    },
    /// A deflated data set that does not inflate.
    #[error("the deflated data set at byte {offset} {problem}; send the plan again")]
    Deflate {
        /// Where the deflated data begin.
        offset: usize,
        /// What is wrong.
        problem: &'static str,
    },
    /// The first elements of the data set make sense in no byte order.
    #[error(
        "no data set can be made out at byte {offset} (declared transfer syntax: {declared}); send the plan again as explicit little endian"
    )]
    UnknownSyntax {
        /// Where the data set should begin.
        offset: usize,
        /// Transfer Syntax UID of the file meta group; `none` when absent.
        declared: String,
    },
    /// The file ends inside a value, an item or a sequence.
    #[error(
        "file truncated: {place} at byte {offset} needs {needed_bytes} bytes where {left_bytes} are left; send the plan again"
    )]
    Truncated {
        /// Attribute path with tag.
        place: String,
        /// Where the bytes run out.
        offset: usize,
        /// Bytes wanted.
        needed_bytes: usize,
        /// Bytes there.
        left_bytes: usize,
    },
    /// The file ends inside a sequence or item of undefined length.
    #[error(
        "file truncated: {place} is not closed at byte {offset}, the end of the data; send the plan again"
    )]
    NotClosed {
        /// Attribute path with tag.
        place: String,
        /// The end.
        offset: usize,
    },
    /// A length that reaches beyond the item or sequence around it.
    #[error(
        "damaged file: {place} at byte {offset} declares {declared_bytes} bytes where {left_bytes} are left in its parent; send the plan again"
    )]
    LengthBeyondParent {
        /// Attribute path with tag.
        place: String,
        /// Where the value begins.
        offset: usize,
        /// Declared length.
        declared_bytes: usize,
        /// What the parent has left.
        left_bytes: usize,
    },
    /// A binary value whose length is no multiple of its size.
    #[error(
        "damaged file: {place} at byte {offset} has {length_bytes} bytes, not a multiple of {unit_bytes} as its VR {vr} demands"
    )]
    OddLength {
        /// Attribute path with tag.
        place: String,
        /// Where the value begins.
        offset: usize,
        /// Its VR.
        vr: &'static str,
        /// Declared length.
        length_bytes: usize,
        /// Size of one value.
        unit_bytes: usize,
    },
    /// Two bytes that are no value representation.
    #[error(
        "damaged file or bytes after its end: {place} at byte {offset} has the unknown value representation {vr}"
    )]
    UnknownVr {
        /// Attribute path with tag.
        place: String,
        /// Where the element begins.
        offset: usize,
        /// The two bytes, escaped.
        vr: String,
    },
    /// A tag that cannot stand where it stands.
    #[error("damaged file or bytes after its end: unexpected {found} at byte {offset} in {place}")]
    Unexpected {
        /// Attribute path of the surroundings.
        place: String,
        /// Where.
        offset: usize,
        /// What stands there.
        found: String,
    },
    /// Sequences nested deeper than any plan needs.
    #[error(
        "{place} at byte {offset} is nested more than {limit} sequences deep; refused as damaged"
    )]
    TooDeep {
        /// Attribute path with tag.
        place: String,
        /// Where.
        offset: usize,
        /// Limit.
        limit: usize,
    },
    /// More beams, devices, control points, positions or references than any plan has.
    #[error("more than {limit} {what} in {place}; refused as damaged")]
    TooManyParts {
        /// What there is too much of.
        what: &'static str,
        /// The sequence, with tag.
        place: String,
        /// Limit.
        limit: usize,
    },
    /// More elements or items than any plan has.
    #[error("more than {limit} {what} at byte {offset} ({place}); refused as damaged")]
    TooMany {
        /// What there is too much of.
        what: &'static str,
        /// Attribute path with tag.
        place: String,
        /// Where.
        offset: usize,
        /// Limit.
        limit: usize,
    },
}
