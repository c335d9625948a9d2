//! The list of plan checks, and running them under the site's rules.

use super::check::{Check, CheckInput};
use crate::audit::Finding;
use crate::settings::CheckSettings;

/// Every plan check, by name.
pub const CHECKS: &[Check] = &[
    super::aperture_unusable::CHECK,
    super::beam_not_referenced::CHECK,
    super::count_mismatch::CHECK,
    super::dangling_reference::CHECK,
    super::depth_bases_disagree::CHECK,
    super::equal_beam_doses::CHECK,
    super::malformed_value::CHECK,
    super::meterset_missing::CHECK,
    super::meterset_weights::CHECK,
    super::missing_value::CHECK,
    super::point_in_build_up::CHECK,
    super::point_near_edge::CHECK,
    super::point_under_device::CHECK,
    super::repeated_attribute::CHECK,
    super::repeated_number::CHECK,
    super::setup_beam_with_meterset::CHECK,
    super::several_prescriptions::CHECK,
    super::uid_not_unique::CHECK,
    super::value_out_of_range::CHECK,
];

/// Runs every check that the site has not switched off.
#[must_use]
pub fn run_checks(input: &CheckInput<'_>, settings: &CheckSettings) -> Vec<Finding> {
    CHECKS
        .iter()
        .filter(|check| !settings.off.iter().any(|name| name == check.name))
        .flat_map(|check| {
            let severity = settings
                .severity
                .get(check.name)
                .copied()
                .unwrap_or(check.severity);
            (check.look)(input).into_iter().map(move |seen| Finding {
                beam_number: seen.beam_number,
                check: check.name,
                severity,
                message: seen.message,
                measured: seen.measured,
                limit: seen.limit,
            })
        })
        .collect()
}

/// Names in the site's check settings that no check bears.
#[must_use]
pub fn unknown_names(settings: &CheckSettings) -> Vec<&str> {
    settings
        .off
        .iter()
        .chain(settings.severity.keys())
        .map(String::as_str)
        .filter(|name| !CHECKS.iter().any(|check| check.name == *name))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::{CHECKS, run_checks};
    use crate::audit::checks::CheckInput;
    use crate::settings::Site;

    #[test]
    fn verify_every_check_fires_on_its_example_and_is_silent_beside_it() {
        let site = Site::default();
        for check in CHECKS {
            let seen = |example: &crate::audit::checks::example::Example| {
                (check.look)(&CheckInput {
                    plan: &example.plan,
                    beams: &example.beams,
                    rivals: &example.rivals,
                    site: &site,
                })
            };
            let [fires, silent] = check.examples;
            let observations = seen(&fires());
            assert!(!observations.is_empty(), "{} does not fire", check.name);
            assert!(observations.iter().all(|one| !one.message.is_empty()));
            let observations = seen(&silent());
            assert!(observations.is_empty(), "{}: {observations:?}", check.name);
        }
    }

    #[test]
    fn verify_names_are_sorted_and_texts_have_their_sections() {
        assert!(CHECKS.windows(2).all(|pair| pair[0].name < pair[1].name));
        for check in CHECKS {
            let sections = [
                "What it looks at:",
                "Why it matters:",
                "Silent when:",
                "What to do:",
                "Source:",
            ];
            let mut rest = check.text;
            for section in sections {
                let at = rest.find(section);
                assert!(at.is_some(), "{}: no section {section}", check.name);
                rest = &rest[at.unwrap_or(0)..];
            }
        }
    }

    #[test]
    fn verify_an_ordinary_plan_has_no_finding_and_a_check_that_is_off_is_silent() {
        let ordinary = super::super::example::ordinary();
        let mut site = Site::default();
        let input = |site| CheckInput {
            plan: &ordinary.plan,
            beams: &ordinary.beams,
            rivals: &ordinary.rivals,
            site,
        };
        assert_eq!(run_checks(&input(&site), &site.checks), []);
        let fires = super::super::uid_not_unique::CHECK.examples[0]();
        site.checks.off = vec!["uid-not-unique".to_owned()];
        let input = CheckInput {
            plan: &fires.plan,
            beams: &fires.beams,
            rivals: &fires.rivals,
            site: &site,
        };
        assert_eq!(run_checks(&input, &site.checks), []);
    }
}
