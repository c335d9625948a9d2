//! The kinds of files that are told apart, with their words. How a file's kind
//! is found out is the matter of `kind`.

use serde::Serialize;

/// The kinds of files that are told apart.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum FileKind {
    /// RT Plan with external beams, or without anything that says otherwise.
    Plan,
    /// RT Plan with brachytherapy only.
    BrachyPlan,
    /// RT Ion Plan.
    IonPlan,
    /// RT Structure Set.
    StructureSet,
    /// CT image.
    Ct,
    /// RT Dose.
    Dose,
    /// A treatment record.
    Record,
    /// Any other DICOM object.
    OtherDicom,
    /// No DICOM.
    NotDicom,
}

impl FileKind {
    /// The word for outputs.
    #[must_use]
    pub const fn term(self) -> &'static str {
        match self {
            Self::Plan => "plan",
            Self::BrachyPlan => "brachy-plan",
            Self::IonPlan => "ion-plan",
            Self::StructureSet => "structure-set",
            Self::Ct => "ct",
            Self::Dose => "dose",
            Self::Record => "record",
            Self::OtherDicom => "other-dicom",
            Self::NotDicom => "not-dicom",
        }
    }

    /// The words for sentences.
    #[must_use]
    pub const fn description(self) -> &'static str {
        match self {
            Self::Plan => "an RT Plan",
            Self::BrachyPlan => "a brachytherapy plan",
            Self::IonPlan => "an RT Ion Plan",
            Self::StructureSet => "an RT Structure Set",
            Self::Ct => "a CT image",
            Self::Dose => "an RT Dose",
            Self::Record => "a treatment record",
            Self::OtherDicom => "another DICOM object",
            Self::NotDicom => "no DICOM file",
        }
    }
}
