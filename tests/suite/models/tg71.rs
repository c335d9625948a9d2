//! The AAPM TG-71 6 MV data set: PDD against TPR, both routes, the quality relation.

use counterfoil::beam_model::{
    TableKind, derivable_grid, derive_table, load_machine, tpr20_10_from_pdd20_10,
};
use counterfoil::quantity::{CollimatorSquare, PointSquare, SurfaceSquare};

use super::{copy_of, edit, shipped_machines, tg71_beam};

fn percentile(sorted: &[f64], share: f64) -> f64 {
    sorted[((sorted.len() - 1) as f64 * share).round() as usize]
}

#[test]
fn verify_one_conversion_by_hand() {
    // TPR(15, s_d = 11.5) from the PDD of side 10 at SSD 100: PDD 75.9 %; s_d0 = 10 * 110/100 = 11.0.
    // Sp(11.0) = 1 + 0.02/2 = 1.010; Sp(11.5) = 1 + 0.02 * 1.5/2 = 1.015;
    // (115/110)^2 = 1.0929752; TPR = 0.759 * 1.0929752 * 1.010/1.015 = 0.825482.
    let beam = tg71_beam("tg71-pdd");
    let tpr = beam.tpr(15.0, PointSquare::new(11.5)).unwrap();
    assert!((tpr.value - 0.825_482).abs() < 1e-6, "{}", tpr.value);
}

#[test]
fn verify_look_ups_of_a_hand_calculation() {
    // AAPM TG-71 tables, a 15 cm square at SSD 100, 8 cm deep: Sc between 14 and 16: 1.016; at d0 the side is 16.5,
    // Sp between 16 and 20: 1.051 + 0.025 * 0.5/4 = 1.054125; PDD as printed, 110.3.
    let beam = tg71_beam("tg71-pdd");
    let near = |found: f64, expected: f64| assert!((found - expected).abs() < 1e-12, "{found}");
    near(beam.sc(CollimatorSquare::new(15.0)).unwrap().value, 1.016);
    let at_d0 = PointSquare::new(16.2).at_reference_depth(100.0, 10.0, 108.0);
    near(beam.sp_at_d0(at_d0).unwrap().value, 1.054_125);
    near(
        beam.pdd_percent(8.0, SurfaceSquare::new(15.0), 100.0)
            .unwrap()
            .value,
        110.3,
    );
    // Off axis 5 cm at 9 cm depth, between 4 and 6 cm: at 8 cm (1.030 + 1.036)/2 = 1.033, at 10 cm (1.028 + 1.030)/2 = 1.029, midway 1.031.
    near(beam.off_axis_ratio(5.0, 9.0).unwrap().value, 1.031);
    assert!(
        beam.pdd_percent(1.4, SurfaceSquare::new(15.0), 100.0)
            .is_err()
    );
    assert!(
        beam.pdd_percent(25.1, SurfaceSquare::new(15.0), 100.0)
            .is_err()
    );
    assert!(beam.sc(CollimatorSquare::new(40.1)).is_err());
}

#[test]
fn validate_tg71_pdd_converts_to_its_tpr() {
    // 95 % of cells within 0.3 %, deepest cells included; the side-30 column stands apart: its values differ by
    // up to 1.1 % at 25 cm, which is suspect in the public copy that was read, and it is left out of the percentile.
    let beam = tg71_beam("tg71-pdd");
    let table = tg71_beam("tg71-tpr").depth_table;
    let (mut differences, mut side_30) = (Vec::new(), Vec::new());
    for (row, &depth) in table.rows().iter().enumerate() {
        for (column, &side) in table.columns().iter().enumerate() {
            let Ok(converted) = beam.tpr(depth, PointSquare::new(side)) else {
                continue;
            };
            let printed = table.cell_value(row, column).unwrap();
            let difference = 100.0 * (converted.value / printed - 1.0);
            if side == 30.0 {
                side_30.push((depth, difference));
            } else if depth != 10.0 {
                differences.push(difference.abs());
            }
        }
    }
    differences.sort_by(f64::total_cmp);
    let (median, p95, p99) = (
        percentile(&differences, 0.5),
        percentile(&differences, 0.95),
        percentile(&differences, 0.99),
    );
    let maximum = percentile(&differences, 1.0);
    println!(
        "{} cells: median {median:.3}, 95th {p95:.3}, 99th {p99:.3}, maximum {maximum:.3} %; side 30: {side_30:.2?}",
        differences.len()
    );
    assert!(differences.len() > 130);
    assert!(median <= 0.10, "{median}");
    assert!(p95 <= 0.30, "{p95}");
    assert!(p99 <= 0.40, "{p99}");
    assert!(maximum <= 0.50, "{maximum}");
    // The named exception: -0.5 % at 18 cm, -1.1 % at 25 cm.
    let at = |wanted: f64| {
        side_30
            .iter()
            .find(|(depth, _)| *depth == wanted)
            .unwrap()
            .1
    };
    assert!((at(18.0) + 0.5).abs() < 0.1, "{}", at(18.0));
    assert!((at(25.0) + 1.1).abs() < 0.1, "{}", at(25.0));
}

