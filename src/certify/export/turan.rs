//! The bound of a clique by cutting planes.
//!
//! Of n fragments that are close to one another, q = n div K of them on each mask and one more on some is best (Turan
//! 1941). Resolution has no short proof of it, not even that n = K + 1 fragments do not fit (Haken 1985); with sums it is one
//! step a fragment. Let s(m, j) say that at least j of the first i fragments are on mask m. Then
//!
//! ```text
//! prices among the first i  >=  sum over m and j of (j - 1) s(m, j)
//! ```
//!
//! by induction: when fragment i goes on mask m, each one there before costs 1, as many as there are s(m, j); they
//! become the terms (j + 1 - 1) s(m, j + 1), and all other masks stay as they are. In the end (j - 1) s(m, j) is at least
//! q s(m, j) - (q - j + 1) for j <= q and q s(m, j) beyond, and all s(m, j) together are n.

use std::io;

use encodings::Mask;

use super::counter::{Counter, Defined, Node};
use super::opb::Problem;
use super::pbp::{Proof, Sum};

/// A clique among the fragments of a problem.
pub struct Turan<'a> {
    problem: &'a Problem<'a>,
    members: &'a [u32],
    prefix: String,
    /// The names of the variables below.
    names: Vec<String>,
    /// "The member is on the mask", by member and mask: here, and in the problem.
    on: Vec<Vec<Option<(i32, i32)>>>,
    /// The price of each two members, the second one first.
    prices: Vec<Vec<i32>>,
}

/// How many members are on one mask.
#[derive(Clone, Default)]
struct Count {
    /// The members that may be on it, by their places.
    members: Vec<usize>,
    /// "On it", in their order.
    on: Vec<i32>,
    /// "At least j of them", from j = 1, with its definition.
    least: Vec<(i32, Defined)>,
}

impl<'a> Turan<'a> {
    /// The bound of some members. `prefix` makes the names of its counts its own.
    pub fn new(problem: &'a Problem<'a>, members: &'a [u32], prefix: String) -> Turan<'a> {
        let mut names = Vec::new();
        let mut local = |variable: i32| {
            names.push(problem.name(variable).to_owned());
            names.len() as i32
        };
        let instance = problem.features.instance;
        let (mut on, mut prices) = (Vec::new(), Vec::new());
        for (i, &member) in members.iter().enumerate() {
            let mut row = vec![None; usize::from(instance.masks())];
            let masks = instance.allowed(member).iter();
            for (variable, mask) in problem.masks_of(member).zip(masks) {
                row[usize::from(mask)] = Some((local(variable), variable));
            }
            on.push(row);
            let edges = members[..i].iter().map(|&other| edge(member, other));
            prices.push(edges.map(|edge| local(problem.price(&[edge]))).collect());
        }
        Turan {
            problem,
            members,
            prefix,
            names,
            on,
            prices,
        }
    }

    /// Derives that the prices of the clique are at least what Turan's theorem says; returns the number.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn show(mut self, proof: &mut Proof<'_>) -> io::Result<u64> {
        let masks = usize::from(self.problem.features.instance.masks());
        let mut counts = vec![Count::default(); masks];
        let mut shown = None;
        for member in 0..self.members.len() {
            let mut later = counts.clone();
            for (mask, count) in later.iter_mut().enumerate() {
                if let Some((on, _)) = self.on[member][mask] {
                    *count = self.counted(count, (member, on), proof)?;
                }
            }
            shown = Some(self.step(member, shown, &counts, &later, proof)?);
            counts = later;
        }
        self.end(shown, &counts, proof)
    }

    /// The count with one member more.
    fn counted(
        &mut self,
        before: &Count,
        (member, on): (usize, i32),
        proof: &mut Proof<'_>,
    ) -> io::Result<Count> {
        let mut count = before.clone();
        count.members.push(member);
        count.on.push(on);
        count.least.clear();
        let all = 0..count.on.len();
        let first = self.names.len() as i32;
        let outputs = all.clone().map(|j| (first + 1 + j as i32, j as u64 + 1));
        let outputs: Vec<(i32, u64)> = outputs.collect();
        for &(output, _) in &outputs {
            self.names.push(format!("t{}_{output}", self.prefix));
        }
        let counter = Counter {
            budget: 0,
            items: count.on.iter().map(|&on| (on, 1)).collect(),
            nodes: vec![Node {
                items: all,
                outputs: outputs.clone(),
            }],
        };
        for output in outputs {
            let defined = counter.define(0, output, &self.names, proof)?;
            count.least.push((output.0, defined));
        }
        Ok(count)
    }

    /// The induction: what holds with one member more, by contradiction.
    fn step(
        &self,
        member: usize,
        shown: Option<u64>,
        before: &[Count],
        after: &[Count],
        proof: &mut Proof<'_>,
    ) -> io::Result<u64> {
        let prices = self.prices[..=member].iter().flatten();
        let mut claim: Vec<(i32, u64)> = prices.map(|&price| (price, 1)).collect();
        let mut least = 0;
        for (j, &(output, _)) in after
            .iter()
            .flat_map(|count| count.least.iter().enumerate())
        {
            if j > 0 {
                claim.push((-output, j as u64));
                least += j as u64;
            }
        }
        let [some, _] = Problem::one_mask(self.members[member]);
        proof.by_contradiction(&claim, least, &self.names, |proof, negation| {
            let mut nowhere = Sum::of(some);
            for mask in self.masks_of(member) {
                let mut sum = Sum::of(negation);
                if let Some(shown) = shown {
                    sum.add(shown, 1);
                }
                self.pay(member, mask, &before[mask], &after[mask], &mut sum, proof)?;
                for other in self.masks_of(member).filter(|&other| other != mask) {
                    let counts = [&before[other], &after[other]];
                    self.stay(member, [mask, other], counts, &mut sum, proof)?;
                }
                sum.saturate();
                nowhere.add(proof.sum(&sum)?, 1);
            }
            proof.sum(&nowhere)?;
            Ok(())
        })
    }

