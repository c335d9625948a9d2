//! Typing errors planted in the shipped tables: the model check must point at the cell.

use counterfoil::beam_model::{
    DepthInterpolation, Grid, MachineModel, ModelFinding, ModelSeverity, check_machine,
};
use jiff::civil::date;

use super::{shipped_machines, test_folder};

/// The grid with one cell multiplied.
fn spoilt(
    grid: &Grid,
    names: (&'static str, &'static str),
    cell: (usize, usize),
    factor: f64,
) -> Grid {
    let width = grid.columns().len();
    let mut values: Vec<f64> = (0..grid.rows().len() * width)
        .map(|index| grid.cell_value(index / width, index % width).unwrap())
        .collect();
    values[cell.0 * width + cell.1] *= factor;
    Grid::new(
        grid.name(),
        (names.0, grid.rows().to_vec()),
        (names.1, grid.columns().to_vec()),
        values,
        DepthInterpolation::Linear,
    )
    .unwrap()
}

/// Findings beyond notes, and whether one of them points at the cell.
fn points_at(machine: &MachineModel, row: f64, column: Option<f64>) -> (bool, Vec<ModelFinding>) {
    let findings: Vec<_> = check_machine(machine, date(2026, 12, 1))
        .into_iter()
        .filter(|finding| finding.severity > ModelSeverity::Note)
        .collect();
    let found = findings.iter().any(|finding| {
        finding
            .place
            .as_ref()
            .is_some_and(|place| place.row == row && place.column.map(|(_, value)| value) == column)
    });
    (found, findings)
}

/// Machines of one beam each, so that a check costs no more than it must.
fn single_beams() -> Vec<MachineModel> {
    let mut all = shipped_machines();
    all.extend(
        counterfoil::beam_model::load_models(&test_folder())
            .unwrap()
            .machines,
    );
    all.into_iter()
        .flat_map(|machine| {
            (0..machine.beams.len()).map(move |index| {
                let mut one = machine.clone();
                one.beams = vec![machine.beams[index].clone()];
                one
            })
        })
        .collect()
}

#[test]
fn validate_planted_errors_in_depth_tables_are_pointed_at() {
    for percent in [2.0, 3.0] {
        let (mut planted, mut found) = (0, 0);
        let mut missed = Vec::new();
        for machine in single_beams() {
            let table = machine.beams[0].depth_table.clone();
            for (row, &depth) in table.rows().iter().enumerate() {
                if depth < machine.beams[0].d_max_cm {
                    continue;
                }
                for (column, &side) in table.columns().iter().enumerate() {
                    let sign = if (row + column) % 2 == 0 { 1.0 } else { -1.0 };
                    let mut spoilt_machine = machine.clone();
                    spoilt_machine.beams[0].depth_table = spoilt(
                        &table,
                        ("depth_cm", "side_cm"),
                        (row, column),
                        1.0 + sign * percent / 100.0,
                    );
                    planted += 1;
                    if points_at(&spoilt_machine, depth, Some(side)).0 {
                        found += 1;
                    } else {
                        missed.push((
                            machine.name.clone(),
                            machine.beams[0].label.clone(),
                            depth,
                            side,
                        ));
                    }
                }
            }
        }
        println!("{percent} %: {found} of {planted} cells pointed at; missed {missed:?}");
        assert!(planted > 1000);
        if percent >= 3.0 {
            assert!(missed.is_empty(), "{percent} %: {missed:?}");
        } else {
            // The printed TG-71 tables scatter by up to 0.7 %, which can hide part of 2 %; smooth tables hide nothing.
            assert!(
                missed.iter().all(|(name, ..)| name.starts_with("tg71")),
                "{missed:?}"
            );
            assert!(missed.len() * 200 < planted, "{missed:?}");
        }
    }
}

