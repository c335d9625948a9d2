//! Points and vectors that carry their IEC 61217 coordinate frame in the type,
//! so that only like frames subtract. Turning one frame into another is the
//! work of `dose::geometry`, not of this file.

use std::fmt;
use std::marker::PhantomData;
use std::ops::Sub;

use serde::{Serialize, Serializer, ser::SerializeStruct};

/// A coordinate frame.
pub trait Frame: Copy + fmt::Debug + PartialEq {
    /// The frame's name in reports.
    const NAME: &'static str;
}

macro_rules! frames {
    ($($(#[$doc:meta])* $name:ident = $text:literal;)*) => {$(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq)]
        pub enum $name {}
        impl Frame for $name {
            const NAME: &'static str = $text;
        }
    )*};
}

frames! {
    /// DICOM patient coordinates: x to the patient's left, y posterior, z superior.
    Patient = "patient";
    /// IEC 61217 fixed system F: X right for an observer facing the gantry, Y toward the gantry, Z up; origin at the isocentre.
    Fixed = "fixed";
    /// IEC 61217 gantry system G: Z from the isocentre to the source; origin at the isocentre.
    Gantry = "gantry";
    /// Beam limiting device system b, with its origin moved from the source to the isocentre; z toward the source.
    Collimator = "collimator";
}

/// A point of frame `F`, cm.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Point<F: Frame> {
    /// x, cm.
    pub x_cm: f64,
    /// y, cm.
    pub y_cm: f64,
    /// z, cm.
    pub z_cm: f64,
    frame: PhantomData<F>,
}

/// A difference of two points of frame `F`, cm.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Vector<F: Frame> {
    /// x, cm.
    pub x_cm: f64,
    /// y, cm.
    pub y_cm: f64,
    /// z, cm.
    pub z_cm: f64,
    frame: PhantomData<F>,
}

impl<F: Frame> Point<F> {
    /// A point from its coordinates in cm.
    #[must_use]
    pub const fn new(x_cm: f64, y_cm: f64, z_cm: f64) -> Self {
        Self {
            x_cm,
            y_cm,
            z_cm,
            frame: PhantomData,
        }
    }

    /// The frame's origin.
    #[must_use]
    pub const fn origin() -> Self {
        Self::new(0.0, 0.0, 0.0)
    }

    /// Distance to another point of the same frame, cm.
    #[must_use]
    pub fn distance_cm(self, other: Self) -> f64 {
        (self - other).length_cm()
    }
}

impl<F: Frame> Vector<F> {
    /// A vector from its components in cm.
    #[must_use]
    pub const fn new(x_cm: f64, y_cm: f64, z_cm: f64) -> Self {
        Self {
            x_cm,
            y_cm,
            z_cm,
            frame: PhantomData,
        }
    }

    /// Length, cm.
    #[must_use]
    pub fn length_cm(self) -> f64 {
        self.x_cm.hypot(self.y_cm).hypot(self.z_cm)
    }
}

impl<F: Frame> Sub for Point<F> {
    type Output = Vector<F>;

    fn sub(self, other: Self) -> Vector<F> {
        Vector::new(
            self.x_cm - other.x_cm,
            self.y_cm - other.y_cm,
            self.z_cm - other.z_cm,
        )
    }
}

impl<F: Frame> fmt::Display for Point<F> {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            out,
            "({:.2}, {:.2}, {:.2}) cm",
            self.x_cm, self.y_cm, self.z_cm
        )
    }
}

impl<F: Frame> Serialize for Point<F> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut out = serializer.serialize_struct("Point", 4)?;
        out.serialize_field("frame", F::NAME)?;
        out.serialize_field("x_cm", &self.x_cm)?;
        out.serialize_field("y_cm", &self.y_cm)?;
        out.serialize_field("z_cm", &self.z_cm)?;
        out.end()
    }
}
