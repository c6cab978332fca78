//! The room's one error: where in which input, what is wrong there, what would be right.

use encodings::InstanceError;
use std::fmt;
use thiserror::Error;

/// A place in an input, as exact as its format allows.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Position {
    /// The file as the user named it, or the command line option; empty when nothing was given.
    pub source: String,
    /// The byte offset, from 0, in the unpacked stream (GDSII).
    pub byte: Option<u64>,
    /// The line, from 1 (text formats).
    pub line: Option<u64>,
    /// The column in characters, from 1 (text formats).
    pub column: Option<u64>,
    /// The cell (GDSII).
    pub cell: Option<String>,
    /// Whether the place is the command line.
    pub command_line: bool,
}

impl Position {
    /// A whole file.
    pub fn file(name: &str) -> Position {
        Position {
            source: name.to_owned(),
            ..Position::default()
        }
    }

    /// A byte of a file.
    pub fn byte(name: &str, byte: u64) -> Position {
        Position {
            byte: Some(byte),
            ..Position::file(name)
        }
    }

    /// A line of a file, from 1.
    pub fn line(name: &str, line: u64) -> Position {
        Position {
            line: Some(line),
            ..Position::file(name)
        }
    }

    /// A line and column of a file, both from 1.
    pub fn column(name: &str, line: u64, column: u64) -> Position {
        Position {
            column: Some(column),
            ..Position::line(name, line)
        }
    }

    /// An option of the command line, such as `--spacing`.
    pub fn command_line(option: &str) -> Position {
        Position {
            command_line: true,
            ..Position::file(option)
        }
    }

    /// The same place, in a cell.
    pub fn in_cell(mut self, cell: &str) -> Position {
        self.cell = Some(cell.to_owned());
        self
    }
}

impl fmt::Display for Position {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.source)?;
        if let Some(line) = self.line {
            write!(f, ":{line}")?;
        }
        if let Some(column) = self.column {
            write!(f, ":{column}")?;
        }
        if let Some(byte) = self.byte {
            write!(f, ": byte {byte}")?;
        }
        if let Some(cell) = &self.cell {
            write!(f, ", cell {cell:?}")?;
        }
        Ok(())
    }
}

/// What is wrong at a place, one variant a format. Every message says what would be right.
#[derive(Debug, Error)]
pub enum Problem {
    /// The operating system refused.
    #[error("{0}")]
    Io(#[from] std::io::Error),
    /// The file is no whole gzip file, or unpacks to too much.
    #[error("{0}")]
    Gzip(String),
    /// The file is of no format that is read.
    #[error("{0}")]
    Unknown(String),
    /// GDSII.
    #[error("{0}")]
    Gdsii(#[from] super::gdsii::Problem),
    /// DIMACS `.col`.
    #[error("{0}")]
    DimacsCol(#[from] super::dimacs_col::Problem),
    /// Instance or colouring JSON.
    #[error("{0}")]
    Json(#[from] super::json::Problem),
    /// Rules, from TOML or the command line.
    #[error("{0}")]
    Rules(#[from] super::rules::Problem),
    /// The lists make no instance.
    #[error("{0}")]
    Instance(#[from] InstanceError),
}

/// One clear error: where, what is wrong, what would be right.
#[derive(Debug)]
pub struct FormatError(Box<(Position, Problem)>);

impl FormatError {
    /// The error of a problem at a place.
    pub fn new(position: Position, problem: impl Into<Problem>) -> FormatError {
        FormatError(Box::new((position, problem.into())))
    }

    /// Where.
    pub fn position(&self) -> &Position {
        &self.0.0
    }

    /// What.
    pub fn problem(&self) -> &Problem {
        &self.0.1
    }

    /// Whether the user's command line is to be changed (exit code 2) rather than an input file
    /// (exit code 3).
    pub fn is_usage(&self) -> bool {
        self.position().command_line
    }
}

impl fmt::Display for FormatError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (position, problem) = &*self.0;
        if position.source.is_empty() {
            write!(f, "{problem}")
        } else {
            write!(f, "{position}: {problem}")
        }
    }
}

impl std::error::Error for FormatError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        Some(&self.0.1)
    }
}
