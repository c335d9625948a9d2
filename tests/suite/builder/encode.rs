//! From an object to the bytes of a file, in each way of writing it.

use dicom_dictionary_std::{tags, uids};
use dicom_object::{FileMetaTableBuilder, InMemDicomObject};

/// Ways of writing a file.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Encoding {
    ExplicitLittle,
    ImplicitLittle,
    ExplicitBig,
    Deflated,
    /// Implicit little endian, from the first element on.
    BareImplicit,
    /// Explicit little endian, from the first element on.
    BareExplicit,
}

impl Encoding {
    pub(crate) const ALL: [Self; 6] = [
        Self::ExplicitLittle,
        Self::ImplicitLittle,
        Self::ExplicitBig,
        Self::Deflated,
        Self::BareImplicit,
        Self::BareExplicit,
    ];

    const fn transfer_syntax(self) -> &'static str {
        match self {
            Self::ExplicitLittle | Self::BareExplicit => uids::EXPLICIT_VR_LITTLE_ENDIAN,
            Self::ImplicitLittle | Self::BareImplicit => uids::IMPLICIT_VR_LITTLE_ENDIAN,
            Self::ExplicitBig => "1.2.840.10008.1.2.2",
            Self::Deflated => uids::DEFLATED_EXPLICIT_VR_LITTLE_ENDIAN,
        }
    }
}

/// The bytes of a file.
pub(crate) fn encode(object: &InMemDicomObject, encoding: Encoding) -> Vec<u8> {
    let text = |tag| {
        object
            .get(tag)
            .and_then(|element| element.to_str().ok())
            .map(|text| text.trim_end_matches('\0').to_owned())
            .unwrap_or_default()
    };
    let meta = FileMetaTableBuilder::new()
        .transfer_syntax(encoding.transfer_syntax())
        .media_storage_sop_class_uid(text(tags::SOP_CLASS_UID))
        .media_storage_sop_instance_uid(text(tags::SOP_INSTANCE_UID))
        .implementation_class_uid("2.25.20240105.99")
        .implementation_version_name("INVENTED");
    let file = object.clone().with_meta(meta).expect("meta group");
    let mut bytes = Vec::new();
    file.write_all(&mut bytes).expect("writing to memory");
    if matches!(encoding, Encoding::BareImplicit | Encoding::BareExplicit) {
        bytes.drain(..data_set_offset(&bytes));
    }
    bytes
}

/// Where the data set of a file with preamble begins.
pub(crate) fn data_set_offset(bytes: &[u8]) -> usize {
    let length = u32::from_le_bytes(bytes[140..144].try_into().expect("group length"));
    144 + length as usize
}
