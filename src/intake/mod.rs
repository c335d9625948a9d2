//! Paths in; files in a stable order out, and every path that was passed over
//! with its reason. What a file holds is told by its content, in a later
//! stage; nothing here interprets one.

mod list;
mod read;
mod walk;

pub use list::paths_from_list;
pub use read::{Contents, FILE_CAP_BYTES, FileBytes, read_file};
pub use walk::{Found, IntakeError, find_files};
