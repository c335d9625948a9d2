//! The four CSV tables: their columns, their cells, and the data dictionary
//! that comes from the same columns. Opening and renaming files is the work of
//! `report::folder`.

mod beams;
mod cell;
mod column;
mod files;
mod findings;
mod plans;

pub use cell::{harmless, plain_decimal};
pub use column::{ColumnMeaning, TableMeaning};

pub(super) use beams::{BEAM_COLUMNS, BeamRow, judged_percent};
pub(super) use cell::Cell;
pub(super) use column::{Column, header, render};
pub(super) use files::{FILE_COLUMNS, FileRow, message as file_message};
pub(super) use findings::{FINDING_COLUMNS, FindingRow};
pub(super) use plans::{PLAN_COLUMNS, PlanRow};

use super::folder::{BEAMS_CSV, FILES_CSV, FINDINGS_CSV, PLANS_CSV};
use column::describe;

/// The data dictionary: every table, every column, in order.
#[must_use]
pub fn data_dictionary() -> Vec<TableMeaning> {
    vec![
        describe(BEAMS_CSV, "one beam of one fraction group", BEAM_COLUMNS),
        describe(PLANS_CSV, "one plan", PLAN_COLUMNS),
        describe(FINDINGS_CSV, "one finding", FINDING_COLUMNS),
        describe(FILES_CSV, "one file that was looked at", FILE_COLUMNS),
    ]
}
