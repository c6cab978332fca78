//! From outcomes and a colouring to the rows of a report.

use encodings::{Instance, Mask};

use super::{Counts, LayerFacts, MaskUse, PieceRow, Report, Stitched, Timings, Unresolved};
use crate::extract::Extraction;
use crate::geometry::{Point, Rect};
use crate::reduce::Reduced;
use crate::solve::{Bounds, PieceOutcome};

/// What is known before solving.
pub struct Facts<'a> {
    /// The name of the input file, without its directories.
    pub input: String,
    /// The layer; nothing for an abstract graph.
    pub layer: Option<LayerFacts>,
    /// The problem.
    pub instance: &'a Instance,
    /// Where its fragments are.
    pub places: &'a dyn Places,
}

/// Where fragments and stitches are, in database units.
pub trait Places {
    /// The box around a fragment, the overlaps of its stitch candidates included.
    fn fragment(&self, fragment: u32) -> Option<Rect>;
    /// What both sides of the stitch candidate between two fragments cover, if it is used.
    fn stitch(&self, a: u32, b: u32) -> Option<Rect>;
}

/// An abstract graph is nowhere.
pub struct Nowhere;

impl Places for Nowhere {
    fn fragment(&self, _: u32) -> Option<Rect> {
        None
    }

    fn stitch(&self, _: u32, _: u32) -> Option<Rect> {
        None
    }
}

impl Places for Extraction {
    fn fragment(&self, fragment: u32) -> Option<Rect> {
        let reach = self.fragments.reach_of(fragment).reduce(around);
        reach.or_else(|| Some(self.features.box_of(self.instance.feature_of(fragment))))
    }

    fn stitch(&self, a: u32, b: u32) -> Option<Rect> {
        let half = self.fragments.half_overlap();
        self.fragments
            .cuts_of(a)
            .find(|cut| cut.sides.contains(&b))
            .map(|cut| cut.overlap(half))
    }
}

/// A report without times, as of a run that nothing stopped. `outcomes` has one entry a piece.
pub fn report(
    facts: &Facts,
    reduced: &Reduced,
    outcomes: &[PieceOutcome],
    colouring: &[Mask],
) -> Report {
    let (instance, places) = (facts.instance, facts.places);
    let (mut conflicts, mut stitches) = (Bounds::default(), Bounds::default());
    for outcome in outcomes {
        conflicts += outcome.conflicts;
        stitches += outcome.stitches;
    }
    Report {
        input: facts.input.clone(),
        masks: instance.masks(),
        layer: facts.layer.clone(),
        counts: counts(instance),
        conflicts,
        stitches,
        stop: None,
        mask_use: mask_use(instance, colouring),
        reductions: reduced.counts,
        pieces: piece_rows(reduced, outcomes, places),
        unresolved: unresolved(instance, colouring, places),
        stitched: stitched(instance, colouring, places),
        start: None,
        timings: Timings {
            pieces: outcomes.iter().map(|outcome| outcome.time).collect(),
            ..Timings::default()
        },
    }
}

fn piece_rows(reduced: &Reduced, outcomes: &[PieceOutcome], places: &dyn Places) -> Vec<PieceRow> {
    let pieces = reduced.pieces.iter().zip(&reduced.same_as).zip(outcomes);
    pieces
        .map(|((piece, same), outcome)| PieceRow {
            counts: counts(&piece.instance),
            conflicts: outcome.conflicts,
            stitches: outcome.stitches,
            engine: outcome.engine,
            same_as: same.is_copy().then_some(same.piece),
            place: cover(&piece.fragments, places),
        })
        .collect()
}

/// The sizes of an instance.
pub fn counts(instance: &Instance) -> Counts {
    Counts {
        features: instance.feature_count() as u64,
        fragments: instance.fragment_count() as u64,
        conflict_pairs: instance.pair_count() as u64,
        self_spacings: instance.self_spacings().len() as u64,
        self_spacing_features: instance.self_unit_count() as u64,
        stitch_candidates: instance.stitches().len() as u64,
    }
}

/// What each mask holds.
pub fn mask_use(instance: &Instance, colouring: &[Mask]) -> Vec<MaskUse> {
    let mut held = vec![MaskUse::default(); usize::from(instance.masks())];
    for (fragment, &mask) in (0..).zip(colouring) {
        if let Some(held) = held.get_mut(usize::from(mask)) {
            held.fragments += 1;
            held.area += u128::from(instance.area(fragment));
        }
    }
    held
}

/// The conflicts that a legal colouring leaves: pairs, then self-spacings.
pub fn unresolved(instance: &Instance, colouring: &[Mask], places: &dyn Places) -> Vec<Unresolved> {
    let mask = |fragment: u32| colouring[fragment as usize];
    let entry = |[a, b]: [u32; 2]| Unresolved {
        features: [instance.feature_of(a), instance.feature_of(b)],
        fragments: [a, b],
        mask: mask(a),
        place: places
            .fragment(a)
            .zip(places.fragment(b))
            .map(|(a, b)| between(a, b)),
    };
    let pairs = instance.unresolved_pairs(colouring).filter_map(|pair| {
        let edges = instance.pair(pair).iter();
        edges.copied().find(|&[a, b]| mask(a) == mask(b))
    });
    // One unit a feature, however many of its self-spacings are violated.
    let mut self_spacings: Vec<[u32; 2]> = instance
        .violated_self_spacings(colouring)
        .map(|i| instance.self_spacings()[i as usize])
        .collect();
    self_spacings.dedup_by_key(|edge| instance.feature_of(edge[0]));
    pairs.chain(self_spacings).map(entry).collect()
}

