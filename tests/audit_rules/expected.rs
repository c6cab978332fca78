//! What should be derived, from the raster: the places that neighbours cover, fragments, close pairs, stitches and ties.

use super::random::ByHand;
use super::raster::{self, Cell, Cells, Feature, Run, UnitEdge};
use super::*;
use maskproof::audit::problem::{Stitch, Tie};
use std::collections::BTreeMap;

/// A cut of a feature.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Place {
    pub feature: u32,
    pub line: [i32; 4],
    pub run: Run,
    pub place: i32,
}

/// The places of a run that neighbours cover, by the definition.
pub fn covered(run: &Run, feature: &Feature, others: &[&Feature], rules: &Rules) -> Vec<i32> {
    let [from, to] = run.along;
    let cells_of = |from: i32, to: i32| -> Cells {
        let [x0, y0, x1, y1] = run.rect(from, to);
        (x0..x1)
            .flat_map(|x| (y0..y1).map(move |y| [x, y]))
            .collect()
    };
    // The unit edges and corners that are at the places from one to another: those across the run are at one place.
    let at_of = |unit: &UnitEdge| match (unit.out[0] != 0) == run.upright {
        true => [unit.along(), unit.along() + 1],
        false => {
            let axis = usize::from(run.upright);
            [unit.cell[axis] + unit.out[axis].max(0); 2]
        }
    };
    let mut reasons: Vec<Vec<[i32; 2]>> = Vec::new();
    let own = cells_of(from, to);
    for other in others {
        for e in &feature.edges {
            for h in &other.edges {
                let pairs = raster::faced([feature, other], [e, h], rules);
                let own = pairs.iter().filter(|(unit, _)| own.contains(&unit.cell));
                reasons.push(own.map(|(unit, _)| at_of(unit)).collect());
            }
        }
        for ((at, cell), _) in raster::turned([feature, other], rules) {
            if own.contains(&cell) {
                reasons.push(vec![[at[usize::from(run.upright)]; 2]]);
            }
        }
    }
    let (least, metric) = (raster::least(rules), rules.spacings.metric);
    let is_covered = |&t: &i32| {
        let line = run.rect(t, t);
        let near = |cell: &Cell| raster::is_near(line, raster::square(*cell), least, metric);
        let by_distance = others.iter().any(|other| other.cells.iter().any(near));
        // Both the run up to the place and the run from it on have something of one reason.
        let both = |reason: &Vec<[i32; 2]>| {
            reason.iter().any(|at| at[1] <= t) && reason.iter().any(|at| t <= at[0])
        };
        by_distance || reasons.iter().any(both)
    };
    (from..=to).filter(is_covered).collect()
}

/// The places of the policy `uncovered` on a run.
pub fn uncovered(run: &Run, covered: &[i32], rules: &Rules, vias: &[([i32; 4], i32)]) -> Vec<i32> {
    let [from, to] = run.along;
    let mut found: Vec<i32> = Vec::new();
    let free: Vec<i32> = (from..=to).filter(|t| !covered.contains(t)).collect();
    for row in free.chunk_by(|a, b| a + 1 == *b) {
        let (first, last) = (row[0], row[row.len() - 1]);
        let dead_end = (first == from && !run.goes_on[0]) || (last == to && !run.goes_on[1]);
        let middle = first + (last - first) / 2;
        let far = found
            .last()
            .is_none_or(|before| middle - before >= rules.stitch.fragment_length);
        if !dead_end
            && last - first >= rules.stitch.overlap
            && far
            && run.is_legal(middle, rules, vias)
        {
            found.push(middle);
        }
    }
    found
}

/// A layout as it is cut.
pub struct Cut {
    pub fragments: Vec<(u32, Cells)>,
    pub start: Vec<u32>,
    pub named: Vec<Named>,
    pub kept: Vec<(Place, [u32; 2])>,
}

/// Cuts at the places, as far as these separate anything.
pub fn cut(features: &[Feature], places: &[Place], half: i32) -> Cut {
    let mut found = Cut {
        fragments: Vec::new(),
        start: vec![0],
        named: Vec::new(),
        kept: Vec::new(),
    };
    for (f, feature) in (0u32..).zip(features) {
        let own: Vec<&Place> = places.iter().filter(|place| place.feature == f).collect();
        let on_line = |shared: [i32; 4]| {
            own.iter().any(|place| {
                let l = place.line;
                l[0] <= shared[0] && l[1] <= shared[1] && shared[2] <= l[2] && shared[3] <= l[3]
            })
        };
        let next = |[x, y]: Cell| {
            let mut cells = Vec::new();
            for (dx, dy) in (-1..=1).flat_map(|dx| (-1..=1).map(move |dy| (dx, dy))) {
                let (a, b) = (raster::square([x, y]), raster::square([x + dx, y + dy]));
                let shared = [
                    a[0].max(b[0]),
                    a[1].max(b[1]),
                    a[2].min(b[2]),
                    a[3].min(b[3]),
                ];
                if !on_line(shared) {
                    cells.push([x + dx, y + dy]);
                }
            }
            cells
        };
        let mut parts = raster::parts(&feature.cells, next);
        let base = parts.clone();
        for place in own {
            let beside = |from: i32, to: i32| -> Cells {
                let [x0, y0, x1, y1] = place.run.rect(from, to);
                (x0..x1)
                    .flat_map(|x| (y0..y1).map(move |y| [x, y]))
                    .collect()
            };
            let part = |cells: Cells| {
                base.iter()
                    .position(|part| part.contains(cells.first().unwrap()))
            };
            let at = place.place;
            let sides = [
                part(beside(at - 1, at)).unwrap(),
                part(beside(at, at + 1)).unwrap(),
            ];
            if sides[0] != sides[1] {
                sides
                    .iter()
                    .for_each(|&side| parts[side].extend(beside(at - half, at + half)));
                let sides = sides.map(|side| side as u32);
                found.named.push((f, place.line, sides));
                let start = *found.start.last().unwrap();
                found
                    .kept
                    .push((place.clone(), sides.map(|side| start + side)));
            }
        }
        found
            .fragments
            .extend(parts.into_iter().map(|part| (f, part)));
        found.start.push(found.fragments.len() as u32);
    }
    found
}

