//! Interpolation against values worked by hand; nothing is extrapolated. SciPy's values are held against the
//! program by tests/external.

use counterfoil::beam_model::{DepthInterpolation, Grid};
use proptest::prelude::*;

fn grid(rows: &[f64], values: &[f64], interpolation: DepthInterpolation) -> Grid {
    Grid::new(
        "test",
        ("depth_cm", rows.to_vec()),
        ("side_cm", vec![0.0]),
        values.to_vec(),
        interpolation,
    )
    .unwrap()
}

fn near(found: f64, expected: f64) {
    assert!((found - expected).abs() < 1e-12, "{found}, not {expected}");
}

#[test]
fn verify_bilinear_by_hand() {
    // Corners 10, 20 / 30, 60; at a quarter down and half across: left 15, right 30, middle 22.5.
    let table = Grid::new(
        "test",
        ("depth_cm", vec![0.0, 4.0]),
        ("side_cm", vec![5.0, 15.0]),
        vec![10.0, 20.0, 30.0, 60.0],
        DepthInterpolation::Linear,
    )
    .unwrap();
    near(table.at(1.0, 10.0).unwrap().value, 22.5);
    for (row, column) in [
        (-0.1, 10.0),
        (4.1, 10.0),
        (1.0, 4.9),
        (1.0, 15.1),
        (f64::NAN, 10.0),
    ] {
        assert!(table.at(row, column).is_err());
    }
}

/// What a look-up says about itself is enough to redo it with a pocket calculator.
#[test]
fn verify_a_lookup_shows_what_it_was_interpolated_between() {
    let table = |interpolation| {
        Grid::new(
            "6/tpr.csv",
            ("depth_cm", vec![0.0, 1.0, 3.0]),
            ("side_cm", vec![5.0, 15.0]),
            vec![0.0, 2.0, 1.0, 4.0, 2.0, 6.0],
            interpolation,
        )
        .unwrap()
    };
    let linear = table(DepthInterpolation::Linear);
    // A quarter down from 1 to 3, half across: left 1.25, right 4.5, middle 2.875.
    let lookup = linear.at(1.5, 10.0).unwrap();
    near(lookup.value, 2.875);
    assert_eq!(
        lookup.source(),
        "6/tpr.csv, depth_cm 1 to 3, side_cm 5 to 15 (1 4 | 2 6)"
    );
    // On a row, on a column, on both.
    for (depth_cm, side_cm, text) in [
        (1.0, 10.0, "6/tpr.csv, depth_cm 1, side_cm 5 to 15 (1 4)"),
        (1.5, 15.0, "6/tpr.csv, depth_cm 1 to 3, side_cm 15 (4 | 6)"),
        (3.0, 15.0, "6/tpr.csv, depth_cm 3, side_cm 15 (6)"),
    ] {
        assert_eq!(linear.at(depth_cm, side_cm).unwrap().source(), text);
    }
    // The cubic needs its slopes. Left column as in the uneven table below: 9/13 = 0.692308 and 1/6 = 0.166667.
    // Right column, secants 2 and 1, everything twice as steep: 18/13 = 1.384615 and 1/3 = 0.333333.
    let cubic = table(DepthInterpolation::MonotoneCubic);
    assert_eq!(
        cubic.at(2.0, 10.0).unwrap().source(),
        "6/tpr.csv, depth_cm 1 to 3, side_cm 5 to 15 (1 4 | 2 6; slopes 0.692308 1.384615 | 0.166667 0.333333)"
    );
    assert_eq!(
        cubic.at(1.0, 5.0).unwrap().source(),
        "6/tpr.csv, depth_cm 1, side_cm 5 (1)"
    );
}

