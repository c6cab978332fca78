//! Why a run has no result, and who has to change something.

use encodings::InstanceError;
use thiserror::Error;

use super::explain::ExplainRefusal;
use super::start::StartError;
use crate::certify::CertifyError;
use crate::certify::export::ExportError;
use crate::extract::ExtractError;
use crate::formats::{FormatError, Position};
use crate::layout::LayerId;
use crate::merge::MergeError;
use crate::report::directory::OutputError;

/// Why a run has no result. Nothing is written then.
#[derive(Debug, Error)]
pub enum PipelineError {
    /// An input file or a rule.
    #[error(transparent)]
    Format(#[from] FormatError),
    /// A layer that gives no instance.
    #[error("{input}: layer {layer}: {error}")]
    Extract {
        /// The input.
        input: String,
        /// The layer.
        layer: LayerId,
        /// What is wrong.
        error: ExtractError,
    },
    /// What was decided by hand contradicts itself.
    #[error("{input}: no colouring keeps to all of this at once: {}", statements.join("; "))]
    Contradiction {
        /// The input.
        input: String,
        /// The statements, of which none can be left out.
        statements: Vec<String>,
    },
    /// A colouring that cannot be begun with.
    #[error("--start {start}: {error}")]
    Start {
        /// Its file.
        start: String,
        /// What is wrong.
        error: Box<StartError>,
    },
    /// One combination of a sweep.
    #[error("with {masks} masks: {error}")]
    InSweep {
        /// Its number of masks.
        masks: u8,
        /// What is wrong.
        error: Box<PipelineError>,
    },
    /// An option or rule for layouts, given with a graph.
    #[error("{place}: {input} is a graph: of the rules, only the number of masks applies to it")]
    NoLayout {
        /// The option, or the place in the rules.
        place: Box<Position>,
        /// The input.
        input: String,
    },
    /// The output directory cannot be used; found before the work began.
    #[error("--out: {0}")]
    Target(OutputError),
    /// The output could not be written.
    #[error(transparent)]
    Output(#[from] OutputError),
    /// The certificate could not be written.
    #[error(transparent)]
    Certify(#[from] CertifyError),
    /// The certificate could not be put in another format.
    #[error(transparent)]
    Export(#[from] ExportError),
    /// The audit's problem is no instance: an error of this program.
    #[error("internal error: the audit's problem is no instance: {0}")]
    Problem(InstanceError),
    /// The threads could not be started.
    #[error("the worker threads cannot be started: {0}")]
    Threads(#[from] rayon::ThreadPoolBuildError),
    /// A reduction broke an invariant: an error of this program.
    #[error("internal error: a piece is no instance: {0}")]
    Reduce(InstanceError),
    /// The places of a result cannot be explained.
    #[error(transparent)]
    Explain(#[from] ExplainRefusal),
    /// The audit does not accept what was found: an error of this program. Feature `self-check` only.
    #[error("internal error: the audit does not accept the result: {0}")]
    SelfCheck(String),
    /// The colouring does not hold together: an error of this program.
    #[error(transparent)]
    Merge(#[from] MergeError),
}

/// Who has to change something.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Blame {
    /// Whoever wrote the command line.
    CommandLine,
    /// Whoever made the input files.
    Input,
    /// The machine, or whoever wrote this program.
    Machine,
}

impl PipelineError {
    /// Who has to change something.
    pub fn blame(&self) -> Blame {
        match self {
            PipelineError::Format(error) if error.is_usage() => Blame::CommandLine,
            PipelineError::NoLayout { place, .. } if place.command_line => Blame::CommandLine,
            PipelineError::Target(_) => Blame::CommandLine,
            PipelineError::Explain(refusal) => refusal.blame(),
            PipelineError::InSweep { error, .. } => error.blame(),
            PipelineError::Format(_)
            | PipelineError::NoLayout { .. }
            | PipelineError::Extract { .. }
            | PipelineError::Start { .. }
            | PipelineError::Contradiction { .. } => Blame::Input,
            PipelineError::Output(_)
            | PipelineError::Certify(_)
            | PipelineError::Export(_)
            | PipelineError::Problem(_)
            | PipelineError::Threads(_)
            | PipelineError::Reduce(_)
            | PipelineError::SelfCheck(_)
            | PipelineError::Merge(_) => Blame::Machine,
        }
    }
}
