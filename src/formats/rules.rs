//! The rules as a user gives them, in TOML or on the command line, and their way to the grid.
//!
//! Both fill a [`RawRules`], whose values remember where they were given; the command line's replace
//! the file's; [`RawRules::resolve`] turns lengths into database units and checks every range. The
//! TOML form, with the defaults, is documented in `rules.md`.

use super::error::{FormatError, Position};
use super::length::Length;
use super::nearest::{nearest, shown};
use crate::geometry::COORDINATE_LIMIT;
use crate::layout::{LayerId, Policy, Rules, StitchRules};
use thiserror::Error;

/// The fewest masks that a layer can be split over.
pub const MIN_MASKS: u8 = 2;

/// The largest price of a stitch.
pub const MAX_WEIGHT: u32 = 1_000_000;

/// The datatype that mask 1 is written to unless the user chooses; mask i follows at i - 1.
pub const FIRST_DATATYPE: u16 = 101;

/// The policies by name.
const POLICIES: [(&str, Policy); 2] = [("none", Policy::None), ("uncovered", Policy::Uncovered)];

/// What is wrong in a rule.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
pub enum Problem {
    /// The file is no TOML.
    #[error("{0}")]
    Syntax(String),
    /// A key that does not exist.
    #[error("unknown key {wrong}: did you mean `{nearest}`?")]
    UnknownKey {
        /// The key in the file, quoted.
        wrong: String,
        /// The nearest right one.
        nearest: &'static str,
    },
    /// A value of the wrong kind.
    #[error("`{key}` must be {expected}, not {found}")]
    Kind {
        /// The key.
        key: &'static str,
        /// What is right.
        expected: &'static str,
        /// What stands there.
        found: String,
    },
    /// A length without a unit.
    #[error("{0} has no unit: write a length with its unit, such as \"250 nm\" or \"0.25 um\"")]
    NoUnit(String),
    /// No length.
    #[error("{0} is no length: write a number and pm, nm, um or mm, such as \"250 nm\"")]
    NoLength(String),
    /// A length finer than a picometre.
    #[error("{0} is no whole number of picometres: no grid is finer")]
    BelowPicometre(String),
    /// No layer.
    #[error("{0} is no layer: write layer and datatype (0 to 65535) as in \"67/20\"")]
    NoLayer(String),
    /// No policy.
    #[error("{found} is no stitch policy: did you mean \"{nearest}\"? The policies are {all}",
        all = POLICIES.map(|(name, _)| name).join(", "))]
    NoPolicy {
        /// What was given, quoted.
        found: String,
        /// The nearest right one.
        nearest: &'static str,
    },
    /// A rule that must be given and is not.
    #[error("no {rule} is given: {remedy}")]
    Missing {
        /// The rule in words.
        rule: &'static str,
        /// How to give it.
        remedy: &'static str,
    },
    /// A length between two points of the grid.
    #[error("{rule} {length} is no whole number of database units: one is {unit} in this layout")]
    OffGrid {
        /// The rule.
        rule: &'static str,
        /// Its length.
        length: Length,
        /// The database unit.
        unit: Length,
    },
    /// A length too large.
    #[error("{rule} {length} is too large: at most {limit} in this layout")]
    TooLong {
        /// The rule.
        rule: &'static str,
        /// Its length.
        length: Length,
        /// The largest one.
        limit: Length,
    },
    /// Spacing 0.
    #[error("spacing is 0: it must be at least one database unit")]
    ZeroSpacing,
    /// Overlap odd.
    #[error(
        "stitch overlap {0} is an odd number of database units: it must be even, since each side is \
         extended by half of it"
    )]
    OddOverlap(Length),
    /// K out of range.
    #[error("{0} mask{s}: a layer is split over 2 to 8 masks", s = if *.0 == 1 { "" } else { "s" })]
    Masks(u64),
    /// Weight out of range.
    #[error("stitch weight {0}: it must be 1 to 1000000")]
    Weight(u64),
    /// Wrong number of output layers.
    #[error("{found} output layers for {masks} masks: give one a mask")]
    OutputCount {
        /// How many are given.
        found: usize,
        /// K.
        masks: u8,
    },
    /// One output layer for two purposes.
    #[error(
        "output layer {0} is used twice: each mask needs one of its own, apart from the layer read"
    )]
    OutputRepeated(LayerId),
    /// The default output layers run past the end.
    #[error("no default output datatypes fit the layer: choose them with `output`")]
    NoDefaultOutput,
}

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

    fn wrong(&self, problem: Problem) -> FormatError {
        FormatError::new(self.position.clone(), problem)
    }
}

/// Where the masks are written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Output {
    /// Datatypes of the layer that is read.
    Datatypes(Vec<u16>),
    /// Layers and datatypes.
    Layers(Vec<LayerId>),
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
    /// Where the masks are written.
    pub output: Option<Given<Output>>,
}

