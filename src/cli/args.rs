//! The command line: what may be said.

use std::path::PathBuf;
use std::time::Duration;

use clap::{Args, Parser, Subcommand};

use super::sweep::{self, SweepArgs};
use super::values;
use crate::formats::length::Length;
use crate::formats::rules::{
    FixedBy, Given, Output, RawFixed, RawHand, RawKeepOut, RawRules, parse_layer, parse_policy,
};
use crate::layout::{LayerId, Policy};
use crate::pipeline::{AuditJob, ExplainJob, ExportJob, Format, Job};

const EXAMPLE: &str = "\
Example, three masks 250 nm apart with stitches:
  maskproof solve block.gds --layer 67/20 --masks 3 --spacing 250 \\
      --stitch uncovered --overlap 40 --fragment-length 100 --out li1

Exit codes: 0 decomposable, 1 not decomposable (both proven), 2 usage, 3 bad input, 4 undecided,
6 the output could not be written, 130 stopped before there was a result.";

/// Splits one chip layer over several masks, exactly.
#[derive(Debug, Parser)]
#[command(name = "maskproof", version, about, after_help = EXAMPLE, max_term_width = 100)]
pub struct CommandLine {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// The subcommands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Colour a layer or a graph at the least cost, and say what is proven.
    #[command(after_help = EXAMPLE)]
    Solve(Box<SolveArgs>),
    /// Solve every combination of masks, spacings and stitch policies, and compare them.
    #[command(after_help = sweep::EXAMPLE)]
    Sweep(Box<SweepArgs>),
    /// Check a certificate against the input, trusting nothing that made it.
    #[command(after_help = AUDIT_EXAMPLE)]
    Audit(AuditArgs),
    /// Show each place that needs a conflict, and what would repair it.
    #[command(after_help = EXPLAIN_EXAMPLE)]
    Explain(ExplainArgs),
    /// Put a certificate in the formats of other checkers.
    Certificate(CertificateArgs),
}

/// The arguments of `certificate`.
#[derive(Debug, Args)]
pub struct CertificateArgs {
    /// What to do with it.
    #[command(subcommand)]
    pub command: CertificateCommand,
}

/// The subcommands of `certificate`.
#[derive(Debug, Subcommand)]
pub enum CertificateCommand {
    /// Audit a certificate, then write it for a checker of SAT or pseudo-Boolean proofs.
    #[command(after_help = EXPORT_EXAMPLE)]
    Export(ExportArgs),
}

const EXPORT_EXAMPLE: &str = "\
Example:
  maskproof certificate export li1 --input block.gds --format drat --out li1-drat

Exit codes: 0 written, 5 the certificate is rejected, 3 it is malformed, or bad input, 2 usage,
6 the output could not be written.";

/// The arguments of `certificate export`.
#[derive(Debug, Args)]
pub struct ExportArgs {
    /// What is exported.
    #[command(flatten)]
    pub audit: AuditArgs,
    /// cnf, lrat or drat: the formula of each bound, alone or with its refutation; veripb: one problem and one proof for
    /// all that is claimed.
    #[arg(long, value_name = "FORMAT", value_parser = values::format)]
    pub format: Format,
    /// Directory for the files: a new name.
    #[arg(long, value_name = "OUT")]
    pub out: PathBuf,
}

impl From<ExportArgs> for ExportJob {
    fn from(args: ExportArgs) -> ExportJob {
        ExportJob {
            audit: args.audit.into(),
            format: args.format,
            out: args.out,
        }
    }
}

const EXPLAIN_EXAMPLE: &str = "\
Example:
  maskproof explain li1 --input block.gds

Exit codes: 0 explained, 2 usage, 3 bad input, 6 the output could not be written, 130 stopped.";

const AUDIT_EXAMPLE: &str = "\
Example:
  maskproof audit li1 --input block.gds

Exit codes: 0 accepted, 5 rejected (what the certificate says is not so), 3 malformed, or bad input, 2 usage.";

