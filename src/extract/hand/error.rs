//! Where statements by hand contradict each other, or speak of nothing.

use crate::geometry::Point;
use crate::layout::length::Micrometres;
use encodings::Mask;
use std::fmt;
use thiserror::Error;

/// A point, for people.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Place {
    pub(super) at: Point,
    pub(super) unit_pm: u64,
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let [x, y] = [self.at.x, self.at.y].map(|units| Micrometres::new(units, self.unit_pm));
        write!(f, "({x} um, {y} um)")
    }
}

/// Where statements were made that contradict each other, or that speak of nothing. Masks are shown from 1.
#[derive(Clone, Debug, Error, PartialEq, Eq)]
pub enum HandError {
    /// A point in no feature.
    #[error("the point {at} given by hand is in no feature of the layer{near}")]
    NoFeature {
        /// The point.
        at: Place,
        /// What would be right, with a word before it.
        near: String,
    },
    /// One feature on two masks.
    #[error(
        "the feature at {one} is fixed on mask {} there and on mask {} at {other}: a feature fixed by hand is \
         on one mask",
        masks[0] + 1, masks[1] + 1
    )]
    TwoMasks {
        /// Where it is on one mask.
        one: Place,
        /// And where on the other.
        other: Place,
        /// The two masks.
        masks: [Mask; 2],
    },
    /// Features that share a mask, on two masks.
    #[error(
        "the features at {one} and {other} must share a mask, but are fixed on mask {} and mask {}",
        masks[0] + 1, masks[1] + 1
    )]
    SharedOnTwo {
        /// One of them.
        one: Place,
        /// Another one.
        other: Place,
        /// Their masks.
        masks: [Mask; 2],
    },
    /// Features that must differ are one.
    #[error("the points {one} and {other} are in one feature, and must be on different masks")]
    DifferentIsOne {
        /// One point.
        one: Place,
        /// The other one.
        other: Place,
    },
    /// Features that must differ share a mask.
    #[error("the features at {one} and {other} must share a mask, and must be on different ones")]
    SharedAndDifferent {
        /// One of them.
        one: Place,
        /// The other one.
        other: Place,
    },
    /// Features that must differ, on one mask.
    #[error(
        "the features at {one} and {other} must be on different masks, but both are fixed on mask {}",
        mask + 1
    )]
    DifferentOnOne {
        /// One of them.
        one: Place,
        /// The other one.
        other: Place,
        /// The mask.
        mask: Mask,
    },
    /// More features that must differ than masks.
    #[error(
        "{count} features, the first at {first}, must all be on different masks, and there are {masks} masks"
    )]
    TooManyDifferent {
        /// The first of them.
        first: Place,
        /// How many they are.
        count: usize,
        /// K.
        masks: u8,
    },
}
