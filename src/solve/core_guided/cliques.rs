//! Cliques of more than K fragments: the first bounds, without a solver.
//!
//! Lemma. In a clique of n fragments, every two joined by a conflict edge, each two on one mask leave their
//! pair unresolved, whatever masks each may take. With n = qK + r that is least where the masks are used
//! evenly: r (q+1 choose 2) + (K-r) (q choose 2), the edges that Turan's theorem says a graph without
//! K+1 mutually distinct parts must lack (Turan 1941). Cliques that share no pair are bounds side by side.
//!
//! Found greedily: from each fragment on, later neighbours are added in order, with backtracking up to a
//! fixed number of steps a fragment until there are K+1, then whatever else fits. Missing one costs time
//! only.

use encodings::Instance;

/// Steps of backtracking for each fragment.
const MOST_STEPS: usize = 200;

/// The largest clique that is looked for, in fragments.
const MOST_MEMBERS: usize = 64;

/// A clique: its pairs, ascending, and how many of them stay unresolved at least.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Clique {
    /// The pairs.
    pub pairs: Vec<u32>,
    /// The least number of unresolved ones.
    pub limit: u32,
}

/// Cliques that share no pair.
pub fn disjoint_cliques(instance: &Instance) -> Vec<Clique> {
    let mut search = Search {
        later: later_neighbours(instance),
        used: vec![false; instance.pair_count()],
        masks: instance.masks() as usize,
        steps: 0,
    };
    let mut found = Vec::new();
    for fragment in 0..instance.fragment_count() as u32 {
        while let Some(clique) = search.from(fragment) {
            for &pair in &clique.pairs {
                search.used[pair as usize] = true;
            }
            found.push(clique);
        }
    }
    found
}

/// The least number of pairs within one mask when `members` fragments are spread over `masks`.
fn least_unresolved(members: usize, masks: usize) -> u32 {
    let (each, more) = (members / masks, members % masks);
    let pairs = |n: usize| n * n.saturating_sub(1) / 2;
    (more * pairs(each + 1) + (masks - more) * pairs(each)) as u32
}

struct Search {
    /// For each fragment its later neighbours, ascending, and the pairs that join them.
    later: Vec<Vec<(u32, u32)>>,
    used: Vec<bool>,
    masks: usize,
    steps: usize,
}

impl Search {
    /// A clique of unused pairs whose first fragment is this one.
    fn from(&mut self, fragment: u32) -> Option<Clique> {
        self.steps = MOST_STEPS;
        let common = self.unused(fragment);
        let mut members = vec![fragment];
        if !self.grow(&mut members, &common) {
            return None;
        }
        for &other in &common {
            if members.len() < MOST_MEMBERS && self.fits(&members, other) {
                members.push(other);
                members.sort_unstable();
            }
        }
        let mut pairs = Vec::new();
        for (i, &a) in members.iter().enumerate() {
            pairs.extend(members[i + 1..].iter().filter_map(|&b| self.pair(a, b)));
        }
        pairs.sort_unstable();
        let limit = least_unresolved(members.len(), self.masks);
        Some(Clique { pairs, limit })
    }

    /// Whether unused pairs join the fragment with every member.
    fn fits(&self, members: &[u32], other: u32) -> bool {
        members.iter().all(|&member| {
            let pair = self.pair(member.min(other), member.max(other));
            pair.is_some_and(|pair| !self.used[pair as usize])
        })
    }

    fn unused(&self, fragment: u32) -> Vec<u32> {
        let later = self.later[fragment as usize].iter();
        later
            .filter(|&&(_, pair)| !self.used[pair as usize])
            .map(|&(other, _)| other)
            .collect()
    }

    fn pair(&self, a: u32, b: u32) -> Option<u32> {
        let later = &self.later[a as usize];
        later
            .binary_search_by_key(&b, |&(other, _)| other)
            .ok()
            .map(|i| later[i].1)
    }

    /// Adds fragments out of `common`, the later neighbours that all members share.
    fn grow(&mut self, members: &mut Vec<u32>, common: &[u32]) -> bool {
        if members.len() == self.masks + 1 {
            return true;
        }
        for (i, &next) in common.iter().enumerate() {
            if members.len() + common.len() - i < self.masks + 1 || self.steps == 0 {
                return false;
            }
            self.steps -= 1;
            let narrower: Vec<u32> = common[i + 1..]
                .iter()
                .copied()
                .filter(|&other| {
                    self.pair(next, other)
                        .is_some_and(|pair| !self.used[pair as usize])
                })
                .collect();
            members.push(next);
            if self.grow(members, &narrower) {
                return true;
            }
            members.pop();
        }
        false
    }
}

fn later_neighbours(instance: &Instance) -> Vec<Vec<(u32, u32)>> {
    let mut later = vec![Vec::new(); instance.fragment_count()];
    for (pair, edges) in instance.pairs().enumerate() {
        for &[a, b] in edges {
            later[a as usize].push((b, pair as u32));
        }
    }
    for own in &mut later {
        own.sort_unstable();
    }
    later
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against trying every spread of the members over the masks.
    #[test]
    fn an_even_spread_leaves_the_fewest_pairs() {
        fn least(members: usize, masks: usize) -> usize {
            let pairs = |n: usize| n * n.saturating_sub(1) / 2;
            match masks {
                1 => pairs(members),
                _ => (0..=members)
                    .map(|on_this| pairs(on_this) + least(members - on_this, masks - 1))
                    .min()
                    .unwrap_or(0),
            }
        }
        for masks in 1..=5 {
            for members in 0..=12 {
                assert_eq!(
                    least_unresolved(members, masks) as usize,
                    least(members, masks)
                );
            }
        }
    }
}
