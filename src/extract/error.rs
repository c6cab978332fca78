//! What can go wrong in the extraction.

use super::hand::HandError;
use crate::geometry::{Point, Rect};
use crate::layout::{Rules, Spacings};
use encodings::InstanceError;
use encodings::masks::MAX_MASKS;
use thiserror::Error;

/// Why a layer gives no instance. Coordinates are in database units.
#[derive(Clone, Debug, Error, PartialEq, Eq)]
pub enum ExtractError {
    /// A rule is out of its range.
    #[error("rule {rule} is {value}: {expected}")]
    Rule {
        /// The rule.
        rule: &'static str,
        /// Its value.
        value: i64,
        /// What would be right.
        expected: &'static str,
    },
    /// A coordinate is beyond the limit.
    #[error(
        "shape {shape} has a vertex at ({x}, {y}): coordinates must be within 2^30 database units of zero"
    )]
    OutOfRange {
        /// The shape.
        shape: u32,
        /// The vertex.
        x: i32,
        /// The vertex.
        y: i32,
    },
    /// More shapes, or rectangles that they are made of, than 32-bit numbers can name.
    #[error("{0} shapes and rectangles of shapes: fewer than 2147483648 are possible")]
    TooManyShapes(usize),
    /// A feature or shape is made of more cells of constant cross-section than memory is planned for.
    #[error(
        "what is drawn from ({x}, {y}) on is made of more than {limit} rectangles of constant cross-section: too many to take apart"
    )]
    TooManyCells {
        /// The lower left corner of its box.
        x: i32,
        /// The lower left corner of its box.
        y: i32,
        /// The most there may be.
        limit: usize,
    },
    /// More pairs of close features or fragments than memory is planned for.
    #[error(
        "more than {limit} pairs of features or fragments are closer than the spacing of {spacing} database units: the spacing is likely to be too large for this layer"
    )]
    TooManyPairs {
        /// The most there may be.
        limit: usize,
        /// The spacing.
        spacing: i32,
    },
    /// The stitches of parallel cuts cost more together than 32 bits hold.
    #[error(
        "the stitch at ({x}, {y}) has parallel ones, and their weights add up to more than 4294967295: a smaller weight is needed"
    )]
    StitchWeight {
        /// The middle of one of the cuts.
        x: i32,
        /// The middle of one of the cuts.
        y: i32,
    },
    /// What was decided by hand cannot be.
    #[error(transparent)]
    Hand(#[from] HandError),
    /// An entry of the list of stitch candidates cannot be followed.
    #[error("entry {entry} of the listed stitch candidates, at ({x}, {y}), {fault}")]
    Listed {
        /// The entry, counted from 1.
        entry: usize,
        /// The point on the run.
        x: i32,
        /// The point on the run.
        y: i32,
        /// What is wrong with it.
        fault: ListedFault,
    },
    /// The instance breaks one of its invariants.
    #[error("the layer gives no instance: {0}")]
    Instance(#[from] InstanceError),
}

/// What is wrong with an entry of the list of stitch candidates.
#[derive(Clone, Copy, Debug, Error, PartialEq, Eq)]
pub enum ListedFault {
    /// Its first point is in no feature.
    #[error("names a point that lies in no feature: a point of the feature is needed")]
    NoFeature,
    /// Its second point is on no run of the feature.
    #[error(
        "is on no straight run of its feature: a place between the ends of a part that is longer than wide, in a feature without slanted edges, is needed"
    )]
    NoRun,
    /// The feature's mask is decided by hand.
    #[error("is in a feature whose mask was decided by hand: such a feature takes no stitch")]
    ByHand,
    /// A rule forbids it.
    #[error(
        "breaks a stitch rule: it must keep the fragment length from line ends, the corner distance from corners and junctions, and the distances from keep-out shapes"
    )]
    Illegal,
    /// An entry before it gives the same cut.
    #[error("gives the same cut as an entry before it: each cut may be listed once")]
    Repeated,
}

/// The most cells that a feature or shape may be made of: 33 million, half a gigabyte.
pub const MAX_CELLS: usize = 1 << 25;

/// The error of a feature or shape in `area` that has more cells.
pub(super) fn too_many_cells(area: Rect) -> ExtractError {
    let Point { x, y } = area.min;
    let limit = MAX_CELLS;
    ExtractError::TooManyCells { x, y, limit }
}

/// Refuses spacings that cannot be meant.
fn check_spacings(
    spacings: &Spacings,
    at_least: &dyn Fn(&'static str, i32, i32, &'static str) -> Result<(), ExtractError>,
) -> Result<(), ExtractError> {
    let kinds = [
        ("side_to_side", spacings.side_to_side),
        ("side_to_end", spacings.side_to_end),
        ("end_to_end", spacings.end_to_end),
        ("corner_to_corner", spacings.corner_to_corner),
    ];
    let spacing = "at least 1 database unit is needed";
    for (rule, value) in kinds {
        at_least(rule, value.unwrap_or(1), 1, spacing)?;
    }
    let length = "at least 0 database units are needed";
    at_least("end_length", spacings.end_length, 0, length)?;
    at_least("any_mask", spacings.any_mask, 0, length)?;
    for row in &spacings.wide {
        at_least("wide width", row.width, 0, length)?;
        at_least("wide run_length", row.run_length, 0, length)?;
        at_least("wide spacing", row.spacing, 1, spacing)?;
    }
    Ok(())
}

/// Refuses rules that the extraction cannot work with.
pub(super) fn check_rules(rules: &Rules) -> Result<(), ExtractError> {
    let stitch = &rules.stitch;
    let at_least = |rule, value: i32, least: i32, expected| {
        if value >= least {
            Ok(())
        } else {
            let value = i64::from(value);
            Err(ExtractError::Rule {
                rule,
                value,
                expected,
            })
        }
    };
    if !(1..=MAX_MASKS).contains(&rules.masks) {
        return Err(ExtractError::Rule {
            rule: "masks",
            value: rules.masks.into(),
            expected: "1 to 8 masks are possible",
        });
    }
    at_least(
        "spacing",
        rules.spacing,
        1,
        "at least 1 database unit is needed",
    )?;
    check_spacings(&rules.spacings, &at_least)?;
    let length = "at least 0 database units are needed";
    at_least("overlap", stitch.overlap, 0, length)?;
    at_least("fragment_length", stitch.fragment_length, 0, length)?;
    at_least("corner", stitch.corner, 0, length)?;
    if stitch.overlap % 2 != 0 {
        return Err(ExtractError::Rule {
            rule: "overlap",
            value: stitch.overlap.into(),
            expected: "an even number of database units is needed, half of it on each side",
        });
    }
    if stitch.weight == 0 {
        return Err(ExtractError::Rule {
            rule: "weight",
            value: 0,
            expected: "a stitch needs a price of at least 1",
        });
    }
    Ok(())
}
