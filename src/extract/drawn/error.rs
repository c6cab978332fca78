//! Where a drawing is that of no colouring, and what would be right.

use crate::extract::ExtractError;
use crate::geometry::Rect;
use crate::layout::Policy;
use crate::layout::length::Micrometres;
use encodings::Mask;
use std::fmt;
use thiserror::Error;

/// A rectangle, for people.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Area {
    /// In database units.
    pub rect: Rect,
    /// One of them in picometres.
    pub unit_pm: u64,
}

impl fmt::Display for Area {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Rect { min, max } = self.rect;
        let um = |units| Micrometres::new(units, self.unit_pm);
        let [x0, y0, x1, y1] = [min.x, min.y, max.x, max.y].map(um);
        write!(f, "({x0}, {y0}) to ({x1}, {y1}) um")
    }
}

/// Why a drawing is that of no colouring. Masks are shown from 1, features from 0.
#[derive(Clone, Debug, Error, PartialEq, Eq)]
pub enum DrawnError {
    /// Something that the layer does not have.
    #[error(
        "mask {} is drawn from {at}, where the layer has nothing: the features of the layer must be drawn, and no \
         more",
        mask + 1
    )]
    Nothing {
        /// The mask.
        mask: Mask,
        /// Where.
        at: Area,
    },
    /// Something of the layer is not drawn.
    #[error(
        "feature {feature} is on no mask from {at}: all of it must be drawn, on one mask or changing at stitches"
    )]
    Missing {
        /// The feature.
        feature: u32,
        /// Where.
        at: Area,
    },
    /// Something is drawn on two masks.
    #[error(
        "feature {feature} is on mask {} and mask {} from {at}: a place is drawn on one mask, and on two only where a \
         stitch overlaps, by the overlap of the rules",
        masks[0] + 1, masks[1] + 1
    )]
    Twice {
        /// The feature.
        feature: u32,
        /// The masks.
        masks: [Mask; 2],
        /// Where.
        at: Area,
    },
    /// The mask changes where there is no candidate.
    #[error(
        "feature {feature} changes between mask {} and mask {} at one end of {at}, where stitch policy `{}` has no \
         candidate: {}",
        masks[0] + 1, masks[1] + 1, policy.name(), advice(*policy)
    )]
    NoStitch {
        /// The feature.
        feature: u32,
        /// The masks.
        masks: [Mask; 2],
        /// The policy.
        policy: Policy,
        /// A part of the fragment that is not on the first mask.
        at: Area,
    },
    /// A stitch without its overlap.
    #[error(
        "feature {feature} has a stitch that mask {} lacks from {at}: both masks of a stitch are drawn over the whole \
         overlap of the rules",
        mask + 1
    )]
    Overlap {
        /// The feature.
        feature: u32,
        /// The mask.
        mask: Mask,
        /// What is missing.
        at: Area,
    },
    /// A slanted outline that the layer does not have.
    #[error(
        "mask {} has a slanted outline within {at} that the layer does not have: features with slanted edges must be \
         drawn shape by shape as on the layer",
        mask + 1
    )]
    Outline {
        /// The mask.
        mask: Mask,
        /// The box around it.
        at: Area,
    },
    /// A feature with slanted edges that is not drawn as on the layer.
    #[error(
        "feature {feature}, which has slanted edges, is not drawn as on the layer from {at}: all its shapes must be on \
         one mask, each as the layer has it, and no more"
    )]
    Slanted {
        /// The feature.
        feature: u32,
        /// The box of what is wrong.
        at: Area,
    },
    /// The shapes cannot be taken apart.
    #[error(transparent)]
    Shapes(#[from] ExtractError),
}

fn advice(policy: Policy) -> &'static str {
    match policy {
        Policy::None => "draw the feature on one mask, or choose a policy that allows the stitch",
        Policy::Listed => "draw it on one mask there, or add the stitch to the list",
        Policy::Uncovered | Policy::EveryInterval => {
            "draw it on one mask there, or allow the stitch by policy `listed`"
        }
    }
}
