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

use super::depth_question::{DepthFindings, DepthQuestion, DepthRow};
use super::plan_depth::from_plan;
use super::{DepthBasis, DepthCandidate};
use crate::quantity::tolerance;

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
