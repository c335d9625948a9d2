//! The records of an audit: what the report writes, no more and no less. Texts
//! are finished sentences; numbers are unrounded; missing is `None`.

use serde::Serialize;

use crate::dose::BeamCalculation;
use crate::settings::{Severity, Site, SiteSource};

/// Verdict of a beam or a plan. The order is that of the plan rule: the later, the worse.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Verdict {
    /// A plan without treatment beams.
    NotApplicable,
    /// A beam that is not delivered for treatment.
    NotTreated,
    /// Within tolerance.
    Within,
    /// Beyond tolerance, within action.
    BeyondTolerance,
    /// Could not be verified.
    NotVerifiable,
    /// Beyond the action level.
    BeyondAction,
}

impl Verdict {
    /// The word used in outputs.
    #[must_use]
    pub const fn term(self) -> &'static str {
        match self {
            Self::NotApplicable => "not-applicable",
            Self::NotTreated => "not-treated",
            Self::Within => "within",
            Self::BeyondTolerance => "beyond-tolerance",
            Self::NotVerifiable => "not-verifiable",
            Self::BeyondAction => "beyond-action",
        }
    }
}

/// How a beam's deviation was judged.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "snake_case", tag = "judged")]
pub enum Judgement {
    /// On its own.
    Alone,
    /// As a share of the dose of all beams at the shared point, because it adds little.
    ShareOfTotal {
        /// The beam's share of the planned dose, per cent.
        share_percent: f64,
        /// Its difference as a per cent of the total: this is what was judged.
        percent_of_total: f64,
    },
    /// By the sum of the group's beams only: the plan states doses at fraction level.
    FractionSum {
        /// The sum's deviation, per cent: this is what was judged.
        sum_deviation_percent: f64,
    },
}

/// One beam of one plan: exactly one entry for each (fraction group, beam).
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct BeamEntry {
    /// Fraction group number; `None` for a beam that no group references.
    pub fraction_group: Option<i32>,
    /// Treatment machine name.
    pub machine: Option<String>,
    /// Beam number.
    pub beam_number: Option<i32>,
    /// Beam name.
    pub beam_name: Option<String>,
    /// PHOTON, ELECTRON or what the file says.
    pub radiation: Option<String>,
    /// `6`, `6-FFF`, `9`.
    pub energy: Option<String>,
    /// Number of control points.
    pub control_points: usize,
    /// Geometry, point, depths, trace, obstacles, picture.
    pub calculation: BeamCalculation,
    /// Planned meterset, MU.
    pub planned_mu: Option<f64>,
    /// Planned dose at the point in one fraction, Gy.
    pub planned_dose_gy: Option<f64>,
    /// Independent dose for the planned meterset, Gy; also shown when an obstacle forbids judging it.
    pub independent_dose_gy: Option<f64>,
    /// Meterset that would give the planned dose, MU.
    pub independent_mu: Option<f64>,
    /// 100 * (independent dose - planned dose) / planned dose.
    pub deviation_percent: Option<f64>,
    /// Expected spread of the independent dose, 1 sigma, per cent.
    pub expected_spread_percent: Option<f64>,
    /// Tolerance that holds for this beam, per cent.
    pub tolerance_percent: Option<f64>,
    /// Action level that holds for this beam, per cent.
    pub action_percent: Option<f64>,
    /// Where the two levels come from.
    pub level_basis: Option<String>,
    /// How it was judged; `None` when it was not.
    pub judgement: Option<Judgement>,
    /// The verdict.
    pub verdict: Verdict,
    /// Why the verdict is what it is: finished sentences, never empty unless within.
    pub reasons: Vec<String>,
    /// Worth knowing, without effect on the verdict (depth stands on the planning system's word, fluence mode not stated ...).
    pub remarks: Vec<String>,
}

/// Something about the plan that a person should look at.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Finding {
    /// Beam number, when it is about one beam.
    pub beam_number: Option<i32>,
    /// Name of the check, in plain words with hyphens.
    pub check: &'static str,
    /// Severity.
    pub severity: Severity,
    /// One or two sentences: what is there, what to do.
    pub message: String,
    /// What was found.
    pub measured: Option<String>,
    /// What was expected.
    pub limit: Option<String>,
}

/// The sum of the beams that share a point.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SharedPointSum {
    /// Fraction group number.
    pub fraction_group: Option<i32>,
    /// Planned dose of one fraction at the point, Gy.
    pub planned_dose_gy: f64,
    /// Independent dose of one fraction at the point, Gy.
    pub independent_dose_gy: f64,
    /// 100 * (independent - planned) / planned.
    pub deviation_percent: f64,
}

