//! Puts the colourings of tiles together: a colouring of the whole piece that is good inside the tiles.
//!
//! Where masks are interchangeable, those of a tile are permuted so that it fits its surroundings: swaps
//! of two masks, as long as one lowers the number of conflict edges across the border. A tile that would break a tie
//! is left as it was. The result is an
//! upper bound, and where the next search begins; nothing proven rests on it.

use encodings::{Mask, MaskSet};

use crate::solve::places::Places;

/// Lays the colouring of a tile (`features` ascending, `masks` of their fragments in order) over `whole`.
pub fn lay(places: &Places<'_>, whole: &mut [Mask], features: &[u32], masks: &[Mask]) {
    let instance = places.instance;
    let fragments: Vec<u32> = features
        .iter()
        .flat_map(|&feature| instance.fragments_of(feature))
        .collect();
    let all = MaskSet::all(instance.masks());
    let interchangeable = fragments
        .iter()
        .all(|&fragment| instance.allowed(fragment) == all);
    let before: Vec<Mask> = fragments.iter().map(|&f| whole[f as usize]).collect();
    for (&fragment, &mask) in fragments.iter().zip(masks) {
        whole[fragment as usize] = mask;
    }
    if interchangeable {
        let renamed = fit(&border(places, whole, features), instance.masks());
        for &fragment in &fragments {
            let mask = &mut whole[fragment as usize];
            *mask = renamed[*mask as usize];
        }
    }
    // Ties that reach beyond the tile may be broken now.
    if !features
        .iter()
        .all(|&feature| places.keeps_ties(feature, whole))
    {
        for (&fragment, mask) in fragments.iter().zip(before) {
            whole[fragment as usize] = mask;
        }
    }
}

/// How many conflict edges join each mask inside with each mask outside.
fn border(places: &Places<'_>, whole: &[Mask], features: &[u32]) -> Vec<Vec<u32>> {
    let instance = places.instance;
    let masks = instance.masks() as usize;
    let mut counts = vec![vec![0; masks]; masks];
    for &feature in features {
        for &(other, pair) in places.neighbours(feature) {
            if features.binary_search(&other).is_ok() {
                continue;
            }
            for &[a, b] in instance.pair(pair) {
                let inside = if instance.feature_of(a) == feature {
                    [a, b]
                } else {
                    [b, a]
                };
                let [own, outer] = inside.map(|fragment| whole[fragment as usize] as usize);
                counts[own][outer] += 1;
            }
        }
    }
    counts
}

/// A renaming of the masks inside, from none on, better by single swaps.
fn fit(counts: &[Vec<u32>], masks: u8) -> Vec<Mask> {
    let mut renamed: Vec<Mask> = (0..masks).collect();
    let mut better = true;
    while better {
        better = false;
        for a in 0..masks as usize {
            for b in a + 1..masks as usize {
                let (to_a, to_b) = (renamed[a] as usize, renamed[b] as usize);
                if counts[a][to_b] + counts[b][to_a] < counts[a][to_a] + counts[b][to_b] {
                    renamed.swap(a, b);
                    better = true;
                }
            }
        }
    }
    renamed
}
