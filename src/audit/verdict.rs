//! What an audit comes to.

use std::fmt;

use thiserror::Error;

/// What an audit comes to, where the files can be read.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Verdict {
    /// The certificate proves what it claims.
    Accepted(Box<super::Theorem>),
    /// What it says is not so.
    Rejected(Rejection),
    /// It has not the form of a certificate.
    Malformed(Malformed),
}

/// A certificate that says what is not so: the step, the reason, and a witness.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
#[error("{step}: {reason}")]
pub struct Rejection {
    /// What was being checked.
    pub step: Step,
    /// What is not so, with the witness.
    pub reason: String,
}

/// A file that has not the form of the format.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
#[error("{file}:{}{message}", Place(*line))]
pub struct Malformed {
    /// The file, from the directory of the certificate on.
    pub file: String,
    /// The line, from 1; 0 where the whole file is meant.
    pub line: u64,
    /// What is wrong and what would be right.
    pub message: String,
}

struct Place(u64);

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.0 {
            0 => f.write_str(" "),
            line => write!(f, "{line}: "),
        }
    }
}

/// A step of the audit.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Step {
    /// The input is the one that the certificate speaks of.
    Input,
    /// The rules are those that were given.
    Rules,
    /// The features are those of the layer.
    Features,
    /// The stitch candidates are legal, and those of the policy.
    Stitches,
    /// The colouring is one, and costs what is claimed.
    Colouring,
    /// A bound on conflicts, by its number from 0.
    ConflictBound(usize),
    /// A bound on stitches, by its number from 0.
    StitchBound(usize),
    /// The limits add up.
    Sum,
}

impl fmt::Display for Step {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Step::Input => f.write_str("input"),
            Step::Rules => f.write_str("rules"),
            Step::Features => f.write_str("features"),
            Step::Stitches => f.write_str("stitches"),
            Step::Colouring => f.write_str("colouring"),
            Step::ConflictBound(i) => write!(f, "conflict bound {i}"),
            Step::StitchBound(i) => write!(f, "stitch bound {i}"),
            Step::Sum => f.write_str("sum"),
        }
    }
}

impl Rejection {
    /// A rejection at a step.
    pub fn new(step: Step, reason: impl Into<String>) -> Rejection {
        Rejection {
            step,
            reason: reason.into(),
        }
    }
}
