//! The outlines of all features: their straight edges along both axes, and their convex corners.
//!
//! Each feature is taken apart into slab cells once; edges along y are those of its mirror image at the line x =
//! y, and kept in its coordinates: "along" is y for them and "across" x. Features with a slanted shape
//! have no edges here.

use super::super::ExtractError;
use super::super::error::{MAX_CELLS, too_many_cells};
use super::super::owners::Owners;
use super::super::parts::{Part, Parts};
use super::Relation;
use super::edges::{Edges, edges_along};
use super::wide::Deep;
use crate::geometry::slabs::cells_of_rects;
use crate::geometry::{Point, Rect};
use rayon::prelude::*;

/// How many features are taken apart at a time.
const BLOCK: usize = 1 << 14;

/// An edge of a feature.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(in crate::extract) struct Edge {
    /// Its feature.
    pub(super) feature: u32,
    /// Where it is, across.
    pub(super) at: i32,
    /// Where it starts, along.
    pub(super) from: i32,
    /// Where it ends, along.
    pub(super) to: i32,
    /// Whether its outward normal points towards larger coordinates.
    pub(super) is_up: bool,
    /// Whether it is a line end.
    pub(super) is_end: bool,
}

/// A convex corner of a feature, in coordinates of the layout.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(in crate::extract) struct Corner {
    /// Its feature.
    pub(super) feature: u32,
    /// Where it is.
    pub(super) at: Point,
    /// Whether it is a right one, and whether an upper one.
    pub(super) is_right: bool,
    pub(super) is_upper: bool,
}

/// The edges of all features along one axis, by feature: 24 bytes an edge.
#[derive(Default)]
pub(in crate::extract) struct Axis {
    /// Feature by feature: those that face down first, then by `at` and `from`.
    pub(super) edges: Vec<Edge>,
    /// Where the edges of each feature start.
    start: Vec<usize>,
    /// The depths behind them; empty where there is no table of wide features.
    pub(super) deep: Deep,
}

impl Axis {
    fn push(&mut self, feature: u32, found: &Edges, relation: &Relation) {
        self.start.push(self.edges.len());
        self.edges.extend(found.edges.iter().map(|edge| {
            let length = i64::from(edge.to) - i64::from(edge.from);
            Edge {
                feature,
                at: edge.at,
                from: edge.from,
                to: edge.to,
                is_up: edge.is_up,
                is_end: edge.is_convex == [true; 2] && length < relation.end_length.into(),
            }
        }));
        if !relation.wide.is_empty() {
            self.deep.push(found);
        }
    }

    fn finish(&mut self, relation: &Relation) {
        self.start.push(self.edges.len());
        if !relation.wide.is_empty() {
            let edges = &self.edges;
            self.deep.sum_up(&relation.wide, |edge| edges[edge].to);
        }
    }

    /// The edges of a feature on one line, facing one way, that have more than a point of [from, to].
    pub(super) fn on_line(
        &self,
        feature: u32,
        is_up: bool,
        at: i32,
        [from, to]: [i32; 2],
    ) -> impl Iterator<Item = u32> + '_ {
        let [start, end] = [feature as usize, feature as usize + 1].map(|f| self.start[f]);
        let before = |edge: &Edge| (edge.is_up, edge.at, edge.to) <= (is_up, at, from);
        let first = start + self.edges[start..end].partition_point(before);
        let on_line = move |edge: &&Edge| (edge.is_up, edge.at) == (is_up, at) && edge.from < to;
        let count = self.edges[first..end].iter().take_while(on_line).count();
        first as u32..(first + count) as u32
    }
}

/// The outlines of all features.
pub(in crate::extract) struct Outlines {
    /// Edges along x, and along y in the mirror image.
    pub(super) axes: [Axis; 2],
    /// Feature by feature, by their places.
    pub(super) corners: Vec<Corner>,
    /// Where the corners of each feature start.
    corner_start: Vec<usize>,
}

/// The outline of one feature.
#[derive(Default)]
struct Outline {
    along: [Edges; 2],
    corners: Vec<Corner>,
}

impl Outlines {
    /// Finds the outlines of all features, on all cores. O(n log n) in the cells.
    ///
    /// # Errors
    /// A feature of more than [`MAX_CELLS`] cells.
    pub(in crate::extract) fn new(
        parts: &Parts,
        owners: &Owners,
        relation: &Relation,
    ) -> Result<Outlines, ExtractError> {
        let total = owners.len();
        let mut all = Outlines {
            axes: Default::default(),
            corners: Vec::new(),
            corner_start: Vec::with_capacity(total + 1),
        };
        for start in (0..total).step_by(BLOCK) {
            let block = start as u32..total.min(start + BLOCK) as u32;
            let found: Vec<Result<Outline, ExtractError>> = (block.clone().into_par_iter())
                .with_min_len(64)
                .map(|feature| of_feature(parts, owners.parts_of(feature), feature))
                .collect();
            for (feature, outline) in block.zip(found) {
                all.push(feature, outline?, relation);
            }
        }
        all.axes.iter_mut().for_each(|axis| axis.finish(relation));
        all.corner_start.push(all.corners.len());
        Ok(all)
    }

    fn push(&mut self, feature: u32, outline: Outline, relation: &Relation) {
        for (axis, edges) in self.axes.iter_mut().zip(&outline.along) {
            axis.push(feature, edges, relation);
        }
        self.corner_start.push(self.corners.len());
        self.corners.extend(outline.corners);
    }

    /// The convex corners of a feature at x between `from` and `to`.
    pub(super) fn corners_between(&self, feature: u32, [from, to]: [i32; 2]) -> &[Corner] {
        let [start, end] = [feature as usize, feature as usize + 1].map(|f| self.corner_start[f]);
        let own = &self.corners[start..end];
        let first = own.partition_point(|corner| corner.at.x < from);
        let count = own[first..].partition_point(|corner| corner.at.x <= to);
        &own[first..first + count]
    }
}

fn of_feature(parts: &Parts, own: &[u32], feature: u32) -> Result<Outline, ExtractError> {
    let mut rects = Vec::with_capacity(own.len());
    for &part in own {
        match parts.get(part) {
            Part::Rect(rect) => rects.push(rect),
            Part::Slanted(_) => return Ok(Outline::default()),
        }
    }
    let too_many = || {
        let area = rects.iter().copied().reduce(|all, one| all.union(&one));
        too_many_cells(area.unwrap_or_default())
    };
    let cells = cells_of_rects(&rects, MAX_CELLS).ok_or_else(too_many)?;
    let mirrored: Vec<Rect> = cells.iter().map(Rect::transposed).collect();
    let mirrored = cells_of_rects(&mirrored, MAX_CELLS).ok_or_else(too_many)?;
    let along = [edges_along(&cells), edges_along(&mirrored)];
    let corners = corners_of(feature, &along[0]);
    Ok(Outline { along, corners })
}

/// The convex corners, each an end of an edge along x, by their places.
fn corners_of(feature: u32, along_x: &Edges) -> Vec<Corner> {
    let mut found = Vec::new();
    for edge in &along_x.edges {
        let ends = [(edge.from, false), (edge.to, true)];
        for ((x, is_right), is_convex) in ends.into_iter().zip(edge.is_convex) {
            if is_convex {
                found.push(Corner {
                    feature,
                    at: Point::new(x, edge.at),
                    is_right,
                    is_upper: edge.is_up,
                });
            }
        }
    }
    found.sort_unstable_by_key(|corner| (corner.at, corner.is_right, corner.is_upper));
    found
}
