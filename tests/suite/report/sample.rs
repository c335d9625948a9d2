//! Entries made by hand, invented throughout: every verdict, hostile and very
//! long names, a number outside the method's range. The numbers are consistent
//! by simple arithmetic, not by any engine.

use std::fs;
use std::path::{Path, PathBuf};

use counterfoil::audit::{
    BeamEntry, Count, FileEntry, FileOutcome, Finding, Judgement, ModelUse, PlanEntry, Run,
    RunSummary, SharedPointSum, Verdict,
};
use counterfoil::dose::{
    BeamCalculation, BeamView, BlockOutline, DepthBasis, DepthCandidate, DosePoint, Factor,
    FactorName, Input, LeafOpening, Method, Obstacle, ObstacleKind, PointBasis, Spread, SpreadTerm,
    Squares, Technique, Trace,
};
use counterfoil::quantity::{CollimatorSquare, Point, PointSquare};
use counterfoil::report::{ReportWriter, Written};
use counterfoil::settings::{Severity, Site, SiteSource};

/// A folder that goes when the test ends.
pub(crate) struct Folder(tempfile::TempDir);

impl Folder {
    pub(crate) fn new() -> Self {
        Self(tempfile::tempdir().unwrap())
    }

    pub(crate) fn path(&self) -> PathBuf {
        self.0.path().join("report")
    }
}

pub(crate) fn run(plans_in_full: usize) -> Run {
    let mut site = Site::default();
    site.report.plans_in_full = plans_in_full;
    Run {
        run_id: "20300102T030405Z-7f3a".to_owned(),
        version: "0.1.0".to_owned(),
        started: "2030-01-02T03:04:05+00:00".to_owned(),
        inputs: vec!["plans/monday".to_owned()],
        options: vec![
            "models = beam-models (default)".to_owned(),
            "fail-on = tolerance (default)".to_owned(),
        ],
        site_source: SiteSource::default(),
        site,
        models: vec![
            ModelUse {
                name: "example-one".to_owned(),
                serves: vec!["LINAC1".to_owned(), "LINAC2".to_owned()],
                fingerprint: "5e884898da28047151d0e56f8dc6292773603d0d6aabbdd62a11ef721d1542d8"
                    .to_owned(),
                origin: "invented",
                provenance: "made by a script for demonstration, 2030-01-01".to_owned(),
                approval: "none".to_owned(),
                approved: false,
            },
            ModelUse {
                name: "example-two".to_owned(),
                serves: vec!["LINAC3".to_owned()],
                fingerprint: "2c26b46b68ffc68ff99b453c1d30413413422d706483bfa0f98a5e886266e7ae"
                    .to_owned(),
                origin: "measured",
                provenance: "water tank, 2029-11-05, by the department's physics group".to_owned(),
                approval: "by A. Physicist on 2029-12-01 until 2030-12-01".to_owned(),
                approved: true,
            },
        ],
    }
}

fn count(term: &'static str, count: u64) -> Count {
    Count { term, count }
}

pub(crate) fn summary() -> RunSummary {
    RunSummary {
        files: vec![
            count("audited", 4),
            count("duplicate-of", 1),
            count("unreadable", 1),
            count("passed-over", 2),
        ],
        plans: vec![
            count("beyond-action", 1),
            count("not-verifiable", 1),
            count("beyond-tolerance", 1),
            count("within", 1),
        ],
        beams: vec![
            count("beyond-action", 1),
            count("not-verifiable", 2),
            count("beyond-tolerance", 1),
            count("within", 5),
            count("not-treated", 1),
        ],
        findings: vec![count("action", 1), count("tolerance", 1), count("note", 1)],
        unreadable_plans: 1,
        models_used: vec!["example-one".to_owned()],
        invented_models: vec!["example-one".to_owned()],
        unapproved_models: vec!["example-one".to_owned()],
        checks_off: vec!["fluence-mode-not-stated".to_owned()],
        complete: false,
        exit: "Exit status 1: a treatment beam is beyond its tolerance. Also: a plan file could not be read, and treatment beams could not be verified.".to_owned(),
    }
}

