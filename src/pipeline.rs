//! The order of the stages: the one file that knows it. Nothing here prints, parses options or ends
//! the program; any program can run a [`Job`].

mod audit;
mod certificate;
mod contradiction;
mod error;
mod explain;
mod export;
mod job;
mod rules;
#[cfg(feature = "self-check")]
mod self_check;
mod start;
mod subject;
mod sweep;

use std::sync::Arc;
use std::time::{Duration, Instant};

use encodings::Mask;

use crate::certify;
use crate::merge;
use crate::reduce::{self, Reductions};
use crate::report::directory::{self, Target};
use crate::report::{Report, Stop, assemble, pieces, result, timings};
use crate::solve::{self, Choice, Limits};

pub use audit::{AuditJob, audit};
pub use error::{Blame, PipelineError};
pub use explain::{ExplainJob, ExplainRefusal, explain};
pub use export::{ExportJob, Exported, Format, export};
pub use job::{Control, Job, Stage, Unwatched, Watch};
use subject::Loaded;
pub use sweep::{Choices, SweepJob, sweep};

/// Runs a job: reads, solves, and writes what it asks for.
///
/// Being stopped by a limit or by [`Control::cancel`] is no error: the report has bounds that are true
/// and a colouring that is legal.
///
/// # Errors
/// See [`PipelineError`]. Nothing is written then.
pub fn run(job: &Job, control: &Control, watch: &dyn Watch) -> Result<Report, PipelineError> {
    let clock = Clock::start(watch);
    let target = job.out.as_deref().map(Target::check).transpose();
    let target = target.map_err(PipelineError::Target)?;
    let threads = job.threads.unwrap_or(0);
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()?;
    pool.install(|| stages(job, target.as_ref(), control, clock))
}

fn stages(
    job: &Job,
    target: Option<&Target>,
    control: &Control,
    mut clock: Clock,
) -> Result<Report, PipelineError> {
    let watch = clock.watch;
    let limits = Limits {
        deadline: job
            .time_limit
            .and_then(|limit| clock.begun.checked_add(limit)),
        piece_limit: job.piece_limit,
        cancel: Arc::clone(&control.cancel),
    };

    clock.enter(Stage::Read);
    let loaded = Loaded::read(job, watch)?;

    clock.enter(Stage::Extract);
    let subject = loaded.extract(watch)?;
    let instance = subject.instance();
    contradiction::check(&subject)?;
    let given = start::read(job, &subject, watch)?;

    clock.enter(Stage::Reduce);
    let reduced = reduce::reduce(instance, Reductions::ALL).map_err(PipelineError::Reduce)?;

    clock.enter(Stage::Solve);
    let total = reduced.pieces.len() as u64;
    let progress = |done: usize| watch.progress(done as u64, total, "pieces");
    let outcomes =
        solve::solve_pieces_from(&reduced, given.as_deref(), Choice::Auto, &limits, &progress);

    clock.enter(Stage::Merge);
    let colourings: Vec<&[Mask]> = outcomes.iter().map(|found| &*found.colouring).collect();
    let merged = merge::merge(instance, &reduced, &colourings)?;
    let mut report =
        subject.with_facts(|facts| assemble::report(facts, &reduced, &outcomes, &merged.colouring));
    report.stop = stopped_by(&report, &limits, Stop::PieceLimit);
    let mut colouring = merged.colouring;
    if let Some(given) = &given {
        let solved = start::Solved {
            reduced: &reduced,
            outcomes: &outcomes,
        };
        let both = [&given[..], &colouring];
        colouring = start::finish(job, &subject, &solved, both, &limits, &mut report)?;
    }
    report.timings.threads = rayon::current_num_threads();

    #[cfg(feature = "self-check")]
    self_check::check(
        &subject,
        &certify::Subject {
            instance,
            reduced: &reduced,
            outcomes: &outcomes,
            colouring: &colouring,
        },
        &limits,
        &report,
    )?;
    if let Some(target) = target {
        let draft = target.draft(&control.abandon)?;
        if !job.no_certificate {
            clock.enter(Stage::Certify);
            let solved = certify::Subject {
                instance,
                reduced: &reduced,
                outcomes: &outcomes,
                colouring: &colouring,
            };
            let facts = subject.certificate_facts();
            let certified = certificate::make(facts, &solved, &draft, &limits, watch)?;
            certificate::keep_to(&certified, &mut report);
            if report.stop.is_none() {
                report.stop = stopped_by(&report, &limits, Stop::ProofLimit);
            }
        }
        clock.enter(Stage::Write);
        subject.write_colouring(&draft, &colouring)?;
        draft.write(directory::PIECES, |out| pieces::write(&report, out))?;
        report.timings.stages = clock.times();
        draft.write(directory::TIMINGS, |out| {
            timings::write(&report.timings, out)
        })?;
        // The last one: a directory without it is no result.
        draft.write(directory::RESULT, |out| result::write(&report, out))?;
        draft.commit()?;
    }
    report.timings.stages = clock.times();
    Ok(report)
}

/// What kept the run from proving everything; `otherwise` where neither its end nor a signal did.
fn stopped_by(report: &Report, limits: &Limits, otherwise: Stop) -> Option<Stop> {
    let proven = report.conflicts.is_tight() && report.stitches.is_tight();
    let late = |deadline| Instant::now() >= deadline;
    match (proven, limits.deadline) {
        (true, _) => None,
        _ if limits.cancel.load(std::sync::atomic::Ordering::SeqCst) => Some(Stop::Interrupt),
        (false, Some(deadline)) if late(deadline) => Some(Stop::TimeLimit),
        _ => Some(otherwise),
    }
}

/// Times each stage, and tells who looks on where the run is.
struct Clock<'a> {
    watch: &'a dyn Watch,
    begun: Instant,
    entered: Instant,
    current: Option<Stage>,
    past: Vec<(Stage, Duration)>,
}

impl<'a> Clock<'a> {
    fn start(watch: &'a dyn Watch) -> Clock<'a> {
        let now = Instant::now();
        Clock {
            watch,
            begun: now,
            entered: now,
            current: None,
            past: Vec::new(),
        }
    }

    fn enter(&mut self, stage: Stage) {
        let now = Instant::now();
        if let Some(past) = self.current.replace(stage) {
            self.past.push((past, now - self.entered));
        }
        self.entered = now;
        self.watch.enter(stage);
    }

    /// The stages so far, the current one up to now.
    fn times(&self) -> Vec<(&'static str, Duration)> {
        let current = self.current.map(|stage| (stage, self.entered.elapsed()));
        let stages = self.past.iter().copied().chain(current);
        stages.map(|(stage, time)| (stage.as_str(), time)).collect()
    }
}
