//! The order in which the page names what needs a person: worst first, what
//! could not be verified beside what deviates; and a list that keeps only the
//! worst. Verdicts and severities are given.

use std::cmp::Ordering;
use std::collections::BTreeMap;

use crate::audit::{BeamEntry, PlanEntry, Verdict};
use crate::report::table::judged_percent;
use crate::settings::Severity;

/// How urgent something is; the earlier, the worse.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Class {
    BeyondAction,
    ActionFinding,
    NotVerifiable,
    BeyondTolerance,
    ToleranceFinding,
    /// Needs nobody.
    Calm,
}

/// Place in the order: class, then size of the deviation, then the order of files and beams.
#[derive(Clone, Copy, Debug)]
pub(super) struct Urgency {
    pub(super) class: Class,
    /// Size of the deviation, per cent; 0 where it plays no part.
    pub(super) size_percent: f64,
    /// Running number of the entry within the run.
    pub(super) entry: u64,
    /// Position within the entry.
    pub(super) position: usize,
}

impl Urgency {
    pub(super) const fn new(class: Class, entry: u64, position: usize) -> Self {
        Self {
            class,
            size_percent: 0.0,
            entry,
            position,
        }
    }
}

impl Ord for Urgency {
    fn cmp(&self, other: &Self) -> Ordering {
        self.class
            .cmp(&other.class)
            .then(other.size_percent.total_cmp(&self.size_percent))
            .then(self.entry.cmp(&other.entry))
            .then(self.position.cmp(&other.position))
    }
}

impl PartialOrd for Urgency {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl PartialEq for Urgency {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}

impl Eq for Urgency {}

/// The urgency of a verdict.
pub(super) const fn of_verdict(verdict: Verdict) -> Class {
    match verdict {
        Verdict::BeyondAction => Class::BeyondAction,
        Verdict::NotVerifiable => Class::NotVerifiable,
        Verdict::BeyondTolerance => Class::BeyondTolerance,
        Verdict::Within | Verdict::NotTreated | Verdict::NotApplicable => Class::Calm,
    }
}

/// The urgency of a beam.
pub(super) fn of_beam(beam: &BeamEntry, entry: u64, position: usize) -> Urgency {
    let class = of_verdict(beam.verdict);
    let size_percent = match class {
        Class::BeyondAction | Class::BeyondTolerance => judged_percent(beam)
            .or(beam.deviation_percent)
            .map_or(0.0, f64::abs),
        _ => 0.0,
    };
    Urgency {
        class,
        size_percent,
        entry,
        position,
    }
}

/// The urgency of a plan's worst finding.
pub(super) fn of_findings(plan: &PlanEntry) -> Class {
    match plan.findings.iter().map(|finding| finding.severity).max() {
        Some(Severity::Action) => Class::ActionFinding,
        Some(Severity::Tolerance) => Class::ToleranceFinding,
        Some(Severity::Note) | None => Class::Calm,
    }
}

/// The urgency of a plan: that of the worst thing in it.
pub(super) fn of_plan(plan: &PlanEntry, entry: u64) -> Urgency {
    let itself = Urgency::new(of_verdict(plan.verdict).min(of_findings(plan)), entry, 0);
    let beams = plan.beams.iter().map(|beam| of_beam(beam, entry, 0));
    beams.fold(itself, Urgency::min)
}

/// Keeps the most urgent of what it is given, and counts the rest.
#[derive(Debug)]
pub(super) struct Worst<T> {
    most: usize,
    kept: BTreeMap<Urgency, T>,
    given: u64,
}

impl<T> Worst<T> {
    pub(super) const fn new(most: usize) -> Self {
        Self {
            most,
            kept: BTreeMap::new(),
            given: 0,
        }
    }

    /// Keeps what `make` makes when it is among the most urgent so far.
    pub(super) fn offer(&mut self, urgency: Urgency, make: impl FnOnce() -> T) {
        self.given += 1;
        if self.kept.len() >= self.most {
            match self.kept.last_key_value() {
                Some((last, _)) if urgency < *last => {
                    self.kept.pop_last();
                }
                _ => return,
            }
        }
        self.kept.insert(urgency, make());
    }

    /// How many were given.
    pub(super) const fn given(&self) -> u64 {
        self.given
    }

    /// How many were given and not kept.
    pub(super) fn left_out(&self) -> u64 {
        self.given.saturating_sub(self.kept.len() as u64)
    }

    /// What was kept, worst first.
    pub(super) fn iter(&self) -> impl Iterator<Item = (&Urgency, &T)> {
        self.kept.iter()
    }
}
