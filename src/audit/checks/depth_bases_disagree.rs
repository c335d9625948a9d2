//! Two grounds for one depth that do not agree.

use super::check::{CheckInput, Observation, check};
#[cfg(test)]
use super::example;

check! {
    /// What it looks at: the geometric depths of a beam's point on every basis that is there (the user's table, the plan's point depth, SSD with a flat surface), two at a time.
    ///
    /// Why it matters: a wrong SSD or a depth of another point is a classic cause of wrong monitor units; where the surface is curved or oblique the flat-surface depth is expected to differ.
    ///
    /// Silent when: there is one basis, or all agree within the site's limit (technical.depth_disagreement_mm).
    ///
    /// What to do: look at the patient's contour along the beam, and at the SSD in the plan.
    ///
    /// Source: common practice in plan checks; the limit is the site's.
    "depth-bases-disagree", Tolerance, look,
    fires on || example::with_depths([10.0, 10.6]),
    silent on || example::with_depths([10.0, 10.4])
}

fn look(input: &CheckInput<'_>) -> Vec<Observation> {
    let limit_mm = input.site.technical.depth_disagreement_mm;
    let mut seen = Vec::new();
    for entry in input.beams {
        let depths = &entry.calculation.depths;
        for (index, first) in depths.iter().enumerate() {
            for second in depths.iter().skip(index + 1) {
                let Some((first_cm, second_cm)) = first.along_ray_cm.zip(second.along_ray_cm)
                else {
                    continue;
                };
                let difference_mm = 10.0 * (first_cm - second_cm).abs();
                if difference_mm > limit_mm {
                    seen.push(Observation {
                        beam_number: entry.beam_number,
                        message: format!(
                            "the depth of the point is {first_cm:.2} cm by {} and {second_cm:.2} cm by {}: look at the contour and the SSD",
                            first.source, second.source
                        ),
                        measured: Some(format!("{difference_mm:.1} mm")),
                        limit: Some(format!("{limit_mm} mm")),
                    });
                }
            }
        }
    }
    seen
}
