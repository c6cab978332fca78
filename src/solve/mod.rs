//! Pieces to outcomes: the engines, and the only room that links a solver.
//!
//! | file | engine |
//! |---|---|
//! | [`legal`] | allowed masks and ties, which nothing can be paid for |
//! | [`greedy`] | saturation-degree ordering; optimal where it costs nothing |
//! | [`descent`] | improves a colouring; an upper bound |
//! | [`enumeration`] | plain search with pruning, for tiny pieces |
//! | [`feasibility`] | SAT: can it be coloured at no cost? |
//! | [`core_guided`] | least cost by core-guided search, both levels |
//! | [`keep`] | places where a given colouring fails, with all else fixed |
//! | [`changes`] | the fewest changes to it at a given cost |
//! | [`places`] | the features of a piece as a graph, and compact groups of them |
//! | [`backend`] | the SAT solver behind a trait |
//! | [`refutation`] | refutations with hints, for proofs |
//! | [`limits`] | when to stop |

pub mod backend;
pub mod changes;
pub mod core_guided;
pub mod descent;
pub mod enumeration;
pub mod feasibility;
pub mod greedy;
pub mod keep;
pub mod legal;
pub mod limits;
pub mod places;
pub mod refutation;

use std::sync::atomic::{AtomicUsize, Ordering};
use std::time::{Duration, Instant};

use rayon::prelude::*;

use encodings::{Instance, Mask};

use crate::reduce::Reduced;
pub use core_guided::Scale;
use core_guided::relaxation::Cluster;
pub use limits::{Limits, Stop};
use places::Places;

/// A lower and an upper bound; equal where the value is proven.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Bounds {
    /// No colouring has less.
    pub lower: u64,
    /// The colouring found has this much.
    pub upper: u64,
}

impl Bounds {
    /// A proven value.
    pub fn exactly(value: u64) -> Bounds {
        Bounds {
            lower: value,
            upper: value,
        }
    }

    /// Whether the value is proven.
    pub fn is_tight(self) -> bool {
        self.lower == self.upper
    }
}

impl std::ops::AddAssign for Bounds {
    fn add_assign(&mut self, other: Bounds) {
        self.lower += other.lower;
        self.upper += other.upper;
    }
}

/// The engine that gave an outcome.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Engine {
    /// Saturation-degree ordering, perhaps with descent, found a colouring that costs nothing.
    Greedy,
    /// Enumeration.
    Enumeration,
    /// Core-guided search.
    CoreGuided,
    /// Carried over from an identical piece.
    Copy,
}

impl std::fmt::Display for Engine {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            Engine::Greedy => "greedy",
            Engine::Enumeration => "enumeration",
            Engine::CoreGuided => "core-guided",
            Engine::Copy => "copy",
        })
    }
}

/// What is known of a piece.
#[derive(Clone, Debug)]
pub struct PieceOutcome {
    /// The best colouring found: legal always.
    pub colouring: Vec<Mask>,
    /// Bounds on its least conflicts.
    pub conflicts: Bounds,
    /// Bounds on its stitches among colourings of least conflicts. Where conflicts are not proven, the
    /// lower one is 0 and the upper one counts the stitches of the colouring.
    pub stitches: Bounds,
    /// Who found it.
    pub engine: Engine,
    /// Bounds on conflicts with disjoint units, where the core-guided search found the outcome.
    pub conflict_packing: Vec<Cluster>,
    /// Bounds on stitches with disjoint stitch edges, likewise.
    pub stitch_packing: Vec<Cluster>,
    /// How long it took.
    pub time: Duration,
}

impl PieceOutcome {
    /// The same bounds from below, and this colouring where it costs less or as much.
    fn unless_cheaper(mut self, instance: &Instance, own: Vec<Mask>) -> PieceOutcome {
        let cost = instance.cost(&own);
        let found = (self.conflicts.upper, self.stitches.upper);
        if (cost.conflicts, cost.stitches) <= found {
            self.conflicts.upper = cost.conflicts;
            self.stitches.upper = cost.stitches;
            self.colouring = own;
        }
        self
    }
}

/// Which engines are used; for tests that compare them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Choice {
    /// The quickest that fits the piece.
    Auto,
    /// Enumeration for everything.
    Enumeration,
    /// Core-guided search for everything.
    CoreGuided(Scale),
}

/// Solves the pieces, largest first, on the current thread pool; outcomes in the order of the pieces.
/// `progress` is called with the number of pieces done.
pub fn solve_pieces(
    reduced: &Reduced,
    choice: Choice,
    limits: &Limits,
    progress: &(dyn Fn(usize) + Sync),
) -> Vec<PieceOutcome> {
    solve_pieces_from(reduced, None, choice, limits, progress)
}

/// The same, beginning with a colouring of the whole instance: a mask below K for each fragment. What is proven
/// does not depend on it; which colouring of least cost is found may, and where a limit stops the search,
/// no piece on which it is legal costs more than it does there.
pub fn solve_pieces_from(
    reduced: &Reduced,
    whole: Option<&[Mask]>,
    choice: Choice,
    limits: &Limits,
    progress: &(dyn Fn(usize) + Sync),
) -> Vec<PieceOutcome> {
    let known = vec![None; reduced.pieces.len()];
    solve_rest(reduced, known, whole, choice, limits, progress)
}

/// The same where the outcomes of some pieces are known: `outcomes` has one entry a piece.
pub fn solve_open_pieces(
    reduced: &Reduced,
    outcomes: Vec<Option<PieceOutcome>>,
    choice: Choice,
    limits: &Limits,
    progress: &(dyn Fn(usize) + Sync),
) -> Vec<PieceOutcome> {
    solve_rest(reduced, outcomes, None, choice, limits, progress)
}

