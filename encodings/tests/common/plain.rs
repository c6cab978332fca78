//! Plain enumeration of colourings, and their cost counted from the definitions: nothing of
//! `encodings::cost` is used.

use encodings::{Cost, Instance, Mask, MaskSet, Tie};
use std::collections::BTreeMap;

/// Every colouring within the allowed masks.
pub fn colourings(allowed: &[MaskSet]) -> Vec<Vec<Mask>> {
    let mut all = vec![Vec::with_capacity(allowed.len())];
    for set in allowed {
        all = all
            .iter()
            .flat_map(|start: &Vec<Mask>| {
                set.iter().map(|mask| {
                    let mut longer = start.clone();
                    longer.push(mask);
                    longer
                })
            })
            .collect();
    }
    all
}

/// The allowed masks of an instance, fragment by fragment.
pub fn allowed(instance: &Instance) -> Vec<MaskSet> {
    let fragments = 0..instance.fragment_count() as u32;
    fragments.map(|f| instance.allowed(f)).collect()
}

/// Whether both ends have one mask.
pub fn same(colouring: &[Mask], [a, b]: [u32; 2]) -> bool {
    colouring[a as usize] == colouring[b as usize]
}

/// Whether b is reached from a over stitch edges whose ends share a mask.
pub fn joined(stitches: &[[u32; 2]], colouring: &[Mask], [a, b]: [u32; 2]) -> bool {
    let mut reached = vec![false; colouring.len()];
    let mut open = vec![a];
    while let Some(at) = open.pop() {
        if std::mem::replace(&mut reached[at as usize], true) {
            continue;
        }
        for &[f, g] in stitches {
            if same(colouring, [f, g]) && [f, g].contains(&at) {
                open.push(if at == f { g } else { f });
            }
        }
    }
    reached[b as usize]
}

/// The definition of a violated self-spacing: one mask, and not joined through fragments of it.
pub fn self_spacing_violated(stitches: &[[u32; 2]], colouring: &[Mask], ends: [u32; 2]) -> bool {
    same(colouring, ends) && !joined(stitches, colouring, ends)
}

/// Whether a colouring keeps a tie, by its definition.
pub fn keeps(tie: &Tie, colouring: &[Mask]) -> bool {
    match tie {
        Tie::Same(ends) => same(colouring, *ends),
        Tie::Different(ends) => !same(colouring, *ends),
        Tie::AtMost { most, stitches } => {
            let mut used = 0;
            for stitch in stitches {
                if !same(colouring, [stitch.a, stitch.b]) {
                    used += stitch.weight;
                }
            }
            used <= *most
        }
    }
}

/// Which units a colouring leaves unresolved: pairs first, then the features with self-spacings.
pub fn unresolved(instance: &Instance, colouring: &[Mask]) -> Vec<bool> {
    let stitches: Vec<[u32; 2]> = instance.stitches().iter().map(|s| [s.a, s.b]).collect();
    let pairs = instance
        .pairs()
        .map(|edges| edges.iter().any(|&edge| same(colouring, edge)));
    let mut of_feature: BTreeMap<u32, bool> = BTreeMap::new();
    for &ends in instance.self_spacings() {
        let violated = of_feature.entry(instance.feature_of(ends[0])).or_default();
        *violated |= self_spacing_violated(&stitches, colouring, ends);
    }
    pairs.chain(of_feature.into_values()).collect()
}

/// The cost of a colouring.
pub fn cost(instance: &Instance, colouring: &[Mask]) -> Cost {
    let conflicts = unresolved(instance, colouring);
    let mut stitches = 0;
    for stitch in instance.stitches() {
        if !same(colouring, [stitch.a, stitch.b]) {
            stitches += u64::from(stitch.weight);
        }
    }
    Cost {
        conflicts: conflicts.iter().filter(|&&yes| yes).count() as u64,
        stitches,
    }
}

/// The least cost of all legal colourings.
pub fn least(instance: &Instance) -> Cost {
    colourings(&allowed(instance))
        .iter()
        .filter(|colouring| instance.ties().iter().all(|tie| keeps(tie, colouring)))
        .map(|colouring| cost(instance, colouring))
        .min()
        .unwrap_or_default()
}
