//! Every setting against plain enumeration, on random small instances of K = 2 to 5 masks with
//! stitches, allowed masks, several edges to a pair and self-spacings.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::solver::{Setting, settings, solve};
use common::{enumerate, random};
use encodings::Instance;
use std::ops::AddAssign;
use std::sync::atomic::{AtomicU64, Ordering};
use std::thread;
use std::time::Duration;

/// Instances per number of masks: 200,800 in all.
const INSTANCES: u64 = 50_200;

/// Seeds that a thread takes at a time.
const BATCH: u64 = 50;

const NO_LIMIT: Duration = Duration::from_secs(600);

/// How many instances held what the comparison is for.
#[derive(Clone, Copy, Debug, Default)]
struct Coverage {
    instances: u64,
    with_conflicts: u64,
    with_stitches: u64,
    with_both: u64,
    with_self_spacings: u64,
    with_excluded_masks: u64,
    with_wide_pairs: u64,
    with_stitch_cycles: u64,
}

impl Coverage {
    fn of(instance: &Instance, (conflicts, stitches): enumerate::Least) -> Coverage {
        let fragments = instance.fragment_count();
        let tree_edges = fragments - instance.feature_count();
        Coverage {
            instances: 1,
            with_conflicts: u64::from(conflicts > 0),
            with_stitches: u64::from(stitches > 0),
            with_both: u64::from(conflicts > 0 && stitches > 0),
            with_self_spacings: u64::from(!instance.self_spacings().is_empty()),
            with_excluded_masks: u64::from(!instance.is_unrestricted()),
            with_wide_pairs: u64::from(instance.pairs().any(|edges| edges.len() > 1)),
            with_stitch_cycles: u64::from(instance.stitches().len() > tree_edges),
        }
    }

    fn parts(&self) -> [u64; 8] {
        [
            self.instances,
            self.with_conflicts,
            self.with_stitches,
            self.with_both,
            self.with_self_spacings,
            self.with_excluded_masks,
            self.with_wide_pairs,
            self.with_stitch_cycles,
        ]
    }
}

impl AddAssign for Coverage {
    fn add_assign(&mut self, other: Coverage) {
        self.instances += other.instances;
        self.with_conflicts += other.with_conflicts;
        self.with_stitches += other.with_stitches;
        self.with_both += other.with_both;
        self.with_self_spacings += other.with_self_spacings;
        self.with_excluded_masks += other.with_excluded_masks;
        self.with_wide_pairs += other.with_wide_pairs;
        self.with_stitch_cycles += other.with_stitch_cycles;
    }
}

fn check(instance: &Instance, setting: Setting, least: enumerate::Least, label: &str) {
    let found = solve(instance, setting, NO_LIMIT);
    let bounds = (found.conflicts, found.stitches);
    let expected = ((least.0, least.0), (least.1, least.1));
    assert_eq!(bounds, expected, "{label}, {}: {instance:#?}", setting.name);
    assert_eq!(
        instance.check_legal(&found.colouring),
        Ok(()),
        "{label}, {}",
        setting.name
    );
    let priced = enumerate::count(instance, &found.colouring);
    assert_eq!(
        priced, least,
        "the colouring of {label}, {}: {instance:#?}",
        setting.name
    );
}

/// Compares the instances of K masks; the threads take seeds in turn.
fn compare(masks: u8) -> Coverage {
    let next = AtomicU64::new(0);
    let settings = settings();
    let work = || {
        let mut coverage = Coverage::default();
        loop {
            let start = next.fetch_add(BATCH, Ordering::Relaxed);
            if start >= INSTANCES {
                return coverage;
            }
            for seed in start..(start + BATCH).min(INSTANCES) {
                let instance = random::instance(masks, seed);
                let least = enumerate::least(&instance);
                for &setting in &settings {
                    check(
                        &instance,
                        setting,
                        least,
                        &format!("K = {masks}, seed {seed}"),
                    );
                }
                coverage += Coverage::of(&instance, least);
            }
        }
    };
    let threads = thread::available_parallelism().map_or(1, usize::from);
    let mut total = Coverage::default();
    thread::scope(|scope| {
        let running: Vec<_> = (0..threads).map(|_| scope.spawn(work)).collect();
        for thread in running {
            total += thread
                .join()
                .expect("a comparison failed: see its message above");
        }
    });
    total
}

fn compare_and_check_coverage(masks: u8) {
    let coverage = compare(masks);
    println!("K = {masks}: {coverage:?}");
    assert_eq!(coverage.instances, INSTANCES);
    let least = coverage.parts().into_iter().min().unwrap();
    assert!(
        least >= INSTANCES / 200,
        "a case is hardly covered: {coverage:?}"
    );
}

#[test]
fn two_masks() {
    compare_and_check_coverage(2);
}

#[test]
fn three_masks() {
    compare_and_check_coverage(3);
}

#[test]
fn four_masks() {
    compare_and_check_coverage(4);
}

#[test]
fn five_masks() {
    compare_and_check_coverage(5);
}

/// The enumeration itself, on instances whose cost is plain to see.
#[test]
fn enumeration_prices_what_the_definitions_say() {
    // Three features in a triangle at K = 2: a stitch of weight 3 in one of them frees it.
    let mut builder = encodings::InstanceBuilder::new(2);
    builder.feature(2);
    builder.feature(1);
    builder.feature(1);
    builder.pair([[0, 2]]);
    builder.pair([[1, 3]]);
    builder.pair([[2, 3]]);
    builder.stitch(0, 1, 3);
    assert_eq!(enumerate::least(&builder.build().unwrap()), (0, 3));

    // Fragments 0-1-2 in a row, 0 and 2 too close: on one mask the whole way it is no violation.
    let mut row = encodings::InstanceBuilder::new(2);
    row.feature(3);
    row.stitch(0, 1, 1);
    row.stitch(1, 2, 1);
    row.self_spacing(0, 2);
    let row = row.build().unwrap();
    assert_eq!(enumerate::count(&row, &[0, 0, 0]), (0, 0));
    assert_eq!(enumerate::count(&row, &[0, 1, 0]), (1, 2));
    assert_eq!(enumerate::count(&row, &[0, 1, 1]), (0, 1));
}
