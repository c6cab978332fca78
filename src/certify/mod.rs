//! The writer of certificates: outcomes and a colouring to what they prove, with the evidence.
//!
//! | file | what it does |
//! |---|---|
//! | [`layer`] | says in the words of the format which features a layer has, and where they are cut |
//! | [`packing`] | the packings that solving left behind |
//! | [`conflicts`] | bounds on conflicts, without what they do not need |
//! | [`stitches`] | bounds on stitches, with the facts that they need |
//! | [`cores`] | what a refutation needs |
//! | [`naming`] | from the fragments of a piece to those of the instance |
//! | [`order`] | the order of the units of a bound |
//! | [`features`] | features as graphs of stitch edges |
//! | [`statement`] | what a bound denies |
//! | [`evidence`] | evidence for a bound: the cheapest that will do |
//! | [`cycle`] | odd cycles |
//! | [`clique`] | cliques |
//! | [`enumeration`] | all colourings |
//! | [`formula`] | the canonical formula |
//! | [`stepwise`] | refutations of large bounds along their counter |
//! | [`precedence`] | which fragments name the masks |
//! | [`ties`] | ties among the fragments of a bound |
//! | [`lrat`] | trimming a refutation, and its text |
//! | [`store`] | where proofs go |
//! | [`export`] | a certificate in the formats of other checkers |
//!
//! Nothing is claimed but what has evidence: a bound that cannot be shown with a bounded effort is left out,
//! and the lower bound is what the others add up to.

pub mod clique;
pub mod conflicts;
pub mod cores;
pub mod cycle;
pub mod enumeration;
pub mod evidence;
pub mod export;
pub mod features;
pub mod formula;
pub mod layer;
pub mod lrat;
pub mod naming;
pub mod order;
pub mod packing;
pub mod precedence;
pub mod statement;
pub mod stepwise;
pub mod stitches;
pub mod store;
pub mod ties;

use std::io;
use std::sync::atomic::{AtomicUsize, Ordering};

use rayon::prelude::*;
use thiserror::Error;

use encodings::{Instance, Mask};

use crate::certificate::{
    Certificate, Claim, ConflictBound, Digest, Evidence, Rules, SplitFeature, StitchBound, Unit,
};
use crate::reduce::Reduced;
use crate::solve::refutation;
use crate::solve::{PieceOutcome, Stop};
use evidence::{Found, Prover};
use features::Features;
use naming::Names;
use packing::Packing;
use statement::{Budget, Item, Statement};
pub use store::{InMemory, ProofStore};

/// What a certificate says of its input besides the bounds.
#[derive(Clone, Debug)]
pub struct Facts {
    /// The input file.
    pub input: Digest,
    /// The rules.
    pub rules: Rules,
    /// For layouts what [`layer::members`] gives.
    pub features: Vec<[i32; 2]>,
    /// The same.
    pub split: Vec<SplitFeature>,
}

/// How much work a bound may be. Not a time: the same bounds are shown on every machine.
#[derive(Clone, Copy, Debug)]
pub struct Effort {
    /// Up to so many colourings are enumerated; beyond, a proof is tried first.
    pub colourings: u64,
    /// How much work a proof may be.
    pub refutation: refutation::Effort,
}

impl Effort {
    /// Chosen by measuring: enumeration takes about as long as a proof where there is this much to try.
    pub const USUAL: Effort = Effort {
        colourings: 20_000,
        refutation: refutation::Effort::USUAL,
    };
}

/// What has evidence.
#[derive(Clone, Debug)]
pub struct Certified {
    /// The certificate.
    pub certificate: Certificate,
    /// For each piece the conflicts and the weight of stitches that its bounds add up to.
    pub pieces: Vec<[u64; 2]>,
}

/// Why there is no certificate.
#[derive(Debug, Error)]
pub enum CertifyError {
    /// A proof could not be kept.
    #[error("a proof cannot be written: {0}")]
    Store(#[from] io::Error),
}

/// Everything that certifying looks at.
pub struct Subject<'a> {
    /// The instance.
    pub instance: &'a Instance,
    /// Its pieces.
    pub reduced: &'a Reduced,
    /// What is known of them.
    pub outcomes: &'a [PieceOutcome],
    /// A legal colouring of the instance.
    pub colouring: &'a [Mask],
}