#[test]
fn verify_monotone_cubic_by_hand() {
    // Rows 0, 1, 2, 3 with values 0, 1, 4, 9 (secants 1, 3, 5). Inner slopes, weighted harmonic mean with equal steps:
    // 2*1*3/(1+3) = 1.5 and 2*3*5/(3+5) = 3.75. At 1.5: (1+4)/2 + (1.5 - 3.75)/8 = 2.21875.
    let square = grid(
        &[0.0, 1.0, 2.0, 3.0],
        &[0.0, 1.0, 4.0, 9.0],
        DepthInterpolation::MonotoneCubic,
    );
    near(square.at(1.5, 0.0).unwrap().value, 2.218_75);
    // First slope, one-sided: ((2*1 + 1)*1 - 1*3)/2 = 0; at 0.5: 0.5 + (0 - 1.5)/8 = 0.3125.
    near(square.at(0.5, 0.0).unwrap().value, 0.3125);
    // Last slope: ((2 + 1)*5 - 3)/2 = 6; at 2.5: 6.5 + (3.75 - 6)/8 = 6.21875.
    near(square.at(2.5, 0.0).unwrap().value, 6.218_75);
    // Unequal steps: rows 0, 1, 3 with 0, 1, 2 (secants 1, 0.5): weights 2*2+1 = 5 and 2+2*1 = 4;
    // slope 9/(5/1 + 4/0.5) = 9/13; at 2: 1.5 + 2*(9/13 - m)/8 with the last slope
    // m = ((2*2 + 1)*0.5 - 2*1)/3 = 1/6.
    let uneven = grid(
        &[0.0, 1.0, 3.0],
        &[0.0, 1.0, 2.0],
        DepthInterpolation::MonotoneCubic,
    );
    near(
        uneven.at(2.0, 0.0).unwrap().value,
        1.5 + (9.0 / 13.0 - 1.0 / 6.0) / 4.0,
    );
    // A peak stays the peak: slope 0 there, so midway 0.5 * (1 + 0) + (m - 0)/8 with m = 2 limited to the side's secant rule.
    let peak = grid(
        &[0.0, 1.0, 2.0],
        &[0.0, 1.0, 0.0],
        DepthInterpolation::MonotoneCubic,
    );
    // First slope: ((2 + 1)*1 - (-1))/2 = 2, of the secant's sign and below 3 times it: kept; at 0.5: 0.5 + 2/8 = 0.75.
    near(peak.at(0.5, 0.0).unwrap().value, 0.75);
}

proptest! {
    #[test]
    fn property_monotone_cubic_stays_between_its_neighbours(
        values in prop::collection::vec(-10.0_f64..10.0, 3..12),
        steps in prop::collection::vec(0.1_f64..5.0, 12),
        share in 0.0_f64..1.0,
    ) {
        let rows: Vec<f64> = steps
            .iter()
            .take(values.len())
            .scan(0.0, |at, step| { *at += step; Some(*at) })
            .collect();
        let table = grid(&rows, &values, DepthInterpolation::MonotoneCubic);
        for (rows, values) in rows.windows(2).zip(values.windows(2)) {
            let found = table.at(rows[0] + share * (rows[1] - rows[0]), 0.0).unwrap().value;
            let (least, greatest) = (values[0].min(values[1]), values[0].max(values[1]));
            prop_assert!(found >= least - 1e-9 && found <= greatest + 1e-9);
        }
        for (row, value) in rows.iter().zip(&values) {
            prop_assert!((table.at(*row, 0.0).unwrap().value - value).abs() < 1e-12);
        }
    }
}

#[test]
fn validate_monotone_cubic_is_that_of_scipy() {
    // Values by SciPy's PchipInterpolator: tests/external/check_pchip_values.py writes and confirms the file.
    let path = concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/tests/data/interpolation/pchip.csv"
    );
    let mut reader = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .from_path(path)
        .unwrap();
    let rows: Vec<(String, String, f64, f64)> = reader.deserialize().map(Result::unwrap).collect();
    let mut cases: Vec<&str> = rows.iter().map(|row| row.0.as_str()).collect();
    cases.dedup();
    let (mut count, mut worst) = (0, 0.0_f64);
    for case in cases {
        let of_kind = |kind: &str| -> (Vec<f64>, Vec<f64>) {
            let wanted = rows.iter().filter(|row| row.0 == case && row.1 == kind);
            wanted.map(|row| (row.2, row.3)).unzip()
        };
        let (knots_x, knots_y) = of_kind("knot");
        let table = grid(&knots_x, &knots_y, DepthInterpolation::MonotoneCubic);
        let (xs, ys) = of_kind("value");
        for (x, y) in xs.into_iter().zip(ys) {
            let found = table.at(x, 0.0).unwrap().value;
            worst = worst.max((found - y).abs());
            count += 1;
        }
    }
    println!("{count} values, largest difference {worst:.1e}");
    assert!(count > 250 && worst < 1e-12, "{worst}");
}
