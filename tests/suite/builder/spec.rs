//! What a plan holds, as plain data. Lengths cm, doses Gy, angles degrees.
//! `None` leaves an attribute out, or empty where the standard wants it there.

/// A plan.
#[derive(Clone, Debug)]
pub(crate) struct PlanSpec {
    /// Root of every UID of the plan, under 2.25.
    pub(crate) uid_root: String,
    pub(crate) patient_name: String,
    pub(crate) patient_id: String,
    pub(crate) character_set: String,
    pub(crate) label: String,
    pub(crate) name: Option<String>,
    pub(crate) intent: Option<String>,
    pub(crate) date: String,
    pub(crate) time: String,
    pub(crate) approval: Option<String>,
    pub(crate) reviewer: String,
    pub(crate) manufacturer: String,
    pub(crate) model_name: String,
    /// Whether the plan refers to a structure set; without one its geometry is the machine's.
    pub(crate) structure_set: bool,
    pub(crate) setups: Vec<SetupSpec>,
    pub(crate) dose_references: Vec<DoseReferenceSpec>,
    pub(crate) groups: Vec<GroupSpec>,
    pub(crate) beams: Vec<BeamSpec>,
}

/// A patient setup.
#[derive(Clone, Debug)]
pub(crate) struct SetupSpec {
    pub(crate) number: i32,
    pub(crate) position: String,
    pub(crate) technique: Option<String>,
}

/// A prescription item.
#[derive(Clone, Debug)]
pub(crate) struct DoseReferenceSpec {
    pub(crate) number: i32,
    pub(crate) structure_type: String,
    pub(crate) reference_type: String,
    pub(crate) description: String,
    pub(crate) point_cm: Option<[f64; 3]>,
    pub(crate) prescription_gy: Option<f64>,
}

/// A fraction group.
#[derive(Clone, Debug)]
pub(crate) struct GroupSpec {
    pub(crate) number: i32,
    pub(crate) fractions: Option<i32>,
    pub(crate) beams: Vec<ReferenceSpec>,
    /// Numbers of referenced dose references.
    pub(crate) dose_references: Vec<i32>,
}

/// A beam as a fraction group refers to it.
#[derive(Clone, Debug, Default)]
pub(crate) struct ReferenceSpec {
    pub(crate) beam_number: i32,
    pub(crate) meterset_mu: Option<f64>,
    pub(crate) dose_gy: Option<f64>,
    pub(crate) dose_meaning: Option<String>,
    pub(crate) dose_type: Option<String>,
    /// Beam Dose Specification Point (300A,0082), retired.
    pub(crate) point_cm: Option<[f64; 3]>,
    /// Number of the dose reference whose UID stands here (300A,0083).
    pub(crate) dose_reference: Option<i32>,
    /// Depths at the reference itself (300A,0088, 0089, 008A).
    pub(crate) depths: Option<DepthSpec>,
    /// Averages over the beam, retired (300A,008D to 008F).
    pub(crate) averages: Option<DepthSpec>,
    /// Beam Dose Verification Control Point Sequence (300A,008C).
    pub(crate) verification: Vec<DepthSpec>,
}

/// Depths of a dose point.
#[derive(Clone, Debug, Default)]
pub(crate) struct DepthSpec {
    /// Cumulative meterset weight of a verification control point.
    pub(crate) weight: Option<f64>,
    pub(crate) depth_cm: Option<f64>,
    pub(crate) equivalent_depth_cm: Option<f64>,
    pub(crate) ssd_cm: Option<f64>,
    pub(crate) source_to_external_contour_cm: Option<f64>,
    /// Depth Value Averaging Flag (300A,0093).
    pub(crate) averaged: Option<bool>,
}

/// A beam.
#[derive(Clone, Debug)]
pub(crate) struct BeamSpec {
    pub(crate) number: i32,
    pub(crate) name: String,
    pub(crate) description: Option<String>,
    pub(crate) beam_type: String,
    pub(crate) radiation: String,
    pub(crate) machine: Option<String>,
    pub(crate) dosimeter_unit: Option<String>,
    pub(crate) sad_cm: Option<f64>,
    pub(crate) delivery: Option<String>,
    /// Fluence mode and its ID.
    pub(crate) fluence: Option<(String, Option<String>)>,
    pub(crate) devices: Vec<DeviceSpec>,
    pub(crate) wedges: Vec<WedgeSpec>,
    pub(crate) compensators: Vec<CompensatorSpec>,
    pub(crate) blocks: Vec<BlockSpec>,
    pub(crate) total_tray_factor: Option<f64>,
    pub(crate) applicators: Vec<ApplicatorSpec>,
    pub(crate) accessories: Vec<AccessorySpec>,
    pub(crate) boluses: Vec<BolusSpec>,
    pub(crate) setup_number: Option<i32>,
    pub(crate) final_weight: Option<f64>,
    /// Stated number of control points, when it is not the true one.
    pub(crate) stated_control_points: Option<i32>,
    pub(crate) control_points: Vec<PointSpec>,
}

