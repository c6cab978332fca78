//! The bounds of a certificate one by one: name, formula, refutation.
//!
//! Where the evidence is no proof (all colourings tried, an odd cycle) a refutation is made, as
//! [`super::super::evidence`] makes them.

use super::super::features::Features;
use super::super::formula::Outline;
use super::super::statement::{Budget, Item, Statement};
use super::super::{conflicts, evidence, formula, lrat, precedence, stitches};
use super::{EFFORT, ExportError};
use crate::certificate::{Certificate, Evidence, StitchBound};
use crate::solve::Stop;
use crate::solve::refutation::{Lists, Steps};

/// A bound of either level.
pub struct Bound<'a> {
    /// `conflicts-I` or `stitches-I`, with its place in the list of the certificate, from 0.
    pub name: String,
    /// The limit that it states.
    pub limit: u64,
    /// What it denies.
    pub statement: Statement,
    /// The fragments that this speaks of.
    pub fragments: Vec<u32>,
    /// The fragments along which masks are named.
    pub precedence: Vec<u32>,
    /// The bounds on conflicts whose budgets come before its own.
    pub met: &'a [u32],
    /// Why it holds.
    by: &'a Evidence,
}

/// A refutation of a bound's formula.
pub enum Refuted {
    /// The proof of that name in the certificate.
    Kept(String),
    /// One that was made now.
    Made(Steps),
}

/// All bounds of a certificate, those on conflicts first.
pub fn all<'a>(features: &Features<'_>, certificate: &'a Certificate) -> Vec<Bound<'a>> {
    let conflicts = certificate.conflict_bounds.iter().enumerate();
    let conflicts = conflicts.map(|(i, bound)| {
        let statement = Statement {
            with: bound.with.clone(),
            ..conflicts::statement(&bound.units, bound.limit)
        };
        let name = format!("conflicts-{i}");
        Bound::new(features, name, bound.limit, statement, &[], &bound.by)
    });
    let stitches = certificate.stitch_bounds.iter().enumerate();
    let stitches = stitches.map(|(i, bound)| {
        let statement = of_stitches(features, certificate, bound);
        let name = format!("stitches-{i}");
        Bound::new(
            features,
            name,
            bound.limit,
            statement,
            &bound.met,
            &bound.by,
        )
    });
    conflicts.chain(stitches).collect()
}

fn of_stitches(
    features: &Features<'_>,
    certificate: &Certificate,
    bound: &StitchBound,
) -> Statement {
    let met = bound.met.iter().map(|&met| {
        let bound = &certificate.conflict_bounds[met as usize];
        stitches::met_budget(&bound.units, bound.limit)
    });
    let items = bound.units.iter().map(|&ends| Item::Stitch {
        ends,
        weight: features.weight(ends),
    });
    let own = Budget {
        items: items.collect(),
        most: bound.limit - 1,
    };
    Statement {
        resolved: bound.resolved.clone(),
        budgets: met.chain([own]).collect(),
        with: bound.with.clone(),
    }
}

impl<'a> Bound<'a> {
    fn new(
        features: &Features<'_>,
        name: String,
        limit: u64,
        statement: Statement,
        met: &'a [u32],
        by: &'a Evidence,
    ) -> Bound<'a> {
        let fragments = statement.fragments(features);
        let precedence = match by {
            Evidence::Proof { precedence, .. } => precedence.clone(),
            _ => precedence::choose(features, &fragments, &statement),
        };
        Bound {
            name,
            limit,
            statement,
            fragments,
            precedence,
            met,
            by,
        }
    }

    /// The clique that is its evidence.
    pub fn clique(&self) -> Option<&'a [u32]> {
        match self.by {
            Evidence::Clique { clique } => Some(clique),
            _ => None,
        }
    }

    /// Its canonical formula.
    ///
    /// # Errors
    /// It is too long.
    pub fn formula(&self, features: &Features<'_>) -> Result<(Lists, Outline), ExportError> {
        formula::canonical(features, &self.fragments, &self.statement, &self.precedence)
            .ok_or_else(|| ExportError::TooLong(self.name.clone()))
    }

    /// A refutation of that formula.
    ///
    /// # Errors
    /// None was found.
    pub fn refutation(&self, formula: &Lists, outline: &Outline) -> Result<Refuted, ExportError> {
        if let Evidence::Proof { proof, .. } = self.by {
            return Ok(Refuted::Kept(proof.clone()));
        }
        let steps = evidence::refutation(formula, outline, EFFORT, &Stop::default());
        let steps = steps
            .ok()
            .and_then(|steps| lrat::trim(formula, &steps).ok());
        let steps = steps.ok_or_else(|| ExportError::NotRefuted(self.name.clone()))?;
        Ok(Refuted::Made(steps))
    }
}
