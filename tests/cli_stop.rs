//! Being stopped: limits and signals end with true bounds and whole outputs, or with nothing.
#![cfg(unix)]
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use std::fs;
use std::path::Path;
use std::process::{Child, Command, Stdio};
use std::thread::sleep;
use std::time::{Duration, Instant};

use cli_support::*;

const UNDECIDED: i32 = 4;
const STOPPED: i32 = 130;

/// How long a stopped run may take to end, on a busy machine.
const PATIENCE: Duration = Duration::from_secs(60);

#[test]
fn a_time_limit_of_zero_still_gives_a_legal_colouring() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let input = routed();
    let args = [
        "solve",
        input.to_str().unwrap(),
        "--layer",
        "67/20",
        "--masks",
        "3",
        "--spacing",
        "250",
        "--out",
        "out",
        "--time-limit",
        "0",
    ];
    let run = run(dir, &args);
    assert_eq!(run.code, UNDECIDED, "{}", run.stderr);
    assert!(
        run.stdout
            .contains("undecided: the time limit ended the run")
    );
    let result = result(&dir.join("out"));
    assert_eq!(result["stopped_by"], "time limit");
    // 35 is the least number of conflicts (RC2 over CaDiCaL, see the table).
    let bound = |name: &str| result["conflicts"][name].as_u64().unwrap();
    assert!(
        bound("lower") <= 35 && 35 <= bound("upper"),
        "{}",
        result["conflicts"]
    );
    assert_eq!(
        result["unresolved"].as_array().unwrap().len() as u64,
        bound("upper")
    );
    assert!(dir.join("out/coloured.gds").exists());
}

#[test]
fn a_piece_limit_of_zero_keeps_true_bounds() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("hard.col"), random_col(150, 2)).unwrap();
    let args = [
        "solve",
        "hard.col",
        "--masks",
        "4",
        "--piece-limit",
        "0",
        "--out",
        "out",
    ];
    let run = run(dir.path(), &args);
    assert_eq!(run.code, UNDECIDED, "{}", run.stderr);
    let result = result(&dir.path().join("out"));
    assert_eq!(result["stopped_by"], "piece limit");
    assert!(result["conflicts"]["lower"].as_u64() < result["conflicts"]["upper"].as_u64());
}

/// A graph that no exact method colours in the time of a test.
fn start_hard(dir: &Path) -> Child {
    fs::write(dir.join("hard.col"), random_col(400, 3)).unwrap();
    let mut command = program(dir, &["solve", "hard.col", "--masks", "5", "--out", "out"]);
    command
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap()
}

fn signal(child: &Child, name: &str) {
    let sent = Command::new("kill")
        .args([name, &child.id().to_string()])
        .status()
        .unwrap();
    assert!(sent.success());
}

/// Waits for the end; kills a run that does not end, and fails.
fn end(mut child: Child) -> Run {
    let start = Instant::now();
    while child.try_wait().unwrap().is_none() {
        if start.elapsed() > PATIENCE {
            child.kill().unwrap();
            panic!("the run did not end: {:?}", child.wait_with_output());
        }
        sleep(Duration::from_millis(20));
    }
    finished(child.wait_with_output().unwrap())
}

#[test]
fn the_first_signal_keeps_the_best_so_far() {
    for (name, wait) in [("-INT", 1500), ("-TERM", 2500)] {
        let dir = tempfile::tempdir().unwrap();
        let child = start_hard(dir.path());
        sleep(Duration::from_millis(wait));
        signal(&child, name);
        let run = end(child);
        assert_eq!(run.code, UNDECIDED, "{name}: {}", run.stderr);
        assert_eq!(names(dir.path()), ["hard.col", "out"]);
        let result = result(&dir.path().join("out"));
        assert_eq!(result["stopped_by"], "interrupt");
        assert!(result["conflicts"]["lower"].as_u64() < result["conflicts"]["upper"].as_u64());
        assert!(dir.path().join("out/colouring.json").exists());
    }
}

/// `timeout` and batch schedulers signal a program and its group, so that it is told twice.
#[test]
fn two_signals_that_come_together_are_one() {
    let dir = tempfile::tempdir().unwrap();
    let child = start_hard(dir.path());
    sleep(Duration::from_millis(1500));
    let sent = Command::new("sh")
        .args(["-c", "kill -TERM $0; sleep 0.05; kill -TERM $0 || true"])
        .arg(child.id().to_string())
        .stderr(Stdio::null())
        .status()
        .unwrap();
    assert!(sent.success());
    let run = end(child);
    assert_eq!(run.code, UNDECIDED, "{}", run.stderr);
    assert_eq!(run.stderr.matches("once more gives it up").count(), 1);
    assert_eq!(names(dir.path()), ["hard.col", "out"]);
    assert_eq!(result(&dir.path().join("out"))["stopped_by"], "interrupt");
}

