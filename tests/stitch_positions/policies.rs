//! Policies against each other, on random layouts: no set of legal places does better than `every-interval`.

use super::{candidates, everywhere, layouts};
use maskproof::extract::{Extraction, extract};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{Listed, Policy, Rules};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

fn run(
    rects: &[Rect],
    outs: &[Rect],
    rules: &Rules,
    policy: Policy,
    listed: &[Listed],
) -> Extraction {
    let mut rules = rules.clone();
    rules.stitch.policy = policy;
    rules.stitch.listed = listed.to_vec();
    extract(&layouts::layout(rects, outs), &rules, &|_| ()).unwrap()
}

/// Some legal stitches as entries of a list.
fn some_spots(rects: &[Rect], outs: &[Rect], rules: &Rules, rng: &mut Pcg64Mcg) -> Vec<Listed> {
    let keep = rules.stitch.keep_outs.iter();
    let outs: Vec<_> = keep
        .map(|rule| (everywhere::cells_of(outs), rule.distance))
        .collect();
    let mut list = Vec::new();
    for cells in everywhere::features(rects) {
        let &(x, y) = cells.first().unwrap();
        for spot in everywhere::spots(&cells, &outs, rules) {
            if list.len() < 12 && rng.random_ratio(1, 4) {
                let at = if rng.random() {
                    spot.line.min
                } else {
                    spot.line.max
                };
                list.push(Listed {
                    feature: Point::new(x, y),
                    at,
                });
            }
        }
    }
    list
}

#[test]
fn nothing_does_better_than_every_interval() {
    let mut rng = Pcg64Mcg::seed_from_u64(7);
    let (mut compared, mut worse, mut as_good) = (0, 0, 0);
    while compared < 1000 {
        let masks = rng.random_range(2..=3);
        let rules = layouts::rules(&mut rng, masks);
        let rects = layouts::scene(&mut rng, 4, 14);
        let outs = layouts::outs(&mut rng, 14);
        let best = run(&rects, &outs, &rules, Policy::EveryInterval, &[]);
        let list = some_spots(&rects, &outs, &rules, &mut rng);
        if list.is_empty() || best.candidates.after == 0 || !best.beyond_theorem.is_empty() {
            continue;
        }
        compared += 1;
        let least = candidates::least(&best, masks);
        let others = [
            (Policy::Uncovered, &[][..]),
            (Policy::Listed, &list),
            (Policy::None, &[]),
        ];
        for (policy, list) in others {
            let found = run(&rects, &outs, &rules, policy, list);
            let cost = candidates::least(&found, masks);
            assert!(
                cost >= least,
                "{policy:?} {cost:?} {least:?}: {rects:?} {outs:?} {rules:?} {list:?}"
            );
            worse += usize::from(cost > least);
            as_good += usize::from(cost == least && policy == Policy::Listed && cost.1 > 0);
        }
    }
    println!("{worse} times worse, {as_good} times as good with a list");
    assert!(worse > 50 && as_good > 0);
}
