//! The least cost of an extracted instance, counted from the definitions with the hard constraints of stitches.

use super::search::{Cost, Problem, Way};
use maskproof::extract::Extraction;
use std::collections::BTreeSet;

/// The least cost over all legal colourings.
pub fn least(found: &Extraction, masks: u8) -> Cost {
    let instance = &found.instance;
    let mut close = BTreeSet::new();
    for &[a, b] in instance.edges() {
        close.extend([(a, b), (b, a)]);
    }
    let first = |feature: usize| found.fragments.of_feature(feature as u32).start;
    let ways = (0..instance.feature_count()).map(|feature| ways(found, feature as u32, masks));
    let close = |f: usize, i: usize, g: usize, j: usize| {
        close.contains(&(first(f) + i as u32, first(g) + j as u32))
    };
    let problem = Problem {
        ways: ways.collect(),
        close: &close,
    };
    problem.least_below((u64::MAX, u64::MAX)).unwrap()
}

/// Every legal colouring of a feature.
fn ways(found: &Extraction, feature: u32, masks: u8) -> Vec<Way> {
    let fragments = found.fragments.of_feature(feature);
    let mut all = Vec::new();
    extend(found, fragments, masks, &mut Vec::new(), &mut all);
    all
}

fn extend(
    found: &Extraction,
    range: std::ops::Range<u32>,
    masks: u8,
    colours: &mut Vec<u8>,
    all: &mut Vec<Way>,
) {
    let colour =
        |colours: &[u8], fragment: u32| colours.get((fragment - range.start) as usize).copied();
    // A limit that the fragments coloured so far break stays broken.
    let used = |cut: &u32| {
        let [a, b] = found.fragments.cuts()[*cut as usize]
            .sides
            .map(|side| colour(colours, side));
        a.is_some() && b.is_some() && a != b
    };
    let of_feature = |cut: u32| range.contains(&found.fragments.cuts()[cut as usize].sides[0]);
    let mut limits = found
        .fragments
        .limits()
        .iter()
        .filter(|limit| of_feature(limit.cuts[0]));
    if limits.any(|limit| limit.cuts.iter().filter(|cut| used(cut)).count() > limit.most as usize) {
        return;
    }
    if colours.len() < range.len() {
        for mask in 0..masks {
            colours.push(mask);
            extend(found, range.clone(), masks, colours, all);
            colours.pop();
        }
        return;
    }
    let get = |fragment: u32| colours[(fragment - range.start) as usize];
    let inside = |fragment: u32| range.contains(&fragment);
    let own = found.instance.stitches().iter().filter(|s| inside(s.a));
    let differs = own.clone().filter(|s| get(s.a) != get(s.b));
    let stitches = differs.map(|s| u64::from(s.weight)).sum();
    // Fragments joined within their mask.
    let mut part: Vec<u32> = range.clone().collect();
    for _ in 0..range.len() {
        for s in own.clone().filter(|s| get(s.a) == get(s.b)) {
            let [a, b] = [s.a, s.b].map(|f| (f - range.start) as usize);
            let least = part[a].min(part[b]);
            (part[a], part[b]) = (least, least);
        }
    }
    let apart =
        |&[a, b]: &[u32; 2]| part[(a - range.start) as usize] != part[(b - range.start) as usize];
    let mut spacings = found
        .instance
        .self_spacings()
        .iter()
        .filter(|s| inside(s[0]));
    let violated = spacings.any(|s| get(s[0]) == get(s[1]) && apart(s));
    all.push(Way {
        cost: (u64::from(violated), stitches),
        parts: colours.iter().copied().enumerate().collect(),
    });
}
