//! Certificate and input to an explanation, and its file.
//!
//! The input is read and extracted again under the rules of the certificate. What does not fit the
//! certificate is refused: an explanation of something else would send a designer to the wrong place.

use std::path::PathBuf;
use std::sync::Arc;

use encodings::Instance;
use thiserror::Error;

use super::error::{Blame, PipelineError};
use super::job::{Control, Stage, Watch};
use super::rules;
use super::subject::{counted, file_name};
use crate::certificate::read::{ReadError, read};
use crate::certificate::{self, Certificate, Digest, LayerRules};
use crate::explain::{
    self, ExplainError, Explanation, Heading, Layer, LayerHeading, Subject, Wanted, units, write,
};
use crate::extract::{self, Extraction};
use crate::formats::input::{self, Input, Kind};
use crate::formats::{dimacs_col, instance_json};
use crate::layout::{Layout, Rules};
use crate::report::directory::EXPLANATION;
use crate::report::single;
use crate::solve::{Bounds, Limits};

/// How an explanation begins: the mark by which an earlier one is known.
const MARK: &str = "{\"format\":\"maskproof-explanation\"";

/// What is to be explained.
#[derive(Clone, Debug, Default)]
pub struct ExplainJob {
    /// The output directory of an earlier run.
    pub dir: PathBuf,
    /// Its input.
    pub input: PathBuf,
    /// Where the explanation goes; into the directory without it.
    pub out: Option<PathBuf>,
    /// Only this place, from 1.
    pub place: Option<usize>,
    /// Worker threads; all cores without it.
    pub threads: Option<usize>,
}

impl ExplainJob {
    /// The file that is written.
    pub fn file(&self) -> PathBuf {
        let inside = || self.dir.join(EXPLANATION);
        self.out.clone().unwrap_or_else(inside)
    }

    fn certificate(&self) -> PathBuf {
        self.dir
            .join(certificate::DIRECTORY)
            .join(certificate::FILE)
    }
}

/// Why the places of a result cannot be explained.
#[derive(Debug, Error)]
pub enum ExplainRefusal {
    /// There is no certificate.
    #[error(
        "{}: holds no {}/{}: an output directory of maskproof solve, with its certificate, is needed",
        .0.display(), certificate::DIRECTORY, certificate::FILE
    )]
    NoCertificate(PathBuf),
    /// The file is no certificate.
    #[error("{}:{}:{}: {}", file.display(), error.line, error.column, error.message)]
    Malformed {
        /// The file.
        file: PathBuf,
        /// What is wrong.
        error: ReadError,
    },
    /// The input is another one.
    #[error(
        "{input}: {what}, but the certificate in {} speaks of {expected}: the input that was solved is \
         needed",
        dir.display()
    )]
    OtherInput {
        /// The input.
        input: String,
        /// What it is.
        what: String,
        /// What it would have to be.
        expected: String,
        /// The output directory.
        dir: PathBuf,
    },
    /// The certificate does not fit what is in the input.
    #[error("{}: {why}; maskproof audit tells more", file.display())]
    Mismatch {
        /// The certificate.
        file: PathBuf,
        /// What does not fit.
        why: String,
    },
    /// The explanation itself.
    #[error(transparent)]
    Explain(#[from] ExplainError),
}

impl ExplainRefusal {
    /// Who has to change something.
    pub fn blame(&self) -> Blame {
        match self {
            ExplainRefusal::Explain(ExplainError::NoPlace { .. }) => Blame::CommandLine,
            ExplainRefusal::Explain(ExplainError::Stopped) => Blame::Machine,
            _ => Blame::Input,
        }
    }
}

/// Explains the places of an earlier result, and writes the explanation.
///
/// # Errors
/// See [`PipelineError`]. Nothing is written then.
pub fn explain(
    job: &ExplainJob,
    control: &Control,
    watch: &dyn Watch,
) -> Result<Explanation, PipelineError> {
    let file = job.file();
    if !job.certificate().exists() {
        return Err(ExplainRefusal::NoCertificate(job.dir.clone()).into());
    }
    single::check_replaceable(&file, MARK, "explanation").map_err(PipelineError::Target)?;
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(job.threads.unwrap_or(0))
        .build()?;
    pool.install(|| {
        watch.enter(Stage::Read);
        let certificate = load_certificate(job)?;
        let input = input::open(&job.input)?;
        check_digest(job, &certificate, &input)?;
        let known = Known::read(job, &certificate, input, watch)?;
        watch.enter(Stage::Explain);
        let explanation = stages(job, &certificate, &known, control, watch)?;
        watch.enter(Stage::Write);
        single::put_in_place(&file, |out| write::write(&explanation, out))?;
        Ok(explanation)
    })
}

fn load_certificate(job: &ExplainJob) -> Result<Certificate, PipelineError> {
    let file = job.certificate();
    let bytes = input::load(&file, &file.display().to_string())?;
    match read(&bytes) {
        Ok((certificate, digest)) if digest == certificate.rules.sha256() => Ok(certificate),
        Ok(_) => Err(mismatch(job, "the rules are not those of its rules_sha256")),
        Err(error) => Err(ExplainRefusal::Malformed { file, error }.into()),
    }
}

fn mismatch(job: &ExplainJob, why: impl Into<String>) -> PipelineError {
    let refusal = ExplainRefusal::Mismatch {
        file: job.certificate(),
        why: why.into(),
    };
    refusal.into()
}

fn other_input(job: &ExplainJob, input: &Input, what: String, expected: String) -> PipelineError {
    let refusal = ExplainRefusal::OtherInput {
        input: input.name.clone(),
        what,
        expected,
        dir: job.dir.clone(),
    };
    refusal.into()
}

