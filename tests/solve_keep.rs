//! A given colouring: what is kept of it, against plain enumeration; and that beginning with one changes no optimum.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use std::collections::BTreeSet;
use std::time::Duration;

use common::enumerate::{count, each_colouring, keeps_ties, least};
use common::random::instance;
use common::solver::{USUAL, solve};
use encodings::{Instance, InstanceBuilder, Mask, MaskSet, Tie};
use maskproof::merge::merge;
use maskproof::reduce::{Reductions, reduce};
use maskproof::solve::descent;
use maskproof::solve::keep::{self, failing};
use maskproof::solve::places::Places;
use maskproof::solve::{Choice, Limits, Scale, solve_pieces_from};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64;

/// Any masks; now and then only allowed ones.
fn random_start(instance: &Instance, rng: &mut Pcg64) -> Vec<Mask> {
    let legal = rng.random_bool(0.5);
    let one = rng
        .random_bool(0.3)
        .then(|| rng.random_range(0..instance.masks()));
    (0..instance.fragment_count() as u32)
        .map(|fragment| {
            loop {
                let mask = one.unwrap_or_else(|| rng.random_range(0..instance.masks()));
                let allowed = instance.allowed(fragment);
                if !legal || allowed.contains(mask) {
                    break mask;
                }
                if one.is_some() {
                    break allowed.first().unwrap();
                }
            }
        })
        .collect()
}

/// The features where a colouring fails, from the definition.
fn fails(instance: &Instance, start: &[Mask]) -> BTreeSet<u32> {
    let feature = |fragment: u32| instance.feature_of(fragment);
    let mask = |fragment: u32| start[fragment as usize];
    let mut illegal: BTreeSet<u32> = (0..start.len() as u32)
        .filter(|&f| !instance.allowed(f).contains(mask(f)))
        .map(feature)
        .collect();
    for tie in instance.ties() {
        let broken = match tie {
            Tie::Same([a, b]) => mask(*a) != mask(*b),
            Tie::Different([a, b]) => mask(*a) == mask(*b),
            Tie::AtMost { most, stitches } => {
                let used = stitches.iter().filter(|s| mask(s.a) != mask(s.b));
                used.map(|s| s.weight).sum::<u32>() > *most
            }
        };
        if broken {
            illegal.extend(tie.fragments().into_iter().map(feature));
        }
    }
    // Ties between two features bind whatever hangs together by them.
    loop {
        let before = illegal.len();
        for tie in instance.ties() {
            if let Tie::Same(ends) | Tie::Different(ends) = tie
                && ends.iter().any(|&f| illegal.contains(&feature(f)))
            {
                illegal.extend(ends.map(feature));
            }
        }
        if illegal.len() == before {
            break;
        }
    }
    // A unit alone: what does a colouring cost where all but two features are far away?
    for pair in 0..instance.pair_count() as u32 {
        if instance.pair(pair).iter().any(|&[a, b]| mask(a) == mask(b)) {
            illegal.extend(instance.pair(pair)[0].map(feature));
        }
    }
    for &[a, b] in instance.self_spacings() {
        if mask(a) == mask(b) && !is_joined(instance, start, a, b) {
            illegal.insert(feature(a));
        }
    }
    illegal
}

/// Whether a path of stitch edges within one mask joins two fragments.
fn is_joined(instance: &Instance, start: &[Mask], a: u32, b: u32) -> bool {
    let mut seen = vec![a];
    let mut next = 0;
    while next < seen.len() {
        for stitch in instance.stitches() {
            for (from, to) in [(stitch.a, stitch.b), (stitch.b, stitch.a)] {
                let same = start[to as usize] == start[a as usize];
                if from == seen[next] && same && !seen.contains(&to) {
                    seen.push(to);
                }
            }
        }
        next += 1;
    }
    seen.contains(&b)
}

/// Conflicts, stitches and changed features of the best colouring that keeps all but `free` features.
fn best_kept(instance: &Instance, start: &[Mask], free: &BTreeSet<u32>) -> (u64, u64, u64) {
    let mut best = (u64::MAX, u64::MAX, u64::MAX);
    each_colouring(instance, |colouring| {
        let mut changed = BTreeSet::new();
        for fragment in 0..colouring.len() {
            if colouring[fragment] != start[fragment] {
                changed.insert(instance.feature_of(fragment as u32));
            }
        }
        if changed.is_subset(free) && keeps_ties(instance, colouring) {
            let (conflicts, stitches) = count(instance, colouring);
            best = best.min((conflicts, stitches, changed.len() as u64));
        }
    });
    best
}

