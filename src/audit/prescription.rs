//! What the plan prescribes: the target prescription doses that its fraction
//! groups refer to.

use crate::plan::Plan;

/// One target prescription dose.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct StatedPrescription {
    pub(super) reference_number: Option<i32>,
    pub(super) dose_gy: f64,
}

/// Every target prescription dose that the fraction groups refer to, in order
/// and once each: at the group's own reference when it stands there, else at
/// the Dose Reference of that number. When no group refers to any, those of
/// the plan's Dose References.
pub(super) fn stated_prescriptions(plan: &Plan) -> Vec<StatedPrescription> {
    let at_plan = |number: i32| {
        plan.dose_references
            .iter()
            .find(|reference| reference.number.value() == Some(&number))
            .and_then(|reference| reference.target_prescription_dose_gy.get())
    };
    let mut stated: Vec<StatedPrescription> = Vec::new();
    let mut add = |reference_number: Option<i32>, dose_gy: f64| {
        let one = StatedPrescription {
            reference_number,
            dose_gy,
        };
        if !stated.contains(&one) {
            stated.push(one);
        }
    };
    let referred = plan
        .fraction_groups
        .iter()
        .flat_map(|group| &group.dose_references);
    let mut any_reference = false;
    for reference in referred {
        any_reference = true;
        let number = reference.number.get();
        let dose_gy = reference
            .target_prescription_dose_gy
            .get()
            .or_else(|| number.and_then(at_plan));
        if let Some(dose_gy) = dose_gy {
            add(number, dose_gy);
        }
    }
    if !any_reference {
        for reference in &plan.dose_references {
            if let Some(dose_gy) = reference.target_prescription_dose_gy.get() {
                add(reference.number.get(), dose_gy);
            }
        }
    }
    stated
}
