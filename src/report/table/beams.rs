//! The columns of `beams.csv`.

use super::{Cell, Column};
use crate::audit::{BeamEntry, Judgement, PlanEntry};
use crate::dose::{DepthCandidate, Method, ShapedResult};

/// What a row is made of.
#[derive(Clone, Copy, Debug)]
pub(in crate::report) struct BeamRow<'a> {
    pub(in crate::report) run_id: &'a str,
    pub(in crate::report) plan: &'a PlanEntry,
    pub(in crate::report) beam: &'a BeamEntry,
}

impl BeamRow<'_> {
    fn depth(&self) -> Option<&DepthCandidate> {
        self.beam.calculation.depths.first()
    }
}

type Getter = for<'a, 'b> fn(&'b BeamRow<'a>) -> Cell;

const fn column(name: &'static str, meaning: &'static str, cell: Getter) -> Column<Getter> {
    Column {
        name,
        meaning,
        cell,
    }
}

/// The columns, in order.
pub(in crate::report) const BEAM_COLUMNS: &[Column<Getter>] = &[
    column("file", "the plan's file as it was given or found", |r| {
        Cell::word(&r.plan.file)
    }),
    column("sop_instance_uid", "SOP Instance UID of the plan", |r| {
        Cell::text(r.plan.sop_instance_uid.as_ref())
    }),
    column(
        "patient_id",
        "Patient ID, or its pseudonym when so ordered",
        |r| Cell::text(r.plan.patient_id.as_ref()),
    ),
    column("plan_label", "RT Plan Label", |r| {
        Cell::text(r.plan.plan_label.as_ref())
    }),
    column(
        "fraction_group",
        "fraction group number; empty for a beam that no group references",
        |r| Cell::whole(r.beam.fraction_group),
    ),
    column("machine", "treatment machine name", |r| {
        Cell::text(r.beam.machine.as_ref())
    }),
    column("beam_number", "beam number", |r| {
        Cell::whole(r.beam.beam_number)
    }),
    column("beam_name", "beam name", |r| {
        Cell::text(r.beam.beam_name.as_ref())
    }),
    column("radiation", "PHOTON, ELECTRON or what the file says", |r| {
        Cell::text(r.beam.radiation.as_ref())
    }),
    column(
        "energy",
        "nominal energy, MV for photons and MeV for electrons, with the fluence mode when not standard",
        |r| Cell::text(r.beam.energy.as_ref()),
    ),
    column(
        "technique",
        "static, wedge, blocked, mlc, segmented, dynamic, arc, electron, or setup for a beam that is not delivered for treatment",
        |r| Cell::word(r.beam.calculation.technique.term()),
    ),
    column(
        "gantry_deg",
        "gantry angle of the first control point, degrees",
        |r| Cell::number(r.beam.calculation.gantry_deg),
    ),
    column(
        "gantry_end_deg",
        "gantry angle of the last control point, degrees",
        |r| Cell::number(r.beam.calculation.gantry_end_deg),
    ),
    column("collimator_deg", "collimator angle, degrees", |r| {
        Cell::number(r.beam.calculation.collimator_deg)
    }),
    column("couch_deg", "patient support angle, degrees", |r| {
        Cell::number(r.beam.calculation.couch_deg)
    }),
    column("control_points", "number of control points", |r| {
        Cell::count(r.beam.control_points)
    }),
    column(
        "x_cm",
        "opening along x at the isocentre plane, cm, meterset-weighted when it moves",
        |r| Cell::number(r.beam.calculation.x_cm),
    ),
    column(
        "y_cm",
        "opening along y at the isocentre plane, cm, meterset-weighted when it moves",
        |r| Cell::number(r.beam.calculation.y_cm),
    ),
    column(
        "collimator_square_cm",
        "side of the equivalent square for collimator scatter, at the isocentre plane, cm",
        |r| {
            let squares = r.beam.calculation.squares;
            Cell::number(squares.map(|squares| squares.collimator.side_cm()))
        },
    ),
    column(
        "phantom_square_cm",
        "side of the equivalent square for phantom scatter, at the plane of the point, cm",
        |r| {
            let squares = r.beam.calculation.squares;
            Cell::number(
                squares
                    .and_then(|squares| squares.phantom)
                    .map(|square| square.side_cm()),
            )
        },
    ),
    column(
        "ssd_cm",
        "source-surface distance on the axis that goes with the depth used, else the plan's, cm",
        |r| {
            let of_depth = r.depth().and_then(|depth| depth.ssd_cm);
            Cell::number(of_depth.or(r.beam.calculation.plan_ssd_cm))
        },
    ),
    column(
        "depth_cm",
        "geometric depth of the point, cm: perpendicular to a flat surface, else along the ray when only that is known",
        |r| {
            Cell::number(
                r.depth()
                    .and_then(|depth| depth.perpendicular_cm.or(depth.along_ray_cm)),
            )
        },
    ),
    column(
        "effective_depth_cm",
        "radiological depth of the point along the ray, cm",
        |r| Cell::number(r.depth().map(|depth| depth.effective_cm)),
    ),
    column(
        "depth_basis",
        "on what ground the depth stands: ct, contour, table, plan, ssd or none",
        |r| Cell::word(r.depth().map_or("none", |depth| depth.basis.term())),
    ),
    column(
        "point_basis",
        "which rule gave the point: beam, reference, target, structure, isocentre or none",
        |r| {
            let point = r.beam.calculation.point.as_ref();
            Cell::word(point.map_or("none", |point| point.basis.term()))
        },
    ),
    column(
        "off_axis_cm",
        "distance of the point's projection from the axis, at the isocentre plane, cm",
        |r| {
            let point = r.beam.calculation.point.as_ref();
            Cell::number(point.and_then(|point| point.off_axis_cm))
        },
    ),
    column("planned_mu", "planned meterset, MU", |r| {
        Cell::number(r.beam.planned_mu)
    }),
    column(
        "planned_dose_gy",
        "the plan's dose of the beam at the point in one fraction, Gy",
        |r| Cell::number(r.beam.planned_dose_gy),
    ),
    column(
        "independent_dose_gy",
        "independent dose for the planned meterset in one fraction, Gy; no verification when the verdict is not-verifiable",
        |r| Cell::number(r.beam.independent_dose_gy),
    ),
    column(
        "independent_mu",
        "meterset that would give the planned dose, MU; no verification when the verdict is not-verifiable",
        |r| Cell::number(r.beam.independent_mu),
    ),
    column(
        "deviation_percent",
        "100 * (independent dose - planned dose) / planned dose; no verification when the verdict is not-verifiable",
        |r| Cell::number(r.beam.deviation_percent),
    ),
    column(
        "expected_spread_percent",
        "expected spread of the independent dose, 1 standard deviation, per cent",
        |r| Cell::number(r.beam.expected_spread_percent),
    ),
    column(
        "tolerance_percent",
        "tolerance that holds for the beam, per cent on both sides of zero",
        |r| Cell::number(r.beam.tolerance_percent),
    ),
    column(
        "action_percent",
        "action level that holds for the beam, per cent on both sides of zero",
        |r| Cell::number(r.beam.action_percent),
    ),
    column(
        "verdict",
        "within, beyond-tolerance, beyond-action, not-verifiable or not-treated",
        |r| Cell::word(r.beam.verdict.term()),
    ),
    column(
        "method",
        "factors, scatter-integration, electron-factors, or empty when nothing was calculated",
        |r| {
            let method = r.beam.calculation.method.map(Method::term);
            method.map_or(Cell::Missing, Cell::word)
        },
    ),
    column(
        "likely_cause",
        "what a deviation may come from; empty when nothing was found",
        |_| Cell::Missing,
    ),
    column(
        "reasons",
        "why the verdict is what it is, joined with semicolons",
        |r| joined(&r.beam.reasons),
    ),
    column(
        "judged_by",
        "alone, share-of-total (as a per cent of all beams at the point), fraction-sum, or empty when not judged",
        |r| {
            let judgement = r.beam.judgement.as_ref();
            judgement.map_or(Cell::Missing, |judgement| {
                Cell::word(match judgement {
                    Judgement::Alone => "alone",
                    Judgement::ShareOfTotal { .. } => "share-of-total",
                    Judgement::FractionSum { .. } => "fraction-sum",
                })
            })
        },
    ),
    column(
        "judged_percent",
        "the deviation that was compared with the levels, per cent",
        |r| Cell::number(judged_percent(r.beam)),
    ),
    column(
        "depth_independent",
        "whether the depth's ground is independent of the planning system: yes, no, or empty without a depth",
        |r| {
            r.depth().map_or(Cell::Missing, |depth| {
                Cell::word(if depth.independent { "yes" } else { "no" })
            })
        },
    ),
    column(
        "level_basis",
        "where tolerance and action level come from",
        |r| Cell::text(r.beam.level_basis.as_ref()),
    ),
    column(
        "remarks",
        "worth knowing, without effect on the verdict, joined with semicolons",
        |r| joined(&r.beam.remarks),
    ),
    column(
        "mean_leaf_gap_cm",
        "mean gap of the open leaf pairs over leaf width and meterset, at the isocentre plane, cm; empty without leaves or when not integrated",
        |r| Cell::number(shaped(r).and_then(|shaped| shaped.mean_leaf_gap_cm)),
    ),
    column(
        "open_primary_percent",
        "share of the independent dose that is primary through the opening, per cent; empty when not integrated",
        |r| Cell::number(shaped(r).map(|shaped| shaped.shares.open_primary_percent)),
    ),
    column(
        "scatter_percent",
        "share of the independent dose that is phantom scatter of what came through the opening, per cent; empty when not integrated",
        |r| Cell::number(shaped(r).map(|shaped| shaped.shares.open_scatter_percent)),
    ),
    column(
        "transmission_percent",
        "share of the independent dose that came through leaves and blocks, per cent; empty when not integrated",
        |r| Cell::number(shaped(r).map(|shaped| shaped.shares.transmission_percent)),
    ),
    column(
        "run_id",
        "identifier of the run, the same in every file of the report",
        |r| Cell::word(r.run_id),
    ),
];

/// What a scatter integration found.
fn shaped<'b>(row: &'b BeamRow<'_>) -> Option<&'b ShapedResult> {
    row.beam.calculation.shaped.as_ref()
}

fn joined(sentences: &[String]) -> Cell {
    if sentences.is_empty() {
        return Cell::Missing;
    }
    Cell::Text(sentences.join("; "))
}

/// The deviation that was compared with the levels, per cent; `None` when the beam was not judged.
pub(in crate::report) fn judged_percent(beam: &BeamEntry) -> Option<f64> {
    match beam.judgement.as_ref()? {
        Judgement::Alone => beam.deviation_percent,
        Judgement::ShareOfTotal {
            percent_of_total, ..
        } => Some(*percent_of_total),
        Judgement::FractionSum {
            sum_deviation_percent,
        } => Some(*sum_deviation_percent),
    }
}