#[test]
fn what_is_kept_agrees_with_enumeration() {
    let limits = Limits::default();
    // All kinds of cases must come up, else the test shows nothing.
    let (mut several, mut two_changes, mut no_better, mut tied) = (0, 0, 0, 0);
    for masks in 2..=5 {
        for seed in 0..1_500 {
            let instance = instance(masks, seed);
            let rng = &mut Pcg64::seed_from_u64(seed);
            let start = random_start(&instance, rng);
            let free = fails(&instance, &start);
            let found: BTreeSet<u32> = failing(&instance, &start).into_iter().collect();
            assert_eq!(found, free, "{masks} {seed}");
            let kept = keep::solve(&instance, &start, &limits).unwrap();
            instance.check_legal(&kept.colouring).unwrap();
            let (conflicts, stitches) = count(&instance, &kept.colouring);
            let now = (conflicts, stitches, kept.changed_count());
            assert_eq!(now, best_kept(&instance, &start, &free), "{masks} {seed}");
            assert!(kept.is_proven(), "{masks} {seed}");
            check_places(&instance, &start, &kept, &free);
            several += u32::from(kept.places.len() > 1);
            two_changes += u32::from(kept.places.iter().any(|p| p.changed.len() > 1));
            no_better += u32::from(kept.places.iter().any(keep::KeptPlace::is_no_better));
            tied += u32::from(instance.broken_ties(&start).next().is_some());
        }
    }
    for times in [several, two_changes, no_better, tied] {
        assert!(times > 100, "{several} {two_changes} {no_better} {tied}");
    }
}

/// What is said of each place, against the whole colourings.
fn check_places(instance: &Instance, start: &[Mask], kept: &keep::Kept, free: &BTreeSet<u32>) {
    let all: Vec<u32> = kept
        .places
        .iter()
        .flat_map(|p| p.features.clone())
        .collect();
    assert_eq!(all.len(), free.len());
    assert_eq!(all.iter().copied().collect::<BTreeSet<u32>>(), *free);
    let changed: BTreeSet<u32> = (0..start.len() as u32)
        .filter(|&f| start[f as usize] != kept.colouring[f as usize])
        .map(|f| instance.feature_of(f))
        .collect();
    let said = kept.places.iter().flat_map(|place| place.changed.clone());
    assert_eq!(said.collect::<BTreeSet<u32>>(), changed);
    let sum = |cost: &dyn Fn(&keep::KeptPlace) -> (u64, u64)| {
        let each = kept.places.iter().map(cost);
        each.fold((0, 0), |sum, cost| (sum.0 + cost.0, sum.1 + cost.1))
    };
    let before = sum(&|place| (place.start.conflicts, place.start.stitches));
    let now = sum(&|place| (place.cost.conflicts, place.cost.stitches));
    // Outside of the places nothing conflicts, and the stitches are the same ones.
    let (old, new) = (count(instance, start), count(instance, &kept.colouring));
    assert_eq!(before.0, old.0);
    assert_eq!(now.0, new.0);
    assert_eq!(old.1 - before.1, new.1 - now.1);
}

#[test]
fn beginning_with_a_colouring_changes_no_least_cost() {
    for masks in 2..=4 {
        for seed in 0..600 {
            let instance = instance(masks, seed);
            let start = random_start(&instance, &mut Pcg64::seed_from_u64(seed + 7));
            let expected = least(&instance);
            for (reductions, choice) in [
                (Reductions::ALL, Choice::Auto),
                (Reductions::NONE, Choice::Enumeration),
                (Reductions::ALL, Choice::CoreGuided(Scale::TINY)),
            ] {
                let reduced = reduce(&instance, reductions).unwrap();
                let limits = Limits::default();
                let outcomes = solve_pieces_from(&reduced, Some(&start), choice, &limits, &|_| {});
                let colourings: Vec<&[Mask]> = outcomes
                    .iter()
                    .map(|outcome| &outcome.colouring[..])
                    .collect();
                let merged = merge(&instance, &reduced, &colourings).unwrap();
                let cost = (merged.cost.conflicts, merged.cost.stitches);
                assert_eq!(cost, expected, "{masks} {seed} {choice:?}");
                assert!(
                    outcomes
                        .iter()
                        .all(|o| o.conflicts.is_tight() && o.stitches.is_tight())
                );
            }
        }
    }
}

