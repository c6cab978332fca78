//! The theorem of the policy `every-interval`: its least cost is the least over all legal places, for layouts whose
//! features it does not name; and never less, for any.

use super::search::Cost;
use super::{candidates, everywhere, layouts};
use maskproof::extract::policy::every_interval::EveryInterval;
use maskproof::extract::{Extraction, extract_with};
use maskproof::geometry::Rect;
use maskproof::layout::Rules;
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

pub fn run(rects: &[Rect], outs: &[Rect], rules: &Rules, drops: bool) -> Extraction {
    let layout = layouts::layout(rects, outs);
    extract_with(&layout, rules, &EveryInterval { drops }, &|_| ()).unwrap()
}

/// The least cost over all legal places, given that of some of them.
pub fn everywhere(rects: &[Rect], outs: &[Rect], rules: &Rules, found: Cost) -> Option<Cost> {
    let keep = rules.stitch.keep_outs.iter();
    let keep_outs: Vec<_> = keep
        .map(|rule| (everywhere::cells_of(outs), rule.distance))
        .collect();
    let features = everywhere::features(rects);
    // One stitch more than found is allowed, so that not finding it again is seen.
    everywhere::least_below(&features, &keep_outs, rules, (found.0, found.1 + 1))
}

#[derive(Debug, Default)]
struct Tally {
    layouts: usize,
    within: usize,
    stitched: usize,
    conflicts: usize,
    worse: usize,
    before: usize,
    after: usize,
}

fn check(seed: u64, masks: u8, rounds: usize) -> Tally {
    let mut rng = Pcg64Mcg::seed_from_u64(seed);
    let mut tally = Tally::default();
    while tally.layouts < rounds {
        let rules = layouts::rules(&mut rng, masks);
        let side = rng.random_range(9..=14);
        // More masks need denser scenes for a stitch to help.
        let fewest = if masks == 2 {
            1
        } else {
            usize::from(masks) + 1
        };
        let count = rng.random_range(fewest..=usize::from(masks) + 3);
        let rects = layouts::scene(&mut rng, count, side);
        let outs = layouts::outs(&mut rng, side);
        let found = run(&rects, &outs, &rules, true);
        // Most layouts have no place for a stitch that could help: some of them will do.
        if found.candidates.after == 0 && !rng.random_ratio(1, 200) {
            continue;
        }
        let least = candidates::least(&found, masks);
        let within = found.beyond_theorem.is_empty();
        let case = || {
            format!(
                "seed {seed} layout {}: {rects:?} outs {outs:?} {rules:?} {:?}",
                tally.layouts, found.beyond_theorem
            )
        };
        let best = everywhere(&rects, &outs, &rules, least);
        let best =
            best.unwrap_or_else(|| panic!("better than all legal places: {least:?} {}", case()));
        assert!(
            !within || least == best,
            "{least:?} for {best:?} {}",
            case()
        );
        let all = candidates::least(&run(&rects, &outs, &rules, false), masks);
        assert_eq!(all, least, "with and without dropping: {}", case());
        tally.layouts += 1;
        tally.within += usize::from(within);
        tally.stitched += usize::from(best.1 > 0);
        tally.conflicts += usize::from(best.0 > 0);
        tally.worse += usize::from(least > best);
        tally.before += found.candidates.before;
        tally.after += found.candidates.after;
    }
    println!("K = {masks}: {tally:?}");
    tally
}

#[test]
fn the_least_cost_is_that_of_all_places_for_two_masks() {
    let tally = check(1, 2, 1500);
    assert!(tally.within * 4 >= tally.layouts * 3);
}

#[test]
fn the_least_cost_is_that_of_all_places_for_three_masks() {
    let tally = check(2, 3, 800);
    assert!(tally.within * 4 >= tally.layouts * 3);
}

#[test]
fn the_least_cost_is_that_of_all_places_for_four_masks() {
    let tally = check(3, 4, 200);
    assert!(tally.within * 4 >= tally.layouts * 3);
}
