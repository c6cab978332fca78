//! Ctrl-C, SIGTERM and SIGHUP: the first one asks for the best result so far, the second ends at once.
//!
//! Before there is anything to keep (reading, extraction, reduction), the first one ends the program
//! too. Whatever the moment, no half-written output directory stays behind.

use std::io::{IsTerminal, Write, stderr};
use std::process;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::pipeline::Control;

/// The exit code of a run that was stopped before there was a result.
pub const STOPPED: i32 = 130;

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
/// Another handler is in place, or the system refuses.
pub fn install(control: &Control, moment: &Moment) -> Result<(), ctrlc::Error> {
    let (control, moment) = (control.clone(), moment.clone());
    ctrlc::try_set_handler(move || {
        let again = control.cancel.swap(true, Ordering::SeqCst);
        if again || !moment.is_solving() {
            // With the result in place, the program is about to end by itself.
            if control.abandon.give_up() {
                say("stopped; nothing was written");
                process::exit(STOPPED);
            }
            return;
        }
        say("stopping with the best result so far; once more gives it up");
    })
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