/// The second request may come before the result or after it.
#[test]
fn two_requests_leave_a_whole_result_or_none() {
    let dir = tempfile::tempdir().unwrap();
    let child = start_hard(dir.path());
    sleep(Duration::from_millis(1500));
    signal(&child, "-INT");
    sleep(Duration::from_millis(600));
    signal(&child, "-INT");
    let run = end(child);
    match run.code {
        STOPPED => assert_eq!(names(dir.path()), ["hard.col"]),
        UNDECIDED => {
            assert_eq!(names(dir.path()), ["hard.col", "out"]);
            assert_eq!(result(&dir.path().join("out"))["stopped_by"], "interrupt");
        }
        code => panic!("code {code}: {}", run.stderr),
    }
}

/// As `nohup` and jobs in the background are started.
#[cfg(target_os = "linux")]
#[test]
fn ignored_signals_stay_ignored_and_the_others_are_heeded() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("hard.col"), random_col(400, 3)).unwrap();
    let script = "trap '' HUP INT; exec \"$0\" solve hard.col --masks 5 --out out";
    let child = Command::new("sh")
        .args(["-c", script, env!("CARGO_BIN_EXE_maskproof")])
        .current_dir(dir.path())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    sleep(Duration::from_millis(1000));
    signal(&child, "-HUP");
    signal(&child, "-INT");
    sleep(Duration::from_millis(1000));
    signal(&child, "-TERM");
    let run = end(child);
    assert_eq!(run.code, UNDECIDED, "{}", run.stderr);
    // Told once: had the first two been heeded, the third would have given the result up.
    assert_eq!(
        run.stderr,
        "maskproof: stopping with the best result so far; once more gives it up\n"
    );
    assert_eq!(names(dir.path()), ["hard.col", "out"]);
}

#[test]
fn a_signal_while_reading_ends_at_once_with_nothing() {
    let dir = tempfile::tempdir().unwrap();
    let pipe = dir.path().join("slow.col");
    assert!(
        Command::new("mkfifo")
            .arg(&pipe)
            .status()
            .unwrap()
            .success()
    );
    // Nobody writes into the pipe: reading waits for ever.
    let mut command = program(
        dir.path(),
        &["solve", "slow.col", "--masks", "3", "--out", "out"],
    );
    let child = command
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    sleep(Duration::from_millis(500));
    signal(&child, "-INT");
    let run = end(child);
    assert_eq!(run.code, STOPPED, "{}", run.stderr);
    assert_eq!(run.stderr, "maskproof: stopped; nothing was written\n");
    assert_eq!(names(dir.path()), ["slow.col"]);
}

#[test]
fn a_write_that_fails_leaves_nothing() {
    const FAILED: i32 = 6;
    let dir = tempfile::tempdir().unwrap();
    fs::write(
        dir.path().join("k3.col"),
        "p edge 3 3\ne 1 2\ne 1 3\ne 2 3\n",
    )
    .unwrap();
    // No file may hold a byte, and the signal that would tell so is ignored: writes fail.
    let script = "trap '' XFSZ; ulimit -f 0; exec \"$0\" solve k3.col --masks 2 --out out";
    let mut shell = Command::new("sh");
    shell.args(["-c", script, env!("CARGO_BIN_EXE_maskproof")]);
    let run = finished(shell.current_dir(dir.path()).output().unwrap());
    assert_eq!(run.code, FAILED, "{}", run.stderr);
    assert!(
        run.stderr
            .starts_with("maskproof: out/certificate/certificate.json: cannot write this file: ")
    );
    assert_eq!(run.stderr.lines().count(), 1);
    assert_eq!(names(dir.path()), ["k3.col"]);
}

#[test]
fn a_closed_stdout_changes_nothing() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(
        dir.path().join("k3.col"),
        "p edge 3 3\ne 1 2\ne 1 3\ne 2 3\n",
    )
    .unwrap();
    let mut command = program(
        dir.path(),
        &["solve", "k3.col", "--masks", "2", "--out", "out"],
    );
    let mut child = command
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let run = end(child);
    assert_eq!((run.code, run.stderr.as_str()), (1, ""));
    assert_eq!(names(dir.path()), ["k3.col", "out"]);
}
