//! Pieces too large for enumeration: every setting must agree, at any number of threads, and each bound
//! of a packing must hold by itself.
//!
//! Compared with: the engines among one another (they share the encodings, which `encodings/tests` hold
//! against enumeration); the least costs of the wires by RC2 over CaDiCaL (tests/data/README.md).
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use std::collections::BTreeSet;
use std::fs::File;
use std::io::BufReader;
use std::path::Path;
use std::time::Duration;

use encodings::{Instance, InstanceBuilder, Mask};
use maskproof::formats::instance_json;
use maskproof::reduce::{Reductions, reduce};
use maskproof::solve::{Choice, Limits, PieceOutcome, Scale, solve_piece, solve_pieces};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64;

use common::solver::{settings, solve};

const LIMIT: Duration = Duration::from_secs(120);

/// Features along a line or in a square, joined to others nearby: cores are local, as in layouts.
fn local_instance(seed: u64) -> Instance {
    let rng = &mut Pcg64::seed_from_u64(seed);
    let masks = rng.random_range(2..=4);
    let side: u32 = rng.random_range(3..=6);
    let chance = 0.05 + 0.15 * f64::from(masks);
    let longest = if rng.random_bool(0.7) { 3 } else { 1 };
    let mut builder = InstanceBuilder::new(masks);
    let mut features = Vec::new();
    for _ in 0..side * side {
        let size = rng.random_range(1..=longest);
        let first = builder.feature(size);
        for i in 1..size {
            builder.stitch(first + i - 1, first + i, rng.random_range(1..=2));
        }
        if size == 3 && rng.random_bool(0.3) {
            builder.self_spacing(first, first + 2);
        }
        features.push(first..first + size);
    }
    for a in 0..features.len() {
        for b in a + 1..features.len() {
            let (a_at, b_at) = (a as u32, b as u32);
            let dx = (a_at % side).abs_diff(b_at % side);
            let dy = (a_at / side).abs_diff(b_at / side);
            if dx.max(dy) > 2 || !rng.random_bool(chance / f64::from(dx.max(dy))) {
                continue;
            }
            let mut edges: Vec<[u32; 2]> = Vec::new();
            for x in features[a].clone() {
                edges.extend(
                    features[b]
                        .clone()
                        .map(|y| [x, y])
                        .filter(|_| rng.random_bool(0.6)),
                );
            }
            if edges.is_empty() {
                edges.push([features[a].start, features[b].start]);
            }
            builder.pair(edges);
        }
    }
    builder.build().unwrap()
}

#[test]
fn settings_agree_on_pieces_beyond_enumeration() {
    let (mut costly, mut stitched) = (0, 0);
    for seed in 0..400 {
        let instance = local_instance(seed);
        let mut first = None;
        for setting in settings() {
            if setting.enumerates() {
                continue;
            }
            let found = solve(&instance, setting, LIMIT);
            let bounds = (found.conflicts, found.stitches);
            assert_eq!(
                found.conflicts.0, found.conflicts.1,
                "seed {seed}, {}",
                setting.name
            );
            assert_eq!(
                found.stitches.0, found.stitches.1,
                "seed {seed}, {}",
                setting.name
            );
            let expected = *first.get_or_insert(bounds);
            assert_eq!(bounds, expected, "seed {seed}, {}", setting.name);
        }
        let (conflicts, stitches) = first.unwrap();
        costly += u32::from(conflicts.1 > 0);
        stitched += u32::from(stitches.1 > 0);
    }
    assert!(
        costly > 150 && stitched > 40,
        "{costly} with conflicts, {stitched} with stitches"
    );
}

fn core_guided(instance: &Instance, scale: Scale) -> PieceOutcome {
    solve_piece(instance, Choice::CoreGuided(scale), &Limits::default())
}

