//! CSV tables of a model as numbers with their lines: comments, header, cells,
//! each error with line and cell. What the numbers mean, and their
//! normalisation, is for `load_beam`.

use std::path::{Path, PathBuf};

use super::ModelError;

/// A table of numbers under a header of texts.
pub(super) struct TableFile {
    /// The CSV file, for messages.
    pub(super) path: PathBuf,
    header_line: u64,
    /// Header texts, the one of the row coordinate first.
    pub(super) header: Vec<String>,
    /// Row coordinates, rising.
    pub(super) rows: Vec<f64>,
    /// Line of each row.
    lines: Vec<u64>,
    /// Row-major, without the row coordinate.
    pub(super) values: Vec<f64>,
}

/// Least and greatest value that a coordinate or cell may have.
#[derive(Clone, Copy)]
pub(super) struct Bounds {
    pub(super) least: f64,
    pub(super) greatest: f64,
}

impl Bounds {
    fn hold(self, value: f64) -> bool {
        value >= self.least && value <= self.greatest
    }

    fn objection(self, value: f64) -> String {
        let Self { least, greatest } = self;
        format!("{value} is outside the credible range {least} to {greatest}")
    }
}

impl TableFile {
    /// Reads a table whose first header cell is `row_name`.
    pub(super) fn parse(path: &Path, text: &str, row_name: &str) -> Result<Self, ModelError> {
        let body_start = leading_comments(text);
        let comment_lines = text
            .get(..body_start)
            .map_or(0, |comments| comments.matches('\n').count() as u64);
        let body = text.get(body_start..).unwrap_or_default();
        let mut reader = csv::ReaderBuilder::new()
            .has_headers(false)
            .flexible(true)
            .trim(csv::Trim::All)
            .from_reader(body.as_bytes());
        let mut table = Self {
            path: path.to_path_buf(),
            header_line: 0,
            header: Vec::new(),
            rows: Vec::new(),
            lines: Vec::new(),
            values: Vec::new(),
        };
        for record in reader.records() {
            let record = record.map_err(|error| {
                ModelError::whole_table(path, format!("not a readable CSV table: {error}"))
            })?;
            let line = comment_lines + record.position().map_or(0, csv::Position::line);
            if table.header.is_empty() {
                table.header_line = line;
                table.take_header(&record, row_name)?;
            } else {
                table.take_row(&record, line)?;
            }
        }
        if table.rows.len() < 2 {
            return Err(ModelError::whole_table(
                path,
                "a table needs a header row and at least two rows",
            ));
        }
        Ok(table)
    }

    fn take_header(
        &mut self,
        record: &csv::StringRecord,
        row_name: &str,
    ) -> Result<(), ModelError> {
        let first = record.get(0).unwrap_or_default();
        if first != row_name {
            let hint = if first.contains(';') {
                "; columns are separated by commas, decimals by a dot"
            } else {
                ""
            };
            return Err(self.header_error(
                first,
                format!("the header row must start with `{row_name}`{hint}"),
            ));
        }
        self.header = record.iter().map(str::to_owned).collect();
        if self.header.len() < 2 {
            return Err(self.header_error(first, "there are no columns beside the first"));
        }
        Ok(())
    }

    fn take_row(&mut self, record: &csv::StringRecord, line: u64) -> Result<(), ModelError> {
        let row_text = record.get(0).unwrap_or_default();
        let row_name = self.header.first().map_or("", String::as_str);
        if record.len() != self.header.len() {
            let hint = if record.len() > self.header.len() {
                " (a decimal comma would do that: decimals are written with a dot)"
            } else {
                ""
            };
            return Err(self.error(
                line,
                format!("row `{row_text}`"),
                format!(
                    "{} cells where the header has {}{hint}",
                    record.len(),
                    self.header.len()
                ),
            ));
        }
        for (index, (text, column)) in record.iter().zip(&self.header).enumerate() {
            let number = parse_number(text).map_err(|message| {
                let cell = if index == 0 {
                    row_name.to_owned()
                } else {
                    format!("{row_name} {row_text}, column `{column}`")
                };
                self.error(line, cell, message)
            })?;
            if index == 0 {
                self.rows.push(number);
            } else {
                self.values.push(number);
            }
        }
        self.lines.push(line);
        if let [.., before, after] = *self.rows
            && after <= before
        {
            return Err(self.error(
                line,
                row_name.to_owned(),
                format!("must rise from row to row, but {after} follows {before}"),
            ));
        }
        Ok(())
    }