/// A declared beam limiting device.
#[derive(Clone, Debug)]
pub(crate) struct DeviceSpec {
    pub(crate) kind: String,
    pub(crate) pairs: i32,
    pub(crate) source_distance_cm: Option<f64>,
    pub(crate) boundaries_cm: Vec<f64>,
}

/// A wedge.
#[derive(Clone, Debug)]
pub(crate) struct WedgeSpec {
    pub(crate) number: i32,
    pub(crate) kind: String,
    pub(crate) id: String,
    pub(crate) angle_deg: i32,
    pub(crate) factor: Option<f64>,
    pub(crate) orientation_deg: f64,
    pub(crate) source_to_tray_cm: Option<f64>,
}

/// A compensator.
#[derive(Clone, Debug)]
pub(crate) struct CompensatorSpec {
    pub(crate) number: i32,
    pub(crate) id: String,
    pub(crate) material: String,
    /// Transmission values of a 2 x 2 grid of 1 cm; none leaves them out.
    pub(crate) transmission: Option<[f64; 4]>,
    /// Thicknesses of that grid, which a compensator of a stated material needs.
    pub(crate) thickness_cm: Option<[f64; 4]>,
}

/// A block.
#[derive(Clone, Debug)]
pub(crate) struct BlockSpec {
    pub(crate) number: i32,
    pub(crate) name: String,
    /// SHIELDING or APERTURE.
    pub(crate) kind: String,
    pub(crate) divergent: bool,
    pub(crate) tray_id: Option<String>,
    pub(crate) material: String,
    pub(crate) thickness_cm: Option<f64>,
    pub(crate) transmission: Option<f64>,
    pub(crate) source_to_tray_cm: Option<f64>,
    pub(crate) outline_cm: Vec<[f64; 2]>,
}

/// An applicator.
#[derive(Clone, Debug)]
pub(crate) struct ApplicatorSpec {
    pub(crate) id: String,
    pub(crate) kind: String,
}

/// A general accessory.
#[derive(Clone, Debug)]
pub(crate) struct AccessorySpec {
    pub(crate) number: i32,
    pub(crate) id: String,
    pub(crate) kind: Option<String>,
}

/// A bolus.
#[derive(Clone, Debug)]
pub(crate) struct BolusSpec {
    pub(crate) roi_number: i32,
    pub(crate) id: Option<String>,
}

/// A control point; what is `None` is left to inheritance.
#[derive(Clone, Debug, Default)]
pub(crate) struct PointSpec {
    pub(crate) weight: Option<f64>,
    pub(crate) energy: Option<f64>,
    pub(crate) dose_rate_mu_per_min: Option<f64>,
    pub(crate) gantry_deg: Option<f64>,
    pub(crate) gantry_direction: Option<String>,
    pub(crate) gantry_pitch_deg: Option<f64>,
    pub(crate) collimator_deg: Option<f64>,
    pub(crate) couch_deg: Option<f64>,
    pub(crate) couch_pitch_deg: Option<f64>,
    pub(crate) couch_roll_deg: Option<f64>,
    /// Vertical, longitudinal, lateral.
    pub(crate) couch_cm: Option<[f64; 3]>,
    pub(crate) isocentre_cm: Option<[f64; 3]>,
    pub(crate) surface_entry_cm: Option<[f64; 3]>,
    pub(crate) ssd_cm: Option<f64>,
    pub(crate) source_to_external_contour_cm: Option<f64>,
    /// Device type and its positions.
    pub(crate) positions_cm: Vec<(String, Vec<f64>)>,
    /// Wedge number and whether it is in.
    pub(crate) wedges: Vec<(i32, bool)>,
    /// Dose reference number, coefficient, depths.
    pub(crate) doses: Vec<(i32, f64, Option<DepthSpec>)>,
}

