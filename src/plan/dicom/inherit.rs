//! What a control point takes over: its beam's frame and the control point
//! before it.

use super::node::Reading;
use crate::plan::{ControlPoint, LimitingDevice, RadiationType, Wedge};
use crate::quantity::Given;

/// What control points need of their beam.
pub(super) struct BeamFrame<'b> {
    pub(super) radiation: Option<&'b RadiationType>,
    pub(super) devices: &'b [LimitingDevice],
    pub(super) wedges: &'b [Wedge],
}

/// The control point before this one.
pub(super) struct Before<'p> {
    pub(super) point: &'p ControlPoint,
    pub(super) index: usize,
}

impl Before<'_> {
    /// What stands here, or what stood before when nothing does.
    pub(super) fn carry<T: Clone>(&self, here: Reading<T>, before: &Given<T>) -> Given<T> {
        match here {
            Reading::Value(value) => Given::stated(value),
            Reading::Unusable => Given::Absent,
            Reading::Nothing => match before {
                Given::Stated { value } => Given::Inherited {
                    value: value.clone(),
                    from_control_point: self.index,
                },
                other => other.clone(),
            },
        }
    }
}