/// Finds evidence for what solving claims. Proofs go to `store` as they are made. Once the stop sign is up,
/// only what is easily shown is shown. `progress` is called with the number of bounds done and in all.
///
/// # Errors
/// Those of the store.
pub fn certify(
    facts: Facts,
    subject: &Subject<'_>,
    store: &dyn ProofStore,
    effort: Effort,
    stop: &Stop,
    progress: &(dyn Fn(usize, usize) + Sync),
) -> Result<Certified, CertifyError> {
    let features = Features::new(subject.instance);
    let prover = Prover {
        features: &features,
        store,
        effort,
        stop,
    };
    let cost = subject.instance.cost(subject.colouring);
    let bounded = bounded_pieces(subject);
    let mut pieces = vec![[0; 2]; subject.reduced.pieces.len()];
    let candidates = conflict_candidates(subject, &bounded);
    let show = |i, bound: &_| show_conflicts(&prover, i, bound);
    let found = in_order(&candidates, progress, |bound| bound.limit, show)?;
    let conflict_bounds = take(&candidates, found, &mut pieces, 0, |bound| bound.limit);
    let conflicts = Claim {
        lower: conflict_bounds.iter().map(|bound| bound.limit).sum(),
        upper: cost.conflicts,
    };
    let mut stitch_bounds = Vec::new();
    if conflicts.is_tight() {
        // The limits of all candidates add up to no more: each of them was shown, at its place.
        let candidates = stitch_candidates(subject, &bounded, &candidates);
        let show = |i, bound: &_| show_stitches(&prover, i, bound, &conflict_bounds);
        let found = in_order(&candidates, progress, |bound| bound.limit, show)?;
        stitch_bounds = take(&candidates, found, &mut pieces, 1, |bound| bound.limit);
    }
    let stitches = Claim {
        lower: stitch_bounds.iter().map(|bound| bound.limit).sum(),
        upper: cost.stitches,
    };
    let certificate = Certificate {
        input: facts.input,
        rules: facts.rules,
        conflicts,
        stitches,
        features: facts.features,
        split: facts.split,
        colours: subject.colouring.to_vec(),
        conflict_bounds,
        stitch_bounds,
    };
    Ok(Certified {
        certificate,
        pieces,
    })
}

/// A piece that was solved, and its bounds in its own numbers.
struct Bounded {
    packing: Packing,
    conflicts: Vec<conflicts::Bound>,
}

fn bounded_pieces(subject: &Subject<'_>) -> Vec<Bounded> {
    let pieces = 0..subject.reduced.pieces.len();
    let bounded = pieces.into_par_iter().with_max_len(1).map(|piece| {
        let packing = packing::of(subject.reduced, subject.outcomes, piece);
        let whole = !packing.stitches.is_empty();
        let conflicts = if packing.conflicts.is_empty() {
            Vec::new()
        } else {
            let features = Features::new(&subject.reduced.pieces[piece].instance);
            let clusters = packing.conflicts.par_iter();
            clusters
                .map(|cluster| conflicts::bound(&features, cluster, whole))
                .collect()
        };
        Bounded { packing, conflicts }
    });
    bounded.collect()
}

/// A bound in the names of the instance.
struct Candidate<B> {
    piece: usize,
    /// The place of the bound among those of the piece.
    own: usize,
    bound: B,
}

/// The bounds of all pieces, copies too, by their first units.
fn named<B, T: Ord>(
    subject: &Subject<'_>,
    name: impl Fn(usize, &Names) -> Vec<B>,
    first: impl Fn(&B) -> T,
) -> Vec<Candidate<B>> {
    let mut candidates = Vec::new();
    for piece in 0..subject.reduced.pieces.len() {
        let original = subject.reduced.same_as[piece].piece as usize;
        let bounds = name(original, &Names::of(subject.reduced, piece));
        let own = bounds.into_iter().enumerate();
        candidates.extend(own.map(|(own, bound)| Candidate { piece, own, bound }));
    }
    candidates.sort_by_cached_key(|candidate| first(&candidate.bound));
    candidates
}

