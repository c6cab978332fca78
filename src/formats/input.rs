//! Input files: unpacked where they are gzip, and told apart by their content first, then their name.

use super::error::{FormatError, Position, Problem};
use std::fs::File;
use std::io::{BufReader, Read};
use std::path::Path;

/// The most bytes that a packed file may unpack to.
pub const MAX_UNPACKED: u64 = 1 << 34;

/// The most bytes that a packed file of `size` bytes may unpack to: 256 times as many, but 1 GiB in any
/// case and [`MAX_UNPACKED`] at most. Layouts pack some ten to one; deflate reaches a thousand to one, so
/// that a hostile file of some megabytes could ask for all memory.
fn unpacked_limit(size: u64) -> u64 {
    size.saturating_mul(256).clamp(1 << 30, MAX_UNPACKED)
}

/// How a gzip file begins (RFC 1952).
const GZIP: [u8; 2] = [0x1f, 0x8b];

/// What is read.
const READ: &str = "GDSII (.gds, .gds.gz), DIMACS graphs (.col) and instance JSON (.json) are read";

/// A format of an input.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// A GDSII stream.
    Gdsii,
    /// A DIMACS `.col` graph.
    DimacsCol,
    /// An instance in JSON.
    InstanceJson,
}

/// An input file in memory.
#[derive(Clone, Debug)]
pub struct Input {
    /// Its name as the user gave it, for errors.
    pub name: String,
    /// Its format.
    pub kind: Kind,
    /// Its content, unpacked.
    pub bytes: Vec<u8>,
}

/// Reads a file whole, unpacks it if it is gzip (whatever its name), and tells its format.
///
/// # Errors
/// The file cannot be read or unpacked whole, is empty, or is of no format that is read.
pub fn open(path: &Path) -> Result<Input, FormatError> {
    let name = path.display().to_string();
    let bytes = load(path, &name)?;
    let kind = kind(&name, &bytes)?;
    Ok(Input { name, kind, bytes })
}

/// Reads a file whole and unpacks it if it is gzip.
///
/// # Errors
/// The file cannot be read, or is a packed file that ends early, is damaged, or unpacks to absurdly
/// many bytes (256 times its size and more than 1 GiB, or more than [`MAX_UNPACKED`]).
pub fn load(path: &Path, name: &str) -> Result<Vec<u8>, FormatError> {
    let failed = |error: std::io::Error| FormatError::new(Position::file(name), error);
    let file = File::open(path).map_err(failed)?;
    let size = file.metadata().map_err(failed)?.len();
    let mut reader = BufReader::with_capacity(1 << 16, file);
    let start = std::io::BufRead::fill_buf(&mut reader).map_err(failed)?;
    if start.starts_with(&GZIP) {
        return unpack(reader, name, unpacked_limit(size));
    }
    let mut bytes = Vec::with_capacity(usize::try_from(size).unwrap_or(0).min(1 << 32));
    reader.read_to_end(&mut bytes).map_err(failed)?;
    Ok(bytes)
}

/// Unpacks a gzip file of one member or several.
fn unpack(reader: impl std::io::BufRead, name: &str, limit: u64) -> Result<Vec<u8>, FormatError> {
    let mut bytes = Vec::new();
    let mut unpacked = flate2::bufread::MultiGzDecoder::new(reader).take(limit + 1);
    let result = unpacked.read_to_end(&mut bytes);
    let after = format!("after {} unpacked bytes", bytes.len());
    let problem = match result {
        Ok(_) if bytes.len() as u64 <= limit => return Ok(bytes),
        Ok(_) => format!("gzip file unpacks to more than {limit} bytes: at most these are read"),
        Err(error) if error.kind() == std::io::ErrorKind::UnexpectedEof => {
            format!("gzip file ends early, {after}: it must be copied whole")
        }
        Err(error) => format!("gzip file is damaged {after} ({error}): it must be packed anew"),
    };
    Err(FormatError::new(
        Position::file(name),
        Problem::Gzip(problem),
    ))
}

