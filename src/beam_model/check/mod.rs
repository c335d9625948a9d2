//! Whether a beam model that loads is also plausible: shape and range rules,
//! single cells that stand out, the published kernel as a band, approval. What
//! cannot be loaded at all is refused earlier; recomputing proof points needs
//! the dose stage and is not done here.

mod depth_cells;
mod depth_table;
mod off_axis;
mod outlier;
mod output;
mod quality;
mod shaped;
mod sweep;
mod wedge;
mod whole;

pub use quality::tpr20_10_from_pdd20_10;
use serde::Serialize;

use super::{Grid, MachineModel};

/// How much a finding matters.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum ModelSeverity {
    /// Worth knowing.
    Note,
    /// A person has to look and decide.
    Warning,
    /// Physically impossible or certainly wrong: do not use the model.
    Error,
}

/// Where in a table a finding lies.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct TablePlace {
    /// Row coordinate, such as `depth_cm`.
    pub row_name: &'static str,
    /// Its value.
    pub row: f64,
    /// Column coordinate and value; `None` for a table of one column or a whole row.
    pub column: Option<(&'static str, f64)>,
}

impl std::fmt::Display for TablePlace {
    fn fmt(&self, out: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(out, "{} {}", self.row_name, self.row)?;
        if let Some((name, value)) = self.column {
            write!(out, ", {name} {value}")?;
        }
        Ok(())
    }
}

/// One thing that the check found.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ModelFinding {
    /// How much it matters.
    pub severity: ModelSeverity,
    /// Label of the beam; `None` for the machine as a whole.
    pub beam: Option<String>,
    /// Table, such as `6/tpr.csv`.
    pub table: Option<String>,
    /// Where in the table.
    pub place: Option<TablePlace>,
    /// What was found, in a sentence.
    pub message: String,
    /// The value found.
    pub measured: Option<f64>,
    /// The value or bound that it was held against.
    pub limit: Option<f64>,
}

impl ModelFinding {
    fn new(severity: ModelSeverity, message: impl Into<String>) -> Self {
        Self {
            severity,
            beam: None,
            table: None,
            place: None,
            message: message.into(),
            measured: None,
            limit: None,
        }
    }

    fn note(message: impl Into<String>) -> Self {
        Self::new(ModelSeverity::Note, message)
    }

    fn warning(message: impl Into<String>) -> Self {
        Self::new(ModelSeverity::Warning, message)
    }

    fn error(message: impl Into<String>) -> Self {
        Self::new(ModelSeverity::Error, message)
    }

    fn measured(mut self, value: f64) -> Self {
        self.measured = Some(value);
        self
    }

    fn limit(mut self, value: f64) -> Self {
        self.limit = Some(value);
        self
    }

    fn in_table(mut self, grid: &Grid) -> Self {
        self.table = Some(grid.name().to_owned());
        self
    }

    fn at(mut self, grid: &Grid, row: f64, column: Option<f64>) -> Self {
        self.place = Some(TablePlace {
            row_name: grid.row_name(),
            row,
            column: column.map(|value| (grid.column_name(), value)),
        });
        self.in_table(grid)
    }
}

impl std::fmt::Display for ModelFinding {
    fn fmt(&self, out: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let severity = match self.severity {
            ModelSeverity::Note => "note",
            ModelSeverity::Warning => "warning",
            ModelSeverity::Error => "error",
        };
        write!(out, "{severity}: ")?;
        if let Some(beam) = &self.beam {
            write!(out, "beam {beam}: ")?;
        }
        if let Some(table) = &self.table {
            write!(out, "{table}: ")?;
        }
        if let Some(place) = &self.place {
            write!(out, "{place}: ")?;
        }
        write!(out, "{}", self.message)
    }
}

/// Everything that the rules find in a machine's model on a day: the machine first, then beam by beam.
#[must_use]
pub fn check_machine(machine: &MachineModel, today: jiff::civil::Date) -> Vec<ModelFinding> {
    let mut findings = whole::check(machine, today);
    for beam in &machine.beams {
        let of_beam = [
            whole::check_beam(machine, beam),
            quality::check(machine, beam),
            depth_table::check(beam),
            depth_cells::check(beam),
            output::check(beam),
            off_axis::check(beam),
            shaped::check(machine, beam),
            wedge::check(machine, beam),
        ];
        findings.extend(of_beam.into_iter().flatten().map(|mut finding| {
            finding.beam = Some(beam.label.clone());
            finding
        }));
    }
    findings
}
