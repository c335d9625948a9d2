//! Counting as results pass by, so that no result need be kept for it.

use std::collections::{BTreeMap, BTreeSet};

use crate::audit::{Count, FileEntry, FileOutcome, ModelUse, PlanEntry, RunSummary, Verdict};
use crate::settings::Severity;

/// Counts of a run so far.
#[derive(Clone, Debug, Default)]
pub struct Tally {
    files: BTreeMap<&'static str, u64>,
    plans: BTreeMap<Verdict, u64>,
    beams: BTreeMap<Verdict, u64>,
    findings: BTreeMap<Severity, u64>,
    unreadable_plans: u64,
    models_used: BTreeSet<String>,
}

impl Tally {
    /// Counts a file. A file that may be a plan and could not be read makes the audit incomplete.
    pub fn file(&mut self, entry: &FileEntry) {
        *self.files.entry(entry.outcome.term()).or_default() += 1;
        if entry.outcome == FileOutcome::Unreadable {
            self.unreadable_plans += 1;
        }
    }

    /// Counts a plan; `models` are the names of the models it was calculated with.
    pub fn plan(&mut self, entry: &PlanEntry, models: &[String]) {
        *self.plans.entry(entry.verdict).or_default() += 1;
        for beam in &entry.beams {
            *self.beams.entry(beam.verdict).or_default() += 1;
        }
        for finding in &entry.findings {
            *self.findings.entry(finding.severity).or_default() += 1;
        }
        self.models_used.extend(models.iter().cloned());
    }

    /// Plans with this verdict.
    #[must_use]
    pub fn plans_with(&self, verdict: Verdict) -> u64 {
        self.plans.get(&verdict).copied().unwrap_or(0)
    }

    /// Beams with this verdict.
    #[must_use]
    pub fn beams_with(&self, verdict: Verdict) -> u64 {
        self.beams.get(&verdict).copied().unwrap_or(0)
    }

    /// Findings of this severity.
    #[must_use]
    pub fn findings_of(&self, severity: Severity) -> u64 {
        self.findings.get(&severity).copied().unwrap_or(0)
    }

    /// Files that may be plans and could not be read.
    #[must_use]
    pub const fn unreadable_plans(&self) -> u64 {
        self.unreadable_plans
    }

    /// Whether everything that had to be verified was.
    #[must_use]
    pub fn is_complete(&self, models: &[ModelUse]) -> bool {
        self.unreadable_plans == 0
            && self.plans_with(Verdict::NotVerifiable) == 0
            && self.beams_with(Verdict::NotVerifiable) == 0
            && self.unapproved(models).is_empty()
    }

    fn unapproved(&self, models: &[ModelUse]) -> Vec<String> {
        self.used(models, |model| !model.approved)
    }

    fn used(&self, models: &[ModelUse], which: impl Fn(&ModelUse) -> bool) -> Vec<String> {
        models
            .iter()
            .filter(|model| self.models_used.contains(&model.name) && which(model))
            .map(|model| model.name.clone())
            .collect()
    }

    /// The summary; `exit` is the status in words.
    #[must_use]
    pub fn summary(
        &self,
        models: &[ModelUse],
        checks_off: Vec<String>,
        exit: String,
    ) -> RunSummary {
        let verdicts = |counts: &BTreeMap<Verdict, u64>| {
            counts
                .iter()
                .rev()
                .map(|(verdict, &count)| Count {
                    term: verdict.term(),
                    count,
                })
                .collect()
        };
        RunSummary {
            files: self
                .files
                .iter()
                .map(|(&term, &count)| Count { term, count })
                .collect(),
            plans: verdicts(&self.plans),
            beams: verdicts(&self.beams),
            findings: self
                .findings
                .iter()
                .rev()
                .map(|(severity, &count)| Count {
                    term: severity.term(),
                    count,
                })
                .collect(),
            unreadable_plans: self.unreadable_plans,
            models_used: self.models_used.iter().cloned().collect(),
            invented_models: self.used(models, |model| model.origin == "invented"),
            unapproved_models: self.unapproved(models),
            checks_off,
            complete: self.is_complete(models),
            exit,
        }
    }
}
