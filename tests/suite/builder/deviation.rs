//! Deviations from the default plan, each named by its method.

use super::spec::{
    ApplicatorSpec, BeamSpec, BlockSpec, BolusSpec, DeviceSpec, GroupSpec, PlanSpec, PointSpec,
    ReferenceSpec, WedgeSpec,
};

impl PlanSpec {
    /// Other UIDs, so that two plans are two plans.
    pub(crate) fn with_uid_root(mut self, root: &str) -> Self {
        self.uid_root = root.to_owned();
        self
    }

    pub(crate) fn with_label(mut self, label: &str) -> Self {
        self.label = label.to_owned();
        self
    }

    /// The position of every patient setup.
    pub(crate) fn with_patient_position(mut self, code: &str) -> Self {
        for setup in &mut self.setups {
            setup.position = code.to_owned();
        }
        self
    }

    /// Changes the first beam.
    pub(crate) fn map_beam(mut self, change: impl FnOnce(BeamSpec) -> BeamSpec) -> Self {
        let first = self.beams.remove(0);
        self.beams.insert(0, change(first));
        self
    }

    /// Changes the first reference of the first fraction group.
    pub(crate) fn map_reference(mut self, change: impl FnOnce(&mut ReferenceSpec)) -> Self {
        change(&mut self.groups[0].beams[0]);
        self
    }

    /// One more beam, and its reference in the first fraction group.
    pub(crate) fn with_beam(mut self, beam: BeamSpec, reference: ReferenceSpec) -> Self {
        self.beams.push(beam);
        self.groups[0].beams.push(reference);
        self
    }

    /// A beam for imaging, without meterset, dose or reference.
    pub(crate) fn with_setup_beam(mut self, number: i32) -> Self {
        self.beams.push(BeamSpec {
            number,
            name: format!("Setup {number}"),
            delivery: Some("SETUP".to_owned()),
            ..BeamSpec::default()
        });
        self
    }

    pub(crate) fn with_meterset(self, meterset_mu: f64) -> Self {
        self.map_reference(|reference| reference.meterset_mu = Some(meterset_mu))
    }

    pub(crate) fn without_meterset(self) -> Self {
        self.map_reference(|reference| reference.meterset_mu = None)
    }

    pub(crate) fn with_beam_dose(self, dose_gy: f64) -> Self {
        self.map_reference(|reference| reference.dose_gy = Some(dose_gy))
    }

    pub(crate) fn without_beam_dose(self) -> Self {
        self.map_reference(|reference| reference.dose_gy = None)
    }

    /// The dose point of the first reference and of the first dose reference.
    pub(crate) fn with_dose_point(mut self, point_cm: [f64; 3]) -> Self {
        if let Some(dose) = self.dose_references.first_mut() {
            dose.point_cm = Some(point_cm);
        }
        self.map_reference(|reference| reference.point_cm = Some(point_cm))
    }

    /// No dose point anywhere.
    pub(crate) fn without_dose_point(mut self) -> Self {
        self.dose_references.clear();
        for group in &mut self.groups {
            group.dose_references.clear();
        }
        self.map_reference(|reference| {
            reference.point_cm = None;
            reference.dose_reference = None;
        })
    }

    /// A second group that gives the first beam again, with other MU.
    pub(crate) fn with_second_group(
        mut self,
        fractions: i32,
        meterset_mu: f64,
        dose_gy: f64,
    ) -> Self {
        self.groups.push(GroupSpec {
            number: 2,
            fractions: Some(fractions),
            beams: vec![ReferenceSpec::new(1, meterset_mu, dose_gy)],
            dose_references: vec![1],
        });
        self
    }

    /// A second beam that has the first one's number.
    pub(crate) fn with_repeated_beam_number(mut self) -> Self {
        let copy = BeamSpec {
            name: "Same number".to_owned(),
            ..self.beams[0].clone()
        };
        self.beams.push(copy);
        self
    }

    /// A reference to a beam that is not there.
    pub(crate) fn with_dangling_reference(mut self, number: i32) -> Self {
        self.groups[0]
            .beams
            .push(ReferenceSpec::new(number, 50.0, 0.5));
        self
    }

    pub(crate) fn without_approval(mut self) -> Self {
        self.approval = None;
        self
    }
}

impl BeamSpec {
    /// A default beam of this number and name.
    pub(crate) fn new(number: i32, name: &str) -> Self {
        Self {
            number,
            name: name.to_owned(),
            ..Self::default()
        }
    }

    /// Changes the first control point.
    pub(crate) fn map_first(mut self, change: impl FnOnce(&mut PointSpec)) -> Self {
        change(&mut self.control_points[0]);
        self
    }

    pub(crate) fn with_machine(mut self, name: &str) -> Self {
        self.machine = Some(name.to_owned());
        self
    }

    pub(crate) fn without_machine(mut self) -> Self {
        self.machine = None;
        self
    }

    pub(crate) fn with_energy(self, energy: f64) -> Self {
        self.map_first(|point| point.energy = Some(energy))
    }

