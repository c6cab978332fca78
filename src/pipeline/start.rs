//! A colouring that is given to begin with: read, checked, and kept where it does not fail.

use encodings::Mask;
use thiserror::Error;

use super::error::PipelineError;
use super::job::{Job, Watch};
use super::subject::{Subject, file_name};
use crate::extract::drawn::{self, error::DrawnError};
use crate::formats::gdsii::masks::read as read_masks;
use crate::formats::{colouring_json, input};
use crate::merge::MergeError;
use crate::reduce::Reduced;
use crate::report::start::{KeptFacts, StartFacts, compare};
use crate::report::{Report, Stop, assemble};
use crate::solve::{Bounds, Limits, PieceOutcome, keep};

/// Why a colouring cannot be begun with. (One that breaks masks or ties can.)
#[derive(Debug, Error)]
pub enum StartError {
    /// Its coordinates are those of another grid.
    #[error(
        "one database unit is {found} pm, but {input} has {expected} pm: both must be on one grid"
    )]
    Unit {
        /// Its unit, in picometres.
        found: u64,
        /// The input's.
        expected: u64,
        /// The input.
        input: String,
    },
    /// It is drawn as no colouring is.
    #[error(transparent)]
    Drawn(#[from] DrawnError),
    /// It is for more masks.
    #[error("a colouring for {found} masks: one for {masks} masks is needed")]
    Masks {
        /// Its masks.
        found: u8,
        /// K.
        masks: u8,
    },
    /// It is for other fragments.
    #[error("masks for {found} fragments: {input} has {expected}, each of which needs one")]
    Length {
        /// How many masks it lists.
        found: usize,
        /// How many fragments there are.
        expected: usize,
        /// The input.
        input: String,
    },
}

/// Reads the colouring that the job begins with, if it does: a mask below K for each fragment.
pub fn read(
    job: &Job,
    subject: &Subject,
    watch: &dyn Watch,
) -> Result<Option<Vec<Mask>>, PipelineError> {
    let Some(path) = &job.start else {
        return Ok(None);
    };
    let name = path.display().to_string();
    let bytes = input::load(path, &name)?;
    let refused = |error: StartError| PipelineError::Start {
        start: name.clone(),
        error: Box::new(error),
    };
    match subject {
        Subject::Graph(graph) => {
            let given = colouring_json::read(&*bytes, &name)?;
            let (found, expected) = (given.colours.len(), graph.instance.fragment_count());
            let masks = graph.instance.masks();
            if given.masks > masks {
                let found = given.masks;
                return Err(refused(StartError::Masks { found, masks }));
            }
            if found != expected {
                let input = graph.name.clone();
                return Err(refused(StartError::Length {
                    found,
                    expected,
                    input,
                }));
            }
            Ok(Some(given.colours))
        }
        Subject::Layer(layer, extraction) => {
            let progress = |done, total| watch.progress(done, total, "bytes");
            let top = &layer.layout.top;
            let masks = read_masks(&bytes, &name, &layer.start, top, &progress)?;
            let (found, expected) = (masks.unit_pm, layer.layout.unit_pm);
            if found != expected {
                let input = layer.input.name.clone();
                return Err(refused(StartError::Unit {
                    found,
                    expected,
                    input,
                }));
            }
            let policy = layer.rules.stitch.policy;
            drawn::colouring(&layer.layout, extraction, policy, &masks.sheets)
                .map(Some)
                .map_err(|error| refused(error.into()))
        }
    }
}

/// What solving found.
pub struct Solved<'a> {
    /// The pieces.
    pub reduced: &'a Reduced,
    /// What is known of them.
    pub outcomes: &'a [PieceOutcome],
}

/// Compares the start with what was found, and keeps it where that is asked for, or where it costs no more; gives the
/// colouring to write. The report speaks of that one then.
pub fn finish(
    job: &Job,
    subject: &Subject,
    solved: &Solved<'_>,
    [start, found]: [&[Mask]; 2],
    limits: &Limits,
    report: &mut Report,
) -> Result<Vec<Mask>, PipelineError> {
    let instance = subject.instance();
    let is_legal = instance.check_legal(start).is_ok();
    let free = [report.conflicts, report.stitches];
    let mut kept = None;
    let written = if job.keep {
        let solved = keep::solve(instance, start, limits).map_err(PipelineError::Reduce)?;
        let colouring = solved.colouring.clone();
        kept = Some(KeptFacts::of(&solved, instance.cost(&colouring), free));
        colouring
    } else if is_legal && instance.cost(start) <= instance.cost(found) {
        start.to_vec()
    } else {
        found.to_vec()
    };
    let checked = instance.check_legal(&written);
    checked.map_err(MergeError::Illegal)?;
    let stop = report.stop;
    *report = subject
        .with_facts(|facts| assemble::report(facts, solved.reduced, solved.outcomes, &written));
    let cost = instance.cost(&written);
    report.conflicts.upper = cost.conflicts;
    report.stitches = Bounds {
        lower: match report.conflicts.is_tight() {
            true => free[1].lower,
            false => 0,
        },
        upper: cost.stitches,
    };
    let is_open = !report.conflicts.is_tight() || !report.stitches.is_tight();
    report.stop = match &kept {
        Some(kept) if stop.is_none() && is_open => match kept.proven {
            true => Some(Stop::Keep),
            false => super::stopped_by(report, limits, Stop::PieceLimit),
        },
        _ => stop,
    };
    let file = job.start.as_deref().map(file_name).unwrap_or_default();
    report.start = Some(StartFacts {
        kept,
        ..subject.with_facts(|facts| compare(file, instance, start, &written, facts.places))
    });
    Ok(written)
}
