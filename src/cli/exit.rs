//! Exit statuses: the one table.

use super::fail_on::FailOn;
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

    /// What it means for an audit that was told to fail on this level.
    pub(super) const fn of_level(self, fail_on: FailOn) -> &'static str {
        match (self, fail_on) {
            (Self::Within, FailOn::Tolerance) => {
                "every treatment beam was verified and is within tolerance, and no finding is above a note"
            }
            (Self::Within, FailOn::Action) => {
                "every treatment beam was verified, and no deviation or finding reaches beyond the action level (--fail-on action: beyond tolerance does not count)"
            }
            (Self::Within, FailOn::Never) => {
                "every treatment beam was verified; whether deviations are within is not judged by this status (--fail-on never)"
            }
            (Self::Beyond, FailOn::Action) => {
                "a deviation or a finding is beyond the action level (--fail-on action)"
            }
            (Self::Beyond, _) => {
                "a deviation or a finding is beyond tolerance (--fail-on tolerance)"
            }
            (Self::Failed | Self::Incomplete, _) => self.meaning(),
        }
    }

    /// The status in a sentence, with the other that holds beside it.
    pub(super) fn sentence(self, fail_on: FailOn, complete: Completeness) -> String {
        let beside = match (self, complete) {
            (Self::Beyond, Completeness::Incomplete) => {
                format!(" Status {} holds as well.", Self::Incomplete.status())
            }
            _ => String::new(),
        };
        format!(
            "Exit status {}: {}.{beside}",
            self.status(),
            self.of_level(fail_on)
        )
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

/// Whether everything that had to be verified was.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Completeness {
    /// It was.
    Complete,
    /// Something was not.
    Incomplete,
}

impl Completeness {
    pub(super) fn of_audit(tally: &Tally, models: &[ModelUse]) -> Self {
        if tally.is_complete(models) {
            Self::Complete
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
