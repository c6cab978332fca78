//! The order of an audit: certificate, input, problem, check. It reads the certificate, its proofs, the input
//! and the rules named, and nothing else.

use std::fs::{self, File};
use std::io::{self, BufRead, BufReader};
use std::path::{Path, PathBuf};

use super::error::PipelineError;
use super::rules;
use crate::audit::{self, Fault, Malformed, Problem, Proofs, Rejection, Step, Theorem, Verdict};
use crate::certificate::{self, Certificate, Digest, LayerRules, Rules};
use crate::formats::input::{self, Input, Kind};
use crate::formats::rules::RawRules;
use crate::formats::{FormatError, dimacs_col, instance_json};
use crate::layout::Layout;

/// What is to be audited.
#[derive(Clone, Debug, Default)]
pub struct AuditJob {
    /// An output directory of `solve`, or the directory of a certificate.
    pub directory: PathBuf,
    /// The input that it speaks of.
    pub input: PathBuf,
    /// Rules that the certificate must have been made under; any without it.
    pub rules_file: Option<PathBuf>,
    /// Worker threads; all cores without it.
    pub threads: Option<usize>,
}

/// Audits a certificate.
///
/// # Errors
/// The input or the rules cannot be read. What is wrong with the certificate is a verdict.
pub fn audit(job: &AuditJob) -> Result<Verdict, PipelineError> {
    let threads = job.threads.unwrap_or(0);
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()?;
    pool.install(|| Ok(examine(job)?.0))
}

/// What a verdict is about, where it came as far.
pub(super) struct Examined {
    pub(super) problem: Problem,
    pub(super) certificate: Certificate,
    pub(super) directory: Directory,
}

/// Audits a certificate; what was accepted comes with the verdict.
pub(super) fn examine(job: &AuditJob) -> Result<(Verdict, Option<Examined>), PipelineError> {
    let directory = Directory::new(&job.directory);
    let (certificate, rules_sha256) = match directory.certificate() {
        Ok(read) => read,
        Err(malformed) => return Ok((Verdict::Malformed(malformed), None)),
    };
    let input = input::open(&job.input)?;
    let raw = job.rules_file.as_deref().map(rules::of_file).transpose()?;
    let subject = Subject {
        input: &input,
        rules: raw.as_ref(),
        rules_sha256: &rules_sha256,
    };
    let problem = match subject.problem(&certificate)? {
        Err(rejection) => return Ok((Verdict::Rejected(rejection), None)),
        Ok(problem) => problem,
    };
    let verdict = verdict(&problem, &certificate, &directory);
    let examined = matches!(verdict, Verdict::Accepted(_)).then_some(Examined {
        problem,
        certificate,
        directory,
    });
    Ok((verdict, examined))
}

/// The verdict on a certificate about a problem.
pub(super) fn verdict(
    problem: &Problem,
    certificate: &Certificate,
    proofs: &dyn Proofs,
) -> Verdict {
    match audit::check(problem, certificate, proofs) {
        Ok(tally) => Verdict::Accepted(Box::new(Theorem::new(problem, certificate, tally))),
        Err(Fault::Rejected(rejection)) => Verdict::Rejected(rejection),
        Err(Fault::Malformed(malformed)) => Verdict::Malformed(malformed),
    }
}

/// The directory of a certificate.
pub(super) struct Directory {
    path: PathBuf,
}

impl Directory {
    fn new(given: &Path) -> Directory {
        let inner = given.join(certificate::DIRECTORY);
        let is_certificate = !inner.is_dir() && given.join(certificate::FILE).is_file();
        Directory {
            path: if is_certificate {
                given.to_path_buf()
            } else {
                inner
            },
        }
    }

    fn certificate(&self) -> Result<(Certificate, String), Malformed> {
        let path = self.path.join(certificate::FILE);
        let malformed = |line, message| Malformed {
            file: certificate::FILE.to_owned(),
            line,
            message,
        };
        let bytes = fs::read(&path).map_err(|error| malformed(0, error.to_string()))?;
        certificate::read::read(&bytes).map_err(|error| {
            malformed(
                error.line,
                format!("column {}: {}", error.column, error.message),
            )
        })
    }
}

impl Proofs for Directory {
    fn open(&self, name: &str) -> io::Result<Box<dyn BufRead + '_>> {
        let path = self.path.join(certificate::PROOFS).join(name);
        Ok(Box::new(BufReader::with_capacity(
            1 << 16,
            File::open(path)?,
        )))
    }
}

