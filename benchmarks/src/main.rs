//! `maskproof-generate`: writes an input for benchmarks.

use benchmarks::{ContactArray, gds_writer};
use clap::{Parser, Subcommand};
use maskproof::formats::instance_json;
use std::error::Error;
use std::fs::File;
use std::io::{BufWriter, Write};
use std::path::PathBuf;

/// Writes inputs for benchmarks, the same bytes for the same options.
#[derive(Debug, Parser)]
#[command(max_term_width = 100)]
struct CommandLine {
    #[command(subcommand)]
    input: Input,
}

#[derive(Debug, Subcommand)]
enum Input {
    /// An irregular array of contacts: .json for an instance, .gds for a layout on layer 1/0.
    ContactArray(ContactArrayArgs),
}

#[derive(Debug, clap::Args)]
struct ContactArrayArgs {
    /// The file to write: .json or .gds.
    out: PathBuf,
    /// Masks (.json only).
    #[arg(long, default_value_t = 4)]
    masks: u8,
    /// Sites in each direction.
    #[arg(long, default_value_t = ContactArray::default().sites,
          value_parser = clap::value_parser!(u32).range(1..=10_000))]
    sites: u32,
    /// Distance of neighbouring sites (nm).
    #[arg(long, default_value_t = ContactArray::default().pitch,
          value_parser = clap::value_parser!(u32).range(1..=10_000))]
    pitch: u32,
    /// Probability that a site has a contact.
    #[arg(long, default_value_t = ContactArray::default().presence, value_parser = probability)]
    presence: f64,
    /// Largest shift of a contact from its site in each direction (nm).
    #[arg(long, default_value_t = ContactArray::default().jitter,
          value_parser = clap::value_parser!(u32).range(0..=10_000))]
    jitter: u32,
    /// Side of a contact (nm); 0 for points (.json only).
    #[arg(long, default_value_t = ContactArray::default().size,
          value_parser = clap::value_parser!(u32).range(0..=10_000))]
    size: u32,
    /// Same-mask spacing from edge to edge (nm; .json only).
    #[arg(long, default_value_t = ContactArray::default().spacing,
          value_parser = clap::value_parser!(u32).range(1..=100_000))]
    spacing: u32,
    /// What the random choices grow from.
    #[arg(long, default_value_t = ContactArray::default().seed)]
    seed: u64,
}

fn probability(text: &str) -> Result<f64, String> {
    let value: f64 = text
        .parse()
        .map_err(|_| "a number from 0 to 1 is needed".to_owned())?;
    if (0.0..=1.0).contains(&value) {
        Ok(value)
    } else {
        Err("a number from 0 to 1 is needed".to_owned())
    }
}

fn main() -> Result<(), Box<dyn Error>> {
    match CommandLine::parse().input {
        Input::ContactArray(args) => write_contact_array(&args),
    }
}

fn write_contact_array(args: &ContactArrayArgs) -> Result<(), Box<dyn Error>> {
    let array = ContactArray {
        sites: args.sites,
        pitch: args.pitch,
        presence: args.presence,
        jitter: args.jitter,
        size: args.size,
        spacing: args.spacing,
        seed: args.seed,
    };
    let extension = args
        .out
        .extension()
        .and_then(|extension| extension.to_str());
    if !matches!(extension, Some("json" | "gds")) {
        return Err("the file to write must end with .json or .gds".into());
    }
    if extension == Some("gds") && args.size == 0 {
        return Err("a layout needs contacts with a --size of at least 1".into());
    }
    let mut out = BufWriter::new(File::create(&args.out)?);
    if extension == Some("json") {
        instance_json::write(&array.instance(args.masks)?, &mut out)?;
    } else {
        gds_writer::write_squares(&array.contacts(), array.size, [1, 0], &mut out)?;
    }
    out.flush()?;
    Ok(())
}
