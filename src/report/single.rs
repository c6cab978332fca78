//! One output file, written whole or not at all: under a hidden name beside its place, flushed to the disk, renamed.
//! What stands there is replaced only if it begins with the mark of an earlier file of the same kind.

use std::fs::{self, File};
use std::io::{self, BufWriter, Read, Write};
use std::path::{Path, PathBuf};

use super::directory::{OutputError, system};

/// Accepts a path that does not exist and an earlier file that begins with `mark`, where a file can be written.
/// `kind` names the file in refusals.
///
/// # Errors
/// Anything else stands there, or the system's refusal.
pub fn check_replaceable(file: &Path, mark: &str, kind: &str) -> Result<(), OutputError> {
    let mut start = Vec::new();
    match File::open(file) {
        Ok(found) => {
            let read = found.take(mark.len() as u64).read_to_end(&mut start);
            if read.is_err() || start != mark.as_bytes() {
                return Err(OutputError::Unusable {
                    path: file.to_path_buf(),
                    why: format!("exists and is no earlier {kind}: name a new file"),
                });
            }
        }
        Err(error) if error.kind() == io::ErrorKind::NotFound => {}
        Err(source) => return Err(system(file, "read this file")(source)),
    }
    let hidden = hidden(file)?;
    File::create_new(&hidden).map_err(system(file, "write this file"))?;
    fs::remove_file(&hidden).map_err(system(&hidden, "remove this file"))
}

/// Writes a file.
///
/// # Errors
/// The system's refusal, a full disk for one; nothing is left behind then.
pub fn put_in_place(
    file: &Path,
    content: impl FnOnce(&mut BufWriter<File>) -> io::Result<()>,
) -> Result<(), OutputError> {
    let hidden = hidden(file)?;
    let written = File::create_new(&hidden).and_then(|created| {
        let mut out = BufWriter::new(created);
        content(&mut out)?;
        out.flush()?;
        out.get_ref().sync_all()?;
        fs::rename(&hidden, file)
    });
    written.map_err(|source| {
        let _ = fs::remove_file(&hidden);
        system(file, "write this file")(source)
    })
}

fn hidden(file: &Path) -> Result<PathBuf, OutputError> {
    let Some(name) = file.file_name() else {
        return Err(OutputError::Unusable {
            path: file.to_path_buf(),
            why: "names no file".to_owned(),
        });
    };
    let name = name.to_string_lossy();
    Ok(file.with_file_name(format!(".{name}.maskproof-partial-{}", std::process::id())))
}