/// The arguments of `audit`.
#[derive(Debug, Args)]
pub struct AuditArgs {
    /// Output directory of solve, or the certificate directory in it.
    #[arg(value_name = "DIR")]
    pub directory: PathBuf,
    /// The layout or graph that the certificate is for.
    #[arg(long, value_name = "INPUT")]
    pub input: PathBuf,
    /// Rules that it must have been made under [default: those that it states].
    #[arg(long, value_name = "FILE")]
    pub rules: Option<PathBuf>,
    /// Worker threads [default: all cores].
    #[arg(long, value_name = "N", value_parser = values::threads, allow_negative_numbers = true)]
    pub threads: Option<usize>,
}

impl From<AuditArgs> for AuditJob {
    fn from(args: AuditArgs) -> AuditJob {
        AuditJob {
            directory: args.directory,
            input: args.input,
            rules_file: args.rules,
            threads: args.threads,
        }
    }
}

/// The arguments of `explain`.
#[derive(Debug, Args)]
pub struct ExplainArgs {
    /// Output directory of an earlier `solve`, with its certificate.
    #[arg(value_name = "DIR")]
    pub dir: PathBuf,
    /// The layout or graph that was solved.
    #[arg(long, value_name = "INPUT")]
    pub input: PathBuf,
    /// Where explanation.json goes [default: DIR/explanation.json].
    #[arg(long, value_name = "FILE")]
    pub out: Option<PathBuf>,
    /// Explain this place only; places are numbered from 1.
    #[arg(long, value_name = "N", value_parser = values::ordinal, allow_negative_numbers = true)]
    pub place: Option<usize>,
    /// Show all places, not the first five.
    #[arg(long)]
    pub all: bool,
    /// Worker threads [default: all cores].
    #[arg(long, value_name = "N", value_parser = values::threads, allow_negative_numbers = true)]
    pub threads: Option<usize>,
}

impl From<&ExplainArgs> for ExplainJob {
    fn from(args: &ExplainArgs) -> ExplainJob {
        ExplainJob {
            dir: args.dir.clone(),
            input: args.input.clone(),
            out: args.out.clone(),
            place: args.place,
            threads: args.threads,
        }
    }
}

/// The arguments of `solve`.
#[derive(Debug, Args)]
pub struct SolveArgs {
    /// Layout (.gds, .gds.gz) or graph (.col, .json).
    #[arg(value_name = "INPUT")]
    pub input: PathBuf,
    /// Rules in TOML; each can be overridden by an option below.
    #[arg(long, value_name = "FILE")]
    pub rules: Option<PathBuf>,
    /// Layer to split: number/datatype.
    #[arg(long, value_name = "L/D", value_parser = parse_layer)]
    pub layer: Option<LayerId>,
    /// Number of masks, 2 to 8.
    #[arg(long, value_name = "K", value_parser = values::count, allow_negative_numbers = true)]
    pub masks: Option<u64>,
    /// Features closer than this need different masks.
    #[arg(long, value_name = "NM", value_parser = Length::parse_or_nm, allow_negative_numbers = true)]
    pub spacing: Option<Length>,
    /// Where a feature may change mask: none, uncovered, every-interval or listed [default: none].
    #[arg(long, value_name = "POLICY", value_parser = parse_policy)]
    pub stitch: Option<Policy>,
    /// Overlap of the two masks at a stitch [default: 0].
    #[arg(long, value_name = "NM", value_parser = Length::parse_or_nm, allow_negative_numbers = true)]
    pub overlap: Option<Length>,
    /// Smallest length of a fragment along its run [default: 0].
    #[arg(long, value_name = "NM", value_parser = Length::parse_or_nm, allow_negative_numbers = true)]
    pub fragment_length: Option<Length>,
    /// Smallest distance of a stitch's overlap from a corner [default: 0].
    #[arg(long, value_name = "NM", value_parser = Length::parse_or_nm, allow_negative_numbers = true)]
    pub corner: Option<Length>,
    /// Price of one stitch [default: 1].
    #[arg(long, value_name = "W", value_parser = values::count, allow_negative_numbers = true)]
    pub stitch_weight: Option<u64>,
    /// Shapes that stitches keep away from, and how far; may be repeated.
    #[arg(long, value_name = "L/D=NM", value_parser = values::keep_out)]
    pub keep_out: Vec<(LayerId, Length)>,
    /// The most stitches of one feature [default: any number].
    #[arg(long, value_name = "N", value_parser = values::count, allow_negative_numbers = true)]
    pub most_stitches: Option<u64>,
    /// The stitch candidates of --stitch listed, in JSON or CSV.
    #[arg(long, value_name = "FILE")]
    pub stitch_list: Option<PathBuf>,
    /// Shapes that are part of the layer, and on a mask; may be repeated.
    #[arg(long, value_name = "L/D=MASK", value_parser = values::fixed)]
    pub fixed: Vec<(LayerId, u64)>,
    /// Where coloured.gds draws the masks: K datatypes of the layer, or K layers L/D
    /// [default: 101,102,...].
    #[arg(long, value_name = "LIST", value_parser = values::output)]
    pub datatypes: Option<Output>,
    /// Cell to flatten, where several stand at the top.
    #[arg(long, value_name = "CELL")]
    pub top: Option<String>,
    /// Directory for the output files: a new name or an earlier result [default: no files].
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// A colouring to begin with, reported beside the one found: a coloured layout as --out writes it, for a graph a
    /// colouring.json.
    #[arg(long, value_name = "FILE")]
    pub start: Option<PathBuf>,
    /// Where the start draws the masks [default: as --datatypes].
    #[arg(long, value_name = "LIST", value_parser = values::output, requires = "start")]
    pub start_datatypes: Option<Output>,
    /// Change the start only where it fails, and as few features as possible: all else is fixed.
    #[arg(long, requires = "start")]
    pub keep: bool,
    /// Leave out DIR/certificate, which lets anyone check the result with `audit`.
    #[arg(long, requires = "out")]
    pub no_certificate: bool,
    /// Seconds after which the whole run ends with the best it has.
    #[arg(long, value_name = "S", value_parser = values::seconds, allow_negative_numbers = true)]
    pub time_limit: Option<Duration>,
    /// Seconds after which one piece ends with the best it has.
    #[arg(long, value_name = "S", value_parser = values::seconds, allow_negative_numbers = true)]
    pub piece_limit: Option<Duration>,
    /// Worker threads [default: all cores].
    #[arg(long, value_name = "N", value_parser = values::threads, allow_negative_numbers = true)]
    pub threads: Option<usize>,
}

