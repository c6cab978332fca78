//! An output directory that appears whole or not at all.
//!
//! Files are written into a hidden sibling, `.NAME.maskproof-partial-PID`, flushed to the disk, and
//! the sibling is renamed to NAME. A directory that stands there is replaced only when everything in
//! it was written by an earlier run: anything else might be somebody's work. `rename` is atomic;
//! replacing takes two of them, so that a kill between them leaves both results whole, under hidden
//! names.

use std::ffi::OsString;
use std::fs::{self, File};
use std::io::{self, BufWriter, Read, Write};
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use thiserror::Error;

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

const OURS: [&str; 5] = [COLOURED, COLOURING, PIECES, TIMINGS, RESULT];

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
    shown: PathBuf,
    parent: PathBuf,
    name: OsString,
}

impl Target {
    /// Checks that `dir` may be created or replaced, by creating and removing a hidden directory
    /// beside it: a run of hours must not end at a directory that cannot be written.
    ///
    /// # Errors
    /// `dir` exists and is no earlier result, has no name of its own (like `..`), or cannot be
    /// created.
    pub fn check(dir: &Path) -> Result<Target, OutputError> {
        let target = Target::locate(dir)?;
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
            }),
            _ => Err(unusable(
                dir,
                "the output directory is put in place as a whole, so it must be a new name or an \
                 earlier result, and not the current directory or one above it",
            )),
        }
    }

    fn path(&self) -> PathBuf {
        self.parent.join(&self.name)
    }

    fn hidden(&self, role: &str) -> OsString {
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

    /// Accepts a path that does not exist, an empty directory, and an earlier result.
    fn check_replaceable(&self) -> Result<(), OutputError> {
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
            if !OURS.iter().any(|ours| name == *ours) {
                return Err(unusable(
                    &self.shown,
                    &format!(
                        "exists and holds {}, which no earlier run wrote: name a new directory",
                        Path::new(&name).display()
                    ),
                ));
            }
        }
        if empty || is_result(&path.join(RESULT)) {
            return Ok(());
        }
        Err(unusable(
            &self.shown,
            "exists and is no complete result of an earlier run: name a new directory",
        ))
    }

    /// Starts the hidden directory that [`Draft::commit`] puts in place. `abandon` can end it from
    /// another thread.
    ///
    /// # Errors
    /// The system's refusal.
    pub fn draft(&self, abandon: &Abandon) -> Result<Draft, OutputError> {
        fs::create_dir_all(&self.parent).map_err(system(&self.parent, "create this directory"))?;
        let path = self.parent.join(self.hidden("partial"));
        let mut state = abandon.lock();
        if state.given_up {
            return Err(OutputError::Abandoned);
        }
        fs::create_dir(&path).map_err(system(&path, "create this directory"))?;
        state.draft = Some(path.clone());
        drop(state);
        Ok(Draft {
            target: self.clone(),
            path,
            abandon: abandon.clone(),
        })
    }
}

/// An output directory in the making; dropped without [`Draft::commit`], it is removed.
#[derive(Debug)]
pub struct Draft {
    target: Target,
    path: PathBuf,
    abandon: Abandon,
}

impl Draft {
    /// Writes one file and flushes it to the disk.
    ///
    /// # Errors
    /// The system's refusal, a full disk for one.
    pub fn write(
        &self,
        name: &str,
        content: impl FnOnce(&mut BufWriter<File>) -> io::Result<()>,
    ) -> Result<(), OutputError> {
        let shown = self.target.shown.join(name);
        let fail = |source| system(&shown, "write this file")(source);
        let mut out = BufWriter::new(File::create_new(self.path.join(name)).map_err(fail)?);
        content(&mut out).map_err(fail)?;
        out.flush().map_err(fail)?;
        out.get_ref().sync_all().map_err(fail)
    }

    /// Puts the directory in place under its own name, in the stead of an earlier result.
    ///
    /// # Errors
    /// The system's refusal, a directory that appeared there meanwhile and is no result, or
    /// [`OutputError::Abandoned`].
    pub fn commit(self) -> Result<(), OutputError> {
        // The lock keeps `Abandon::give_up` from emptying a directory that is being renamed.
        let mut state = self.abandon.lock();
        if state.given_up {
            return Err(OutputError::Abandoned);
        }
        self.put_in_place()?;
        state.draft = None;
        Ok(())
    }

    fn put_in_place(&self) -> Result<(), OutputError> {
        let shown = &self.target.shown;
        self.target.check_replaceable()?;
        let place = self.target.path();
        let old = self.target.parent.join(self.target.hidden("replaced"));
        let replaced = match fs::rename(&place, &old) {
            Ok(()) => true,
            Err(error) if error.kind() == io::ErrorKind::NotFound => false,
            Err(source) => return Err(system(shown, "move the earlier result away")(source)),
        };
        if let Err(source) = fs::rename(&self.path, &place) {
            if replaced {
                let _ = fs::rename(&old, &place);
            }
            return Err(system(shown, "put the output in place")(source));
        }
        if replaced {
            // The new result stands whether or not the old one goes.
            let _ = fs::remove_dir_all(&old);
        }
        sync_directory(&self.target.parent);
        Ok(())
    }
}

impl Drop for Draft {
    fn drop(&mut self) {
        let mut state = self.abandon.lock();
        if state.draft.take().is_some() {
            let _ = fs::remove_dir_all(&self.path);
        }
    }
}

/// Ends a draft from another thread, leaving nothing behind.
#[derive(Clone, Debug, Default)]
pub struct Abandon(Arc<Mutex<DraftState>>);

