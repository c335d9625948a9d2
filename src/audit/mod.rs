//! Judgement: comparison with the plan's claim, verdicts, plan checks. Every
//! beam gets exactly one entry. Nothing here opens a file or prints.

mod entry;

pub use entry::{
    BeamEntry, Count, FileEntry, FileOutcome, Finding, Judgement, ModelUse, PlanEntry, Run,
    RunSummary, SharedPointSum, Verdict,
};
