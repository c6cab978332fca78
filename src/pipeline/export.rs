//! The order of an export: the audit first, then the files.

use std::io::{self, BufRead, BufWriter, Write};
use std::path::PathBuf;

use encodings::{Instance, InstanceBuilder, InstanceError, MaskSet};

use super::audit::{AuditJob, Directory, Examined, examine};
use super::error::PipelineError;
use super::job::Control;
use crate::audit::problem::{Stitch, Tie};
use crate::audit::{Problem, Proofs, Theorem, Verdict};
use crate::certify::ProofStore;
use crate::certify::export::{Kept, Subject};
use crate::report::directory::Target;
use crate::report::draft::Draft;

pub use crate::certify::export::Format;

/// What is to be exported, and how.
#[derive(Clone, Debug)]
pub struct ExportJob {
    /// The certificate, its input and its rules.
    pub audit: AuditJob,
    /// As what.
    pub format: Format,
    /// Where the files go: a new or empty directory.
    pub out: PathBuf,
}

/// What came of it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Exported {
    /// The files are there.
    Written {
        /// What the certificate proves.
        theorem: Box<Theorem>,
        /// How many bounds were exported.
        bounds: usize,
    },
    /// The audit does not accept the certificate. Nothing was written.
    Refused(Verdict),
}

/// Audits a certificate and writes it in another format.
///
/// # Errors
/// Input or rules cannot be read, or the files cannot be written. What is wrong with the certificate is a verdict.
pub fn export(job: &ExportJob, control: &Control) -> Result<Exported, PipelineError> {
    let target = Target::check_new(&job.out).map_err(PipelineError::Target)?;
    let threads = job.audit.threads.unwrap_or(0);
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()?;
    pool.install(|| match examine(&job.audit)? {
        (Verdict::Accepted(theorem), Some(examined)) => {
            let draft = target.draft(&control.abandon)?;
            let bounds = write(&examined, job.format, &draft)?;
            draft.commit()?;
            Ok(Exported::Written { theorem, bounds })
        }
        (verdict, _) => Ok(Exported::Refused(verdict)),
    })
}

fn write(examined: &Examined, format: Format, draft: &Draft) -> Result<usize, PipelineError> {
    let instance = instance(&examined.problem).map_err(PipelineError::Problem)?;
    let subject = Subject {
        instance: &instance,
        certificate: &examined.certificate,
        kept: &examined.directory,
    };
    let bounds = crate::certify::export::export(&subject, format, &Files(draft))?;
    Ok(bounds)
}

impl Kept for Directory {
    fn open(&self, name: &str) -> io::Result<Box<dyn BufRead + '_>> {
        Proofs::open(self, name)
    }
}

/// The files of an export.
struct Files<'a>(&'a Draft);

impl ProofStore for Files<'_> {
    fn put(
        &self,
        name: &str,
        content: &dyn Fn(&mut dyn Write) -> io::Result<()>,
    ) -> io::Result<()> {
        let write = |out: &mut BufWriter<_>| content(out);
        self.0.write(name, write).map_err(io::Error::other)
    }
}

/// The problem that the audit derived as an instance, in the same numbers. Areas are no part of it.
fn instance(problem: &Problem) -> Result<Instance, InstanceError> {
    let mut builder = InstanceBuilder::new(problem.masks);
    for feature in 0..problem.feature_count() as u32 {
        builder.feature(problem.fragments_of(feature).len() as u32);
    }
    for (fragment, &masks) in (0..).zip(&problem.allowed) {
        builder.allow(fragment, MaskSet::from_bits(masks));
    }
    let features = |&[a, b]: &[u32; 2]| [problem.feature_of(a), problem.feature_of(b)];
    let mut close = problem.close.clone();
    close.sort_by_cached_key(features);
    for unit in close.chunk_by(|one, other| features(one) == features(other)) {
        match features(&unit[0]) {
            [f, g] if f == g => unit.iter().for_each(|&[a, b]| builder.self_spacing(a, b)),
            _ => builder.pair(unit.iter().copied()),
        }
    }
    for stitch in &problem.stitches {
        builder.stitch(stitch.ends[0], stitch.ends[1], stitch.weight);
    }
    for tie in &problem.ties {
        builder.tie(match tie {
            Tie::Same(ends) => encodings::Tie::Same(*ends),
            Tie::Different(ends) => encodings::Tie::Different(*ends),
            Tie::AtMost { most, stitches } => encodings::Tie::AtMost {
                most: u32::try_from(*most).unwrap_or(u32::MAX),
                stitches: (stitches.iter())
                    .map(
                        |&Stitch {
                             ends: [a, b],
                             weight,
                         }| encodings::Stitch { a, b, weight },
                    )
                    .collect(),
            },
        });
    }
    builder.build()
}
