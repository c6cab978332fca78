//! An output directory that appears whole or not at all.
//!
//! Files are written into a hidden sibling ([`super::draft`]), `.NAME.maskproof-partial-PID`, flushed to the disk, and
//! the sibling is renamed to NAME. A directory that stands there is replaced only when everything in
//! it was written by an earlier run: anything else might be somebody's work. `rename` is atomic;
//! replacing takes two of them, so that a kill between them leaves both results whole, under hidden
//! names.

use std::ffi::{OsStr, OsString};
use std::fs::{self, File};
use std::io::{self, Read};
use std::path::{Path, PathBuf};

use thiserror::Error;

use crate::certificate;

/// The names that a result directory may hold; `RESULT` is the last one written.
pub const COLOURED: &str = "coloured.gds";
/// The colouring of an abstract graph.
pub const COLOURING: &str = "colouring.json";
/// One row a piece.
pub const PIECES: &str = "pieces.csv";
/// All measured times.
pub const TIMINGS: &str = "timings.json";
/// The verdict and everything that it rests on.
pub const RESULT: &str = "result.json";

/// The places of unavoidable conflicts, added to a result later.
pub const EXPLANATION: &str = "explanation.json";

/// How the hidden name begins that an explanation has while it is written.
pub const PARTIAL_EXPLANATION: &str = ".explanation.json.maskproof-partial-";

const OURS: [&str; 6] = [COLOURED, COLOURING, PIECES, TIMINGS, RESULT, EXPLANATION];

/// How the names of proofs end.
pub const PROOF_ENDING: &str = ".lrat";

/// How `result.json` begins: the mark by which an earlier result is known.
pub const RESULT_MARK: &str = "{\"format\":\"maskproof-result\"";

/// Why the output directory cannot be used or written.
#[derive(Debug, Error)]
pub enum OutputError {
    /// The path given names no directory that could be replaced as a whole.
    #[error("{}: {why}", path.display())]
    Unusable {
        /// The path given.
        path: PathBuf,
        /// What stands in the way, and what would be right.
        why: String,
    },
    /// The operating system refused.
    #[error("{}: cannot {action}: {source}", path.display())]
    System {
        /// The file or directory.
        path: PathBuf,
        /// What was being done.
        action: &'static str,
        /// The system's reason.
        source: io::Error,
    },
    /// The run was told to give up while it was writing.
    #[error("given up before the output was complete; nothing was kept")]
    Abandoned,
}

/// A place for an output directory, checked before the work begins.
#[derive(Clone, Debug)]
pub struct Target {
    pub(super) shown: PathBuf,
    pub(super) parent: PathBuf,
    name: OsString,
    /// Whether an earlier result may stand there.
    replaces: bool,
}

impl Target {
    /// Checks that `dir` may be created or replaced, by creating and removing a hidden directory
    /// beside it: a run of hours must not end at a directory that cannot be written.
    ///
    /// # Errors
    /// `dir` exists and is no earlier result, has no name of its own (like `..`), or cannot be
    /// created.
    pub fn check(dir: &Path) -> Result<Target, OutputError> {
        Target::locate(dir)?.probed()
    }

    /// The same for a directory that is new or empty: nothing that stands there is replaced.
    ///
    /// # Errors
    /// The same, and an earlier result.
    pub fn check_new(dir: &Path) -> Result<Target, OutputError> {
        let target = Target {
            replaces: false,
            ..Target::locate(dir)?
        };
        target.probed()
    }

    fn probed(self) -> Result<Target, OutputError> {
        let target = self;
        target.check_replaceable()?;
        let base = target.existing_ancestor();
        let probe = base.join(target.hidden("probe"));
        fs::create_dir(&probe).map_err(system(base, "create a directory here"))?;
        fs::remove_dir(&probe).map_err(system(&probe, "remove this directory"))?;
        Ok(target)
    }

    /// The directory as the user named it.
    pub fn shown(&self) -> &Path {
        &self.shown
    }

    /// Splits the path into parent and name, through symbolic links where the directory exists.
    fn locate(dir: &Path) -> Result<Target, OutputError> {
        let real = fs::canonicalize(dir).unwrap_or_else(|_| dir.to_path_buf());
        let name = real.file_name();
        let here = std::env::current_dir().and_then(fs::canonicalize);
        let holds_us = here.is_ok_and(|here| here.starts_with(&real));
        match (name, holds_us) {
            (Some(name), false) => Ok(Target {
                shown: dir.to_path_buf(),
                parent: match real.parent() {
                    Some(parent) if parent.as_os_str().is_empty() => PathBuf::from("."),
                    Some(parent) => parent.to_path_buf(),
                    None => PathBuf::from("."),
                },
                name: name.to_owned(),
                replaces: true,
            }),
            _ => Err(unusable(
                dir,
                "the output directory is put in place as a whole, so it must be a new name or an \
                 earlier result, and not the current directory or one above it",
            )),
        }
    }

