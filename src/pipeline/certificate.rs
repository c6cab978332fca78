//! The certificate of a run: made, written into the draft, and what it proves taken into the report.

use std::io::{self, BufWriter, Write};

use super::error::PipelineError;
use super::job::Watch;
use crate::certificate::{DIRECTORY, FILE, PROOFS, write};
use crate::certify::{self, Certified, Effort, Facts, ProofStore, Subject};
use crate::report::Report;
use crate::report::draft::Draft;
use crate::solve::{Bounds, Limits};

/// Certifies what was solved, and writes the certificate.
pub fn make(
    facts: Facts,
    solved: &Subject<'_>,
    draft: &Draft,
    limits: &Limits,
    watch: &dyn Watch,
) -> Result<Certified, PipelineError> {
    draft.add_directory(DIRECTORY)?;
    draft.add_directory(&format!("{DIRECTORY}/{PROOFS}"))?;
    // The limit of a piece is over: the stop sign is that of the whole run.
    let stop = limits.for_run();
    let progress = |done: usize, total: usize| watch.progress(done as u64, total as u64, "bounds");
    let certified = certify::certify(
        facts,
        solved,
        &Files(draft),
        Effort::USUAL,
        &stop,
        &progress,
    )?;
    draft.write(&format!("{DIRECTORY}/{FILE}"), |out| {
        write::write(&certified.certificate, out)
    })?;
    Ok(certified)
}

/// Proofs as files of the draft.
struct Files<'a>(&'a Draft);

impl ProofStore for Files<'_> {
    fn put(
        &self,
        name: &str,
        content: &dyn Fn(&mut dyn Write) -> io::Result<()>,
    ) -> io::Result<()> {
        let path = format!("{DIRECTORY}/{PROOFS}/{name}");
        let write = |out: &mut BufWriter<_>| content(out);
        self.0.write(&path, write).map_err(io::Error::other)
    }
}

/// The report claims what the certificate proves, and no more.
pub fn keep_to(certified: &Certified, report: &mut Report) {
    let certificate = &certified.certificate;
    let bounds = |lower, upper| Bounds { lower, upper };
    let (conflicts, stitches) = (certificate.conflicts, certificate.stitches);
    report.conflicts = bounds(conflicts.lower, conflicts.upper);
    report.stitches = bounds(stitches.lower, stitches.upper);
    for (row, &[conflicts, stitches]) in report.pieces.iter_mut().zip(&certified.pieces) {
        row.conflicts.lower = conflicts;
        row.stitches.lower = stitches;
    }
}