pub fn stitches_of<'a>(sides: impl Iterator<Item = &'a [u32; 2]>, weight: u32) -> Vec<Stitch> {
    let mut counts: BTreeMap<[u32; 2], u32> = BTreeMap::new();
    for &[a, b] in sides {
        *counts.entry([a.min(b), a.max(b)]).or_default() += weight;
    }
    let stitch = |(ends, weight)| Stitch { ends, weight };
    counts.into_iter().map(stitch).collect()
}

pub fn ties_of(cut: &Cut, features: usize, rules: &Rules) -> Vec<Tie> {
    let mut ties = Vec::new();
    let mut add = |most: u64, own: Vec<&(Place, [u32; 2])>| {
        if own.len() as u64 > most {
            let stitches = stitches_of(own.iter().map(|cut| &cut.1), 1);
            ties.push(Tie::AtMost { most, stitches });
        }
    };
    let near = |from: &Place| -> Vec<&(Place, [u32; 2])> {
        let is_near = |(other, _): &&(Place, [u32; 2])| {
            let by = other.place - from.place;
            let one_run = other.feature == from.feature && other.run == from.run;
            one_run && 0 <= by && by < rules.stitch.fragment_length
        };
        cut.kept.iter().filter(is_near).collect()
    };
    let windows: Vec<_> = cut.kept.iter().map(|(place, _)| near(place)).collect();
    for window in &windows {
        // Not a part of another one.
        let is_part = windows.iter().any(|other| {
            other.len() > window.len() && window.iter().all(|cut| other.contains(cut))
        });
        if !is_part {
            add(1, window.clone());
        }
    }
    if let Some(most) = rules.stitch.most_per_feature {
        for f in 0..features as u32 {
            add(
                most.into(),
                cut.kept
                    .iter()
                    .filter(|(place, _)| place.feature == f)
                    .collect(),
            );
        }
    }
    ties
}

/// What the audit should derive where nothing is decided by hand, and how many pairs of fragments are close because of their edges or corners only.
pub fn expected(features: &[Feature], cut: &Cut, rules: &Rules) -> (Problem, usize) {
    let stitches = stitches_of(cut.kept.iter().map(|cut| &cut.1), rules.stitch.weight);
    let (mut close, mut by_kind) = (Vec::new(), 0);
    let (least, metric) = (raster::least(rules), rules.spacings.metric);
    for f in 0..features.len() {
        for g in f..features.len() {
            let both = [&features[f], &features[g]];
            let edges = both[0].edges.iter();
            let pairs = edges.flat_map(|e| both[1].edges.iter().map(move |h| [e, h]));
            let faced: Vec<_> = pairs
                .flat_map(|pair| raster::faced(both, pair, rules))
                .collect();
            let turned = raster::turned(both, rules);
            for a in cut.start[f]..cut.start[f + 1] {
                for b in cut.start[g].max(a + 1)..cut.start[g + 1] {
                    let [p, q] = [a, b].map(|i| &cut.fragments[i as usize].1);
                    let near = |one: &Cell| {
                        let one = raster::square(*one);
                        q.iter().any(|other| {
                            raster::is_near(one, raster::square(*other), least, metric)
                        })
                    };
                    let is_near = p.iter().any(near);
                    let edges = faced.iter();
                    let mut edges =
                        edges.filter(|(e, h)| p.contains(&e.cell) && q.contains(&h.cell));
                    let corners = turned.iter();
                    let mut corners = corners.filter(|(c, d)| p.contains(&c.1) && q.contains(&d.1));
                    let is_close = is_near || edges.next().is_some() || corners.next().is_some();
                    if is_close && stitches.iter().all(|s| s.ends != [a, b]) {
                        close.push([a, b]);
                        by_kind += usize::from(!is_near);
                    }
                }
            }
        }
    }
    close.sort_unstable();
    let problem = Problem {
        masks: rules.masks,
        feature_start: cut.start.clone(),
        allowed: vec![u8::MAX >> (8 - rules.masks); cut.fragments.len()],
        close,
        stitches,
        ties: ties_of(cut, features.len(), rules),
    };
    (problem, by_kind)
}

/// Adds what was decided by hand.
pub fn decide(problem: &mut Problem, hand: &ByHand) {
    let first = |f: &u32| problem.feature_start[*f as usize];
    for (f, mask) in (0u32..).zip(&hand.fixed) {
        if let Some(mask) = mask {
            problem.allowed[first(&f) as usize] = 1 << mask;
        }
    }
    let next = hand.same.iter().zip(hand.same.iter().skip(1));
    let mut ties: Vec<Tie> = next.map(|(a, b)| Tie::Same([first(a), first(b)])).collect();
    for (i, a) in hand.different.iter().enumerate() {
        let later = hand.different[i + 1..].iter();
        ties.extend(later.map(|b| Tie::Different([first(a), first(b)])));
    }
    problem.ties.extend(ties);
    problem.ties.sort_by_key(|tie| (tie.first(), tie.clone()));
    problem.ties.dedup();
}