/// The sub-instance of some units of conflict: all fragments, only those pairs, stitches free.
fn only(instance: &Instance, units: &[u32]) -> Instance {
    let mut builder = InstanceBuilder::new(instance.masks());
    for feature in 0..instance.feature_count() as u32 {
        builder.feature(instance.fragments_of(feature).len() as u32);
    }
    for fragment in 0..instance.fragment_count() as u32 {
        builder.allow(fragment, instance.allowed(fragment));
    }
    for stitch in instance.stitches() {
        builder.stitch(stitch.a, stitch.b, 1);
    }
    for &unit in units {
        let edges = instance.unit(unit).iter();
        if instance.is_self_unit(unit) {
            edges.for_each(|&[a, b]| builder.self_spacing(a, b));
        } else {
            builder.pair(edges.copied());
        }
    }
    for tie in instance.ties() {
        builder.tie(tie.clone());
    }
    builder.build().unwrap()
}

/// Limits add up to the lower bound, units are disjoint, and each limit is the truth of its own units
/// or less.
fn check_packing(instance: &Instance, outcome: &PieceOutcome, label: &str) -> usize {
    let mut seen = BTreeSet::new();
    let mut sum = 0;
    for bound in &outcome.conflict_packing {
        assert!(
            bound.units.iter().all(|&unit| seen.insert(unit)),
            "{label}: a unit stands twice"
        );
        let alone = solve(&only(instance, &bound.units), common::solver::USUAL, LIMIT);
        assert!(
            alone.conflicts.0 >= bound.limit,
            "{label}: {bound:?} costs {alone:?} alone"
        );
        sum += bound.limit;
    }
    assert_eq!(sum, outcome.conflicts.lower, "{label}");
    outcome.conflict_packing.len()
}

#[test]
fn each_bound_of_a_packing_holds_by_itself() {
    let mut bounds = 0;
    for seed in 0..60 {
        let instance = local_instance(seed);
        for scale in [Scale::USUAL, Scale::TINY] {
            let outcome = core_guided(&instance, scale);
            bounds += check_packing(&instance, &outcome, &format!("seed {seed}, {scale:?}"));
        }
    }
    assert!(bounds > 100, "only {bounds} bounds");
}

fn data(name: &str) -> Instance {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/data")
        .join(name);
    instance_json::read(BufReader::new(File::open(&path).unwrap()), name, None).unwrap()
}

#[test]
fn bounds_of_the_small_wires_hold_and_add_up() {
    let instance = data("wires_s.json");
    let outcome = core_guided(&instance, Scale::USUAL);
    assert_eq!((outcome.conflicts.lower, outcome.stitches.lower), (118, 13));
    check_packing(&instance, &outcome, "wires_s");
    let stitches: u64 = outcome.stitch_packing.iter().map(|bound| bound.limit).sum();
    assert_eq!(stitches, 13);
}

fn colourings(instance: &Instance, threads: usize) -> Vec<(Vec<Mask>, u64, u64)> {
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .unwrap();
    let reduced = reduce(instance, Reductions::ALL).unwrap();
    let outcomes =
        pool.install(|| solve_pieces(&reduced, Choice::Auto, &Limits::default(), &|_| {}));
    outcomes
        .into_iter()
        .map(|o| (o.colouring, o.conflicts.lower, o.stitches.lower))
        .collect()
}

#[test]
fn threads_do_not_show_in_outcomes() {
    let instance = data("wires_m3.json");
    assert_eq!(colourings(&instance, 1), colourings(&instance, 3));
}

/// Stopped at once or half-way, the bounds are true and the colouring is legal.
#[test]
fn stopped_searches_keep_true_bounds() {
    let instance = data("wires_m3.json");
    for milliseconds in [0, 5, 50, 150, 400] {
        let limit = Duration::from_millis(milliseconds);
        let found = solve(&instance, common::solver::USUAL, limit);
        assert!(
            found.conflicts.0 <= 126 && found.conflicts.1 >= 126,
            "{milliseconds} ms"
        );
        if found.conflicts == (126, 126) {
            assert!(
                found.stitches.0 <= 54 && found.stitches.1 >= 54,
                "{milliseconds} ms"
            );
        }
        assert_eq!(instance.check_legal(&found.colouring), Ok(()));
    }
}
