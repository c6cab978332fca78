//! The whole claim as one pseudo-Boolean problem and one proof of it, for VeriPB 3.0.
//!
//! The proof logs the colouring and derives each conflict bound, "the prices of its units add up to at least its
//! limit", by contradiction; their sum bounds the conflicts. Where that sum is what the colouring costs, anything better
//! than the colouring has as many conflicts: so each bound is met exactly and every unit outside is resolved, and each stitch
//! bound follows in the same way. The sum of all is the bound on the objective.
//! Source: Bogaerts, Gocht, McCreesh, Nordström, "Certified dominance and symmetry breaking for combinatorial
//! optimisation" (JAIR 2023) for the rules; the VeriPB 3.0 format overview that comes with the checker.

use std::collections::BTreeSet;
use std::io::{self, Write};
use std::ops::Range;

use rayon::prelude::*;

use super::super::features::Features;
use super::super::store::ProofStore;
use super::ExportError;
use super::bounds::Bound;
use super::derivation::Facts;
use super::opb::Problem;
use super::pbp::{Proof, Sum};
use super::system::{Refutation, refute};
use super::turan::Turan;
use crate::certificate::Certificate;

/// The problem.
pub const PROBLEM: &str = "claim.opb";
/// The proof.
pub const PROOF: &str = "claim.pbp";

/// Writes both files.
///
/// # Errors
/// See [`ExportError`].
pub fn write(
    features: &Features<'_>,
    certificate: &Certificate,
    bounds: &[Bound<'_>],
    store: &dyn ProofStore,
) -> Result<(), ExportError> {
    let fragments: Vec<u32> = (0..features.instance.fragment_count() as u32).collect();
    let problem = Problem::new(features, &fragments)
        .ok_or_else(|| ExportError::TooLong("the whole claim".to_owned()))?;
    store.put(PROBLEM, &|out| problem.write(out))?;
    let each = bounds.par_iter().enumerate().with_max_len(1);
    let refutations = each.map(|(i, bound)| match bound.clique() {
        Some(_) => Ok(None),
        None => refute(&problem, bound, i.to_string()).map(Some),
    });
    let refutations: Vec<Option<Refutation>> = refutations.collect::<Result<_, _>>()?;
    let claim = Claim {
        problem: &problem,
        certificate,
        bounds,
        refutations: &refutations,
    };
    store.put(PROOF, &|out| claim.prove(out))?;
    Ok(())
}

struct Claim<'a> {
    problem: &'a Problem<'a>,
    certificate: &'a Certificate,
    bounds: &'a [Bound<'a>],
    /// Of all bounds but those of cliques.
    refutations: &'a [Option<Refutation>],
}

