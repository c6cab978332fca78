//! The certificate as JSON: one bound a line, written as it goes.

use std::io::{self, Write};

use super::{Certificate, VERSION};
use crate::formats::document::Document;

/// How a certificate begins.
pub const FORMAT: &str = "maskproof-certificate";

/// Writes a certificate: the same one gives the same bytes.
///
/// # Errors
/// Those of the writer. It should be buffered.
pub fn write(certificate: &Certificate, out: &mut impl Write) -> io::Result<()> {
    let mut document = Document::open(out)?;
    document.member("format", FORMAT)?;
    document.member("version", VERSION)?;
    document.member("input", &certificate.input)?;
    document.member("rules", &certificate.rules)?;
    document.member("rules_sha256", certificate.rules.sha256())?;
    document.member("conflicts", certificate.conflicts)?;
    document.member("stitches", certificate.stitches)?;
    document.list("features", &certificate.features)?;
    document.list("split", &certificate.split)?;
    let digits = certificate
        .colours
        .iter()
        .map(|&mask| (b'1' + mask) as char);
    document.member("colours", digits.collect::<String>())?;
    document.list("conflict_bounds", &certificate.conflict_bounds)?;
    document.list("stitch_bounds", &certificate.stitch_bounds)?;
    document.close()
}
