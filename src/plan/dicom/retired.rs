//! Attributes that the standard has retired and that are still sent, hence
//! still read.

use dicom_core::Tag;

pub(super) const TREATMENT_SITES: Tag = Tag(0x300A, 0x000B);
pub(super) const BEAM_DOSE_SPECIFICATION_POINT: Tag = Tag(0x300A, 0x0082);
pub(super) const AVERAGE_BEAM_DOSE_POINT_DEPTH: Tag = Tag(0x300A, 0x008D);
pub(super) const AVERAGE_BEAM_DOSE_POINT_EQUIVALENT_DEPTH: Tag = Tag(0x300A, 0x008E);
pub(super) const AVERAGE_BEAM_DOSE_POINT_SSD: Tag = Tag(0x300A, 0x008F);
