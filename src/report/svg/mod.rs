//! A small way to draw: scales with sensible ticks, and a drawing that escapes
//! what it is given and rounds coordinates to hundredths. Colours and line
//! weights are classes of the page's style sheet, so that print and dark mode
//! need no second drawing. What is drawn is decided in `report::page`.

mod drawing;
mod png;
mod scale;

pub(super) use drawing::{Anchor, Drawing};
pub(super) use png::grey_picture;
pub(super) use scale::{Scale, tick_step};
