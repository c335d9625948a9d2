//! Reading one attribute of one item: present, empty, repeated, malformed or
//! incredible, with the note that each deserves. What the attributes mean is
//! left to the files named after the parts of a plan.

use dicom_core::{Tag, VR};
use dicom_dictionary_std::tags;

use super::name::{named, push_step};
use super::notes::Notes;
use super::number::{Malformed, read_numbers, shown, whole};
use super::text::Charset;
use super::tree::{DataSet, Element, Found, Value};
use crate::plan::{Effect, NoteKind, NoteScope, ReadingNote};
use crate::quantity::{Given, Patient, Point, Quantity};

/// Longest text that is kept, in bytes, with room for several values and for
/// four bytes a character. Identifiers and names have 64 characters, free text
/// 10,240 (PS3.5, 6.2); every row of the report repeats some names.
const fn longest_text(vr: VR) -> usize {
    match vr {
        VR::LT | VR::ST | VR::UC | VR::UT => 40_960,
        _ => 4_096,
    }
}

/// A data set or item, with the way to it and what notes about it concern.
#[derive(Clone, Copy)]
pub(super) struct Node<'n, 'a> {
    pub(super) set: &'n DataSet<'a>,
    pub(super) charset: &'n Charset,
    pub(super) scope: NoteScope,
    up: Option<(&'n Node<'n, 'a>, Tag, usize)>,
}

/// How a number is read.
#[derive(Clone, Copy, Debug)]
pub(super) struct Wanted {
    /// Credible range, in the program's units.
    quantity: Option<Quantity>,
    /// What the value in the file is divided by.
    divisor: f64,
    /// What an unusable value stops.
    effect: Effect,
}

/// A length, mm in the file, cm here.
pub(super) const fn length(quantity: Quantity, effect: Effect) -> Wanted {
    Wanted {
        quantity: Some(quantity),
        divisor: 10.0,
        effect,
    }
}

/// A quantity whose unit in the file is ours.
pub(super) const fn quantity(quantity: Quantity, effect: Effect) -> Wanted {
    Wanted {
        quantity: Some(quantity),
        divisor: 1.0,
        effect,
    }
}

/// A number without a credible range.
pub(super) const fn plain(effect: Effect) -> Wanted {
    Wanted {
        quantity: None,
        divisor: 1.0,
        effect,
    }
}

/// One number as it was found.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Reading<T> {
    /// Absent or empty.
    Nothing,
    /// There, but not usable; a note says why.
    Unusable,
    /// Usable.
    Value(T),
}

impl<T> Reading<T> {
    /// As a value with its standing.
    pub(super) fn given(self) -> Given<T> {
        match self {
            Self::Nothing | Self::Unusable => Given::Absent,
            Self::Value(value) => Given::stated(value),
        }
    }

    /// With the value changed.
    pub(super) fn map<U>(self, change: impl FnOnce(T) -> U) -> Reading<U> {
        match self {
            Self::Nothing => Reading::Nothing,
            Self::Unusable => Reading::Unusable,
            Self::Value(value) => Reading::Value(change(value)),
        }
    }
}

impl<'n, 'a> Node<'n, 'a> {
    /// The outermost data set.
    pub(super) const fn root(set: &'n DataSet<'a>, charset: &'n Charset) -> Self {
        Self {
            set,
            charset,
            scope: NoteScope::Plan,
            up: None,
        }
    }

    /// The same node with its notes about something else.
    pub(super) const fn about(self, scope: NoteScope) -> Self {
        Self { scope, ..self }
    }

    /// Path of an attribute of this node, with its tag.
    pub(super) fn place(&self, tag: Tag) -> String {
        let mut path = String::new();
        self.push_path(&mut path);
        path.push_str(&named(tag));
        path
    }

    fn push_path(&self, path: &mut String) {
        if let Some((parent, sequence, item)) = self.up {
            parent.push_path(path);
            push_step(path, sequence, item);
        }
    }

    /// Adds a note about an attribute of this node.
    pub(super) fn note(
        &self,
        notes: &mut Notes,
        tag: Tag,
        kind: NoteKind,
        effect: Effect,
        message: impl Into<String>,
    ) {
        self.note_values(notes, tag, kind, effect, message, (None, None));
    }

    /// The same, with what was found and what was expected.
    pub(super) fn note_values(
        &self,
        notes: &mut Notes,
        tag: Tag,
        kind: NoteKind,
        effect: Effect,
        message: impl Into<String>,
        (measured, limit): (Option<String>, Option<String>),
    ) {
        notes.add(ReadingNote {
            scope: self.scope,
            kind,
            effect,
            place: self.place(tag),
            message: message.into(),
            measured,
            limit,
        });
    }

