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
use rustc_hash::FxHashMap;

use super::super::features::Features;
use super::super::store::ProofStore;
use super::ExportError;
use super::bounds::Bound;
use super::counter::Defined;
use super::opb::Problem;
use super::pbp::Proof;
use super::system::{Reason, Refutation, refute};
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
    let refutations = each.map(|(i, bound)| refute(&problem, bound, i.to_string()));
    let refutations: Vec<Refutation> = refutations.collect::<Result<_, _>>()?;
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
    refutations: &'a [Refutation],
}

/// The facts that hold of everything better than the colouring, by the numbers of their constraints.
#[derive(Default)]
struct Facts {
    /// "The unit is resolved", by its price in the problem.
    resolved: FxHashMap<i32, u64>,
    /// "The conflict bound is met", by its place.
    met: FxHashMap<u32, u64>,
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
        let (first, second) = self
            .refutations
            .split_at(self.certificate.conflict_bounds.len());
        let none = Facts::default();
        let mut shown = Vec::with_capacity(first.len());
        for (bound, refutation) in self.bounds.iter().zip(first) {
            shown.push(show(bound, refutation, &none, proof)?);
        }
        let mut sum: Vec<String> = added(&shown);
        if !sum.is_empty() {
            sum.push(format!("{weight} *"));
        }
        if !second.is_empty() {
            let facts = self.facts(better, &shown, proof)?;
            for (bound, refutation) in self.bounds[first.len()..].iter().zip(second) {
                let bound = show(bound, refutation, &facts, proof)?;
                let plus = if sum.is_empty() { "" } else { " +" };
                sum.push(format!("{bound}{plus}"));
            }
        }
        let by = if sum.is_empty() {
            proof.nothing()?
        } else {
            proof.polish(&sum)?
        };
        let cost = |conflicts: u64, stitches: u64| {
            u128::from(weight) * u128::from(conflicts) + u128::from(stitches)
        };
        let lower = cost(conflicts.lower, stitches.lower);
        proof.end(lower, by, cost(conflicts.upper, stitches.upper))
    }

    /// What the stitch bounds rely on. `better` says that the objective is less than that of the colouring, which has
    /// as many conflicts as the bounds that were `shown` add up to.
    fn facts(&self, better: u64, shown: &[u64], proof: &mut Proof<'_>) -> io::Result<Facts> {
        let problem = self.problem;
        proof.comment("no more conflicts than the colouring has")?;
        let stitches = problem.stitches.iter();
        let mut words = vec![better.to_string()];
        words.extend(stitches.map(|&(price, _)| format!("{} w", problem.name(price))));
        words.push(format!("{} d", problem.conflict_weight()));
        let few = proof.polish(&words)?;
        let mut facts = Facts::default();

        let stitch_bounds = &self.bounds[shown.len()..];
        let needed = stitch_bounds
            .iter()
            .flat_map(|bound| &bound.statement.resolved);
        let needed: BTreeSet<i32> = needed.map(|unit| problem.price(unit)).collect();
        if !needed.is_empty() {
            proof.comment("what is outside all bounds is resolved")?;
            let rest = [few.to_string()].into_iter();
            let bounds = shown.iter().map(|bound| format!("{bound} +"));
            let outside = proof.polish(&rest.chain(bounds).collect::<Vec<_>>())?;
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
            let outside = problem.units.iter().filter(|price| !within.contains(price));
            let outside = outside.map(|&price| format!("{} w", problem.name(price)));
            let rest = [few.to_string()].into_iter();
            let few = proof.polish(&rest.chain(outside).collect::<Vec<_>>())?;
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
        let others = shown[halves[other].clone()].iter();
        let mut words = vec![few.to_string()];
        words.extend(others.map(|bound| format!("{bound} +")));
        let few = proof.polish(&words)?;
        meet(few, halves[half].clone(), shown, met, facts, proof)?;
    }
    Ok(())
}

/// The sum of some constraints, in reverse Polish notation.
fn added(numbers: &[u64]) -> Vec<String> {
    let plus = |(i, number)| format!("{number}{}", if i > 0 { " +" } else { "" });
    numbers.iter().enumerate().map(plus).collect()
}

