//! Random layouts with random rules: what the audit derives against the raster.

use super::expected::{Place, covered, cut, decide, expected, uncovered};
use super::random::{ByHand, Random};
use super::raster::{self, Feature};
use super::*;
use maskproof::layout::Listed;
use rand::SeedableRng;
use rand::seq::IndexedRandom;
use rand_pcg::Pcg64Mcg;

/// The keep-outs of a layout, each with the distance from it.
type Vias = Vec<([i32; 4], i32)>;

/// Where the policy may cut (under `uncovered`, where it does), and everywhere else on runs.
fn places(features: &[Feature], hand: &ByHand, rules: &Rules, vias: &Vias) -> [Vec<Place>; 2] {
    let mut found = [Vec::new(), Vec::new()];
    for (f, feature) in (0u32..).zip(features) {
        let others = (0u32..).zip(features).filter(|(g, _)| *g != f);
        let others: Vec<&Feature> = others.map(|(_, other)| other).collect();
        for run in raster::runs(feature) {
            let all = run.along[0]..=run.along[1];
            let legal = |place: &i32| run.is_legal(*place, rules, vias);
            let placed: Vec<i32> = match rules.stitch.policy {
                Policy::None => Vec::new(),
                Policy::Uncovered => {
                    let covered = covered(&run, feature, &others, rules);
                    uncovered(&run, &covered, rules, vias)
                }
                _ => all.clone().filter(legal).collect(),
            };
            for place in all {
                let is_placed = placed.contains(&place) && !hand.names(f);
                found[usize::from(!is_placed)].push(Place {
                    feature: f,
                    line: run.rect(place, place),
                    run: run.clone(),
                    place,
                });
            }
        }
    }
    found
}

/// Random layouts under one policy; counts what is close because of edges or corners only, stitch edges, ties, refusals.
fn check(policy: Policy, rounds: u64, salt: u64) -> [usize; 4] {
    let mut seen = [0; 4];
    for seed in 0..rounds {
        let mut random = Random(Pcg64Mcg::seed_from_u64(seed * 16 + salt));
        let rects = random.rects();
        let mut rules = random.rules(policy);
        let vias = random.keep_outs(&mut rules);
        let features = raster::features(&rects, &rules);
        let firsts: Vec<[i32; 2]> = features.iter().map(|f| *f.cells.first().unwrap()).collect();
        let mut layout = layout(shapes(&rects));
        let via_rects: Vec<[i32; 4]> = vias.iter().map(|via| via.0).collect();
        layout.keep_outs = vec![(VIA, shapes(&via_rects))];
        let hand = random.hand(&features, &mut rules);
        let [mut legal, others] = places(&features, &hand, &rules, &vias);
        if policy != Policy::Uncovered {
            let count = random.to(7) as usize;
            let some = legal.choose_multiple(&mut random.0, count);
            legal = some.cloned().collect();
        }
        legal.sort_unstable();
        if policy == Policy::Listed {
            let listed = |place: &Place| {
                let [x0, y0, x1, y1] = place.line;
                Listed {
                    feature: random.point_of(&features[place.feature as usize]),
                    at: Point::new(x0 + random.to(x1 - x0 + 1), y0 + random.to(y1 - y0 + 1)),
                }
            };
            rules.stitch.listed = legal.iter().map(listed).collect();
        }
        let cut = cut(&features, &legal, rules.stitch.overlap / 2);
        let (mut expected, by_kind) = expected(&features, &cut, &rules);
        decide(&mut expected, &hand);
        let found = derived(&layout, &rules, &firsts, &cut.named);
        let shown = format!(
            "seed {seed}: {rules:?}\n{rects:?} {vias:?}\n{:?}",
            cut.named
        );
        assert_eq!(found.as_ref(), Ok(&expected), "{shown}");
        let refused = |cuts: &[Named], reason: &str| {
            let refused = derived(&layout, &rules, &firsts, cuts).unwrap_err();
            let is_right = refused.step == Step::Stitches && refused.reason.contains(reason);
            assert!(is_right, "{shown}\n{cuts:?}\n{refused}");
        };
        // Any one more is refused.
        if let Some(other) = others.choose(&mut random.0) {
            let mut more = cut.named.clone();
            more.push((other.feature, other.line, [0, 1]));
            more.sort_unstable();
            refused(&more, "no cut is allowed at");
            seen[3] += 1;
        }
        // And any one less, where it is not the certificate that says where to cut.
        if policy != Policy::EveryInterval && !cut.named.is_empty() {
            let mut fewer = cut.named.clone();
            fewer.remove(random.to(fewer.len() as i32) as usize);
            refused(&fewer, "which is not listed");
        }
        seen[0] += by_kind;
        seen[1] += expected.stitches.len();
        seen[2] += expected.ties.len();
    }
    seen
}

#[test]
fn cuts_that_a_certificate_names() {
    let seen = check(Policy::EveryInterval, 4_000, 1);
    assert!(seen.iter().all(|&count| count > 500), "{seen:?}");
}

#[test]
fn cuts_that_the_rules_list() {
    let seen = check(Policy::Listed, 2_000, 2);
    assert!(seen.iter().all(|&count| count > 250), "{seen:?}");
}

#[test]
fn cuts_that_the_policy_places() {
    let seen = check(Policy::Uncovered, 4_000, 3);
    assert!(seen.iter().all(|&count| count > 500), "{seen:?}");
}

#[test]
fn no_cuts_at_all() {
    let seen = check(Policy::None, 3_000, 4);
    assert!(seen[0] > 500 && seen[1] == 0 && seen[3] > 2_000, "{seen:?}");
}