impl Claim<'_> {
    fn prove(&self, out: &mut dyn Write) -> io::Result<()> {
        let Certificate {
            conflicts,
            stitches,
            ..
        } = self.certificate;
        let weight = self.problem.conflict_weight();
        let proof = &mut Proof::begin(out, self.problem.constraint_count())?;
        let values = self.problem.values(&self.certificate.colours);
        let variables = (1..).zip(&values);
        let better = proof.solution(variables.map(|(v, &value)| (self.problem.name(v), value)))?;
        let first = self.certificate.conflict_bounds.len();
        let none = Facts::default();
        let mut shown = Vec::with_capacity(first);
        for at in 0..first {
            shown.push(self.show(at, &none, proof)?);
        }
        let mut sum = Sum::default();
        shown.iter().for_each(|&bound| sum.add(bound, weight));
        if first < self.bounds.len() {
            let facts = self.facts(better, &shown, proof)?;
            for at in first..self.bounds.len() {
                sum.add(self.show(at, &facts, proof)?, 1);
            }
        }
        let by = if sum.is_empty() {
            proof.nothing()?
        } else {
            proof.sum(&sum)?
        };
        let cost = |conflicts: u64, stitches: u64| {
            u128::from(weight) * u128::from(conflicts) + u128::from(stitches)
        };
        let lower = cost(conflicts.lower, stitches.lower);
        proof.end(lower, by, cost(conflicts.upper, stitches.upper))
    }

    /// Derives a bound; returns the number of its constraint.
    fn show(&self, at: usize, facts: &Facts, proof: &mut Proof<'_>) -> io::Result<u64> {
        let bound = &self.bounds[at];
        proof.comment(&bound.name)?;
        match (&self.refutations[at], bound.clique()) {
            (Some(refutation), _) => refutation.show(bound, facts, proof),
            (None, clique) => {
                let members = clique.unwrap_or_default();
                let by = Turan::new(self.problem, members, at.to_string()).show(proof)?;
                self.all_units(bound, by, proof)
            }
        }
    }

    /// From a sum of some of a bound's units to that of all.
    fn all_units(&self, bound: &Bound<'_>, by: u64, proof: &mut Proof<'_>) -> io::Result<u64> {
        let own = bound.statement.budgets.iter();
        let own = own.flat_map(|budget| &budget.items);
        let prices = own.map(|item| self.problem.price(item.edges()));
        let names: Vec<String> = prices
            .map(|price| self.problem.name(price).to_owned())
            .collect();
        let sum: Vec<(i32, u64)> = (1..=names.len() as i32).map(|i| (i, 1)).collect();
        proof.implied(&sum, bound.limit, &names, by)
    }

    /// What the stitch bounds rely on. `better` says that the objective is less than that of the colouring, which has
    /// as many conflicts as the bounds that were `shown` add up to.
    fn facts(&self, better: u64, shown: &[u64], proof: &mut Proof<'_>) -> io::Result<Facts> {
        let problem = self.problem;
        proof.comment("no more conflicts than the colouring has")?;
        let mut few = Sum::of(better);
        for &(price, _) in &problem.stitches {
            few.weaken(problem.name(price));
        }
        few.divide(problem.conflict_weight());
        let few = proof.sum(&few)?;
        let mut facts = Facts::default();

        let stitch_bounds = &self.bounds[shown.len()..];
        let needed = stitch_bounds
            .iter()
            .flat_map(|bound| &bound.statement.resolved);
        let needed: BTreeSet<i32> = needed.map(|unit| problem.price(unit)).collect();
        if !needed.is_empty() {
            proof.comment("what is outside all bounds is resolved")?;
            let mut outside = Sum::of(few);
            shown.iter().for_each(|&bound| outside.add(bound, 1));
            let outside = proof.sum(&outside)?;
            for &price in &needed {
                let name = [problem.name(price).to_owned()];
                let number = proof.propagated(&[-1], &name, [outside].into_iter())?;
                facts.resolved.insert(price, number);
            }
        }

        let met = stitch_bounds
            .iter()
            .flat_map(|bound| bound.met.iter().copied());
        let met: BTreeSet<u32> = met.collect();
        if !met.is_empty() {
            proof.comment("bounds that are met")?;
            let within = self.certificate.conflict_bounds.iter();
            let within = within.flat_map(|bound| &bound.units);
            let within: BTreeSet<i32> = within.map(|unit| problem.price(unit)).collect();
            let mut inside = Sum::of(few);
            for &price in problem.units.iter().filter(|price| !within.contains(price)) {
                inside.weaken(problem.name(price));
            }
            let few = proof.sum(&inside)?;
            let all = 0..shown.len();
            meet(few, all, shown, &met, &mut facts, proof)?;
        }
        Ok(facts)
    }
}

/// From "no more conflicts than that" over the bounds in `range` to "the bound is met", for each in `met`: all
/// others are taken off at their limits, half of them at a time.
fn meet(
    few: u64,
    range: Range<usize>,
    shown: &[u64],
    met: &BTreeSet<u32>,
    facts: &mut Facts,
    proof: &mut Proof<'_>,
) -> io::Result<()> {
    let here = range.start as u32..range.end as u32;
    if met.range(here).next().is_none() {
        return Ok(());
    }
    if range.len() == 1 {
        facts.met.insert(range.start as u32, few);
        return Ok(());
    }
    let middle = range.start + range.len() / 2;
    let halves = [range.start..middle, middle..range.end];
    for (half, other) in [(0, 1), (1, 0)] {
        let mut fewer = Sum::of(few);
        for &bound in &shown[halves[other].clone()] {
            fewer.add(bound, 1);
        }
        let few = proof.sum(&fewer)?;
        meet(few, halves[half].clone(), shown, met, facts, proof)?;
    }
    Ok(())
}