#[test]
fn verify_quality_relation() {
    // TPR20,10 = 1.2661 PDD20,10 - 0.0595 (IAEA TRS-398; Followill et al. 1998); by hand, e.g. 1.2661 * 0.5 - 0.0595.
    for (pdd, tpr) in [
        (0.50, 0.573_55),
        (0.54, 0.624_194),
        (0.575, 0.668_507_5),
        (0.60, 0.700_16),
        (0.64, 0.750_804),
    ] {
        assert!((tpr20_10_from_pdd20_10(pdd) - tpr).abs() < 1e-9);
    }
    // AAPM TG-71: PDD20,10 = 57.6/100, TPR20,10 = .672/1.
    let pdd = tg71_beam("tg71-pdd")
        .depth_table
        .at(20.0, 10.0)
        .unwrap()
        .value;
    assert!((pdd - 57.6).abs() < 1e-12);
    assert!((tpr20_10_from_pdd20_10(pdd / 100.0) - 0.672).abs() < 0.003);
}

#[test]
fn property_pdd_of_a_derived_tpr_table_is_the_pdd_again() {
    // A PDD model's TPR, written as a table, loaded as a TPR model, must give the PDD back at the nodes of that table.
    let pdd_beam = tg71_beam("tg71-pdd");
    let (depths, sides) = derivable_grid(&pdd_beam, TableKind::Tpr);
    assert_eq!(depths.len(), 16);
    // Sp is tabulated from 4 to 40: side 4 at 25 cm is 4 * 110/125 = 3.52 at d0, side 40 at 1.5 cm is 40 * 110/101.5 = 43.3.
    // Nothing is extrapolated, so 3, 4 and 40 drop out.
    assert_eq!(sides, [5.0, 6.0, 8.0, 10.0, 12.0, 15.0, 20.0, 30.0]);
    assert!(derive_table(&pdd_beam, TableKind::Tpr, &depths, &[4.0]).is_err());
    let derived = derive_table(&pdd_beam, TableKind::Tpr, &depths, &sides).unwrap();

    let copy = copy_of("tg71-pdd");
    std::fs::write(
        copy.path().join("6/pdd.csv"),
        derived.to_csv(&["derived\nfrom PDD"]),
    )
    .unwrap();
    edit(
        &copy,
        "machine.toml",
        "kind = \"pdd\"\nssd_cm = 100.0",
        "kind = \"tpr\"",
    );
    edit(&copy, "machine.toml", "\"percent\"", "\"share\"");
    let tpr_beam = &load_machine(copy.path()).unwrap().beams[0];
    for &depth in &depths {
        for &side in &sides {
            let direct = pdd_beam.tpr(depth, PointSquare::new(side)).unwrap().value;
            let loaded = tpr_beam.tpr(depth, PointSquare::new(side)).unwrap().value;
            assert!((direct - loaded).abs() <= 5.1e-6, "{depth} {side}");
        }
    }
    // Back to PDD at other SSDs: both beams agree where the point's side is a node.
    for ssd in [80.0, 100.0, 120.0] {
        for &depth in &depths {
            let surface = SurfaceSquare::new(10.0 * ssd / (ssd + depth));
            let one = pdd_beam.pdd_percent(depth, surface, ssd).unwrap().value;
            let other = tpr_beam.pdd_percent(depth, surface, ssd).unwrap().value;
            assert!(
                (one / other - 1.0).abs() < 1e-5,
                "{ssd} {depth}: {one} {other}"
            );
        }
    }
}

#[test]
fn property_both_routes_agree_on_every_shipped_beam() {
    // PDD at any SSD turned back into TPR by the AAPM TG-71 relation, written out here a second time, is the TPR.
    for machine in shipped_machines() {
        for beam in &machine.beams {
            let d0 = beam.output.depth_cm;
            for ssd in [85.0, 100.0, 115.0] {
                for depth in [2.0, 4.0, 7.3, 10.0, 18.5, 29.0] {
                    for side in [5.0, 9.7, 18.0, 27.0] {
                        let point = side * (ssd + depth) / ssd;
                        let sp = |side: f64| beam.sp(PointSquare::new(side)).unwrap().value;
                        let pdd = beam
                            .pdd_percent(depth, SurfaceSquare::new(side), ssd)
                            .unwrap()
                            .value;
                        let tpr = beam.tpr(depth, PointSquare::new(point)).unwrap().value;
                        let back = pdd / 100.0
                            * ((ssd + depth) / (ssd + d0)).powi(2)
                            * sp(side * (ssd + d0) / ssd)
                            / sp(point);
                        assert!(
                            (back / tpr - 1.0).abs() < 1e-12,
                            "{} {ssd} {depth} {side}",
                            beam.label
                        );
                    }
                }
            }
        }
    }
}
