//! The command line: arguments to a job, a report to a summary and an exit code.
//!
//! | file | what it holds |
//! |---|---|
//! | `args` | the options |
//! | `sweep` | the command `sweep`: its options, its run |
//! | `audited` | a verdict as text |
//! | `values` | the values of options that are no rules |
//! | `usage` | refusals of the command line, one line each |
//! | `progress` | bars on a terminal, now and then a line elsewhere |
//! | `interrupt` | Ctrl-C |

mod args;
mod audited;
mod interrupt;
mod progress;
mod sweep;
mod usage;
mod values;

use std::io::Write;
use std::process::ExitCode;

use clap::Parser;
use clap::error::ErrorKind;

use crate::audit::Verdict;
use crate::explain::text;
use crate::pipeline::{
    self, AuditJob, Blame, Control, ExplainJob, ExportJob, Exported, Job, PipelineError,
};
use crate::report::{self, summary};
use args::{
    AuditArgs, CertificateCommand, Command, CommandLine, ExplainArgs, ExportArgs, SolveArgs,
};
use interrupt::Moment;
use progress::Progress;

/// The codes that the program ends with, besides [`interrupt::STOPPED`].
mod exit {
    /// Proven: no conflict, and the fewest stitches.
    pub const DECOMPOSABLE: u8 = 0;
    /// Every combination of a sweep is proven, one way or the other.
    pub const DECIDED: u8 = 0;
    /// Each place is explained, or there is none.
    pub const EXPLAINED: u8 = 0;
    /// Proven: conflicts are unavoidable.
    pub const NOT_DECOMPOSABLE: u8 = 1;
    /// The command line is at fault.
    pub const USAGE: u8 = 2;
    /// An input file is at fault.
    pub const BAD_INPUT: u8 = 3;
    /// A limit came first.
    pub const UNDECIDED: u8 = 4;
    /// The audit accepts the certificate.
    pub const ACCEPTED: u8 = 0;
    /// The audit rejects the certificate.
    pub const REJECTED: u8 = 5;
    /// The machine (a full disk) or this program is at fault.
    pub const FAILED: u8 = 6;
}

/// Runs the program on the command line that it was started with.
pub fn main() -> ExitCode {
    let line = match CommandLine::try_parse() {
        Ok(line) => line,
        Err(error) => return refuse(&error),
    };
    ExitCode::from(match line.command {
        Command::Solve(args) => solve(*args),
        Command::Sweep(args) => sweep::run(*args),
        Command::Explain(args) => explain(&args),
        Command::Audit(args) => audit(args),
        Command::Certificate(args) => match args.command {
            CertificateCommand::Export(args) => export(args),
        },
    })
}

/// Prints what was asked for (help, version), or says what is wrong with the command line.
fn refuse(error: &clap::Error) -> ExitCode {
    match error.kind() {
        ErrorKind::DisplayHelp | ErrorKind::DisplayVersion => {
            let _ = error.print();
            ExitCode::SUCCESS
        }
        _ => {
            complain(&usage::line(error));
            ExitCode::from(exit::USAGE)
        }
    }
}

fn solve(args: SolveArgs) -> u8 {
    let job = Job::from(args);
    let control = Control::default();
    let moment = Moment::default();
    if let Err(error) = interrupt::install(&control, &moment) {
        // The run is no worse for it, only harder to stop.
        complain(&format!(
            "Ctrl-C will end the run without a result: {error}"
        ));
    }
    let progress = Progress::new(moment);
    let outcome = pipeline::run(&job, &control, &progress);
    progress.clear();
    match outcome {
        Ok(report) => {
            // A reader that closed the pipe has seen enough; files and exit code stand.
            let text = summary::text(&report, job.out.as_deref());
            let _ = std::io::stdout().write_all(text.as_bytes());
            code(report.verdict())
        }
        Err(error) => {
            complain(&error.to_string());
            blame(&error)
        }
    }
}

fn explain(args: &ExplainArgs) -> u8 {
    let job = ExplainJob::from(args);
    let control = Control::default();
    let moment = Moment::default();
    if let Err(error) = interrupt::install(&control, &moment) {
        complain(&format!("Ctrl-C will not end the run cleanly: {error}"));
    }
    let progress = Progress::new(moment);
    let outcome = pipeline::explain(&job, &control, &progress);
    progress.clear();
    match outcome {
        Ok(explanation) => {
            let text = text::text(&explanation, args.all, &job.file());
            let _ = std::io::stdout().write_all(text.as_bytes());
            exit::EXPLAINED
        }
        Err(error) => {
            complain(&error.to_string());
            blame(&error)
        }
    }
}

fn code(verdict: report::Verdict) -> u8 {
    match verdict {
        report::Verdict::Decomposable => exit::DECOMPOSABLE,
        report::Verdict::NotDecomposable => exit::NOT_DECOMPOSABLE,
        report::Verdict::Undecided => exit::UNDECIDED,
    }
}

fn blame(error: &PipelineError) -> u8 {
    match error.blame() {
        Blame::CommandLine => exit::USAGE,
        Blame::Input => exit::BAD_INPUT,
        Blame::Machine => exit::FAILED,
    }
}

fn audit(args: AuditArgs) -> u8 {
    let name = args.directory.display().to_string();
    match pipeline::audit(&AuditJob::from(args)) {
        Ok(verdict) => show(&name, &verdict),
        Err(error) => {
            complain(&error.to_string());
            blame(&error)
        }
    }
}

/// Prints a verdict on the certificate in the directory `name`.
fn show(name: &str, verdict: &Verdict) -> u8 {
    let text = audited::text(name, verdict);
    let _ = std::io::stdout().write_all(text.as_bytes());
    match verdict {
        Verdict::Accepted(_) => exit::ACCEPTED,
        Verdict::Rejected(_) => exit::REJECTED,
        Verdict::Malformed(_) => exit::BAD_INPUT,
    }
}

fn export(args: ExportArgs) -> u8 {
    let name = args.audit.directory.display().to_string();
    let job = ExportJob::from(args);
    let control = Control::default();
    // At no moment is there anything worth keeping, so the first signal ends the export.
    if let Err(error) = interrupt::install(&control, &Moment::default()) {
        complain(&format!(
            "Ctrl-C may leave a hidden directory behind: {error}"
        ));
    }
    match pipeline::export(&job, &control) {
        Ok(Exported::Written { theorem, bounds }) => {
            show(&name, &Verdict::Accepted(theorem));
            let (format, out) = (job.format.as_str(), job.out.display());
            let noun = if bounds == 1 { "bound" } else { "bounds" };
            let text = format!("\n{bounds} {noun} written as {format} to {out}\n");
            let _ = std::io::stdout().write_all(text.as_bytes());
            exit::ACCEPTED
        }
        Ok(Exported::Refused(verdict)) => show(&name, &verdict),
        Err(error) => {
            complain(&error.to_string());
            blame(&error)
        }
    }
}

/// One line on stderr. Names of files and cells may hold anything, control characters too.
fn complain(message: &str) {
    let line: String = message
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    let _ = writeln!(std::io::stderr(), "maskproof: {line}");
}
