//! Masks decided by hand: features fixed to a mask, sets that share one, sets of which every two differ. 100,000
//! random small instances, against plain enumeration of all colourings, with all reductions and with none.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use std::time::Duration;

use common::enumerate;
use common::solver::{Setting, solve};
use encodings::{Instance, InstanceBuilder, Mask, MaskSet, Tie};
use maskproof::reduce::Reductions;
use maskproof::solve::Choice;
use rand::seq::SliceRandom;
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;
use rayon::prelude::*;

const INSTANCES: u64 = 100_000;

/// Up to seven features, some of two fragments; sets that a colouring drawn first keeps.
fn instance(seed: u64) -> (Instance, [bool; 3]) {
    let rng = &mut Pcg64Mcg::seed_from_u64(seed);
    let masks = 2 + (seed % 4) as u8;
    let features = rng.random_range(3..=if masks < 4 { 7 } else { 6 });
    let mut builder = InstanceBuilder::new(masks);
    let density = [0.4, 0.7, 1.0][rng.random_range(0..3)];
    let mut first: Vec<u32> = Vec::new();
    for feature in 0..features {
        let size = if rng.random_ratio(1, 6) { 2 } else { 1 };
        let own = builder.feature(size);
        if size == 2 {
            builder.stitch(own, own + 1, 1);
        }
        for (other, &at) in first.iter().enumerate() {
            if other < feature && rng.random_bool(density) {
                builder.pair([[at, own + rng.random_range(0..size)]]);
            }
        }
        first.push(own);
    }
    let kept: Vec<Mask> = first.iter().map(|_| rng.random_range(0..masks)).collect();
    let mut seen = [false; 3];
    let mut order: Vec<usize> = (0..features).collect();
    order.shuffle(rng);
    for &feature in order.iter().take(rng.random_range(0..3)) {
        let last = first.get(feature + 1).copied();
        let end = last.unwrap_or(builder.fragment_count() as u32);
        for fragment in first[feature]..end {
            builder.allow(fragment, MaskSet::only(kept[feature]));
        }
        seen[0] = true;
    }
    for mask in 0..masks {
        // Those of one mask in the colouring: some of them are a set that shares it.
        let same: Vec<usize> = (0..features).filter(|&f| kept[f] == mask).collect();
        if same.len() > 1 && rng.random_bool(0.4) {
            for two in same.windows(2) {
                builder.tie(Tie::Same([first[two[0]], first[two[1]]]));
            }
            seen[1] = true;
        }
    }
    // One of each of some masks: a set of different ones.
    let mut different: Vec<usize> = Vec::new();
    for &feature in &order {
        if different.iter().all(|&other| kept[other] != kept[feature]) && rng.random_bool(0.5) {
            different.push(feature);
        }
    }
    for (i, &a) in different.iter().enumerate() {
        for &b in &different[..i] {
            builder.tie(Tie::Different([first[a], first[b]]));
            seen[2] = true;
        }
    }
    (builder.build().unwrap(), seen)
}

#[test]
fn least_costs_are_those_of_plain_enumeration() {
    let settings = [
        (
            "none",
            Reductions::NONE,
            Choice::CoreGuided(maskproof::solve::Scale::TINY),
        ),
        ("all", Reductions::ALL, Choice::Auto),
    ];
    let check = |seed: u64| {
        let (instance, seen) = instance(seed);
        let least = enumerate::least(&instance);
        for (name, reductions, choice) in settings {
            let setting = Setting {
                name,
                reductions,
                choice,
            };
            let found = solve(&instance, setting, Duration::from_secs(600));
            let bounds = (found.conflicts, found.stitches);
            let expected = ((least.0, least.0), (least.1, least.1));
            assert_eq!(bounds, expected, "seed {seed}, {name}: {instance:?}");
            assert_eq!(enumerate::count(&instance, &found.colouring), least);
            assert!(enumerate::keeps_ties(&instance, &found.colouring));
        }
        let [fixed, same, different] = seen.map(u64::from);
        [fixed, same, different, u64::from(least.0 > 0)]
    };
    let add = |a: [u64; 4], b: [u64; 4]| std::array::from_fn(|i| a[i] + b[i]);
    let seen = (0..INSTANCES)
        .into_par_iter()
        .map(check)
        .reduce(|| [0; 4], add);
    println!("{INSTANCES} instances: [fixed, same, different, with conflicts] {seen:?}");
    assert!(seen.iter().all(|&count| count > INSTANCES / 5), "{seen:?}");
}