impl RawRules {
    /// These rules, with those that `other` gives in their place: a file's, overridden by the command
    /// line's.
    pub fn overridden_by(self, other: RawRules) -> RawRules {
        RawRules {
            layer: other.layer.or(self.layer),
            masks: other.masks.or(self.masks),
            spacing: other.spacing.or(self.spacing),
            policy: other.policy.or(self.policy),
            overlap: other.overlap.or(self.overlap),
            fragment_length: other.fragment_length.or(self.fragment_length),
            corner: other.corner.or(self.corner),
            weight: other.weight.or(self.weight),
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

    /// The rules on the grid of a layout whose database unit is `unit_pm` picometres. Stitch rules
    /// that are not given: no stitches; overlap, fragment length and corner keep-out 0; weight 1.
    ///
    /// # Errors
    /// What is missing, off the grid or out of range, and where it was given.
    pub fn resolve(&self, unit_pm: u64) -> Result<Rules, FormatError> {
        let grid = |given: &Option<Given<Length>>, rule| match given {
            Some(given) => on_grid(given, rule, unit_pm),
            None => Ok(0),
        };
        let spacing = self.spacing.as_ref().ok_or_else(|| {
            missing(
                "same-mask spacing",
                "add --spacing, or `spacing = \"... nm\"` to the rules",
            )
        })?;
        let rules = Rules {
            layer: self.layer()?,
            masks: self.required_masks()?,
            spacing: on_grid(spacing, "spacing", unit_pm)?,
            stitch: StitchRules {
                policy: self
                    .policy
                    .as_ref()
                    .map_or(Policy::None, |policy| policy.value),
                overlap: grid(&self.overlap, "stitch overlap")?,
                fragment_length: grid(&self.fragment_length, "fragment length")?,
                corner: grid(&self.corner, "corner keep-out")?,
                weight: self.weight()?,
                ..StitchRules::default()
            },
            spacings: Default::default(),
            hand: Default::default(),
        };
        if rules.spacing == 0 {
            return Err(spacing.wrong(Problem::ZeroSpacing));
        }
        match &self.overlap {
            Some(overlap) if rules.stitch.overlap % 2 != 0 => {
                Err(overlap.wrong(Problem::OddOverlap(overlap.value)))
            }
            _ => Ok(rules),
        }
    }

    fn weight(&self) -> Result<u32, FormatError> {
        match &self.weight {
            None => Ok(1),
            Some(given) => match u32::try_from(given.value) {
                Ok(weight @ 1..=MAX_WEIGHT) => Ok(weight),
                _ => Err(given.wrong(Problem::Weight(given.value))),
            },
        }
    }

    /// Where each mask is written, in the order of the masks: as given, or datatypes from
    /// [`FIRST_DATATYPE`] on of the layer that is read.
    ///
    /// # Errors
    /// Not one a mask, one twice, or the layer that is read itself.
    pub fn output_layers(&self, rules: &Rules) -> Result<Vec<LayerId>, FormatError> {
        let on_layer = |datatype: &u16| LayerId {
            layer: rules.layer.layer,
            datatype: *datatype,
        };
        let masks = rules.masks;
        let (layers, position) = match &self.output {
            None => {
                let datatypes = (0..u16::from(masks)).map(|mask| FIRST_DATATYPE + mask);
                let layers = datatypes.map(|datatype| on_layer(&datatype)).collect();
                (layers, Position::default())
            }
            Some(Given {
                value: Output::Datatypes(datatypes),
                position,
            }) => (
                datatypes.iter().map(on_layer).collect::<Vec<_>>(),
                position.clone(),
            ),
            Some(Given {
                value: Output::Layers(layers),
                position,
            }) => (layers.clone(), position.clone()),
        };
        let problem = if self.output.is_none() && layers.contains(&rules.layer) {
            Problem::NoDefaultOutput
        } else if layers.len() != usize::from(masks) {
            Problem::OutputCount {
                found: layers.len(),
                masks,
            }
        } else if let Some(layer) = repeated(rules.layer, &layers) {
            Problem::OutputRepeated(layer)
        } else {
            return Ok(layers);
        };
        Err(FormatError::new(position, problem))
    }
}

fn repeated(read: LayerId, layers: &[LayerId]) -> Option<LayerId> {
    let mut seen = vec![read];
    layers.iter().copied().find(|layer| {
        let again = seen.contains(layer);
        seen.push(*layer);
        again
    })
}

/// A rule that is not given anywhere is asked for on the command line.
fn missing(rule: &'static str, remedy: &'static str) -> FormatError {
    let position = Position {
        command_line: true,
        ..Position::default()
    };
    FormatError::new(position, Problem::Missing { rule, remedy })
}

fn on_grid(given: &Given<Length>, rule: &'static str, unit_pm: u64) -> Result<i32, FormatError> {
    let (length, unit) = (given.value, Length { pm: unit_pm });
    if unit_pm == 0 || length.pm % unit_pm != 0 {
        return Err(given.wrong(Problem::OffGrid { rule, length, unit }));
    }
    match i32::try_from(length.pm / unit_pm) {
        Ok(units) if units <= COORDINATE_LIMIT => Ok(units),
        _ => {
            let pm = unit_pm.saturating_mul(COORDINATE_LIMIT as u64);
            let limit = Length { pm };
            Err(given.wrong(Problem::TooLong {
                rule,
                length,
                limit,
            }))
        }
    }
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
    let known = POLICIES.iter().find(|(name, _)| *name == text);
    known
        .map(|&(_, policy)| policy)
        .ok_or_else(|| Problem::NoPolicy {
            found: shown(text),
            nearest: nearest(text, &POLICIES.map(|(name, _)| name)).unwrap_or_default(),
        })
}

#[cfg(test)]
mod tests;
