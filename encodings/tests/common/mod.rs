//! What the tests of the encodings share: small graphs, plain enumeration of colourings, and a plain
//! solver for each kind of formula. Nothing here encodes anything.
// Every test file is a crate of its own and uses its own part of this module.
#![allow(dead_code)]

pub mod dpll;
pub mod instances;
pub mod plain;
pub mod zero_one;

use encodings::colour::Colours;
use encodings::{Lit, Mask, MaskSet};

/// All two-element subsets of 0..n, in order.
pub fn vertex_pairs(n: u32) -> Vec<[u32; 2]> {
    (0..n)
        .flat_map(|a| (a + 1..n).map(move |b| [a, b]))
        .collect()
}

/// The items whose bit is set.
pub fn subset<T: Copy>(items: &[T], bits: usize) -> Vec<T> {
    let chosen = items.iter().enumerate().filter(|(i, _)| bits >> i & 1 == 1);
    chosen.map(|(_, &item)| item).collect()
}

/// Every subset of the items.
pub fn subsets<T: Copy>(items: &[T]) -> impl Iterator<Item = Vec<T>> {
    (0..1usize << items.len()).map(|bits| subset(items, bits))
}

/// The edge sets of all labelled graphs of n vertices.
pub fn graphs(n: u32) -> Vec<Vec<[u32; 2]>> {
    subsets(&vertex_pairs(n)).collect()
}

/// Every word of `length` letters 0..`letters`.
pub fn words(letters: usize, length: usize) -> impl Iterator<Item = Vec<usize>> {
    (0..letters.pow(length as u32)).map(move |mut code| {
        let letter = |_| {
            let letter = code % letters;
            code /= letters;
            letter
        };
        (0..length).map(letter).collect()
    })
}

/// Every way to give n fragments a non-empty set of the K masks.
pub fn allowed_combinations(masks: u8, n: u32) -> impl Iterator<Item = Vec<MaskSet>> {
    words((1 << masks) - 1, n as usize).map(|word| {
        word.iter()
            .map(|&bits| MaskSet::from_bits(bits as u8 + 1))
            .collect()
    })
}

/// n fragments that may take every mask.
pub fn unrestricted(masks: u8, n: u32) -> Vec<MaskSet> {
    vec![MaskSet::all(masks); n as usize]
}

/// The literals that put every fragment on exactly its mask: where "at most one" is left open, a
/// fragment may be on several.
pub fn fix(colours: &Colours, colouring: &[Mask]) -> Vec<Lit> {
    let mut fixed = Vec::new();
    for (fragment, &own) in colouring.iter().enumerate() {
        for mask in 0..colours.masks() {
            let lit = colours.lit(fragment as u32, mask);
            assert!(mask != own || lit.is_some(), "{own} is an allowed mask");
            fixed.extend(lit.map(|lit| if mask == own { lit } else { !lit }));
        }
    }
    fixed
}

/// Every sequence of different items of 0..n, of any length, the empty one included.
pub fn sequences(n: u32) -> Vec<Vec<u32>> {
    let mut all = vec![Vec::new()];
    let mut next = 0;
    while next < all.len() {
        for item in 0..n {
            if !all[next].contains(&item) {
                let mut longer = all[next].clone();
                longer.push(item);
                all.push(longer);
            }
        }
        next += 1;
    }
    all
}

/// Repeatable random numbers: the generator splitmix64 (Steele, Lea and Flood, OOPSLA 2014).
pub struct Random(pub u64);

impl Random {
    pub fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ z >> 30).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ z >> 27).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ z >> 31
    }

    /// A number of 0..`limit`.
    pub fn below(&mut self, limit: u32) -> u32 {
        (self.next() % u64::from(limit)) as u32
    }

    /// True `percent` times of a hundred.
    pub fn chance(&mut self, percent: u32) -> bool {
        self.below(100) < percent
    }

    pub fn shuffle<T>(&mut self, items: &mut [T]) {
        for i in (1..items.len()).rev() {
            items.swap(i, self.below(i as u32 + 1) as usize);
        }
    }
}
