//! The certificate back from JSON.
//!
//! Only the form is looked at: members and their types, the version, digits within K. Memory is
//! proportional to the file, whatever numbers stand in it.

use serde::Deserialize;
use serde::de::Error as _;
use thiserror::Error;

use encodings::masks::MAX_MASKS;

use super::write::FORMAT;
use super::{
    Certificate, Claim, ConflictBound, Digest, Evidence, Rules, SplitFeature, StitchBound, VERSION,
    is_proof_name,
};

/// Why bytes are no certificate.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
#[error("line {line}, column {column}: {message}")]
pub struct ReadError {
    /// The line, from 1.
    pub line: u64,
    /// The column, from 1.
    pub column: u64,
    /// What is wrong and what would be right.
    pub message: String,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Members {
    #[serde(deserialize_with = "format")]
    #[serde(rename = "format")]
    _format: (),
    #[serde(deserialize_with = "version")]
    #[serde(rename = "version")]
    _version: (),
    input: Digest,
    rules: Rules,
    rules_sha256: String,
    conflicts: Claim,
    stitches: Claim,
    features: Vec<[i32; 2]>,
    split: Vec<SplitFeature>,
    colours: Colours,
    conflict_bounds: Vec<ConflictBound>,
    stitch_bounds: Vec<StitchBound>,
}

/// Reads a certificate, and the digest of its rules as it is written there.
///
/// # Errors
/// Line and column of what has not the form of `format.md`.
pub fn read(bytes: &[u8]) -> Result<(Certificate, String), ReadError> {
    let members: Members = serde_json::from_slice(bytes).map_err(of_json)?;
    let masks = members.rules.masks();
    if masks == 0 || masks > MAX_MASKS {
        return Err(at(
            bytes,
            "\"rules\"",
            format!("{masks} masks: 1 to {MAX_MASKS} are possible"),
        ));
    }
    let Colours(colours) = members.colours;
    if let Some(mask) = colours.iter().find(|&&mask| mask >= masks) {
        let message = format!("mask {} of {masks} masks", mask + 1);
        return Err(at(bytes, "\"colours\"", message));
    }
    let bounds = members.conflict_bounds.iter().map(|bound| &bound.by);
    let evidence = bounds.chain(members.stitch_bounds.iter().map(|bound| &bound.by));
    for by in evidence {
        if let Evidence::Proof { proof, .. } = by
            && !is_proof_name(proof)
        {
            let message = format!("{proof:?} is no name of a proof");
            let written = serde_json::to_string(proof).unwrap_or_default();
            return Err(at(bytes, &written, message));
        }
    }
    let certificate = Certificate {
        input: members.input,
        rules: members.rules,
        conflicts: members.conflicts,
        stitches: members.stitches,
        features: members.features,
        split: members.split,
        colours,
        conflict_bounds: members.conflict_bounds,
        stitch_bounds: members.stitch_bounds,
    };
    Ok((certificate, members.rules_sha256))
}

fn of_json(error: serde_json::Error) -> ReadError {
    let text = error.to_string();
    let place = format!(" at line {} column {}", error.line(), error.column());
    ReadError {
        line: error.line() as u64,
        column: error.column() as u64,
        message: text.strip_suffix(&place).unwrap_or(&text).to_owned(),
    }
}

/// An error where `text` first stands.
fn at(bytes: &[u8], text: &str, message: String) -> ReadError {
    let found = bytes
        .windows(text.len().max(1))
        .position(|window| window == text.as_bytes());
    let before = &bytes[..found.unwrap_or(0)];
    let line_start = before
        .iter()
        .rposition(|&byte| byte == b'\n')
        .map_or(0, |end| end + 1);
    ReadError {
        line: before.iter().filter(|&&byte| byte == b'\n').count() as u64 + 1,
        column: (before.len() - line_start) as u64 + 1,
        message,
    }
}

fn format<'de, D: serde::Deserializer<'de>>(deserializer: D) -> Result<(), D::Error> {
    let format = String::deserialize(deserializer)?;
    if format == FORMAT {
        return Ok(());
    }
    Err(D::Error::custom(format_args!(
        "format {format:?}: {FORMAT:?} is read"
    )))
}

fn version<'de, D: serde::Deserializer<'de>>(deserializer: D) -> Result<(), D::Error> {
    let version = u32::deserialize(deserializer)?;
    if version == VERSION {
        return Ok(());
    }
    Err(D::Error::custom(format_args!(
        "version {version}: {VERSION} is read"
    )))
}

/// Masks from 0, written as digits from 1.
struct Colours(Vec<u8>);

impl<'de> Deserialize<'de> for Colours {
    fn deserialize<D: serde::Deserializer<'de>>(deserializer: D) -> Result<Colours, D::Error> {
        let digits = String::deserialize(deserializer)?;
        let masks = digits.bytes().map(|digit| match digit {
            b'1'..=b'8' => Ok(digit - b'1'),
            _ => Err(D::Error::custom(
                "colours are a string of the digits 1 to K",
            )),
        });
        masks.collect::<Result<Vec<u8>, _>>().map(Colours)
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::super::{Cut, Enumeration, write};
    use super::*;

