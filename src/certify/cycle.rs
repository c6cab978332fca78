//! Odd cycles, for two masks: a closed walk with an odd number of conflict edges, and stitch edges
//! between them.
//!
//! A shortest odd closed walk through a fragment is a shortest way from it to itself in the doubled graph
//! of fragments and parities, where conflict edges change the parity and stitch edges keep it (Monien,
//! "The complexity of determining a shortest cycle of even length", Computing 1983, has the construction).
//! Self-spacings are no steps: their ends may share a mask where they are joined.

use std::collections::VecDeque;

use crate::certificate::Edge;

/// A walk begins at so many fragments at most: from each one a walk is found, if the part that it lies in has
/// one, and only its length depends on where it begins.
const MOST_STARTS: usize = 1000;

/// A shortest closed walk with an odd number of steps over `conflicts` and any number over `stitches`, or
/// among very many fragments a short one: the fragments along it.
pub fn shortest(conflicts: &[Edge], stitches: &[Edge]) -> Option<Vec<u32>> {
    let mut fragments: Vec<u32> = conflicts
        .iter()
        .chain(stitches)
        .flatten()
        .copied()
        .collect();
    fragments.sort_unstable();
    fragments.dedup();
    let place = |fragment: u32| fragments.binary_search(&fragment).unwrap_or(0);
    // Neighbour, and whether the step changes the parity.
    let mut near: Vec<Vec<(usize, usize)>> = vec![Vec::new(); fragments.len()];
    for (edges, odd) in [(conflicts, 1), (stitches, 0)] {
        for &[a, b] in edges {
            let (a, b) = (place(a), place(b));
            near[a].push((b, odd));
            near[b].push((a, odd));
        }
    }
    // All fragments of few; of many, some of all over.
    let apart = fragments.len().div_ceil(MOST_STARTS).max(1);
    let mut best: Option<Vec<usize>> = None;
    for from in (0..fragments.len()).step_by(apart) {
        let most = best.as_ref().map_or(usize::MAX, Vec::len);
        if let Some(walk) = walk_through(&near, from, most) {
            best = Some(walk);
        }
    }
    best.map(|walk| walk.into_iter().map(|at| fragments[at]).collect())
}

/// A shortest odd closed walk through a place that is shorter than `most`.
fn walk_through(near: &[Vec<(usize, usize)>], from: usize, most: usize) -> Option<Vec<usize>> {
    const NONE: usize = usize::MAX;
    let mut before = vec![[(NONE, 0, NONE); 2]; near.len()];
    before[from][0] = (from, 0, 0);
    let mut open = VecDeque::from([(from, 0)]);
    while let Some((at, parity)) = open.pop_front() {
        let steps = before[at][parity].2;
        if (at, parity) == (from, 1) {
            return Some(trace(&before, from, steps));
        }
        if steps + 1 >= most {
            continue;
        }
        for &(next, odd) in &near[at] {
            let place = &mut before[next][parity ^ odd];
            if place.2 == NONE {
                *place = (at, parity, steps + 1);
                open.push_back((next, parity ^ odd));
            }
        }
    }
    None
}

fn trace(before: &[[(usize, usize, usize); 2]], from: usize, steps: usize) -> Vec<usize> {
    let mut walk = Vec::with_capacity(steps);
    let (mut at, mut parity) = (from, 1);
    for _ in 0..steps {
        walk.push(at);
        (at, parity, _) = before[at][parity];
    }
    walk.reverse();
    walk
}

/// The steps of a closed walk as edges.
pub fn steps(walk: &[u32]) -> impl Iterator<Item = Edge> + '_ {
    let next = walk.iter().cycle().skip(1);
    walk.iter().zip(next).map(|(&a, &b)| [a.min(b), a.max(b)])
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    #[test]
    fn the_shortest_of_several() {
        // A triangle 0-1-2, a square 2-3-4-5 that is even, and a cycle of five.
        let conflicts = [[0, 1], [1, 2], [0, 2], [2, 3], [3, 4], [4, 5], [2, 5]];
        let mut walk = shortest(&conflicts, &[]).unwrap();
        walk.sort_unstable();
        assert_eq!(walk, [0, 1, 2]);
        assert_eq!(shortest(&conflicts[3..], &[]), None);
    }

    #[test]
    fn stitch_edges_agree() {
        // Two conflicts and two stitches: even. Three conflicts and one stitch: odd.
        assert_eq!(shortest(&[[0, 1], [2, 3]], &[[1, 2], [0, 3]]), None);
        let walk = shortest(&[[0, 1], [1, 2], [2, 3]], &[[0, 3]]).unwrap();
        assert_eq!(walk.len(), 4);
        let mut steps: Vec<Edge> = steps(&walk).collect();
        steps.sort_unstable();
        assert_eq!(steps, [[0, 1], [0, 3], [1, 2], [2, 3]]);
    }
}
