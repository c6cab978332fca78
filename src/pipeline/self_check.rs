//! The feature `self-check`: every result is certified in memory and audited before it is given.

use super::error::PipelineError;
use super::subject::Subject;
use crate::audit;
use crate::certify::{self, Effort, InMemory};
use crate::report::Report;
use crate::solve::Limits;

/// Certifies and audits a result.
///
/// # Errors
/// The audit does not accept the certificate, or it claims more than was found.
pub fn check(
    subject: &Subject,
    solved: &certify::Subject<'_>,
    limits: &Limits,
    report: &Report,
) -> Result<(), PipelineError> {
    let store = InMemory::default();
    let facts = subject.certificate_facts();
    let stop = limits.for_run();
    let certified = certify::certify(facts, solved, &store, Effort::USUAL, &stop, &|_, _| ())?;
    let certificate = certified.certificate;
    let failed = |reason: String| PipelineError::SelfCheck(reason);
    let problem = subject
        .audited_problem(&certificate)
        .map_err(|rejection| failed(rejection.to_string()))?;
    audit::check(&problem, &certificate, &store.into_proofs())
        .map_err(|fault| failed(format!("{fault:?}")))?;
    let claims = [
        (report.conflicts, certificate.conflicts),
        (report.stitches, certificate.stitches),
    ];
    for (found, certified) in claims {
        // Less may be certified than was found, where a proof is too dear; never more.
        if certified.lower > found.lower || certified.upper != found.upper {
            return Err(failed(format!(
                "{found:?} was found, {certified:?} is certified"
            )));
        }
    }
    Ok(())
}
