//! The shapes of a layer in parts that distances and unions are taken of.
//!
//! A rectangle is one part. An outline along the axes becomes the rectangles of its slab cells, which cover
//! what it encloses: a point inside is then no special case any more. An outline with slanted edges
//! stays whole, and its part is the box around it. Shapes that enclose no area print nothing: they get
//! no part, and are named.
//!
//! The parts are stored in the order of their centres along Hilbert's curve, in a packed tree: 21 bytes a
//! rectangle.

use super::ExtractError;
use super::error::{MAX_CELLS, too_many_cells};
use super::owners::Owners;
use crate::geometry::distance::{
    Outline, edge_index, outlines_closer_than, outlines_closer_than_square, outlines_touch,
    rects_closer_than, rects_closer_than_square,
};
use crate::geometry::outline::{is_manhattan, without_spikes};
use crate::geometry::rtree::PackedTree;
use crate::geometry::slabs::{cells, rims_of_outline};
use crate::geometry::{Point, Rect, hilbert};
use crate::layout::{Fragments, Metric, Shape, Shapes};
use rayon::prelude::*;

/// Marks the parts that are slanted outlines.
const SLANTED: u32 = 1 << 31;

/// The most edges of an outline that are looked at one by one.
const PLAIN_EDGES: usize = 48;

/// The parts of all shapes.
pub(super) struct Parts {
    tree: PackedTree,
    /// The shape of each part, with [`SLANTED`] or not.
    source: Vec<u32>,
    /// Slanted outlines without spikes, by shape.
    slanted: Outlines,
    /// Shapes that enclose no area, ascending.
    pub(super) empty: Vec<u32>,
}

/// What a part is.
pub(super) enum Part<'a> {
    Rect(Rect),
    Slanted(Outline<'a>),
}

/// Outlines of some shapes, sorted by shape.
struct Outlines {
    shapes: Vec<u32>,
    start: Vec<usize>,
    points: Vec<Point>,
    /// The edge indices of outlines of more than [`PLAIN_EDGES`] edges, by shape.
    indices: Vec<(u32, PackedTree)>,
}

impl Outlines {
    fn push(&mut self, shape: u32, outline: &[Point]) {
        self.shapes.push(shape);
        self.points.extend_from_slice(outline);
        self.start.push(self.points.len());
        if outline.len() > PLAIN_EDGES {
            self.indices.push((shape, edge_index(outline)));
        }
    }

    fn get(&self, shape: u32) -> Outline<'_> {
        let points = match self.shapes.binary_search(&shape) {
            Ok(i) => &self.points[self.start[i]..self.start[i + 1]],
            Err(_) => &[],
        };
        match self.indices.binary_search_by_key(&shape, |index| index.0) {
            Ok(i) => Outline::indexed(points, &self.indices[i].1),
            Err(_) => Outline::plain(points),
        }
    }
}

impl Parts {
    /// Takes the shapes apart. O(n log n) in their vertices.
    pub(super) fn new(shapes: &Shapes) -> Result<Parts, ExtractError> {
        if shapes.len() >= SLANTED as usize {
            return Err(ExtractError::TooManyShapes(shapes.len()));
        }
        let mut collector = Collector::new(shapes.len());
        for (shape, outline) in shapes.iter().enumerate() {
            collector.push(shape as u32, outline)?;
        }
        let empty = std::mem::take(&mut collector.empty);
        let (mut parts, _) = collector.finish()?;
        parts.empty = empty;
        Ok(parts)
    }

    /// The same with fragments as owners: the parts of unsplit features as they are, those of split ones
    /// replaced by what distances of their fragments are taken from.
    pub(super) fn of_fragments(
        self,
        owners: &Owners,
        fragments: &Fragments,
    ) -> Result<(Parts, Owners), ExtractError> {
        let mut collector = Collector::new(self.len());
        let mut of = Vec::with_capacity(self.len());
        for feature in 0..owners.len() as u32 {
            for fragment in fragments.of_feature(feature) {
                if fragments.is_split(fragment) {
                    collector.boxes.extend(fragments.reach_of(fragment));
                    // Rectangles are never looked up by shape again.
                    collector.source.resize(collector.boxes.len(), 0);
                } else {
                    for &part in owners.parts_of(feature) {
                        collector.boxes.push(self.box_of(part));
                        collector.source.push(self.source[part as usize]);
                    }
                }
                of.resize(collector.boxes.len(), fragment);
            }
        }
        collector.slanted = self.slanted;
        drop(self.tree);
        let (parts, order) = collector.finish()?;
        let of = order.into_iter().map(|part| of[part as usize]).collect();
        Ok((parts, Owners::new(of, fragments.len())))
    }

    /// How many parts there are.
    pub(super) fn len(&self) -> usize {
        self.source.len()
    }

    /// The tree over the boxes of the parts.
    pub(super) fn tree(&self) -> &PackedTree {
        &self.tree
    }

    /// The box of a part.
    pub(super) fn box_of(&self, part: u32) -> Rect {
        self.tree.items()[part as usize]
    }

