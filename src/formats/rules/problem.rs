//! What can be wrong in a rule. Every message says what would be right.

use crate::formats::length::{Coordinate, Length};
use crate::layout::{LayerId, Policy};
use thiserror::Error;

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
        all = Policy::ALL.map(Policy::name).join(", "))]
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
    /// A length of 0.
    #[error("{0} is 0: it must be at least one database unit")]
    Zero(&'static str),
    /// A coordinate without a unit or of no kind.
    #[error("{0} is no coordinate: write a number and pm, nm, um or mm, such as \"-1.25 um\"")]
    NoCoordinate(String),
    /// A coordinate between two points of the grid.
    #[error("coordinate {at} is no whole number of database units: one is {unit} in this layout")]
    CoordinateOffGrid {
        /// The coordinate.
        at: Coordinate,
        /// The database unit.
        unit: Length,
    },
    /// A coordinate too large.
    #[error("coordinate {at} is out of range: at most {limit} from 0 in this layout")]
    CoordinateTooLarge {
        /// The coordinate.
        at: Coordinate,
        /// The largest one.
        limit: Length,
    },
    /// Spacings that depend on which masks are meant.
    #[error(
        "a spacing between a particular pair of masks is not handled: `spacing` and [spacings] hold for \
         any two features on one mask, whichever mask it is"
    )]
    MaskPairs,
    /// A metric that does not exist.
    #[error("{0} is no metric: write \"euclidean\" or \"square\"")]
    NoMetric(String),
    /// A spacing of line ends, and no word on what a line end is.
    #[error("`{0}` needs `end_length`: an edge shorter than that is a line end")]
    NoEndLength(&'static str),
    /// An any-mask spacing that is not below the others.
    #[error(
        "any-mask spacing {any} must be smaller than every same-mask spacing: {rule} is {least}"
    )]
    AnyMask {
        /// The any-mask spacing.
        any: Length,
        /// The smallest of the others.
        rule: &'static str,
        /// Its length.
        least: Length,
    },
    /// Two rows of the wide spacings that say the same.
    #[error("a second row for width {width} and run length {run_length}: one is right")]
    WideRepeated {
        /// Their width.
        width: Length,
        /// Their run length.
        run_length: Length,
    },
    /// A layer with two purposes.
    #[error("layer {layer} is {first} and {second}: one layer can only be one of them")]
    LayerTwice {
        /// The layer.
        layer: LayerId,
        /// What it is for.
        first: &'static str,
        /// What else.
        second: &'static str,
    },
    /// A key that a table must have.
    #[error("{table} without `{key}`: {remedy}")]
    MissingKey {
        /// The table.
        table: &'static str,
        /// The key.
        key: &'static str,
        /// What to write.
        remedy: &'static str,
    },
    /// A mask that the layer is not split over.
    #[error("mask {given}: the masks are numbered 1 to {masks}")]
    NoMask {
        /// The number.
        given: u64,
        /// K.
        masks: u8,
    },
    /// A set too small to say anything.
    #[error("a set of {0}: two or more features are needed")]
    FewMembers(String),
    /// A text that is nowhere.
    #[error("no text {text} on layer {layer}: the texts there are {present}")]
    NoText {
        /// The text, quoted.
        text: String,
        /// The layer and texttype.
        layer: LayerId,
        /// The texts that there are.
        present: String,
    },
    /// A number of stitches out of range.
    #[error(
        "{0} stitches of a feature at most: it must be 1 to 4294967295; \"none\" is the policy without stitches"
    )]
    MostPerFeature(u64),
    /// The policy `listed`, and no list.
    #[error(
        "the policy \"listed\" needs a list: add --stitch-list FILE, or `list = \"FILE\"` to [stitch]"
    )]
    NoList,
    /// A list, and another policy.
    #[error("only the policy \"listed\" reads a list: add --stitch listed")]
    IdleList,
    /// Two equal entries of a list.
    #[error("the same stitch as in {0}: list it once")]
    ListRepeated(String),
    /// What is no list of stitches.
    #[error("{0}")]
    List(String),
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
