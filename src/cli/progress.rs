//! Progress on stderr: a bar on a terminal, otherwise a plain line now and then.

use std::io::{IsTerminal, Write, stderr};
use std::sync::{Mutex, PoisonError};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use super::interrupt::Moment;
use crate::pipeline::{Stage, Watch};

/// How often a log that is no terminal gets a line.
const LOG_INTERVAL: Duration = Duration::from_secs(10);

/// Shows how far the run is.
pub struct Progress {
    moment: Moment,
    shown: Mutex<Shown>,
}

struct Shown {
    bar: Option<ProgressBar>,
    stage: Stage,
    noun: &'static str,
    logged: Instant,
}

impl Progress {
    /// Nothing is drawn before the first stage begins.
    pub fn new(moment: Moment) -> Progress {
        Progress {
            moment,
            shown: Mutex::new(Shown {
                bar: stderr().is_terminal().then(ProgressBar::hidden),
                stage: Stage::Read,
                noun: "",
                logged: Instant::now(),
            }),
        }
    }

    /// Takes the bar away, so that what follows has the screen for itself.
    pub fn clear(&self) {
        if let Some(bar) = &self.lock().bar {
            bar.finish_and_clear();
        }
    }

    fn lock(&self) -> std::sync::MutexGuard<'_, Shown> {
        self.shown.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

impl Watch for Progress {
    fn enter(&self, stage: Stage) {
        if stage == Stage::Solve {
            self.moment.solving();
        }
        let mut shown = self.lock();
        shown.stage = stage;
        shown.noun = "";
        if let Some(old) = shown.bar.take() {
            old.finish_and_clear();
            let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::stderr_with_hz(10));
            bar.set_style(uncounted());
            bar.set_prefix(verb(stage));
            bar.enable_steady_tick(Duration::from_millis(200));
            shown.bar = Some(bar);
        }
    }

    fn progress(&self, done: u64, total: u64, noun: &'static str) {
        let mut shown = self.lock();
        if let Some(bar) = &shown.bar {
            if bar.length() != Some(total) || shown.noun != noun {
                bar.set_length(total);
                bar.set_style(counted(noun));
            }
            bar.set_position(done);
            shown.noun = noun;
        } else if shown.logged.elapsed() >= LOG_INTERVAL {
            shown.logged = Instant::now();
            let verb = verb(shown.stage);
            let _ = writeln!(stderr(), "maskproof: {verb}, {done} of {total} {noun}");
        }
    }
}

fn verb(stage: Stage) -> &'static str {
    match stage {
        Stage::Read => "reading",
        Stage::Extract => "extracting",
        Stage::Reduce => "reducing",
        Stage::Solve => "solving",
        Stage::Merge => "merging",
        Stage::Explain => "explaining",
        Stage::Certify => "proving",
        Stage::Write => "writing",
    }
}

/// A bar with counts, rate and time left.
fn counted(noun: &str) -> ProgressStyle {
    let counts = match noun {
        "bytes" => "{decimal_bytes} of {decimal_total_bytes}, {decimal_bytes_per_sec}".to_owned(),
        _ => format!("{{human_pos}} of {{human_len}} {noun}, {{per_sec}}"),
    };
    style(&format!("{{prefix:>10}} {{bar:30}} {counts}, {{eta}} left"))
}

/// The time gone by, where nothing is counted.
fn uncounted() -> ProgressStyle {
    style("{prefix:>10} {spinner} {elapsed}")
}

fn style(template: &str) -> ProgressStyle {
    ProgressStyle::with_template(template)
        .unwrap_or_else(|_| ProgressStyle::default_bar())
        .progress_chars("=> ")
}
