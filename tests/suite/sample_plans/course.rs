//! A course of treatment under construction. Metersets and planned doses come
//! from the program's own calculation, so that the plans hang together; each
//! planned dose is then shifted by a fixed share, as a planning system's dose
//! would differ from an independent one. They prove nothing about physics.

use std::path::PathBuf;
use std::sync::OnceLock;

use counterfoil::audit::Verdict;
use counterfoil::beam_model::{ModelSet, load_models};
use counterfoil::dose::{BeamRequest, ModelAnswer, StepLimits, calculate_beam};
use counterfoil::plan::{Plan, read_plan};
use counterfoil::settings::Site;

use super::sample::Sample;
use crate::builder::{BeamSpec, DoseReferenceSpec, Encoding, GroupSpec, PlanSpec, ReferenceSpec};

/// The isocentre of most plans.
pub(super) const ISOCENTRE_CM: [f64; 3] = [1.2, -3.5, 20.4];

/// The project's own models, which the sample plans are made for.
pub(super) fn models() -> &'static ModelSet {
    static MODELS: OnceLock<ModelSet> = OnceLock::new();
    MODELS.get_or_init(|| {
        let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("beam-models");
        load_models(&folder).expect("shipped models load")
    })
}

/// A plan of the department without beams: patient and UIDs by serial number.
pub(super) fn department_plan(serial: u16, family: &str, label: &str, name: &str) -> PlanSpec {
    PlanSpec {
        uid_root: format!("2.25.202611091{serial:04}"),
        patient_name: format!("Sample^{family}"),
        patient_id: format!("DEMO-{serial:04}"),
        label: label.to_owned(),
        name: Some(name.to_owned()),
        date: "20261109".to_owned(),
        time: "093000".to_owned(),
        reviewer: "Sample^Reviewer".to_owned(),
        groups: Vec::new(),
        beams: Vec::new(),
        ..PlanSpec::default()
    }
}

/// An isocentric beam of the department.
pub(super) fn beam(number: i32, name: &str, machine: &str, energy_mv: f64) -> BeamSpec {
    BeamSpec::new(number, name)
        .with_machine(machine)
        .with_energy(energy_mv)
        .with_isocentre(ISOCENTRE_CM)
}

/// The isocentre with an offset.
pub(super) fn beside_isocentre(offset_cm: [f64; 3]) -> [f64; 3] {
    // To a hundredth of a mm, as it would be typed.
    std::array::from_fn(|axis| ((ISOCENTRE_CM[axis] + offset_cm[axis]) * 1e3).round() / 1e3)
}

/// Which attribute says where a beam's dose belongs.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum PointStated {
    /// Beam Dose Specification Point and the dose reference.
    AtBeam,
    /// The dose reference that the beam's reference names.
    ByReference,
    /// Nothing but the one TARGET dose reference with coordinates.
    ByTarget,
}

/// What the planner wants of one reference to a beam.
struct Wish {
    dose_gy: f64,
    scatter_percent: f64,
}

/// A course under construction.
pub(super) struct Course {
    spec: PlanSpec,
    point_cm: [f64; 3],
    stated: PointStated,
    /// By fraction group and reference.
    wishes: Vec<Vec<Wish>>,
}

impl Course {
    pub(super) fn new(serial: u16, family: &str, label: &str, name: &str) -> Self {
        Self {
            spec: department_plan(serial, family, label, name),
            point_cm: ISOCENTRE_CM,
            stated: PointStated::AtBeam,
            wishes: Vec::new(),
        }
    }

    pub(super) fn position(mut self, code: &str) -> Self {
        self.spec = self.spec.with_patient_position(code);
        self
    }

    pub(super) fn fixed_ssd(mut self) -> Self {
        for setup in &mut self.spec.setups {
            setup.technique = Some("FIXED_SSD".to_owned());
        }
        self
    }

    /// The one point of the course.
    pub(super) fn point(mut self, point_cm: [f64; 3], stated: PointStated) -> Self {
        self.point_cm = point_cm;
        self.stated = stated;
        self
    }

    /// A fraction group; the beams that follow belong to it.
    pub(super) fn fractions(mut self, fractions: i32) -> Self {
        let number = i32::try_from(self.spec.groups.len() + 1).expect("few groups");
        self.spec.groups.push(GroupSpec {
            number,
            fractions: Some(fractions),
            beams: Vec::new(),
            dose_references: vec![1],
        });
        self.wishes.push(Vec::new());
        self
    }

    /// A beam that is to give about this dose in each fraction; its planned dose
    /// will lie this far above ours.
    pub(super) fn treat(mut self, beam: BeamSpec, dose_gy: f64, scatter_percent: f64) -> Self {
        let number = beam.number;
        self.spec.beams.push(beam);
        self.again(number, dose_gy, scatter_percent)
    }

