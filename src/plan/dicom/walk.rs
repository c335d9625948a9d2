//! The bounded walk over the bytes of a data set. It checks every length
//! against the bytes left in its parent before it goes on, the depth, the
//! number of elements, delimiters, value representations and value sizes, and
//! gives a borrowed tree; nothing is allocated by a declared length. Private
//! groups are passed over. Values are decoded elsewhere.

use dicom_core::{Tag, VR};

use super::error::ReadError;
use super::framing::{
    Decoded, Header, ITEM, ITEM_END, SEQUENCE_END, UNDEFINED, decode_header, decode_length,
    is_impossible, standard_vr_of_unknown, unit_bytes,
};
use super::name::{named, push_step};
use super::tree::{DataSet, Element, Order, Syntax, Value};

/// Sequences in sequences. Real plans use six at most.
pub(super) const MAX_DEPTH: usize = 16;
/// Elements and items in all. A plan of ten arcs has some 30,000.
pub(super) const MAX_ELEMENTS: usize = 250_000;
/// Items of one sequence.
pub(super) const MAX_ITEMS: usize = 10_000;
/// Repeats and disorder that are kept for notes.
const MAX_IRREGULARITIES: usize = 100;

/// Something legible but not as the standard has it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Irregularity {
    /// A tag that stands a second time. Attribute path with tag.
    Repeated { place: String },
    /// A tag smaller than the one before it. Attribute path with tag.
    OutOfOrder { place: String },
}

/// How a run of elements ends.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Ends {
    AtLimit,
    AtDelimiter,
}

/// A walk in progress.
pub(super) struct Walk<'a> {
    bytes: &'a [u8],
    position: usize,
    left_elements: usize,
    trail: Vec<(Tag, usize)>,
    pub(super) irregularities: Vec<Irregularity>,
}

impl<'a> Walk<'a> {
    /// A walk over `bytes` from `position` on.
    pub(super) const fn new(bytes: &'a [u8], position: usize) -> Self {
        Self {
            bytes,
            position,
            left_elements: MAX_ELEMENTS,
            trail: Vec::new(),
            irregularities: Vec::new(),
        }
    }