fn trace() -> Trace {
    let factor = |name, value, source: &str| Factor {
        name,
        value,
        source: source.to_owned(),
    };
    let input = |symbol, name, value, source: &str| Input {
        name,
        symbol,
        value,
        unit: "cm",
        source: source.to_owned(),
    };
    Trace::new(
        "D'0 * Sc * Sp * TPR * OAR * ISF".to_owned(),
        "AAPM TG-71, isocentric form",
        vec![
            input(
                "c",
                "equivalent square of the collimator",
                12.0,
                "jaws 10.00 x 15.00 cm, 2ab/(a+b)",
            ),
            input(
                "s_d",
                "equivalent square at the plane of the point",
                12.0,
                "12.00 x SPD 100.00 / SAD 100.00",
            ),
            input(
                "d_eff",
                "radiological depth",
                9.7,
                "plan: point depth of the referenced beam",
            ),
            input(
                "r",
                "distance from the axis at the isocentre plane",
                2.73,
                "point (1.93, -1.93) cm",
            ),
        ],
        vec![
            factor(
                FactorName::ReferenceOutput,
                1.0,
                "machine.toml, beam 6: 1.0000 cGy/MU at SAD 100, depth 10, side 10",
            ),
            factor(
                FactorName::CollimatorScatter,
                1.0095,
                "6/output.csv, sc between sides 10 and 15",
            ),
            factor(
                FactorName::PhantomScatter,
                1.0081,
                "6/output.csv, sp between sides 10 and 15",
            ),
            factor(
                FactorName::TissuePhantomRatio,
                1.0123,
                "6/tpr.csv, depths 9 and 10, sides 10 and 15",
            ),
            factor(
                FactorName::OffAxisRatio,
                1.0102,
                "6/off-axis.csv, radii 2 and 3, depths 9 and 10",
            ),
            factor(
                FactorName::InverseSquare,
                1.0,
                "(SAD 100.00 / SPD 100.00)^2",
            ),
        ],
    )
}

fn spread() -> Spread {
    let term = |name, percent, source: &str| SpreadTerm {
        name,
        percent,
        source: source.to_owned(),
    };
    Spread::new(vec![
        term("output", 0.8, "machine.toml, uncertainty of the beam"),
        term(
            "depth",
            0.7,
            "2.0 mm on the planning system's word, 3.6 %/cm",
        ),
        term("tables", 0.5, "machine.toml, uncertainty of the beam"),
    ])
}

fn calculation(technique: Technique) -> BeamCalculation {
    BeamCalculation {
        beam_index: 0,
        group_index: Some(0),
        reference_index: Some(0),
        technique,
        gantry_deg: Some(0.0),
        gantry_end_deg: Some(0.0),
        collimator_deg: Some(90.0),
        couch_deg: Some(0.0),
        x_cm: Some(10.0),
        y_cm: Some(15.0),
        squares: Some(Squares {
            collimator: CollimatorSquare::new(12.0),
            phantom: Some(PointSquare::new(12.0)),
        }),
        point: Some(DosePoint {
            basis: PointBasis::Beam,
            source: "Beam Dose Specification Point (300A,0082) of fraction group 1, beam 1"
                .to_owned(),
            patient: Point::new(1.93, -4.5, -1.93),
            collimator: Some(Point::new(1.93, -1.93, 0.0)),
            spd_cm: Some(100.0),
            projected_cm: Some([1.93, -1.93]),
            off_axis_cm: Some(2.729_395),
        }),
        depths: vec![
            DepthCandidate {
                basis: DepthBasis::Plan,
                independent: false,
                perpendicular_cm: Some(9.7),
                along_ray_cm: Some(9.703_6),
                effective_cm: 9.703_6,
                ssd_cm: Some(90.3),
                source: "Beam Dose Point Depth (300A,0088)".to_owned(),
            },
            DepthCandidate {
                basis: DepthBasis::Ssd,
                independent: false,
                perpendicular_cm: Some(9.9),
                along_ray_cm: Some(9.903_7),
                effective_cm: 9.903_7,
                ssd_cm: Some(90.1),
                source: "Source to Surface Distance (300A,0130), flat surface".to_owned(),
            },
        ],
        plan_ssd_cm: Some(90.1),
        trace: Some(trace()),
        method: Some(Method::Factors),
        shaped: None,
        spread: Some(spread()),
        obstacles: Vec::new(),
        remarks: Vec::new(),
        view: BeamView {
            jaws_x_cm: Some([-5.0, 5.0]),
            jaws_y_cm: Some([-7.5, 7.5]),
            leaf_banks: Vec::new(),
            blocks: Vec::new(),
            point_cm: Some([1.93, -1.93]),
            last: None,
        },
    }
}

