//! The certificate: what a result claims about an input, and the evidence for it.
//!
//! `certify` writes certificates and `audit` reads them. These types, and the page [`format.md`](self) beside
//! this file, are all that the two share.
//!
//! | file | what it holds |
//! |---|---|
//! | `format.md` | the format and the canonical formula, for anyone who wants to check |
//! | `export.md` | how it corresponds to the formats of other checkers |
//! | [`rules`] | what the proof is about: masks, layer, spacing, stitch rules |
//! | [`digest`] | SHA-256 |
//! | [`write`](mod@write) | the certificate as JSON |
//! | [`read`](mod@read) | and back |

pub mod digest;
pub mod read;
pub mod rules;
pub mod write;

use serde::{Deserialize, Serialize};

use encodings::Mask;

pub use digest::Digest;
pub use rules::{LayerRules, Rules};

/// The directory of a certificate in an output directory.
pub const DIRECTORY: &str = "certificate";
/// The file that says everything but the proofs.
pub const FILE: &str = "certificate.json";
/// The directory of the proofs in the directory of the certificate.
pub const PROOFS: &str = "proofs";

/// The version of the format.
pub const VERSION: u32 = 1;

/// The most colourings of a bound that evidence by enumeration may leave to its reader.
pub const MOST_COLOURINGS: u64 = 1_000_000;

/// The most literals of a canonical formula, counted with repetition.
pub const MOST_LITERALS: usize = 1 << 24;

/// A certificate: see `format.md`. What it names need not exist, and what it says need not be true.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Certificate {
    /// Which input.
    pub input: Digest,
    /// Under which rules.
    pub rules: Rules,
    /// What is claimed of the units of conflict that a colouring violates.
    pub conflicts: Claim,
    /// What is claimed of the weight of its stitches.
    pub stitches: Claim,
    /// For layouts the smallest point of each feature, by x and then y; empty for graphs.
    pub features: Vec<[i32; 2]>,
    /// For layouts the features of several fragments, ascending; empty for graphs.
    pub split: Vec<SplitFeature>,
    /// The mask of each fragment.
    pub colours: Vec<Mask>,
    /// Bounds on conflicts with disjoint units.
    pub conflict_bounds: Vec<ConflictBound>,
    /// Bounds on stitches with disjoint stitch edges.
    pub stitch_bounds: Vec<StitchBound>,
}

/// No colouring has less than `lower`; the one given has `upper`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Claim {
    /// The sum of the limits of the bounds.
    pub lower: u64,
    /// The cost of the colouring.
    pub upper: u64,
}

impl Claim {
    /// Whether the two agree.
    pub fn is_tight(self) -> bool {
        self.lower == self.upper
    }
}

/// A feature of several fragments.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SplitFeature {
    /// The feature.
    pub feature: u32,
    /// How many fragments it has.
    pub fragments: u32,
    /// Its stitch candidates.
    pub cuts: Vec<Cut>,
}

/// A stitch candidate: its line, and the fragments on its two sides. Written as a list of six numbers.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(from = "(i32, i32, i32, i32, u32, u32)")]
#[serde(into = "(i32, i32, i32, i32, u32, u32)")]
pub struct Cut {
    /// `[x1, y1, x2, y2]`, smaller corner first; of no width or no height.
    pub line: [i32; 4],
    /// The fragment to the left (below) and to the right (above), numbered from 0 within the feature.
    pub sides: [u32; 2],
}

impl From<(i32, i32, i32, i32, u32, u32)> for Cut {
    fn from((x1, y1, x2, y2, a, b): (i32, i32, i32, i32, u32, u32)) -> Cut {
        Cut {
            line: [x1, y1, x2, y2],
            sides: [a, b],
        }
    }
}

impl From<Cut> for (i32, i32, i32, i32, u32, u32) {
    fn from(cut: Cut) -> (i32, i32, i32, i32, u32, u32) {
        let ([x1, y1, x2, y2], [a, b]) = (cut.line, cut.sides);
        (x1, y1, x2, y2, a, b)
    }
}

/// Two fragments, the smaller one first.
pub type Edge = [u32; 2];

/// A unit of conflict by some of its fragment edges: a conflict pair, or self-spacings of one feature.
pub type Unit = Vec<Edge>;

/// Units of conflict of which every colouring violates at least `limit`.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ConflictBound {
    /// At least 1.
    pub limit: u64,
    /// In the order of the counter.
    pub units: Vec<Unit>,
    /// Further fragments, ascending, whose ties count.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub with: Vec<u32>,
    /// Why.
    pub by: Evidence,
}

/// Stitch edges of which every colouring of fewest conflicts cuts a weight of at least `limit`.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct StitchBound {
    /// At least 1.
    pub limit: u64,
    /// In the order of the counter.
    pub units: Vec<Edge>,
    /// Units of conflict outside all conflict bounds, which such a colouring resolves.
    pub resolved: Vec<Unit>,
    /// Conflict bounds, of which such a colouring violates no more units than their limits.
    pub met: Vec<u32>,
    /// Further fragments, ascending, whose ties count.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub with: Vec<u32>,
    /// Why.
    pub by: Evidence,
}

/// Why a bound holds.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, untagged)]
pub enum Evidence {
    /// All colourings were tried, and can be tried again.
    Enumeration(Enumeration),
    /// Every two of these fragments are joined, and masks are few.
    Clique {
        /// The fragments, all different.
        clique: Vec<u32>,
    },
    /// Two colours do not go around an odd cycle.
    Cycle {
        /// The fragments along it; the last one is next to the first.
        cycle: Vec<u32>,
    },
    /// The canonical formula is refuted.
    Proof {
        /// The file in the directory of the proofs.
        proof: String,
        /// Fragments along which masks are named in the order of their first use.
        precedence: Vec<u32>,
    },
}

/// The word `enumeration`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Enumeration {
    /// The word.
    Enumeration,
}

/// Whether evidence may name this file: letters, digits, `-` and `.`, and no dot in front, so that the
/// name cannot lead out of the directory of the proofs.
pub fn is_proof_name(name: &str) -> bool {
    let plain = |c: char| c.is_ascii_alphanumeric() || c == '-' || c == '.';
    !name.is_empty() && name.len() <= 100 && !name.starts_with('.') && name.chars().all(plain)
}
