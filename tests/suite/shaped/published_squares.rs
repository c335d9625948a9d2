//! Squares, circles and rectangles: the scatter integration against the factor
//! formalism, against published equivalent squares, and a published Sc table
//! against the two-source fit.

use std::fs;
use std::path::{Path, PathBuf};

use counterfoil::beam_model::{
    BeamModel, HeadScatter, JawAxis, MachineModel, TableKind, load_machine, load_models,
};
use counterfoil::dose::{Method, StepLimits, Technique};
use counterfoil::quantity::{Given, PointSquare};

use super::field::{calculate, cgy_per_mu};
use super::kernel_model::{Spoilt, kernel, kernel_machine};
use super::quantiles;
use super::reference::kernel_dose;
use crate::dose::plain_plan;

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

fn tg71(name: &str) -> MachineModel {
    load_machine(&root().join("tests/data/models").join(name)).unwrap()
}

/// Every model at hand: the published TG-71 set in both forms, the shipped ones, the kernel's own.
fn machines() -> Vec<MachineModel> {
    let mut machines = load_models(&root().join("beam-models")).unwrap().machines;
    machines.push(tg71("tg71-tpr"));
    machines.push(tg71("tg71-pdd"));
    machines.push(kernel_machine(Spoilt::No));
    machines
}

/// TPR * Sp by the tables, when they reach.
fn table_dose(beam: &BeamModel, depth_cm: f64, side_cm: f64) -> Option<f64> {
    let square = PointSquare::new(side_cm);
    Some(beam.tpr(depth_cm, square).ok()?.value * beam.sp(square).ok()?.value)
}

/// On the axis of a rectangle, by the kernel.
fn rectangle_dose(beam: &BeamModel, depth_cm: f64, x_cm: f64, y_cm: f64) -> f64 {
    let kernel = beam.scatter_at(depth_cm).unwrap();
    let half = |side: f64| [-side / 2.0, side / 2.0];
    kernel.primary() + kernel.rectangle(half(x_cm), half(y_cm))
}

/// On open squares the integral gives the factor formalism, at the tables' own sides.
#[test]
fn validate_open_squares_give_the_factor_formalism() {
    for machine in machines() {
        for beam in &machine.beams {
            let mut deviations = Vec::new();
            let mut between = Vec::new();
            let deepest_cm = beam.depth_table.rows().last().copied().unwrap();
            let mut depth_cm = beam.d_max_cm;
            while depth_cm <= deepest_cm {
                // A depth dose is given by the side at the surface, which is wider at depth.
                let widening = match beam.table_kind {
                    TableKind::Tpr => 1.0,
                    TableKind::Pdd { ssd_cm } => (ssd_cm + depth_cm) / ssd_cm,
                };
                let compare = |side_cm: f64, into: &mut Vec<f64>| {
                    if let Some(table) = table_dose(beam, depth_cm, side_cm) {
                        let found = rectangle_dose(beam, depth_cm, side_cm, side_cm);
                        into.push(100.0 * (found / table - 1.0));
                    }
                };
                let sides: Vec<f64> = beam
                    .depth_table
                    .columns()
                    .iter()
                    .map(|side_cm| side_cm * widening)
                    .collect();
                for &side_cm in &sides {
                    compare(side_cm, &mut deviations);
                }
                // Half-way between two sides the table is a straight line and the kernel a curve.
                for pair in sides.windows(2) {
                    compare(f64::midpoint(pair[0], pair[1]), &mut between);
                }
                depth_cm += 0.7;
            }
            let found = quantiles(&deviations);
            println!(
                "{} {}: {} squares, median {:.3} %, maximum {:.3} %; between the sides maximum {:.3} %",
                machine.name,
                beam.label,
                found.count,
                found.median,
                found.maximum,
                quantiles(&between).maximum
            );
            assert!(
                found.maximum <= 0.2,
                "{} {} {found:?}",
                machine.name,
                beam.label
            );
            // The straight line lies below the curve, so the table is what is off there.
            let between = quantiles(&between);
            // Three decimals make the TG-71 columns fall where they should rise (.524 .522 at 25 cm): printed only.
            assert!(
                machine.name.starts_with("tg71") || between.maximum <= 0.3,
                "{} {} {between:?}",
                machine.name,
                beam.label
            );
        }
    }
}

