//! The shipped models: they load, pass their own check, and show the trends that any photon model must show
//! (common practice, with the figures' sources beside them).

use counterfoil::beam_model::{
    BeamModel, DataOrigin, ModelSeverity, TableKind, check_machine, load_models,
};
use counterfoil::quantity::{PointSquare, SurfaceSquare};
use jiff::civil::date;

use super::{shipped_folder, shipped_machines, test_folder};

const SSDS_CM: [f64; 4] = [85.0, 100.0, 110.0, 130.0];
const SIDES_CM: [f64; 5] = [5.0, 10.0, 15.0, 20.0, 25.0];

fn pdd(beam: &BeamModel, depth_cm: f64, side_cm: f64, ssd_cm: f64) -> f64 {
    let square = SurfaceSquare::new(side_cm);
    beam.pdd_percent(depth_cm, square, ssd_cm).unwrap().value
}

/// PDD in per cent of the maximum over depths of 0.05 cm, and the depth of that maximum.
fn of_maximum(beam: &BeamModel, depth_cm: f64, side_cm: f64, ssd_cm: f64) -> (f64, f64) {
    let (greatest, at_cm) = (0..120)
        .map(|step| f64::from(step) * 0.05)
        .map(|depth| (pdd(beam, depth, side_cm, ssd_cm), depth))
        .max_by(|one, other| one.0.total_cmp(&other.0))
        .unwrap();
    (
        100.0 * pdd(beam, depth_cm, side_cm, ssd_cm) / greatest,
        at_cm,
    )
}

#[test]
fn verify_shipped_and_test_models_load() {
    let shipped = load_models(&shipped_folder()).unwrap();
    assert_eq!(shipped.known_names(), ["ROWAN-1", "ROWAN-2", "SORREL"]);
    let labels: Vec<Vec<&str>> = shipped
        .machines
        .iter()
        .map(|machine| {
            machine
                .beams
                .iter()
                .map(|beam| beam.label.as_str())
                .collect()
        })
        .collect();
    assert_eq!(labels, [vec!["6", "18"], vec!["6", "6-FFF"]]);
    for machine in &shipped.machines {
        assert_eq!(machine.provenance.origin, DataOrigin::Invented);
        assert!(machine.is_approved_on(date(2026, 11, 2)));
        assert!(machine.is_approved_on(date(2099, 12, 31)));
        assert!(!machine.is_approved_on(date(2026, 11, 1)));
    }
    assert_eq!(
        shipped.machines[0].collimation.leaf_banks[0]
            .boundaries_cm
            .len(),
        61
    );
    let test = load_models(&test_folder()).unwrap();
    assert_eq!(test.known_names(), ["TG71-PDD", "TG71-TPR"]);
}

#[test]
fn verify_shipped_and_test_models_pass_their_check() {
    for folder in [shipped_folder(), test_folder()] {
        for machine in load_models(&folder).unwrap().machines {
            for finding in check_machine(&machine, date(2026, 12, 1)) {
                assert_eq!(
                    finding.severity,
                    ModelSeverity::Note,
                    "{}: {finding}",
                    machine.name
                );
            }
        }
    }
}

#[test]
fn verify_approval_is_looked_at_on_the_day() {
    let [mut machine, _]: [_; 2] = shipped_machines().try_into().unwrap();
    let of_day = |machine: &_, day| check_machine(machine, day).remove(0);
    let early = of_day(&machine, date(2026, 11, 1));
    assert!(early.severity == ModelSeverity::Warning && early.message.contains("from 2026-11-02"));
    let late = of_day(&machine, date(2100, 1, 1));
    assert!(
        late.severity == ModelSeverity::Warning && late.message.contains("ended on 2099-12-31")
    );
    machine.approval = None;
    let never = of_day(&machine, date(2026, 12, 1));
    assert!(
        never.severity == ModelSeverity::Warning && never.message.contains("nobody has approved")
    );
}

#[test]
fn validate_shipped_pdd_at_10_cm_and_d_max() {
    // PDD(10), 10 x 10, SSD 100, of the maximum: 6 MV 66.3 to 67, 6 FFF 63.4 (common practice), 18 MV 79.0 (BJR Supplement 25,
    // from memory). d_max, 5 x 5: 6 MV 1.5, 18 MV 3.5 (IAEA handbook, table 6.I, from memory). Machines of one energy differ.
    let expected = [(66.5, 1.5), (79.0, 3.5), (66.5, 1.5), (63.4, 1.4)];
    let machines = shipped_machines();
    let beams = machines.iter().flat_map(|machine| &machine.beams);
    for (beam, (pdd_10, d_max)) in beams.zip(expected) {
        let (found, _) = of_maximum(beam, 10.0, 10.0, 100.0);
        let (_, at_cm) = of_maximum(beam, 10.0, 5.0, 100.0);
        println!(
            "{}: PDD(10) {found:.2} (about {pdd_10}), d_max at 5 x 5 {at_cm:.2} (about {d_max})",
            beam.label
        );
        assert!((found - pdd_10).abs() < 1.5, "{} {found}", beam.label);
        assert!((at_cm - d_max).abs() < 0.5, "{} {at_cm}", beam.label);
    }
}