#[derive(Debug, Default)]
struct DraftState {
    draft: Option<PathBuf>,
    given_up: bool,
}

impl Abandon {
    /// Removes the draft, if one is being written, and refuses any later one. A directory already
    /// put in place stays.
    pub fn give_up(&self) {
        let mut state = self.lock();
        state.given_up = true;
        if let Some(draft) = state.draft.take() {
            // The writer may add a file between listing and removing: try again.
            let gone = (0..20).any(|_| fs::remove_dir_all(&draft).is_ok() || !draft.exists());
            if !gone {
                state.draft = Some(draft);
            }
        }
    }

    fn lock(&self) -> MutexGuard<'_, DraftState> {
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

fn is_result(file: &Path) -> bool {
    let mut start = Vec::new();
    let length = RESULT_MARK.len() as u64;
    File::open(file)
        .and_then(|file| file.take(length).read_to_end(&mut start))
        .is_ok_and(|_| start == RESULT_MARK.as_bytes())
}

/// A rename is safe against a loss of power once its directory is flushed. Where a directory cannot
/// be opened (not every system allows it) the result is complete all the same.
fn sync_directory(path: &Path) {
    if let Ok(directory) = File::open(path) {
        let _ = directory.sync_all();
    }
}

fn unusable(path: &Path, why: &str) -> OutputError {
    OutputError::Unusable {
        path: path.to_path_buf(),
        why: why.to_owned(),
    }
}

fn system(path: &Path, action: &'static str) -> impl FnOnce(io::Error) -> OutputError {
    let path = path.to_path_buf();
    move |source| OutputError::System {
        path,
        action,
        source,
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    fn put(dir: &Path, mark: &str) -> Result<(), OutputError> {
        let draft = Target::check(dir)?.draft(&Abandon::default())?;
        draft.write(RESULT, |out| out.write_all(mark.as_bytes()))?;
        draft.commit()
    }

    fn names(dir: &Path) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(dir)
            .unwrap()
            .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }

    #[test]
    fn an_earlier_result_is_replaced_and_nothing_is_left_beside_it() {
        let base = tempfile::tempdir().unwrap();
        let dir = base.path().join("new/parents/out");
        put(&dir, RESULT_MARK).unwrap();
        let second = format!("{RESULT_MARK}, second");
        put(&dir, &second).unwrap();
        assert_eq!(fs::read_to_string(dir.join(RESULT)).unwrap(), second);
        assert_eq!(names(&base.path().join("new/parents")), ["out"]);
    }

    #[test]
    fn an_empty_directory_is_taken() {
        let base = tempfile::tempdir().unwrap();
        let dir = base.path().join("out");
        fs::create_dir(&dir).unwrap();
        put(&dir, RESULT_MARK).unwrap();
        assert_eq!(names(&dir), [RESULT]);
        assert_eq!(names(base.path()), ["out"]);
    }

    #[test]
    fn what_is_no_result_is_refused_and_kept() {
        let base = tempfile::tempdir().unwrap();
        let dir = base.path().join("out");
        fs::create_dir(&dir).unwrap();
        for (name, content) in [("notes.txt", "mine"), (RESULT, "{\"format\":\"other\"}")] {
            fs::write(dir.join(name), content).unwrap();
            assert!(matches!(
                put(&dir, RESULT_MARK),
                Err(OutputError::Unusable { .. })
            ));
            assert_eq!(fs::read_to_string(dir.join(name)).unwrap(), content);
            fs::remove_file(dir.join(name)).unwrap();
        }
        let file = base.path().join("file");
        fs::write(&file, "mine").unwrap();
        assert!(put(&file, RESULT_MARK).is_err());
        assert_eq!(fs::read_to_string(&file).unwrap(), "mine");
        assert_eq!(names(base.path()), ["file", "out"]);
    }

    #[test]
    fn directories_around_us_are_refused() {
        for dir in [".", "..", "/"] {
            assert!(matches!(
                Target::check(Path::new(dir)),
                Err(OutputError::Unusable { .. })
            ));
        }
    }

    #[test]
    fn a_draft_dropped_or_abandoned_leaves_nothing() {
        let base = tempfile::tempdir().unwrap();
        let target = Target::check(&base.path().join("out")).unwrap();
        let dropped = target.draft(&Abandon::default()).unwrap();
        dropped.write(PIECES, |out| out.write_all(b"x")).unwrap();
        assert_eq!(names(base.path()).len(), 1);
        drop(dropped);
        assert!(names(base.path()).is_empty());

        let abandon = Abandon::default();
        let draft = target.draft(&abandon).unwrap();
        draft.write(PIECES, |out| out.write_all(b"x")).unwrap();
        abandon.give_up();
        assert!(matches!(draft.commit(), Err(OutputError::Abandoned)));
        assert!(names(base.path()).is_empty());
        assert!(matches!(
            target.draft(&abandon),
            Err(OutputError::Abandoned)
        ));
    }

    #[test]
    fn a_failed_write_leaves_nothing() {
        let base = tempfile::tempdir().unwrap();
        let target = Target::check(&base.path().join("out")).unwrap();
        let draft = target.draft(&Abandon::default()).unwrap();
        let error = draft
            .write(PIECES, |_| Err(io::Error::other("disk full")))
            .unwrap_err();
        assert!(
            error
                .to_string()
                .contains("pieces.csv: cannot write this file: disk full")
        );
        drop(draft);
        assert!(names(base.path()).is_empty());
    }
}
