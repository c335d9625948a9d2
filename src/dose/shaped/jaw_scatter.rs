//! Collimator scatter of the jaws at a moment, kept while the jaws stand still.

use super::opening::Opening;
use super::standing::{Standing, SumError};
use crate::beam_model::collimator_square;
use crate::dose::FactorName;
use crate::quantity::{CollimatorSquare, tolerance};

/// Head scatter of the jaws, kept while the jaws stand still.
pub(super) struct JawScatter {
    jaws_cm: [[f64; 2]; 2],
    pub(super) side_cm: f64,
    pub(super) sc: f64,
    pub(super) below_table: bool,
}

/// The head scatter of an opening's jaws.
pub(super) fn jaw_scatter<'j>(
    standing: &Standing<'_>,
    opening: &Opening,
    known: &'j mut Option<JawScatter>,
) -> Result<&'j JawScatter, SumError> {
    let stale = known
        .as_ref()
        .is_none_or(|known| known.jaws_cm != opening.jaws_cm);
    if stale {
        *known = Some(standing.jaw_scatter(opening.jaws_cm)?);
    }
    known.as_ref().ok_or(SumError::Missing("the jaws"))
}

impl Standing<'_> {
    /// Sc of a jaw opening. Jaws that close in the course of a moving field pass below the table's smallest
    /// opening: from there the two-source fit leads on, and the share of the dose that rests on it is told.
    fn jaw_scatter(&self, jaws_cm: [[f64; 2]; 2]) -> Result<JawScatter, SumError> {
        let [x, y] = jaws_cm.map(|jaw| jaw[1] - jaw[0]);
        let beam = self.beam();
        let table = &beam.output_factors.sc;
        let least_cm = table.rows().first().copied().unwrap_or_default();
        let closed = x <= tolerance::POSITION_CM || y <= tolerance::POSITION_CM;
        let side_cm = if closed {
            0.0
        } else {
            collimator_square(x, y, self.model.upper_jaws, beam.exchange_k).side_cm()
        };
        let range = |range| SumError::Range(FactorName::CollimatorScatter, range);
        let (sc, below_table) = match &beam.head_scatter {
            Some(head) if side_cm < least_cm - tolerance::TABLE_EDGE_CM => {
                let at_least = beam.sc(CollimatorSquare::new(least_cm)).map_err(range)?;
                let seen = |jaws_cm: [[f64; 2]; 2]| {
                    let [x, y] = jaws_cm.map(|jaw_cm| {
                        // Both pairs at the height of the upper one: only the ratio of two small openings counts.
                        head.window(jaw_cm, 0.0, self.jaw_height_cm)
                    });
                    head.visible(x, y)
                };
                let square = [[-least_cm / 2.0, least_cm / 2.0]; 2];
                let ratio =
                    head.output(seen(jaws_cm), side_cm) / head.output(seen(square), least_cm);
                (at_least.value * ratio, true)
            }
            _ => (
                beam.sc(CollimatorSquare::new(side_cm))
                    .map_err(range)?
                    .value,
                false,
            ),
        };
        Ok(JawScatter {
            jaws_cm,
            side_cm,
            sc,
            below_table,
        })
    }
}