    /// The column headers as numbers that rise and lie within bounds.
    pub(super) fn column_numbers(&self, bounds: Bounds) -> Result<Vec<f64>, ModelError> {
        let mut numbers: Vec<f64> = Vec::new();
        for text in self.header.iter().skip(1) {
            let number = parse_number(text).map_err(|message| self.header_error(text, message))?;
            if !bounds.hold(number) {
                return Err(self.header_error(text, bounds.objection(number)));
            }
            if let Some(&before) = numbers.last()
                && number <= before
            {
                return Err(self.header_error(
                    text,
                    format!("must rise from column to column, but {number} follows {before}"),
                ));
            }
            numbers.push(number);
        }
        Ok(numbers)
    }

    /// Refuses row coordinates outside their bounds.
    pub(super) fn bound_rows(&self, bounds: Bounds) -> Result<(), ModelError> {
        for (&number, &line) in self.rows.iter().zip(&self.lines) {
            if !bounds.hold(number) {
                let row_name = self.header.first().map_or("", String::as_str);
                return Err(self.error(line, row_name.to_owned(), bounds.objection(number)));
            }
        }
        Ok(())
    }

    /// Refuses cells outside their bounds.
    pub(super) fn bound_values(&self, bounds: Bounds) -> Result<(), ModelError> {
        let width = self.header.len() - 1;
        for (index, &value) in self.values.iter().enumerate() {
            if !bounds.hold(value) {
                return Err(self.cell_error(index / width, index % width, bounds.objection(value)));
            }
        }
        Ok(())
    }

    /// An error in a cell, by row and column index (without the row coordinate).
    pub(super) fn cell_error(
        &self,
        row: usize,
        column: usize,
        message: impl Into<String>,
    ) -> ModelError {
        let text = |index: usize| self.header.get(index).map_or("", String::as_str);
        let coordinate = self.rows.get(row).copied().unwrap_or(f64::NAN);
        self.error(
            self.lines.get(row).copied().unwrap_or(0),
            format!("{} {coordinate}, column `{}`", text(0), text(column + 1)),
            message,
        )
    }

    /// An error in a header cell.
    pub(super) fn header_error(&self, cell: &str, message: impl Into<String>) -> ModelError {
        self.error(self.header_line, format!("header `{cell}`"), message)
    }

    fn error(&self, line: u64, cell: String, message: impl Into<String>) -> ModelError {
        ModelError::Table {
            path: self.path.clone(),
            line,
            cell,
            message: message.into(),
        }
    }
}

/// Byte offset behind the leading lines that are empty or start with `#`.
fn leading_comments(text: &str) -> usize {
    let mut offset = 0;
    for line in text.split_inclusive('\n') {
        let trimmed = line.trim();
        if !trimmed.is_empty() && !trimmed.starts_with('#') {
            break;
        }
        offset += line.len();
    }
    offset
}

fn parse_number(text: &str) -> Result<f64, String> {
    if text.is_empty() {
        return Err("the cell is empty".to_owned());
    }
    match text.parse::<f64>() {
        Ok(number) if number.is_finite() => Ok(number),
        Ok(_) => Err(format!("`{text}` is not a finite number")),
        Err(_) if text.contains(',') && text.replace(',', ".").parse::<f64>().is_ok() => Err(
            format!("`{text}` has a decimal comma: decimals are written with a dot"),
        ),
        Err(_) => Err(format!("`{text}` is not a number")),
    }
}
