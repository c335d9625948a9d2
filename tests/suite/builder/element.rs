//! One data set under construction: values in the builder's units become
//! elements with the standard's value representation.

use dicom_core::dictionary::{DataDictionary, DataDictionaryEntry};
use dicom_core::value::{DataSetSequence, PrimitiveValue};
use dicom_core::{DataElement, Tag, VR};
use dicom_object::{InMemDicomObject, StandardDataDictionary};

/// A data set or item.
#[derive(Clone, Debug, Default)]
pub(crate) struct Item {
    object: Option<InMemDicomObject>,
}

impl Item {
    pub(crate) fn new() -> Self {
        Self::default()
    }

    /// The object made.
    pub(crate) fn finish(self) -> InMemDicomObject {
        self.object.unwrap_or_else(InMemDicomObject::new_empty)
    }

    fn put(&mut self, tag: Tag, vr: VR, value: PrimitiveValue) {
        self.object
            .get_or_insert_with(InMemDicomObject::new_empty)
            .put(DataElement::new(tag, vr, value));
    }

    /// Text, as it is.
    pub(crate) fn text(&mut self, tag: Tag, text: &str) -> &mut Self {
        let value = if text.is_empty() {
            PrimitiveValue::Empty
        } else {
            PrimitiveValue::from(text)
        };
        self.put(tag, vr(tag), value);
        self
    }

    /// Text or an empty value.
    pub(crate) fn text_or_empty(&mut self, tag: Tag, text: Option<&str>) -> &mut Self {
        self.text(tag, text.unwrap_or_default())
    }

    /// Text, left out when there is none.
    pub(crate) fn text_if(&mut self, tag: Tag, text: Option<&str>) -> &mut Self {
        if let Some(text) = text {
            self.text(tag, text);
        }
        self
    }

    /// A whole number.
    pub(crate) fn whole(&mut self, tag: Tag, number: i32) -> &mut Self {
        self.text(tag, &number.to_string())
    }

    /// A number, left out when there is none.
    pub(crate) fn number_if(&mut self, tag: Tag, number: Option<f64>) -> &mut Self {
        if let Some(number) = number {
            self.numbers(tag, &[number]);
        }
        self
    }

    /// A number or an empty value.
    pub(crate) fn number_or_empty(&mut self, tag: Tag, number: Option<f64>) -> &mut Self {
        self.numbers(tag, number.as_slice())
    }

    /// Numbers, as strings or as floats as the attribute's representation demands.
    pub(crate) fn numbers(&mut self, tag: Tag, numbers: &[f64]) -> &mut Self {
        if vr(tag) == VR::FL {
            #[expect(clippy::cast_possible_truncation, reason = "the attribute is a float")]
            let floats: Vec<f32> = numbers.iter().map(|&number| number as f32).collect();
            self.put(tag, VR::FL, PrimitiveValue::F32(floats.into()));
            return self;
        }
        let all: Vec<String> = numbers.iter().map(|&number| decimal(number)).collect();
        self.text(tag, &all.join("\\"))
    }

    /// A length, left out when there is none.
    pub(crate) fn cm_if(&mut self, tag: Tag, length_cm: Option<f64>) -> &mut Self {
        if let Some(length_cm) = length_cm {
            self.cm(tag, &[length_cm]);
        }
        self
    }

    /// Lengths in cm, written in mm.
    pub(crate) fn cm(&mut self, tag: Tag, lengths_cm: &[f64]) -> &mut Self {
        // Rounded to a millionth of a mm, so that 89.7 cm are written 897.
        let mm: Vec<f64> = lengths_cm
            .iter()
            .map(|length_cm| (length_cm * 1e7).round() / 1e6)
            .collect();
        self.numbers(tag, &mm)
    }

    /// A sequence, left out when it has no items.
    pub(crate) fn sequence(
        &mut self,
        tag: Tag,
        items: impl IntoIterator<Item = Item>,
    ) -> &mut Self {
        let items: Vec<InMemDicomObject> = items.into_iter().map(Item::finish).collect();
        if !items.is_empty() {
            self.object
                .get_or_insert_with(InMemDicomObject::new_empty)
                .put(DataElement::new(tag, VR::SQ, DataSetSequence::from(items)));
        }
        self
    }
}

fn vr(tag: Tag) -> VR {
    StandardDataDictionary
        .by_tag(tag)
        .map_or(VR::UN, |entry| entry.vr().relaxed())
}

/// A decimal string of at most 16 characters, without trailing zeros.
fn decimal(number: f64) -> String {
    let shortest = number.to_string();
    if shortest.len() <= 16 {
        return shortest;
    }
    (0..=14)
        .rev()
        .map(|decimals| format!("{number:.decimals$}"))
        .find(|text| text.len() <= 16)
        .map_or(shortest, |text| match text.contains('.') {
            true => text.trim_end_matches('0').trim_end_matches('.').to_owned(),
            false => text,
        })
}
