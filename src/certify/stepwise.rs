//! Refutations of large bounds, step by step along the counter.
//!
//! A bound of a large limit is dear to refute at one go: the solver has to find the places that cost
//! something again and again. So each node of the counter, children before parents, is asked on its own how
//! much its units cost at least, with what is known of the nodes below it; the answer is a lemma, "the
//! output of this value holds". At the root, what is left to show is small.
//!
//! A lemma is a refutation of the node's own clauses together with "the output does not hold". Whatever was
//! derived from that assumption gets the output as a literal, so that the assumption is none any more, and the
//! empty clause becomes the lemma. (Stratified lower bounds along a tree of cardinalities are those of
//! Martins, Joshi, Manquinho and Lynce, "Incremental cardinality constraints for MaxSAT", CP 2014; the
//! lemmas and their proofs are ours.)

use rustc_hash::FxHashMap;

use super::formula::Outline;
use crate::solve::Stop;
use crate::solve::refutation::{Effort, Lists, Refutation, Steps, refute};

/// A node of fewer prices than this is left to its parent.
const LEAST_PRICES: usize = 6;

/// Refutes a formula along the counter of its last budget. Where that takes too much, or does not come to
/// a refutation: the limit that was shown on the way.
pub fn refute_stepwise(
    formula: &Lists,
    outline: &Outline,
    effort: Effort,
    stop: &Stop,
) -> Result<Steps, u64> {
    let mut proof = Proof {
        formula,
        outline,
        steps: Steps::default(),
        effort,
        stop,
        lemmas: FxHashMap::default(),
    };
    for node in 0..outline.nodes.len() {
        match proof.raise(node) {
            Some(true) => return Ok(proof.steps),
            Some(false) => {}
            None => break,
        }
    }
    Err(proof.shown())
}

struct Proof<'a> {
    formula: &'a Lists,
    outline: &'a Outline,
    steps: Steps,
    effort: Effort,
    stop: &'a Stop,
    /// For each node of which something is known its value and the numbers of the lemmas about it.
    lemmas: FxHashMap<usize, (u64, i32)>,
}

/// How an attempt at a lemma ended.
enum Ended {
    Lemma,
    /// The empty clause was derived.
    Refuted,
    Satisfiable,
    Stopped,
}

