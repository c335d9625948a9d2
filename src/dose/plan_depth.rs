//! The plan's own point depths: Beam Dose Point Depth, Equivalent Depth and SSD
//! at the referenced beam, in its verification control points and at the control
//! points. Each set is used as a set, and sets that contradict each other are an
//! obstacle. Conventions and the other bases are in `depth`.

use super::depth_question::{DepthFindings, DepthQuestion};
use super::{DepthBasis, DepthCandidate, PointBasis};
use crate::plan::{PointDepth, PointDepthPlace};
use crate::quantity::{Given, tolerance};

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
pub(super) fn belongs(question: &DepthQuestion<'_>, number: Option<i32>) -> bool {
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

/// The depth by the plan's point depth attributes.
pub(super) fn from_plan(question: &DepthQuestion<'_>, found: &mut DepthFindings) {
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