#[test]
fn property_energy_orders_maximum_depth_dose_and_surface_dose() {
    let machines = shipped_machines();
    let (six, eighteen) = (&machines[0].beams[0], &machines[0].beams[1]);
    let fff = &machines[1].beams[1];
    for ssd in SSDS_CM {
        for side in SIDES_CM {
            let (_, d_max_6) = of_maximum(six, 10.0, side, ssd);
            let (_, d_max_18) = of_maximum(eighteen, 10.0, side, ssd);
            let (_, d_max_fff) = of_maximum(fff, 10.0, side, ssd);
            assert!(d_max_18 > d_max_6 + 1.0, "{ssd} {side}");
            assert!((d_max_fff - d_max_6).abs() < 0.3, "{ssd} {side}");
            for depth in [5.0, 7.5, 10.0, 15.0, 20.0, 25.0, 30.0] {
                let at = |beam| of_maximum(beam, depth, side, ssd).0;
                assert!(
                    at(eighteen) > at(six) && at(six) > at(fff),
                    "{ssd} {side} {depth}"
                );
            }
            let surface = |beam| of_maximum(beam, 0.0, side, ssd).0;
            assert!(
                surface(eighteen) < surface(six) && surface(six) < surface(fff),
                "{ssd} {side}"
            );
        }
    }
}

#[test]
fn property_pdd_rises_with_the_side_less_and_less() {
    for machine in shipped_machines() {
        for beam in &machine.beams {
            for ssd in SSDS_CM {
                for depth in [5.0, 10.0, 20.0, 30.0] {
                    let values = [5.0, 10.0, 15.0, 20.0, 25.0]
                        .map(|side| of_maximum(beam, depth, side, ssd).0);
                    let steps = [0, 1, 2, 3].map(|index| values[index + 1] - values[index]);
                    assert!(
                        steps.iter().all(|step| *step > 0.0),
                        "{} {ssd} {depth} {steps:?}",
                        beam.label
                    );
                    assert!(
                        steps[3] < steps[0] && steps[2] < steps[0],
                        "{} {ssd} {depth} {steps:?}",
                        beam.label
                    );
                }
            }
        }
    }
}

#[test]
fn property_dose_falls_with_depth_beyond_d_max() {
    // d_max is that of the beam's own table. The TPR of a PDD table peaks a little deeper (no fall by distance): from 0.5 cm below.
    for machine in shipped_machines() {
        for beam in &machine.beams {
            let depths = || (0..).map(|step| beam.d_max_cm + 0.25 * f64::from(step));
            for side in [5.0, 10.0, 20.0, 30.0, 36.0] {
                let tpr = |depth| beam.tpr(depth, PointSquare::new(side)).unwrap().value;
                let from_cm = match beam.table_kind {
                    TableKind::Tpr => beam.d_max_cm,
                    TableKind::Pdd { .. } => beam.d_max_cm + 0.5,
                };
                let tpr: Vec<f64> = depths()
                    .skip_while(|depth| *depth < from_cm)
                    .take_while(|depth| *depth <= 40.0)
                    .map(tpr)
                    .collect();
                assert!(tpr.len() > 100);
                assert!(
                    tpr.windows(2).all(|pair| pair[1] < pair[0]),
                    "{} TPR {side}",
                    beam.label
                );
            }
            for ssd in SSDS_CM {
                for side in [5.0, 10.0, 20.0, 27.0] {
                    // The maximum moves deeper with SSD: from 0.25 cm below it at SSDs beyond 100.
                    let pdd: Vec<f64> = depths()
                        .skip(usize::from(ssd > 100.0))
                        .take_while(|depth| *depth <= 30.0)
                        .map(|depth| pdd(beam, depth, side, ssd))
                        .collect();
                    assert!(
                        pdd.windows(2).all(|pair| pair[1] < pair[0]),
                        "{} PDD {side} {ssd}",
                        beam.label
                    );
                }
            }
        }
    }
}

#[test]
fn validate_pdd_follows_mayneord_with_ssd() {
    // Mayneord's F = ((SSD2 + d0)/(SSD1 + d0))^2 ((SSD1 + d)/(SSD2 + d))^2 leaves out that the field at depth changes: it
    // holds nearly (common practice; 2 % is what hand calculations allow for it). PDD at the maximum's norm rises with SSD.
    let mut differences = Vec::new();
    for machine in shipped_machines() {
        for beam in &machine.beams {
            for (ssd1, ssd2) in [
                (85.0, 100.0),
                (100.0, 110.0),
                (100.0, 130.0),
                (110.0, 130.0),
            ] {
                for depth in [5.0, 10.0, 15.0, 20.0, 30.0] {
                    for side in SIDES_CM {
                        let d0 = beam.output.depth_cm;
                        let factor = ((ssd2 + d0) / (ssd1 + d0)).powi(2)
                            * ((ssd1 + depth) / (ssd2 + depth)).powi(2);
                        let (one, other) =
                            (pdd(beam, depth, side, ssd1), pdd(beam, depth, side, ssd2));
                        differences.push((100.0 * (other / (one * factor) - 1.0)).abs());
                        let (near, far) = (
                            of_maximum(beam, depth, side, ssd1).0,
                            of_maximum(beam, depth, side, ssd2).0,
                        );
                        assert!(far > near, "{} {ssd1} {ssd2} {depth} {side}", beam.label);
                    }
                }
            }
        }
    }
    differences.sort_by(f64::total_cmp);
    let at = |share: f64| differences[((differences.len() - 1) as f64 * share) as usize];
    println!(
        "median {:.2}, 99th {:.2}, maximum {:.2} %",
        at(0.5),
        at(0.99),
        at(1.0)
    );
    assert!(at(0.5) < 0.5 && at(0.99) < 2.0 && at(1.0) < 2.5);
}