    fn sample() -> Certificate {
        Certificate {
            input: Digest::of(b"abc"),
            rules: Rules::of_graph(3),
            conflicts: Claim { lower: 1, upper: 1 },
            stitches: Claim { lower: 2, upper: 2 },
            features: vec![[-5, 7], [0, 0]],
            split: vec![SplitFeature {
                feature: 1,
                fragments: 2,
                cuts: vec![Cut {
                    line: [10, 0, 10, 5],
                    sides: [0, 1],
                }],
            }],
            colours: vec![0, 2, 1],
            conflict_bounds: vec![ConflictBound {
                limit: 1,
                units: vec![vec![[0, 1], [0, 2]]],
                with: Vec::new(),
                by: Evidence::Enumeration(Enumeration::Enumeration),
            }],
            stitch_bounds: vec![
                StitchBound {
                    limit: 2,
                    units: vec![[1, 2]],
                    resolved: Vec::new(),
                    met: vec![0],
                    with: Vec::new(),
                    by: Evidence::Proof {
                        proof: "s-1.lrat".to_owned(),
                        precedence: vec![0, 1],
                    },
                },
                StitchBound {
                    limit: 2,
                    units: vec![[1, 2]],
                    resolved: vec![vec![[0, 1]]],
                    met: Vec::new(),
                    with: Vec::new(),
                    by: Evidence::Cycle {
                        cycle: vec![0, 1, 2],
                    },
                },
            ],
        }
    }

    fn text(certificate: &Certificate) -> String {
        let mut out = Vec::new();
        write::write(certificate, &mut out).unwrap();
        String::from_utf8(out).unwrap()
    }

    #[test]
    fn what_is_written_is_read() {
        let certificate = sample();
        let (read, digest) = read(text(&certificate).as_bytes()).unwrap();
        assert_eq!(read, certificate);
        assert_eq!(digest, certificate.rules.sha256());
    }

    #[test]
    fn what_has_not_the_form_is_refused_with_its_line() {
        let text = text(&sample());
        let refused = |old: &str, new: &str| {
            assert!(text.contains(old), "{old}");
            read(text.replacen(old, new, 1).as_bytes()).unwrap_err()
        };
        assert_eq!(refused("\"version\":1", "\"version\":2").line, 2);
        assert_eq!(
            refused("\"colours\":\"132\"", "\"colours\":\"142\"").message,
            "mask 4 of 3 masks"
        );
        assert_eq!(
            refused("\"colours\":\"132\"", "\"colours\":\"102\"").line,
            13
        );
        assert_eq!(refused("s-1.lrat", "../../x").line, 17);
        assert_eq!(refused("\"upper\":1", "\"upper\":-1").line, 6);
        assert_eq!(
            refused("\"upper\":1", "\"upper\":18446744073709551616").line,
            6
        );
        assert_eq!(
            refused("\"masks\":3", "\"masks\":9").message,
            "9 masks: 1 to 8 are possible"
        );
        assert_eq!(refused("\"met\"", "\"mett\"").line, 17);
        assert_eq!(
            read(&text.as_bytes()[..text.len() / 2])
                .unwrap_err()
                .message,
            "EOF while parsing a string"
        );
    }
}