/// Derives a bound; returns the number of its constraint.
fn show(
    bound: &Bound<'_>,
    refutation: &Refutation,
    facts: &Facts,
    proof: &mut Proof<'_>,
) -> io::Result<u64> {
    let Refutation { names, own, .. } = refutation;
    proof.comment(&bound.name)?;
    let used = refutation.used();
    let defined = define(refutation, &used, proof)?;
    proof.by_contradiction(own, bound.limit, names, |proof, negation| {
        let mut budgets: Vec<u64> = bound.met.iter().map(|met| facts.met[met]).collect();
        budgets.push(negation);
        let mut numbers = refutation.derive(&used, &defined, &budgets, facts, proof)?;
        let steps = &refutation.steps;
        for (clause, hints) in steps.clauses.iter().zip(steps.hints.iter()) {
            let hints = hints.iter().map(|&hint| numbers[hint as usize - 1]);
            let number = proof.propagated(clause, names, hints)?;
            numbers.push(number);
        }
        Ok(())
    })
}

/// Defines the outputs that the clauses in use speak of.
fn define(
    refutation: &Refutation,
    used: &[bool],
    proof: &mut Proof<'_>,
) -> io::Result<FxHashMap<i32, Defined>> {
    let mut defined = FxHashMap::default();
    let reasons = refutation
        .reasons
        .iter()
        .zip(used)
        .filter(|(_, used)| **used);
    let mut spoken: Vec<BTreeSet<i32>> = vec![BTreeSet::new(); refutation.counters.len()];
    for (reason, _) in reasons {
        if let Reason::Counted(counter, step) = reason {
            spoken[*counter].extend(step.literals().map(i32::abs));
        }
    }
    for (counter, spoken) in refutation.counters.iter().zip(&spoken) {
        for (node, outputs) in counter.nodes.iter().enumerate() {
            for &output in &outputs.outputs {
                if spoken.contains(&output.0) {
                    let numbers = counter.define(node, output, &refutation.names, proof)?;
                    defined.insert(output.0, numbers);
                }
            }
        }
    }
    Ok(defined)
}

impl Refutation {
    /// Which of its clauses the steps need.
    fn used(&self) -> Vec<bool> {
        let mut used = vec![false; self.clauses.len()];
        for &hint in self.steps.hints.iter().flatten() {
            if let Some(used) = used.get_mut(hint as usize - 1) {
                *used = true;
            }
        }
        used
    }

    /// Derives the clauses in use; returns the numbers of all clauses, 0 for those that are not.
    fn derive(
        &self,
        used: &[bool],
        defined: &FxHashMap<i32, Defined>,
        budgets: &[u64],
        facts: &Facts,
        proof: &mut Proof<'_>,
    ) -> io::Result<Vec<u64>> {
        let own = budgets.last().copied();
        let defined = |output: i32| defined.get(&output).copied();
        let mut within: FxHashMap<(usize, usize), u64> = FxHashMap::default();
        let mut numbers = Vec::with_capacity(self.clauses.len() + self.steps.clauses.len());
        for ((clause, reason), &used) in self.clauses.iter().zip(&self.reasons).zip(used) {
            let number = match reason {
                _ if !used => 0,
                Reason::Given(number) => *number,
                Reason::Resolved(price) => facts.resolved[price],
                Reason::Unaffordable => proof.propagated(clause, &self.names, own.into_iter())?,
                Reason::Counted(at, step) => {
                    let counter = &self.counters[*at];
                    let output = step.output.and_then(|(output, _)| defined(output));
                    let from = match (output, within.get(&(*at, step.node))) {
                        (Some(output), _) => output.if_reached,
                        (None, Some(&within)) => within,
                        (None, None) => {
                            let budget = (budgets[counter.budget], &*self.budgets[counter.budget]);
                            let number = counter.within(step.node, budget, &self.names, proof)?;
                            within.insert((*at, step.node), number);
                            number
                        }
                    };
                    counter.derive(step, from, &defined, &self.names, proof)?
                }
            };
            numbers.push(number);
        }
        Ok(numbers)
    }
}