/// A beam of 100 MU whose independent dose is the trace's and whose planned dose makes the deviation.
pub(crate) fn beam(number: i32, name: &str, deviation_percent: f64, verdict: Verdict) -> BeamEntry {
    let independent_dose_gy = trace().dose_per_mu_cgy;
    let planned_dose_gy = independent_dose_gy / (1.0 + deviation_percent / 100.0);
    BeamEntry {
        fraction_group: Some(1),
        machine: Some("LINAC1".to_owned()),
        beam_number: Some(number),
        beam_name: Some(name.to_owned()),
        radiation: Some("PHOTON".to_owned()),
        energy: Some("6".to_owned()),
        control_points: 2,
        calculation: calculation(Technique::Static),
        planned_mu: Some(100.0),
        planned_dose_gy: Some(planned_dose_gy),
        independent_dose_gy: Some(independent_dose_gy),
        independent_mu: Some(100.0 / (1.0 + deviation_percent / 100.0)),
        deviation_percent: Some(deviation_percent),
        expected_spread_percent: Some(spread().percent),
        tolerance_percent: Some(3.0),
        action_percent: Some(5.0),
        level_basis: Some("open static fields, built-in defaults".to_owned()),
        judgement: Some(Judgement::Alone),
        verdict,
        reasons: match verdict {
            Verdict::Within => Vec::new(),
            _ => vec![format!(
                "The independent dose is {deviation_percent:+.1} % from the plan's; the tolerance is 3 %, the action level 5 %."
            )],
        },
        remarks: vec!["The depth stands on the planning system's own word.".to_owned()],
    }
}

/// A beam with a number that is no verification: the point lies at the field edge.
pub(crate) fn outside_beam(number: i32) -> BeamEntry {
    let mut entry = beam(number, "edge", 1.2, Verdict::NotVerifiable);
    let message = "The dose point is 0.40 cm from the field edge; within 1.0 cm the factor method does not hold. Verify this beam by another method.".to_owned();
    entry.judgement = None;
    entry.reasons = vec![message.clone()];
    entry.calculation.obstacles = vec![Obstacle {
        kind: ObstacleKind::BuildUp,
        message,
    }];
    entry.calculation.view.point_cm = Some([4.6, 0.0]);
    entry
}

