//! Judgement: comparison with the plan's claim, verdicts, plan checks. Every
//! beam gets exactly one entry per fraction group. Nothing here opens a file
//! or prints.

pub mod checks;
mod compare;
mod entry;
mod group;
mod levels;
mod plan_entry;
mod prescription;
mod rivals;

pub use entry::{
    BeamEntry, Count, FileEntry, FileOutcome, Finding, Judgement, ModelUse, PlanEntry, Run,
    RunSummary, SharedPointSum, Verdict,
};
pub use plan_entry::{PlanInput, audit_plan};
pub use rivals::Rivals;
