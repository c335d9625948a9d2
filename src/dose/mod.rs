//! Plan, model and point in; a trace of factors out. No I/O, no logging, no
//! rounding. What a deviation means is judged in `audit`.

mod outcome;
mod trace;

pub use outcome::{
    BeamCalculation, BeamView, BlockOutline, DepthBasis, DepthCandidate, DosePoint, LeafOpening,
    Method, Obstacle, ObstacleKind, PointBasis, Spread, SpreadTerm, Squares, Technique,
};
pub use trace::{Factor, FactorName, Input, Trace};
