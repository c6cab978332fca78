//! Many runs over one input: every combination of numbers of masks, spacings, stitch policies, overlaps and
//! fragment lengths, solved one after the other.
//!
//! | file | what it does |
//! |---|---|
//! | `plan` | the combinations |
//! | `source` | the input, read once, and its instance under each combination |
//! | `known` | outcomes of pieces that were solved before |
//!
//! What is shared: the input is read once; where the extraction does not look at the masks, it is done once
//! for all numbers of masks; a piece that an earlier combination had is not solved again. None of that
//! changes a row: it is what a run of that combination alone finds.

mod known;
mod plan;
mod source;

use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::Ordering;
use std::time::{Duration, Instant};

use crate::formats::rules::RawRules;
use crate::merge;
use crate::reduce::{self, Reductions};
use crate::report::assemble;
use crate::report::directory::{OutputError, Target};
use crate::report::sweep::{Found, Price, Row, Sweep, csv};
use crate::report::{Stop, single};
use crate::solve::Limits;

use super::error::PipelineError;
use super::job::{Control, Stage, Unwatched, Watch};
use super::subject::Subject;
use super::{contradiction, stopped_by};
use known::Known;
pub use plan::Choices;
use source::{Held, Source};

/// What is to be swept.
#[derive(Clone, Debug, Default)]
pub struct SweepJob {
    /// Layout or graph.
    pub input: PathBuf,
    /// Rules in TOML.
    pub rules_file: Option<PathBuf>,
    /// Rules that take the place of those in the file, the same in all combinations.
    pub rules: RawRules,
    /// What varies.
    pub choices: Choices,
    /// The cell to flatten, where several stand at the top.
    pub top: Option<String>,
    /// The file to write, or the directory for it; none is written without it.
    pub out: Option<PathBuf>,
    /// The price of one more mask.
    pub mask_cost: Option<Price>,
    /// How long solving one combination may take.
    pub time_limit: Option<Duration>,
    /// Worker threads; all cores without it.
    pub threads: Option<usize>,
}

impl SweepJob {
    /// The file that is written: a name that ends in `.csv`, or `sweep.csv` in a directory.
    pub fn file(&self) -> Option<PathBuf> {
        let out = self.out.as_ref()?;
        let is_file = out.extension().is_some_and(|ending| ending == "csv") && !out.is_dir();
        Some(if is_file {
            out.clone()
        } else {
            out.join(csv::FILE)
        })
    }
}

/// Solves all combinations, and writes the rows where the job asks for it.
///
/// Being stopped by a limit or by [`Control::cancel`] is no error: rows have bounds that are true, and those that
/// were not begun say so.
///
/// # Errors
/// See [`PipelineError`]: a combination whose rules are out of range or contradict each other, for one. Nothing
/// is written then.
pub fn sweep(job: &SweepJob, control: &Control, watch: &dyn Watch) -> Result<Sweep, PipelineError> {
    let file = job.file();
    if let Some(file) = &file {
        check(file).map_err(PipelineError::Target)?;
    }
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(job.threads.unwrap_or(0))
        .build()?;
    let sweep = pool.install(|| rows(job, control, watch))?;
    if let Some(file) = file {
        watch.enter(Stage::Write);
        make_directory(&file)?;
        single::put_in_place(&file, |out| csv::write(&sweep, out))?;
    }
    Ok(sweep)
}

/// Refuses a file that cannot be written before the work begins. A directory that is new is made at the end.
fn check(file: &Path) -> Result<(), OutputError> {
    match file.parent() {
        Some(parent) if !parent.as_os_str().is_empty() && !parent.exists() => {
            Target::check(parent).map(|_| ())
        }
        _ => single::check_replaceable(file, csv::MARK, "sweep"),
    }
}