/// A colouring that costs the least in a piece is what comes out of it, when it is stopped at once too.
#[test]
fn a_start_is_an_upper_limit_where_the_search_is_stopped() {
    let mut used = 0;
    for seed in 0..300 {
        let instance = instance(3, seed);
        let mut best: Option<Vec<Mask>> = None;
        let expected = least(&instance);
        each_colouring(&instance, |colouring| {
            if best.is_none()
                && count(&instance, colouring) == expected
                && keeps_ties(&instance, colouring)
            {
                best = Some(colouring.to_vec());
            }
        });
        let best = best.unwrap();
        let reduced = reduce(&instance, Reductions::NONE).unwrap();
        let limits = Limits::default();
        limits
            .cancel
            .store(true, std::sync::atomic::Ordering::SeqCst);
        let choice = Choice::CoreGuided(Scale::TINY);
        let without = solve_pieces_from(&reduced, None, choice, &limits, &|_| {});
        let with = solve_pieces_from(&reduced, Some(&best), choice, &limits, &|_| {});
        let upper = |outcomes: &[maskproof::solve::PieceOutcome]| {
            let each = outcomes
                .iter()
                .map(|o| (o.conflicts.upper, o.stitches.upper));
            each.fold((0, 0), |sum, one| (sum.0 + one.0, sum.1 + one.1))
        };
        assert_eq!(upper(&with), expected, "{seed}");
        used += u32::from(upper(&without) != expected);
    }
    assert!(used > 10, "{used}");
}

/// Twenty features in a row, each near the next four, of up to three fragments.
fn row(rng: &mut Pcg64) -> InstanceBuilder {
    let mut builder = InstanceBuilder::new(3);
    let sizes: Vec<u32> = (0..20).map(|_| rng.random_range(1..4)).collect();
    let firsts: Vec<u32> = sizes.iter().map(|&size| builder.feature(size)).collect();
    for (i, (&first, &size)) in firsts.iter().zip(&sizes).enumerate() {
        (1..size).for_each(|k| builder.stitch(first + k - 1, first + k, rng.random_range(1..3)));
        for other in i + 1..(i + 5).min(20) {
            let all = (0..size).flat_map(|a| (0..sizes[other]).map(move |b| (a, b)));
            let mut edges: Vec<[u32; 2]> =
                all.map(|(a, b)| [first + a, firsts[other] + b]).collect();
            edges.retain(|_| rng.random_bool(0.6));
            if !edges.is_empty() {
                builder.pair(edges);
            }
        }
    }
    builder
}

/// Places too large to enumerate, against the whole instance with all other masks fixed, solved with its reductions.
#[test]
fn large_places_agree_with_the_instance_that_has_the_rest_fixed() {
    let (mut large, mut saved) = (0, 0);
    for seed in 0..150 {
        let rng = &mut Pcg64::seed_from_u64(seed);
        let mut builder = row(rng);
        let instance = builder.clone().build().unwrap();
        let start: Vec<Mask> = (0..instance.fragment_count())
            .map(|_| rng.random_range(0..3))
            .collect();
        let limits = Limits::default();
        let mut improved = start.clone();
        descent::improve(&Places::new(&instance), &mut improved, &limits.for_run());
        // A little worse than a good colouring.
        for _ in 0..3 {
            improved[rng.random_range(0..start.len())] = rng.random_range(0..3);
        }
        let start = improved;
        let free = fails(&instance, &start);
        for fragment in 0..instance.fragment_count() as u32 {
            if !free.contains(&instance.feature_of(fragment)) {
                builder.allow(fragment, MaskSet::from_bits(1 << start[fragment as usize]));
            }
        }
        let fixed = solve(&builder.build().unwrap(), USUAL, Duration::from_secs(600));
        let kept = keep::solve(&instance, &start, &limits).unwrap();
        let cost = count_large(&instance, &kept.colouring);
        assert_eq!((cost.0, cost.0), fixed.conflicts, "{seed}");
        assert_eq!((cost.1, cost.1), fixed.stitches, "{seed}");
        large += u32::from(kept.places.iter().any(|place| place.features.len() > 8));
        saved += u32::from(cost < count_large(&instance, &start));
    }
    assert!(large > 20 && saved > 50, "{large} {saved}");
}

/// Conflicts and stitches of an instance without self-spacings.
fn count_large(instance: &Instance, colouring: &[Mask]) -> (u64, u64) {
    let mask = |fragment: u32| colouring[fragment as usize];
    let left = instance
        .pairs()
        .filter(|pair| pair.iter().any(|&[a, b]| mask(a) == mask(b)));
    let used = instance
        .stitches()
        .iter()
        .filter(|s| mask(s.a) != mask(s.b));
    (left.count() as u64, used.map(|s| u64::from(s.weight)).sum())
}