    /// The element under a tag. One that stands twice with different content
    /// counts as unusable; neither the first nor the last is chosen.
    fn element(&self, tag: Tag, effect: Effect, notes: &mut Notes) -> Reading<&'n Element<'a>> {
        match self.set.find(tag) {
            Found::Nothing => Reading::Nothing,
            Found::One(element) => Reading::Value(element),
            Found::Repeated(element) => {
                self.note(
                    notes,
                    tag,
                    NoteKind::RepeatedAttribute,
                    Effect::None,
                    "the attribute stands more than once, with the same content",
                );
                Reading::Value(element)
            }
            Found::Contradictory(first) => {
                let measured = match first.value {
                    Value::Bytes(bytes) => Some(format!("first: {}", shown(bytes))),
                    Value::Items(_) => None,
                };
                self.note_values(
                    notes,
                    tag,
                    NoteKind::RepeatedAttribute,
                    effect,
                    "the attribute stands more than once with different content; none of them is used: export the plan again",
                    (measured, None),
                );
                Reading::Unusable
            }
        }
    }

    /// A text value as shown text, with its standing.
    pub(super) fn text(&self, tag: Tag, effect: Effect, notes: &mut Notes) -> Given<String> {
        self.text_reading(tag, effect, notes).given()
    }

    /// A text value as shown text.
    pub(super) fn text_reading(
        &self,
        tag: Tag,
        effect: Effect,
        notes: &mut Notes,
    ) -> Reading<String> {
        let element = match self.element(tag, effect, notes) {
            Reading::Value(element) => element,
            Reading::Nothing => return Reading::Nothing,
            Reading::Unusable => return Reading::Unusable,
        };
        let Value::Bytes(bytes) = element.value else {
            let message = "a sequence stands where text belongs";
            self.note(notes, tag, NoteKind::MalformedValue, effect, message);
            return Reading::Unusable;
        };
        let limit = longest_text(element.vr);
        if bytes.len() > limit {
            self.note_values(
                notes,
                tag,
                NoteKind::MalformedValue,
                effect,
                "the text is far longer than the standard allows; it counts as absent",
                (
                    Some(format!("{} bytes", bytes.len())),
                    Some(format!("{limit} bytes")),
                ),
            );
            return Reading::Unusable;
        }
        let own = if bytes.is_ascii() && !bytes.contains(&0x1B) {
            None
        } else {
            self.own_charset()
        };
        let charset = own.as_ref().unwrap_or(self.charset);
        match charset.decode(element.vr, bytes) {
            text if text.is_empty() => Reading::Nothing,
            text => Reading::Value(text),
        }
    }

    /// The character set that this item, or the nearest item around it, states for itself (PS3.3, C.12.1.1.2).
    fn own_charset(&self) -> Option<Charset> {
        // The outermost data set's is known.
        let (parent, ..) = self.up?;
        match self
            .set
            .first(tags::SPECIFIC_CHARACTER_SET)
            .map(|element| &element.value)
        {
            Some(Value::Bytes(value)) => Some(Charset::from_value(value)),
            _ => parent.own_charset(),
        }
    }

    /// All numbers of an attribute, in the program's units, each checked
    /// against the credible range; into `out`, which is emptied first.
    pub(super) fn numbers_into(
        &self,
        tag: Tag,
        wanted: Wanted,
        out: &mut Vec<f64>,
        notes: &mut Notes,
    ) -> Reading<()> {
        out.clear();
        let element = match self.element(tag, wanted.effect, notes) {
            Reading::Value(element) => element,
            Reading::Nothing => return Reading::Nothing,
            Reading::Unusable => return Reading::Unusable,
        };
        if let Err(malformed) = read_numbers(element, out) {
            self.note_malformed(tag, wanted.effect, malformed, notes);
            return Reading::Unusable;
        }
        if out.is_empty() {
            return Reading::Nothing;
        }
        for value in out.iter_mut() {
            *value /= wanted.divisor;
        }
        if let Some(quantity) = wanted.quantity {
            let range = quantity.range();
            let credible = |value: &f64| *value >= range.least && *value <= range.greatest;
            let objection = out
                .iter()
                .find(|value| !credible(value))
                .and_then(|&value| quantity.objection(value).map(|text| (value, text)));
            if let Some((value, objection)) = objection {
                self.note_values(
                    notes,
                    tag,
                    NoteKind::IncredibleValue,
                    wanted.effect,
                    objection,
                    (
                        Some(format!("{value} {}", range.unit)),
                        Some(format!(
                            "{} to {} {}",
                            range.least, range.greatest, range.unit
                        )),
                    ),
                );
                return Reading::Unusable;
            }
        }
        Reading::Value(())
    }

    fn note_malformed(&self, tag: Tag, effect: Effect, malformed: Malformed, notes: &mut Notes) {
        let Malformed { found, why } = malformed;
        self.note_values(
            notes,
            tag,
            NoteKind::MalformedValue,
            effect,
            format!("'{found}' {why}; the value counts as absent"),
            (Some(found), None),
        );
    }

