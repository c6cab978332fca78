//! What is solved: a layer of a layout, or an abstract graph.

use std::io::{self, Write};
use std::path::Path;

use encodings::{Instance, Mask};

use super::error::PipelineError;
use super::job::{Job, Watch};
use super::rules;
use crate::certificate::{self, Digest};
use crate::certify;
use crate::extract::policy::Beyond;
use crate::extract::{self, ExtractError, Extraction};
use crate::formats::gdsii::coloured::Plan;
use crate::formats::input::{self, Input, Kind};
use crate::formats::rules::{RawRules, drawn_layers};
use crate::formats::{FormatError, Position, colouring_json, dimacs_col, instance_json};
use crate::geometry::{Point, Rect};
use crate::layout::fragments::Drawing;
use crate::layout::{LayerId, Layout, Rules, Shape};
use crate::report::LayerFacts;
use crate::report::assemble::{self, Facts, Nowhere};
use crate::report::directory::{COLOURED, COLOURING, OutputError};
use crate::report::draft::Draft;

/// An input that is read, but not yet an instance.
pub enum Loaded {
    /// A layer.
    Layer(Box<Layer>),
    /// A graph.
    Graph(Box<Graph>),
}

/// An input as an instance.
pub enum Subject {
    /// A layer.
    Layer(Box<Layer>, Box<Extraction>),
    /// A graph.
    Graph(Box<Graph>),
}

/// A layer as read.
pub struct Layer {
    pub(super) input: Input,
    pub(super) layout: Layout,
    pub(super) rules: Rules,
    /// Where each mask is drawn.
    outputs: Vec<LayerId>,
    /// Where a start draws each mask.
    pub(super) start: Vec<LayerId>,
}

/// A graph as read.
pub struct Graph {
    pub(super) name: String,
    /// The file, unpacked.
    bytes: Vec<u8>,
    pub(super) instance: Instance,
}

impl Loaded {
    /// Reads the rules and the input.
    pub fn read(job: &Job, watch: &dyn Watch) -> Result<Loaded, PipelineError> {
        let rules = given_rules(job)?;
        let input = input::open(&job.input)?;
        if input.kind == Kind::Gdsii {
            return Ok(Loaded::Layer(Box::new(layer(input, &rules, job, watch)?)));
        }
        if let Some(given) = &job.start_output {
            return Err(PipelineError::NoLayout {
                place: Box::new(given.position.clone()),
                input: input.name,
            });
        }
        Loaded::graph(input, &rules, job.top.as_deref())
    }

    /// A graph, whose only rule is the number of masks.
    pub fn graph(
        input: Input,
        rules: &RawRules,
        top: Option<&str>,
    ) -> Result<Loaded, PipelineError> {
        let instance = match input.kind {
            Kind::DimacsCol => {
                dimacs_col::read(&input.bytes, &input.name, rules.required_masks()?)?
            }
            _ => instance_json::read(&*input.bytes, &input.name, rules.masks()?)?,
        };
        refuse_layout_rules(rules, top, &input.name)?;
        Ok(Loaded::Graph(Box::new(Graph {
            name: file_name(Path::new(&input.name)),
            bytes: input.bytes,
            instance,
        })))
    }

    /// A layer that is not to be drawn.
    pub fn undrawn_layer(input: Input, layout: Layout, rules: Rules) -> Loaded {
        Loaded::Layer(Box::new(Layer {
            input,
            layout,
            rules,
            outputs: Vec::new(),
            start: Vec::new(),
        }))
    }

    /// The same layer under other rules; a graph as it is.
    pub fn under(mut self, rules: &Rules) -> Loaded {
        if let Loaded::Layer(layer) = &mut self {
            layer.rules = rules.clone();
        }
        self
    }

    /// Extracts the instance of a layer.
    pub fn extract(self, watch: &dyn Watch) -> Result<Subject, PipelineError> {
        let layer = match self {
            Loaded::Graph(graph) => return Ok(Subject::Graph(graph)),
            Loaded::Layer(layer) => layer,
        };
        let progress = |now: extract::Progress| {
            watch.progress(now.done as u64, now.total as u64, counted(now.step));
        };
        match extract::extract(&layer.layout, &layer.rules, &progress) {
            Ok(extraction) => Ok(Subject::Layer(layer, Box::new(extraction))),
            Err(error) => Err(layer.refused(error)),
        }
    }
}

