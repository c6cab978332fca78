//! `timings.json`: every measured time, and nothing else, so that the other files never change from
//! run to run.

use std::io::{self, Write};

use serde::Serialize;

use super::Timings;
use crate::formats::document::Document;

#[derive(Serialize)]
struct Stage {
    stage: &'static str,
    seconds: f64,
}

#[derive(Serialize)]
struct Piece {
    piece: usize,
    seconds: f64,
}

/// Writes the stages in order and the pieces in the order of `pieces.csv`.
pub fn write(timings: &Timings, out: &mut impl Write) -> io::Result<()> {
    let mut document = Document::open(out)?;
    document.member("format", "maskproof-timings")?;
    document.member("version", 1)?;
    document.member("threads", timings.threads)?;
    document.member("seconds", rounded(timings.total().as_secs_f64()))?;
    document.list(
        "stages",
        timings.stages.iter().map(|&(stage, time)| Stage {
            stage,
            seconds: rounded(time.as_secs_f64()),
        }),
    )?;
    document.list(
        "pieces",
        timings.pieces.iter().enumerate().map(|(i, &time)| Piece {
            piece: i + 1,
            seconds: rounded(time.as_secs_f64()),
        }),
    )?;
    document.close()
}

/// Microseconds: a clock tells no more.
fn rounded(seconds: f64) -> f64 {
    (seconds * 1e6).round() / 1e6
}
