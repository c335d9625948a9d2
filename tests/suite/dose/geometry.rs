//! IEC 61217 geometry: literal cases worked out in words, and an oracle that
//! composes rotation matrices written down independently of the program.

use counterfoil::dose::geometry::{
    CouchAngles, HeadAngles, patient_to_collimator, patient_to_fixed, ray_through, source_in_fixed,
};
use counterfoil::plan::PatientPosition::{self, *};
use counterfoil::quantity::{Collimator, Patient, Point, Vector};
use proptest::prelude::*;

use super::assert_close;

type Matrix = [[f64; 3]; 3];

fn times(a: Matrix, b: Matrix) -> Matrix {
    let mut product = [[0.0; 3]; 3];
    for row in 0..3 {
        for column in 0..3 {
            product[row][column] = (0..3).map(|inner| a[row][inner] * b[inner][column]).sum();
        }
    }
    product
}

fn apply(matrix: Matrix, vector: [f64; 3]) -> [f64; 3] {
    matrix.map(|row| row.iter().zip(vector).map(|(a, b)| a * b).sum())
}

/// Active right-handed rotations of a vector.
fn about_x(deg: f64) -> Matrix {
    let (s, c) = deg.to_radians().sin_cos();
    [[1.0, 0.0, 0.0], [0.0, c, -s], [0.0, s, c]]
}

fn about_y(deg: f64) -> Matrix {
    let (s, c) = deg.to_radians().sin_cos();
    [[c, 0.0, s], [0.0, 1.0, 0.0], [-s, 0.0, c]]
}

fn about_z(deg: f64) -> Matrix {
    let (s, c) = deg.to_radians().sin_cos();
    [[c, -s, 0.0], [s, c, 0.0], [0.0, 0.0, 1.0]]
}

/// Lying on the couch, from where head and front point: the patient's left is front x ... by the
/// right-handed set (left, posterior, superior): left = posterior x superior.
fn lying(head_toward_gantry: bool, front: [f64; 3]) -> Matrix {
    let superior = [0.0, if head_toward_gantry { 1.0 } else { -1.0 }, 0.0];
    let posterior = front.map(|component| -component);
    let left = [
        posterior[1] * superior[2] - posterior[2] * superior[1],
        posterior[2] * superior[0] - posterior[0] * superior[2],
        posterior[0] * superior[1] - posterior[1] * superior[0],
    ];
    // Columns: images of the patient axes x (left), y (posterior), z (superior).
    [0, 1, 2].map(|row| [left[row], posterior[row], superior[row]])
}

/// Which way the patient's front points: up when supine, down when prone. On a side, the side named
/// is down: on the left side with the head to the gantry, left is down (-Z), so front is +X (to
/// the right of someone facing the gantry); each of the other three mirrors it.
fn oracle_position(position: PatientPosition) -> Matrix {
    let (up, down) = ([0.0, 0.0, 1.0], [0.0, 0.0, -1.0]);
    let (right, left) = ([1.0, 0.0, 0.0], [-1.0, 0.0, 0.0]);
    match position {
        HeadFirstSupine => lying(true, up),
        HeadFirstProne => lying(true, down),
        HeadFirstDecubitusLeft => lying(true, right),
        HeadFirstDecubitusRight => lying(true, left),
        FeetFirstSupine => lying(false, up),
        FeetFirstProne => lying(false, down),
        FeetFirstDecubitusLeft => lying(false, left),
        FeetFirstDecubitusRight => lying(false, right),
    }
}

/// The side named by a decubitus position is down, whichever way the head points.
#[test]
fn verify_decubitus_side_is_down() {
    let left = Vector::new(1.0, 0.0, 0.0);
    for (position, left_side_z_cm) in [
        (HeadFirstDecubitusLeft, -1.0),
        (FeetFirstDecubitusLeft, -1.0),
        (HeadFirstDecubitusRight, 1.0),
        (FeetFirstDecubitusRight, 1.0),
    ] {
        let fixed = patient_to_fixed(left, position, CouchAngles::default());
        assert_close(fixed.z_cm, left_side_z_cm, 1e-12);
        // And the oracle says the same.
        assert_close(
            apply(oracle_position(position), [1.0, 0.0, 0.0])[2],
            left_side_z_cm,
            1e-12,
        );
    }
}