impl Subject {
    /// The problem to solve.
    pub fn instance(&self) -> &Instance {
        match self {
            Subject::Layer(_, extraction) => &extraction.instance,
            Subject::Graph(graph) => &graph.instance,
        }
    }

    /// The input again, as before the extraction.
    pub fn into_loaded(self) -> Loaded {
        match self {
            Subject::Layer(layer, _) => Loaded::Layer(layer),
            Subject::Graph(graph) => Loaded::Graph(graph),
        }
    }

    /// The same layer over another number of masks, extracted as before: to be asked only where the
    /// extraction does not look at the masks. A graph stays as it is.
    pub fn with_masks(self, masks: u8) -> Result<Subject, PipelineError> {
        match self {
            Subject::Layer(mut layer, mut extraction) => {
                layer.rules.masks = masks;
                match extraction.instance.with_masks(masks) {
                    Ok(instance) => extraction.instance = instance,
                    Err(error) => return Err(layer.refused(error.into())),
                }
                Ok(Subject::Layer(layer, extraction))
            }
            graph => Ok(graph),
        }
    }

    /// What a report tells about it, besides the solution.
    pub fn with_facts<T>(&self, tell: impl FnOnce(&Facts) -> T) -> T {
        match self {
            Subject::Graph(graph) => tell(&Facts {
                input: graph.name.clone(),
                layer: None,
                instance: &graph.instance,
                places: &Nowhere,
            }),
            Subject::Layer(layer, extraction) => tell(&Facts {
                input: file_name(Path::new(&layer.input.name)),
                layer: Some(layer.facts(extraction)),
                instance: &extraction.instance,
                places: &**extraction,
            }),
        }
    }

    /// What a certificate says of it besides the bounds.
    pub fn certificate_facts(&self) -> certify::Facts {
        match self {
            Subject::Graph(graph) => certify::Facts {
                input: Digest::of(&graph.bytes),
                rules: certificate::Rules::of_graph(graph.instance.masks()),
                features: Vec::new(),
                split: Vec::new(),
            },
            Subject::Layer(layer, extraction) => {
                let (layout, rules) = (&layer.layout, &layer.rules);
                let policy = rules.stitch.policy.name();
                let (features, split) = certify::layer::members(
                    &layout.shapes,
                    &extraction.features,
                    &extraction.fragments,
                );
                certify::Facts {
                    input: Digest::of(&layer.input.bytes),
                    rules: certificate::Rules::of_layer(rules, policy, &layout.top, layout.unit_pm),
                    features,
                    split,
                }
            }
        }
    }

    /// The problem as the audit derives it from what was read.
    #[cfg(feature = "self-check")]
    pub fn audited_problem(
        &self,
        certificate: &certificate::Certificate,
    ) -> Result<crate::audit::Problem, crate::audit::Rejection> {
        use crate::audit;
        match self {
            Subject::Graph(graph) => Ok(audit::graph::derive(&graph.instance)),
            Subject::Layer(layer, _) => {
                audit::layer::derive(&layer.layout, &layer.rules, certificate)
            }
        }
    }

    /// Writes the colouring: drawn for a layer, listed for a graph.
    pub fn write_colouring(&self, draft: &Draft, colouring: &[Mask]) -> Result<(), OutputError> {
        match self {
            Subject::Graph(graph) => draft.write(COLOURING, |out| {
                colouring_json::write(graph.instance.masks(), colouring, out)
            }),
            Subject::Layer(layer, extraction) => {
                draft.write(COLOURED, |out| layer.draw(extraction, colouring, out))
            }
        }
    }
}

/// What a step of the extraction counts.
pub(super) fn counted(step: extract::Step) -> &'static str {
    match step {
        extract::Step::Merging => "parts of shapes",
        extract::Step::Stitches => "features",
        extract::Step::Pairs => "fragments",
    }
}

/// The rules of the file, overridden by those of the job.
fn given_rules(job: &Job) -> Result<RawRules, FormatError> {
    match &job.rules_file {
        None => Ok(job.rules.clone()),
        Some(path) => Ok(rules::of_file(path)?.overridden_by(job.rules.clone())),
    }
}

