//! SAT feasibility: whether a piece can be coloured at no cost at all, before any cost is in play.
//!
//! Every conflict edge is hard, and so is every stitch edge: its two fragments share a mask, so no
//! self-spacing is violated. Where masks are interchangeable a
//! largest clique found greedily is fixed to masks 1, 2, ...: sound here, where nothing can be paid for
//! ([`encodings::symmetry`]).

use encodings::colour::{AtMostOne, Colours};
use encodings::{Mask, Tie, conflict, symmetry, ties};

use super::backend::{Answer, SatBackend, Varisat};
use super::limits::Stop;
use super::places::Places;

/// What was found out.
pub enum Feasibility {
    /// A colouring that costs nothing.
    Colouring(Vec<Mask>),
    /// There is none.
    Infeasible,
    /// Stopped before it was known.
    Stopped,
}

/// Decides whether a colouring without conflicts and stitches exists.
pub fn decide(places: &Places<'_>, stop: &Stop) -> Feasibility {
    let instance = places.instance;
    let mut solver = Varisat::new(stop);
    let allowed = (0..instance.fragment_count() as u32).map(|f| instance.allowed(f));
    let colours = Colours::encode(instance.masks(), allowed, AtMostOne::Open, &mut solver);
    for &edge in instance.edges() {
        conflict::separate(&colours, edge, None, &mut solver);
    }
    for stitch in instance.stitches() {
        conflict::unite(&colours, [stitch.a, stitch.b], &mut solver);
    }
    // Without stitches, ties between stitches are kept.
    for tie in instance.ties() {
        if !matches!(tie, Tie::AtMost { .. }) {
            ties::encode(&colours, tie, &mut solver);
        }
    }
    if instance.is_unrestricted() {
        symmetry::fix_clique(&colours, &clique(places), &mut solver);
    }
    match solver.solve(&[]) {
        Answer::Satisfiable => {
            let model = solver.model();
            Feasibility::Colouring(colours.decode(|lit| model.holds(lit)))
        }
        Answer::Unsatisfiable(_) => Feasibility::Infeasible,
        Answer::Stopped => Feasibility::Stopped,
    }
}

/// A clique of fragments, one of each feature, grown greedily from the feature with the most neighbours.
fn clique(places: &Places<'_>) -> Vec<u32> {
    let instance = places.instance;
    let degree = |&feature: &u32| places.neighbours(feature).len();
    let seed = (0..instance.feature_count() as u32)
        .max_by_key(|feature| (degree(feature), std::cmp::Reverse(*feature)));
    let Some(seed) = seed else { return Vec::new() };
    let adjacent = |a: u32, b: u32| {
        let joined = places.neighbours(instance.feature_of(a));
        let other = instance.feature_of(b);
        joined
            .binary_search_by_key(&other, |&(feature, _)| feature)
            .is_ok_and(|i| {
                instance
                    .pair(joined[i].1)
                    .binary_search(&[a.min(b), a.max(b)])
                    .is_ok()
            })
    };
    let mut found = vec![instance.fragments_of(seed).start];
    let mut others: Vec<u32> = places
        .neighbours(seed)
        .iter()
        .map(|&(other, _)| other)
        .collect();
    others.sort_by_key(|feature| (std::cmp::Reverse(degree(feature)), *feature));
    for other in others {
        if found.len() >= instance.masks() as usize {
            break;
        }
        let fits = |&fragment: &u32| found.iter().all(|&member| adjacent(member, fragment));
        if let Some(fragment) = instance.fragments_of(other).find(fits) {
            found.push(fragment);
        }
    }
    found
}
