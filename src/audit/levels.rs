//! Which action level holds for a beam, and what a deviation is against it.

use super::Verdict;
use crate::dose::{DepthCandidate, Technique};
use crate::settings::{ActionLevel, ActionLevels};

/// The levels that hold for one beam.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Levels {
    pub(super) tolerance_percent: f64,
    pub(super) action_percent: f64,
    pub(super) basis: String,
}

impl Levels {
    /// The verdict on a deviation. NaN is beyond action: it must never pass.
    pub(super) fn verdict(&self, deviation_percent: f64) -> Verdict {
        let size = deviation_percent.abs();
        if size <= self.tolerance_percent {
            Verdict::Within
        } else if size <= self.action_percent {
            Verdict::BeyondTolerance
        } else {
            Verdict::BeyondAction
        }
    }
}

/// The levels of a technique; `None` for a beam that is not delivered for
/// treatment. They widen by the site's amount when the depth stands on the
/// planning system's own word.
pub(super) fn levels_for(
    technique: Technique,
    depth: Option<&DepthCandidate>,
    site: &ActionLevels,
) -> Option<Levels> {
    let group = group_of(technique, site)?;
    let dependent = depth.is_some_and(|depth| !depth.independent);
    let widening_percent = if dependent {
        site.dependent_depth_widening_percent
    } else {
        0.0
    };
    let mut basis = group.basis.clone();
    if widening_percent > 0.0 {
        basis.push_str(&format!(
            "; widened by {widening_percent} % because the depth is the planning system's own"
        ));
    }
    Some(Levels {
        tolerance_percent: group.tolerance_percent + widening_percent,
        action_percent: group.action_percent + widening_percent,
        basis,
    })
}

const fn group_of(technique: Technique, site: &ActionLevels) -> Option<&ActionLevel> {
    match technique {
        Technique::Setup => None,
        Technique::Static => Some(&site.static_open),
        Technique::Wedge => Some(&site.wedged),
        Technique::Blocked | Technique::Mlc => Some(&site.irregular),
        Technique::Segmented | Technique::Dynamic => Some(&site.modulated),
        Technique::Arc => Some(&site.arc),
        Technique::Electron => Some(&site.electron),
    }
}

#[cfg(test)]
mod tests {
    use super::levels_for;
    use crate::audit::Verdict;
    use crate::dose::Technique;
    use crate::settings::ActionLevels;

    #[test]
    fn verify_the_edge_belongs_to_the_better_side_and_nan_to_the_worst() {
        let site = ActionLevels::default();
        let levels = levels_for(Technique::Static, None, &site).unwrap();
        let (tolerance, action) = (levels.tolerance_percent, levels.action_percent);
        assert_eq!(levels.verdict(tolerance), Verdict::Within);
        assert_eq!(levels.verdict(-tolerance), Verdict::Within);
        assert_eq!(levels.verdict(tolerance + 1e-9), Verdict::BeyondTolerance);
        assert_eq!(levels.verdict(-action - 1e-9), Verdict::BeyondAction);
        assert_eq!(levels.verdict(f64::NAN), Verdict::BeyondAction);
        assert_eq!(levels.verdict(f64::INFINITY), Verdict::BeyondAction);
    }
}
