//! Outlines that are compared as drawn, wherever they begin and whichever way they run.
//!
//! The least rotation of a cyclic list: J.-P. Duval's two-pointer form of the minimal representation (1983),
//! linear in the vertices.

use crate::geometry::Point;
use crate::geometry::outline::without_spikes;
use crate::layout::{Features, Shape, Shapes};
use rustc_hash::FxHashMap;

/// The outlines of some features, numbered.
#[derive(Default)]
pub(super) struct Outlines {
    /// Feature and number by outline. Nothing follows the order of this map.
    known: FxHashMap<Vec<Point>, (u32, u32)>,
    /// How many outlines each feature has.
    count: FxHashMap<u32, usize>,
}

impl Outlines {
    /// All outlines of `features`, which may be listed repeatedly.
    pub(super) fn of(mut features: Vec<u32>, all: &Features, shapes: &Shapes) -> Outlines {
        features.sort_unstable();
        features.dedup();
        let mut outlines = Outlines::default();
        for feature in features {
            for &shape in all.shapes_of(feature) {
                let number = outlines.known.len() as u32;
                let outline = canonical(shapes.get(shape));
                let entry = outlines.known.entry(outline);
                if entry.or_insert((feature, number)).1 == number {
                    *outlines.count.entry(feature).or_default() += 1;
                }
            }
        }
        outlines
    }

    /// Whether the feature is one of them.
    pub(super) fn has(&self, feature: u32) -> bool {
        self.count.contains_key(&feature)
    }

    /// How many different outlines the feature has.
    pub(super) fn count(&self, feature: u32) -> usize {
        self.count.get(&feature).copied().unwrap_or_default()
    }

    /// The feature that has this outline, and the number of the outline.
    pub(super) fn find(&self, shape: Shape<'_>) -> Option<(u32, u32)> {
        if self.known.is_empty() {
            return None;
        }
        self.known.get(&canonical(shape)).copied()
    }
}

/// The outline of a shape without spikes and straight vertices, in the least of its rotations and directions.
fn canonical(shape: Shape<'_>) -> Vec<Point> {
    let one = match shape {
        Shape::Rect(rect) => rect.corners().to_vec(),
        Shape::Polygon(vertices) => without_spikes(vertices),
    };
    let other: Vec<Point> = one.iter().rev().copied().collect();
    least_rotation(one).min(least_rotation(other))
}

fn least_rotation(mut points: Vec<Point>) -> Vec<Point> {
    let count = points.len();
    let (mut first, mut second, mut equal) = (0, 1, 0);
    while first < count && second < count && equal < count {
        let [a, b] = [first, second].map(|start| points[(start + equal) % count]);
        match a.cmp(&b) {
            std::cmp::Ordering::Equal => equal += 1,
            order => {
                match order.is_gt() {
                    true => first += equal + 1,
                    false => second += equal + 1,
                }
                second += usize::from(first == second);
                equal = 0;
            }
        }
    }
    points.rotate_left(first.min(second).min(count));
    points
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    #[test]
    fn rotations_are_the_least_of_all() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(3);
        for _ in 0..5_000 {
            let count = rng.random_range(0..9);
            let mut point = |_| Point::new(rng.random_range(0..2), rng.random_range(0..2));
            let points: Vec<Point> = (0..count).map(&mut point).collect();
            let all = (0..count).map(|start| {
                let mut turned = points.clone();
                turned.rotate_left(start);
                turned
            });
            let least = all.min().unwrap_or_default();
            assert_eq!(least_rotation(points.clone()), least, "{points:?}");
        }
    }

    #[test]
    fn where_an_outline_begins_and_how_it_runs_does_not_matter() {
        let corners = [(0, 0), (8, 0), (5, 4), (0, 3)].map(|(x, y)| Point::new(x, y));
        let more = [(5, 4), (8, 0), (4, 0), (0, 0), (0, 3)].map(|(x, y)| Point::new(x, y));
        let other = [(0, 0), (8, 0), (5, 4), (0, 4)].map(|(x, y)| Point::new(x, y));
        let [corners, more, other] =
            [&corners[..], &more, &other].map(|points| canonical(Shape::Polygon(points)));
        assert_eq!(corners, more);
        assert_ne!(corners, other);
    }
}