/// The whole way by matrices. Fixed to gantry and collimator are inverse turns: the head turns by
/// +gantry about Y (its source goes from +Z toward +X) and by +collimator about its own Z.
fn oracle(
    from_isocentre: [f64; 3],
    position: PatientPosition,
    couch: CouchAngles,
    head: HeadAngles,
) -> [f64; 3] {
    let table = times(
        about_z(couch.support_deg),
        times(about_x(couch.pitch_deg), about_y(couch.roll_deg)),
    );
    let machine = times(about_z(-head.collimator_deg), about_y(-head.gantry_deg));
    apply(
        times(machine, times(table, oracle_position(position))),
        from_isocentre,
    )
}

fn program(
    from_isocentre: [f64; 3],
    position: PatientPosition,
    couch: CouchAngles,
    head: HeadAngles,
) -> Point<Collimator> {
    let isocentre = Point::<Patient>::new(-3.0, 7.0, 110.0);
    let [x, y, z] = from_isocentre;
    let point = Point::new(isocentre.x_cm + x, isocentre.y_cm + y, isocentre.z_cm + z);
    patient_to_collimator(point, isocentre, position, couch, head)
}

fn assert_point(found: Point<Collimator>, wanted: [f64; 3]) {
    for (found, wanted) in [found.x_cm, found.y_cm, found.z_cm].into_iter().zip(wanted) {
        assert_close(found, wanted, 1e-9);
    }
}

/// All eight positions, four gantry angles, couch and collimator turned, a point on each side of the isocentre.
#[test]
fn verify_every_position_against_matrices() {
    let points = [
        [2.0, 0.0, 0.0],
        [-2.0, 0.0, 0.0],
        [0.0, 3.0, 0.0],
        [0.0, -3.0, 0.0],
        [0.0, 0.0, 4.0],
        [0.0, 0.0, -4.0],
        [1.0, 2.0, 3.0],
    ];
    for position in PatientPosition::ALL {
        for gantry_deg in [0.0, 90.0, 180.0, 270.0, 37.0] {
            for (support_deg, collimator_deg) in
                [(0.0, 0.0), (30.0, 0.0), (0.0, 25.0), (330.0, 75.0)]
            {
                let couch = CouchAngles {
                    support_deg,
                    ..CouchAngles::default()
                };
                let head = HeadAngles {
                    gantry_deg,
                    collimator_deg,
                };
                for point in points {
                    assert_point(
                        program(point, position, couch, head),
                        oracle(point, position, couch, head),
                    );
                }
            }
        }
    }
}