    /// The same for a beam that is there already.
    pub(super) fn again(mut self, number: i32, dose_gy: f64, scatter_percent: f64) -> Self {
        let mut reference = ReferenceSpec::new(number, 100.0, 1.0);
        reference.point_cm = (self.stated == PointStated::AtBeam).then_some(self.point_cm);
        reference.dose_reference = (self.stated != PointStated::ByTarget).then_some(1);
        self.spec
            .groups
            .last_mut()
            .expect("a fraction group comes first")
            .beams
            .push(reference);
        self.wishes.last_mut().expect("as above").push(Wish {
            dose_gy,
            scatter_percent,
        });
        self
    }

    /// Any other change to the plan.
    pub(super) fn map(mut self, change: impl FnOnce(&mut PlanSpec)) -> Self {
        change(&mut self.spec);
        self
    }

    /// The finished plan, with metersets and doses, and the shifts that are in them.
    pub(super) fn finish(mut self) -> (PlanSpec, Vec<f64>) {
        let groups = self.spec.groups.iter().zip(&self.wishes);
        let prescription_gy: f64 = groups
            .map(|(group, wishes)| {
                let fraction_gy: f64 = wishes.iter().map(|wish| wish.dose_gy).sum();
                f64::from(group.fractions.expect("stated")) * fraction_gy
            })
            .sum();
        self.spec.dose_references = vec![DoseReferenceSpec {
            point_cm: Some(self.point_cm),
            prescription_gy: Some(round_to(prescription_gy, 1e-2)),
            ..DoseReferenceSpec::default()
        }];
        fill_doses(&mut self.spec, &self.wishes);
        let scatter_percent = self.wishes.iter().flatten();
        let scatter_percent = scatter_percent.map(|wish| wish.scatter_percent).collect();
        (self.spec, scatter_percent)
    }

    /// A sample that must be within.
    pub(super) fn sound(self, file: &str, shows: &'static str) -> Sample {
        let (spec, scatter_percent) = self.finish();
        Sample {
            path: file.to_owned(),
            shows,
            spec,
            encoding: Encoding::ExplicitLittle,
            scatter_percent,
            verdict: Verdict::Within,
            checks: &[],
            sound: None,
        }
    }

    /// A sample with a fault that is planted after the doses are fixed.
    pub(super) fn faulty(
        self,
        file: &str,
        fault: &'static str,
        (verdict, checks): (Verdict, &'static [&'static str]),
        plant: impl FnOnce(&mut PlanSpec),
    ) -> Sample {
        let sound = self.sound(file, fault);
        let mut spec = sound.spec.clone();
        plant(&mut spec);
        Sample {
            path: format!("faulty/{file}"),
            sound: Some(sound.spec),
            spec,
            verdict,
            checks,
            ..sound
        }
    }
}

fn round_to(value: f64, step: f64) -> f64 {
    // Through text, so that 104.3 is 104.3 and not its neighbour.
    let decimals = if step < 1e-3 {
        4
    } else if step < 0.1 {
        2
    } else {
        1
    };
    format!("{value:.decimals$}").parse().expect("a number")
}

/// Puts a meterset (to 0.1 MU) and a beam dose (to 0.0001 Gy) into every reference.
fn fill_doses(spec: &mut PlanSpec, wishes: &[Vec<Wish>]) {
    let plan = read_plan(&spec.bytes()).expect("a plan");
    for (group_index, (group, wishes)) in spec.groups.iter_mut().zip(wishes).enumerate() {
        for (index, (reference, wish)) in group.beams.iter_mut().zip(wishes).enumerate() {
            let ours_cgy = dose_per_mu_cgy(&plan, reference.beam_number, (group_index, index));
            let theirs_cgy = ours_cgy * (1.0 + wish.scatter_percent / 100.0);
            let meterset_mu = round_to(100.0 * wish.dose_gy / theirs_cgy, 0.1);
            reference.meterset_mu = Some(meterset_mu);
            reference.dose_gy = Some(round_to(meterset_mu * theirs_cgy / 100.0, 1e-4));
        }
    }
}

fn dose_per_mu_cgy(plan: &Plan, number: i32, group: (usize, usize)) -> f64 {
    let label = &plan.identity.plan_label;
    let beam_index = plan.beam_index_by_number(number).expect("the beam");
    let machine = plan.beams[beam_index].machine.value().expect("a machine");
    let calculation = calculate_beam(&BeamRequest {
        plan,
        beam_index,
        group: Some(group),
        model: ModelAnswer::Found(models().machine_for(machine).expect("a model")),
        site: &Site::default(),
        depth_row: None,
        steps: StepLimits::default(),
    });
    let obstacles = &calculation.obstacles;
    assert!(obstacles.is_empty(), "{label:?}, {number}: {obstacles:?}");
    calculation.trace.expect("a number").dose_per_mu_cgy
}