/// Reads a layer, and refuses output layers that are in use before any work goes into it.
fn layer(input: Input, raw: &RawRules, job: &Job, watch: &dyn Watch) -> Result<Layer, FormatError> {
    let progress = |done, total| watch.progress(done, total, "bytes");
    let (layout, rules) = rules::layer(&input, raw, job.top.as_deref(), &progress)?;
    let outputs = raw.output_layers(&rules)?;
    if job.out.is_some() {
        Plan::new(&input.bytes, &input.name, &layout.top, &outputs)?;
    }
    let start = match &job.start_output {
        None => outputs.clone(),
        Some(given) => drawn_layers(given, &rules)?,
    };
    Ok(Layer {
        input,
        layout,
        rules,
        outputs,
        start,
    })
}

impl Layer {
    fn refused(self, error: ExtractError) -> PipelineError {
        PipelineError::Extract {
            input: self.input.name,
            layer: self.rules.layer,
            error,
        }
    }

    fn facts(&self, extraction: &Extraction) -> LayerFacts {
        let unstitchable = extraction.unstitchable.iter();
        LayerFacts {
            top: self.layout.top.clone(),
            unit_pm: self.layout.unit_pm,
            shapes: self.layout.shapes.len() as u64,
            empty_shapes: extraction.empty_shapes.len() as u64,
            rules: self.rules.clone(),
            unstitchable: unstitchable
                .map(|&feature| (feature, extraction.features.box_of(feature)))
                .collect(),
            too_close: (extraction.too_close.iter())
                .map(|&pair| {
                    let [a, b] = pair.map(|feature| extraction.features.box_of(feature));
                    (pair, assemble::between(a, b))
                })
                .collect(),
            candidates_found: extraction.candidates.before as u64,
            beyond_theorem: (extraction.beyond_theorem.iter())
                .map(|&Beyond { feature, reason }| {
                    (feature, reason.name(), extraction.features.box_of(feature))
                })
                .collect(),
        }
    }

    fn draw(
        &self,
        extraction: &Extraction,
        colouring: &[Mask],
        out: &mut impl Write,
    ) -> io::Result<()> {
        let plan = Plan::new(
            &self.input.bytes,
            &self.input.name,
            &self.layout.top,
            &self.outputs,
        );
        let polygons = (0..).zip(colouring).flat_map(|(fragment, &mask)| {
            let outlines = self.outlines(extraction, fragment, colouring);
            outlines.into_iter().map(move |outline| (mask, outline))
        });
        plan.map_err(io::Error::other)?.write(polygons, out)
    }

    /// What is drawn of a fragment.
    fn outlines(
        &self,
        extraction: &Extraction,
        fragment: u32,
        colouring: &[Mask],
    ) -> Vec<Vec<Point>> {
        let (features, fragments) = (&extraction.features, &extraction.fragments);
        match fragments.drawing(features, fragment, colouring) {
            Drawing::Rects(rects) => rects.into_iter().map(corners).collect(),
            Drawing::Shapes(shapes) => shapes
                .iter()
                .map(|&shape| match self.layout.shapes.get(shape) {
                    Shape::Rect(rect) => corners(rect),
                    Shape::Polygon(vertices) => vertices.to_vec(),
                })
                .collect(),
        }
    }
}

fn corners(Rect { min, max }: Rect) -> Vec<Point> {
    [
        (min.x, min.y),
        (max.x, min.y),
        (max.x, max.y),
        (min.x, max.y),
    ]
    .map(|(x, y)| Point { x, y })
    .to_vec()
}

/// Refuses rules and options that only a layout can follow, rather than ignore them.
fn refuse_layout_rules(
    rules: &RawRules,
    top: Option<&str>,
    input: &str,
) -> Result<(), PipelineError> {
    let top = top.map(|_| Position::command_line("--top"));
    match rules.layout_rule().or(top) {
        None => Ok(()),
        Some(place) => Err(PipelineError::NoLayout {
            place: Box::new(place),
            input: input.to_owned(),
        }),
    }
}

/// The last part of a path: no output names the directories of a machine.
pub(super) fn file_name(path: &Path) -> String {
    let name = path.file_name().unwrap_or(path.as_os_str());
    name.to_string_lossy().into_owned()
}
