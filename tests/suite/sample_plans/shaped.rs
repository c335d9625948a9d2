//! Plans that are in order, with fields that leaves or blocks shape and the
//! gantry at rest: conformal, blocked, in segments, sliding windows.

use super::course::{Course, ISOCENTRE_CM, PointStated, beam, beside_isocentre};
use super::sample::Sample;
use super::shapes::{
    Body, Segment, around_ellipse, half_width_cm, in_segments, leaves, rowan_leaves, sliding,
};
use crate::builder::{BeamSpec, BlockSpec, Encoding};

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    vec![
        leaf_shaped().sound(
            "leaf-shaped.dcm",
            "three fields that leaves shape around a target, the collimator turned, the point off the axis",
        ),
        corner_blocks().sound(
            "blocked.dcm",
            "opposed fields with two shielding blocks on a tray",
        ),
        aperture_block()
            .sound(
                "aperture-block.dcm",
                "two fields with an aperture block each; implicit little endian",
            )
            .with_encoding(Encoding::ImplicitLittle),
        field_in_field().sound(
            "field-in-field.dcm",
            "opposed fields with a second opening inside the first",
        ),
        step_and_shoot().sound(
            "step-and-shoot.dcm",
            "five fields of five openings each, moved without dose",
        ),
        sliding_window().sound(
            "sliding-window.dcm",
            "three fields over which a gap between the leaves slides, 16 control points each",
        ),
    ]
}

const BODY: Body = Body {
    side_cm: 17.5,
    front_cm: 11.0,
    isocentre_cm: [0.8, -0.6],
};

fn field(
    number: i32,
    name: &str,
    energy_mv: f64,
    gantry_deg: f64,
    (x_cm, y_cm): (f64, f64),
) -> BeamSpec {
    beam(number, name, "ROWAN-2", energy_mv)
        .with_field(x_cm, y_cm)
        .with_gantry(gantry_deg)
        .with_ssd(BODY.ssd_cm(gantry_deg))
}

pub(super) fn leaf_shaped() -> Course {
    let shaped = |number, name, gantry_deg, half_cm: [f64; 2], collimator_deg| {
        field(number, name, 6.0, gantry_deg, (12.0, 13.0))
            .with_collimator(collimator_deg)
            .with_leaves(rowan_leaves(), around_ellipse(half_cm, [0.4, 0.2]))
    };
    Course::new(20, "Acacia", "CONFORMAL", "Three leaf-shaped fields")
        .point(beside_isocentre([0.8, -0.5, 1.2]), PointStated::AtBeam)
        .fractions(30)
        .treat(shaped(1, "Anterior", 0.0, [4.6, 5.8], 15.0), 0.72, 0.9)
        .treat(shaped(2, "Left", 90.0, [4.1, 5.6], 350.0), 0.64, -1.1)
        .treat(
            shaped(3, "Right posterior", 240.0, [4.3, 5.7], 0.0),
            0.64,
            0.4,
        )
}

fn corner(number: i32, name: &str, outline_cm: Vec<[f64; 2]>) -> BlockSpec {
    BlockSpec {
        number,
        name: name.to_owned(),
        kind: "SHIELDING".to_owned(),
        divergent: true,
        tray_id: Some("TRAY-1".to_owned()),
        material: "LEAD_ALLOY".to_owned(),
        thickness_cm: Some(7.5),
        transmission: Some(0.04),
        source_to_tray_cm: Some(65.0),
        outline_cm,
    }
}

pub(super) fn corner_blocks() -> Course {
    let blocked = |number, name, gantry_deg| {
        field(number, name, 6.0, gantry_deg, (15.0, 16.0))
            .with_block(corner(
                1,
                "Left lung",
                vec![[2.5, 8.2], [3.1, 2.0], [7.8, -3.5], [7.8, 8.2]],
            ))
            .with_block(corner(
                2,
                "Right lung",
                vec![[-2.5, 8.2], [-3.1, 2.0], [-7.8, -3.5], [-7.8, 8.2]],
            ))
    };
    Course::new(21, "Baobab", "BLOCKS", "Opposed fields with blocks")
        .fractions(20)
        .treat(blocked(1, "Anterior", 0.0), 1.0, -0.8)
        .treat(blocked(2, "Posterior", 180.0), 1.0, 0.7)
}

fn aperture_block() -> Course {
    let around = |radius_cm: f64| -> Vec<[f64; 2]> {
        let corners = (0..24).map(|corner| (15.0 * f64::from(corner)).to_radians());
        corners
            .map(|angle| {
                let at = |value: f64| (value * 100.0).round() / 100.0;
                [
                    at(radius_cm * angle.cos()),
                    at(1.2 * radius_cm * angle.sin()),
                ]
            })
            .collect()
    };
    let blocked = |number, name, gantry_deg, radius_cm| {
        field(number, name, 18.0, gantry_deg, (11.0, 13.0)).with_block(BlockSpec {
            kind: "APERTURE".to_owned(),
            transmission: Some(0.05),
            ..corner(1, "Cut-out", around(radius_cm))
        })
    };
    Course::new(22, "Cypress", "CUTOUT", "Two fields with cut-outs")
        .fractions(5)
        .treat(blocked(1, "Left", 90.0, 3.8), 1.6, 1.2)
        .treat(blocked(2, "Right", 270.0, 4.0), 1.4, -0.5)
}

