//! How deep the point lies, on every basis there is, best first: the user's
//! table, the plan's point depth, the plan's SSD with a flat surface
//! perpendicular to the axis. Nothing is guessed: a basis that contradicts
//! itself or puts the point above the surface is an obstacle. Whether two
//! bases agree is judged in `audit`.
//!
//! Conventions. The plan's Beam Dose Point Depth, Equivalent Depth and SSD and
//! the user's table hold along the ray from the source to the point; Source to
//! Surface Distance (300A,0130) holds on the axis. With a flat surface
//! perpendicular to the axis, depth perpendicular = depth along the ray * cos(ray, axis).

use super::{DepthBasis, DepthCandidate, DosePoint, Obstacle, ObstacleKind, PointBasis, RayPoint};
use crate::plan::{Beam, ControlPoint, Plan, PointDepth, PointDepthPlace, ReferencedBeam};
use crate::quantity::{Given, tolerance};

/// One row of the user's depth table, already read and found to be about this beam.
#[derive(Clone, Debug, PartialEq)]
pub struct DepthRow {
    /// SOP Instance UID of the plan.
    pub sop_instance_uid: String,
    /// Beam Number.
    pub beam_number: i32,
    /// Geometric depth along the ray from the source to the point, cm.
    pub depth_cm: f64,
    /// Radiological depth along the same ray, cm.
    pub effective_depth_cm: Option<f64>,
    /// Source-surface distance on the axis, cm.
    pub ssd_cm: Option<f64>,
    /// Whether the user says that the row does not come from the planning system.
    pub independent: bool,
}

/// Depths found, and what was found on the way.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct DepthFindings {
    /// Best basis first.
    pub(super) candidates: Vec<DepthCandidate>,
    /// Bases that state a radiological depth of their own.
    pub(super) radiological: Vec<DepthBasis>,
    /// Contradictions and impossible depths.
    pub(super) obstacles: Vec<Obstacle>,
    /// Worth telling.
    pub(super) remarks: Vec<String>,
}

/// What depths are sought for.
#[derive(Clone, Copy, Debug)]
pub(super) struct DepthQuestion<'a> {
    /// The plan.
    pub(super) plan: &'a Plan,
    /// The beam.
    pub(super) beam: &'a Beam,
    /// Its reference in the fraction group.
    pub(super) reference: Option<&'a ReferencedBeam>,
    /// The point.
    pub(super) point: Option<&'a DosePoint>,
    /// Its ray, when the beam stands still and its geometry is known.
    pub(super) ray: Option<RayPoint>,
    /// Control points that deliver dose.
    pub(super) delivering: &'a [&'a ControlPoint],
    /// The user's row.
    pub(super) row: Option<&'a DepthRow>,
    /// Two statements of one depth or SSD may differ by this, cm.
    pub(super) limit_cm: f64,
}

impl DepthFindings {
    fn object(&mut self, message: String) {
        self.obstacles.push(Obstacle {
            kind: ObstacleKind::Depth,
            message,
        });
    }

    /// Takes a candidate unless it puts the point above the surface.
    fn take(&mut self, candidate: DepthCandidate) {
        let negative = [candidate.perpendicular_cm, candidate.along_ray_cm]
            .into_iter()
            .flatten()
            .chain([candidate.effective_cm])
            .find(|&depth_cm| depth_cm.is_nan() || depth_cm < 0.0);
        match negative {
            Some(depth_cm) => self.object(format!(
                "the depth is {depth_cm:.2} cm, the point above the surface, by {}: check point and SSD",
                candidate.source
            )),
            None => self.candidates.push(candidate),
        }
    }
}

/// Every depth of the point, best basis first.
#[must_use]
pub(super) fn find_depths(question: &DepthQuestion<'_>) -> DepthFindings {
    let mut found = DepthFindings::default();
    if let Some(row) = question.row {
        from_row(row, question, &mut found);
    }
    from_plan(question, &mut found);
    from_ssd(question, &mut found);
    // Without a ray something else is missing already, and the caller says what.
    if found.candidates.is_empty() && question.ray.is_some() {
        found.object(
            "the depth of the point is not known: the plan gives neither a point depth nor a usable SSD; a row in the depth table would give it"
                .to_owned(),
        );
    }
    found
}

