//! The command `sweep`.

use std::io::Write as _;
use std::path::PathBuf;
use std::time::Duration;

use clap::Args;

use super::args::given;
use super::interrupt::{self, Moment};
use super::progress::Progress;
use super::{blame, complain, exit, values};
use crate::formats::length::Length;
use crate::formats::rules::{Given, RawRules, parse_layer, parse_policy};
use crate::layout::{LayerId, Policy};
use crate::pipeline::{self, Choices, Control, SweepJob};
use crate::report::sweep::{Price, table};

pub const EXAMPLE: &str = "\
Example, how many masks at which spacing, and what stitches are worth:
  maskproof sweep block.gds --layer 68/20 --masks 2,3,4 --spacing 480,500,520 \\
      --stitch none,uncovered,every-interval --overlap 40 --fragment-length 100 \\
      --mask-cost 1.5e6 --out sweep.csv

Exit codes: 0 every combination is proven, 4 some are undecided, 2 usage, 3 bad input,
6 the output could not be written, 130 stopped before there was a row.";

/// How long one combination may take unless the user says otherwise.
const USUAL_LIMIT: &str = "60";

/// The arguments of `sweep`. Lists are separated by commas; what is not given is taken from the rules.
#[derive(Debug, Args)]
pub struct SweepArgs {
    /// Layout (.gds, .gds.gz) or graph (.col, .json; only --masks applies to it).
    #[arg(value_name = "INPUT")]
    pub input: PathBuf,
    /// Rules in TOML: those that do not vary, and one value of each that does.
    #[arg(long, value_name = "FILE")]
    pub rules: Option<PathBuf>,
    /// Layer to split: number/datatype.
    #[arg(long, value_name = "L/D", value_parser = parse_layer)]
    pub layer: Option<LayerId>,
    /// Numbers of masks, each 2 to 8.
    #[arg(long, value_name = "K,...", value_delimiter = ',', value_parser = values::count, allow_negative_numbers = true)]
    pub masks: Vec<u64>,
    /// Same-mask spacings.
    #[arg(long, value_name = "NM,...", value_delimiter = ',', value_parser = Length::parse_or_nm, allow_negative_numbers = true)]
    pub spacing: Vec<Length>,
    /// Stitch policies: none, uncovered, every-interval or listed [default: none].
    #[arg(long, value_name = "POLICY,...", value_delimiter = ',', value_parser = parse_policy)]
    pub stitch: Vec<Policy>,
    /// Overlaps of the two masks at a stitch [default: 0].
    #[arg(long, value_name = "NM,...", value_delimiter = ',', value_parser = Length::parse_or_nm, allow_negative_numbers = true)]
    pub overlap: Vec<Length>,
    /// Smallest lengths of a fragment along its run [default: 0].
    #[arg(long, visible_alias = "fragment", value_name = "NM,...", value_delimiter = ',', value_parser = Length::parse_or_nm, allow_negative_numbers = true)]
    pub fragment_length: Vec<Length>,
    /// Smallest distance of a stitch's overlap from a corner, in all combinations [default: 0].
    #[arg(long, value_name = "NM", value_parser = Length::parse_or_nm, allow_negative_numbers = true)]
    pub corner: Option<Length>,
    /// The stitch candidates of --stitch listed, in JSON or CSV.
    #[arg(long, value_name = "FILE")]
    pub stitch_list: Option<PathBuf>,
    /// Price of one more mask, to set beside what it saves.
    #[arg(long, value_name = "PRICE", value_parser = Price::parse, allow_negative_numbers = true)]
    pub mask_cost: Option<Price>,
    /// Cell to flatten, where several stand at the top.
    #[arg(long, value_name = "CELL")]
    pub top: Option<String>,
    /// File for the rows (its name ends in .csv), or a directory for sweep.csv [default: no file].
    #[arg(long, value_name = "OUT")]
    pub out: Option<PathBuf>,
    /// Seconds after which solving one combination ends with the best it has.
    #[arg(long, value_name = "S", default_value = USUAL_LIMIT, value_parser = values::seconds, allow_negative_numbers = true)]
    pub time_limit: Duration,
    /// Worker threads [default: all cores].
    #[arg(long, value_name = "N", value_parser = values::threads, allow_negative_numbers = true)]
    pub threads: Option<usize>,
}

impl SweepArgs {
    /// A value that stands in its list twice, by the same name or another.
    fn repeated(&self) -> Option<String> {
        let lengths = [
            ("--spacing", &self.spacing),
            ("--overlap", &self.overlap),
            ("--fragment-length", &self.fragment_length),
        ];
        let mut found = lengths
            .iter()
            .find_map(|(option, list)| twice(option, list));
        found = found.or_else(|| twice("--masks", &self.masks));
        let policies: Vec<&str> = self.stitch.iter().map(|policy| policy.name()).collect();
        found.or_else(|| twice("--stitch", &policies))
    }
}

fn twice<T: PartialEq + std::fmt::Display>(option: &str, list: &[T]) -> Option<String> {
    let mut values = list.iter().enumerate();
    let (_, value) = values.find(|(i, value)| list[..*i].contains(value))?;
    Some(format!("{option}: {value} is listed twice: once is right"))
}

impl From<SweepArgs> for SweepJob {
    fn from(args: SweepArgs) -> SweepJob {
        SweepJob {
            rules: RawRules {
                layer: given("--layer", args.layer),
                corner: given("--corner", args.corner),
                list: given("--stitch-list", args.stitch_list),
                ..RawRules::default()
            },
            choices: Choices {
                masks: all_given("--masks", args.masks),
                spacings: all_given("--spacing", args.spacing),
                policies: all_given("--stitch", args.stitch),
                overlaps: all_given("--overlap", args.overlap),
                fragment_lengths: all_given("--fragment-length", args.fragment_length),
            },
            input: args.input,
            rules_file: args.rules,
            top: args.top,
            out: args.out,
            mask_cost: args.mask_cost,
            time_limit: Some(args.time_limit),
            threads: args.threads,
        }
    }
}

fn all_given<T>(option: &str, values: Vec<T>) -> Vec<Given<T>> {
    let one = |value| Given::on_command_line(option, value);
    values.into_iter().map(one).collect()
}

/// Runs the command; gives the exit code.
pub fn run(args: SweepArgs) -> u8 {
    if let Some(message) = args.repeated() {
        complain(&message);
        return exit::USAGE;
    }
    let job = SweepJob::from(args);
    let control = Control::default();
    let moment = Moment::default();
    if let Err(error) = interrupt::install(&control, &moment) {
        complain(&format!(
            "Ctrl-C will end the run without a result: {error}"
        ));
    }
    let progress = Progress::new(moment);
    let outcome = pipeline::sweep(&job, &control, &progress);
    progress.clear();
    match outcome {
        Ok(sweep) => {
            let text = table::text(&sweep, job.file().as_deref());
            let _ = std::io::stdout().write_all(text.as_bytes());
            match sweep.is_decided() {
                true => exit::DECIDED,
                false => exit::UNDECIDED,
            }
        }
        Err(error) => {
            complain(&error.to_string());
            blame(&error)
        }
    }
}
