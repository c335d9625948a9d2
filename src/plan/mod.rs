//! A radiotherapy plan in the program's own terms, and the only way to get
//! one: `read_plan` over the bytes of a DICOM file. `plan::dicom` is the one
//! place that knows tags; nothing here calculates, prints or guesses. What
//! could not be read cleanly stands in the plan's reading notes, each with its
//! attribute and with what it blocks.

mod beam;
mod control_point;
mod dicom;
mod fraction;
mod identity;
mod modifier;
mod note;
mod prescription;

pub use beam::{
    Beam, BeamEnergy, DeliveryType, DeviceKind, LeafAxis, LimitingDevice, RadiationType,
};
pub use control_point::{ControlPoint, LeafPositions, ReferencedDose, WedgePosition};
pub use dicom::{FileKind, Identified, ReadError, identify, read_plan};
pub use fraction::{
    DoseMeaning, DoseType, FractionGroup, GroupDoseReference, PointDepth, PointDepthPlace,
    ReferencedBeam,
};
pub use identity::{Approval, Identity, PatientPosition, PatientSetup, ToleranceTable};
pub use modifier::{Accessory, Applicator, Block, BlockType, Bolus, Compensator, Wedge, WedgeKind};
pub use note::{Effect, NoteKind, NoteScope, ReadingNote};
pub use prescription::DoseReference;

use serde::Serialize;

/// One RT Plan.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Plan {
    /// Who, what, when: raw text as the file has it.
    pub identity: Identity,
    /// Patient setups, by item order.
    pub patient_setups: Vec<PatientSetup>,
    /// Tolerance tables, by item order.
    pub tolerance_tables: Vec<ToleranceTable>,
    /// Prescription items, by item order.
    pub dose_references: Vec<DoseReference>,
    /// Fraction groups, by item order.
    pub fraction_groups: Vec<FractionGroup>,
    /// Beams, by item order (which need not be number order).
    pub beams: Vec<Beam>,
    /// What the reader noticed or could not read.
    pub notes: Vec<ReadingNote>,
}

impl Plan {
    /// The one beam of this number: `None` when there is none or more than one.
    #[must_use]
    pub fn beam_index_by_number(&self, number: i32) -> Option<usize> {
        let mut found = self
            .beams
            .iter()
            .enumerate()
            .filter(|(_, beam)| beam.number.value() == Some(&number))
            .map(|(index, _)| index);
        let first = found.next()?;
        found.next().is_none().then_some(first)
    }
}