fn from_row(row: &DepthRow, question: &DepthQuestion<'_>, found: &mut DepthFindings) {
    let perpendicular_cm = question.ray.map(|ray| row.depth_cm * ray.cosine());
    let axis_ssd_cm = question
        .ray
        .zip(perpendicular_cm)
        .map(|(ray, depth_cm)| ray.spd_cm - depth_cm);
    if let (Some(stated_cm), Some(worked_cm)) = (row.ssd_cm, axis_ssd_cm)
        && (stated_cm - worked_cm).abs() > question.limit_cm
    {
        found.object(format!(
            "the depth table contradicts itself: SSD {stated_cm:.2} cm, but depth {:.2} cm of a point at this distance from the source makes it {worked_cm:.2} cm",
            row.depth_cm
        ));
    }
    if row.effective_depth_cm.is_some() {
        found.radiological.push(DepthBasis::Table);
    }
    found.take(DepthCandidate {
        basis: DepthBasis::Table,
        independent: row.independent,
        perpendicular_cm,
        along_ray_cm: Some(row.depth_cm),
        effective_cm: row.effective_depth_cm.unwrap_or(row.depth_cm),
        ssd_cm: axis_ssd_cm.or(row.ssd_cm),
        source: format!(
            "depth table, beam {}: depth {:.2} cm{}",
            row.beam_number,
            row.depth_cm,
            row.effective_depth_cm
                .map_or_else(String::new, |depth_cm| format!(
                    ", effective {depth_cm:.2} cm"
                ))
        ),
    });
}

/// A set of the plan's point depths with the words for its place.
struct Placed<'a> {
    set: &'a PointDepth,
    place: String,
}

const fn rank(place: PointDepthPlace) -> u8 {
    match place {
        PointDepthPlace::ReferencedBeam => 0,
        PointDepthPlace::VerificationControlPoint(_) => 1,
        PointDepthPlace::ControlPoint => 2,
        PointDepthPlace::RetiredAverage => 3,
    }
}

fn place_text(place: PointDepthPlace) -> String {
    match place {
        PointDepthPlace::ReferencedBeam => "the referenced beam".to_owned(),
        PointDepthPlace::RetiredAverage => "the referenced beam's retired averages".to_owned(),
        PointDepthPlace::VerificationControlPoint(index) => {
            format!("verification control point {index} (300A,008C)")
        }
        PointDepthPlace::ControlPoint => "the control points (300C,0050)".to_owned(),
    }
}

/// The sets that belong to the point, best place first.
fn sets_of_plan<'a>(question: &DepthQuestion<'a>, found: &mut DepthFindings) -> Vec<Placed<'a>> {
    let mut sets: Vec<Placed<'a>> = question
        .reference
        .iter()
        .flat_map(|reference| &reference.point_depths)
        .map(|set| Placed {
            set,
            place: place_text(set.place),
        })
        .collect();
    let mut strangers: Vec<String> = Vec::new();
    for (index, point) in question.beam.control_points.iter().enumerate() {
        for dose in &point.referenced_doses {
            let Some(set) = &dose.point_depth else {
                continue;
            };
            if belongs(question, dose.number.get()) {
                sets.push(Placed {
                    set,
                    place: format!("control point {index} (300C,0050)"),
                });
            } else {
                let number = dose
                    .number
                    .get()
                    .map_or_else(|| "without number".to_owned(), |number| number.to_string());
                if !strangers.contains(&number) {
                    strangers.push(number);
                }
            }
        }
    }
    if !strangers.is_empty() {
        found.remarks.push(format!(
            "the control points give depths of dose reference {}, whose point is another one or not stated: not used",
            strangers.join(", ")
        ));
    }
    sets.retain(|placed| {
        !(placed.set.depth_cm.is_absent()
            && placed.set.equivalent_depth_cm.is_absent()
            && placed.set.ssd_cm.is_absent())
    });
    sets.sort_by_key(|placed| rank(placed.set.place));
    sets
}

/// Whether a control point's dose reference is at the point in question: by its coordinates, or, when it has
/// none, because it is the one that the referenced beam names for the dose at its specification point.
fn belongs(question: &DepthQuestion<'_>, number: Option<i32>) -> bool {
    let (Some(number), Some(point)) = (number, question.point) else {
        return false;
    };
    question
        .plan
        .dose_references
        .iter()
        .filter(|reference| reference.number.value() == Some(&number))
        .any(|reference| match reference.point.get() {
            Some(at) => at.distance_cm(point.patient) <= tolerance::SHARED_POINT_CM,
            None => {
                let named = question
                    .reference
                    .and_then(|beam| beam.dose_reference_uid.value());
                point.basis == PointBasis::Beam && named.is_some() && named == reference.uid.value()
            }
        })
}

