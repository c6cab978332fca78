//! The rules as a user gives them, in TOML or on the command line, and their way to the grid.
//!
//! Both fill a [`RawRules`], whose values remember where they were given; the command line's replace
//! the file's; [`RawRules::resolve`] turns lengths into database units and checks every range. The
//! TOML form, with the defaults, is documented in `rules.md`.
//!
//! | file | what it does |
//! |---|---|
//! | `resolve` | rules on the grid; what stitches need |
//! | `spacings` | the table `[spacings]` |
//! | `hand` | masks given by hand, by layer, point or label |
//! | `layers` | which layers are to be read, each for one purpose |
//! | `output` | where the masks are written |
//! | `problem` | what can be wrong |

mod hand;
mod layers;
mod output;
mod problem;
mod resolve;
mod spacings;

use super::error::{FormatError, Position};
use super::length::Length;
use super::nearest::{nearest, shown};
use crate::layout::{LayerId, Policy};
use std::path::PathBuf;

pub use hand::{FixedBy, RawFixed, RawHand, RawLabels, RawPoint, RawSet};
pub use layers::Layers;
pub use output::{Output, drawn_layers};
pub use problem::Problem;
pub use resolve::Sources;
pub(super) use resolve::coordinate_on_grid;
pub use spacings::{RawSpacings, RawWide, parse_metric};

/// The fewest masks that a layer can be split over.
pub const MIN_MASKS: u8 = 2;

/// The largest price of a stitch.
pub const MAX_WEIGHT: u32 = 1_000_000;

/// The datatype that mask 1 is written to unless the user chooses; mask i follows at i - 1.
pub const FIRST_DATATYPE: u16 = 101;

/// A value and where it was given.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Given<T> {
    /// The value.
    pub value: T,
    /// Where it was given.
    pub position: Position,
}

impl<T> Given<T> {
    /// A value given by an option of the command line, such as `--spacing`.
    pub fn on_command_line(option: &str, value: T) -> Given<T> {
        Given {
            value,
            position: Position::command_line(option),
        }
    }

    pub(super) fn wrong(&self, problem: Problem) -> FormatError {
        FormatError::new(self.position.clone(), problem)
    }
}

/// What stitches keep away from.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RawKeepOut {
    /// The layer.
    pub layer: LayerId,
    /// The smallest distance of a stitch's overlap from its shapes.
    pub distance: Given<Length>,
}

/// Rules as given, each of them or none.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct RawRules {
    /// The layer to split.
    pub layer: Option<Given<LayerId>>,
    /// K.
    pub masks: Option<Given<u64>>,
    /// The same-mask spacing.
    pub spacing: Option<Given<Length>>,
    /// More special spacings.
    pub spacings: RawSpacings,
    /// The stitch policy.
    pub policy: Option<Given<Policy>>,
    /// The overlap of the two sides of a stitch.
    pub overlap: Option<Given<Length>>,
    /// The smallest fragment length.
    pub fragment_length: Option<Given<Length>>,
    /// The corner keep-out.
    pub corner: Option<Given<Length>>,
    /// The price of a stitch.
    pub weight: Option<Given<u64>>,
    /// What stitches keep away from.
    pub keep_outs: Vec<Given<RawKeepOut>>,
    /// The most stitches of one feature.
    pub most_per_feature: Option<Given<u64>>,
    /// The file that lists stitch candidates.
    pub list: Option<Given<PathBuf>>,
    /// What was decided by hand.
    pub hand: RawHand,
    /// Where the masks are written.
    pub output: Option<Given<Output>>,
}

impl RawRules {
    /// These rules, with those that `other` gives in their place: a file's, overridden by the command
    /// line's. A list that `other` gives takes the place of the whole list here.
    pub fn overridden_by(self, other: RawRules) -> RawRules {
        RawRules {
            layer: other.layer.or(self.layer),
            masks: other.masks.or(self.masks),
            spacing: other.spacing.or(self.spacing),
            spacings: self.spacings.overridden_by(other.spacings),
            policy: other.policy.or(self.policy),
            overlap: other.overlap.or(self.overlap),
            fragment_length: other.fragment_length.or(self.fragment_length),
            corner: other.corner.or(self.corner),
            weight: other.weight.or(self.weight),
            keep_outs: first_given(other.keep_outs, self.keep_outs),
            most_per_feature: other.most_per_feature.or(self.most_per_feature),
            list: other.list.or(self.list),
            hand: self.hand.overridden_by(other.hand),
            output: other.output.or(self.output),
        }
    }