    /// A beam without flattening filter.
    pub(crate) fn with_fluence_mode(mut self, mode: &str, id: Option<&str>) -> Self {
        self.fluence = Some((mode.to_owned(), id.map(str::to_owned)));
        self
    }

    pub(crate) fn without_fluence_mode(mut self) -> Self {
        self.fluence = None;
        self
    }

    /// Asymmetric jaws, cm at the isocentre plane.
    pub(crate) fn with_jaws(self, x_cm: [f64; 2], y_cm: [f64; 2]) -> Self {
        self.with_jaw_kinds("ASYMX", "ASYMY", x_cm, y_cm)
    }

    /// Symmetric jaws for a field of these sides, cm.
    pub(crate) fn with_field(self, x_cm: f64, y_cm: f64) -> Self {
        let half = |side_cm: f64| [-side_cm / 2.0, side_cm / 2.0];
        self.with_jaw_kinds("X", "Y", half(x_cm), half(y_cm))
    }

    fn with_jaw_kinds(mut self, x: &str, y: &str, x_cm: [f64; 2], y_cm: [f64; 2]) -> Self {
        self.devices.retain(|device| device.pairs > 1);
        self.devices.insert(0, DeviceSpec::jaw(x));
        self.devices.insert(1, DeviceSpec::jaw(y));
        self.map_first(|point| {
            point
                .positions_cm
                .retain(|(kind, _)| kind.starts_with("MLC"));
            point.positions_cm.insert(0, (x.to_owned(), x_cm.to_vec()));
            point.positions_cm.insert(1, (y.to_owned(), y_cm.to_vec()));
        })
    }

    /// A leaf bank that stands at these positions: first the bank at negative coordinate.
    pub(crate) fn with_leaves(mut self, device: DeviceSpec, positions_cm: Vec<f64>) -> Self {
        let kind = device.kind.clone();
        self.devices.push(device);
        self.map_first(|point| point.positions_cm.push((kind, positions_cm)))
    }

    pub(crate) fn with_gantry(self, angle_deg: f64) -> Self {
        self.map_first(|point| point.gantry_deg = Some(angle_deg))
    }

    pub(crate) fn with_collimator(self, angle_deg: f64) -> Self {
        self.map_first(|point| point.collimator_deg = Some(angle_deg))
    }

    pub(crate) fn with_couch(self, angle_deg: f64) -> Self {
        self.map_first(|point| point.couch_deg = Some(angle_deg))
    }

    pub(crate) fn with_ssd(self, ssd_cm: f64) -> Self {
        self.map_first(|point| point.ssd_cm = Some(ssd_cm))
    }

    pub(crate) fn without_ssd(self) -> Self {
        self.map_first(|point| point.ssd_cm = None)
    }

    pub(crate) fn with_isocentre(self, point_cm: [f64; 3]) -> Self {
        self.map_first(|point| point.isocentre_cm = Some(point_cm))
    }

    pub(crate) fn without_isocentre(self) -> Self {
        self.map_first(|point| point.isocentre_cm = None)
    }

    /// A wedge that is in the beam.
    pub(crate) fn with_wedge(mut self, wedge: WedgeSpec) -> Self {
        let number = wedge.number;
        self.wedges.push(wedge);
        self.map_first(|point| point.wedges.push((number, true)))
    }

    pub(crate) fn with_block(mut self, block: BlockSpec) -> Self {
        self.blocks.push(block);
        self
    }

    pub(crate) fn with_bolus(mut self, roi_number: i32) -> Self {
        self.boluses.push(BolusSpec {
            roi_number,
            id: Some("Bolus".to_owned()),
        });
        self
    }

    /// An electron beam with an applicator of this ID.
    pub(crate) fn with_electrons(mut self, energy_mev: f64, applicator: &str) -> Self {
        self.radiation = "ELECTRON".to_owned();
        self.applicators.push(ApplicatorSpec {
            id: applicator.to_owned(),
            kind: "ELECTRON_SQUARE".to_owned(),
        });
        self.with_energy(energy_mev)
    }

    /// An arc from the first control point's gantry angle, with weights in equal steps.
    pub(crate) fn with_arc(mut self, end_deg: f64, direction: &str, points: u16) -> Self {
        let start_deg = self.control_points[0].gantry_deg.unwrap_or(0.0);
        let last = f64::from(points.max(2) - 1);
        self.beam_type = "DYNAMIC".to_owned();
        self.control_points.truncate(1);
        self.control_points[0].gantry_direction = Some(direction.to_owned());
        let final_weight = self.final_weight.unwrap_or(1.0);
        for index in 1..points.max(2) {
            let share = f64::from(index) / last;
            let mut point = PointSpec::at_weight(share * final_weight);
            point.gantry_deg = Some(start_deg + (end_deg - start_deg) * share);
            point.gantry_direction = Some(
                if index + 1 == points {
                    "NONE"
                } else {
                    direction
                }
                .to_owned(),
            );
            self.control_points.push(point);
        }
        self
    }
}