impl Default for PlanSpec {
    fn default() -> Self {
        Self {
            uid_root: "2.25.20240105".to_owned(),
            patient_name: "Invented^Patient".to_owned(),
            patient_id: "INV-001".to_owned(),
            character_set: "ISO_IR 192".to_owned(),
            label: "STATIC".to_owned(),
            name: Some("One static field".to_owned()),
            intent: Some("CURATIVE".to_owned()),
            date: "20240105".to_owned(),
            time: "101500".to_owned(),
            approval: Some("APPROVED".to_owned()),
            reviewer: "Invented^Reviewer".to_owned(),
            manufacturer: "Invented Planning".to_owned(),
            model_name: "Planner".to_owned(),
            structure_set: true,
            setups: vec![SetupSpec::default()],
            dose_references: vec![DoseReferenceSpec::default()],
            groups: vec![GroupSpec::default()],
            beams: vec![BeamSpec::default()],
        }
    }
}

impl Default for SetupSpec {
    fn default() -> Self {
        Self {
            number: 1,
            position: "HFS".to_owned(),
            technique: Some("ISOCENTRIC".to_owned()),
        }
    }
}

impl Default for DoseReferenceSpec {
    fn default() -> Self {
        Self {
            number: 1,
            structure_type: "COORDINATES".to_owned(),
            reference_type: "TARGET".to_owned(),
            description: "Target point".to_owned(),
            point_cm: Some([0.0, 0.0, 0.0]),
            prescription_gy: Some(30.0),
        }
    }
}

impl Default for GroupSpec {
    fn default() -> Self {
        Self {
            number: 1,
            fractions: Some(30),
            beams: vec![ReferenceSpec::new(1, 100.0, 1.0)],
            dose_references: vec![1],
        }
    }
}

impl ReferenceSpec {
    /// A beam with its MU and its dose at the first dose reference's point, the origin.
    pub(crate) fn new(beam_number: i32, meterset_mu: f64, dose_gy: f64) -> Self {
        Self {
            beam_number,
            meterset_mu: Some(meterset_mu),
            dose_gy: Some(dose_gy),
            point_cm: Some([0.0, 0.0, 0.0]),
            dose_reference: Some(1),
            ..Self::default()
        }
    }
}

impl Default for BeamSpec {
    fn default() -> Self {
        Self {
            number: 1,
            name: "Anterior".to_owned(),
            description: None,
            beam_type: "STATIC".to_owned(),
            radiation: "PHOTON".to_owned(),
            machine: Some("Alder".to_owned()),
            dosimeter_unit: Some("MU".to_owned()),
            sad_cm: Some(100.0),
            delivery: Some("TREATMENT".to_owned()),
            fluence: Some(("STANDARD".to_owned(), None)),
            devices: vec![DeviceSpec::jaw("ASYMX"), DeviceSpec::jaw("ASYMY")],
            wedges: Vec::new(),
            compensators: Vec::new(),
            blocks: Vec::new(),
            total_tray_factor: None,
            applicators: Vec::new(),
            accessories: Vec::new(),
            boluses: Vec::new(),
            setup_number: Some(1),
            final_weight: Some(1.0),
            stated_control_points: None,
            control_points: vec![PointSpec::first(), PointSpec::at_weight(1.0)],
        }
    }
}

impl DeviceSpec {
    /// A jaw pair.
    pub(crate) fn jaw(kind: &str) -> Self {
        Self {
            kind: kind.to_owned(),
            pairs: 1,
            source_distance_cm: Some(if kind.ends_with('X') { 40.0 } else { 30.0 }),
            boundaries_cm: Vec::new(),
        }
    }

    /// A leaf bank with leaves of one width, centred on the axis.
    pub(crate) fn leaves(kind: &str, pairs: i32, width_cm: f64) -> Self {
        let half = f64::from(pairs) / 2.0;
        Self {
            kind: kind.to_owned(),
            pairs,
            source_distance_cm: Some(50.0),
            boundaries_cm: (0..=pairs)
                .map(|edge| (f64::from(edge) - half) * width_cm)
                .collect(),
        }
    }
}

impl PointSpec {
    /// A first control point with everything that the standard wants there: 6 MV, 10 x 10 cm,
    /// all angles 0, isocentre at the origin, SSD 90 cm.
    pub(crate) fn first() -> Self {
        Self {
            weight: Some(0.0),
            energy: Some(6.0),
            dose_rate_mu_per_min: Some(600.0),
            gantry_deg: Some(0.0),
            collimator_deg: Some(0.0),
            couch_deg: Some(0.0),
            isocentre_cm: Some([0.0, 0.0, 0.0]),
            ssd_cm: Some(90.0),
            positions_cm: vec![
                ("ASYMX".to_owned(), vec![-5.0, 5.0]),
                ("ASYMY".to_owned(), vec![-5.0, 5.0]),
            ],
            ..Self::default()
        }
    }

    /// A later control point that changes nothing but the weight.
    pub(crate) fn at_weight(weight: f64) -> Self {
        Self {
            weight: Some(weight),
            ..Self::default()
        }
    }
}
