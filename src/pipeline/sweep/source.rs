//! The input of a sweep: read once, and what it is under each combination.

use std::path::Path;

use super::super::error::PipelineError;
use super::super::job::Watch;
use super::super::rules;
use super::super::subject::{Loaded, Subject, file_name};
use super::SweepJob;
use super::plan::{combinations, extracts_alike};
use crate::formats::input::{self, Input, Kind};
use crate::formats::rules::RawRules;
use crate::layout::{Policy, Rules};
use crate::report::sweep::{Setting, SweptLayer};

/// The combinations of a sweep.
pub struct Source {
    /// The name of the input, without its directories.
    pub name: String,
    /// The layer; nothing for a graph.
    pub layer: Option<SweptLayer>,
    /// K and the other rules of each combination.
    pub combinations: Vec<(u8, Option<Setting>)>,
    rules: Resolved,
}

/// The rules of each combination.
enum Resolved {
    Layer(Vec<Rules>),
    /// A file of a graph is read into an instance for each K: little beside the work that it makes.
    Graph {
        file: Input,
        raw: Vec<RawRules>,
        top: Option<String>,
    },
}

/// The input as the combination before has left it.
pub enum Held {
    /// Read, under the first combination.
    Read(Loaded),
    /// The problem of a combination.
    Extracted(usize, Subject),
}

impl Source {
    /// Reads the rules and the input, and checks the rules of every combination.
    pub fn read(job: &SweepJob, watch: &dyn Watch) -> Result<(Source, Held), PipelineError> {
        let base = match &job.rules_file {
            None => job.rules.clone(),
            Some(path) => rules::of_file(path)?.overridden_by(job.rules.clone()),
        };
        let all = combinations(&base, &job.choices);
        let first = all.first().unwrap_or(&base);
        let file = input::open(&job.input)?;
        match file.kind {
            Kind::Gdsii => read_layer(file, first, &all, job, watch),
            _ => read_graph(file, first.clone(), all, job, watch),
        }
    }

    /// The problem of combination `i`, from what the one before has left.
    pub fn subject(
        &self,
        i: usize,
        held: Held,
        watch: &dyn Watch,
    ) -> Result<Subject, PipelineError> {
        match (&self.rules, held) {
            (_, Held::Read(loaded)) => loaded.extract(watch),
            (Resolved::Layer(all), Held::Extracted(before, subject)) => {
                let (before, rules) = (&all[before], &all[i]);
                match extracts_alike(before, rules) {
                    true => subject.with_masks(rules.masks),
                    false => subject.into_loaded().under(rules).extract(watch),
                }
            }
            (Resolved::Graph { file, raw, top }, Held::Extracted(..)) => {
                Loaded::graph(file.clone(), &raw[i], top.as_deref())?.extract(watch)
            }
        }
    }
}

fn read_layer(
    file: Input,
    first: &RawRules,
    all: &[RawRules],
    job: &SweepJob,
    watch: &dyn Watch,
) -> Result<(Source, Held), PipelineError> {
    let progress = |done, total| watch.progress(done, total, "bytes");
    let top = job.top.as_deref();
    let (layout, first, all) = rules::layer_under(&file, first, all, top, &progress)?;
    let source = Source {
        name: file_name(Path::new(&file.name)),
        layer: Some(SweptLayer {
            top: layout.top.clone(),
            layer: layout.layer,
            unit_pm: layout.unit_pm,
        }),
        combinations: all.iter().map(|r| (r.masks, Some(setting(r)))).collect(),
        rules: Resolved::Layer(all),
    };
    Ok((
        source,
        Held::Read(Loaded::undrawn_layer(file, layout, first)),
    ))
}

fn read_graph(
    file: Input,
    first: RawRules,
    raw: Vec<RawRules>,
    job: &SweepJob,
    watch: &dyn Watch,
) -> Result<(Source, Held), PipelineError> {
    let load = |raw: &RawRules| Loaded::graph(file.clone(), raw, job.top.as_deref());
    let mut combinations = Vec::with_capacity(raw.len());
    for raw in &raw {
        let subject = load(raw)?.extract(watch)?;
        combinations.push((subject.instance().masks(), None));
    }
    let held = Held::Read(load(&first)?);
    let source = Source {
        name: file_name(Path::new(&file.name)),
        layer: None,
        combinations,
        rules: Resolved::Graph {
            raw,
            top: job.top.clone(),
            file,
        },
    };
    Ok((source, held))
}

fn setting(rules: &Rules) -> Setting {
    let stitch = &rules.stitch;
    let lengths = [stitch.overlap, stitch.fragment_length];
    Setting {
        spacing: rules.spacing,
        policy: stitch.policy,
        stitch: (stitch.policy != Policy::None).then_some(lengths),
    }
}