    /// Exactly `N` numbers.
    pub(super) fn exactly<const N: usize>(
        &self,
        tag: Tag,
        wanted: Wanted,
        notes: &mut Notes,
    ) -> Reading<[f64; N]> {
        let mut values = Vec::new();
        let reading = self.numbers_into(tag, wanted, &mut values, notes);
        match <[f64; N]>::try_from(values.as_slice()) {
            Ok(all) => reading.map(|()| all),
            Err(_) => match reading {
                Reading::Value(()) => {
                    self.note_count(tag, wanted.effect, values.len(), N, notes);
                    Reading::Unusable
                }
                Reading::Nothing => Reading::Nothing,
                Reading::Unusable => Reading::Unusable,
            },
        }
    }

    /// Notes a wrong number of values.
    pub(super) fn note_count(
        &self,
        tag: Tag,
        effect: Effect,
        found: usize,
        expected: usize,
        notes: &mut Notes,
    ) {
        self.note_values(
            notes,
            tag,
            NoteKind::MalformedValue,
            effect,
            format!("{found} values where {expected} belong; the attribute counts as absent"),
            (Some(found.to_string()), Some(expected.to_string())),
        );
    }

    /// One number.
    pub(super) fn reading(&self, tag: Tag, wanted: Wanted, notes: &mut Notes) -> Reading<f64> {
        self.exactly::<1>(tag, wanted, notes).map(|[value]| value)
    }

    /// One number, with its standing.
    pub(super) fn number(&self, tag: Tag, wanted: Wanted, notes: &mut Notes) -> Given<f64> {
        self.reading(tag, wanted, notes).given()
    }

    /// One whole number.
    pub(super) fn integer(&self, tag: Tag, effect: Effect, notes: &mut Notes) -> Given<i32> {
        match self.reading(tag, plain(effect), notes) {
            Reading::Value(value) => match whole(value) {
                Some(value) => Given::stated(value),
                None => {
                    let malformed = Malformed {
                        found: value.to_string(),
                        why: "is not a whole number",
                    };
                    self.note_malformed(tag, effect, malformed, notes);
                    Given::Absent
                }
            },
            _ => Given::Absent,
        }
    }

    /// A point of the patient frame, mm in the file, cm here.
    pub(super) fn point_reading(
        &self,
        tag: Tag,
        effect: Effect,
        notes: &mut Notes,
    ) -> Reading<Point<Patient>> {
        self.exactly::<3>(tag, length(Quantity::Coordinate, effect), notes)
            .map(|[x_cm, y_cm, z_cm]| Point::new(x_cm, y_cm, z_cm))
    }

    /// The items of a sequence. One that stands twice with different content
    /// is read as the first says, with the note's effect.
    pub(super) fn items(
        &'n self,
        tag: Tag,
        effect: Effect,
        notes: &mut Notes,
    ) -> impl Iterator<Item = Node<'n, 'a>> + use<'n, 'a> {
        let first = match self.element(tag, effect, notes) {
            Reading::Value(element) => Some(element),
            Reading::Unusable => self.set.first(tag),
            Reading::Nothing => None,
        };
        let items: &'n [DataSet<'a>] = match first.map(|element| &element.value) {
            Some(Value::Items(items)) => items,
            Some(Value::Bytes(bytes)) if !bytes.is_empty() => {
                self.note(
                    notes,
                    tag,
                    NoteKind::MalformedValue,
                    effect,
                    "bytes stand where a sequence belongs; it counts as absent",
                );
                &[]
            }
            _ => &[],
        };
        items.iter().enumerate().map(move |(index, set)| Node {
            set,
            charset: self.charset,
            scope: self.scope,
            up: Some((self, tag, index)),
        })
    }

    /// Notes when a stated count differs from the items that are there.
    pub(super) fn check_count(&self, tag: Tag, items: usize, more: Effect, notes: &mut Notes) {
        let Some(stated) = self.integer(tag, Effect::None, notes).get() else {
            return;
        };
        let stated_items = usize::try_from(stated).unwrap_or(usize::MAX);
        if stated_items != items {
            let effect = if stated_items > items {
                more
            } else {
                Effect::None
            };
            self.note_values(
                notes,
                tag,
                NoteKind::CountMismatch,
                effect,
                format!("{stated} stated, {items} items there; the items count"),
                (Some(stated.to_string()), Some(items.to_string())),
            );
        }
    }
}

/// An angle brought to 0 <= a < 360.
pub(super) fn normalised_deg(angle_deg: f64) -> f64 {
    let turned = angle_deg.rem_euclid(360.0);
    // A tiny negative angle rounds up to 360.
    if turned >= 360.0 { 0.0 } else { turned }
}