/// The whole way of a plan: a square made by leaves that stand a hair inside the jaws is integrated, the same square
/// made by jaws alone is multiplied out.
#[test]
fn validate_a_leaf_made_square_equals_the_jaw_made_one() {
    let machine = kernel_machine(Spoilt::No);
    for side_cm in [4.0, 7.0, 10.0, 18.0, 30.0] {
        for ssd_cm in [85.0, 92.0, 97.0] {
            let jaws = [-side_cm / 2.0, side_cm / 2.0];
            let mut plan = plain_plan();
            for point in &mut plan.beams[0].control_points {
                point.jaws_x_cm = counterfoil::quantity::Given::stated(jaws);
                point.jaws_y_cm = counterfoil::quantity::Given::stated(jaws);
                point.ssd_cm = counterfoil::quantity::Given::stated(ssd_cm);
            }
            let open = calculate(&plan, &machine, StepLimits::default());
            assert_eq!(open.method, Some(Method::Factors));
            let inside = super::field::Aperture::closed(1.0);
            let half = side_cm / 2.0 - 0.002;
            let inside = inside.open([-half, half], [-20.0, 20.0]);
            let field = super::field::Field {
                class: "square",
                apertures: vec![inside],
                point_cm: [0.0, 0.0],
                spd_cm: 100.0,
                depth_cm: 100.0 - ssd_cm,
            };
            let mut plan = field.plan();
            for point in &mut plan.beams[0].control_points {
                point.jaws_x_cm = counterfoil::quantity::Given::stated(jaws);
                point.jaws_y_cm = counterfoil::quantity::Given::stated(jaws);
            }
            let shaped = calculate(&plan, &machine, StepLimits::default());
            assert_eq!(shaped.method, Some(Method::ScatterIntegration));
            let percent = 100.0 * (cgy_per_mu(&shaped) / cgy_per_mu(&open) - 1.0);
            assert!(percent.abs() < 0.2, "{side_cm} {ssd_cm} {percent}");
        }
    }
}

/// Equivalent squares of BJR Supplement 25 (Day & Aird), from memory: the dose they imply, not the side.
#[test]
fn validate_rectangles_against_bjr_25_equivalent_squares() {
    const RECTANGLES: [(f64, f64, f64); 11] = [
        (4.0, 10.0, 5.8),
        (4.0, 20.0, 6.7),
        (6.0, 12.0, 8.0),
        (8.0, 16.0, 10.5),
        (8.0, 20.0, 11.1),
        (10.0, 15.0, 11.9),
        (10.0, 20.0, 13.0),
        (10.0, 30.0, 13.9),
        (12.0, 20.0, 14.7),
        (14.0, 20.0, 16.3),
        (20.0, 30.0, 23.3),
    ];
    for machine in machines() {
        for beam in &machine.beams {
            for depth_cm in [5.0, 10.0, 20.0] {
                let mut deviations = Vec::new();

                for (a_cm, b_cm, side_cm) in RECTANGLES {
                    let Some(table) = table_dose(beam, depth_cm, side_cm) else {
                        continue;
                    };
                    for (x_cm, y_cm) in [(a_cm, b_cm), (b_cm, a_cm)] {
                        let found = rectangle_dose(beam, depth_cm, x_cm, y_cm);
                        let percent = 100.0 * (found / table - 1.0);
                        deviations.push(percent);
                    }
                }
                let found = quantiles(&deviations);
                println!(
                    "{} {}, depth {depth_cm} cm: {} rectangles, mean {:+.3} %, maximum {:.3} %",
                    machine.name, beam.label, found.count, found.mean, found.maximum
                );
                // One square for every depth: at 20 cm, where scatter counts most, 10 x 30 alone is a per cent apart
                // (exact kernels give 14.4 to 14.7 where this table has 13.9), so that depth is printed only.
                assert!(
                    depth_cm > 10.0 || found.maximum <= 0.7,
                    "{} {} {found:?}",
                    machine.name,
                    beam.label
                );
            }
        }
    }
}

