//! What an audit leaves behind: four CSV tables, `audit.json` and one page, all
//! written whole or not at all; the page and text of a beam model; and the
//! plain texts of `field` and `read`.
//! Nothing here recomputes or judges: numbers and sentences come from `audit`,
//! `dose` and `plan` as they are. Printing is the work of `cli`.

mod base64;
mod error;
mod field_text;
mod folder;
mod json;
mod model_page;
mod model_text;
mod number;
mod page;
mod plain_text;
mod plan_text;
mod svg;
mod table;
mod target;
mod writer;

pub use error::ReportError;
pub use field_text::trace_text;
pub use folder::REPORT_FILES;
pub use model_page::model_page;
pub use model_text::model_check_text;
pub use plan_text::{ControlPointDetail, plan_text};
pub use table::{ColumnMeaning, TableMeaning, data_dictionary, harmless, plain_decimal};
pub use target::{TargetState, target_state};
pub use writer::{ReportWriter, Written};

/// Every version of the record that this program has written begins so.
const SCHEMA_FAMILY: &str = "counterfoil.audit/";

/// Schema of `audit.json`.
pub const SCHEMA: &str = "counterfoil.audit/1";