/// One plan.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PlanEntry {
    /// File, as it was given or found.
    pub file: String,
    /// SHA-256 of the file, hex.
    pub sha256: String,
    /// SOP Instance UID.
    pub sop_instance_uid: Option<String>,
    /// Patient ID (a pseudonym when so ordered).
    pub patient_id: Option<String>,
    /// Patient name (left out when pseudonymised).
    pub patient_name: Option<String>,
    /// RT Plan Label.
    pub plan_label: Option<String>,
    /// Approval Status.
    pub approval: Option<String>,
    /// Treatment machine names, joined with ` + ` when several.
    pub machine: Option<String>,
    /// Fractions planned; `None` when groups differ or none is stated.
    pub fractions: Option<i32>,
    /// Prescribed dose of the course, Gy; `None` when none or several are stated.
    pub prescription_gy: Option<f64>,
    /// Sum over all treatment beams of a single fraction group that share one point.
    pub sum: Option<SharedPointSum>,
    /// Why there is no sum.
    pub no_sum_reason: Option<String>,
    /// The deviation that is largest in size over the beams that were judged, per cent.
    pub worst_beam_percent: Option<f64>,
    /// Verdict.
    pub verdict: Verdict,
    /// Beams, in order of fraction group item and reference item; unreferenced beams last.
    pub beams: Vec<BeamEntry>,
    /// Findings, in order of check and beam.
    pub findings: Vec<Finding>,
    /// Whether a model that was used is invented.
    pub uses_invented_model: bool,
}

/// What became of a file.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case", tag = "outcome", content = "of")]
pub enum FileOutcome {
    /// Audited.
    Audited,
    /// Used as a companion of a plan.
    Used,
    /// Nothing in it for this program (brachytherapy).
    NotApplicable,
    /// A kind this program does not support.
    NotSupported,
    /// The same plan and the same bytes as this file.
    DuplicateOf(String),
    /// Could not be read.
    Unreadable,
    /// No plan: counted and passed over.
    PassedOver,
}

/// One file.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct FileEntry {
    /// File, as it was given or found.
    pub file: String,
    /// Size, bytes.
    pub size_bytes: Option<u64>,
    /// SHA-256, hex.
    pub sha256: Option<String>,
    /// plan, brachy-plan, ion-plan, structure-set, ct, dose, record, other-dicom, not-dicom.
    pub kind: Option<&'static str>,
    /// What became of it.
    #[serde(flatten)]
    pub outcome: FileOutcome,
    /// Why.
    pub message: String,
}

/// A model that the run had on offer.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ModelUse {
    /// Folder name.
    pub name: String,
    /// Machine names that it serves.
    pub serves: Vec<String>,
    /// SHA-256 over its files, hex.
    pub fingerprint: String,
    /// `measured`, `published` or `invented`.
    pub origin: &'static str,
    /// By whom and when.
    pub provenance: String,
    /// Approval in words, or that there is none.
    pub approval: String,
    /// Whether the approval holds on the day of the run.
    pub approved: bool,
}

/// What was run, known before the first plan.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Run {
    /// Identifier carried by every output of the run.
    pub run_id: String,
    /// Version of the program.
    pub version: String,
    /// Start of the run, ISO 8601 with zone.
    pub started: String,
    /// Paths as typed.
    pub inputs: Vec<String>,
    /// Options as `name = value (from)` lines.
    pub options: Vec<String>,
    /// Where the site settings came from.
    pub site_source: SiteSource,
    /// The site settings in force.
    pub site: Site,
    /// The models on offer.
    pub models: Vec<ModelUse>,
}

/// A count by word.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Count {
    /// The word.
    pub term: &'static str,
    /// How many.
    pub count: u64,
}

/// What came out, known after the last plan.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct RunSummary {
    /// Files by kind of outcome.
    pub files: Vec<Count>,
    /// Plans by verdict.
    pub plans: Vec<Count>,
    /// Beams by verdict.
    pub beams: Vec<Count>,
    /// Findings by severity.
    pub findings: Vec<Count>,
    /// Plan files that could not be read.
    pub unreadable_plans: u64,
    /// Models (by name) that a plan of this run was calculated with.
    pub models_used: Vec<String>,
    /// Models (by name) that were used and are invented.
    pub invented_models: Vec<String>,
    /// Models (by name) that were used and are not approved on the day of the run.
    pub unapproved_models: Vec<String>,
    /// Checks that the site switched off.
    pub checks_off: Vec<String>,
    /// Whether everything that had to be verified was.
    pub complete: bool,
    /// Exit status and what it means, in words.
    pub exit: String,
}

impl FileOutcome {
    /// The word used in outputs.
    #[must_use]
    pub const fn term(&self) -> &'static str {
        match self {
            Self::Audited => "audited",
            Self::Used => "used",
            Self::NotApplicable => "not-applicable",
            Self::NotSupported => "not-supported",
            Self::DuplicateOf(_) => "duplicate-of",
            Self::Unreadable => "unreadable",
            Self::PassedOver => "passed-over",
        }
    }
}