    /// The whole data set up to the end of the bytes.
    pub(super) fn whole(&mut self, syntax: Syntax) -> Result<DataSet<'a>, ReadError> {
        self.data_set(syntax, self.bytes.len(), Ends::AtLimit)
    }

    /// The next header without moving, `None` at the end of the bytes.
    pub(super) fn peek(&mut self, syntax: Syntax) -> Result<Option<Header>, ReadError> {
        let before = self.position;
        if before >= self.bytes.len() {
            return Ok(None);
        }
        let header = self.header(syntax, self.bytes.len());
        self.position = before;
        header.map(Some)
    }

    /// The next element of the outermost data set; `None` for a private one.
    pub(super) fn step(&mut self, syntax: Syntax) -> Result<Option<Element<'a>>, ReadError> {
        let limit = self.bytes.len();
        let header = self.header(syntax, limit)?;
        self.element(header, syntax, limit)
    }

    fn data_set(
        &mut self,
        syntax: Syntax,
        limit: usize,
        ends: Ends,
    ) -> Result<DataSet<'a>, ReadError> {
        let mut set = DataSet::default();
        let mut highest: Option<Tag> = None;
        while self.position < limit {
            let start = self.position;
            let header = self.header(syntax, limit)?;
            if header.tag == ITEM_END && ends == Ends::AtDelimiter {
                self.delimiter_is_empty(header, start)?;
                return Ok(set);
            }
            if let Some(before) = highest
                && header.tag <= before
            {
                set.order = Order::Disturbed;
                self.note_irregular(header.tag, &set);
            }
            highest = highest.max(Some(header.tag));
            if let Some(element) = self.element(header, syntax, limit)? {
                set.elements.push(element);
            }
        }
        match ends {
            Ends::AtLimit => Ok(set),
            Ends::AtDelimiter => Err(self.not_closed(ITEM, limit)),
        }
    }

    /// The element whose header was just read; `None` when it is private.
    fn element(
        &mut self,
        header: Header,
        syntax: Syntax,
        limit: usize,
    ) -> Result<Option<Element<'a>>, ReadError> {
        let Header { tag, vr, length } = header;
        self.count_one(tag)?;
        if is_impossible(tag) {
            return Err(self.unexpected(tag));
        }
        let private = tag.group() % 2 == 1;
        if length == UNDEFINED {
            let inner = match vr {
                VR::SQ => syntax,
                // A UN of undefined length is a sequence written in implicit little endian.
                VR::UN => Syntax::ImplicitLittle,
                VR::OB | VR::OW => {
                    self.fragments(tag, syntax, limit)?;
                    return Ok(None);
                }
                _ => return Err(self.unexpected(tag)),
            };
            let items = self.items(tag, inner, limit, Ends::AtDelimiter)?;
            return Ok((!private).then_some(Element {
                tag,
                vr: VR::SQ,
                syntax: inner,
                value: Value::Items(items),
            }));
        }
        let start = self.position;
        let end = self.value_end(tag, length, limit)?;
        if private {
            self.position = end;
            return Ok(None);
        }
        // A known attribute sent as UN: its bytes are implicit little endian.
        let (vr, syntax) = match (vr, standard_vr_of_unknown(vr, tag)) {
            (VR::UN, Some(known)) => (known, Syntax::ImplicitLittle),
            _ => (vr, syntax),
        };
        if vr == VR::SQ {
            let items = self.items(tag, syntax, end, Ends::AtLimit)?;
            return Ok(Some(Element {
                tag,
                vr,
                syntax,
                value: Value::Items(items),
            }));
        }
        let unit_bytes = unit_bytes(vr);
        let length_bytes = end - start;
        if !length_bytes.is_multiple_of(unit_bytes) {
            return Err(ReadError::OddLength {
                place: self.place(tag),
                offset: start,
                vr: vr.to_string(),
                length_bytes,
                unit_bytes,
            });
        }
        self.position = end;
        let bytes = self.bytes.get(start..end).unwrap_or_default();
        Ok(Some(Element {
            tag,
            vr,
            syntax,
            value: Value::Bytes(bytes),
        }))
    }

    /// The items of a sequence that begins here.
    fn items(
        &mut self,
        tag: Tag,
        syntax: Syntax,
        limit: usize,
        ends: Ends,
    ) -> Result<Vec<DataSet<'a>>, ReadError> {
        if self.trail.len() >= MAX_DEPTH {
            return Err(ReadError::TooDeep {
                place: self.place(tag),
                offset: self.position,
                limit: MAX_DEPTH,
            });
        }
        let mut items = Vec::new();
        while self.position < limit {
            let start = self.position;
            let header = self.header(syntax, limit)?;
            if header.tag == SEQUENCE_END && ends == Ends::AtDelimiter {
                self.delimiter_is_empty(header, start)?;
                return Ok(items);
            }
            if header.tag != ITEM {
                return Err(self.unexpected_in(tag, header.tag, start));
            }
            if items.len() >= MAX_ITEMS {
                return Err(self.too_many("items of one sequence", tag, MAX_ITEMS));
            }
            self.count_one(tag)?;
            self.trail.push((tag, items.len()));
            let item = if header.length == UNDEFINED {
                self.data_set(syntax, limit, Ends::AtDelimiter)?
            } else {
                let end = self.value_end(ITEM, header.length, limit)?;
                self.data_set(syntax, end, Ends::AtLimit)?
            };
            self.trail.pop();
            items.push(item);
        }
        match ends {
            Ends::AtLimit => Ok(items),
            Ends::AtDelimiter => Err(self.not_closed(tag, limit)),
        }
    }

    /// Passes over encapsulated fragments.
    fn fragments(&mut self, tag: Tag, syntax: Syntax, limit: usize) -> Result<(), ReadError> {
        while self.position < limit {
            let start = self.position;
            let header = self.header(syntax, limit)?;
            if header.tag == SEQUENCE_END {
                return self.delimiter_is_empty(header, start);
            }
            if header.tag != ITEM || header.length == UNDEFINED {
                return Err(self.unexpected_in(tag, header.tag, start));
            }
            self.count_one(tag)?;
            self.position = self.value_end(tag, header.length, limit)?;
        }
        Err(self.not_closed(tag, limit))
    }

    /// Reads a header and moves behind it.
    fn header(&mut self, syntax: Syntax, limit: usize) -> Result<Header, ReadError> {
        let start = self.position;
        let (tag, vr, length) = match decode_header(self.take::<8>(limit)?, syntax) {
            Decoded::Whole(header) => return Ok(header),
            Decoded::LengthFollows(tag, vr) => {
                let length = decode_length(self.take::<4>(limit)?, syntax);
                (tag, vr, length)
            }
            Decoded::UnknownVr(tag, letters) => {
                return Err(ReadError::UnknownVr {
                    place: self.place(tag),
                    offset: start,
                    vr: letters.escape_ascii().to_string(),
                });
            }
        };
        Ok(Header { tag, vr, length })
    }

    /// The next `N` bytes, moving behind them.
    fn take<const N: usize>(&mut self, limit: usize) -> Result<[u8; N], ReadError> {
        let left = limit.saturating_sub(self.position);
        if left >= N
            && let Some(taken) = self
                .bytes
                .get(self.position..)
                .and_then(|rest| rest.first_chunk::<N>())
        {
            self.position += N;
            return Ok(*taken);
        }
        Err(self.short("an element header".to_owned(), N, left, limit))
    }

    /// The end of a value of this length, checked against its parent.
    fn value_end(&self, tag: Tag, length: u32, limit: usize) -> Result<usize, ReadError> {
        let left = limit.saturating_sub(self.position);
        match usize::try_from(length) {
            Ok(length) if length <= left => Ok(self.position + length),
            other => Err(self.short(self.place(tag), other.unwrap_or(usize::MAX), left, limit)),
        }
    }

    fn short(&self, place: String, needed: usize, left: usize, limit: usize) -> ReadError {
        let offset = self.position;
        if limit == self.bytes.len() {
            ReadError::Truncated {
                place,
                offset,
                needed_bytes: needed,
                left_bytes: left,
            }
        } else {
            ReadError::LengthBeyondParent {
                place,
                offset,
                declared_bytes: needed,
                left_bytes: left,
            }
        }
    }

    fn count_one(&mut self, tag: Tag) -> Result<(), ReadError> {
        match self.left_elements.checked_sub(1) {
            Some(left) => {
                self.left_elements = left;
                Ok(())
            }
            None => Err(self.too_many("elements", tag, MAX_ELEMENTS)),
        }
    }

    fn delimiter_is_empty(&self, header: Header, start: usize) -> Result<(), ReadError> {
        if header.length == 0 {
            Ok(())
        } else {
            Err(self.unexpected_in(header.tag, header.tag, start))
        }
    }

    fn too_many(&self, what: &'static str, tag: Tag, limit: usize) -> ReadError {
        ReadError::TooMany {
            what,
            place: self.place(tag),
            offset: self.position,
            limit,
        }
    }

    fn unexpected(&self, tag: Tag) -> ReadError {
        self.unexpected_in(tag, tag, self.position)
    }

    fn unexpected_in(&self, place: Tag, found: Tag, offset: usize) -> ReadError {
        ReadError::Unexpected {
            place: self.place(place),
            offset,
            found: named(found),
        }
    }

    fn not_closed(&self, tag: Tag, limit: usize) -> ReadError {
        let place = self.place(tag);
        if limit == self.bytes.len() {
            ReadError::NotClosed {
                place,
                offset: limit,
            }
        } else {
            ReadError::LengthBeyondParent {
                place,
                offset: limit,
                declared_bytes: 8,
                left_bytes: 0,
            }
        }
    }

    fn note_irregular(&mut self, tag: Tag, set: &DataSet<'a>) {
        if self.irregularities.len() < MAX_IRREGULARITIES && tag.group().is_multiple_of(2) {
            let place = self.place(tag);
            let twice = set.elements.iter().any(|other| other.tag == tag);
            self.irregularities.push(if twice {
                Irregularity::Repeated { place }
            } else {
                Irregularity::OutOfOrder { place }
            });
        }
    }

    fn place(&self, tag: Tag) -> String {
        let mut path = String::new();
        for &(sequence, item) in &self.trail {
            push_step(&mut path, sequence, item);
        }
        path.push_str(&named(tag));
        path
    }
}
