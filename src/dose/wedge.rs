//! Wedges of a plan's beam: which one is in, for what share of the meterset,
//! what the beam model has under its ID, and how it lies across the field.
//! What it does to the dose is worked out in `wedge_factor`, for a dynamic one in `sweep`.

use super::Obstacle;
use super::delivery::Interval;
use super::sweep::PlannedSweep;
use super::text::number;
use crate::beam_model::{BeamModel, Lookup, OutOfRange, WedgeModel, WedgeModelKind, WedgeTables};
use crate::plan::{Beam, ControlPoint, Wedge, WedgeKind};
use crate::quantity::{Given, PointSquare, tolerance};

/// A wedge of metal of a beam model as it lies across the field.
#[derive(Clone, Copy, Debug)]
pub struct PlacedWedge<'a> {
    model: &'a WedgeModel,
    tables: &'a WedgeTables,
    orientation_deg: f64,
}

impl<'a> PlacedWedge<'a> {
    /// The wedge at an orientation, degrees of any turn as Wedge Orientation (300A,00D8) has it; `None` for a dynamic
    /// wedge, which has no tables of its own.
    #[must_use]
    pub const fn new(model: &'a WedgeModel, orientation_deg: f64) -> Option<Self> {
        match model.tables() {
            Some(tables) => Some(Self {
                model,
                tables,
                orientation_deg,
            }),
            None => None,
        }
    }

    /// Its ID in the model.
    #[must_use]
    pub fn id(&self) -> &'a str {
        &self.model.id
    }

    /// Its orientation as given, degrees.
    #[must_use]
    pub const fn orientation_deg(&self) -> f64 {
        self.orientation_deg
    }

    /// Position along the wedge of a place [x, y] of the collimator system at the isocentre plane, cm, positive
    /// towards the thin end.
    ///
    /// Wedge Orientation is the turn of the wedge filter system in the beam limiting device system of IEC 61217,
    /// whose y axis points from the heel to the toe of the wedge; about the beam axis, counter-clockwise seen from the
    /// source, as the collimator turns. So the thin end lies towards (-sin a, cos a): a = 0 towards +y, 90 towards -x,
    /// 180 towards -y, 270 towards +x. This is from memory of IEC 61217 and DICOM PS3.3 C.8.8.14, not read from their
    /// text: measure one wedged field of a plan before trusting it.
    #[must_use]
    pub fn position_cm(&self, [x_cm, y_cm]: [f64; 2]) -> f64 {
        let (sine, cosine) = self.orientation_deg.to_radians().sin_cos();
        y_cm * cosine - x_cm * sine
    }

    /// Fluence at a place [x, y] of the collimator system at the isocentre plane, cm, relative to the axis.
    ///
    /// # Errors
    /// When the place is beyond the measured profile.
    pub fn profile_at(&self, place_cm: [f64; 2]) -> Result<Lookup, OutOfRange> {
        self.tables.profile(self.position_cm(place_cm))
    }

    /// The wedge factor on the axis, for a depth (radiological where known), cm, and the square at the point's plane.
    ///
    /// # Errors
    /// When depth or side is outside the table.
    pub fn factor_at(&self, depth_cm: f64, square: PointSquare) -> Result<Lookup, OutOfRange> {
        self.tables.factor(depth_cm, square)
    }

    /// The same wedge turned round: thin end where the thick one was.
    #[must_use]
    pub fn reversed(&self) -> Self {
        Self {
            orientation_deg: self.orientation_deg + 180.0,
            ..*self
        }
    }
}

/// A wedge in a field.
#[derive(Clone, Copy, Debug)]
pub struct FieldWedge<'a> {
    /// The wedge as it lies.
    pub placed: PlacedWedge<'a>,
    /// Share of the meterset that it is in for, above 0, at most 1.
    pub share_in: f64,
    /// Item index of the wedge in the beam.
    pub index: usize,
}

/// What the wedges of a beam come to.
#[derive(Clone, Debug, Default)]
pub(super) struct WedgeFindings<'a> {
    /// The wedge, when it and the model go together.
    pub(super) wedge: Option<FieldWedge<'a>>,
    /// The sweep that makes the wedge, when it is a dynamic one that the model has, and the wedge in words.
    pub(super) swept: Option<(PlannedSweep<'a>, String)>,
    /// Why there is no number with it.
    pub(super) obstacles: Vec<Obstacle>,
    /// Worth telling.
    pub(super) remarks: Vec<String>,
}

/// A wedge in words.
fn named(wedge: &Wedge) -> String {
    match wedge.id.value() {
        Some(id) => format!("the wedge {id:?}"),
        None => "the wedge without ID".to_owned(),
    }
}

