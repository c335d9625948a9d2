//! One table of columns feeds header, rows and data dictionary.

use super::Cell;

/// One column. `G` is the function that takes a row to the column's cell.
#[derive(Clone, Copy, Debug)]
pub(in crate::report) struct Column<G> {
    /// Name in the header, with the unit.
    pub(in crate::report) name: &'static str,
    /// What stands there, for the data dictionary.
    pub(in crate::report) meaning: &'static str,
    /// The cell of a row.
    pub(in crate::report) cell: G,
}

/// A column of the data dictionary.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ColumnMeaning {
    /// Name in the header, with the unit.
    pub name: &'static str,
    /// What stands there.
    pub meaning: &'static str,
}

/// A table of the data dictionary.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct TableMeaning {
    /// File name.
    pub file: &'static str,
    /// What one row is.
    pub row: &'static str,
    /// Its columns, in order.
    pub columns: Vec<ColumnMeaning>,
}

pub(super) fn describe<G>(
    file: &'static str,
    row: &'static str,
    columns: &[Column<G>],
) -> TableMeaning {
    let columns = columns
        .iter()
        .map(|column| ColumnMeaning {
            name: column.name,
            meaning: column.meaning,
        })
        .collect();
    TableMeaning { file, row, columns }
}

/// The header row.
pub(in crate::report) fn header<G>(columns: &[Column<G>]) -> Vec<&'static str> {
    columns.iter().map(|column| column.name).collect()
}

/// Renders the cells of one row.
pub(in crate::report) fn render<G>(
    columns: &[Column<G>],
    cell: impl Fn(&G) -> Cell,
) -> Vec<String> {
    columns
        .iter()
        .map(|column| cell(&column.cell).render())
        .collect()
}