fn conflict_candidates(
    subject: &Subject<'_>,
    bounded: &[Bounded],
) -> Vec<Candidate<conflicts::Bound>> {
    let name = |piece: usize, names: &Names| {
        let bounds = bounded[piece].conflicts.iter();
        let named = bounds.map(|bound| {
            let mut units = names.units(&bound.units);
            order::sort(&mut units, &[]);
            conflicts::Bound {
                limit: bound.limit,
                units,
            }
        });
        named.collect()
    };
    named(subject, name, |bound| bound.units.iter().min().cloned())
}

fn stitch_candidates(
    subject: &Subject<'_>,
    bounded: &[Bounded],
    conflicts: &[Candidate<conflicts::Bound>],
) -> Vec<Candidate<stitches::Bound>> {
    let bounds: Vec<Vec<stitches::Bound>> = bounded
        .par_iter()
        .enumerate()
        .with_max_len(1)
        .map(|(piece, bounded)| {
            if bounded.packing.stitches.is_empty() {
                return Vec::new();
            }
            let features = Features::new(&subject.reduced.pieces[piece].instance);
            let settled = stitches::Settled::new(features, &bounded.conflicts);
            let clusters = bounded.packing.stitches.par_iter().with_max_len(1);
            clusters
                .filter_map(|cluster| settled.bound(cluster))
                .collect()
        })
        .collect();
    // Where each piece's conflict bounds stand in the certificate.
    let mut place: Vec<Vec<u32>> = Vec::new();
    place.resize_with(subject.reduced.pieces.len(), Vec::new);
    for (at, candidate) in (0..).zip(conflicts) {
        let own = &mut place[candidate.piece];
        own.resize(own.len().max(candidate.own + 1), 0);
        own[candidate.own] = at;
    }
    let mut candidates = named(
        subject,
        |piece, names| {
            bounds[piece]
                .iter()
                .map(|bound| name_stitches(bound, names))
                .collect()
        },
        |bound| bound.units.iter().min().copied(),
    );
    for candidate in &mut candidates {
        let place = &place[candidate.piece];
        for met in &mut candidate.bound.met {
            *met = place[*met as usize];
        }
        candidate.bound.met.sort_unstable();
        sort_stitches(&mut candidate.bound, conflicts);
    }
    candidates
}

fn name_stitches(bound: &stitches::Bound, names: &Names) -> stitches::Bound {
    stitches::Bound {
        limit: bound.limit,
        units: bound.units.iter().map(|&edge| names.edge(edge)).collect(),
        resolved: names.units(&bound.resolved),
        met: bound.met.clone(),
    }
}

/// Puts the stitch edges of a bound into a spatial order.
fn sort_stitches(bound: &mut stitches::Bound, conflicts: &[Candidate<conflicts::Bound>]) {
    let met = bound.met.iter();
    let met = met.flat_map(|&met| &conflicts[met as usize].bound.units);
    let ties: Vec<&Unit> = bound.resolved.iter().chain(met).collect();
    let mut units: Vec<[[u32; 2]; 1]> = bound.units.iter().map(|&edge| [edge]).collect();
    units.sort_unstable();
    order::sort(&mut units, &ties);
    bound.units = units.into_iter().flatten().collect();
}

