//! What a sweep took from the beam model, in words and with its numbers, so that
//! a person can do it again by hand.

use super::motion::JawMotion;
use super::planned::ThinEnd;
use crate::beam_model::JawAxis;
use crate::dose::text::number;

impl JawMotion<'_> {
    /// The arithmetic of [`Self::share`] at a position, for a person.
    pub(super) fn share_in_words(&self, position_cm: f64) -> String {
        let within_cm = position_cm.clamp(self.from_cm, self.to_cm);
        let table = self.planned.sweep.delivered_share(within_cm);
        let source = table.map_or_else(
            |range| range.to_string(),
            |lookup| format!("S({}) = {}", number(within_cm), lookup.source()),
        );
        format!(
            "S'({}) / S'({}) = {} / {}; {source}",
            number(within_cm),
            number(self.to_cm),
            number(self.mixed(within_cm)),
            number(self.shares[1])
        )
    }

    /// What was taken from the model, so that it can be done again by hand.
    pub(super) fn in_words(&self, name: &str) -> String {
        let planned = &self.planned;
        let [moving, standing] = planned.jaw_names();
        let place = |position_cm: f64| number(planned.thin_end.signed(position_cm));
        let angle = number(planned.angle_deg);
        let table_angle = number(planned.model.angle_deg);
        let mixing = if self.weight >= 1.0 {
            format!("S' = S, {angle} degrees being the sweep's own angle")
        } else {
            format!(
                "S'(p) = w S(p) + (1 - w) S(0) with w = tan {angle} / tan {table_angle} = {} and S(0) = {}",
                number(self.weight),
                number(self.at_axis)
            )
        };
        format!(
            "{name}, {angle} degrees at orientation {}: the plan does not spell out how its jaw moves; the motion is the beam model's sweep of {} ({}, {table_angle} degrees), and stands in no control point of the plan. Jaw {moving} goes from {} to {} cm, {} cm before {standing}; p is {}{} positive towards the thin end; {mixing}. {} of the meterset comes before the jaw moves: S'({}) / S'({}) = {} / {}. No wedge factor is applied",
            number(planned.orientation_deg),
            planned.id(),
            planned.sweep.delivered.name(),
            place(self.from_cm),
            place(self.to_cm),
            number(planned.sweep.closing_gap_cm),
            match planned.thin_end {
                ThinEnd::Positive => "",
                ThinEnd::Negative => "-",
            },
            match planned.sweep.moves_along {
                JawAxis::X => "x,",
                JawAxis::Y => "y,",
            },
            format_args!("{} %", number(100.0 * self.shares[0] / self.shares[1])),
            number(self.from_cm),
            number(self.to_cm),
            number(self.shares[0]),
            number(self.shares[1]),
        )
    }
}