impl Proof<'_> {
    /// Proves as much as holds of a node; says whether that refuted the formula. `None` when stopped.
    fn raise(&mut self, node: usize) -> Option<bool> {
        let outline = &self.outline.nodes[node];
        let is_root = node + 1 == self.outline.nodes.len();
        if outline.items.len() < LEAST_PRICES && !is_root {
            return Some(false);
        }
        let clauses = self.clauses_of(node);
        let below = outline.children.iter().map(|child| self.value(*child));
        let mut known: u64 = below.sum();
        loop {
            // The outputs are ascending from 1: of unit weights every value up to the budget has one.
            let output = outline.outputs.get(known as usize).copied();
            match self.lemma(node, &clauses, output) {
                Ended::Lemma => known += 1,
                Ended::Refuted => return Some(true),
                Ended::Satisfiable => break,
                Ended::Stopped => return None,
            }
        }
        // Where nothing more than the children's sum holds, it is a lemma all the same: it follows.
        if known > 0 && self.lemmas.get(&node).is_none_or(|lemma| lemma.0 < known) {
            let output = outline.outputs.get(known as usize - 1).copied();
            match self.lemma(node, &clauses, output) {
                Ended::Lemma => {}
                Ended::Refuted => return Some(true),
                Ended::Satisfiable | Ended::Stopped => return None,
            }
        }
        Some(false)
    }

    fn value(&self, node: usize) -> u64 {
        self.lemmas.get(&node).map_or(0, |lemma| lemma.0)
    }

    /// What the lemmas about nodes that share no unit add up to, from the root down.
    fn shown(&self) -> u64 {
        let mut open: Vec<usize> = self
            .outline
            .nodes
            .len()
            .checked_sub(1)
            .into_iter()
            .collect();
        let mut shown = 0;
        while let Some(node) = open.pop() {
            match self.value(node) {
                0 => open.extend(&self.outline.nodes[node].children),
                value => shown += value,
            }
        }
        shown
    }

    /// The numbers of the clauses that speak of the units below a node.
    fn clauses_of(&self, node: usize) -> Vec<i32> {
        let node = &self.outline.nodes[node];
        let mut clauses: Vec<u32> = self.outline.common.clone().collect();
        clauses.extend(node.counter.clone());
        let mut fragments: Vec<u32> = self.outline.fragments_of_common.clone();
        for item in node.items.clone() {
            let item = &self.outline.items[item];
            clauses.extend(item.clauses.clone());
            fragments.extend(&item.fragments);
        }
        fragments.sort_unstable();
        fragments.dedup();
        for at in fragments {
            clauses.extend(self.outline.masks[at as usize].clone());
        }
        clauses.sort_unstable();
        clauses
            .into_iter()
            .map(|clause| clause as i32 + 1)
            .collect()
    }

    /// Tries for the lemma that an output holds; without one, for the empty clause.
    fn lemma(&mut self, node: usize, clauses: &[i32], output: Option<i32>) -> Ended {
        let mut local = Lists::default();
        let mut numbers = clauses.to_vec();
        for &number in clauses {
            local.push(self.formula.get(number as usize - 1).iter().copied());
        }
        let below = self.below(node);
        for &(lemma, number) in &below {
            local.push([lemma]);
            numbers.push(number);
        }
        if let Some(output) = output {
            local.push([-output]);
        }
        let spent = self.steps.clauses.number_count() + self.steps.hints.number_count();
        let effort = Effort {
            most: self.effort.most.saturating_sub(spent),
            sure: self.effort.sure.saturating_sub(spent),
        };
        match refute(&local, effort, self.stop) {
            Refutation::Stopped => Ended::Stopped,
            Refutation::Satisfiable => Ended::Satisfiable,
            Refutation::Proof(steps) => match super::lrat::trim(&local, &steps) {
                Ok(steps) => self.take_in(node, &numbers, output, &steps),
                Err(_) => Ended::Stopped,
            },
        }
    }

    /// The lemmas about a node and those below it, the nearest only.
    fn below(&self, node: usize) -> Vec<(i32, i32)> {
        if let Some(&(value, number)) = self.lemmas.get(&node) {
            let output = self.outline.nodes[node].outputs[value as usize - 1];
            let mut lemmas = vec![(output, number)];
            lemmas.extend(self.below_children(node));
            return lemmas;
        }
        self.below_children(node)
    }

    fn below_children(&self, node: usize) -> Vec<(i32, i32)> {
        let children = self.outline.nodes[node].children.iter();
        children.flat_map(|&child| self.below(child)).collect()
    }

    /// Takes the steps of a local refutation in: local numbers become those of the whole, and what
    /// depends on the assumption says so.
    fn take_in(
        &mut self,
        node: usize,
        numbers: &[i32],
        output: Option<i32>,
        steps: &Steps,
    ) -> Ended {
        let assumption = output.map(|_| numbers.len());
        let given = numbers.len() + usize::from(assumption.is_some());
        let mut number = numbers.to_vec();
        let mut depends = vec![false; numbers.len()];
        if assumption.is_some() {
            number.push(0);
            depends.push(true);
        }
        for (clause, hints) in steps.clauses.iter().zip(steps.hints.iter()) {
            let places = hints.iter().map(|&hint| hint as usize - 1);
            let dependent = places.clone().any(|place| depends[place]);
            let extra = output.filter(|_| dependent);
            if extra.is_some_and(|lit| clause.contains(&-lit)) {
                return Ended::Stopped;
            }
            // A clause that has the literal already does not get it twice.
            let extra = extra.filter(|lit| !clause.contains(lit));
            self.steps.clauses.push(clause.iter().copied().chain(extra));
            let kept = places.filter(|&place| Some(place) != assumption);
            self.steps.hints.push(kept.map(|place| number[place]));
            number.push((self.formula.len() + self.steps.clauses.len()) as i32);
            depends.push(dependent);
        }
        debug_assert_eq!(number.len(), given + steps.clauses.len());
        let (Some(output), true) = (output, depends.last().copied().unwrap_or(false)) else {
            return Ended::Refuted;
        };
        let outputs = &self.outline.nodes[node].outputs;
        let value = outputs.iter().position(|&lit| lit == output).unwrap_or(0) as u64 + 1;
        let number = number.last().copied().unwrap_or(0);
        self.lemmas.insert(node, (value, number));
        Ended::Lemma
    }
}
