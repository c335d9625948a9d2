//! Plans that are in order, with the point off the axis: jaws, collimator,
//! couch and patient positions. Jaws lie so that a point placed with another
//! patient position or collimator angle would often be under one.

use super::course::{Course, PointStated, beam, beside_isocentre};
use super::sample::Sample;
use crate::builder::Encoding;

/// The samples of this file.
pub(super) fn samples() -> Vec<Sample> {
    vec![
        asymmetric_jaws(),
        off_axis_point(),
        collimator_turned(),
        couch_turned(),
        feet_first_supine(),
        prone(),
        decubitus(),
    ]
}

fn asymmetric_jaws() -> Sample {
    // Gantry 50: x_b = 2.9 cos 50 + 3.4 sin 50 = 4.47; gantry 230: the same with the other sign.
    let field = |number, name, gantry_deg, x_cm, ssd_cm| {
        beam(number, name, "ROWAN-2", 6.0)
            .with_jaws(x_cm, [-8.0, 8.5])
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(13, "Nutmeg", "HALF", "Half-blocked opposed fields")
        .point(beside_isocentre([2.9, 3.4, 1.0]), PointStated::AtBeam)
        .fractions(25)
        .treat(field(1, "Medial", 50.0, [0.0, 9.0], 91.4), 1.05, 0.8)
        .treat(field(2, "Lateral", 230.0, [-9.0, 0.0], 91.8), 0.95, -0.6)
        .sound(
            "asymmetric-jaws.dcm",
            "half-blocked fields, one jaw on the axis, the point 4.5 cm off it",
        )
}

fn off_axis_point() -> Sample {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-1", 6.0)
            .with_field(20.0, 18.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(14, "Oak", "OFFAXIS", "Opposed fields, point off axis")
        .point(beside_isocentre([4.0, 0.5, 3.0]), PointStated::AtBeam)
        .fractions(20)
        .treat(field(1, "Anterior", 0.0, 90.2), 1.1, -0.9)
        .treat(field(2, "Posterior", 180.0, 88.6), 0.9, 1.5)
        .sound(
            "off-axis-point.dcm",
            "symmetric fields, the point 5 cm off the axis",
        )
        .with_encoding(Encoding::ImplicitLittle)
}

fn collimator_turned() -> Sample {
    // Gantry 0, collimator 90: a point at x = +5 in the patient lies at y_b = -5.
    let field = |number, name, gantry_deg, collimator_deg, ssd_cm| {
        beam(number, name, "ROWAN-1", 6.0)
            .with_field(6.0, 18.0)
            .with_gantry(gantry_deg)
            .with_collimator(collimator_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(15, "Pine", "COLL90", "Collimator turned")
        .point(beside_isocentre([5.0, 0.0, 0.5]), PointStated::ByTarget)
        .fractions(15)
        .treat(field(1, "Anterior", 0.0, 90.0, 92.0), 1.4, 0.3)
        .treat(field(2, "Posterior", 180.0, 270.0, 90.8), 1.6, -1.1)
        .sound(
            "collimator-turned.dcm",
            "collimator at 90 and 270 degrees; the point is the one TARGET dose reference with coordinates",
        )
}

fn couch_turned() -> Sample {
    let field = |number, name, gantry_deg, couch_deg, ssd_cm| {
        beam(number, name, "ROWAN-2", 6.0)
            .with_field(8.0, 8.5)
            .with_gantry(gantry_deg)
            .with_couch(couch_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(16, "Quince", "NONCOPL", "Three fields, couch turned")
        .point(beside_isocentre([1.5, 0.5, -1.0]), PointStated::AtBeam)
        .fractions(30)
        .treat(field(1, "Left oblique", 50.0, 315.0, 93.1), 0.6, 1.0)
        .treat(field(2, "Right oblique", 310.0, 45.0, 92.7), 0.6, -0.8)
        .treat(field(3, "Vertex side", 40.0, 270.0, 91.5), 0.6, 0.4)
        .sound(
            "couch-turned.dcm",
            "couch at 315, 45 and 270 degrees with oblique gantry angles, the point off the axis",
        )
}

fn feet_first_supine() -> Sample {
    // Gantry 0: x_b = -3, y_b = -2, 1 cm above the isocentre; head first it would be +3, +2, under two jaws.
    let field = |number, name, gantry_deg, x_cm, ssd_cm| {
        beam(number, name, "ROWAN-1", 6.0)
            .with_jaws(x_cm, [-9.0, 1.5])
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(17, "Rowan", "FFS", "Feet first")
        .position("FFS")
        .point(beside_isocentre([3.0, -1.0, 2.0]), PointStated::AtBeam)
        .fractions(25)
        .treat(field(1, "Anterior", 0.0, [-8.0, 2.0], 91.0), 1.2, -0.1)
        .treat(field(2, "Posterior", 180.0, [-2.0, 8.0], 88.0), 0.8, 0.9)
        .sound(
            "feet-first-supine.dcm",
            "feet first, supine; jaws and point placed so that head first would fail",
        )
}

fn prone() -> Sample {
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "ROWAN-2", 18.0)
            .with_field(10.0, 14.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(18, "Spruce", "PRONE", "Three fields, prone")
        .position("HFP")
        .point(beside_isocentre([1.0, 2.0, 1.5]), PointStated::AtBeam)
        .fractions(25)
        .treat(field(1, "Posterior", 0.0, 88.4), 0.8, 0.5)
        .treat(field(2, "Right", 90.0, 84.0), 0.5, -1.4)
        .treat(field(3, "Left", 270.0, 83.2), 0.5, 0.7)
        .sound("prone.dcm", "head first, prone, the point off the axis")
        .with_encoding(Encoding::ImplicitLittle)
}

fn decubitus() -> Sample {
    // Lying on the left side: gantry 0 enters from the right, gantry 90 from the front.
    let field = |number, name, gantry_deg, ssd_cm| {
        beam(number, name, "SORREL", 6.0)
            .with_field(12.0, 14.0)
            .with_gantry(gantry_deg)
            .with_ssd(ssd_cm)
    };
    Course::new(19, "Tamarack", "HFDL", "Two fields, lying on the left side")
        .position("HFDL")
        .point(beside_isocentre([1.0, -2.0, 2.0]), PointStated::AtBeam)
        .fractions(10)
        .treat(field(1, "Right", 0.0, 88.7), 1.6, 1.1)
        .treat(field(2, "Anterior", 90.0, 90.2), 1.4, -0.7)
        .sound(
            "decubitus.dcm",
            "head first, lying on the left side; isocentric on a machine with PDD tables",
        )
}
