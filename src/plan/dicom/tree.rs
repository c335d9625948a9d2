//! A borrowed tree over the bytes of a data set: what the walk found, with
//! every value still undecoded. Building it is the walk's work, decoding
//! values is that of `number` and `text`.

use dicom_core::{Tag, VR};

/// The three ways elements are written; deflated data are explicit little endian inside.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Syntax {
    ImplicitLittle,
    ExplicitLittle,
    ExplicitBig,
}

/// One element.
#[derive(Debug)]
pub(super) struct Element<'a> {
    pub(super) tag: Tag,
    pub(super) vr: VR,
    pub(super) syntax: Syntax,
    pub(super) value: Value<'a>,
}

/// The value of an element.
#[derive(Debug, PartialEq)]
pub(super) enum Value<'a> {
    /// Undecoded bytes.
    Bytes(&'a [u8]),
    /// Items of a sequence.
    Items(Vec<DataSet<'a>>),
}

/// The elements of a data set or item in file order, private ones left out.
#[derive(Debug, Default)]
pub(super) struct DataSet<'a> {
    pub(super) elements: Vec<Element<'a>>,
    pub(super) order: Order,
}

/// Whether the tags of a data set rise, as the standard has it.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) enum Order {
    #[default]
    Rising,
    /// Out of order, or a tag twice.
    Disturbed,
}

/// What stands under a tag.
pub(super) enum Found<'n, 'a> {
    Nothing,
    One(&'n Element<'a>),
    /// The tag stands more than once; all contents are equal.
    Repeated(&'n Element<'a>),
    /// The tag stands more than once, with different content. The first.
    Contradictory(&'n Element<'a>),
}

/// Equality of content; where the element stands does not matter.
impl PartialEq for Element<'_> {
    fn eq(&self, other: &Self) -> bool {
        self.tag == other.tag && self.value == other.value
    }
}

impl PartialEq for DataSet<'_> {
    fn eq(&self, other: &Self) -> bool {
        self.elements == other.elements
    }
}

impl<'a> DataSet<'a> {
    /// What stands under a tag.
    pub(super) fn find<'n>(&'n self, tag: Tag) -> Found<'n, 'a> {
        if self.order == Order::Rising {
            return match self
                .elements
                .binary_search_by_key(&tag, |element| element.tag)
            {
                Ok(index) => self.elements.get(index).map_or(Found::Nothing, Found::One),
                Err(_) => Found::Nothing,
            };
        }
        let mut all = self.elements.iter().filter(|element| element.tag == tag);
        let Some(first) = all.next() else {
            return Found::Nothing;
        };
        let mut found = Found::One(first);
        for other in all {
            if other == first {
                if matches!(found, Found::One(_)) {
                    found = Found::Repeated(first);
                }
            } else {
                found = Found::Contradictory(first);
            }
        }
        found
    }

    /// The first element under a tag.
    pub(super) fn first<'n>(&'n self, tag: Tag) -> Option<&'n Element<'a>> {
        match self.find(tag) {
            Found::Nothing => None,
            Found::One(element) | Found::Repeated(element) | Found::Contradictory(element) => {
                Some(element)
            }
        }
    }

    /// Number of items of a sequence; 0 when it is absent or no sequence.
    pub(super) fn item_count(&self, tag: Tag) -> usize {
        match self.first(tag).map(|element| &element.value) {
            Some(Value::Items(items)) => items.len(),
            _ => 0,
        }
    }
}