fn from_plan(question: &DepthQuestion<'_>, found: &mut DepthFindings) {
    let sets = sets_of_plan(question, found);
    // A set without a depth of its own cannot carry the basis unless the ray turns its SSD into one.
    let Some(main) = sets.iter().find(|placed| {
        let set = placed.set;
        !set.depth_cm.is_absent() || !set.equivalent_depth_cm.is_absent() || question.ray.is_some()
    }) else {
        return;
    };
    if question.ray.is_some() {
        for other in &sets {
            compare_sets(main, other, question.limit_cm, found);
        }
    }
    if sets.iter().any(|placed| {
        placed.set.averaged.get() == Some(true)
            || placed.set.place == PointDepthPlace::RetiredAverage
    }) {
        found
            .remarks
            .push("the plan marks its point depths as averages over the beam".to_owned());
    }
    let set = main.set;
    let slant_cm = question.ray.map(|ray| ray.slant_distance_cm());
    let by_ssd_cm = slant_cm
        .zip(set.ssd_cm.get())
        .map(|(slant_cm, ssd_cm)| slant_cm - ssd_cm);
    if let (Some(depth_cm), Some(by_ssd_cm)) = (set.depth_cm.get(), by_ssd_cm)
        && (depth_cm - by_ssd_cm).abs() > question.limit_cm
    {
        found.object(format!(
            "{} gives depth {depth_cm:.2} cm, but its SSD of {:.2} cm makes it {by_ssd_cm:.2} cm for a point at this distance from the source",
            main.place,
            set.ssd_cm.get().unwrap_or_default(),
        ));
    }
    let along_ray_cm = set.depth_cm.get().or(by_ssd_cm);
    let Some(effective_cm) = set.equivalent_depth_cm.get().or(along_ray_cm) else {
        return;
    };
    let perpendicular_cm = along_ray_cm
        .zip(question.ray)
        .map(|(depth_cm, ray)| depth_cm * ray.cosine());
    if !set.equivalent_depth_cm.is_absent() {
        found.radiological.push(DepthBasis::Plan);
    }
    found.take(DepthCandidate {
        basis: DepthBasis::Plan,
        independent: false,
        perpendicular_cm,
        along_ray_cm,
        effective_cm,
        ssd_cm: perpendicular_cm
            .zip(question.ray)
            .map(|(depth_cm, ray)| ray.spd_cm - depth_cm),
        source: format!("{}: {}", main.place, set_text(set)),
    });
}

fn set_text(set: &PointDepth) -> String {
    let parts: Vec<String> = [
        ("depth", "300A,0088", &set.depth_cm),
        ("equivalent depth", "300A,0089", &set.equivalent_depth_cm),
        ("SSD of the point", "300A,008A", &set.ssd_cm),
    ]
    .into_iter()
    .filter_map(|(name, tag, value)| {
        let value_cm = value.get()?;
        Some(format!("{name} ({tag}) {value_cm:.2} cm"))
    })
    .collect();
    parts.join(", ")
}

fn compare_sets(main: &Placed<'_>, other: &Placed<'_>, limit_cm: f64, found: &mut DepthFindings) {
    type Value = fn(&PointDepth) -> &Given<f64>;
    let values: [(&str, Value); 3] = [
        ("depth", |set| &set.depth_cm),
        ("equivalent depth", |set| &set.equivalent_depth_cm),
        ("SSD of the point", |set| &set.ssd_cm),
    ];
    for (name, value) in values {
        if let (Some(a), Some(b)) = (value(main.set).get(), value(other.set).get())
            && (a - b).abs() > limit_cm
        {
            found.object(format!(
                "the plan contradicts itself on the {name}: {a:.2} cm at {}, {b:.2} cm at {}",
                main.place, other.place
            ));
        }
    }
}

fn from_ssd(question: &DepthQuestion<'_>, found: &mut DepthFindings) {
    let Some(ray) = question.ray else {
        return;
    };
    let mut ssds = question
        .delivering
        .iter()
        .filter_map(|point| point.ssd_cm.get());
    let Some(ssd_cm) = ssds.next() else {
        return;
    };
    if let Some(other_cm) = ssds.find(|other_cm| (other_cm - ssd_cm).abs() > tolerance::POSITION_CM)
    {
        found.object(format!(
            "Source to Surface Distance (300A,0130) is {ssd_cm:.2} cm at one control point and {other_cm:.2} cm at another, though the beam stands still"
        ));
    }
    let perpendicular_cm = ray.spd_cm - ssd_cm;
    let along_ray_cm = perpendicular_cm / ray.cosine();
    found.take(DepthCandidate {
        basis: DepthBasis::Ssd,
        independent: false,
        perpendicular_cm: Some(perpendicular_cm),
        along_ray_cm: Some(along_ray_cm),
        effective_cm: along_ray_cm,
        ssd_cm: Some(ssd_cm),
        source: format!(
            "SSD (300A,0130) {ssd_cm:.2} cm and a flat surface: {:.2} - {ssd_cm:.2} = {perpendicular_cm:.2} cm",
            ray.spd_cm
        ),
    });
}