/// The stitches that a legal colouring uses.
pub fn stitched(instance: &Instance, colouring: &[Mask], places: &dyn Places) -> Vec<Stitched> {
    let mask = |fragment: u32| colouring[fragment as usize];
    let stitches = instance.stitches().iter();
    stitches
        .filter(|stitch| mask(stitch.a) != mask(stitch.b))
        .map(|stitch| Stitched {
            feature: instance.feature_of(stitch.a),
            fragments: [stitch.a, stitch.b],
            masks: [mask(stitch.a), mask(stitch.b)],
            weight: stitch.weight,
            place: places.stitch(stitch.a, stitch.b),
        })
        .collect()
}

/// The box that covers all fragments, if they have boxes.
pub fn cover(fragments: &[u32], places: &dyn Places) -> Option<Rect> {
    let boxes = fragments.iter().filter_map(|&f| places.fragment(f));
    boxes.reduce(around)
}

/// The box around two boxes.
fn around(a: Rect, b: Rect) -> Rect {
    Rect {
        min: Point {
            x: a.min.x.min(b.min.x),
            y: a.min.y.min(b.min.y),
        },
        max: Point {
            x: a.max.x.max(b.max.x),
            y: a.max.y.max(b.max.y),
        },
    }
}

/// The box that two boxes share, or along an axis on which they are apart, the gap between them.
pub fn between(a: Rect, b: Rect) -> Rect {
    let span = |a: [i32; 2], b: [i32; 2]| {
        let (from, to) = (a[0].max(b[0]), a[1].min(b[1]));
        [from.min(to), from.max(to)]
    };
    let x = span([a.min.x, a.max.x], [b.min.x, b.max.x]);
    let y = span([a.min.y, a.max.y], [b.min.y, b.max.y]);
    Rect {
        min: Point { x: x[0], y: y[0] },
        max: Point { x: x[1], y: y[1] },
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use encodings::InstanceBuilder;

    fn rect(x1: i32, y1: i32, x2: i32, y2: i32) -> Rect {
        Rect {
            min: Point { x: x1, y: y1 },
            max: Point { x: x2, y: y2 },
        }
    }

    #[test]
    fn between_is_the_gap_or_what_is_shared() {
        let a = rect(0, 0, 10, 10);
        assert_eq!(between(a, rect(15, 2, 20, 30)), rect(10, 2, 15, 10));
        assert_eq!(between(rect(15, 2, 20, 30), a), rect(10, 2, 15, 10));
        assert_eq!(between(a, rect(8, 0, 30, 10)), rect(8, 0, 10, 10));
        assert_eq!(between(a, rect(12, -9, 13, -4)), rect(10, -4, 12, 0));
    }

    /// Fragments in a row, 90 long, 10 apart.
    struct Row;

    impl Places for Row {
        fn fragment(&self, fragment: u32) -> Option<Rect> {
            let x = fragment as i32 * 100;
            Some(rect(x, 0, x + 90, 10))
        }

        fn stitch(&self, a: u32, b: u32) -> Option<Rect> {
            Some(rect(a as i32 * 100 + 90, 0, b as i32 * 100, 10))
        }
    }

    /// Feature 0: fragments 0-1-2 with a self-spacing (0, 2); feature 1: fragment 3, too close to 0
    /// and 1.
    fn instance() -> Instance {
        let mut builder = InstanceBuilder::new(2);
        builder.feature(3);
        builder.feature(1);
        builder.pair([[0, 3], [1, 3]]);
        builder.stitch(0, 1, 1);
        builder.stitch(1, 2, 4);
        builder.self_spacing(0, 2);
        builder.area(3, 70);
        builder.build().unwrap()
    }

    #[test]
    fn rows_agree_with_the_cost() {
        let instance = instance();
        for bits in 0u8..16 {
            let colouring: Vec<Mask> = (0..4).map(|i| bits >> i & 1).collect();
            let cost = instance.cost(&colouring);
            let left = unresolved(&instance, &colouring, &Row);
            let used = stitched(&instance, &colouring, &Row);
            assert_eq!(left.len() as u64, cost.conflicts);
            let weight: u64 = used.iter().map(|used| u64::from(used.weight)).sum();
            assert_eq!(weight, cost.stitches);
            for left in left {
                let [a, b] = left.fragments.map(|f| colouring[f as usize]);
                assert_eq!((a, b), (left.mask, left.mask));
            }
            let held = mask_use(&instance, &colouring);
            assert_eq!(held.iter().map(|held| held.area).sum::<u128>(), 73);
        }
        let left = unresolved(&instance, &[0, 1, 0, 1], &Row);
        assert_eq!(left[0].fragments, [1, 3]);
        assert_eq!(left[0].place, Some(rect(190, 0, 300, 10)));
        assert_eq!(left[1].features, [0, 0]);
        assert_eq!(cover(&[1, 3], &Row), Some(rect(100, 0, 390, 10)));
        assert_eq!(cover(&[], &Row), None);
    }
}
