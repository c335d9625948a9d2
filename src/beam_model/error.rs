//! What can go wrong while a beam model is loaded, always with its place.

use std::path::{Path, PathBuf};

use thiserror::Error;

use super::GridError;

/// Why a beam model was refused. Every variant names the file; tables name line and cell.
#[derive(Debug, Error)]
pub enum ModelError {
    /// A file or folder that cannot be read.
    #[error("{path}: cannot be read")]
    Read {
        /// The file or folder.
        path: PathBuf,
        /// Why.
        source: std::io::Error,
    },
    /// A file beyond the size that a table can sensibly have.
    #[error("{path}: larger than {limit_bytes} bytes, which no table of a model needs")]
    TooLarge {
        /// The file.
        path: PathBuf,
        /// Greatest size accepted.
        limit_bytes: u64,
    },
    /// A file that is not UTF-8 text.
    #[error("{path}, line {line}: not UTF-8 text")]
    NotText {
        /// The file.
        path: PathBuf,
        /// Line of the first wrong byte, from 1.
        line: usize,
    },
    /// A table file named in `machine.toml` that lies outside the model's folder.
    #[error("{path}: the file `{named}` must lie inside the model's folder")]
    Outside {
        /// The `machine.toml`.
        path: PathBuf,
        /// The file name as written there.
        named: String,
    },
    /// `machine.toml` is not TOML, has an unknown key, lacks one, or a value is out of its range.
    #[error("{path}, line {line}: {message}")]
    Toml {
        /// The `machine.toml`.
        path: PathBuf,
        /// Line, from 1.
        line: usize,
        /// What is wrong.
        message: String,
    },
    /// Keys of `machine.toml` that do not go together.
    #[error("{path}, {key}: {message}")]
    Setting {
        /// The `machine.toml`.
        path: PathBuf,
        /// The key, such as `beams 6, depth_table.ssd_cm`.
        key: String,
        /// What is wrong.
        message: String,
    },
    /// A table whose cell is wrong.
    #[error("{path}, line {line}, {cell}: {message}")]
    Table {
        /// The CSV file.
        path: PathBuf,
        /// Line, from 1, comments included.
        line: u64,
        /// The cell: its row and column as the table names them.
        cell: String,
        /// What is wrong.
        message: String,
    },
    /// A table that is wrong as a whole.
    #[error("{path}: {message}")]
    WholeTable {
        /// The CSV file.
        path: PathBuf,
        /// What is wrong.
        message: String,
    },
    /// A table that the interpolation refuses.
    #[error("{path}: the table cannot be used")]
    Grid {
        /// The CSV file.
        path: PathBuf,
        /// Why.
        source: GridError,
    },
    /// A folder without any model.
    #[error("{folder}: no beam model there (no folder with a machine.toml)")]
    NoModels {
        /// The folder.
        folder: PathBuf,
    },
    /// One treatment machine name claimed by two models.
    #[error("the machine name `{name}` is served by two beam models: {first} and {second}")]
    SharedName {
        /// The treatment machine name.
        name: String,
        /// One `machine.toml`.
        first: PathBuf,
        /// The other.
        second: PathBuf,
    },
}

impl ModelError {
    pub(super) fn setting(path: &Path, key: impl Into<String>, message: impl Into<String>) -> Self {
        Self::Setting {
            path: path.to_path_buf(),
            key: key.into(),
            message: message.into(),
        }
    }

    pub(super) fn whole_table(path: &Path, message: impl Into<String>) -> Self {
        Self::WholeTable {
            path: path.to_path_buf(),
            message: message.into(),
        }
    }
}
