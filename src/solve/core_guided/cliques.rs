//! Cliques of K+1 fragments: the first cores, without a solver.
//!
//! Lemma. K+1 fragments of which every two are joined by a conflict edge cannot all differ, whatever masks
//! each may take: at least one of their pairs stays unresolved. Cliques that share no pair are cores side by
//! side, and each is a bound of limit 1.
//!
//! Found greedily: from each fragment on, later neighbours are added in order, with backtracking up to a
//! fixed number of steps a fragment, so the whole is linear. Missing one costs time only.

use encodings::Instance;

/// Steps of backtracking for each fragment.
const MOST_STEPS: usize = 200;

/// Pairs, ascending, of cliques that share none.
pub fn disjoint_cliques(instance: &Instance) -> Vec<Vec<u32>> {
    let mut search = Search {
        later: later_neighbours(instance),
        used: vec![false; instance.pair_count()],
        size: instance.masks() as usize + 1,
        steps: 0,
    };
    let mut found = Vec::new();
    for fragment in 0..instance.fragment_count() as u32 {
        while let Some(pairs) = search.from(fragment) {
            for &pair in &pairs {
                search.used[pair as usize] = true;
            }
            found.push(pairs);
        }
    }
    found
}

struct Search {
    /// For each fragment its later neighbours, ascending, and the pairs that join them.
    later: Vec<Vec<(u32, u32)>>,
    used: Vec<bool>,
    size: usize,
    steps: usize,
}

impl Search {
    /// A clique of unused pairs whose first fragment is this one.
    fn from(&mut self, fragment: u32) -> Option<Vec<u32>> {
        self.steps = MOST_STEPS;
        let common = self.unused(fragment);
        let mut members = vec![fragment];
        if !self.grow(&mut members, &common) {
            return None;
        }
        let mut pairs = Vec::new();
        for (i, &a) in members.iter().enumerate() {
            pairs.extend(members[i + 1..].iter().filter_map(|&b| self.pair(a, b)));
        }
        pairs.sort_unstable();
        Some(pairs)
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
        if members.len() == self.size {
            return true;
        }
        for (i, &next) in common.iter().enumerate() {
            if members.len() + common.len() - i < self.size || self.steps == 0 {
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
