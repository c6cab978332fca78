//! A bug planted in each reduction: it may lose a certificate, it never makes a false one.
//!
//! Runs with `--features planted-bugs` only; `.ci/run` does.
#![cfg(feature = "planted-bugs")]
#![allow(clippy::unwrap_used)]

mod common;

use common::{audited, enumerate, random};
use encodings::{Instance, InstanceBuilder, Mask};
use maskproof::merge::merge;
use maskproof::reduce::planted::{Bug, plant};
use maskproof::reduce::{Reductions, reduce};
use maskproof::solve::{Choice, Limits, solve_pieces};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

/// What became of an instance under a bug.
#[derive(Debug, Default)]
struct Tally {
    /// An inner check refused the result.
    refused: usize,
    /// The audit refused the certificate.
    rejected: usize,
    /// The certificate proves less than the optimum: `undecided`.
    undecided: usize,
    /// It proves what is so; the bug did no harm.
    unharmed: usize,
}

fn run(instance: &Instance, on: Reductions, tally: &mut Tally) {
    let Ok(reduced) = reduce(instance, on) else {
        tally.refused += 1;
        return;
    };
    let outcomes = solve_pieces(&reduced, Choice::Auto, &Limits::default(), &|_| ());
    let colourings: Vec<&[Mask]> = outcomes.iter().map(|found| &*found.colouring).collect();
    let Ok(merged) = merge(instance, &reduced, &colourings) else {
        tally.refused += 1;
        return;
    };
    let made = audited::certificate(instance, &reduced, &outcomes, &merged.colouring);
    if audited::audit(instance, &made).is_err() {
        tally.rejected += 1;
        return;
    }
    let (conflicts, stitches) = (made.0.conflicts, made.0.stitches);
    let least = enumerate::least(instance);
    assert!(
        conflicts.lower <= least.0 && least.0 <= conflicts.upper,
        "{least:?}: {made:?}"
    );
    if conflicts.is_tight() {
        assert!(
            stitches.lower <= least.1 && least.1 <= stitches.upper,
            "{least:?}: {made:?}"
        );
    }
    if conflicts.is_tight() && stitches.is_tight() {
        tally.unharmed += 1;
    } else {
        tally.undecided += 1;
    }
}

#[test]
fn no_planted_bug_ends_in_an_accepted_false_claim() {
    let blocks = Reductions::ALL;
    let components = Reductions {
        blocks: false,
        ..Reductions::ALL
    };
    for (bug, on) in [
        (Bug::Peel, blocks),
        (Bug::Dominated, blocks),
        (Bug::Components, components),
        (Bug::Blocks, blocks),
        (Bug::Hinges, blocks),
        (Bug::Palette, blocks),
        (Bug::Cuts, blocks),
        (Bug::Identical, blocks),
    ] {
        let mut tally = Tally::default();
        for seed in 0..500 {
            for masks in 2..=5 {
                let instance = match bug {
                    Bug::Identical => twins(seed * 8 + u64::from(masks)),
                    _ => random::instance(masks, seed),
                };
                plant(Some(bug));
                run(&instance, on, &mut tally);
                plant(None);
            }
        }
        println!("{bug:?}: {tally:?}");
        let harmed = tally.refused + tally.rejected + tally.undecided;
        assert!(harmed > 20, "{bug:?} did no harm: {tally:?}");
    }
}

/// Two random graphs of as many vertices side by side.
fn twins(seed: u64) -> Instance {
    let mut rng = Pcg64Mcg::seed_from_u64(seed);
    let size = rng.random_range(4..=5);
    let mut builder = InstanceBuilder::new(2);
    for first in [0, size] {
        for a in 0..size {
            builder.feature(1);
            for b in 0..a {
                if rng.random_bool(0.7) {
                    builder.pair([[first + b, first + a]]);
                }
            }
        }
    }
    builder.build().unwrap()
}
