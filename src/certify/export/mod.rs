//! A certificate in the formats of other checkers; the page `src/certificate/export.md` says how each
//! corresponds to it.
//!
//! | file | what it does |
//! |---|---|
//! | [`bounds`] | a bound as a formula and its refutation: the certificate's, or one made now |
//! | [`cnf`] | the canonical formula as DIMACS CNF |
//! | [`drat`] | a refutation as DRAT |
//! | [`opb`] | the whole instance as a pseudo-Boolean problem |
//! | [`system`] | the refutation of a bound within that problem |
//! | [`counter`] | counters whose clauses have pseudo-Boolean proofs |
//! | [`derivation`] | a bound by its refutation, in a pseudo-Boolean proof |
//! | [`turan`] | the bound of a clique in such a proof |
//! | [`pbp`] | the lines of such a proof |
//! | [`veripb`] | the proof of the whole claim |
//!
//! What is exported is a certificate that the audit accepts. Nothing new is claimed: who reads the files
//! needs to trust neither this program nor the audit, but the checker and the formula.

pub mod bounds;
pub mod cnf;
pub mod counter;
pub mod derivation;
pub mod drat;
pub mod opb;
pub mod pbp;
pub mod system;
pub mod turan;
pub mod veripb;

use std::io::{self, BufRead};

use rayon::prelude::*;
use thiserror::Error;

use encodings::Instance;

use super::features::Features;
use super::store::ProofStore;
use crate::certificate::Certificate;
use crate::solve::refutation::Effort;
use bounds::{Bound, Refuted};

/// The formats that there are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Format {
    /// The formula of each bound, in DIMACS CNF.
    Cnf,
    /// The same, and an LRAT refutation of each.
    Lrat,
    /// The same with DRAT.
    Drat,
    /// The whole instance as a pseudo-Boolean problem, and one proof of all that is claimed of it.
    Veripb,
}

impl Format {
    /// All of them, in the order in which they are listed to users.
    pub const ALL: [Format; 4] = [Format::Cnf, Format::Lrat, Format::Drat, Format::Veripb];

    /// The name on the command line.
    pub fn as_str(self) -> &'static str {
        match self {
            Format::Cnf => "cnf",
            Format::Lrat => "lrat",
            Format::Drat => "drat",
            Format::Veripb => "veripb",
        }
    }
}

/// The proofs of a certificate.
pub trait Kept: Sync {
    /// Opens the proof of that name.
    ///
    /// # Errors
    /// There is none, or it cannot be read.
    fn open(&self, name: &str) -> io::Result<Box<dyn BufRead + '_>>;
}

/// What is exported: a certificate that was accepted, and what it is about.
pub struct Subject<'a> {
    /// The instance, in the certificate's numbering.
    pub instance: &'a Instance,
    /// The certificate.
    pub certificate: &'a Certificate,
    /// Its proofs.
    pub kept: &'a dyn Kept,
}

/// About half a gigabyte of proof, and a minute: a bound that was shown to the audit is hardly ever harder than
/// that. Cliques of more than a dozen are, but not for VeriPB.
const EFFORT: Effort = Effort {
    most: 1 << 27,
    sure: 1 << 27,
};

/// Why there is no export.
#[derive(Debug, Error)]
pub enum ExportError {
    /// A file could not be read or written.
    #[error(transparent)]
    Io(#[from] io::Error),
    /// The formula is longer than the format of certificates allows, and no proof was there.
    #[error(
        "{0}: the formula of this bound has more literals than the format of certificates allows"
    )]
    TooLong(String),
    /// Ties are not written as a pseudo-Boolean problem.
    #[error(
        "masks decided by hand and limits on stitches are not written in the format veripb: take cnf, lrat or drat"
    )]
    Ties,
    /// No refutation was found with the effort that is allowed.
    #[error("{0}: no refutation was found within the effort that is allowed for one bound")]
    NotRefuted(String),
}

/// Writes the certificate in a format, into files of `store`; returns how many bounds there are.
///
/// # Errors
/// See [`ExportError`].
pub fn export(
    subject: &Subject<'_>,
    format: Format,
    store: &dyn ProofStore,
) -> Result<usize, ExportError> {
    let features = Features::new(subject.instance);
    let bounds = bounds::all(&features, subject.certificate);
    if format == Format::Veripb {
        if !subject.instance.ties().is_empty() {
            return Err(ExportError::Ties);
        }
        veripb::write(&features, subject.certificate, &bounds, store)?;
        return Ok(bounds.len());
    }
    let each = bounds.par_iter().with_max_len(1);
    each.try_for_each(|bound| one(&features, subject.kept, bound, format, store))?;
    Ok(bounds.len())
}

/// The files of one bound.
fn one(
    features: &Features<'_>,
    kept: &dyn Kept,
    bound: &Bound<'_>,
    format: Format,
    store: &dyn ProofStore,
) -> Result<(), ExportError> {
    let (formula, outline) = bound.formula(features)?;
    store.put(&format!("{}.cnf", bound.name), &|out| {
        cnf::write(features, bound, &formula, out)
    })?;
    if format == Format::Cnf {
        return Ok(());
    }
    let refuted = bound.refutation(&formula, &outline)?;
    let name = format!("{}.{}", bound.name, format.as_str());
    store.put(&name, &|out| match (&refuted, format) {
        (Refuted::Kept(proof), Format::Drat) => drat::of_lrat(kept.open(proof)?, out),
        (Refuted::Kept(proof), _) => io::copy(&mut kept.open(proof)?, out).map(|_| ()),
        (Refuted::Made(steps), Format::Drat) => drat::write(steps, out),
        (Refuted::Made(steps), _) => super::lrat::write(formula.len(), steps, out),
    })?;
    Ok(())
}
