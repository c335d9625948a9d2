//! Rows of the user's depth table while a run goes on: which belong to a plan,
//! and which no beam has used. Reading the table is done elsewhere.

use std::collections::{BTreeSet, HashMap};

use crate::audit::PlanEntry;
use crate::dose::DepthRow;

/// So many unused rows are named; a table for another folder may have thousands.
const NAMED: usize = 5;

/// The rows by SOP Instance UID.
#[derive(Debug, Default)]
pub(super) struct RowsByPlan(HashMap<String, Vec<DepthRow>>);

impl RowsByPlan {
    pub(super) fn new(rows: &[DepthRow]) -> Self {
        let mut by_plan: HashMap<String, Vec<DepthRow>> = HashMap::new();
        for row in rows {
            by_plan
                .entry(row.sop_instance_uid.clone())
                .or_default()
                .push(row.clone());
        }
        Self(by_plan)
    }

    /// The rows of the plan of this UID.
    pub(super) fn of(&self, uid: Option<&str>) -> &[DepthRow] {
        uid.and_then(|uid| self.0.get(uid))
            .map_or(&[], Vec::as_slice)
    }
}

/// Rows that no beam has used so far, by UID and beam number.
#[derive(Debug)]
pub(super) struct UnusedRows(BTreeSet<(String, i32)>);

impl UnusedRows {
    pub(super) fn new(rows: &[DepthRow]) -> Self {
        let keys = rows
            .iter()
            .map(|row| (row.sop_instance_uid.clone(), row.beam_number));
        Self(keys.collect())
    }

    /// Strikes off the rows of a plan's beams.
    pub(super) fn strike(&mut self, plan: &PlanEntry) {
        if self.0.is_empty() {
            return;
        }
        let Some(uid) = &plan.sop_instance_uid else {
            return;
        };
        for number in plan.beams.iter().filter_map(|beam| beam.beam_number) {
            self.0.remove(&(uid.clone(), number));
        }
    }

    /// The first of what is left, and how many more there are; `None` when nothing is.
    pub(super) fn in_words(&self) -> Option<String> {
        let named: Vec<String> = self
            .0
            .iter()
            .take(NAMED)
            .map(|(uid, number)| format!("beam {number} of {uid}"))
            .collect();
        match self.0.len().checked_sub(named.len()) {
            _ if named.is_empty() => None,
            None | Some(0) => Some(named.join(", ")),
            Some(more) => Some(format!("{} (and {more} rows more)", named.join(", "))),
        }
    }
}