    /// The layer to split, which the reader needs before it knows the database unit.
    ///
    /// # Errors
    /// No layer is given.
    pub fn layer(&self) -> Result<LayerId, FormatError> {
        let layer = self.layer.as_ref().map(|layer| layer.value);
        layer.ok_or_else(|| {
            missing(
                "layer",
                "add --layer L/D, or `layer = \"L/D\"` to the rules",
            )
        })
    }

    /// K, 2 to 8: the one rule that abstract graphs share with layouts. `None` when it is not given.
    ///
    /// # Errors
    /// K out of range.
    pub fn masks(&self) -> Result<Option<u8>, FormatError> {
        let Some(masks) = &self.masks else {
            return Ok(None);
        };
        let range = u64::from(MIN_MASKS)..=u64::from(encodings::masks::MAX_MASKS);
        if !range.contains(&masks.value) {
            return Err(masks.wrong(Problem::Masks(masks.value)));
        }
        Ok(Some(masks.value as u8))
    }

    /// K, 2 to 8.
    ///
    /// # Errors
    /// K out of range, or not given.
    pub fn required_masks(&self) -> Result<u8, FormatError> {
        let remedy = "add --masks K, or `masks = K` to the rules";
        self.masks()?
            .ok_or_else(|| missing("number of masks", remedy))
    }

    /// Where a rule is given that only a layout can follow, if there is one.
    pub fn layout_rule(&self) -> Option<Position> {
        let places = [
            place(&self.layer),
            place(&self.spacing),
            self.spacings.first(),
            place(&self.policy),
            place(&self.overlap),
            place(&self.fragment_length),
            place(&self.corner),
            place(&self.weight),
            place(&self.most_per_feature),
            place(&self.list),
            self.keep_outs.first().map(|first| first.position.clone()),
            self.hand.first(),
            place(&self.output),
        ];
        places.into_iter().flatten().next()
    }
}

fn first_given<T>(one: Vec<T>, other: Vec<T>) -> Vec<T> {
    if one.is_empty() { other } else { one }
}

fn place<T>(rule: &Option<Given<T>>) -> Option<Position> {
    rule.as_ref().map(|given| given.position.clone())
}

/// A rule that is not given anywhere is asked for on the command line.
fn missing(rule: &'static str, remedy: &'static str) -> FormatError {
    let position = Position {
        command_line: true,
        ..Position::default()
    };
    FormatError::new(position, Problem::Missing { rule, remedy })
}

/// Reads a layer, `67/20`.
///
/// # Errors
/// What is not two numbers from 0 to 65535 with a slash between them.
pub fn parse_layer(text: &str) -> Result<LayerId, Problem> {
    let number = |part: &str| {
        let digits = !part.is_empty() && part.bytes().all(|byte| byte.is_ascii_digit());
        digits.then(|| part.parse().ok()).flatten()
    };
    let parts = text.trim().split_once('/');
    parts
        .and_then(|(layer, datatype)| {
            Some(LayerId {
                layer: number(layer)?,
                datatype: number(datatype)?,
            })
        })
        .ok_or_else(|| Problem::NoLayer(shown(text)))
}

/// Reads a stitch policy by its name.
///
/// # Errors
/// What is no policy, with the nearest one.
pub fn parse_policy(text: &str) -> Result<Policy, Problem> {
    let known = Policy::ALL.into_iter().find(|policy| policy.name() == text);
    known.ok_or_else(|| Problem::NoPolicy {
        found: shown(text),
        nearest: nearest(text, &Policy::ALL.map(Policy::name)).unwrap_or_default(),
    })
}

#[cfg(test)]
mod tests;
