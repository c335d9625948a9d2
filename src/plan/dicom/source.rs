//! From the bytes of a file to the bytes of its data set: preamble, file meta
//! group, the byte order that the first elements show, inflating. The data set
//! itself is walked elsewhere.

use std::borrow::Cow;

use dicom_core::{Tag, VR};
use dicom_dictionary_std::{tags, uids};
use flate2::{Decompress, FlushDecompress, Status};

use super::error::ReadError;
use super::tree::Syntax;

/// Largest file, and largest inflated data set, that is read as a plan: some
/// 150 arcs. Numbers grow to four times their text at most, which keeps the
/// memory for one file under 200 MB.
pub(super) const MAX_PLAN_BYTES: usize = 32 << 20;

/// What of an inflated data set is enough to tell the SOP class.
pub(super) const IDENTIFY_BYTES: usize = 1 << 20;

/// Where the data set of a file begins and what the file says about itself.
#[derive(Debug, Default)]
pub(super) struct Envelope {
    /// Where the data set begins.
    pub(super) data_offset: usize,
    /// Transfer Syntax UID (0002,0010).
    pub(super) declared_syntax: Option<String>,
    /// Media Storage SOP Class UID (0002,0002).
    pub(super) sop_class_uid: Option<String>,
    /// Media Storage SOP Instance UID (0002,0003).
    pub(super) sop_instance_uid: Option<String>,
    /// Whether a DICM marker or a file meta group is there.
    pub(super) marked: bool,
}

/// The bytes of a data set and how they are written.
#[derive(Debug)]
pub(super) struct Source<'a> {
    pub(super) bytes: Cow<'a, [u8]>,
    pub(super) start: usize,
    pub(super) syntax: Syntax,
    /// What the file says wrongly about itself, one sentence.
    pub(super) remark: Option<String>,
}

/// Reads preamble and file meta group, as far as they are there. Never fails:
/// a damaged group ends where it stops making sense.
pub(super) fn open_envelope(bytes: &[u8]) -> Envelope {
    let has = |offset: usize, text: &[u8]| {
        bytes
            .get(offset..)
            .is_some_and(|rest| rest.starts_with(text))
    };
    let (start, marked) = if has(128, b"DICM") {
        (132, true)
    } else if has(0, b"DICM") {
        (4, true)
    } else {
        (0, has(0, &[2, 0, 0, 0, b'U', b'L']))
    };
    let mut envelope = Envelope {
        data_offset: start,
        marked,
        ..Envelope::default()
    };
    if marked {
        read_meta(bytes, &mut envelope);
    }
    envelope
}

/// Walks group 0002 by its tags, since its stated length may be wrong.
fn read_meta(bytes: &[u8], envelope: &mut Envelope) {
    let mut stated_end = None;
    while let Some((tag, value_start, value_end)) = meta_element(bytes, envelope.data_offset) {
        let value = bytes.get(value_start..value_end).unwrap_or_default();
        let text = || {
            let text = String::from_utf8_lossy(value);
            let text = text.trim_matches(|c: char| c == ' ' || c == '\0');
            (!text.is_empty()).then(|| text.to_owned())
        };
        match tag {
            tags::FILE_META_INFORMATION_GROUP_LENGTH => {
                stated_end = value.first_chunk::<4>().and_then(|length| {
                    value_end.checked_add(usize::try_from(u32::from_le_bytes(*length)).ok()?)
                });
            }
            tags::MEDIA_STORAGE_SOP_CLASS_UID => envelope.sop_class_uid = text(),
            tags::MEDIA_STORAGE_SOP_INSTANCE_UID => envelope.sop_instance_uid = text(),
            tags::TRANSFER_SYNTAX_UID => envelope.declared_syntax = text(),
            _ => {}
        }
        envelope.data_offset = value_end;
        // Deflated bytes could look like one more element of the group.
        if Some(value_end) == stated_end && declares_deflate(envelope) {
            break;
        }
    }
}

/// Tag and bounds of the value of the meta element at `offset`, if one is there.
fn meta_element(bytes: &[u8], offset: usize) -> Option<(Tag, usize, usize)> {
    let [a, b, c, d, e, f, g, h] = *bytes.get(offset..)?.first_chunk::<8>()?;
    let tag = Tag(u16::from_le_bytes([a, b]), u16::from_le_bytes([c, d]));
    if tag.group() != 2 {
        return None;
    }
    let (start, length) = match VR::from_binary([e, f])? {
        VR::OB | VR::UN | VR::UT | VR::OW => {
            let long = bytes.get(offset + 8..)?.first_chunk::<4>()?;
            (
                offset + 12,
                usize::try_from(u32::from_le_bytes(*long)).ok()?,
            )
        }
        _ => (offset + 8, usize::from(u16::from_le_bytes([g, h]))),
    };
    let end = start.checked_add(length)?;
    (end <= bytes.len()).then_some((tag, start, end))
}

fn declares_deflate(envelope: &Envelope) -> bool {
    envelope.declared_syntax.as_deref() == Some(uids::DEFLATED_EXPLICIT_VR_LITTLE_ENDIAN)
}