/// A beam that leaves and a block shape: nothing is calculated.
pub(crate) fn shaped_beam(number: i32) -> BeamEntry {
    let mut entry = beam(number, "conformal", 0.0, Verdict::NotVerifiable);
    let message = "Leaves shape the field; no method here covers that yet. Verify this beam by another method.".to_owned();
    entry.calculation = calculation(Technique::Mlc);
    entry.calculation.trace = None;
    entry.calculation.method = None;
    entry.calculation.spread = None;
    entry.calculation.obstacles = vec![Obstacle {
        kind: ObstacleKind::Technique,
        message: message.clone(),
    }];
    let half_cm = |y_cm: f64| (36.0 - y_cm * y_cm).max(0.0).sqrt() * 0.75;
    entry.calculation.view.leaf_banks = vec![
        (-8..8)
            .map(|leaf| {
                let y1_cm = f64::from(leaf);
                let half_cm = half_cm(y1_cm + 0.5);
                LeafOpening {
                    x1_cm: -half_cm,
                    x2_cm: half_cm * 0.9,
                    y1_cm,
                    y2_cm: y1_cm + 1.0,
                }
            })
            .collect(),
    ];
    entry.calculation.view.blocks = vec![BlockOutline {
        outline_cm: [[-4.0, 2.0], [-1.5, 2.5], [-1.0, 5.5], [-4.5, 6.0]].into(),
        shields_inside: true,
    }];
    entry.independent_dose_gy = None;
    entry.independent_mu = None;
    entry.deviation_percent = None;
    entry.expected_spread_percent = None;
    entry.judgement = None;
    entry.reasons = vec![message];
    entry
}

fn setup_beam(number: i32) -> BeamEntry {
    let mut entry = shaped_beam(number);
    entry.verdict = Verdict::NotTreated;
    entry.beam_name = Some("setup AP".to_owned());
    entry.calculation.technique = Technique::Setup;
    entry.calculation.obstacles = Vec::new();
    entry.calculation.point = None;
    entry.calculation.depths = Vec::new();
    entry.calculation.view = BeamView {
        jaws_x_cm: Some([-10.0, 10.0]),
        jaws_y_cm: Some([-10.0, 10.0]),
        ..BeamView::default()
    };
    entry.planned_mu = None;
    entry.planned_dose_gy = None;
    entry.tolerance_percent = None;
    entry.action_percent = None;
    entry.level_basis = None;
    entry.remarks = Vec::new();
    entry.reasons = vec!["A setup beam: not delivered for treatment.".to_owned()];
    entry
}

pub(crate) fn plan(file: &str, patient: &str, label: &str, beams: Vec<BeamEntry>) -> PlanEntry {
    let verdict = beams
        .iter()
        .map(|beam| beam.verdict)
        .max()
        .unwrap_or(Verdict::NotApplicable);
    PlanEntry {
        file: file.to_owned(),
        sha256: "fcde2b2edba56bf408601fb721fe9b5c338d10ee429ea04fae5511b68fbf8fb9".to_owned(),
        sop_instance_uid: Some("1.2.826.0.1.3680043.8.498.1234".to_owned()),
        patient_id: Some(patient.to_owned()),
        patient_name: Some("INVENTED^PERSON".to_owned()),
        plan_label: Some(label.to_owned()),
        approval: Some("APPROVED".to_owned()),
        machine: Some("LINAC1".to_owned()),
        fractions: Some(25),
        prescription_gy: Some(50.0),
        sum: None,
        no_sum_reason: Some("the beams do not share a point".to_owned()),
        worst_beam_percent: beams
            .iter()
            .filter(|beam| beam.judgement.is_some())
            .filter_map(|beam| beam.deviation_percent)
            .max_by(|one, other| one.abs().total_cmp(&other.abs())),
        verdict,
        beams,
        findings: Vec::new(),
        uses_invented_model: true,
    }
}

pub(crate) const HOSTILE_NAME: &str = "<script>alert(1)</script>";
pub(crate) const FORMULA_NAME: &str = "=cmd|' /C calc'!A0";