    pub(super) fn path(&self) -> PathBuf {
        self.parent.join(&self.name)
    }

    pub(super) fn hidden(&self, role: &str) -> OsString {
        let mut name = OsString::from(".");
        name.push(&self.name);
        name.push(format!(".maskproof-{role}-{}", std::process::id()));
        name
    }

    fn existing_ancestor(&self) -> &Path {
        let here = Path::new(".");
        self.parent
            .ancestors()
            .find(|path| path.exists())
            .unwrap_or(here)
    }

    /// Something in the certificate of a result at `path` that no run writes.
    fn foreign_in_certificate(&self, path: &Path) -> Result<Option<PathBuf>, OutputError> {
        let directory = Path::new(certificate::DIRECTORY);
        let proofs = directory.join(certificate::PROOFS);
        let is_named = |name: &OsStr| name == certificate::FILE || name == certificate::PROOFS;
        match self.foreign(path, directory, is_named)? {
            None if path.join(&proofs).exists() => self.foreign(path, &proofs, is_proof),
            found => Ok(found),
        }
    }

    /// An entry of a directory within `path` whose name is not one of `ours`.
    fn foreign(
        &self,
        path: &Path,
        directory: &Path,
        ours: impl Fn(&OsStr) -> bool,
    ) -> Result<Option<PathBuf>, OutputError> {
        let shown = self.shown.join(directory);
        let entries = fs::read_dir(path.join(directory));
        for entry in entries.map_err(system(&shown, "list this directory"))? {
            let name = entry
                .map_err(system(&shown, "list this directory"))?
                .file_name();
            if !ours(&name) {
                return Ok(Some(directory.join(name)));
            }
        }
        Ok(None)
    }

    /// Accepts a path that does not exist, an empty directory, and an earlier result where it may be replaced.
    pub(super) fn check_replaceable(&self) -> Result<(), OutputError> {
        let path = self.path();
        let entries = match fs::read_dir(&path) {
            Ok(entries) => entries,
            Err(error) if error.kind() == io::ErrorKind::NotFound => return Ok(()),
            Err(source) => return Err(system(&self.shown, "use this as a directory")(source)),
        };
        let mut empty = true;
        for entry in entries {
            let name = entry
                .map_err(system(&self.shown, "list this directory"))?
                .file_name();
            empty = false;
            if !self.replaces {
                break;
            }
            let foreign = match () {
                () if OURS.iter().any(|ours| name == *ours) => None,
                () if name.to_string_lossy().starts_with(PARTIAL_EXPLANATION) => None,
                () if name == certificate::DIRECTORY => self.foreign_in_certificate(&path)?,
                () => Some(PathBuf::from(name)),
            };
            if let Some(foreign) = foreign {
                return Err(unusable(
                    &self.shown,
                    &format!(
                        "exists and holds {}, which no earlier run wrote: name a new directory",
                        foreign.display()
                    ),
                ));
            }
        }
        if empty || self.replaces && is_result(&path.join(RESULT)) {
            return Ok(());
        }
        if !self.replaces {
            let why = "exists and is not empty: name a new directory";
            return Err(unusable(&self.shown, why));
        }
        Err(unusable(
            &self.shown,
            "exists and is no complete result of an earlier run: name a new directory",
        ))
    }
}

/// Whether certificates have proofs of this name (`crate::certify` makes them).
fn is_proof(name: &OsStr) -> bool {
    let name = name.to_str().unwrap_or_default();
    certificate::is_proof_name(name) && name.ends_with(PROOF_ENDING)
}

fn is_result(file: &Path) -> bool {
    let mut start = Vec::new();
    let length = RESULT_MARK.len() as u64;
    File::open(file)
        .and_then(|file| file.take(length).read_to_end(&mut start))
        .is_ok_and(|_| start == RESULT_MARK.as_bytes())
}

fn unusable(path: &Path, why: &str) -> OutputError {
    OutputError::Unusable {
        path: path.to_path_buf(),
        why: why.to_owned(),
    }
}

/// An [`OutputError::System`] about `path`.
pub(super) fn system(path: &Path, action: &'static str) -> impl FnOnce(io::Error) -> OutputError {
    let path = path.to_path_buf();
    move |source| OutputError::System {
        path,
        action,
        source,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn directories_around_us_are_refused() {
        for dir in [".", "..", "/"] {
            assert!(matches!(
                Target::check(Path::new(dir)),
                Err(OutputError::Unusable { .. })
            ));
        }
    }
}