    /// The shape that a part is of.
    pub(super) fn shape_of(&self, part: u32) -> u32 {
        self.source[part as usize] & !SLANTED
    }

    /// Whether a part is a slanted outline.
    pub(super) fn is_slanted(&self, part: u32) -> bool {
        self.source[part as usize] & SLANTED != 0
    }

    /// A part.
    pub(super) fn get(&self, part: u32) -> Part<'_> {
        if self.is_slanted(part) {
            Part::Slanted(self.slanted.get(self.shape_of(part)))
        } else {
            Part::Rect(self.box_of(part))
        }
    }

    /// Whether two parts share a point.
    pub(super) fn touch(&self, a: u32, b: u32) -> bool {
        match (self.get(a), self.get(b)) {
            (Part::Rect(a), Part::Rect(b)) => a.touches(&b),
            (Part::Rect(a), Part::Slanted(b)) => outlines_touch(Outline::plain(&a.corners()), b),
            (Part::Slanted(a), Part::Rect(b)) => outlines_touch(a, Outline::plain(&b.corners())),
            (Part::Slanted(a), Part::Slanted(b)) => outlines_touch(a, b),
        }
    }

    /// Whether two parts are strictly closer than `spacing`.
    pub(super) fn closer_than(&self, a: u32, b: u32, spacing: i32, metric: Metric) -> bool {
        let outlines = match metric {
            Metric::Euclidean => outlines_closer_than,
            Metric::Square => outlines_closer_than_square,
        };
        match (self.get(a), self.get(b)) {
            (Part::Rect(a), Part::Rect(b)) => match metric {
                Metric::Euclidean => rects_closer_than(&a, &b, spacing),
                Metric::Square => rects_closer_than_square(&a, &b, spacing),
            },
            (Part::Rect(a), Part::Slanted(b)) => outlines(Outline::plain(&a.corners()), b, spacing),
            (Part::Slanted(a), Part::Rect(b)) => outlines(a, Outline::plain(&b.corners()), spacing),
            (Part::Slanted(a), Part::Slanted(b)) => outlines(a, b, spacing),
        }
    }
}

struct Collector {
    boxes: Vec<Rect>,
    source: Vec<u32>,
    slanted: Outlines,
    empty: Vec<u32>,
}

impl Collector {
    fn new(capacity: usize) -> Collector {
        Collector {
            boxes: Vec::with_capacity(capacity),
            source: Vec::with_capacity(capacity),
            slanted: Outlines {
                shapes: Vec::new(),
                start: vec![0],
                points: Vec::new(),
                indices: Vec::new(),
            },
            empty: Vec::new(),
        }
    }

    fn push(&mut self, shape: u32, outline: Shape<'_>) -> Result<(), ExtractError> {
        match outline {
            Shape::Rect(rect) => {
                check_range(shape, &[rect.min, rect.max])?;
                self.boxes.push(rect);
                self.source.push(shape);
            }
            Shape::Polygon(vertices) => {
                check_range(shape, vertices)?;
                self.push_polygon(shape, vertices)?;
            }
        }
        Ok(())
    }

    fn push_polygon(&mut self, shape: u32, vertices: &[Point]) -> Result<(), ExtractError> {
        let before = self.boxes.len();
        if is_manhattan(vertices) {
            let rims = rims_of_outline(vertices).collect();
            let area = Rect::around(vertices).unwrap_or_default();
            let cells = cells(rims, MAX_CELLS).ok_or_else(|| too_many_cells(area))?;
            self.boxes.extend(cells);
            self.source.resize(self.boxes.len(), shape);
        } else {
            let outline = without_spikes(vertices);
            if let Some(area) = Rect::around(&outline) {
                self.boxes.push(area);
                self.source.push(shape | SLANTED);
                self.slanted.push(shape, &outline);
            }
        }
        if self.boxes.len() == before {
            self.empty.push(shape);
        }
        Ok(())
    }

    /// Sorts the parts along the curve; also gives the place that each part had before.
    fn finish(self) -> Result<(Parts, Vec<u32>), ExtractError> {
        if self.boxes.len() >= u32::MAX as usize {
            return Err(ExtractError::TooManyShapes(self.boxes.len()));
        }
        let mut order: Vec<(u64, u32)> = (self.boxes.iter().zip(0u32..))
            .map(|(area, part)| (hilbert::centre(area), part))
            .collect();
        order.par_sort_unstable();
        let order: Vec<u32> = order.into_iter().map(|(_, part)| part).collect();
        let source = order.iter().map(|&part| self.source[part as usize]);
        let source = source.collect();
        let boxes = order.iter().map(|&part| self.boxes[part as usize]);
        let boxes: Vec<Rect> = boxes.collect();
        drop(self.boxes);
        let parts = Parts {
            tree: PackedTree::new(boxes),
            source,
            slanted: self.slanted,
            empty: Vec::new(),
        };
        Ok((parts, order))
    }
}

fn check_range(shape: u32, points: &[Point]) -> Result<(), ExtractError> {
    match points.iter().find(|point| !point.is_in_range()) {
        None => Ok(()),
        Some(&Point { x, y }) => Err(ExtractError::OutOfRange { shape, x, y }),
    }
}