fn solve_rest(
    reduced: &Reduced,
    mut outcomes: Vec<Option<PieceOutcome>>,
    whole: Option<&[Mask]>,
    choice: Choice,
    limits: &Limits,
    progress: &(dyn Fn(usize) + Sync),
) -> Vec<PieceOutcome> {
    let pieces = &reduced.pieces;
    let given = |i: usize| {
        let own = pieces[i].fragments.iter();
        let own: Vec<Mask> = own
            .map(|&f| whole?.get(f as usize).copied())
            .collect::<Option<_>>()?;
        pieces[i].instance.check_legal(&own).is_ok().then_some(own)
    };
    let mut order: Vec<usize> = (0..pieces.len())
        .filter(|&i| !reduced.same_as[i].is_copy() && outcomes[i].is_none())
        .collect();
    order.sort_by_key(|&i| std::cmp::Reverse(pieces[i].instance.fragment_count()));
    let done = AtomicUsize::new(pieces.len() - order.len());
    let next = AtomicUsize::new(0);
    // Each worker takes the largest piece that is left: a split of the list would fix the order.
    let work = |_| {
        let mut solved = Vec::new();
        while let Some(&i) = order.get(next.fetch_add(1, Ordering::Relaxed)) {
            let outcome = solve_piece_from(&pieces[i].instance, given(i), choice, limits);
            solved.push((i, outcome));
            progress(done.fetch_add(1, Ordering::Relaxed) + 1);
        }
        solved
    };
    let workers = 0..rayon::current_num_threads();
    let solved: Vec<Vec<(usize, PieceOutcome)>> = workers.into_par_iter().map(work).collect();
    for (i, outcome) in solved.into_iter().flatten() {
        outcomes[i] = Some(outcome);
    }
    for i in 0..pieces.len() {
        let same = &reduced.same_as[i];
        if same.is_copy()
            && let Some(original) = &outcomes[same.piece as usize]
        {
            let copied = same.fragment.iter();
            let copied = copied.map(|&f| original.colouring[f as usize]).collect();
            let copy = PieceOutcome {
                colouring: copied,
                engine: Engine::Copy,
                conflict_packing: Vec::new(),
                stitch_packing: Vec::new(),
                time: Duration::ZERO,
                ..*original
            };
            outcomes[i] = Some(match given(i) {
                Some(own) => copy.unless_cheaper(&pieces[i].instance, own),
                None => copy,
            });
        }
    }
    outcomes.into_iter().flatten().collect()
}

/// Solves one piece.
pub fn solve_piece(instance: &Instance, choice: Choice, limits: &Limits) -> PieceOutcome {
    solve_piece_from(instance, None, choice, limits)
}

/// The same, beginning with a legal colouring if one is given.
pub fn solve_piece_from(
    instance: &Instance,
    given: Option<Vec<Mask>>,
    choice: Choice,
    limits: &Limits,
) -> PieceOutcome {
    let begun = Instant::now();
    let first = start(instance, given);
    let mut outcome = match choice {
        Choice::Auto => automatic(instance, first, limits),
        Choice::Enumeration => by_enumeration(instance, first),
        Choice::CoreGuided(scale) => core_guided(instance, first, scale, limits),
    };
    outcome.time = begun.elapsed();
    outcome
}

/// Nothing costs less than nothing.
fn free(colouring: Vec<Mask>, engine: Engine) -> PieceOutcome {
    PieceOutcome {
        colouring,
        conflicts: Bounds::exactly(0),
        stitches: Bounds::exactly(0),
        engine,
        conflict_packing: Vec::new(),
        stitch_packing: Vec::new(),
        time: Duration::ZERO,
    }
}

/// A legal colouring to begin with: the given one where greedy ordering finds none that costs less.
fn start(instance: &Instance, given: Option<Vec<Mask>>) -> Vec<Mask> {
    let found = legal::near(instance, greedy::colour(instance));
    match given {
        Some(given) if instance.cost(&given) <= instance.cost(&found) => given,
        _ => found,
    }
}

fn automatic(instance: &Instance, first: Vec<Mask>, limits: &Limits) -> PieceOutcome {
    if instance.cost(&first) == encodings::Cost::default() {
        return free(first, Engine::Greedy);
    }
    if instance.fragment_count() <= enumeration::MOST_FRAGMENTS {
        return by_enumeration(instance, first);
    }
    core_guided(instance, first, Scale::USUAL, limits)
}

fn by_enumeration(instance: &Instance, first: Vec<Mask>) -> PieceOutcome {
    let (colouring, cost) = enumeration::least_cost(instance, first);
    PieceOutcome {
        conflicts: Bounds::exactly(cost.conflicts),
        stitches: Bounds::exactly(cost.stitches),
        ..free(colouring, Engine::Enumeration)
    }
}

fn core_guided(
    instance: &Instance,
    mut start: Vec<Mask>,
    scale: Scale,
    limits: &Limits,
) -> PieceOutcome {
    let stop = limits.for_piece();
    let places = Places::new(instance);
    descent::improve(&places, &mut start, &stop);
    if instance.cost(&start) == encodings::Cost::default() {
        return free(start, Engine::Greedy);
    }
    let found = core_guided::least_cost(&places, start, scale, &stop);
    PieceOutcome {
        colouring: found.colouring,
        conflicts: found.conflicts,
        stitches: found.stitches,
        engine: Engine::CoreGuided,
        conflict_packing: found.conflict_packing,
        stitch_packing: found.stitch_packing,
        time: Duration::ZERO,
    }
}
