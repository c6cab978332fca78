//! The audit: an independent check of a certificate against the input.
//!
//! Nothing of the program that wrote a certificate is used: the problem is derived from the input again
//! by plain methods, formulas are built from the format's page, proofs are checked line by line. What
//! is left to trust is this room, and the readers of input files.
//!
//! | file | what it does |
//! |---|---|
//! | [`problem`] | the problem in the certificate's numbering |
//! | [`graph`] | the problem of a graph |
//! | [`layer`] | the problem of a layer, derived from its shapes again |
//! | [`colouring`] | the colouring is one, and what it costs |
//! | [`statement`] | what a bound says cannot be |
//! | [`enumeration`], [`clique`], [`cycle`], [`formula`] and [`lrat`] | four kinds of evidence that it cannot |
//! | [`bounds`] | the packings: every bound holds, no unit is in two |
//! | [`theorem`] | what all of it proves, in words |
//! | [`verdict`] | accepted, rejected or malformed |

pub mod bounds;
pub mod clique;
pub mod colouring;
pub mod cycle;
pub mod enumeration;
pub mod formula;
pub mod graph;
pub mod layer;
pub mod lrat;
pub mod problem;
pub mod statement;
pub mod theorem;
pub mod verdict;

pub use bounds::{Fault, Proofs, Tally};
pub use problem::Problem;
pub use theorem::Theorem;
pub use verdict::{Malformed, Rejection, Step, Verdict};

use crate::certificate::{Certificate, Claim};

/// Checks what a certificate says about a problem: the colouring costs what it claims, every bound
/// holds, and the bounds add up to what it claims.
///
/// # Errors
/// The first thing that is wrong, in the order of the steps.
pub fn check(
    problem: &Problem,
    certificate: &Certificate,
    proofs: &dyn Proofs,
) -> Result<Tally, Fault> {
    let count = colouring::count(problem, &certificate.colours)?;
    let Certificate {
        conflicts,
        stitches,
        ..
    } = certificate;
    costs("unresolved conflicts", count.conflicts, *conflicts)?;
    costs("stitches by weight", count.stitches, *stitches)?;
    if !conflicts.is_tight() && (stitches.lower > 0 || !certificate.stitch_bounds.is_empty()) {
        let reason = "bounds on stitches, though the least number of conflicts is not proven";
        return Err(Rejection::new(Step::Sum, reason).into());
    }
    let limits = certificate.conflict_bounds.iter().map(|bound| bound.limit);
    adds_up("conflict", limits, *conflicts)?;
    let limits = certificate.stitch_bounds.iter().map(|bound| bound.limit);
    adds_up("stitch", limits, *stitches)?;
    bounds::check(problem, certificate, proofs)
}

fn costs(what: &str, found: u64, claim: Claim) -> Result<(), Rejection> {
    if found == claim.upper {
        return Ok(());
    }
    let reason = format!(
        "the colouring has {found} {what}, and {} are claimed",
        claim.upper
    );
    Err(Rejection::new(Step::Colouring, reason))
}

fn adds_up(what: &str, limits: impl Iterator<Item = u64>, claim: Claim) -> Result<(), Rejection> {
    let sum = limits.map(u128::from).sum::<u128>();
    if sum != u128::from(claim.lower) {
        let reason = format!(
            "the limits of the {what} bounds add up to {sum}, and {} is claimed",
            claim.lower
        );
        return Err(Rejection::new(Step::Sum, reason));
    }
    if claim.lower > claim.upper {
        let reason = format!(
            "the {what} bounds claim {}, and the colouring has {}",
            claim.lower, claim.upper
        );
        return Err(Rejection::new(Step::Sum, reason));
    }
    Ok(())
}