fn make_directory(file: &Path) -> Result<(), OutputError> {
    let parent = file.parent().unwrap_or(Path::new(""));
    if parent.as_os_str().is_empty() {
        return Ok(());
    }
    std::fs::create_dir_all(parent).map_err(|source| OutputError::System {
        path: parent.to_path_buf(),
        action: "create this directory",
        source,
    })
}

fn rows(job: &SweepJob, control: &Control, watch: &dyn Watch) -> Result<Sweep, PipelineError> {
    watch.enter(Stage::Read);
    let (source, mut held) = Source::read(job, watch)?;
    watch.enter(Stage::Extract);
    let mut run = Run {
        job,
        control,
        watch,
        known: Known::default(),
    };
    let mut rows = Vec::with_capacity(source.combinations.len());
    for (i, &(masks, setting)) in source.combinations.iter().enumerate() {
        let mut found = None;
        // The first one is always begun: there is no answer before it.
        if i == 0 || !control.cancel.load(Ordering::SeqCst) {
            let combination = run.combination(&source, i, held);
            let (new, left) = combination.map_err(|error| within(masks, error))?;
            (found, held) = (Some(new), left);
        }
        rows.push(Row {
            masks,
            setting,
            found,
        });
    }
    Ok(Sweep {
        input: source.name,
        layer: source.layer,
        mask_cost: job.mask_cost,
        rows,
    })
}

/// What goes through all combinations.
struct Run<'a> {
    job: &'a SweepJob,
    control: &'a Control,
    watch: &'a dyn Watch,
    known: Known,
}

impl Run<'_> {
    /// Solves combination `i`; gives what it leaves for the next one too.
    fn combination(
        &mut self,
        source: &Source,
        i: usize,
        held: Held,
    ) -> Result<(Found, Held), PipelineError> {
        let begun = Instant::now();
        let subject = match i {
            0 => source.subject(i, held, self.watch)?,
            // Combinations are counted from the second one on, whatever each one's stage.
            _ => source.subject(i, held, &Unwatched)?,
        };
        if i == 0 {
            self.watch.enter(Stage::Solve);
        }
        let total = source.combinations.len() as u64;
        self.watch.progress(i as u64, total, "combinations");
        let limits = limits(self.job, self.control);
        let mut found = solve(&subject, &mut self.known, &limits)?;
        found.time = begun.elapsed();
        Ok((found, Held::Extracted(i, subject)))
    }
}

/// An error of a combination.
fn within(masks: u8, error: PipelineError) -> PipelineError {
    let error = Box::new(error);
    PipelineError::InSweep { masks, error }
}

/// The limits of a combination that begins now.
fn limits(job: &SweepJob, control: &Control) -> Limits {
    let now = Instant::now();
    Limits {
        deadline: job.time_limit.and_then(|limit| now.checked_add(limit)),
        piece_limit: None,
        cancel: Arc::clone(&control.cancel),
    }
}

/// Solves one combination.
fn solve(subject: &Subject, known: &mut Known, limits: &Limits) -> Result<Found, PipelineError> {
    contradiction::check(subject)?;
    let instance = subject.instance();
    let reduced = reduce::reduce(instance, Reductions::ALL).map_err(PipelineError::Reduce)?;
    let outcomes = known.solve(&reduced, limits);
    let colourings: Vec<_> = outcomes.iter().map(|found| &*found.colouring).collect();
    let merged = merge::merge(instance, &reduced, &colourings)?;
    let mut report =
        subject.with_facts(|facts| assemble::report(facts, &reduced, &outcomes, &merged.colouring));
    report.stop = stopped_by(&report, limits, Stop::PieceLimit);
    #[cfg(feature = "self-check")]
    super::self_check::check(
        subject,
        &crate::certify::Subject {
            instance,
            reduced: &reduced,
            outcomes: &outcomes,
            colouring: &merged.colouring,
        },
        limits,
        &report,
    )?;
    Ok(Found {
        counts: report.counts,
        conflicts: report.conflicts,
        stitches: report.stitches,
        stop: report.stop,
        time: Duration::ZERO,
    })
}
