//! Cores by their definition, on random instances with everything that an instance may hold: by plain
//! enumeration of the units that are kept (`common/enumerate.rs`).

use encodings::{Instance, InstanceBuilder, MaskSet};
use maskproof::solve::Stop;
use maskproof::solve::places::Places;

use maskproof::explain::core::{Core, Shrunk, shrink};
use maskproof::explain::{Bound, units};

use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64;

use crate::common::{enumerate, random};
use crate::{whole, with_units};

fn least(instance: &Instance, units: &[u32]) -> u64 {
    enumerate::least(&with_units(instance, units)).0
}

fn core_of(instance: &Instance, bound: &Bound) -> Core {
    match shrink(&Places::new(instance), bound, &Stop::default()) {
        Shrunk::Core(core) => core,
        other => panic!("{other:?}"),
    }
}

/// "Needs the limit, and no longer does once any one is left out."
fn check(instance: &Instance, bound: &Bound) -> Core {
    let core = core_of(instance, bound);
    assert!(core.irreducible);
    assert_eq!(core.limit, bound.limit);
    assert!(core.units.iter().all(|unit| bound.units.contains(unit)));
    assert!(core.units.is_sorted());
    assert!(least(instance, &core.units) >= core.limit);
    for left_out in &core.units {
        let rest: Vec<u32> = core
            .units
            .iter()
            .copied()
            .filter(|u| u != left_out)
            .collect();
        assert!(
            least(instance, &rest) < core.limit,
            "{left_out} of {core:?}"
        );
    }
    core
}

#[test]
fn cores_of_random_instances_are_irreducible() {
    let mut cores = [0; 4];
    let mut several = 0;
    for masks in 2..=5 {
        // Conflicts are rare among many masks.
        for seed in 0..[250, 250, 300, 1200][usize::from(masks) - 2] {
            let instance = random::instance(masks, seed);
            let limit = enumerate::least(&instance).0;
            if limit == 0 {
                continue;
            }
            let core = check(&instance, &whole(&instance, limit));
            cores[usize::from(masks) - 2] += 1;
            several += u32::from(core.limit > 1);
            // A smaller limit is a bound too, with smaller cores.
            if limit > 1 {
                check(&instance, &whole(&instance, 1));
            }
        }
    }
    assert!(cores.iter().all(|&count| count >= 50), "{cores:?}");
    assert!(several >= 50, "{several}");
}

/// Two features of several fragments, trees and rings, most of their fragments on given masks, with as many
/// self-spacings as there can be.
fn folded(masks: u8, seed: u64) -> Instance {
    let rng = &mut Pcg64::seed_from_u64(seed);
    let mut builder = InstanceBuilder::new(masks);
    for _ in 0..2 {
        let size = rng.random_range(2..=4);
        let first = builder.feature(size);
        for i in 1..size {
            let parent = rng.random_range(0..i);
            for j in 0..i {
                if j == parent || rng.random_bool(0.2) {
                    builder.stitch(first + j, first + i, 1);
                } else {
                    builder.self_spacing(first + j, first + i);
                }
            }
        }
    }
    for fragment in 0..builder.fragment_count() as u32 {
        if rng.random_bool(0.7) {
            builder.allow(fragment, MaskSet::only(rng.random_range(0..masks)));
        }
    }
    let last = builder.fragment_count() as u32 - 1;
    builder.pair([[0, last], [1, last - 1]]);
    builder.build().unwrap()
}

#[test]
fn cores_with_self_spacings_are_irreducible() {
    let (mut own, mut several) = (0, 0);
    for masks in 2..=3 {
        for seed in 0..200 {
            let instance = folded(masks, seed);
            let limit = enumerate::least(&instance).0;
            if limit == 0 {
                continue;
            }
            let core = check(&instance, &whole(&instance, limit));
            own += u32::from((core.units.iter()).any(|&u| units::is_self_spacing(&instance, u)));
            several += u32::from(limit > 1);
        }
    }
    assert!(own >= 60 && several >= 20, "{own} {several}");
}

/// The edges that a core keeps are a core too: no fragment edge can be left out of it.
#[test]
fn the_edges_of_a_core_are_needed() {
    let mut dropped = 0;
    for masks in 2..=4 {
        for seed in 1000..1100 {
            let instance = random::instance(masks, seed);
            let limit = enumerate::least(&instance).0;
            if limit == 0 {
                continue;
            }
            let core = core_of(&instance, &whole(&instance, limit));
            let given = |without: Option<[u32; 2]>| {
                let kept = |edge: &&[u32; 2]| Some(**edge) != without;
                let pairs: Vec<Vec<[u32; 2]>> = (core.units.iter().zip(&core.edges))
                    .map(|(_, edges)| edges.iter().filter(kept).copied().collect())
                    .collect();
                enumerate::least(&with_edges(&instance, &core, &pairs)).0
            };
            assert!(given(None) >= limit);
            for edge in core.edges.iter().flatten() {
                assert!(given(Some(*edge)) < limit, "{edge:?} of {core:?}");
            }
            let all = core.units.iter().map(|&u| units::edges(&instance, u).len());
            dropped += all.sum::<usize>() - core.edges.iter().flatten().count();
        }
    }
    assert!(dropped > 50, "{dropped}");
}

fn with_edges(instance: &Instance, core: &Core, edges: &[Vec<[u32; 2]>]) -> Instance {
    let mut builder = InstanceBuilder::new(instance.masks());
    for feature in 0..instance.feature_count() as u32 {
        builder.feature(instance.fragments_of(feature).len() as u32);
    }
    for fragment in 0..instance.fragment_count() as u32 {
        builder.allow(fragment, instance.allowed(fragment));
    }
    for stitch in instance.stitches() {
        builder.stitch(stitch.a, stitch.b, stitch.weight);
    }
    for (&unit, edges) in core.units.iter().zip(edges) {
        match edges[..] {
            [] => {}
            _ if units::is_self_spacing(instance, unit) => {
                edges.iter().for_each(|&[a, b]| builder.self_spacing(a, b));
            }
            _ => builder.pair(edges.iter().copied()),
        }
    }
    for tie in instance.ties() {
        builder.tie(tie.clone());
    }
    builder.build().unwrap()
}

#[test]
fn what_is_no_bound_is_told() {
    let mut told = 0;
    for seed in 0..40 {
        let instance = random::instance(3, seed);
        let limit = enumerate::least(&instance).0 + 1;
        let found = shrink(
            &Places::new(&instance),
            &whole(&instance, limit),
            &Stop::default(),
        );
        assert_eq!(found, Shrunk::NoBound);
        told += 1;
    }
    assert_eq!(told, 40);
}