    fn masks_of(&self, member: usize) -> impl Iterator<Item = usize> + Clone {
        let masks = 0..self.on[member].len();
        masks.filter(move |&mask| self.on[member][mask].is_some())
    }

    fn name(&self, variable: i32) -> &str {
        &self.names[variable as usize - 1]
    }

    /// The member goes on a mask: those there before cost 1 each.
    fn pay(
        &self,
        member: usize,
        mask: usize,
        before: &Count,
        after: &Count,
        sum: &mut Sum,
        proof: &mut Proof<'_>,
    ) -> io::Result<()> {
        for (other, &price) in self.prices[member].iter().enumerate() {
            if before.members.contains(&other) {
                sum.add(self.apart(member, other, mask as Mask), 1);
            } else {
                sum.axiom(self.name(price), true, 1);
            }
        }
        if !before.least.is_empty() {
            let defined = before.least.iter();
            let chain = defined.map(|&(output, defined)| (output, defined.only_if_reached));
            sum.add(self.together(chain, false, proof)?, 1);
        }
        for (j, (_, defined)) in before.least.iter().enumerate() {
            // At least j + 2 with the member: at least j + 1 without it.
            let mut clause = Sum::of(defined.if_reached);
            clause.add(after.least[j + 1].1.only_if_reached, 1);
            if let Some((on, _)) = self.on[member][mask] {
                clause.weaken(self.name(on));
            }
            clause.saturate();
            sum.add(proof.sum(&clause)?, j as u64 + 1);
        }
        Ok(())
    }

    /// The member goes on a mask, so the count of another one stays.
    fn stay(
        &self,
        member: usize,
        [mask, other]: [usize; 2],
        [before, after]: [&Count; 2],
        sum: &mut Sum,
        proof: &mut Proof<'_>,
    ) -> io::Result<()> {
        let (Some((on, _)), [_, one]) = (
            self.on[member][other],
            Problem::one_mask(self.members[member]),
        ) else {
            return Ok(());
        };
        let mut total = 0;
        for (j, (_, later)) in after.least.iter().enumerate().skip(1) {
            let mut clause = Sum::of(later.only_if_reached);
            match before.least.get(j) {
                Some((_, defined)) => clause.add(defined.if_reached, 1),
                // All of them, the member too.
                None => after
                    .on
                    .iter()
                    .filter(|&&each| each != on)
                    .for_each(|&each| clause.weaken(self.name(each))),
            }
            clause.saturate();
            sum.add(proof.sum(&clause)?, j as u64);
            total += j as u64;
        }
        if total > 0 {
            let mut not_both = Sum::of(one);
            for third in self.masks_of(member) {
                if let (Some((on, _)), false) =
                    (self.on[member][third], third == mask || third == other)
                {
                    not_both.weaken(self.name(on));
                }
            }
            sum.add(proof.sum(&not_both)?, total);
        }
        Ok(())
    }

    /// The clause "not both on the mask, or the price" of two members.
    fn apart(&self, member: usize, other: usize, mask: Mask) -> u64 {
        let edge = edge(self.members[member], self.members[other]);
        let on = self.on[member][usize::from(mask)].map(|(_, variable)| -variable);
        let clauses = self.problem.clauses_of(edge);
        let mut of_mask = clauses.filter(|(_, clause)| on.is_some_and(|on| clause.contains(&on)));
        of_mask.next().map_or(0, |(number, _)| number)
    }

    /// From "at least j, if s(j)" for j = 1, 2, ... to "as many as there are s(j)"; `negated` for the same of
    /// those that are not on the mask.
    fn together(
        &self,
        chain: impl Iterator<Item = (i32, u64)>,
        negated: bool,
        proof: &mut Proof<'_>,
    ) -> io::Result<u64> {
        let mut known: Option<u64> = None;
        let mut outputs = Vec::new();
        for (j, (output, defined)) in (1..).zip(chain) {
            let number = match known {
                None => defined,
                Some(known) => {
                    let mut sum = Sum::of(defined);
                    sum.add(known, j - 1);
                    for &output in &outputs {
                        sum.axiom(self.name(output), negated, 1);
                    }
                    sum.divide(j);
                    proof.sum(&sum)?
                }
            };
            known = Some(number);
            outputs.push(output);
        }
        Ok(known.unwrap_or(0))
    }

    /// From the terms (j - 1) s(m, j) to the bound.
    fn end(&self, shown: Option<u64>, counts: &[Count], proof: &mut Proof<'_>) -> io::Result<u64> {
        let each = (self.members.len() / counts.len()) as u64;
        let mut sum = Sum::of(shown.unwrap_or(0));
        for count in counts.iter().filter(|count| !count.least.is_empty()) {
            for (j, &(output, _)) in (0..).zip(&count.least) {
                sum.axiom(self.name(output), j > each, each.abs_diff(j));
            }
            // "At least j of those that are not there" is "less than so many of those that are".
            let chain = count.least.iter().rev();
            let chain = chain.map(|&(output, defined)| (output, defined.if_reached));
            sum.add(self.together(chain, true, proof)?, each);
        }
        for &member in self.members {
            let [some, _] = Problem::one_mask(member);
            sum.add(some, each);
        }
        proof.sum(&sum)
    }
}

fn edge(a: u32, b: u32) -> [u32; 2] {
    [a.min(b), a.max(b)]
}