/// Shows the candidates in parallel, those of the largest limits first; what is found stands in their
/// order.
fn in_order<B: Sync, F: Send>(
    candidates: &[Candidate<B>],
    progress: &(dyn Fn(usize, usize) + Sync),
    limit: impl Fn(&B) -> u64,
    show: impl Fn(usize, &B) -> Result<Option<F>, CertifyError> + Sync,
) -> Result<Vec<Option<F>>, CertifyError> {
    let mut order: Vec<usize> = (0..candidates.len()).collect();
    order.sort_by_key(|&i| std::cmp::Reverse(limit(&candidates[i].bound)));
    let (next, done) = (AtomicUsize::new(0), AtomicUsize::new(0));
    let work = |_| {
        let mut shown = Vec::new();
        while let Some(&i) = order.get(next.fetch_add(1, Ordering::Relaxed)) {
            shown.push((i, show(i, &candidates[i].bound)));
            progress(done.fetch_add(1, Ordering::Relaxed) + 1, candidates.len());
        }
        shown
    };
    let workers = 0..rayon::current_num_threads();
    let shown: Vec<Vec<_>> = workers.into_par_iter().map(work).collect();
    let mut found: Vec<Option<F>> = Vec::new();
    found.resize_with(candidates.len(), || None);
    for (i, shown) in shown.into_iter().flatten() {
        found[i] = shown?;
    }
    Ok(found)
}

/// The bounds that were found; adds their limits up piece by piece.
fn take<B, F>(
    candidates: &[Candidate<B>],
    found: Vec<Option<F>>,
    pieces: &mut [[u64; 2]],
    level: usize,
    limit: impl Fn(&F) -> u64,
) -> Vec<F> {
    let mut bounds = Vec::with_capacity(found.len());
    for (candidate, bound) in candidates.iter().zip(found) {
        if let Some(bound) = bound {
            pieces[candidate.piece][level] += limit(&bound);
            bounds.push(bound);
        }
    }
    bounds
}

/// A bound that has evidence.
struct Shown {
    limit: u64,
    /// Further fragments for their ties.
    with: Vec<u32>,
    by: Evidence,
}

/// Evidence for a bound of a limit, or of a smaller one where that is too dear to show.
fn show(
    prover: &Prover<'_>,
    name: &str,
    mut limit: u64,
    statement: impl Fn(u64) -> Statement,
) -> Result<Option<Shown>, CertifyError> {
    while limit > 0 {
        let alone = statement(limit);
        let mut found = prover.refute(&alone, name)?;
        let mut with = Vec::new();
        if let Found::Less(_) = found {
            // Perhaps ties with fragments beyond the bound's own are needed.
            let tied = alone.with_ties(prover.features);
            with.clone_from(&tied.with);
            if !with.is_empty() {
                found = prover.refute(&tied, name)?;
            }
        }
        match found {
            Found::Evidence(by) => return Ok(Some(Shown { limit, with, by })),
            Found::Less(less) => limit = less.min(limit - 1),
        }
    }
    Ok(None)
}

fn show_conflicts(
    prover: &Prover<'_>,
    number: usize,
    bound: &conflicts::Bound,
) -> Result<Option<ConflictBound>, CertifyError> {
    let name = format!("conflicts-{number}");
    let statement = |limit| conflicts::statement(&bound.units, limit);
    let shown = show(prover, &name, bound.limit, statement)?;
    Ok(shown.map(|Shown { limit, with, by }| ConflictBound {
        limit,
        units: bound.units.clone(),
        with,
        by,
    }))
}

fn show_stitches(
    prover: &Prover<'_>,
    number: usize,
    bound: &stitches::Bound,
    conflicts: &[ConflictBound],
) -> Result<Option<StitchBound>, CertifyError> {
    let items = bound.units.iter().map(|&ends| Item::Stitch {
        ends,
        weight: prover.features.weight(ends),
    });
    let items: Vec<Item> = items.collect();
    let met = bound.met.iter().map(|&met| {
        let bound = &conflicts[met as usize];
        stitches::met_budget(&bound.units, bound.limit)
    });
    let met: Vec<Budget> = met.collect();
    let statement = |limit: u64| {
        let own = Budget {
            items: items.clone(),
            most: limit.saturating_sub(1),
        };
        Statement {
            resolved: bound.resolved.clone(),
            budgets: met.iter().cloned().chain([own]).collect(),
            with: Vec::new(),
        }
    };
    let name = format!("stitches-{number}");
    let shown = show(prover, &name, bound.limit, statement)?;
    Ok(shown.map(|Shown { limit, with, by }| StitchBound {
        limit,
        units: bound.units.clone(),
        resolved: bound.resolved.clone(),
        met: bound.met.clone(),
        with,
        by,
    }))
}