fn check_digest(
    job: &ExplainJob,
    certificate: &Certificate,
    input: &Input,
) -> Result<(), PipelineError> {
    let found = Digest::of(&input.bytes);
    if found == certificate.input {
        return Ok(());
    }
    let shown = |digest: &Digest| format!("{} bytes with SHA-256 {}", digest.bytes, digest.sha256);
    Err(other_input(
        job,
        input,
        shown(&found),
        shown(&certificate.input),
    ))
}

/// The input of a certificate as an instance.
#[allow(clippy::large_enum_variant)] // One value a run.
enum Known {
    Graph(Instance),
    Layer(Box<(Layout, Rules, Extraction)>),
}

impl Known {
    fn read(
        job: &ExplainJob,
        certificate: &Certificate,
        input: Input,
        watch: &dyn Watch,
    ) -> Result<Known, PipelineError> {
        match (&certificate.rules, input.kind) {
            (certificate::Rules::Layer(rules), Kind::Gdsii) => {
                Known::layer(job, rules, input, watch)
            }
            (certificate::Rules::Graph(rules), Kind::DimacsCol) => Ok(Known::Graph(
                dimacs_col::read(&input.bytes, &input.name, rules.masks)?,
            )),
            (certificate::Rules::Graph(rules), Kind::InstanceJson) => Ok(Known::Graph(
                instance_json::read(&*input.bytes, &input.name, Some(rules.masks))?,
            )),
            (certificate::Rules::Layer(_), _) => Err(other_input(
                job,
                &input,
                "a graph".to_owned(),
                "a layout".to_owned(),
            )),
            (certificate::Rules::Graph(_), _) => Err(other_input(
                job,
                &input,
                "a layout".to_owned(),
                "a graph".to_owned(),
            )),
        }
    }

    fn layer(
        job: &ExplainJob,
        given: &LayerRules,
        input: Input,
        watch: &dyn Watch,
    ) -> Result<Known, PipelineError> {
        let rules = given.resolve().map_err(|why| mismatch(job, why))?;
        let progress = |done, total| watch.progress(done, total, "bytes");
        let layout = rules::certified_layer(&input, &rules, &given.top, &progress)?;
        if layout.unit_pm != given.unit_pm {
            let (unit, is) = (given.unit_pm, layout.unit_pm);
            let why = format!("its database unit is {unit} pm, that of the input {is} pm");
            return Err(mismatch(job, why));
        }
        watch.enter(Stage::Extract);
        let progress = |now: extract::Progress| {
            watch.progress(now.done as u64, now.total as u64, counted(now.step));
        };
        let extraction = extract::extract(&layout, &rules, &progress);
        let extraction = extraction.map_err(|error| PipelineError::Extract {
            input: input.name,
            layer: rules.layer,
            error,
        })?;
        Ok(Known::Layer(Box::new((layout, rules, extraction))))
    }

    fn instance(&self) -> &Instance {
        match self {
            Known::Graph(instance) => instance,
            Known::Layer(layer) => &layer.2.instance,
        }
    }

    fn heading(&self, job: &ExplainJob) -> Heading {
        Heading {
            input: file_name(&job.input),
            masks: self.instance().masks(),
            layer: match self {
                Known::Graph(_) => None,
                Known::Layer(layer) => Some(LayerHeading {
                    top: layer.0.top.clone(),
                    unit_pm: layer.0.unit_pm,
                    rules: layer.1.clone(),
                }),
            },
        }
    }
}

fn stages(
    job: &ExplainJob,
    certificate: &Certificate,
    known: &Known,
    control: &Control,
    watch: &dyn Watch,
) -> Result<Explanation, PipelineError> {
    let instance = known.instance();
    check_colouring(certificate, instance).map_err(|why| mismatch(job, why))?;
    let bounds = units::bounds_of(certificate, instance)
        .map_err(|(bound, why)| mismatch(job, format!("conflict bound {bound}: {why}")))?;
    let subject = Subject {
        instance,
        layer: match known {
            Known::Graph(_) => None,
            Known::Layer(layer) => Some(Layer {
                layout: &layer.0,
                rules: &layer.1,
                extraction: &layer.2,
            }),
        },
        colouring: &certificate.colours,
    };
    let limits = Limits {
        cancel: Arc::clone(&control.cancel),
        ..Limits::default()
    };
    let wanted = Wanted {
        place: job.place,
        is_best: certificate.conflicts.is_tight(),
        stop: limits.for_piece(),
    };
    let progress = |done: usize, total: usize| watch.progress(done as u64, total as u64, "places");
    let places = explain::explain(&subject, &bounds, &wanted, &progress);
    Ok(Explanation {
        heading: known.heading(job),
        conflicts: Bounds {
            lower: certificate.conflicts.lower,
            upper: certificate.conflicts.upper,
        },
        total: bounds.len(),
        places: places.map_err(ExplainRefusal::from)?,
    })
}

/// Whether the colours are a colouring of the instance that costs what is claimed.
fn check_colouring(certificate: &Certificate, instance: &Instance) -> Result<(), String> {
    let (given, needed) = (certificate.colours.len(), instance.fragment_count());
    if given != needed {
        return Err(format!(
            "it colours {given} fragments, and the input has {needed}"
        ));
    }
    if instance.check_legal(&certificate.colours).is_err() {
        return Err("its colouring uses a mask that is not allowed".to_owned());
    }
    let (counted, claimed) = (
        instance.cost(&certificate.colours).conflicts,
        certificate.conflicts.upper,
    );
    if counted != claimed {
        return Err(format!(
            "its colouring has {counted} conflicts, not {claimed}"
        ));
    }
    Ok(())
}