/// The wedge that is in the beam while meterset accrues. Without a model only what the plan itself lacks is told.
pub(super) fn wedge_of<'a>(
    beam: &Beam,
    delivered: &[Interval<'_>],
    model: Option<&'a BeamModel>,
) -> WedgeFindings<'a> {
    let mut found = WedgeFindings::default();
    let mut used: Vec<(usize, &Wedge, f64)> = Vec::new();
    for (index, wedge) in beam.wedges.iter().enumerate() {
        match weight_in(index, wedge, delivered) {
            Ok(weight) if weight > 0.0 => used.push((index, wedge, weight)),
            Ok(_) => {}
            Err(obstacle) => found.obstacles.push(obstacle),
        }
    }
    let dangling = delivered.iter().any(|interval| {
        let more = |count: usize| count > beam.wedges.len();
        more(interval.start.wedges.len()) || more(interval.end.wedges.len())
    });
    if dangling {
        found.obstacles.push(Obstacle::reading(
            "a control point gives the position of a wedge that the beam does not have".to_owned(),
        ));
    }
    if let [_, _, ..] = *used {
        let names: Vec<String> = used.iter().map(|(_, wedge, _)| named(wedge)).collect();
        found.obstacles.push(Obstacle::technique(format!(
            "{} are in the beam: more than one wedge is not calculated, verify the beam by other means",
            names.join(" and ")
        )));
    }
    let ([(index, wedge, weight)], true) = (used.as_slice(), found.obstacles.is_empty()) else {
        return found;
    };
    let total: f64 = delivered.iter().map(|interval| interval.weight).sum();
    let always_in = delivered
        .iter()
        .all(|interval| position(interval.start, *index) == Some(true));
    let weights_stated = delivered.iter().all(|interval| {
        !interval.start.cumulative_weight.is_absent() && !interval.end.cumulative_weight.is_absent()
    });
    if !always_in && !weights_stated {
        found.obstacles.push(Obstacle::reading(format!(
            "{} is in for a part of the meterset, and the cumulative meterset weights (300A,0134) do not say for how much",
            named(wedge)
        )));
        return found;
    }
    let share_in = if always_in { 1.0 } else { weight / total };
    let orientation_deg = stated_in_plan(wedge, share_in, &mut found);
    let Some(model) = model else {
        return found;
    };
    let known = known_to(model, wedge, &mut found);
    if let (Some(orientation_deg), Some(known), true) =
        (orientation_deg, known, found.obstacles.is_empty())
    {
        if let Some(sweep) = known.sweep() {
            let name = named(wedge);
            match PlannedSweep::new((wedge, &name), (known, sweep), orientation_deg) {
                Ok(planned) => found.swept = Some((planned, name)),
                Err(obstacle) => found.obstacles.push(obstacle),
            }
            return found;
        }
        found.wedge = PlacedWedge::new(known, orientation_deg).map(|placed| FieldWedge {
            placed,
            share_in,
            index: *index,
        });
    }
    found
}

/// Whether the wedge of this item index is in at a control point; `None` when that is not stated.
fn position(point: &ControlPoint, index: usize) -> Option<bool> {
    point.wedges.get(index)?.in_beam.get()
}

