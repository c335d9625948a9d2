//! Changes to one item of a finished object, for faults that no specification
//! should be able to express.

use dicom_core::value::PrimitiveValue;
use dicom_core::{DataElement, Tag, VR};
use dicom_object::InMemDicomObject;

use super::encode::{Encoding, encode};
use super::spec::PlanSpec;

impl PlanSpec {
    /// The bytes of the plan after a change to the item at a path of sequences and item indices.
    pub(crate) fn edited(
        &self,
        path: &[(Tag, usize)],
        change: &dyn Fn(&mut InMemDicomObject),
    ) -> Vec<u8> {
        let mut object = self.object();
        edit(&mut object, path, change);
        encode(&object, Encoding::ExplicitLittle)
    }

    /// The bytes of the plan with one attribute set to this text; empty text empties it.
    pub(crate) fn with_text(&self, path: &[(Tag, usize)], tag: Tag, vr: VR, text: &str) -> Vec<u8> {
        self.edited(path, &|item| {
            let value = if text.is_empty() {
                PrimitiveValue::Empty
            } else {
                PrimitiveValue::from(text)
            };
            item.put(DataElement::new(tag, vr, value));
        })
    }

    /// The bytes of the plan without one attribute.
    pub(crate) fn without(&self, path: &[(Tag, usize)], tag: Tag) -> Vec<u8> {
        self.edited(path, &|item| {
            assert!(item.remove_element(tag), "{tag} is there");
        })
    }
}

fn edit(
    object: &mut InMemDicomObject,
    path: &[(Tag, usize)],
    change: &dyn Fn(&mut InMemDicomObject),
) {
    let Some((&(sequence, index), rest)) = path.split_first() else {
        change(object);
        return;
    };
    assert!(object.get(sequence).is_some(), "{sequence} is there");
    object.update_value(sequence, |value| {
        edit(&mut value.items_mut().expect("items")[index], rest, change);
    });
}
