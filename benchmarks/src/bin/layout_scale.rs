//! Time and memory of the extraction and the reductions of many random shapes:
//! `layout_scale [SHAPES] [SPACING] [wires]`.
//!
//! Contacts of 100 x 100 stand on a square grid of pitch 250 with a jitter of 50, every twentieth is drawn
//! twice, and a rail runs along every hundredth row. Wires of width 60 and lengths up to 3000 stand on rows of
//! pitch 150, and are cut at stitch candidates of the policy `uncovered`. Run it under `/usr/bin/time -v` for the peak.

use maskproof::extract::{Progress, extract};
use maskproof::geometry::Rect;
use maskproof::layout::{LayerId, Layout, Policy, Rules, Shapes, StitchRules};
use maskproof::reduce::{Reductions, reduce};
use std::time::Instant;

/// A linear congruential generator (Knuth's MMIX constants): the layout needs no better one.
struct Random(u64);

impl Random {
    fn below(&mut self, bound: i32) -> i32 {
        self.0 = (self.0)
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        ((self.0 >> 33) % bound.unsigned_abs() as u64) as i32
    }
}

fn contacts(count: i32) -> Shapes {
    let mut random = Random(1);
    let side = count.isqrt().max(1);
    let mut shapes = Shapes::default();
    for i in 0..count {
        let (x, y) = (
            i % side * 250 + random.below(50),
            i / side * 250 + random.below(50),
        );
        let contact = Rect::new(x, y, x + 100, y + 100);
        shapes.push_rect(contact);
        if random.below(20) == 0 {
            shapes.push_rect(contact);
        }
        if i % (100 * side) == 0 {
            shapes.push_rect(Rect::new(0, y - 80, side * 250, y - 60));
        }
    }
    shapes
}

fn wires(count: i32) -> Shapes {
    let mut random = Random(2);
    let (mut x, mut row) = (0, 0);
    let end = count.isqrt().max(1) * 500;
    let mut shapes = Shapes::default();
    for _ in 0..count {
        let length = 100 + random.below(2900);
        shapes.push_rect(Rect::new(x, row * 150, x + length, row * 150 + 60));
        x += length + 100 + random.below(400);
        if x > end {
            (x, row) = (random.below(1000), row + 1);
        }
    }
    shapes
}

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let wired = std::env::args().nth(3).is_some_and(|kind| kind == "wires");
    let mut numbers = std::env::args()
        .skip(1)
        .take(2)
        .map(|text| text.parse::<i32>());
    let count = numbers.next().transpose()?.unwrap_or(1_000_000);
    let spacing = numbers.next().transpose()?.unwrap_or(210);
    let layer = LayerId {
        layer: 1,
        datatype: 0,
    };
    let layout = Layout {
        top: "contacts".into(),
        layer,
        unit_pm: 1000,
        shapes: if wired { wires(count) } else { contacts(count) },
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    };
    let rules = Rules {
        layer,
        masks: 4,
        spacing,
        spacings: Default::default(),
        hand: Default::default(),
        stitch: StitchRules {
            policy: if wired {
                Policy::Uncovered
            } else {
                Policy::None
            },
            overlap: 40,
            fragment_length: 100,
            corner: 40,
            weight: 1,
            ..StitchRules::default()
        },
    };
    let start = Instant::now();
    let report = |progress: Progress| {
        if progress.done == progress.total {
            println!(
                "{:?}: {:.2} s",
                progress.step,
                start.elapsed().as_secs_f64()
            );
        }
    };
    let found = extract(&layout, &rules, &report)?;
    println!(
        "{} shapes, {} features, {} pairs, {} stitch edges: {:.2} s",
        layout.shapes.len(),
        found.features.len(),
        found.instance.pair_count(),
        found.instance.stitches().len(),
        start.elapsed().as_secs_f64()
    );
    let reduced = reduce(&found.instance, Reductions::ALL)?;
    let largest = reduced
        .pieces
        .iter()
        .map(|piece| piece.instance.fragment_count());
    println!(
        "{} pieces, the largest of {} fragments, {:?}: {:.2} s",
        reduced.pieces.len(),
        largest.max().unwrap_or(0),
        reduced.counts,
        start.elapsed().as_secs_f64()
    );
    Ok(())
}
