//! Plans that are in order, with a gantry that turns: the depth of the point
//! is stated at every control point, and varies as the skin of a body does.

use super::course::{Course, PointStated, beam, beside_isocentre};
use super::sample::Sample;
use super::shapes::{
    ArcPoint, Body, along, around_ellipse, half_width_cm, leaves, rowan_leaves, to_tenth_mm,
};
use crate::builder::{BeamSpec, DepthSpec};

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    vec![
        modulated_arc().sound(
            "modulated-arc.dcm",
            "an arc of 178 control points: leaves, gantry and dose rate change together",
        ),
        conformal_arc().sound(
            "conformal-arc.dcm",
            "two half arcs of 91 control points each, leaves following a target; the second counter-clockwise through 0",
        ),
        static_aperture_arc().sound(
            "static-aperture-arc.dcm",
            "an arc through 0 with one opening; depth, equivalent depth and SSD of the point stand at every control point",
        ),
    ]
}

const BODY: Body = Body {
    side_cm: 16.8,
    front_cm: 10.6,
    isocentre_cm: [-1.1, 0.7],
};

fn field(number: i32, name: &str, (x_cm, y_cm): (f64, f64)) -> BeamSpec {
    beam(number, name, "ROWAN-1", 6.0).with_field(x_cm, y_cm)
}

/// Angles from one to another in equal steps, to a tenth of a degree.
fn angles_deg(from_deg: f64, to_deg: f64, points: u32) -> impl Iterator<Item = f64> {
    (0..points).map(move |point| {
        let share = f64::from(point) / f64::from(points - 1);
        ((from_deg + (to_deg - from_deg) * share) * 10.0).round() / 10.0
    })
}

/// Part of a period of `period_deg` that a wave has behind it at an angle: 0 to 1 and back.
fn wave(gantry_deg: f64, period_deg: f64, from_deg: f64) -> f64 {
    let turn = (gantry_deg - from_deg) / period_deg * std::f64::consts::TAU;
    f64::midpoint(1.0, -turn.cos())
}

pub(super) fn modulated_arc() -> Course {
    let points = angles_deg(181.0, 539.0, 178)
        .map(|gantry_deg| {
            // Each bank comes in over a part of the target in its turn, the middle leaves furthest.
            let [lower, upper] = [75.0, 110.0].map(|from| wave(gantry_deg, 90.0, from));
            let leaves_cm = leaves(|y_cm| {
                let half = half_width_cm([4.8, 5.7], y_cm)?;
                let middle = 1.0 - (y_cm / 8.0).powi(2);
                Some([
                    half * (1.1 * middle * lower - 1.0),
                    half * (1.0 - 0.9 * middle * upper),
                ])
            });
            ArcPoint {
                gantry_deg,
                meterset: 1.0 + 0.35 * wave(gantry_deg, 120.0, 20.0),
                ssd_cm: BODY.ssd_cm(gantry_deg),
                leaves_cm: Some(leaves_cm),
            }
        })
        .collect();
    let beam = field(1, "Arc", (10.0, 12.0)).with_collimator(10.0);
    Course::new(26, "Holly", "ARC", "One arc with moving leaves")
        .fractions(30)
        .treat(along(beam, "CW", points), 2.0, -0.7)
}

pub(super) fn conformal_arc() -> Course {
    let arc = |number, name, from_deg, to_deg, direction| {
        let points = angles_deg(from_deg, to_deg, 91)
            .map(|gantry_deg| {
                // An ellipse of 4.5 cm by 3.2 cm, seen from the side of the gantry.
                let (sine, cosine) = gantry_deg.to_radians().sin_cos();
                let half_cm = (4.5 * cosine).hypot(3.2 * sine);
                ArcPoint {
                    gantry_deg,
                    meterset: 1.0,
                    ssd_cm: BODY.ssd_cm(gantry_deg),
                    leaves_cm: Some(around_ellipse([half_cm, 4.9], [0.0, 0.0])),
                }
            })
            .collect();
        along(field(number, name, (10.0, 11.0)), direction, points)
    };
    Course::new(27, "Jasmine", "CONFARC", "Two conformal arcs")
        .fractions(20)
        .treat(arc(1, "Posterior half", 90.0, 270.0, "CW"), 1.1, 0.8)
        .treat(arc(2, "Anterior half", 450.0, 270.0, "CC"), 0.9, -1.2)
}

pub(super) fn static_aperture_arc() -> Course {
    let gantry_deg: Vec<f64> = angles_deg(300.0, 430.0, 27).collect();
    let points = gantry_deg
        .iter()
        .enumerate()
        .map(|(index, &gantry_deg)| ArcPoint {
            gantry_deg,
            meterset: 1.0,
            ssd_cm: BODY.ssd_cm(gantry_deg),
            leaves_cm: (index == 0).then(|| around_ellipse([3.6, 4.2], [0.0, 0.0])),
        })
        .collect();
    let mut beam = along(field(1, "Arc", (8.0, 9.0)), "CW", points);
    assert_eq!(beam.devices[2].pairs, rowan_leaves().pairs);
    for (point, gantry_deg) in beam.control_points.iter_mut().zip(gantry_deg) {
        let depth_cm = to_tenth_mm(BODY.depth_cm(gantry_deg));
        // Fat lets a little more through than water (invented).
        let depths = DepthSpec {
            depth_cm: Some(depth_cm),
            equivalent_depth_cm: Some(to_tenth_mm(0.97 * depth_cm)),
            ssd_cm: Some(to_tenth_mm(100.0 - depth_cm)),
            ..DepthSpec::default()
        };
        let coefficient = point.weight.unwrap_or_default();
        point.doses = vec![(1, coefficient, Some(depths))];
    }
    Course::new(28, "Kauri", "FIXARC", "One arc with a fixed opening")
        .fractions(5)
        .treat(beam, 3.0, 1.1)
}

/// An arc over the front, the point in front of the isocentre: from behind it would be deeper and further away.
pub(super) fn short_arc() -> Course {
    let points = angles_deg(320.0, 400.0, 41)
        .enumerate()
        .map(|(index, gantry_deg)| ArcPoint {
            gantry_deg,
            meterset: 1.0,
            ssd_cm: BODY.ssd_cm(gantry_deg),
            leaves_cm: (index == 0).then(|| around_ellipse([4.6, 5.2], [0.0, 0.0])),
        })
        .collect();
    Course::new(310, "Tulip", "DIRECTION", "One short arc")
        .point(beside_isocentre([0.0, -3.5, 0.0]), PointStated::AtBeam)
        .fractions(20)
        .treat(along(field(1, "Arc", (10.0, 11.0)), "CW", points), 2.0, 0.6)
}