/// The data set's bytes and syntax. `inflate_limit` bounds what is inflated.
pub(super) fn open_data_set<'a>(
    bytes: &'a [u8],
    envelope: &Envelope,
    limit: InflateLimit,
) -> Result<Source<'a>, ReadError> {
    let start = envelope.data_offset;
    let rest = bytes.get(start..).unwrap_or_default();
    let declared = envelope.declared_syntax.as_deref();
    if let Some(syntax) = shown_syntax(rest) {
        return Ok(Source {
            bytes: Cow::Borrowed(bytes),
            start,
            syntax,
            remark: syntax_remark(envelope, syntax_uid(syntax)),
        });
    }
    let unknown = || ReadError::UnknownSyntax {
        offset: start,
        declared: declared.unwrap_or("none").to_owned(),
    };
    if !envelope.marked {
        return Err(ReadError::NotDicom);
    }
    if rest.is_empty() {
        return Err(ReadError::Truncated {
            place: "the data set".to_owned(),
            offset: start,
            needed_bytes: 8,
            left_bytes: 0,
        });
    }
    let inflated = match inflate(rest, start, limit) {
        Ok(inflated) => inflated,
        Err(error) if declares_deflate(envelope) => return Err(error),
        Err(_) if rest.len() < 8 => {
            return Err(ReadError::Truncated {
                place: "the data set".to_owned(),
                offset: start,
                needed_bytes: 8,
                left_bytes: rest.len(),
            });
        }
        Err(_) => return Err(unknown()),
    };
    let syntax = shown_syntax(&inflated).ok_or_else(unknown)?;
    Ok(Source {
        bytes: Cow::Owned(inflated),
        start: 0,
        syntax,
        remark: syntax_remark(envelope, uids::DEFLATED_EXPLICIT_VR_LITTLE_ENDIAN),
    })
}

/// The syntax that the first element shows, which counts for more than what is declared.
fn shown_syntax(rest: &[u8]) -> Option<Syntax> {
    let [a, b, _, _, e, f, g, h] = *rest.first_chunk::<8>()?;
    // The first group of a data set is 0004 to 0020, nearly always 0008.
    let plausible = |group: u16| (0x0004..=0x0020).contains(&group) && group != 0x0005;
    let little = plausible(u16::from_le_bytes([a, b]));
    let big = plausible(u16::from_be_bytes([a, b]));
    let explicit = VR::from_binary([e, f]).is_some();
    let short_enough = || {
        usize::try_from(u32::from_le_bytes([e, f, g, h])).is_ok_and(|length| length < rest.len())
    };
    match (explicit, little, big) {
        (true, true, _) => Some(Syntax::ExplicitLittle),
        (true, false, true) => Some(Syntax::ExplicitBig),
        (false, true, _) if short_enough() => Some(Syntax::ImplicitLittle),
        _ => None,
    }
}

const fn syntax_uid(syntax: Syntax) -> &'static str {
    match syntax {
        Syntax::ImplicitLittle => uids::IMPLICIT_VR_LITTLE_ENDIAN,
        Syntax::ExplicitLittle => uids::EXPLICIT_VR_LITTLE_ENDIAN,
        Syntax::ExplicitBig => "1.2.840.10008.1.2.2",
    }
}

fn syntax_remark(envelope: &Envelope, shown: &str) -> Option<String> {
    match envelope.declared_syntax.as_deref() {
        Some(declared) if declared == shown => None,
        // Encapsulated pixel data live in explicit little endian data sets.
        Some(declared)
            if declared.starts_with("1.2.840.10008.1.2.4")
                && shown == uids::EXPLICIT_VR_LITTLE_ENDIAN =>
        {
            None
        }
        Some(declared) => Some(format!(
            "transfer syntax {declared} is declared, but the data set is written in {shown}; read as written"
        )),
        None => Some(format!(
            "no transfer syntax is declared; the data set reads as {shown}"
        )),
    }
}

/// What to do when the limit of inflated bytes is reached.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum InflateLimit {
    /// Refuse the file.
    Refuse(usize),
    /// Be content with the beginning.
    Stop(usize),
}

/// Inflates raw deflate data, to the end of its stream.
fn inflate(rest: &[u8], offset: usize, limit: InflateLimit) -> Result<Vec<u8>, ReadError> {
    let limit_bytes = match limit {
        InflateLimit::Refuse(limit) | InflateLimit::Stop(limit) => limit,
    };
    let fault = |problem| ReadError::Deflate { offset, problem };
    let mut inflater = Decompress::new(false);
    let mut out = Vec::with_capacity(rest.len().saturating_mul(4).min(limit_bytes));
    loop {
        let consumed = usize::try_from(inflater.total_in()).unwrap_or(usize::MAX);
        let before = (consumed, out.len());
        let input = rest.get(consumed..).unwrap_or_default();
        let status = inflater
            .decompress_vec(input, &mut out, FlushDecompress::None)
            .map_err(|_| fault("is damaged"))?;
        let consumed = usize::try_from(inflater.total_in()).unwrap_or(usize::MAX);
        if status == Status::StreamEnd {
            // One NUL pads to an even length.
            return match rest.get(consumed..) {
                None | Some([] | [0]) => Ok(out),
                Some(_) => Err(fault("is followed by bytes that do not belong to it")),
            };
        }
        if out.len() >= limit_bytes {
            return match limit {
                InflateLimit::Stop(_) => Ok(out),
                InflateLimit::Refuse(_) => Err(ReadError::InflatesTooLarge {
                    offset,
                    limit_bytes,
                }),
            };
        }
        if out.len() == out.capacity() {
            let growth = (out.len() / 2).max(64 << 10);
            out.reserve_exact(growth.min(limit_bytes - out.len() + 1));
        } else if before == (consumed, out.len()) {
            return match limit {
                InflateLimit::Stop(_) if !out.is_empty() => Ok(out),
                _ => Err(fault("is truncated")),
            };
        }
    }
}
