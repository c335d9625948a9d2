//! What the reader noticed: each note has a place (attribute path with tag), a
//! kind that the plan checks select by, and an effect on what may still be
//! calculated. Severity is not decided here; that is the site's.

use serde::Serialize;

/// What part of the plan a note is about.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum NoteScope {
    /// The plan as a whole.
    Plan,
    /// A fraction group, by item index.
    FractionGroup(usize),
    /// A beam, by item index in `Plan::beams` (numbers may repeat).
    Beam(usize),
}

/// What a note is about; the plan checks select by this.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum NoteKind {
    /// The same attribute twice in one data set, or twice one beam limiting axis.
    RepeatedAttribute,
    /// A beam, fraction group or dose reference number that stands twice.
    RepeatedNumber,
    /// A reference to something that is not in the plan.
    DanglingReference,
    /// A value that cannot be read as what the standard says it is.
    MalformedValue,
    /// A value outside its credible range.
    IncredibleValue,
    /// A stated count that differs from the items that are there.
    CountMismatch,
    /// Cumulative meterset weights that fall, do not start at 0, or do not end at the final weight; a final weight of zero.
    MetersetWeights,
    /// An attribute without which the beam cannot be calculated.
    MissingValue,
    /// An opening that is closed or inverted, leaves out of order.
    Aperture,
    /// Something that the standard allows but that this program does not cover.
    Unsupported,
    /// Worth showing, no more (retired attribute used, fluence mode not stated, wrong transfer syntax declared ...).
    Remark,
}

/// What a note stops.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Effect {
    /// Nothing: the value concerned is shown or absent, the rest holds.
    None,
    /// The beam (of a beam scope) or every beam of the group (of a group scope) cannot be verified.
    BlocksScope,
    /// No beam of the plan can be verified.
    BlocksPlan,
}

/// One thing the reader noticed.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ReadingNote {
    /// What it is about.
    pub scope: NoteScope,
    /// What kind of thing it is.
    pub kind: NoteKind,
    /// What it stops.
    pub effect: Effect,
    /// Attribute path with tag, such as `BeamSequence[2].SourceAxisDistance (300A,00B4)`.
    pub place: String,
    /// One sentence: what is there and what to do.
    pub message: String,
    /// What was found, when it is one value.
    pub measured: Option<String>,
    /// What was expected, when it is one value or range.
    pub limit: Option<String>,
}