/// Tells the format of unpacked bytes.
fn kind(name: &str, bytes: &[u8]) -> Result<Kind, FormatError> {
    let unknown = |what: String| FormatError::new(Position::byte(name, 0), Problem::Unknown(what));
    if bytes.is_empty() {
        return Err(unknown(format!("the file is empty: {READ}")));
    }
    if bytes.starts_with(&super::gdsii::SIGNATURE) {
        return Ok(Kind::Gdsii);
    }
    let lower = name.to_ascii_lowercase();
    let plain = lower.strip_suffix(".gz").unwrap_or(&lower);
    match plain.rsplit('.').next() {
        Some("json") => return Ok(Kind::InstanceJson),
        Some("col") => return Ok(Kind::DimacsCol),
        Some("gds" | "gds2" | "gdsii") => {
            let start: Vec<String> = bytes.iter().take(4).map(|b| format!("{b:02x}")).collect();
            let start = start.join(" ");
            return Err(unknown(format!(
                "the file starts with {start}: a GDSII stream starts with 00 06 00 02"
            )));
        }
        _ => {}
    }
    let text = bytes.trim_ascii_start();
    let line = text
        .split(|&byte| byte == b'\n')
        .find(|line| !is_comment(line));
    if text.starts_with(b"{") {
        Ok(Kind::InstanceJson)
    } else if line.is_some_and(|line| line.starts_with(b"p edge") || line.starts_with(b"p col")) {
        Ok(Kind::DimacsCol)
    } else {
        Err(unknown(format!("the file is of no known format: {READ}")))
    }
}

fn is_comment(line: &[u8]) -> bool {
    line.trim_ascii().is_empty() || line.starts_with(b"c ") || line.trim_ascii() == b"c"
}

#[cfg(test)]
#[allow(clippy::unwrap_used, clippy::expect_used)]
mod tests {
    use super::*;
    use flate2::Compression;
    use flate2::write::GzEncoder;
    use std::io::Write;

    fn packed(bytes: &[u8]) -> Vec<u8> {
        let mut encoder = GzEncoder::new(Vec::new(), Compression::fast());
        encoder.write_all(bytes).unwrap();
        encoder.finish().unwrap()
    }

    fn open_bytes(name: &str, bytes: &[u8]) -> Result<Input, FormatError> {
        let directory = tempfile::tempdir().unwrap();
        let path = directory.path().join(name);
        std::fs::write(&path, bytes).unwrap();
        open(&path)
    }

    #[test]
    fn formats_are_told_by_content() {
        let header = [0, 6, 0, 2, 2, 88];
        for name in ["a.gds", "a.gds.gz", "a", "a.json"] {
            assert_eq!(open_bytes(name, &header).unwrap().kind, Kind::Gdsii);
            let input = open_bytes(name, &packed(&header)).unwrap();
            assert_eq!((input.kind, input.bytes), (Kind::Gdsii, header.to_vec()));
        }
        assert_eq!(
            open_bytes("a.col", b"nonsense").unwrap().kind,
            Kind::DimacsCol
        );
        assert_eq!(
            open_bytes("a", b"c x\n\np edge 1 0\n").unwrap().kind,
            Kind::DimacsCol
        );
        assert_eq!(
            open_bytes("a.json", b"nonsense").unwrap().kind,
            Kind::InstanceJson
        );
        assert_eq!(
            open_bytes("a", b" {\"format\"").unwrap().kind,
            Kind::InstanceJson
        );
    }

    #[test]
    fn unknown_files_are_refused() {
        let error = |name: &str, bytes: &[u8]| open_bytes(name, bytes).unwrap_err().to_string();
        assert!(error("a.gds", b"").contains("the file is empty"));
        assert!(error("a.gds", b"abc").contains("starts with 61 62 63: a GDSII stream"));
        assert!(error("a.txt", b"hello").contains("no known format: GDSII (.gds"));
        let missing = open(Path::new("no/such/file.gds")).unwrap_err().to_string();
        assert!(missing.starts_with("no/such/file.gds: "), "{missing}");
    }

    #[test]
    fn packed_files_are_unpacked_whole_or_refused() {
        let bytes: Vec<u8> = (0..100_000u32).flat_map(u32::to_be_bytes).collect();
        let whole = packed(&bytes);
        assert_eq!(unpack(&whole[..], "x", 1 << 20).unwrap(), bytes);
        let two = [packed(&bytes[..1000]), packed(&bytes[1000..])].concat();
        assert_eq!(unpack(&two[..], "x", 1 << 20).unwrap(), bytes);
        for cut in [3, 12, 100, whole.len() / 2, whole.len() - 1] {
            let error = unpack(&whole[..cut], "x", 1 << 20).unwrap_err().to_string();
            assert!(error.contains("ends early"), "{error}");
        }
        let mut damaged = whole.clone();
        let middle = damaged.len() / 2;
        damaged[middle] ^= 0xff;
        assert!(unpack(&damaged[..], "x", 1 << 20).is_err());
        let bomb = packed(&vec![0; 1 << 20]);
        let error = unpack(&bomb[..], "x", 1000).unwrap_err().to_string();
        assert!(error.contains("more than 1000 bytes"));
    }
}