/// Four plans of every kind.
pub(crate) fn plans() -> Vec<PlanEntry> {
    let mut within = plan(
        "plans/monday/a.dcm",
        "INV-0001",
        "Four field box",
        vec![
            beam(1, "AP", -0.4, Verdict::Within),
            beam(2, "PA", 0.6, Verdict::Within),
            beam(3, "RLAT", 1.1, Verdict::Within),
            beam(4, "LLAT", -1.3, Verdict::Within),
            setup_beam(5),
        ],
    );
    within.no_sum_reason = None;
    within.sum = Some(SharedPointSum {
        fraction_group: Some(1),
        planned_dose_gy: 2.0,
        independent_dose_gy: 2.001,
        deviation_percent: 0.05,
    });
    within.findings = vec![Finding {
        beam_number: None,
        check: "plan-not-approved",
        severity: Severity::Note,
        message: "The plan's approval status is APPROVED without a review date.".to_owned(),
        measured: None,
        limit: None,
    }];
    let mut tolerance = plan(
        "plans/monday/hostile.dcm",
        HOSTILE_NAME,
        FORMULA_NAME,
        vec![beam(1, "@SUM(A1)", 3.6, Verdict::BeyondTolerance), {
            let mut low = beam(2, "boost", 6.4, Verdict::Within);
            low.judgement = Some(Judgement::ShareOfTotal {
                share_percent: 3.1,
                percent_of_total: 0.2,
            });
            low
        }],
    );
    tolerance.findings = vec![Finding {
        beam_number: Some(1),
        check: "meterset-whole-number",
        severity: Severity::Tolerance,
        message: "<b>Beam 1</b> has a meterset of -1.5; check it against the record.".to_owned(),
        measured: Some("-1.5".to_owned()),
        limit: Some("=0".to_owned()),
    }];
    let long_name = "A very long plan label that somebody typed without end ".repeat(12);
    let mut action = plan(
        "plans/monday/caf\u{e9} \u{653e}\u{5c04}\u{7dda}.dcm",
        "INV-0003",
        &long_name,
        vec![beam(1, "Fl\u{fc}gel \u{3b1}", -8.2, Verdict::BeyondAction)],
    );
    action.findings = vec![Finding {
        beam_number: Some(1),
        check: "ssd-disagrees",
        severity: Severity::Action,
        message: "The plan's SSD of beam 1 and its point depth differ by 12.0 mm; find out which is right before treatment.".to_owned(),
        measured: Some("12.0 mm".to_owned()),
        limit: Some("5 mm".to_owned()),
    }];
    let open = plan(
        "plans/monday/d.dcm",
        "INV-0004",
        "Tangents",
        vec![outside_beam(1), shaped_beam(2)],
    );
    vec![within, tolerance, action, open]
}

pub(crate) fn files() -> Vec<FileEntry> {
    let file = |file: &str, kind, outcome, message: &str| FileEntry {
        file: file.to_owned(),
        size_bytes: Some(4096),
        sha256: Some("ab".repeat(32)),
        kind,
        outcome,
        message: message.to_owned(),
    };
    let mut files: Vec<FileEntry> = plans()
        .iter()
        .map(|plan| file(&plan.file, Some("plan"), FileOutcome::Audited, ""))
        .collect();
    files.push(file(
        "plans/monday/copy.dcm",
        Some("plan"),
        FileOutcome::DuplicateOf("plans/monday/a.dcm".to_owned()),
        "same instance, same bytes",
    ));
    files.push(file(
        "plans/monday/truncated.dcm",
        Some("plan"),
        FileOutcome::Unreadable,
        "The file ends inside BeamSequence (300A,00B0), byte 1811; ask for it again.",
    ));
    files.push(file(
        "plans/monday/ct.dcm",
        Some("ct"),
        FileOutcome::PassedOver,
        "an image, not a plan",
    ));
    files.push(file(
        "plans/monday/readme.txt",
        Some("not-dicom"),
        FileOutcome::PassedOver,
        "no DICOM",
    ));
    files
}

/// Writes plans and files and reads what came out.
pub(crate) fn write(folder: &Path, plans_in_full: usize, plans: &[PlanEntry]) -> Written {
    let mut writer = ReportWriter::create(folder, &run(plans_in_full)).unwrap();
    for file in files() {
        writer.file(&file).unwrap();
    }
    for plan in plans {
        writer.plan(plan).unwrap();
    }
    writer.finish(&summary()).unwrap()
}

/// The text of a file of the report.
pub(crate) fn text(folder: &Path, name: &str) -> String {
    fs::read_to_string(folder.join(name)).unwrap()
}
