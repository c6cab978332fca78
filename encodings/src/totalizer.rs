//! The incremental totalizer: a balanced tree of unary counters over literals.
//!
//! Output j of a node holds whenever at least j of the inputs below it hold (one direction: enough to
//! bound a sum from above by assuming an output false). Outputs are made on demand: asking for output j
//! adds the clauses of sums up to j only, so a core-guided search pays for the counts it reaches.
//!
//! Sources: Bailleux and Boufkhad, "Efficient CNF encoding of Boolean cardinality constraints", CP 2003;
//! Martins, Joshi, Manquinho and Lynce, "Incremental cardinality constraints for MaxSAT", CP 2014.
//! Where we differ: the tree splits the inputs in the order given, in halves. Inputs in spatial order
//! make every node a compact area of the layout, which changed refutation times by a factor of 100.

use crate::literal::{ClauseSink, Lit, VarAllocator};

#[derive(Clone, Debug)]
struct Node {
    /// The two nodes below; a leaf has none.
    below: Option<[u32; 2]>,
    size: u32,
    /// Outputs 1, 2, ... as far as they have been made.
    outputs: Vec<Lit>,
}

/// A counter over a list of literals.
#[derive(Clone, Debug)]
pub struct Totalizer {
    /// Children before parents; the root is the last one.
    nodes: Vec<Node>,
}

impl Totalizer {
    /// A counter over `inputs`, in this order. No clause is added before an output is asked for.
    pub fn new(inputs: &[Lit]) -> Totalizer {
        let mut nodes = Vec::with_capacity(inputs.len() * 2);
        if !inputs.is_empty() {
            build(inputs, &mut nodes);
        }
        Totalizer { nodes }
    }

    /// How many literals are counted.
    pub fn input_count(&self) -> u32 {
        self.nodes.last().map_or(0, |root| root.size)
    }

    /// The literal "at least `count` inputs hold" (implied, not equivalent), for `count` from 1;
    /// `None` where there are fewer inputs.
    pub fn at_least<S: ClauseSink + VarAllocator>(
        &mut self,
        count: u32,
        sink: &mut S,
    ) -> Option<Lit> {
        if count == 0 || count > self.input_count() {
            return None;
        }
        for node in 0..self.nodes.len() {
            self.extend(node, count, sink);
        }
        self.nodes
            .last()
            .and_then(|root| root.outputs.get(count as usize - 1).copied())
    }

    /// Gives a node its outputs up to `count`; the nodes below have theirs already.
    fn extend<S: ClauseSink + VarAllocator>(&mut self, node: usize, count: u32, sink: &mut S) {
        let Some([left, right]) = self.nodes[node].below else {
            return;
        };
        let had = self.nodes[node].outputs.len() as u32;
        let count = count.min(self.nodes[node].size);
        let mut outputs = std::mem::take(&mut self.nodes[node].outputs);
        outputs.extend((had..count).map(|_| sink.fresh()));
        let (left, right) = (
            &self.nodes[left as usize].outputs,
            &self.nodes[right as usize].outputs,
        );
        for sum in had + 1..=count {
            let output = outputs[sum as usize - 1];
            for i in sum.saturating_sub(right.len() as u32)..=sum.min(left.len() as u32) {
                let of = |outputs: &[Lit], n: u32| n.checked_sub(1).map(|n| !outputs[n as usize]);
                let clause = [of(left, i), of(right, sum - i), Some(output)];
                let clause: Vec<Lit> = clause.into_iter().flatten().collect();
                sink.clause(&clause);
            }
        }
        self.nodes[node].outputs = outputs;
    }
}

fn build(inputs: &[Lit], nodes: &mut Vec<Node>) -> u32 {
    let node = match inputs {
        &[input] => Node {
            below: None,
            size: 1,
            outputs: vec![input],
        },
        _ => {
            let (left, right) = inputs.split_at(inputs.len() / 2);
            let below = [build(left, nodes), build(right, nodes)];
            Node {
                below: Some(below),
                size: inputs.len() as u32,
                outputs: Vec::new(),
            }
        }
    };
    nodes.push(node);
    nodes.len() as u32 - 1
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use crate::literal::Formula;

    /// For up to five inputs, every order of asking for outputs and every assignment: assuming "not at
    /// least j" is possible exactly when fewer than j inputs hold.
    #[test]
    fn counts_like_plain_addition() {
        for n in 1..=5u32 {
            for (first, second) in (1..=n).flat_map(|j| (1..=n).map(move |k| (j, k))) {
                let mut formula = Formula::default();
                let inputs: Vec<Lit> = (0..n).map(|_| formula.fresh()).collect();
                let mut totalizer = Totalizer::new(&inputs);
                let one = totalizer.at_least(first, &mut formula).unwrap();
                let two = totalizer.at_least(second, &mut formula).unwrap();
                for bits in 0..1u32 << n {
                    for (output, count) in [(one, first), (two, second)] {
                        let mut fixed: Vec<Lit> = (0..n as usize)
                            .map(|i| {
                                if bits >> i & 1 == 1 {
                                    inputs[i]
                                } else {
                                    !inputs[i]
                                }
                            })
                            .collect();
                        fixed.push(!output);
                        assert_eq!(
                            formula.satisfiable_with(&fixed),
                            bits.count_ones() < count,
                            "{n} inputs {bits:b}, asked {first} then {second}, output {count}"
                        );
                    }
                }
            }
        }
    }

    #[test]
    fn no_output_beyond_the_inputs() {
        let mut formula = Formula::default();
        let inputs: Vec<Lit> = (0..3).map(|_| formula.fresh()).collect();
        assert_eq!(Totalizer::new(&inputs).at_least(4, &mut formula), None);
        assert_eq!(Totalizer::new(&inputs).at_least(0, &mut formula), None);
        assert_eq!(Totalizer::new(&[]).at_least(1, &mut formula), None);
    }
}
