//! Exit statuses: the one table.

use super::args::FailOn;
use crate::audit::{ModelUse, Verdict};
use crate::batch::Tally;
use crate::settings::Severity;

/// How the program ends. When several hold: 2, then 1, then 3.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Exit {
    /// Everything verified and within.
    Within,
    /// Something beyond.
    Beyond,
    /// The run itself failed.
    Failed,
    /// The audit is incomplete.
    Incomplete,
}

impl Exit {
    /// The process's exit status.
    #[must_use]
    pub const fn status(self) -> u8 {
        match self {
            Self::Within => 0,
            Self::Beyond => 1,
            Self::Failed => 2,
            Self::Incomplete => 3,
        }
    }

    /// What it means.
    #[must_use]
    pub const fn meaning(self) -> &'static str {
        match self {
            Self::Within => "every treatment beam was verified and is within what --fail-on names",
            Self::Beyond => "a deviation or a finding is beyond what --fail-on names",
            Self::Failed => {
                "the run itself failed (usage, models, nothing to audit, output not writable)"
            }
            Self::Incomplete => {
                "the audit is incomplete: a plan could not be read, a treatment beam could not be verified, or a model is not approved"
            }
        }
    }

    /// The status of an audit from its counts.
    pub(super) fn of_audit(tally: &Tally, models: &[ModelUse], fail_on: FailOn) -> Self {
        let least = match fail_on {
            FailOn::Tolerance => Some((Verdict::BeyondTolerance, Severity::Tolerance)),
            FailOn::Action => Some((Verdict::BeyondAction, Severity::Action)),
            FailOn::Never => None,
        };
        let beyond = least.is_some_and(|(verdict, severity)| {
            [Verdict::BeyondTolerance, Verdict::BeyondAction]
                .into_iter()
                .filter(|one| *one >= verdict)
                .any(|one| tally.beams_with(one) + tally.plans_with(one) > 0)
                || [Severity::Tolerance, Severity::Action]
                    .into_iter()
                    .filter(|one| *one >= severity)
                    .any(|one| tally.findings_of(one) > 0)
        });
        if beyond {
            Self::Beyond
        } else if tally.is_complete(models) {
            Self::Within
        } else {
            Self::Incomplete
        }
    }
}

/// The table for `--help`.
pub(super) const HELP: &str = "\
Exit status:
  0  every treatment beam was verified and is within what --fail-on names
  1  a deviation or a finding is beyond what --fail-on names
  2  the run itself failed (usage, models, nothing to audit, output not writable)
  3  the audit is incomplete: a plan could not be read, a treatment beam could
     not be verified, or a model is not approved
When several hold: 2, then 1, then 3.

Counterfoil supports and does not replace a qualified physicist's review,
measurement, licensed practice and local rules.";
