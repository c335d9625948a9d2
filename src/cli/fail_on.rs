//! What --fail-on can name.

use clap::ValueEnum;

/// From which level on the exit status is 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(super) enum FailOn {
    /// Beyond tolerance
    Tolerance,
    /// Beyond the action level only
    Action,
    /// Never
    Never,
}

impl FailOn {
    /// The word as typed.
    pub(super) const fn word(self) -> &'static str {
        match self {
            Self::Tolerance => "tolerance",
            Self::Action => "action",
            Self::Never => "never",
        }
    }
}
