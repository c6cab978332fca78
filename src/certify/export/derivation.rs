//! A bound by its refutation, in the lines of a pseudo-Boolean proof: from "less than the limit" the clauses of
//! counters and budgets, then the steps one by one.

use std::collections::BTreeSet;
use std::io;

use rustc_hash::FxHashMap;

use super::bounds::Bound;
use super::counter::Defined;
use super::pbp::Proof;
use super::system::{Reason, Refutation};

/// The facts that hold of everything better than the colouring, by the numbers of their constraints.
#[derive(Default)]
pub struct Facts {
    /// "The unit is resolved", by its price in the problem.
    pub resolved: FxHashMap<i32, u64>,
    /// "The conflict bound is met", by its place.
    pub met: FxHashMap<u32, u64>,
}

impl Refutation {
    /// Derives the bound; returns the number of its constraint.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn show(&self, bound: &Bound<'_>, facts: &Facts, proof: &mut Proof<'_>) -> io::Result<u64> {
        let used = self.used();
        let defined = self.define(&used, proof)?;
        proof.by_contradiction(&self.own, bound.limit, &self.names, |proof, negation| {
            let mut budgets: Vec<u64> = bound.met.iter().map(|met| facts.met[met]).collect();
            budgets.push(negation);
            let mut numbers = self.derive(&used, &defined, &budgets, facts, proof)?;
            for (clause, hints) in self.steps.clauses.iter().zip(self.steps.hints.iter()) {
                let hints = hints.iter().map(|&hint| numbers[hint as usize - 1]);
                let number = proof.propagated(clause, &self.names, hints)?;
                numbers.push(number);
            }
            Ok(())
        })
    }

    /// Defines the outputs that the clauses in use speak of.
    fn define(&self, used: &[bool], proof: &mut Proof<'_>) -> io::Result<FxHashMap<i32, Defined>> {
        let mut defined = FxHashMap::default();
        let reasons = self.reasons.iter().zip(used).filter(|(_, used)| **used);
        let mut spoken: Vec<BTreeSet<i32>> = vec![BTreeSet::new(); self.counters.len()];
        for (reason, _) in reasons {
            if let Reason::Counted(counter, step) = reason {
                spoken[*counter].extend(step.literals().map(i32::abs));
            }
        }
        for (counter, spoken) in self.counters.iter().zip(&spoken) {
            for (node, outputs) in counter.nodes.iter().enumerate() {
                for &output in &outputs.outputs {
                    if spoken.contains(&output.0) {
                        let numbers = counter.define(node, output, &self.names, proof)?;
                        defined.insert(output.0, numbers);
                    }
                }
            }
        }
        Ok(defined)
    }

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
