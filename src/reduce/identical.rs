//! Identical pieces are solved once.
//!
//! Two pieces are identical when a renumbering of the fragments of one gives the other: equal allowed
//! masks, and the same conflict edges, stitch edges with weights, self-spacings and ties. Features and pairs
//! follow from those (a feature is a connected part of the stitch graph, a pair all edges between two
//! features). Translated, mirrored and reordered copies of one place in a layout are found this way.
//! Areas may differ: they are no part of the cost.
//!
//! Lemma. A colouring carried over by such a renumbering keeps its cost, so least costs are equal. The
//! renumbering is compared link by link before it is used; whatever the heuristics below miss is solved
//! again, never wrongly shared.
//!
//! How candidates are found: colour refinement gives each fragment a label that renumbering does not
//! change (Weisfeiler and Leman 1968); pieces with equal label sums are numbered by labels, ties broken by
//! singling out one fragment and refining again, without backtracking.

use rustc_hash::FxHashMap;

use encodings::{Instance, Tie};

use super::pieces::Piece;
use super::planted::{self, Bug};

/// The largest piece, in fragments, that is compared; larger ones repeat too seldom to be worth it.
pub const MOST_FRAGMENTS: usize = 96;

/// Rounds of refinement that decide which pieces are worth comparing.
const FIRST_ROUNDS: usize = 3;

/// Which piece stands for a piece, and how.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SameAs {
    /// The earlier piece that stands for this one, or this piece itself.
    pub piece: u32,
    /// For each fragment of this piece the fragment of the other; empty for the piece itself.
    pub fragment: Vec<u32>,
}

impl SameAs {
    /// Whether another piece stands for this one.
    pub fn is_copy(&self) -> bool {
        !self.fragment.is_empty()
    }
}

/// Finds the earlier equal of each piece.
pub fn find(pieces: &[Piece], on: bool) -> Vec<SameAs> {
    let mut same: Vec<SameAs> = (0..pieces.len() as u32)
        .map(|piece| SameAs {
            piece,
            fragment: Vec::new(),
        })
        .collect();
    if !on {
        return same;
    }
    // Only the lists' contents and their ascending order matter, never the order of the map.
    let mut alike: FxHashMap<u64, Vec<u32>> = FxHashMap::default();
    for (i, piece) in pieces.iter().enumerate() {
        if piece.instance.fragment_count() <= MOST_FRAGMENTS {
            let sum = Links::of(&piece.instance).refined(FIRST_ROUNDS).1;
            alike.entry(sum).or_default().push(i as u32);
        }
    }
    for group in alike.into_values().filter(|group| group.len() > 1) {
        compare_group(pieces, &group, &mut same);
    }
    same
}

/// Compares pieces that may be equal, through their canonical numberings.
fn compare_group(pieces: &[Piece], group: &[u32], same: &mut [SameAs]) {
    let mut known: FxHashMap<Numbered, (u32, Vec<u32>)> = FxHashMap::default();
    for &i in group {
        let links = Links::of(&pieces[i as usize].instance);
        let order = links.canonical_order();
        match known.entry(links.numbered(&order)) {
            std::collections::hash_map::Entry::Occupied(entry) => {
                let (piece, theirs) = entry.get();
                let mut fragment = vec![0; order.len()];
                for (&own, &other) in order.iter().zip(theirs) {
                    fragment[own as usize] = other;
                }
                same[i as usize] = SameAs {
                    piece: *piece,
                    fragment,
                };
            }
            std::collections::hash_map::Entry::Vacant(entry) => {
                entry.insert((i, order));
            }
        }
    }
}

/// A piece under a numbering: equal exactly when the numberings carry one piece into the other.
#[derive(PartialEq, Eq, Hash)]
struct Numbered {
    masks: u8,
    allowed: Vec<u8>,
    /// Kind, and the two ends, smaller first; sorted.
    links: Vec<(u64, u32, u32)>,
    /// Sorted.
    ties: Vec<Tie>,
}

/// The fragments and links of a piece, links with a kind: 0 conflict, 1 self-spacing, 1 + weight stitch.
struct Links {
    masks: u8,
    allowed: Vec<u8>,
    links: Vec<(u64, u32, u32)>,
    ties: Vec<Tie>,
}