/// In words, from IEC 61217. z_b is toward the source; x_b, y_b as the collimator at 0 has them:
/// x_b along X of the gantry system, y_b toward the gantry.
#[test]
fn verify_cases_in_words() {
    let level = CouchAngles::default();
    let at = |gantry_deg, collimator_deg| HeadAngles {
        gantry_deg,
        collimator_deg,
    };
    let (left, posterior, superior) = ([2.0, 0.0, 0.0], [0.0, 2.0, 0.0], [0.0, 0.0, 2.0]);
    let cases = [
        // Supine, head to the gantry, beam from above: left is to the right of an observer who faces the gantry.
        (left, HeadFirstSupine, at(0.0, 0.0), [2.0, 0.0, 0.0]),
        (posterior, HeadFirstSupine, at(0.0, 0.0), [0.0, 0.0, -2.0]),
        (superior, HeadFirstSupine, at(0.0, 0.0), [0.0, 2.0, 0.0]),
        // Gantry 90: the source is on the patient's left, X of the gantry points down, to the back.
        (left, HeadFirstSupine, at(90.0, 0.0), [0.0, 0.0, 2.0]),
        (posterior, HeadFirstSupine, at(90.0, 0.0), [2.0, 0.0, 0.0]),
        // Gantry 180: from below; the back is toward the source.
        (posterior, HeadFirstSupine, at(180.0, 0.0), [0.0, 0.0, 2.0]),
        (left, HeadFirstSupine, at(180.0, 0.0), [-2.0, 0.0, 0.0]),
        // Gantry 270: source on the patient's right.
        (left, HeadFirstSupine, at(270.0, 0.0), [0.0, 0.0, -2.0]),
        // Feet first supine, gantry 90: source on the patient's right.
        (left, FeetFirstSupine, at(90.0, 0.0), [0.0, 0.0, -2.0]),
        (superior, FeetFirstSupine, at(0.0, 0.0), [0.0, -2.0, 0.0]),
        // Prone, beam from above: the back is toward the source.
        (posterior, HeadFirstProne, at(0.0, 0.0), [0.0, 0.0, 2.0]),
        (left, HeadFirstProne, at(0.0, 0.0), [-2.0, 0.0, 0.0]),
        // On the left side, head to the gantry: the right side faces a beam from above.
        (left, HeadFirstDecubitusLeft, at(0.0, 0.0), [0.0, 0.0, -2.0]),
        // Collimator 90, counter-clockwise seen from the source: x_b now points where y pointed,
        // so a point toward the gantry lies on x_b, and one along X on -y_b.
        (superior, HeadFirstSupine, at(0.0, 90.0), [2.0, 0.0, 0.0]),
        (left, HeadFirstSupine, at(0.0, 90.0), [0.0, -2.0, 0.0]),
    ];
    for (point, position, head, wanted) in cases {
        assert_point(program(point, position, level, head), wanted);
    }
    // Couch 90, counter-clockwise from above: what pointed to the observer's right now points to the gantry,
    // what pointed to the gantry now points to the observer's left.
    let turned = CouchAngles {
        support_deg: 90.0,
        ..level
    };
    assert_point(
        program(left, HeadFirstSupine, turned, at(0.0, 0.0)),
        [0.0, 2.0, 0.0],
    );
    assert_point(
        program(superior, HeadFirstSupine, turned, at(0.0, 0.0)),
        [-2.0, 0.0, 0.0],
    );
    // Pitch 90 about X: the head end goes up. Roll 90 about Y: the observer's right goes down.
    let pitched = CouchAngles {
        pitch_deg: 90.0,
        ..level
    };
    assert_point(
        program(superior, HeadFirstSupine, pitched, at(0.0, 0.0)),
        [0.0, 0.0, 2.0],
    );
    let rolled = CouchAngles {
        roll_deg: 90.0,
        ..level
    };
    assert_point(
        program(left, HeadFirstSupine, rolled, at(0.0, 0.0)),
        [0.0, 0.0, -2.0],
    );
}

/// The source lies on the axis of the collimator system whatever the angles, and at gantry 90 on the
/// fixed system's +X, the left of a patient who lies supine with the head to the gantry.
#[test]
fn verify_source_side() {
    let source = source_in_fixed(90.0, 100.0);
    assert_close(source.x_cm, 100.0, 1e-9);
    let left = patient_to_fixed(
        Vector::new(1.0, 0.0, 0.0),
        HeadFirstSupine,
        CouchAngles::default(),
    );
    assert!(left.x_cm * source.x_cm > 0.0);
}

/// A point 20 cm nearer the source than the isocentre at (4, -2): projected by 100/80 to (5, -2.5), SPD 80.
#[test]
fn verify_projection() {
    let ray = ray_through(Point::new(4.0, -2.0, 20.0), 100.0).unwrap();
    assert_close(ray.spd_cm, 80.0, 1e-12);
    assert_close(ray.projected_cm[0], 5.0, 1e-12);
    assert_close(ray.projected_cm[1], -2.5, 1e-12);
    // Along the ray: sqrt(80^2 + 4^2 + 2^2) = 80.1249.
    assert_close(ray.slant_distance_cm(), 6420.0_f64.sqrt(), 1e-9);
    assert_eq!(ray_through(Point::new(0.0, 0.0, 100.0), 100.0), None);
}

fn any_position() -> impl Strategy<Value = PatientPosition> {
    prop::sample::select(PatientPosition::ALL.to_vec())
}

proptest! {
    /// Any angles: the same as by matrices, and lengths are kept.
    #[test]
    fn property_any_angles_agree_with_matrices(
        position in any_position(),
        angles in prop::array::uniform5(-360.0..360.0_f64),
        point in prop::array::uniform3(-20.0..20.0_f64),
    ) {
        let [support_deg, pitch_deg, roll_deg, gantry_deg, collimator_deg] = angles;
        let couch = CouchAngles { support_deg, pitch_deg, roll_deg };
        let head = HeadAngles { gantry_deg, collimator_deg };
        let found = program(point, position, couch, head);
        assert_point(found, oracle(point, position, couch, head));
        let length: f64 = point.iter().map(|component| component * component).sum::<f64>().sqrt();
        prop_assert!((found.distance_cm(Point::origin()) - length).abs() < 1e-9);
    }
}