/// What a certificate is held against.
pub(super) struct Subject<'a> {
    pub(super) input: &'a Input,
    /// Rules that it must have been made under.
    pub(super) rules: Option<&'a RawRules>,
    /// The digest of its rules as it states it.
    pub(super) rules_sha256: &'a str,
}

impl Subject<'_> {
    /// The problem of the input under the certificate's rules, where both are what they are said to be.
    pub(super) fn problem(
        &self,
        certificate: &Certificate,
    ) -> Result<Result<Problem, Rejection>, PipelineError> {
        let found = Digest::of(&self.input.bytes);
        if found != certificate.input {
            let Digest { sha256, bytes } = &certificate.input;
            let reason = format!(
                "{} has {} bytes of SHA-256 {}; the certificate is for {bytes} bytes of {sha256}",
                self.input.name, found.bytes, found.sha256
            );
            return Ok(Err(Rejection::new(Step::Input, reason)));
        }
        if certificate.rules.sha256() != self.rules_sha256 {
            let reason = "the digest of the rules is not that of the rules that are listed";
            return Ok(Err(Rejection::new(Step::Rules, reason)));
        }
        match (&certificate.rules, self.input.kind) {
            (Rules::Layer(rules), Kind::Gdsii) => self.layer(rules, certificate),
            (Rules::Graph(_), Kind::DimacsCol | Kind::InstanceJson) => self.graph(certificate),
            _ => {
                let reason = "rules of a layer for a graph, or of a graph for a layout";
                Ok(Err(Rejection::new(Step::Rules, reason)))
            }
        }
    }

    fn graph(
        &self,
        certificate: &Certificate,
    ) -> Result<Result<Problem, Rejection>, PipelineError> {
        let masks = certificate.rules.masks();
        let reject = |reason: String| Ok(Err(Rejection::new(Step::Rules, reason)));
        if let Some(raw) = self.rules
            && let Some(given) = raw.masks()?
            && given != masks
        {
            return reject(format!("{masks} masks; the rules given have {given}"));
        }
        if !certificate.features.is_empty() || !certificate.split.is_empty() {
            let reason = "features listed for a graph, which has its own numbering";
            return Ok(Err(Rejection::new(Step::Features, reason)));
        }
        let Input { bytes, name, kind } = self.input;
        let instance = match kind {
            Kind::DimacsCol => dimacs_col::read(bytes, name, masks),
            _ => instance_json::read(&**bytes, name, Some(masks)),
        };
        match instance {
            Ok(instance) => Ok(Ok(audit::graph::derive(&instance))),
            // A file that can be read, but not with this number of masks.
            Err(error)
                if *kind == Kind::InstanceJson
                    && instance_json::read(&**bytes, name, None).is_ok() =>
            {
                reject(error.to_string())
            }
            Err(error) => Err(error.into()),
        }
    }

    fn layer(
        &self,
        rules: &LayerRules,
        certificate: &Certificate,
    ) -> Result<Result<Problem, Rejection>, PipelineError> {
        let reject = |reason: String| Ok(Err(Rejection::new(Step::Rules, reason)));
        let resolved = match rules.resolve() {
            Ok(resolved) => resolved,
            Err(reason) => return reject(reason),
        };
        let layout = rules::certified_layer(self.input, &resolved, &rules.top, &|_, _| {})?;
        if layout.unit_pm != rules.unit_pm {
            let reason = format!(
                "units of {} pm; the input has {} pm",
                rules.unit_pm, layout.unit_pm
            );
            return reject(reason);
        }
        if let Some(raw) = self.rules
            && let Some(reason) = self.difference(&certificate.rules, raw, &layout)?
        {
            return reject(reason);
        }
        Ok(audit::layer::derive(&layout, &resolved, certificate))
    }

    /// What the rules given say otherwise than those of the certificate.
    fn difference(
        &self,
        rules: &Rules,
        raw: &RawRules,
        layout: &Layout,
    ) -> Result<Option<String>, FormatError> {
        let given = rules::on_grid_of(layout, self.input, raw)?;
        let policy = given.stitch.policy.name();
        let given = Rules::of_layer(&given, policy, &layout.top, layout.unit_pm);
        let listed = |rules: &Rules| serde_json::to_string(rules).unwrap_or_default();
        let (ours, theirs) = (listed(rules), listed(&given));
        Ok((ours != theirs).then(|| format!("{ours}; the rules given say {theirs}")))
    }
}