impl From<SolveArgs> for Job {
    fn from(args: SolveArgs) -> Job {
        Job {
            rules: RawRules {
                layer: given("--layer", args.layer),
                masks: given("--masks", args.masks),
                spacing: given("--spacing", args.spacing),
                policy: given("--stitch", args.stitch),
                overlap: given("--overlap", args.overlap),
                fragment_length: given("--fragment-length", args.fragment_length),
                corner: given("--corner", args.corner),
                weight: given("--stitch-weight", args.stitch_weight),
                keep_outs: args.keep_out.into_iter().map(keep_out).collect(),
                most_per_feature: given("--most-stitches", args.most_stitches),
                list: given("--stitch-list", args.stitch_list),
                hand: RawHand {
                    fixed: args.fixed.into_iter().map(fixed).collect(),
                    ..RawHand::default()
                },
                output: given("--datatypes", args.datatypes),
                ..RawRules::default()
            },
            input: args.input,
            rules_file: args.rules,
            top: args.top,
            out: args.out,
            start: args.start,
            start_output: given("--start-datatypes", args.start_datatypes),
            keep: args.keep,
            no_certificate: args.no_certificate,
            time_limit: args.time_limit,
            piece_limit: args.piece_limit,
            threads: args.threads,
        }
    }
}

pub(super) fn given<T>(option: &str, value: Option<T>) -> Option<Given<T>> {
    value.map(|value| Given::on_command_line(option, value))
}

fn keep_out((layer, distance): (LayerId, Length)) -> Given<RawKeepOut> {
    let distance = Given::on_command_line("--keep-out", distance);
    Given::on_command_line("--keep-out", RawKeepOut { layer, distance })
}

fn fixed((layer, mask): (LayerId, u64)) -> Given<RawFixed> {
    let fixed = RawFixed {
        mask: Given::on_command_line("--fixed", mask),
        by: FixedBy::Layer(Given::on_command_line("--fixed", layer)),
    };
    Given::on_command_line("--fixed", fixed)
}
