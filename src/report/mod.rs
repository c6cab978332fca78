//! What a run has found, and how it is told: a summary for people, files for programs.
//!
//! `outputs.md` beside this file describes every file.

pub mod assemble;
pub mod directory;
pub mod draft;
pub use crate::layout::length;
pub mod pieces;
pub mod result;
pub mod single;
pub mod start;
pub mod start_json;
pub mod summary;
pub mod sweep;
pub mod timings;
pub mod verdict;

use std::time::Duration;

use encodings::Mask;

use crate::geometry::Rect;
use crate::layout::Rules;
use crate::reduce;
use crate::solve::{Bounds, Engine};
pub use verdict::Verdict;

/// All that is told about a run. Everything but `timings` depends on the input and the options only,
/// as long as no limit stops the run.
#[derive(Clone, Debug)]
pub struct Report {
    /// The name of the input file, without its directories.
    pub input: String,
    /// K.
    pub masks: u8,
    /// The layer and its rules; nothing for an abstract graph.
    pub layer: Option<LayerFacts>,
    /// Sizes of the instance.
    pub counts: Counts,
    /// Bounds on the least number of unresolved conflict pairs and self-spacing violations.
    pub conflicts: Bounds,
    /// Bounds on the least total weight of the stitches of a colouring of least conflicts. While
    /// `conflicts` is open, `upper` only says what the colouring found has.
    pub stitches: Bounds,
    /// What stopped the run before everything was proven.
    pub stop: Option<Stop>,
    /// What each mask holds.
    pub mask_use: Vec<MaskUse>,
    /// What the reductions did.
    pub reductions: reduce::Counts,
    /// The pieces, in the order of the instance.
    pub pieces: Vec<PieceRow>,
    /// Conflicts that the colouring leaves unresolved: pairs, then self-spacings, in the order of the
    /// instance.
    pub unresolved: Vec<Unresolved>,
    /// Stitches that the colouring uses, in the order of the instance.
    pub stitched: Vec<Stitched>,
    /// The colouring that was given to begin with.
    pub start: Option<start::StartFacts>,
    /// Times.
    pub timings: Timings,
}

impl Report {
    /// The verdict on the layer or graph.
    pub fn verdict(&self) -> Verdict {
        Verdict::of(self.conflicts, self.stitches)
    }
}

/// The layer that was split.
#[derive(Clone, Debug)]
pub struct LayerFacts {
    /// The top cell.
    pub top: String,
    /// One database unit, in picometres.
    pub unit_pm: u64,
    /// Shapes drawn on the layer, before merging.
    pub shapes: u64,
    /// The rules, in database units.
    pub rules: Rules,
    /// Shapes among them that enclose no area: they print nothing and are part of no feature.
    pub empty_shapes: u64,
    /// Features that the stitch policy cannot place candidates on, with the boxes around them.
    pub unstitchable: Vec<(u32, Rect)>,
    /// Pairs of features closer than the any-mask spacing, with the boxes between them: errors of the layout,
    /// which no masks mend.
    pub too_close: Vec<([u32; 2], Rect)>,
    /// How many stitch candidates the policy found before those that cannot matter were dropped.
    pub candidates_found: u64,
    /// The features for which `every-interval` does not prove that no stitch elsewhere would do better, why, and
    /// the boxes around them.
    pub beyond_theorem: Vec<(u32, &'static str, Rect)>,
}

/// Sizes of an instance.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Counts {
    /// Features.
    pub features: u64,
    /// Fragments.
    pub fragments: u64,
    /// Conflict pairs, self-spacings not counted.
    pub conflict_pairs: u64,
    /// Self-spacings.
    pub self_spacings: u64,
    /// Features that have any: each is one unit of conflict.
    pub self_spacing_features: u64,
    /// Stitch candidates.
    pub stitch_candidates: u64,
}

/// What ended a run early.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stop {
    /// Ctrl-C or a signal.
    Interrupt,
    /// `--time-limit`.
    TimeLimit,
    /// `--piece-limit`, or a limit of an engine.
    PieceLimit,
    /// A bound that was found could not be proven with a bounded effort.
    ProofLimit,
    /// No limit: `--keep` leaves fixed what a colouring of least cost changes.
    Keep,
}

impl Stop {
    /// The words used in every output.
    pub fn as_str(self) -> &'static str {
        match self {
            Stop::Interrupt => "interrupt",
            Stop::TimeLimit => "time limit",
            Stop::PieceLimit => "piece limit",
            Stop::ProofLimit => "proof limit",
            Stop::Keep => "keep",
        }
    }
}

/// What one mask holds.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct MaskUse {
    /// Fragments.
    pub fragments: u64,
    /// Their area in square database units, overlaps of stitches not counted (1 a fragment for
    /// graphs).
    pub area: u128,
}

/// A piece: its size and what was proven.
#[derive(Clone, Debug)]
pub struct PieceRow {
    /// Sizes; stitch candidates are its stitch edges.
    pub counts: Counts,
    /// Bounds on its conflicts.
    pub conflicts: Bounds,
    /// Bounds on its stitches.
    pub stitches: Bounds,
    /// The engine that gave the outcome.
    pub engine: Engine,
    /// The earlier piece that it equals, from 0, whose outcome was taken over.
    pub same_as: Option<u32>,
    /// What it covers of the layer, in database units.
    pub place: Option<Rect>,
}

/// A conflict that is left.
#[derive(Clone, Copy, Debug)]
pub struct Unresolved {
    /// The features; the same one twice for a self-spacing.
    pub features: [u32; 2],
    /// Two fragments that are too close, the first such two of the pair.
    pub fragments: [u32; 2],
    /// The mask that they share.
    pub mask: Mask,
    /// Where they are closest, as far as their bounding boxes tell, in database units.
    pub place: Option<Rect>,
}

/// A stitch that is used.
#[derive(Clone, Copy, Debug)]
pub struct Stitched {
    /// The feature.
    pub feature: u32,
    /// The fragments on both sides.
    pub fragments: [u32; 2],
    /// Their masks.
    pub masks: [Mask; 2],
    /// Its weight.
    pub weight: u32,
    /// Where it is, in database units.
    pub place: Option<Rect>,
}

/// Times: the only part of a report that differs from run to run.
#[derive(Clone, Debug, Default)]
pub struct Timings {
    /// Worker threads.
    pub threads: usize,
    /// Each stage in turn.
    pub stages: Vec<(&'static str, Duration)>,
    /// Each piece, in the order of [`Report::pieces`].
    pub pieces: Vec<Duration>,
}

impl Timings {
    /// All stages together.
    pub fn total(&self) -> Duration {
        self.stages.iter().map(|stage| stage.1).sum()
    }
}

#[cfg(test)]
pub(crate) mod samples;