/// A circle put together from strips is what the table says of its equivalent square: side over diameter 0.891
/// (Bjarngard & Siddon 1982, Med Phys 9:258).
#[test]
fn validate_a_circle_by_strips_equals_the_table() {
    for machine in machines() {
        for beam in &machine.beams {
            let mut greatest = 0.0_f64;
            for side_cm in [6.0_f64, 10.0, 15.0, 20.0] {
                for depth_cm in [5.0, 10.0, 20.0] {
                    let radius_cm = side_cm / 0.891 / 2.0;
                    let kernel = beam.scatter_at(depth_cm).unwrap();
                    let count = 400;
                    let strips: f64 = (0..count)
                        .map(|strip| {
                            let edge = |strip: i32| {
                                radius_cm * (2.0 * f64::from(strip) / f64::from(count) - 1.0)
                            };
                            let (low, high) = (edge(strip), edge(strip + 1));
                            let middle = f64::midpoint(low, high);
                            let half = (radius_cm.powi(2) - middle.powi(2)).sqrt();
                            kernel.rectangle([-half, half], [low, high])
                        })
                        .sum();
                    let found = kernel.primary() + strips;
                    let by_sectors = kernel.circle(radius_cm);
                    assert!(
                        (found / by_sectors - 1.0).abs() < 2e-4,
                        "{found} {by_sectors}"
                    );
                    // The ratio is that of mean radii, for scatter linear in the radius; deeper down it levels off.
                    let table = table_dose(beam, depth_cm, side_cm).unwrap();
                    let percent = 100.0 * (found / table - 1.0);
                    greatest = greatest.max(percent.abs());
                    assert!(depth_cm > 10.0 || percent.abs() <= 0.3, "{percent}");
                }
            }
            println!(
                "{} {}: circles against squares up to {greatest:.3} %",
                machine.name, beam.label
            );
        }
    }
}

/// The published TG-71 6 MV Sc table with distances of jaws and filter as they are common (28, 37 and 12 cm; common
/// practice, the set does not state them): fitted by two sources and a monitor term within 0.3 %.
#[test]
fn validate_the_two_source_fit_of_the_published_sc_table() {
    let mut machine = tg71("tg71-tpr");
    for (jaw, distance_cm) in machine.collimation.jaws.iter_mut().zip([28.0, 37.0]) {
        jaw.source_distance_cm = Some(distance_cm);
    }
    let mut beam = machine.beams.remove(0);
    beam.extra_focal_distance_cm = Some(12.0);
    let fitted = HeadScatter::fit(100.0, &machine.collimation, &beam).unwrap();
    println!("{fitted:?}");
    assert!(fitted.residual_percent <= 0.3, "{fitted:?}");
    assert!(fitted.extra_focal > 0.0 && fitted.backscatter_per_cm >= 0.0);
}

/// By hand: source-axis distance 100, extra-focal plane at 12, a device at 50 and an edge 5 cm from the axis there is at
/// 2.5 cm; the ray from the axis at the isocentre goes on to 2.5 * (100 - 12)/(100 - 50) = 4.4 cm. For a point 3 cm off the
/// axis: 3 + (2.5 - 3) * 88/50 = 2.12 cm. A Gaussian of 2.2 cm is seen between -4.4 and 4.4, two sigmas on either
/// side, to 0.9545 along one axis (tables of the normal distribution).
#[test]
fn verify_head_scatter_windows_by_hand() {
    let head = HeadScatter {
        sad_cm: 100.0,
        plane_cm: 12.0,
        sigma_cm: 2.2,
        extra_focal: 0.08,
        backscatter_per_cm: 0.001,
        residual_percent: 0.0,
    };
    let centred = head.window([-5.0, 5.0], 0.0, 50.0);
    assert!((centred.bounds_cm[1] - 4.4).abs() < 1e-12);
    let off = head.window([-5.0, 5.0], 3.0, 50.0);
    assert!((off.bounds_cm[1] - 2.12).abs() < 1e-12);
    let seen = head.visible(centred, centred);
    assert!((seen - 0.9545 * 0.9545).abs() < 1e-4, "{seen}");
    // 1 + 0.08 * 0.911 + 0.001 * 10 = 1.0829
    assert!((head.output(seen, 10.0) - 1.082_89).abs() < 1e-4);
}

/// The pair nearer to the source limits the view of the extra-focal source more: a long field lets more head scatter
/// through when the nearer (upper) pair is the open one (the collimator exchange effect, Kase & Svensson 1986; from memory).
#[test]
fn verify_exchanging_the_jaws_changes_the_head_scatter() {
    let machine = load_machine(&root().join("beam-models/rowan")).unwrap();
    let head = machine.beams[0].head_scatter.unwrap();
    let distance = |axis| {
        machine
            .collimation
            .jaw(axis)
            .unwrap()
            .source_distance_cm
            .unwrap()
    };
    let (x_cm, y_cm) = (distance(JawAxis::X), distance(JawAxis::Y));
    assert!(y_cm < x_cm);
    let half = |side: f64| [-side / 2.0, side / 2.0];
    let seen = |x: f64, y: f64| {
        head.visible(
            head.window(half(x), 0.0, x_cm),
            head.window(half(y), 0.0, y_cm),
        )
    };
    let (upper_open, lower_open) = (seen(5.0, 30.0), seen(30.0, 5.0));
    assert!(upper_open > lower_open, "{upper_open} {lower_open}");
}