/// Openings with a second one inside that spares the hot end.
pub(super) fn field_in_field() -> Course {
    let wide = || around_ellipse([5.2, 6.8], [0.0, 0.0]);
    // The lower part closed.
    let narrow = |from_cm: f64| {
        leaves(|y_cm| {
            let half = half_width_cm([5.2, 6.8], y_cm).filter(|_| y_cm > from_cm)?;
            Some([-half, half])
        })
    };
    let shaped = |number, name, gantry_deg, share, from_cm| {
        let segment = |share, leaves_cm| Segment { share, leaves_cm };
        in_segments(
            field(number, name, 6.0, gantry_deg, (11.0, 14.0)),
            vec![
                segment(share, wide()),
                segment(1.0 - share, narrow(from_cm)),
            ],
        )
    };
    Course::new(23, "Ebony", "FIF", "Field in field")
        .fractions(25)
        .treat(shaped(1, "Anterior", 0.0, 0.92, -2.5), 1.0, 0.6)
        .treat(shaped(2, "Posterior", 180.0, 0.9, -3.0), 1.0, -1.0)
}

/// Five openings: the whole target, and four parts of it.
fn parts(half_cm: [f64; 2], shift_cm: f64) -> Vec<Segment> {
    let part = |share, from: f64, to: f64, low_cm: f64, high_cm: f64| Segment {
        share,
        leaves_cm: leaves(|y_cm| {
            let half = half_width_cm(half_cm, y_cm).filter(|_| low_cm < y_cm && y_cm < high_cm)?;
            Some([shift_cm + from * half, shift_cm + to * half])
        }),
    };
    vec![
        part(0.5, -1.0, 1.0, -9.0, 9.0),
        part(0.16, -1.0, 0.5, -9.0, 9.0),
        part(0.14, -0.5, 1.0, -9.0, 9.0),
        part(0.11, -1.0, 1.0, -9.0, 2.5),
        part(0.09, -1.0, 1.0, -2.5, 9.0),
    ]
}

pub(super) fn step_and_shoot() -> Course {
    let shaped = |number, name, gantry_deg, half_cm, shift_cm| {
        in_segments(
            field(number, name, 6.0, gantry_deg, (12.0, 13.0)),
            parts(half_cm, shift_cm),
        )
    };
    Course::new(24, "Filbert", "STEPS", "Five fields, step and shoot")
        .point(ISOCENTRE_CM, PointStated::ByReference)
        .fractions(33)
        .treat(shaped(1, "Anterior", 0.0, [5.0, 5.9], 0.0), 0.42, 0.5)
        .treat(shaped(2, "Left anterior", 72.0, [4.4, 5.7], 0.3), 0.4, -0.7)
        .treat(
            shaped(3, "Left posterior", 144.0, [4.7, 5.8], -0.2),
            0.4,
            1.1,
        )
        .treat(
            shaped(4, "Right posterior", 216.0, [4.7, 5.8], 0.2),
            0.39,
            -0.3,
        )
        .treat(
            shaped(5, "Right anterior", 288.0, [4.4, 5.7], -0.3),
            0.39,
            0.2,
        )
}

/// A gap of about 4 cm slides from -x to +x over an ellipse; both ends rest where the ellipse ends.
fn window(half_cm: [f64; 2], gap_cm: f64, points: u32) -> Vec<Vec<f64>> {
    (0..points)
        .map(|point| {
            let share = f64::from(point) / f64::from(points - 1);
            leaves(|y_cm| {
                let half = half_width_cm(half_cm, y_cm)?;
                let from = -half + (2.0 * half + gap_cm) * share;
                Some([from - gap_cm, from].map(|tip| tip.clamp(-half, half)))
            })
        })
        .collect()
}

pub(super) fn sliding_window() -> Course {
    let shaped = |number, name, gantry_deg, half_cm, gap_cm| {
        sliding(
            field(number, name, 6.0, gantry_deg, (11.0, 12.0)),
            window(half_cm, gap_cm, 16),
        )
    };
    Course::new(25, "Gum", "WINDOW", "Three sliding windows")
        .fractions(28)
        .treat(shaped(1, "Anterior", 0.0, [5.0, 5.7], 4.2), 0.7, -0.6)
        .treat(
            shaped(2, "Left posterior", 120.0, [4.6, 5.6], 3.8),
            0.65,
            0.8,
        )
        .treat(
            shaped(3, "Right posterior", 240.0, [4.7, 5.6], 4.0),
            0.65,
            0.3,
        )
}