/// The meterset weight that a wedge is in for. Where it is in at one end of an interval and out at the other the plan
/// does not say for how much of the interval.
fn weight_in(index: usize, wedge: &Wedge, delivered: &[Interval<'_>]) -> Result<f64, Obstacle> {
    let mut sum = 0.0;
    for interval in delivered {
        let first = interval.start_index;
        match (
            position(interval.start, index),
            position(interval.end, index),
        ) {
            (Some(true), Some(true)) => sum += interval.weight,
            (Some(false), Some(false)) => {}
            (Some(start), Some(_)) => {
                let (one, other) = if start { ("in", "out") } else { ("out", "in") };
                return Err(Obstacle::reading(format!(
                    "{} is {one} at control point {first} and {other} at {}, with meterset in between: for how much of it the wedge is in is not stated",
                    named(wedge),
                    first + 1
                )));
            }
            _ => {
                return Err(Obstacle::reading(format!(
                    "Wedge Position (300A,0118) of {} is not given where meterset accrues (from control point {first})",
                    named(wedge)
                )));
            }
        }
    }
    Ok(sum)
}

/// What the plan must say of the wedge itself; gives its orientation.
fn stated_in_plan(wedge: &Wedge, share_in: f64, found: &mut WedgeFindings<'_>) -> Option<f64> {
    let name = named(wedge);
    match wedge.kind.value() {
        None => found.obstacles.push(Obstacle::reading(format!(
            "Wedge Type (300A,00D3) of {name} is not given"
        ))),
        Some(WedgeKind::Standard) if share_in < 1.0 => found.obstacles.push(Obstacle::technique(format!(
            "{name} is STANDARD (300A,00D3) and in for {} % of the meterset only: a wedge put in by hand does not move within a beam",
            number(100.0 * share_in)
        ))),
        Some(WedgeKind::Dynamic) if share_in < 1.0 => found.obstacles.push(Obstacle::technique(format!(
            "{name} is DYNAMIC (300A,00D3) and in for {} % of the meterset only: a sweep that the plan does not spell out is one of the whole beam",
            number(100.0 * share_in)
        ))),
        Some(WedgeKind::PartialStandard | WedgeKind::PartialMotorized) => {
            found.obstacles.push(Obstacle::technique(format!(
                "{name} is a partial one that does not reach over the whole field, which this version does not calculate"
            )));
        }
        Some(WedgeKind::Other(kind)) => found.obstacles.push(Obstacle::technique(format!(
            "{name} is of type {kind} (300A,00D3), which this version does not calculate"
        ))),
        Some(WedgeKind::Standard | WedgeKind::Motorized | WedgeKind::Dynamic) => {}
    }
    if wedge.id.value().is_none_or(|id| id.trim().is_empty()) {
        found.obstacles.push(Obstacle::reading(
            "Wedge ID (300A,00D4) is not given: which wedge is in the beam is not certain"
                .to_owned(),
        ));
    }
    if wedge.orientation_deg.is_absent() {
        found.obstacles.push(Obstacle::reading(format!(
            "Wedge Orientation (300A,00D8) of {name} is not given: where its thin end lies is not certain"
        )));
    }
    wedge.orientation_deg.get()
}

/// The model's wedge of this ID, when kind and angle are the plan's.
fn known_to<'a>(
    model: &'a BeamModel,
    wedge: &Wedge,
    found: &mut WedgeFindings<'_>,
) -> Option<&'a WedgeModel> {
    let id = wedge.id.value()?;
    let Some(known) = model.wedge(id) else {
        let ids: Vec<&str> = model.wedges.iter().flat_map(WedgeModel::ids).collect();
        let ids = if ids.is_empty() {
            "none".to_owned()
        } else {
            ids.join(", ")
        };
        found.obstacles.push(Obstacle::model(format!(
            "the beam model does not know {} for {}; known wedges: {ids}",
            named(wedge),
            model.label
        )));
        return None;
    };
    let as_planned = match wedge.kind.value()? {
        WedgeKind::Standard => WedgeModelKind::Fixed,
        WedgeKind::Motorized => WedgeModelKind::Motorised,
        WedgeKind::Dynamic => WedgeModelKind::Dynamic,
        WedgeKind::PartialStandard | WedgeKind::PartialMotorized | WedgeKind::Other(_) => {
            return None;
        }
    };
    if as_planned != known.kind() {
        found.obstacles.push(Obstacle::model(format!(
            "the plan has {} as a {} one (300A,00D3), the beam model as a {} one",
            named(wedge),
            as_planned.term(),
            known.kind().term()
        )));
        return None;
    }
    // A sweep makes smaller angles too; `sweep` sees to its angle.
    if known.kind() != WedgeModelKind::Dynamic {
        compare_angles(wedge, known, found);
    }
    Some(known)
}

/// The plan's angle against the model's. The ID says which wedge it is; of a motorised one plans state its own angle or
/// the smaller one that its share of the meterset comes to.
fn compare_angles(wedge: &Wedge, known: &WedgeModel, found: &mut WedgeFindings<'_>) {
    let angle: &Given<f64> = &wedge.angle_deg;
    let Some(planned_deg) = angle.get() else {
        found.remarks.push(format!(
            "Wedge Angle (300A,00D5) of {} is not given; the wedge was taken by its ID alone",
            named(wedge)
        ));
        return;
    };
    let difference_deg = planned_deg - known.angle_deg;
    let smaller = difference_deg < -tolerance::ANGLE_DEG;
    if known.kind() == WedgeModelKind::Motorised && smaller && planned_deg >= 0.0 {
        found.remarks.push(format!(
            "the plan states {} degrees for {}, which is one of {} degrees: what counts is the meterset that it is in for",
            number(planned_deg),
            named(wedge),
            number(known.angle_deg)
        ));
    } else if difference_deg.abs() > tolerance::ANGLE_DEG || difference_deg.is_nan() {
        found.obstacles.push(Obstacle::model(format!(
            "the plan states {} degrees for {} (300A,00D5), the beam model {}",
            number(planned_deg),
            named(wedge),
            number(known.angle_deg)
        )));
    }
}
