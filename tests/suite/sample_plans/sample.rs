//! A sample plan: its file, its bytes, and what the audit must say of it. How
//! its doses came about is the matter of `course`.

use counterfoil::audit::Verdict;
use dicom_core::{DataElement, VR, value::PrimitiveValue};
use dicom_dictionary_std::tags;

use crate::builder::{Encoding, PlanSpec, encode};

/// Stands in RT Plan Description of every sample plan.
const REMARK: &str = "Invented demonstration plan of a fictional department. Not for clinical use.";

/// One file of `sample-plans/`.
pub(super) struct Sample {
    /// Relative to `sample-plans/`.
    pub(super) path: String,
    /// What the plan shows; of a faulty one, the fault.
    pub(super) shows: &'static str,
    /// What is in the file.
    pub(super) spec: PlanSpec,
    pub(super) encoding: Encoding,
    /// By how much the planned dose of each reference to a beam lies above
    /// ours, per cent; empty when the doses were typed.
    pub(super) scatter_percent: Vec<f64>,
    /// What the audit must say.
    pub(super) verdict: Verdict,
    /// The checks that must have a finding; no other may.
    pub(super) checks: &'static [&'static str],
    /// The plan without its fault.
    pub(super) sound: Option<PlanSpec>,
}

impl Sample {
    /// The bytes of the file.
    pub(super) fn bytes(&self) -> Vec<u8> {
        let mut object = self.spec.object();
        object.put(DataElement::new(
            tags::RT_PLAN_DESCRIPTION,
            VR::ST,
            PrimitiveValue::from(REMARK),
        ));
        encode(&object, self.encoding)
    }

    pub(super) fn with_encoding(mut self, encoding: Encoding) -> Self {
        self.encoding = encoding;
        self
    }

    /// Whether it is a plan in order: no fault was planted, and its technique is calculated.
    pub(super) fn is_sound(&self) -> bool {
        self.verdict == Verdict::Within && self.sound.is_none()
    }

    /// The row of `sample-plans/README.md`.
    pub(super) fn readme_row(&self) -> String {
        let checks: Vec<String> = self.checks.iter().map(|name| format!("`{name}`")).collect();
        let verdict = self.verdict.term();
        let last = match (self.path.split_once('/'), checks.is_empty()) {
            (None, _) => {
                let scatter: Vec<String> = self
                    .scatter_percent
                    .iter()
                    .map(|percent| format!("{percent:+}"))
                    .collect();
                scatter.join(", ")
            }
            (Some(_), true) => "-".to_owned(),
            (Some(_), false) => checks.join(", "),
        };
        format!("| `{}` | {} | {verdict} | {last} |", self.path, self.shows)
    }
}
