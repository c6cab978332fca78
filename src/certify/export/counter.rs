//! A counter over prices with a pseudo-Boolean proof of each of its clauses.
//!
//! The generalized totalizer of the canonical formula (Joshi, Martins, Manquinho, CP 2015). An output o of value
//! v over items of total weight T is defined by two constraints, "o, if the items weigh v" and "the items weigh v, if o":
//!
//! ```text
//! sum(w ~e) + (T - v + 1) o >= T - v + 1        sum(w e) + v ~o >= v
//! ```
//!
//! Those of an output and of two inputs add up to the clause "output, if both inputs", and a budget and those of
//! two inputs to "not both inputs" (Vandesande, De Wulf, Bogaerts, "QMaxSATpb", LPNMR 2022, for weights of 1).

use std::io;
use std::ops::Range;

use rustc_hash::FxHashSet;

use super::pbp::Proof;

/// A price, or an output, and what it weighs. Variables are those of a [`Refutation`](super::system::Refutation).
pub type Weighed = (i32, u64);

/// The counter over some prices.
pub struct Counter {
    /// The budget of the statement that it belongs to.
    pub budget: usize,
    /// The prices in order.
    pub items: Vec<Weighed>,
    /// The nodes, children before parents; leaves are none.
    pub nodes: Vec<Node>,
}

/// An inner node.
pub struct Node {
    /// Its items.
    pub items: Range<usize>,
    /// Its outputs by ascending value.
    pub outputs: Vec<Weighed>,
}

/// A clause of a counter: "not left, or not right, or output"; values of 0 are always reached, and without an output
/// the values exceed the budget.
pub struct Step {
    /// The node.
    pub node: usize,
    /// The input from its left half.
    pub left: Option<Weighed>,
    /// The input from its right half.
    pub right: Option<Weighed>,
    /// The output.
    pub output: Option<Weighed>,
}

impl Step {
    /// The clause.
    pub fn literals(&self) -> impl Iterator<Item = i32> {
        let inputs = [self.left, self.right].into_iter().flatten();
        let inputs = inputs.map(|(input, _)| -input);
        inputs.chain(self.output.map(|(output, _)| output))
    }
}

/// The counter in the making.
pub struct Builder<'a> {
    /// The counter.
    pub counter: Counter,
    /// Its clauses.
    pub steps: Vec<Step>,
    /// The most that may be spent.
    pub most: u64,
    /// Gives variables.
    pub fresh: &'a mut dyn FnMut() -> i32,
}

impl Builder<'_> {
    /// Adds the nodes over a range of the items; returns the outputs.
    pub fn build(&mut self, items: Range<usize>) -> Vec<Weighed> {
        if items.len() < 2 {
            return self.counter.items[items].to_vec();
        }
        let middle = items.start + items.len() / 2;
        let zero = || std::iter::once(None);
        let left = self.build(items.start..middle);
        let right = self.build(middle..items.end);
        let left: Vec<Option<Weighed>> = zero().chain(left.into_iter().map(Some)).collect();
        let right: Vec<Option<Weighed>> = zero().chain(right.into_iter().map(Some)).collect();
        let value = |input: Option<Weighed>| input.map_or(0, |(_, value)| value);
        let sums = left
            .iter()
            .flat_map(|&x| right.iter().map(move |&y| value(x) + value(y)));
        let mut values: Vec<u64> = sums.filter(|sum| (1..=self.most).contains(sum)).collect();
        values.sort_unstable();
        values.dedup();
        let outputs: Vec<Weighed> = values.iter().map(|&v| ((self.fresh)(), v)).collect();
        let node = self.counter.nodes.len();
        for &left in &left {
            for &right in &right {
                let sum = value(left) + value(right);
                let output = values.binary_search(&sum).ok().map(|at| outputs[at]);
                if sum > 0 {
                    self.steps.push(Step {
                        node,
                        left,
                        right,
                        output,
                    });
                }
            }
        }
        let node = Node {
            items,
            outputs: outputs.clone(),
        };
        self.counter.nodes.push(node);
        outputs
    }
}

/// The numbers of the two constraints that define an output.
#[derive(Clone, Copy)]
pub struct Defined {
    /// "The output, if the items weigh its value."
    pub if_reached: u64,
    /// "The items weigh its value, if the output."
    pub only_if_reached: u64,
}

impl Counter {
    fn weight(&self, items: Range<usize>) -> u64 {
        self.items[items].iter().map(|&(_, weight)| weight).sum()
    }

    /// Defines an output of a node.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn define(
        &self,
        node: usize,
        (output, value): Weighed,
        names: &[String],
        proof: &mut Proof<'_>,
    ) -> io::Result<Defined> {
        let items = &self.items[self.nodes[node].items.clone()];
        let own = &names[output as usize - 1];
        let sum = items.iter().map(|&(price, weight)| (price, weight));
        let only: Vec<Weighed> = sum.clone().chain([(-output, value)]).collect();
        let only_if_reached = proof.redundant(&only, value, names, &format!("{own} -> 0"))?;
        let rest = self.weight(self.nodes[node].items.clone()) - value + 1;
        let sum = sum.map(|(price, weight)| (-price, weight));
        let reached: Vec<Weighed> = sum.chain([(output, rest)]).collect();
        let if_reached = proof.redundant(&reached, rest, names, &format!("{own} -> 1"))?;
        Ok(Defined {
            if_reached,
            only_if_reached,
        })
    }

    /// From a budget over `budgeted` the same over the items of a node, which are among them.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn within(
        &self,
        node: usize,
        (budget, budgeted): (u64, &[i32]),
        names: &[String],
        proof: &mut Proof<'_>,
    ) -> io::Result<u64> {
        let items = &self.items[self.nodes[node].items.clone()];
        let own: FxHashSet<i32> = items.iter().map(|&(price, _)| price).collect();
        let outside = budgeted.iter().filter(|price| !own.contains(price));
        let outside = outside.map(|&price| format!("{} w", names[price as usize - 1]));
        let words: Vec<String> = [budget.to_string()].into_iter().chain(outside).collect();
        proof.polish(&words)
    }

    /// Derives a clause of a node from the constraint `from`: "output, if the items weigh that much", or the
    /// budget [within](Self::within) the node. `defined` gives the definition of an output, nothing for a price.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn derive(
        &self,
        step: &Step,
        from: u64,
        defined: &dyn Fn(i32) -> Option<Defined>,
        names: &[String],
        proof: &mut Proof<'_>,
    ) -> io::Result<u64> {
        let items = self.nodes[step.node].items.clone();
        let middle = items.start + items.len() / 2;
        let halves = [items.start..middle, middle..items.end];
        let mut words = vec![from.to_string()];
        for (input, items) in [step.left, step.right].into_iter().zip(halves) {
            match input {
                None => words.extend(
                    self.items[items]
                        .iter()
                        .map(|&(price, _)| format!("{} w", names[price as usize - 1])),
                ),
                // A price is its own definition.
                Some((input, _)) => {
                    words.extend(defined(input).map(|input| format!("{} +", input.only_if_reached)))
                }
            }
        }
        words.push("s".to_owned());
        proof.polish(&words)
    }
}
