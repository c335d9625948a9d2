//! The report against its own promises: documented columns, harmless cells,
//! valid JSON, a page that escapes and needs no network, whole or not at all.

mod folder;
mod moving;
mod page;
mod record;
mod sample;
mod tables;
mod texts;