/// What Sc the fit starts from comes back exactly on jaw rectangles: the aperture that equals its jaws has the table's Sc.
#[test]
fn verify_an_aperture_as_wide_as_its_jaws_has_the_tables_sc() {
    let folder = tempfile::tempdir().unwrap();
    copy(&root().join("beam-models/rowan"), folder.path());
    let machine = load_machine(folder.path()).unwrap();
    let beam = &machine.beams[0];
    let head = beam.head_scatter.unwrap();
    for (row, &side_cm) in beam.output_factors.sc.rows().iter().enumerate() {
        let table = beam.output_factors.sc.cell_value(row, 0).unwrap();
        let half = [-side_cm / 2.0, side_cm / 2.0];
        let x = head.window(half, 0.0, 37.0);
        let y = head.window(half, 0.0, 28.0);
        let jaws = head.output(head.visible(x, y), side_cm);
        // The leaves stand back by a millimetre: the windows are the jaws' own.
        let wide = [half[0] - 0.1, half[1] + 0.1];
        let leaves = head.window(wide, 0.0, 50.0);
        let aperture = head.output(head.visible(leaves.and(x), leaves.and(y)), side_cm);
        assert!((table * aperture / jaws - table).abs() < 1e-12);
    }
}

fn copy(from: &Path, to: &Path) {
    for entry in fs::read_dir(from).unwrap() {
        let entry = entry.unwrap();
        let target = to.join(entry.file_name());
        if entry.path().is_dir() {
            fs::create_dir(&target).unwrap();
            copy(&entry.path(), &target);
        } else {
            fs::copy(entry.path(), target).unwrap();
        }
    }
}

/// Long fields of jaws alone, through a whole plan: the kernel's own integral over the rectangle, which the equivalent
/// square misses by up to 0.35 % at this depth.
#[test]
fn validate_long_fields_against_the_published_kernel() {
    let machine = kernel_machine(Spoilt::No);
    let of = |[x_cm, y_cm]: [f64; 2]| {
        let mut plan = plain_plan();
        plan.beams[0].machine = Given::stated("KERNEL".to_owned());
        for point in &mut plan.beams[0].control_points {
            point.jaws_x_cm = Given::stated([-x_cm / 2.0, x_cm / 2.0]);
            point.jaws_y_cm = Given::stated([-y_cm / 2.0, y_cm / 2.0]);
        }
        calculate(&plan, &machine, StepLimits::default())
    };
    let square = of([10.0, 10.0]);
    assert_eq!(square.method, Some(Method::Factors));
    let depth_cm = square.depths[0].effective_cm;
    let half = |side: f64| [-side / 2.0, side / 2.0];
    let exact =
        |[x_cm, y_cm]: [f64; 2]| kernel_dose(&kernel(), &[(half(x_cm), half(y_cm))], depth_cm);
    for sides_cm in [
        [36.0, 5.0],
        [5.0, 36.0],
        [20.0, 4.0],
        [6.0, 30.0],
        [10.0, 21.0],
    ] {
        let long = of(sides_cm);
        assert_eq!(long.technique, Technique::Static);
        assert_eq!(long.method, Some(Method::ScatterIntegration));
        let ratio = cgy_per_mu(&long) / cgy_per_mu(&square);
        let wanted = exact(sides_cm) / exact([10.0, 10.0]);
        let deviation = 100.0 * (ratio / wanted - 1.0);
        println!("{sides_cm:?}: {deviation:+.3} %; {:?}", long.remarks);
        assert!(deviation.abs() < 0.3, "{sides_cm:?} {deviation}");
    }
    // An elongation of 2 is not beyond 2; and without a penumbra there is no integral.
    assert_eq!(of([20.0, 10.0]).method, Some(Method::Factors));
    let by_square = of([36.0, 5.0]).remarks.join("\n");
    assert!(
        by_square.contains("by its equivalent square the dose would be"),
        "{by_square}"
    );
}

#[test]
fn verify_a_long_field_without_a_penumbra_goes_by_its_square() {
    let mut machine = kernel_machine(Spoilt::No);
    machine.beams[0].penumbra = None;
    let mut plan = plain_plan();
    plan.beams[0].machine = Given::stated("KERNEL".to_owned());
    for point in &mut plan.beams[0].control_points {
        point.jaws_x_cm = Given::stated([-15.0, 15.0]);
        point.jaws_y_cm = Given::stated([-3.0, 3.0]);
    }
    let result = calculate(&plan, &machine, StepLimits::default());
    assert_eq!(result.method, Some(Method::Factors));
    let spread = result.spread.unwrap();
    assert!(
        spread
            .terms
            .iter()
            .any(|term| term.name == "elongated field")
    );
}