fn mix(value: u64) -> u64 {
    // The finaliser of SplitMix64 (Steele, Lea, Flood 2014).
    let value = (value ^ (value >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    let value = (value ^ (value >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    value ^ (value >> 31)
}

impl Links {
    fn of(instance: &Instance) -> Links {
        let conflicts = instance.edges().iter().map(|&[a, b]| (0, a, b));
        let conflicts = conflicts.filter(|_| !planted::has(Bug::Identical));
        let self_spacings = instance.self_spacings().iter().map(|&[a, b]| (1, a, b));
        let stitches = instance
            .stitches()
            .iter()
            .map(|s| (1 + u64::from(s.weight), s.a, s.b));
        Links {
            masks: instance.masks(),
            allowed: (0..instance.fragment_count() as u32)
                .map(|fragment| instance.allowed(fragment).bits())
                .collect(),
            links: conflicts.chain(self_spacings).chain(stitches).collect(),
            ties: instance.ties().to_vec(),
        }
    }

    /// Labels after some rounds of refinement, and a sum over them that any renumbering keeps.
    fn refined(&self, rounds: usize) -> (Vec<u64>, u64) {
        let start = (u64::from(self.masks) << 32) + self.links.len() as u64;
        let mut labels: Vec<u64> = self
            .allowed
            .iter()
            .map(|&set| mix(start ^ (u64::from(set) << 48)))
            .collect();
        self.refine(&mut labels, rounds);
        let sum = labels
            .iter()
            .fold(0u64, |sum, &label| sum.wrapping_add(mix(label)));
        (labels, sum)
    }

    /// Labels take in their neighbours' labels until no more of them differ, or for some rounds only.
    fn refine(&self, labels: &mut [u64], rounds: usize) {
        let mut distinct = count_distinct(labels);
        for _ in 0..rounds {
            let mut gathered = vec![0u64; labels.len()];
            for &(kind, a, b) in &self.links {
                let (a, b) = (a as usize, b as usize);
                let kind = mix(kind.wrapping_add(0x9e37_79b9_7f4a_7c15));
                gathered[a] = gathered[a].wrapping_add(mix(labels[b] ^ kind));
                gathered[b] = gathered[b].wrapping_add(mix(labels[a] ^ kind));
            }
            for (label, gathered) in labels.iter_mut().zip(gathered) {
                *label = mix(label.wrapping_mul(3).wrapping_add(gathered));
            }
            let now = count_distinct(labels);
            if now == distinct {
                return;
            }
            distinct = now;
        }
    }

    /// The fragments in an order that depends on the piece up to renumbering only, where luck has it.
    fn canonical_order(&self) -> Vec<u32> {
        let (mut labels, _) = self.refined(usize::MAX);
        loop {
            let mut order: Vec<u32> = (0..labels.len() as u32).collect();
            order.sort_by_key(|&fragment| (labels[fragment as usize], fragment));
            let tie = order
                .windows(2)
                .find(|two| labels[two[0] as usize] == labels[two[1] as usize]);
            let Some(tie) = tie else { return order };
            labels[tie[0] as usize] = mix(labels[tie[0] as usize] ^ 0x5851_f42d_4c95_7f2d);
            self.refine(&mut labels, usize::MAX);
        }
    }

    fn numbered(&self, order: &[u32]) -> Numbered {
        let mut number = vec![0u32; order.len()];
        for (i, &fragment) in order.iter().enumerate() {
            number[fragment as usize] = i as u32;
        }
        let mut links: Vec<(u64, u32, u32)> = self
            .links
            .iter()
            .map(|&(kind, a, b)| {
                let (a, b) = (number[a as usize], number[b as usize]);
                (kind, a.min(b), a.max(b))
            })
            .collect();
        links.sort_unstable();
        let renumbered = |tie: &Tie| tie.renumbered(|f| number.get(f as usize).copied());
        let mut ties: Vec<Tie> = self.ties.iter().filter_map(renumbered).collect();
        ties.sort_unstable();
        Numbered {
            masks: self.masks,
            allowed: order
                .iter()
                .map(|&fragment| self.allowed[fragment as usize])
                .collect(),
            links,
            ties,
        }
    }
}

fn count_distinct(labels: &[u64]) -> usize {
    let mut sorted = labels.to_vec();
    sorted.sort_unstable();
    sorted.dedup();
    sorted.len()
}
