//! A dynamic wedge whose plan states the field and no motion: from the beam
//! model's sweep to the motion of the jaw in this field.
//!
//! S(p) is the share of the full sweep's meterset that has been delivered when the moving jaw passes the position p
//! (isocentre plane, positive towards the thin end). The jaw comes from the thick end, so a place p is open until the
//! jaw passes it: with the whole sweep its fluence is S(p) of that of an open field.
//!
//! **A smaller angle** theta than the sweep's own A is made of that sweep and an open field, weighted by what they
//! give on the central axis: w = tan(theta) / tan(A) of A and 1 - w of open,
//!
//! ```text
//! F(p) / F(0) = w S(p) / S(0) + (1 - w)        so, in units of the full sweep,   S'(p) = w S(p) + (1 - w) S(0)
//! ```
//!
//! which is not a share of the MU: S(0) of an open field gives as much on the axis as the whole sweep does. (That the
//! weight is that of the tangents, and of the axis, is common practice for such wedges.)
//!
//! **A field** has its open jaw at p1 and the opposed one, which stands, at p2. It uses the part of the sweep from p1 to
//! e = p2 - gap. S'(p1) is delivered before the jaw moves; at e the beam ends, so its meterset is S'(e), and the share
//! of it with the jaw short of p is
//!
//! ```text
//! share(p) = S'(p) / S'(e),   p1 <= p <= e
//! ```
//!
//! which is also the fluence at p per MU of the beam; between e and p2 it is 1. The table is linear between its rows, so
//! a jaw that moves evenly from row to row delivers exactly this. What such a motion does to the dose is integrated in
//! `shaped`; what is told about it stands in `field` and `words`.

mod field;
mod motion;
mod planned;
mod words;

pub(super) use field::calculate_swept;
pub(super) use planned::{PlannedSweep, motion_beside_sweep};
