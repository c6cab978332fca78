//! Ctrl-C.

use std::fs;
use std::process::{Command, Stdio};
use std::thread::sleep;
use std::time::Duration;

use crate::cli_support::*;
use crate::{UNDECIDED, column, rows};

const STOPPED: i32 = 130;

/// The first signal ends the search that is under way; rows before it stand, those after it are not begun.
#[test]
fn a_signal_keeps_the_rows_so_far() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    // A graph that no exact method colours in the time of a test: the very first row is cut short.
    fs::write(dir.join("hard.col"), random_col(400, 3)).unwrap();
    let args = [
        "sweep",
        "hard.col",
        "--masks",
        "5,6,7",
        "--out",
        "out.csv",
        "--time-limit",
        "600",
    ];
    let mut command = program(dir, &args);
    let child = command
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    sleep(Duration::from_millis(2500));
    let sent = Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .unwrap();
    assert!(sent.success());
    let run = finished(child.wait_with_output().unwrap());
    assert_eq!(run.code, UNDECIDED, "{}", run.stderr);
    assert!(
        run.stdout
            .contains("stopped by an interrupt: 2 combinations of 3 not begun\n"),
        "{}",
        run.stdout
    );
    let rows = rows(&dir.join("out.csv"));
    assert_eq!(column(&rows, "masks"), ["5", "6", "7"]);
    assert_eq!(column(&rows, "verdict"), ["undecided"; 3]);
    assert_eq!(column(&rows, "stopped_by"), ["interrupt"; 3]);
    let bound = |name: &str| rows[0][name].parse::<u64>().unwrap();
    assert!(bound("conflicts_lower") < bound("conflicts_upper"));
    assert_eq!(column(&rows, "features"), ["400", "", ""]);
    assert_eq!(column(&rows, "conflicts_upper")[1..], ["", ""]);
}

/// A signal before there is a row leaves nothing.
#[test]
fn a_signal_while_reading_ends_with_nothing() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let made = Command::new("mkfifo").arg(dir.join("slow.col")).status();
    assert!(made.unwrap().success());
    // Nobody writes into the pipe: reading waits for ever.
    let mut command = program(
        dir,
        &["sweep", "slow.col", "--masks", "2,3", "--out", "out.csv"],
    );
    let child = command
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    sleep(Duration::from_millis(700));
    let sent = Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .unwrap();
    assert!(sent.success());
    let run = finished(child.wait_with_output().unwrap());
    assert_eq!(run.code, STOPPED, "{}", run.stderr);
    assert_eq!(run.stderr, "maskproof: stopped; nothing was written\n");
    assert_eq!(names(dir), ["slow.col"]);
}
