//! The parts of a run, one at a time: telling what a file is, reading it,
//! auditing it. `cargo bench --bench parts`.

#[allow(
    dead_code,
    unused_imports,
    reason = "the tests' tool kit; a benchmark needs little of it"
)]
#[path = "../suite/builder/mod.rs"]
mod builder;

use std::fs;
use std::path::{Path, PathBuf};

use builder::{BeamSpec, DeviceSpec, PlanSpec, ReferenceSpec};
use counterfoil::audit::{PlanEntry, PlanInput, Rivals, audit_plan};
use counterfoil::beam_model::{ModelSet, load_models};
use counterfoil::dose::{BeamRequest, ModelAnswer, StepLimits, calculate_beam};
use counterfoil::intake::read_file;
use counterfoil::plan::{Plan, identify, read_plan};
use counterfoil::quantity::sha256_hex;
use counterfoil::settings::Site;
use divan::counter::BytesCount;
use divan::{Bencher, black_box};

fn main() {
    divan::main();
}

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).to_path_buf()
}

/// Two arcs of 178 control points with 60 leaf pairs that move at each.
fn arcs() -> Vec<u8> {
    let arc = |number: i32| {
        let leaves: Vec<f64> = (0..120)
            .map(|leaf| {
                let lower = -2.0 - f64::from(leaf % 60) / 37.0;
                if leaf < 60 { lower } else { -lower }
            })
            .collect();
        let mut beam = BeamSpec::new(number, "Arc")
            .with_leaves(DeviceSpec::leaves("MLCX", 60, 0.5), leaves.clone())
            .with_arc(179.0, "CW", 178);
        for (index, point) in (0_i32..).zip(&mut beam.control_points) {
            let shift = f64::from(index % 50) / 83.0;
            let moved = leaves.iter().map(|position| position + shift).collect();
            point.positions_cm.retain(|(kind, _)| kind != "MLCX");
            point.positions_cm.push(("MLCX".to_owned(), moved));
        }
        beam
    };
    let mut spec = PlanSpec::default().with_beam(arc(2), ReferenceSpec::new(2, 300.0, 1.0));
    spec.beams[0] = arc(1);
    spec.bytes()
}

/// One modulated arc that is calculated: 178 control points, 60 leaf pairs.
fn one_arc() -> Vec<u8> {
    fs::read(root().join("sample-plans/modulated-arc.dcm")).expect("a sample plan")
}

fn four_fields() -> Vec<u8> {
    fs::read(root().join("sample-plans/four-field-box.dcm")).expect("a sample plan")
}

fn plans() -> [(&'static str, Vec<u8>); 3] {
    [
        ("two arcs", arcs()),
        ("four fields", four_fields()),
        ("one arc", one_arc()),
    ]
}

#[divan::bench(args = [0, 1, 2])]
fn identifies(bencher: Bencher<'_, '_>, which: usize) {
    let (_, bytes) = &plans()[which];
    bencher.bench(|| identify(black_box(bytes)));
}

#[divan::bench(args = [0, 1, 2])]
fn fingerprints(bencher: Bencher<'_, '_>, which: usize) {
    let (_, bytes) = &plans()[which];
    bencher
        .counter(BytesCount::of_slice(bytes))
        .bench(|| sha256_hex(black_box(bytes)));
}

#[divan::bench(args = [0, 1, 2])]
fn reads(bencher: Bencher<'_, '_>, which: usize) {
    let (_, bytes) = &plans()[which];
    bencher
        .counter(BytesCount::of_slice(bytes))
        .bench(|| read_plan(black_box(bytes)).map(|plan| plan.beams.len()));
}

#[divan::bench(args = [0, 1, 2])]
fn audits(bencher: Bencher<'_, '_>, which: usize) {
    let (_, bytes) = &plans()[which];
    let plan = read_plan(bytes).expect("reads");
    let models = load_models(&root().join("beam-models")).expect("models");
    let site = Site::default();
    bencher.bench(|| audit(black_box(&plan), &models, &site));
}

/// The two that are held against each other: everything that a run does to read the file of an arc, from the disk to the
/// plan, and the calculation of its beam.
#[divan::bench]
fn arc_reads(bencher: Bencher<'_, '_>) {
    let path = root().join("sample-plans/modulated-arc.dcm");
    bencher.bench(|| {
        let file = read_file(black_box(&path)).expect("reads");
        let bytes = file.contents.bytes();
        let kind = identify(bytes);
        (kind, read_plan(bytes))
    });
}

#[divan::bench]
fn arc_calculates(bencher: Bencher<'_, '_>) {
    let plan = read_plan(&one_arc()).expect("reads");
    let models = load_models(&root().join("beam-models")).expect("models");
    let site = Site::default();
    let machine = &plan.beams[0].machine;
    let model = models
        .machine_for(machine.value().map_or("", String::as_str))
        .expect("the sample's machine");
    let request = BeamRequest {
        plan: &plan,
        beam_index: 0,
        group: Some((0, 0)),
        model: ModelAnswer::Found(model),
        site: &site,
        depth_row: None,
        steps: StepLimits::default(),
    };
    let found = calculate_beam(&request);
    assert!(found.trace.is_some() && found.obstacles.is_empty());
    bencher.bench(|| calculate_beam(black_box(&request)));
}

fn audit(plan: &Plan, models: &ModelSet, site: &Site) -> PlanEntry {
    audit_plan(PlanInput {
        file: "plan",
        sha256: "",
        plan,
        rivals: &Rivals::default(),
        models,
        site,
        depth_rows: &[],
    })
}
