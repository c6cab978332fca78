//! What a feature or fragment covers, and exact distances.
//!
//! Between rectangles the squared distance is an integer. Where an outline has slanted edges it is a
//! fraction, and the distance rounded down to the grid is found by bisection with exact comparisons.

use crate::geometry::distance::{Outline, outlines_closer_than, squared_gap};
use crate::geometry::outline::is_manhattan;
use crate::geometry::slabs::{cells, rims_of_outline};
use crate::geometry::{Point, Rect};
use crate::layout::Shape;

use super::Layer;

/// The most rectangles that an outline is taken apart into; extraction has the same limit.
const MAX_CELLS: usize = 1 << 26;

/// A part of what a feature covers.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Region {
    /// A rectangle.
    Rect(Rect),
    /// An outline with slanted edges.
    Outline(Vec<Point>),
}

/// How far two things are apart.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Gap {
    /// In database units, rounded down.
    pub distance: i32,
    /// Whether nothing was rounded.
    pub is_exact: bool,
    /// The square of it, where it is an integer that is known.
    pub squared: Option<u64>,
    /// The boxes around the two parts that are closest.
    pub boxes: [Rect; 2],
}

impl Gap {
    /// Whether it is known to be smaller than another one.
    pub fn is_less(&self, other: &Gap) -> bool {
        match (self.squared, other.squared) {
            (Some(own), Some(its)) => own < its,
            _ => self.distance < other.distance,
        }
    }
}

impl Region {
    /// The box around it.
    pub fn bounds(&self) -> Rect {
        match self {
            Region::Rect(rect) => *rect,
            Region::Outline(points) => Rect::around(points).unwrap_or_default(),
        }
    }

    /// The same, moved. `None` beyond the range of coordinates.
    pub fn moved(&self, [dx, dy]: [i32; 2]) -> Option<Region> {
        let shift = |p: Point| -> Option<Point> {
            let moved = Point::new(p.x.checked_add(dx)?, p.y.checked_add(dy)?);
            moved.is_in_range().then_some(moved)
        };
        Some(match self {
            Region::Rect(rect) => Region::Rect(Rect {
                min: shift(rect.min)?,
                max: shift(rect.max)?,
            }),
            Region::Outline(points) => {
                Region::Outline(points.iter().copied().map(shift).collect::<Option<_>>()?)
            }
        })
    }

    /// Whether two are strictly closer than `spacing`, at least 1.
    pub fn is_closer(&self, other: &Region, spacing: i32) -> bool {
        let square = i64::from(spacing).pow(2).unsigned_abs();
        if squared_gap(&self.bounds(), &other.bounds()) >= square {
            return false;
        }
        match (self, other) {
            (Region::Rect(_), Region::Rect(_)) => true,
            (Region::Rect(a), Region::Outline(b)) => {
                outlines_closer_than(Outline::plain(&a.corners()), Outline::plain(b), spacing)
            }
            (Region::Outline(_), Region::Rect(_)) => other.is_closer(self, spacing),
            (Region::Outline(a), Region::Outline(b)) => {
                outlines_closer_than(Outline::plain(a), Outline::plain(b), spacing)
            }
        }
    }

    fn gap(&self, other: &Region, below: i32) -> Option<Gap> {
        if !self.is_closer(other, below) {
            return None;
        }
        let boxes = [self.bounds(), other.bounds()];
        if let (Region::Rect(a), Region::Rect(b)) = (self, other) {
            let squared = squared_gap(a, b);
            let distance = squared.isqrt();
            return Some(Gap {
                distance: i32::try_from(distance).unwrap_or(i32::MAX),
                is_exact: distance * distance == squared,
                squared: Some(squared),
                boxes,
            });
        }
        // Not closer than `low`, closer than `high`.
        let (mut low, mut high) = (0, below);
        while high - low > 1 {
            let middle = low + (high - low) / 2;
            if self.is_closer(other, middle) {
                high = middle;
            } else {
                low = middle;
            }
        }
        Some(Gap {
            distance: low,
            is_exact: false,
            squared: None,
            boxes,
        })
    }
}

/// The distance of two things, if it is less than `below`, at least 1.
pub fn between(a: &[Region], b: &[Region], below: i32) -> Option<Gap> {
    let mut best: Option<Gap> = None;
    let near = near(b, a, below);
    for one in self::near(a, b, below) {
        for other in &near {
            let Some(gap) = one.gap(other, below) else {
                continue;
            };
            let nearer = |best: &Gap| match (gap.is_less(best), best.is_less(&gap)) {
                (false, false) => gap.boxes < best.boxes,
                (less, _) => less,
            };
            if best.as_ref().is_none_or(nearer) {
                best = Some(gap);
            }
        }
    }
    best
}

/// Those of `regions` that may be closer than `spacing` to one of `others`.
fn near<'r>(regions: &'r [Region], others: &[Region], spacing: i32) -> Vec<&'r Region> {
    let boxes = others.iter().map(Region::bounds);
    let Some(area) = boxes.reduce(|all, one| all.union(&one)) else {
        return Vec::new();
    };
    let reach = area.grown(spacing);
    let within = |region: &&Region| region.bounds().touches(&reach);
    regions.iter().filter(within).collect()
}

/// What a feature covers.
pub fn of_feature(layer: &Layer<'_>, feature: u32) -> Vec<Region> {
    let mut regions = Vec::new();
    for &shape in layer.extraction.features.shapes_of(feature) {
        match layer.layout.shapes.get(shape) {
            Shape::Rect(rect) => regions.push(Region::Rect(rect)),
            Shape::Polygon(points) if is_manhattan(points) => {
                let rects = cells(rims_of_outline(points).collect(), MAX_CELLS);
                regions.extend(rects.unwrap_or_default().into_iter().map(Region::Rect));
            }
            Shape::Polygon(points) => regions.push(Region::Outline(points.to_vec())),
        }
    }
    regions
}

/// What distances of a fragment are taken from: its cells and the overlaps of its cuts.
pub fn of_fragment(layer: &Layer<'_>, fragment: u32) -> Vec<Region> {
    let fragments = &layer.extraction.fragments;
    if fragments.is_split(fragment) {
        return fragments.reach_of(fragment).map(Region::Rect).collect();
    }
    of_feature(layer, fragments.feature_of(fragment))
}

/// The box that two boxes share, or along an axis on which they are apart, the gap between them.
pub fn box_between([a, b]: [Rect; 2]) -> Rect {
    let span = |a: [i32; 2], b: [i32; 2]| {
        let (from, to) = (a[0].max(b[0]), a[1].min(b[1]));
        [from.min(to), from.max(to)]
    };
    let [x0, x1] = span([a.min.x, a.max.x], [b.min.x, b.max.x]);
    let [y0, y1] = span([a.min.y, a.max.y], [b.min.y, b.max.y]);
    Rect::new(x0, y0, x1, y1)
}
