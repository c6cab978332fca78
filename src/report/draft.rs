//! A directory in the making: written under a hidden name, put in place whole, or removed.

use std::fs::{self, File};
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use super::directory::{OutputError, Target, system};

impl Target {
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

    /// Adds a directory to it.
    ///
    /// # Errors
    /// The system's refusal.
    pub fn add_directory(&self, name: &str) -> Result<(), OutputError> {
        let shown = self.target.shown.join(name);
        let fail = system(&shown, "create this directory");
        fs::create_dir(self.path.join(name)).map_err(fail)
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
        state.in_place = true;
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
    in_place: bool,
}

impl Abandon {
    /// Removes the draft, if one is being written, and refuses any later one. Does nothing, and says
    /// `false`, once the directory is in place: there is a result then.
    pub fn give_up(&self) -> bool {
        let mut state = self.lock();
        if state.in_place {
            return false;
        }
        state.given_up = true;
        if let Some(draft) = state.draft.take() {
            // The writer may add a file between listing and removing: try again.
            let gone = (0..20).any(|_| fs::remove_dir_all(&draft).is_ok() || !draft.exists());
            if !gone {
                state.draft = Some(draft);
            }
        }
        true
    }

    fn lock(&self) -> MutexGuard<'_, DraftState> {
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

/// A rename is safe against a loss of power once its directory is flushed. Where a directory cannot
/// be opened (not every system allows it) the result is complete all the same.
fn sync_directory(path: &Path) {
    if let Ok(directory) = File::open(path) {
        let _ = directory.sync_all();
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::super::directory::{PIECES, RESULT, RESULT_MARK};
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
        assert!(abandon.give_up());
        assert!(matches!(draft.commit(), Err(OutputError::Abandoned)));
        assert!(names(base.path()).is_empty());
        assert!(matches!(
            target.draft(&abandon),
            Err(OutputError::Abandoned)
        ));
    }

    #[test]
    fn a_result_in_place_is_not_given_up() {
        let base = tempfile::tempdir().unwrap();
        let target = Target::check(&base.path().join("out")).unwrap();
        let abandon = Abandon::default();
        target.draft(&abandon).unwrap().commit().unwrap();
        assert!(!abandon.give_up());
        assert_eq!(names(base.path()), ["out"]);
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
