//! A value together with where it stands: stated, inherited from an earlier
//! control point, derived, or absent. Nothing here supplies a default: what is
//! absent stays visibly absent until a person sees it.

use serde::Serialize;

/// A value read from a plan and the ground it stands on.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
#[serde(tag = "standing", rename_all = "snake_case")]
pub enum Given<T> {
    /// The file does not give it, or gives it empty, or unusable (then a reading note says so).
    #[default]
    Absent,
    /// The file gives it here.
    Stated {
        /// The value.
        value: T,
    },
    /// An earlier control point gave it and it has not changed since.
    Inherited {
        /// The value.
        value: T,
        /// Index (item order, from 0) of the control point that stated it.
        from_control_point: usize,
    },
    /// Worked out from other attributes.
    Derived {
        /// The value.
        value: T,
        /// From what, in words.
        how: String,
    },
}

impl<T> Given<T> {
    /// A value stated by the file.
    pub const fn stated(value: T) -> Self {
        Self::Stated { value }
    }

    /// A value worked out from others.
    pub fn derived(value: T, how: impl Into<String>) -> Self {
        Self::Derived {
            value,
            how: how.into(),
        }
    }

    /// The value, if there is one.
    pub const fn value(&self) -> Option<&T> {
        match self {
            Self::Absent => None,
            Self::Stated { value }
            | Self::Inherited { value, .. }
            | Self::Derived { value, .. } => Some(value),
        }
    }

    /// A copy of the value, if there is one.
    pub fn get(&self) -> Option<T>
    where
        T: Clone,
    {
        self.value().cloned()
    }

    /// Whether there is no value.
    pub const fn is_absent(&self) -> bool {
        matches!(self, Self::Absent)
    }

    /// The same standing with the value changed.
    pub fn map<U>(self, change: impl FnOnce(T) -> U) -> Given<U> {
        match self {
            Self::Absent => Given::Absent,
            Self::Stated { value } => Given::Stated {
                value: change(value),
            },
            Self::Inherited {
                value,
                from_control_point,
            } => Given::Inherited {
                value: change(value),
                from_control_point,
            },
            Self::Derived { value, how } => Given::Derived {
                value: change(value),
                how,
            },
        }
    }

    /// One word for tables: `stated`, `inherited`, `derived`, `absent`.
    pub const fn standing(&self) -> &'static str {
        match self {
            Self::Absent => "absent",
            Self::Stated { .. } => "stated",
            Self::Inherited { .. } => "inherited",
            Self::Derived { .. } => "derived",
        }
    }
}