#[test]
fn validate_planted_errors_of_3_percent_in_output_and_off_axis_tables_are_pointed_at() {
    let mut planted = 0;
    for machine in single_beams() {
        let beam = &machine.beams[0];
        for (name, grid) in [
            ("sc", &beam.output_factors.sc),
            ("sp", &beam.output_factors.sp),
        ] {
            for (row, &side) in grid.rows().iter().enumerate() {
                let mut spoilt_machine = machine.clone();
                let spoilt = spoilt(grid, ("side_cm", name), (row, 0), 1.03);
                let factors = &mut spoilt_machine.beams[0].output_factors;
                *if name == "sc" {
                    &mut factors.sc
                } else {
                    &mut factors.sp
                } = spoilt;
                planted += 1;
                let (found, findings) = points_at(&spoilt_machine, side, None);
                assert!(
                    found,
                    "{} {} {name} {side}: {findings:?}",
                    machine.name, beam.label
                );
            }
        }
        let grid = &beam.off_axis.grid;
        for (row, &radius) in grid.rows().iter().enumerate() {
            for (column, &depth) in grid.columns().iter().enumerate() {
                let mut spoilt_machine = machine.clone();
                spoilt_machine.beams[0].off_axis.grid =
                    spoilt(grid, ("radius_cm", "depth_cm"), (row, column), 0.97);
                planted += 1;
                let (found, findings) = points_at(&spoilt_machine, radius, Some(depth));
                assert!(
                    found,
                    "{} {} {radius} {depth}: {findings:?}",
                    machine.name, beam.label
                );
            }
        }
    }
    println!("{planted} planted, all pointed at");
}

#[test]
fn verify_a_row_under_the_wrong_depth_and_a_shallow_d_max_are_pointed_at() {
    // The row of 18 cm typed under 17 (and that of 17 missing): 4.5 % too low at 17 cm (attenuation of 6 MV, 0.045 per cm).
    let mut machine = single_beams().remove(0);
    let grid = machine.beams[0].depth_table.clone();
    let width = grid.columns().len();
    let wrong = grid.rows().iter().position(|depth| *depth == 17.0).unwrap();
    let values = (0..grid.rows().len() * width)
        .map(|index| {
            let row = index / width + usize::from(index / width == wrong);
            grid.cell_value(row, index % width).unwrap()
                * if row == index / width { 1.0 } else { 1.000_1 }
        })
        .collect();
    machine.beams[0].depth_table = Grid::new(
        grid.name(),
        ("depth_cm", grid.rows().to_vec()),
        ("side_cm", grid.columns().to_vec()),
        values,
        DepthInterpolation::Linear,
    )
    .unwrap();
    let (found, findings) = points_at(&machine, 17.0, None);
    assert!(found, "{findings:?}");

    // Tables with their maximum at 1.5 cm and a d_max of 1.2 in machine.toml.
    let mut machine = single_beams().remove(0);
    machine.beams[0].d_max_cm = 1.2;
    let (found, findings) = points_at(&machine, 1.5, Some(10.0));
    assert!(found, "{findings:?}");
    assert!(
        findings
            .iter()
            .any(|finding| finding.severity == ModelSeverity::Error)
    );
}

#[test]
fn verify_slips_of_single_numbers_are_pointed_at() {
    let with = |change: fn(&mut MachineModel)| {
        let mut machine = single_beams().remove(0);
        change(&mut machine);
        let findings = check_machine(&machine, date(2026, 12, 1));
        let texts: Vec<String> = findings
            .into_iter()
            .filter(|finding| finding.severity > ModelSeverity::Note)
            .map(|finding| finding.message)
            .collect();
        texts.join("; ")
    };
    // S_ref of another setup: 97 cm belongs to none.
    assert!(with(|machine| machine.beams[0].output.source_distance_cm = 97.0).contains("S_ref"));
    // The 6 MV table under the name of 18 MV: TPR20,10 0.67 where 0.78 is usual (common practice).
    assert!(with(|machine| machine.beams[0].nominal_energy = 18.0).contains("another energy"));
    assert!(with(|machine| machine.beams[0].exchange_k = 0.5).contains("exchange_k"));
    assert!(with(|machine| machine.beams[0].trays[0].1 = 0.79).contains("tray"));
    assert!(with(|machine| machine.beams[0].couch[0].transmission = 0.5).contains("couch"));
    assert!(
        with(|machine| machine.beams[0].uncertainty.output_percent = 0.0)
            .contains("output_percent")
    );
    assert!(with(|machine| machine.beams[0].output.dose_per_mu_cgy = 0.6).contains("D'0"));
}
