//! Random small layouts with features that want stitches.

use maskproof::geometry::Rect;
use maskproof::layout::{
    KeepOut, LayerId, Layout, Metric, Policy, Rules, Shapes, Spacings, StitchRules,
};
use rand::Rng;
use rand_pcg::Pcg64Mcg;

pub const LAYER: LayerId = LayerId {
    layer: 1,
    datatype: 0,
};
pub const OUT: LayerId = LayerId {
    layer: 2,
    datatype: 0,
};

/// A layout of rectangles, and the rectangles that stitches keep away from.
pub fn layout(rects: &[Rect], outs: &[Rect]) -> Layout {
    let shapes = |rects: &[Rect]| {
        let mut shapes = Shapes::default();
        rects.iter().for_each(|&rect| shapes.push_rect(rect));
        shapes
    };
    Layout {
        top: "top".into(),
        layer: LAYER,
        unit_pm: 1000,
        shapes: shapes(rects),
        fixed: Vec::new(),
        keep_outs: vec![(OUT, shapes(outs))],
    }
}

/// Random rules for `masks`.
pub fn rules(rng: &mut Pcg64Mcg, masks: u8) -> Rules {
    let square = false;
    let keep_out = rng.random_ratio(1, 4);
    Rules {
        spacings: Spacings {
            metric: if square {
                Metric::Square
            } else {
                Metric::Euclidean
            },
            ..Spacings::default()
        },
        stitch: StitchRules {
            policy: Policy::EveryInterval,
            overlap: 2 * rng.random_range(0..=2),
            fragment_length: rng.random_range(0..=4),
            corner: rng.random_range(0..=2),
            weight: rng.random_range(1..=3),
            keep_outs: keep_out
                .then(|| KeepOut {
                    layer: OUT,
                    distance: rng.random_range(1..=2),
                })
                .into_iter()
                .collect(),
            most_per_feature: Some(rng.random_range(1..=3)),
            listed: Vec::new(),
        },
        ..Rules::plain(
            LAYER,
            masks,
            rng.random_range(2..=5) + 2 * i32::from(masks - 2),
        )
    }
}

/// The rectangles of a random feature whose lower left corner is at about (0, 0).
pub fn shape(rng: &mut Pcg64Mcg, longest: i32) -> Vec<Rect> {
    let w = rng.random_range(1..=2);
    let long = rng.random_range(5..=longest);
    let tall = rng.random_range(4..=longest.max(5) - 1);
    let arm = |x: i32, length: i32| Rect::new(x, 0, x + w, length);
    let mut rects = vec![Rect::new(0, 0, long, w)];
    match rng.random_range(0..12) {
        0..6 => {}
        6 | 7 => rects.push(arm(0, tall)),
        8 => rects.push(arm(rng.random_range(1..long - w), tall)),
        9 => rects.extend([arm(0, tall), arm(long - w, rng.random_range(4..=tall))]),
        10 => {
            let (x, y) = (long.max(3 * w + 1), tall.max(3 * w + 1));
            rects = vec![
                Rect::new(0, 0, x, w),
                Rect::new(0, y - w, x, y),
                Rect::new(0, 0, w, y),
                Rect::new(x - w, 0, x, y),
            ];
        }
        _ => {
            rects.extend((0..=(long - w) / (2 * w + 2)).map(|i| arm(i * (2 * w + 2), tall.min(6))))
        }
    }
    let (flip, turn) = (rng.random_range(0..4), rng.random_bool(0.3));
    (rects.into_iter())
        .map(|r| {
            let r = if flip & 1 != 0 {
                Rect::new(long - r.max.x, r.min.y, long - r.min.x, r.max.y)
            } else {
                r
            };
            let r = if flip & 2 != 0 {
                Rect::new(r.min.x, tall - r.max.y, r.max.x, tall - r.min.y)
            } else {
                r
            };
            if turn { r.transposed() } else { r }
        })
        .collect()
}

pub fn moved(r: &Rect, x: i32, y: i32) -> Rect {
    Rect::new(r.min.x + x, r.min.y + y, r.max.x + x, r.max.y + y)
}

/// Up to `count` features that do not touch, in a square of the given side.
pub fn scene(rng: &mut Pcg64Mcg, count: usize, side: i32) -> Vec<Rect> {
    let mut all: Vec<Rect> = Vec::new();
    for _ in 0..count {
        for _ in 0..20 {
            let longest = side.min(14);
            let feature = shape(rng, longest);
            let (x, y) = (rng.random_range(0..side), rng.random_range(0..side));
            let feature: Vec<Rect> = feature.iter().map(|r| moved(r, x, y)).collect();
            let fits = |r: &Rect| {
                r.min.x >= 0
                    && r.min.y >= 0
                    && r.max.x <= side
                    && r.max.y <= side
                    && !all.iter().any(|o| o.touches(r))
            };
            if feature.iter().all(fits) {
                all.extend(feature);
                break;
            }
        }
    }
    all
}

/// Small rectangles anywhere.
pub fn outs(rng: &mut Pcg64Mcg, side: i32) -> Vec<Rect> {
    (0..rng.random_range(1..4))
        .map(|_| {
            let (x, y) = (rng.random_range(0..side), rng.random_range(0..side));
            Rect::new(x, y, x + rng.random_range(1..3), y + rng.random_range(1..3))
        })
        .collect()
}
