//! Descent: improves a colouring one feature at a time, until no single change helps.
//!
//! A change gives a whole feature another mask, or one fragment of it. Each change lowers the cost, so the
//! search ends; ties stay kept. A feature is looked at again when it or a neighbour has changed. What it gives is an upper bound
//! only: it matters where a limit stops the exact search.

use encodings::{Cost, Mask};

use super::limits::Stop;
use super::places::Places;

/// A feature with more fragment edges than this, times its fragments, is changed as a whole only.
const MOST_WORK: usize = 4096;

/// Looks at each feature at most this often on average.
const MOST_SWEEPS: usize = 24;

/// Improves a legal colouring.
pub fn improve(places: &Places<'_>, colours: &mut [Mask], stop: &Stop) {
    let features = places.instance.feature_count();
    let mut waiting: std::collections::VecDeque<u32> = (0..features as u32).collect();
    let mut is_waiting = vec![true; features];
    let mut looks = features * MOST_SWEEPS;
    while let Some(feature) = waiting.pop_front() {
        is_waiting[feature as usize] = false;
        if looks == 0 || (looks.is_multiple_of(16) && stop.now()) {
            return;
        }
        looks -= 1;
        if improve_feature(places, feature, colours) {
            let touched = places.neighbours(feature).iter().map(|&(other, _)| other);
            for other in touched.chain([feature]) {
                if !std::mem::replace(&mut is_waiting[other as usize], true) {
                    waiting.push_back(other);
                }
            }
        }
    }
}

/// Makes the best single change to a feature, if one helps.
fn improve_feature(places: &Places<'_>, feature: u32, colours: &mut [Mask]) -> bool {
    let instance = places.instance;
    let fragments = instance.fragments_of(feature);
    let now = cost_at(places, feature, colours);
    if now == Cost::default() {
        return false;
    }
    let range = fragments.start as usize..fragments.end as usize;
    let own: Vec<Mask> = colours[range.clone()].to_vec();
    let mut best = (now, own.clone());
    let mut consider = |colours: &mut [Mask], changed: &[Mask]| {
        colours[range.clone()].copy_from_slice(changed);
        let cost = cost_at(places, feature, colours);
        if cost < best.0 && places.keeps_ties(feature, colours) {
            best = (cost, changed.to_vec());
        }
    };
    for mask in 0..instance.masks() {
        if fragments
            .clone()
            .all(|fragment| instance.allowed(fragment).contains(mask))
        {
            consider(colours, &vec![mask; own.len()]);
        }
    }
    if own.len() > 1 && own.len() * work_at(places, feature) <= MOST_WORK {
        for (i, fragment) in fragments.enumerate() {
            for mask in instance.allowed(fragment).iter() {
                let mut changed = own.clone();
                changed[i] = mask;
                consider(colours, &changed);
            }
        }
    }
    colours[range].copy_from_slice(&best.1);
    best.0 < now
}

fn work_at(places: &Places<'_>, feature: u32) -> usize {
    let pairs = places
        .neighbours(feature)
        .iter()
        .map(|&(_, pair)| places.instance.pair(pair).len());
    pairs.sum::<usize>() + places.stitches(feature).len()
}

/// What a feature costs: its pairs, its stitches and its self-spacings.
fn cost_at(places: &Places<'_>, feature: u32, colours: &[Mask]) -> Cost {
    let instance = places.instance;
    let same = |a: u32, b: u32| colours[a as usize] == colours[b as usize];
    let stitches = places
        .stitches(feature)
        .iter()
        .map(|&i| instance.stitches()[i as usize]);
    let stitches: u64 = stitches
        .filter(|stitch| !same(stitch.a, stitch.b))
        .map(|stitch| u64::from(stitch.weight))
        .sum();
    Cost {
        conflicts: places.unresolved_at(feature, colours) as u64,
        stitches,
    }
}
