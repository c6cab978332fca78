//! Ctrl-C, SIGTERM and SIGHUP: the first one asks for the best result so far, the second ends at once.
//!
//! Before there is anything to keep (reading, extraction, reduction), the first one ends the program
//! too. Whatever the moment, no half-written output directory stays behind.
//!
//! One request may arrive as several signals: `timeout`, batch schedulers and terminals signal a program
//! and its whole group, and wrappers pass on what they get. So what follows within [`SAME_REQUEST`] of the
//! first is the first one again.
//!
//! Signals that whoever started the program has it ignore stay ignored: `nohup` means it, and so does a shell
//! that starts a job in the background.

use std::io::{self, IsTerminal, Write, stderr};
use std::process;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::{Duration, Instant};

use crate::pipeline::Control;

/// The exit code of a run that was stopped before there was a result.
pub const STOPPED: i32 = 130;

/// How long after the first signal others still count as the same request.
const SAME_REQUEST: Duration = Duration::from_millis(500);

/// Tells the signal handler whether there is something worth keeping.
#[derive(Clone, Debug, Default)]
pub struct Moment(Arc<AtomicBool>);

impl Moment {
    /// From now on a legal colouring can be had at any time.
    pub fn solving(&self) {
        self.0.store(true, Ordering::SeqCst);
    }

    fn is_solving(&self) -> bool {
        self.0.load(Ordering::SeqCst)
    }
}

/// Takes over the signals for the rest of the program.
///
/// # Errors
/// The system refuses.
pub fn install(control: &Control, moment: &Moment) -> io::Result<()> {
    let (control, moment) = (control.clone(), moment.clone());
    let (mut first, mut told) = (None, false);
    on_each_signal(move || {
        control.cancel.store(true, Ordering::SeqCst);
        if is_second(&mut first, Instant::now()) || !moment.is_solving() {
            // With the result in place, the program is about to end by itself.
            if control.abandon.give_up() {
                say("stopped; nothing was written");
                process::exit(STOPPED);
            }
            return;
        }
        if !std::mem::replace(&mut told, true) {
            say("stopping with the best result so far; once more gives it up");
        }
    })
}

/// Calls `act` for each signal, on a thread of its own.
#[cfg(unix)]
fn on_each_signal(mut act: impl FnMut() + Send + 'static) -> io::Result<()> {
    use signal_hook::consts::{SIGHUP, SIGINT, SIGTERM};
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let ignored = ignored_signals(&status);
    let heeded = [SIGHUP, SIGINT, SIGTERM].map(|signal| (signal, ignored >> (signal - 1) & 1));
    let heeded = heeded.iter().filter(|(_, ignored)| *ignored == 0);
    let mut signals = signal_hook::iterator::Signals::new(heeded.map(|(signal, _)| signal))?;
    let listen = move || signals.forever().for_each(|_| act());
    std::thread::Builder::new()
        .name("signals".to_owned())
        .spawn(listen)?;
    Ok(())
}

/// The set of ignored signals in Linux's account of a process, bit i for signal i + 1; empty where the system
/// tells nothing.
#[cfg(unix)]
fn ignored_signals(status: &str) -> u64 {
    let set = status.lines().find_map(|line| line.strip_prefix("SigIgn:"));
    set.and_then(|set| u64::from_str_radix(set.trim(), 16).ok())
        .unwrap_or(0)
}

/// Calls `act` for each Ctrl-C.
#[cfg(not(unix))]
fn on_each_signal(act: impl FnMut() + Send + 'static) -> io::Result<()> {
    ctrlc::try_set_handler(act).map_err(io::Error::other)
}

/// Whether a signal at `now` is a request of its own after the one at `first`, which it sets.
fn is_second(first: &mut Option<Instant>, now: Instant) -> bool {
    let first = *first.get_or_insert(now);
    now.saturating_duration_since(first) > SAME_REQUEST
}

/// Wipes the bar, if there is one. A closed stderr must not turn a stop into a panic.
fn say(text: &str) {
    let wipe = if stderr().is_terminal() {
        "\r\x1b[2K"
    } else {
        ""
    };
    let _ = writeln!(stderr(), "{wipe}maskproof: {text}");
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn signals_that_come_together_are_one_request() {
        let begun = Instant::now();
        let mut first = None;
        assert!(!is_second(&mut first, begun));
        assert!(!is_second(&mut first, begun));
        assert!(!is_second(&mut first, begun + SAME_REQUEST));
        assert!(is_second(
            &mut first,
            begun + SAME_REQUEST + Duration::from_millis(1)
        ));
        // They are counted from the first one, so that a held key does not put off the end for ever.
        assert_eq!(first, Some(begun));
    }

    #[cfg(unix)]
    #[test]
    fn ignored_signals_are_read() {
        assert_eq!(
            ignored_signals("SigBlk:\t0000000000000002\nSigIgn:\t0000000000001003\n"),
            0x1003
        );
        assert_eq!(ignored_signals("Name:\tmaskproof\n"), 0);
        assert_eq!(ignored_signals("SigIgn:\tnone\n"), 0);
    }
}
