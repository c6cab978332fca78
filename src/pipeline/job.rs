//! What a run is asked to do, how it is stopped, and who looks on.

use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;
use std::time::Duration;

use crate::formats::rules::{Given, Output, RawRules};
use crate::report::draft::Abandon;

/// What is to be done.
#[derive(Clone, Debug, Default)]
pub struct Job {
    /// Layout or graph.
    pub input: PathBuf,
    /// Rules in TOML.
    pub rules_file: Option<PathBuf>,
    /// Rules that take the place of those in the file.
    pub rules: RawRules,
    /// The cell to flatten, where several stand at the top.
    pub top: Option<String>,
    /// Where the output files go; none are written without it.
    pub out: Option<PathBuf>,
    /// A colouring to begin with: coloured GDSII, or a colouring of a graph.
    pub start: Option<PathBuf>,
    /// Where it draws the masks; where the output does without it.
    pub start_output: Option<Given<Output>>,
    /// Only the places where it fails are solved, all else is fixed.
    pub keep: bool,
    /// No certificate is written, and what solving found is taken for proven.
    pub no_certificate: bool,
    /// How long the whole run may take. Only solving is cut short, and proofs that take long.
    pub time_limit: Option<Duration>,
    /// How long one piece may take.
    pub piece_limit: Option<Duration>,
    /// Worker threads; all cores without it.
    pub threads: Option<usize>,
}

/// The two ways to stop a run from another thread.
#[derive(Clone, Debug, Default)]
pub struct Control {
    /// Ends solving with the best so far, once set, and proofs that take long. The rest of the run goes on.
    pub cancel: Arc<AtomicBool>,
    /// Gives up the output directory.
    pub abandon: Abandon,
}

/// A part of the run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stage {
    /// Bytes to layout or instance.
    Read,
    /// Layout to instance.
    Extract,
    /// Instance to pieces.
    Reduce,
    /// Pieces to outcomes.
    Solve,
    /// Outcomes to a colouring and a report.
    Merge,
    /// Certificate and input to places and repairs.
    Explain,
    /// Outcomes to a certificate.
    Certify,
    /// Files.
    Write,
}

impl Stage {
    /// The name in `timings.json`.
    pub fn as_str(self) -> &'static str {
        match self {
            Stage::Read => "read",
            Stage::Extract => "extract",
            Stage::Reduce => "reduce",
            Stage::Solve => "solve",
            Stage::Merge => "merge",
            Stage::Explain => "explain",
            Stage::Certify => "certify",
            Stage::Write => "write",
        }
    }
}

/// Somebody who looks on.
pub trait Watch: Sync {
    /// A stage begins.
    fn enter(&self, stage: Stage);
    /// So many of `total` things are done in the current step of the stage; `noun` says what is counted.
    fn progress(&self, done: u64, total: u64, noun: &'static str);
}

/// Nobody looks on.
pub struct Unwatched;

impl Watch for Unwatched {
    fn enter(&self, _: Stage) {}
    fn progress(&self, _: u64, _: u64, _: &'static str) {}
}
