//! What technique a beam is, and what about it no method here covers. First
//! match of: setup, electron, arc, dynamic, segmented, wedge, blocked, mlc,
//! static. Devices that stand in the beam are looked at in `modifier`.

use super::aperture::{Leaves, leaves_at};
use super::delivery::{
    Interval, delivering_points, intervals, same_angle, same_aperture, same_point,
};
use super::{Obstacle, ObstacleKind, Technique};
use crate::plan::{Beam, ControlPoint, DeviceKind, RadiationType, Wedge, WedgeKind};
use crate::quantity::{Given, tolerance};

/// The beam's technique. A beam whose apertures or wedge positions are not
/// known is never called static.
#[must_use]
pub fn classify(beam: &Beam) -> Technique {
    classify_delivered(beam, &intervals(beam))
}

pub(super) fn classify_delivered(beam: &Beam, intervals: &[Interval<'_>]) -> Technique {
    if !beam.is_treatment() {
        return Technique::Setup;
    }
    if beam.radiation.value() == Some(&RadiationType::Electron) {
        return Technique::Electron;
    }
    if intervals.iter().any(gantry_turns) {
        return Technique::Arc;
    }
    if intervals
        .iter()
        .any(|interval| !same_aperture(interval.start, interval.end))
    {
        return Technique::Dynamic;
    }
    let several = intervals.first().is_some_and(|first| {
        intervals
            .iter()
            .any(|interval| !same_aperture(first.start, interval.start))
    });
    if several {
        return Technique::Segmented;
    }
    if wedge_in(beam, intervals) {
        return Technique::Wedge;
    }
    if !beam.blocks.is_empty() {
        return Technique::Blocked;
    }
    let at = intervals
        .first()
        .map(|interval| interval.start)
        .or(beam.control_points.first());
    match at.map(|point| leaves_at(beam, point)) {
        Some(Leaves::Cut | Leaves::Unknown) => Technique::Mlc,
        Some(Leaves::Outside) | None => Technique::Static,
    }
}

/// Whether leaves or blocks, and not jaws alone, shape a wedged field.
fn wedged_field_is_shaped(beam: &Beam, intervals: &[Interval<'_>]) -> bool {
    let at = intervals.first().map(|interval| interval.start);
    let leaves = at.map(|point| leaves_at(beam, point));
    !beam.blocks.is_empty() || !matches!(leaves, Some(Leaves::Outside) | None)
}

/// Whether a wedged field is integrated and not multiplied out: leaves or blocks shape it, or a jaw makes its wedge.
pub(super) fn wedged_field_is_integrated(beam: &Beam, intervals: &[Interval<'_>]) -> bool {
    let points = delivering_points(intervals);
    let dynamic_in = beam.wedges.iter().enumerate().any(|(index, wedge)| {
        let in_beam = |point: &&ControlPoint| {
            let position = point.wedges.get(index);
            position.and_then(|wedge| wedge.in_beam.get()) != Some(false)
        };
        wedge.kind.value() == Some(&WedgeKind::Dynamic) && points.iter().any(in_beam)
    });
    dynamic_in || wedged_field_is_shaped(beam, intervals)
}

/// Whether a dynamic wedge is in, and the control points spell out how a jaw moves for it: then the motion is the wedge.
pub(super) fn jaws_are_the_wedge(beam: &Beam, intervals: &[Interval<'_>]) -> bool {
    let dynamic = |wedge: &Wedge| wedge.kind.value() == Some(&WedgeKind::Dynamic);
    if beam.wedges.is_empty() || !beam.wedges.iter().all(dynamic) {
        return false;
    }
    // The jaw that moves is one across the wedge: its thin end lies towards +-y at 0 and 180 degrees, +-x at 90 and 270.
    let along_y = beam.wedges.iter().all(|wedge| {
        let quarter = wedge.orientation_deg.get().map(|deg| deg.rem_euclid(180.0));
        quarter.is_some_and(|deg| !(45.0..135.0).contains(&deg))
    });
    intervals.iter().any(|interval| {
        let jaws = |point: &ControlPoint| {
            if along_y {
                point.jaws_y_cm.get()
            } else {
                point.jaws_x_cm.get()
            }
        };
        match (jaws(interval.start), jaws(interval.end)) {
            (Some(start), Some(end)) => start
                .iter()
                .zip(&end)
                .any(|(a, b)| (a - b).abs() > tolerance::POSITION_CM),
            _ => false,
        }
    })
}

fn turns(start: &Given<f64>, end: &Given<f64>, direction: &Given<String>) -> bool {
    // A stated direction with equal angles is a whole turn, or junk: no static beam either way.
    let directed = matches!(
        direction.value().map(String::as_str),
        Some("CW" | "CC" | "CCW")
    );
    directed || !same_angle(start, end)
}

fn gantry_turns(interval: &Interval<'_>) -> bool {
    let Interval { start, end, .. } = interval;
    turns(&start.gantry_deg, &end.gantry_deg, &start.gantry_direction)
}

/// Whether a wedge is, or may be, in the beam while meterset accrues.
pub(super) fn wedge_in(beam: &Beam, intervals: &[Interval<'_>]) -> bool {
    let points = delivering_points(intervals);
    let stated_in = points
        .iter()
        .flat_map(|point| &point.wedges)
        .any(|wedge| wedge.in_beam.get() != Some(false));
    let unstated = !beam.wedges.is_empty()
        && points
            .iter()
            .any(|point| point.wedges.len() < beam.wedges.len());
    stated_in || unstated
}

/// Whether the beam declares wedges and none is ever in it.
pub(super) fn wedges_stay_out(beam: &Beam, technique: Technique) -> bool {
    !beam.wedges.is_empty()
        && matches!(
            technique,
            Technique::Static | Technique::Mlc | Technique::Blocked
        )
}

fn obstacle(message: impl Into<String>) -> Obstacle {
    Obstacle {
        kind: ObstacleKind::Technique,
        message: message.into(),
    }
}

/// What keeps the technique from being calculated.
pub(super) fn technique_obstacles(
    beam: &Beam,
    technique: Technique,
    intervals: &[Interval<'_>],
) -> Vec<Obstacle> {
    let mut found = Vec::new();
    if let Some(reason) = uncovered_reason(beam, technique, intervals) {
        found.push(obstacle(format!(
            "{reason}, which this version does not calculate: verify the beam by other means"
        )));
    }
    for device in &beam.devices {
        if let DeviceKind::Other(kind) = &device.kind {
            found.push(obstacle(format!(
                "a beam limiting device of type {kind} shapes the field, which this version does not calculate"
            )));
        }
    }
    match beam.radiation.value() {
        Some(RadiationType::Other(kind)) => found.push(obstacle(format!(
            "the radiation is {kind}, which this version does not calculate"
        ))),
        None => found.push(Obstacle {
            kind: ObstacleKind::Reading,
            message: "Radiation Type (300A,00C6) is not given".to_owned(),
        }),
        Some(RadiationType::Photon | RadiationType::Electron) => {}
    }
    if beam.high_dose_technique.value().map(String::as_str) == Some("TBI") {
        found.push(obstacle(
            "the plan marks the beam as total body irradiation (300A,00C7), which this version does not calculate",
        ));
    }
    if beam.energy.changes {
        found.push(obstacle(
            "the nominal energy changes between control points, which this version does not calculate",
        ));
    }
    found.extend(turning_obstacles(technique, intervals));
    found.extend(whole_turn_obstacle(intervals));
    found
}

/// A direction with equal angles: a whole turn or none. Among other intervals it is none; alone it may be either.
fn whole_turn_obstacle(intervals: &[Interval<'_>]) -> Option<Obstacle> {
    let [interval] = intervals else {
        return None;
    };
    let Interval { start, end, .. } = interval;
    let alone = gantry_turns(interval) && same_angle(&start.gantry_deg, &end.gantry_deg);
    alone.then(|| {
        obstacle(format!(
            "the gantry has a rotation direction (300A,011F) and the same angle of {} at both ends: a whole turn and standing still cannot be told apart",
            degrees(&start.gantry_deg)
        ))
    })
}

fn uncovered_reason(
    beam: &Beam,
    technique: Technique,
    intervals: &[Interval<'_>],
) -> Option<&'static str> {
    match technique {
        Technique::Setup
        | Technique::Static
        | Technique::Arc
        | Technique::Dynamic
        | Technique::Segmented
        | Technique::Wedge
        | Technique::Blocked => None,
        Technique::Electron => Some("the beam is an electron beam"),
        Technique::Mlc => {
            let at = intervals.first().map(|interval| interval.start);
            match at
                .or(beam.control_points.first())
                .map(|point| leaves_at(beam, point))
            {
                Some(Leaves::Unknown) => {
                    Some("leaves may shape the field (their positions or boundaries are not given)")
                }
                _ => None,
            }
        }
    }
}

/// Collimator, couch and isocentre must stand still over all that is delivered;
/// the gantry too unless the beam is an arc.
fn turning_obstacles(technique: Technique, intervals: &[Interval<'_>]) -> Vec<Obstacle> {
    type Angle = fn(&ControlPoint) -> &Given<f64>;
    let mut found = Vec::new();
    let points = delivering_points(intervals);
    let Some(first) = points.first() else {
        return found;
    };
    let angles: [(&str, Angle); 7] = [
        ("the gantry angle", |point| &point.gantry_deg),
        ("the gantry pitch", |point| &point.gantry_pitch_deg),
        ("the collimator angle", |point| &point.collimator_deg),
        ("the couch angle", |point| &point.couch_deg),
        ("the couch's eccentric angle", |point| &point.eccentric_deg),
        ("the couch pitch", |point| &point.couch_pitch_deg),
        ("the couch roll", |point| &point.couch_roll_deg),
    ];
    for (what, angle) in angles {
        let gantry_of_arc = technique == Technique::Arc && what == "the gantry angle";
        let changed = points
            .iter()
            .find(|point| !same_angle(angle(first), angle(point)));
        if let (Some(other), false) = (changed, gantry_of_arc) {
            found.push(obstacle(format!(
                "{what} is {} at one control point that delivers dose and {} at another, which this version does not calculate",
                degrees(angle(first)),
                degrees(angle(other)),
            )));
        }
    }
    let directed = |direction: fn(&ControlPoint) -> &Given<String>| {
        intervals.iter().any(|interval| {
            matches!(
                direction(interval.start).value().map(String::as_str),
                Some("CW" | "CC" | "CCW")
            )
        })
    };
    for (what, turning) in [
        (
            "the collimator",
            directed(|point| &point.collimator_direction),
        ),
        ("the couch", directed(|point| &point.couch_direction)),
    ] {
        if turning {
            found.push(obstacle(format!(
                "{what} has a rotation direction while meterset accrues, which this version does not calculate"
            )));
        }
    }
    if points
        .iter()
        .any(|point| !same_point(&first.isocentre, &point.isocentre))
    {
        found.push(obstacle(
            "the isocentre differs between control points that deliver dose, which this version does not calculate",
        ));
    }
    found
}

fn degrees(angle: &Given<f64>) -> String {
    angle.get().map_or_else(
        || "not given".to_owned(),
        |angle| format!("{angle:.2} degrees"),
    )
}

/// What a tilt or offset outside the covered geometry stops; an absent angle is no tilt
/// (Table Top Pitch, Roll and Eccentric Angle and Gantry Pitch are optional attributes).
pub(super) fn tilt_obstacles(point: &ControlPoint) -> Vec<Obstacle> {
    [
        ("gantry pitch (300A,014A)", &point.gantry_pitch_deg),
        ("couch eccentric angle (300A,0125)", &point.eccentric_deg),
    ]
    .into_iter()
    .filter_map(|(what, angle)| {
        let angle_deg = angle.get()?;
        let tilted = super::delivery::turn_between_deg(angle_deg, 0.0) > tolerance::ANGLE_DEG;
        tilted.then(|| {
            obstacle(format!(
                "the {what} is {angle_deg:.2} degrees, which this version does not calculate"
            ))
        })
    })
    .collect()
}
