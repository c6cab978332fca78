//! Plain enumeration: the least cost of an instance, by trying every colouring.
//!
//! The reference that everything else is held against. It prunes nothing, and counts the cost of a
//! colouring straight from the definitions of the design's section 1, sharing no line with
//! `encodings::cost`: only the instance's accessors.

use encodings::{Instance, Mask, Tie};
use std::collections::BTreeSet;

/// The most fragments that it takes: sets of fragments are the bits of a word.
const MOST_FRAGMENTS: usize = 32;

/// (unresolved conflict pairs and self-spacings, stitches by weight).
pub type Least = (u64, u64);

/// The least cost over every legal colouring.
pub fn least(instance: &Instance) -> Least {
    let mut best = (u64::MAX, u64::MAX);
    each_colouring(instance, |colouring| {
        if keeps_ties(instance, colouring) {
            best = best.min(count(instance, colouring))
        }
    });
    best
}

/// Whether a colouring keeps to what nothing can be paid for.
pub fn keeps_ties(instance: &Instance, colouring: &[Mask]) -> bool {
    let same = |a: u32, b: u32| colouring[a as usize] == colouring[b as usize];
    instance.ties().iter().all(|tie| match tie {
        Tie::Same([a, b]) => same(*a, *b),
        Tie::Different([a, b]) => !same(*a, *b),
        Tie::AtMost { most, stitches } => {
            let used = stitches.iter().filter(|s| !same(s.a, s.b));
            used.map(|s| s.weight).sum::<u32>() <= *most
        }
    })
}

/// Calls `visit` with every colouring within the allowed masks, as an odometer turns.
pub fn each_colouring(instance: &Instance, mut visit: impl FnMut(&[Mask])) {
    let dial = |fragment| {
        let allowed = instance.allowed(fragment);
        (0..instance.masks())
            .filter(|&mask| allowed.contains(mask))
            .collect()
    };
    let dials: Vec<Vec<Mask>> = (0..instance.fragment_count() as u32).map(dial).collect();
    let mut at = vec![0; dials.len()];
    let mut colouring: Vec<Mask> = dials.iter().map(|dial| dial[0]).collect();
    loop {
        visit(&colouring);
        let Some(turned) = (0..dials.len()).find(|&i| at[i] + 1 < dials[i].len()) else {
            return;
        };
        for i in 0..=turned {
            at[i] = if i == turned { at[i] + 1 } else { 0 };
            colouring[i] = dials[i][at[i]];
        }
    }
}

/// What a colouring costs.
pub fn count(instance: &Instance, colouring: &[Mask]) -> Least {
    (
        unresolved_pairs(instance, colouring) + violated_self_spacings(instance, colouring),
        stitches(instance, colouring),
    )
}

/// "Unresolved when some conflicting fragments of the two share a mask."
fn unresolved_pairs(instance: &Instance, colouring: &[Mask]) -> u64 {
    let mut unresolved = 0;
    for pair in 0..instance.pair_count() as u32 {
        let mut shared = false;
        for edge in instance.pair(pair) {
            shared |= colouring[edge[0] as usize] == colouring[edge[1] as usize];
        }
        unresolved += u64::from(shared);
    }
    unresolved
}

/// "It is a stitch when its two sides differ."
fn stitches(instance: &Instance, colouring: &[Mask]) -> u64 {
    let mut weight = 0;
    for stitch in instance.stitches() {
        if colouring[stitch.a as usize] != colouring[stitch.b as usize] {
            weight += u64::from(stitch.weight);
        }
    }
    weight
}

/// "A violation if they share a mask and are not joined through fragments of that same mask."
fn violated_self_spacings(instance: &Instance, colouring: &[Mask]) -> u64 {
    // One unit for all those of a feature.
    let mut violated = BTreeSet::new();
    for &[a, b] in instance.self_spacings() {
        let shared = colouring[a as usize] == colouring[b as usize];
        if shared && reached(instance, colouring, a) >> b & 1 == 0 {
            violated.insert(instance.feature_of(a));
        }
    }
    violated.len() as u64
}

/// The fragments reached from `from` over stitch edges within its mask, as bits.
fn reached(instance: &Instance, colouring: &[Mask], from: u32) -> u32 {
    assert!(
        colouring.len() <= MOST_FRAGMENTS,
        "an instance too large to enumerate"
    );
    let mask = colouring[from as usize];
    let mut set = 1u32 << from;
    loop {
        let mut grown = set;
        for stitch in instance.stitches() {
            let (a, b) = (stitch.a, stitch.b);
            if colouring[a as usize] == mask && colouring[b as usize] == mask {
                grown |= (set >> a & 1) << b | (set >> b & 1) << a;
            }
        }
        if grown == set {
            return set;
        }
        set = grown;
    }
}
