//! Edges and corners by their owners, features or fragments, in packed trees.
//!
//! What a feature owns of its outline is all of it. What a fragment owns of an edge is where its rectangles,
//! overlaps included, touch the edge: a rectangle inside the feature that shares a stretch with the edge has its
//! own side there. It owns the corners that its rectangles touch. Both are asked of the tree of parts; since
//! features do not touch one another, only rectangles of the same feature answer.

use super::super::ExtractError;
use super::super::owners::Owners;
use super::super::pairs::MAX_PAIRS;
use super::super::parts::Parts;
use super::outlines::{Corner, Edge, Outlines};
use super::{Relation, corners, facing};
use crate::geometry::rtree::{PackedTree, Visitor};
use crate::geometry::{Point, Rect, hilbert};
use crate::layout::Fragments;
use rayon::prelude::*;
use std::sync::atomic::{AtomicUsize, Ordering};

/// How many edges or corners are looked at, or around, at a time.
const BLOCK: usize = 1 << 14;

/// What an owner owns of an edge, one stretch of it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Span {
    /// The edge.
    pub(super) edge: u32,
    /// The feature or fragment.
    pub(super) owner: u32,
    /// Where it starts, along.
    pub(super) from: i32,
    /// Where it ends, along.
    pub(super) to: i32,
}

/// The spans along one axis that face one way.
pub(super) struct Side {
    /// In the order of the tree.
    pub(super) spans: Vec<Span>,
    /// Over the spans, as lines along x.
    pub(super) tree: PackedTree,
}

/// Corners that may be turned to each other: seekers are upper right ones, and targets are lower left ones.
pub(super) struct Quarter {
    /// Their places and owners, in the order of their tree.
    pub(super) seekers: Vec<(Point, u32)>,
    /// Over the places of the seekers.
    pub(super) seeker_tree: PackedTree,
    /// Their places and owners, in the order of their tree.
    pub(super) targets: Vec<(Point, u32)>,
    /// Over the places of the targets.
    pub(super) tree: PackedTree,
}

/// The outlines of all features, by owner: 33 bytes a span and 29 a corner, beside the outlines.
pub(in crate::extract) struct Faces {
    /// The outlines.
    pub(super) outlines: Outlines,
    /// By axis, then those that face down and those that face up.
    pub(super) sides: [[Side; 2]; 2],
    /// The corners as they are, and in the mirror image at the line x = 0, where the upper left ones and the
    /// lower right ones are what seekers and targets are.
    pub(super) quarters: [Quarter; 2],
}

impl Faces {
    /// The outlines with the features as owners.
    pub(in crate::extract) fn of_features(outlines: Outlines) -> Faces {
        let spans = |axis: usize| {
            let edges = (0u32..).zip(&outlines.axes[axis].edges);
            edges
                .map(|(edge, of)| whole(edge, of, of.feature))
                .collect()
        };
        let spans = [0, 1].map(spans);
        let corners = outlines.corners.iter();
        let corners = corners.map(|&corner| (corner, corner.feature)).collect();
        Faces::new(outlines, spans, corners)
    }

    /// The same with fragments as owners; `parts` and `owners` are those of the fragments.
    pub(in crate::extract) fn of_fragments(
        self,
        parts: &Parts,
        owners: &Owners,
        fragments: &Fragments,
    ) -> Faces {
        let outlines = self.outlines;
        // Given free before others take their place.
        drop((self.sides, self.quarters));
        let touching = Touching {
            parts,
            owners,
            fragments,
        };
        let spans = |axis: usize| {
            let edges = &outlines.axes[axis].edges;
            let starts: Vec<usize> = (0..edges.len()).step_by(BLOCK).collect();
            let found: Vec<Vec<Span>> = (starts.into_par_iter())
                .map(|start| {
                    let block = start..edges.len().min(start + BLOCK);
                    let spans = block.flat_map(|edge| touching.spans(axis, edge, &edges[edge]));
                    spans.collect()
                })
                .collect();
            found.concat()
        };
        let spans = [0, 1].map(spans);
        let corners: Vec<Vec<(Corner, u32)>> = (outlines.corners.par_chunks(BLOCK))
            .map(|block| block.iter().flat_map(|c| touching.corners(c)).collect())
            .collect();
        Faces::new(outlines, spans, corners.concat())
    }

    fn new(outlines: Outlines, spans: [Vec<Span>; 2], corners: Vec<(Corner, u32)>) -> Faces {
        let mut axes = spans.into_iter().zip(&outlines.axes);
        let mut next = || {
            let (spans, axis) = axes.next().unwrap_or((Vec::new(), &outlines.axes[0]));
            let is_up = |span: &Span| axis.edges[span.edge as usize].is_up;
            let (up, down): (Vec<Span>, Vec<Span>) = spans.into_iter().partition(is_up);
            [down, up].map(|spans| {
                let at = |span: &Span| axis.edges[span.edge as usize].at;
                let area = |span: &Span| Rect::new(span.from, at(span), span.to, at(span));
                let (spans, tree) = packed(spans, area);
                Side { spans, tree }
            })
        };
        let sides = [next(), next()];
        let quarters = [false, true].map(|is_mirrored| quarter(&corners, is_mirrored));
        Faces {
            outlines,
            sides,
            quarters,
        }
    }

    /// The pairs of owners that are close by their outlines (2 to 4 of [`super`]), smaller one first,
    /// ascending.
    ///
    /// # Errors
    /// More than [`MAX_PAIRS`] of them.
    pub(in crate::extract) fn pairs(
        &self,
        relation: &Relation,
    ) -> Result<Vec<[u32; 2]>, ExtractError> {
        let mut all = Vec::new();
        for axis in 0..2 {
            let seekers = &self.sides[axis][1].spans;
            let find = |span: usize| facing::of_span(self, relation, axis, &seekers[span]);
            collect(seekers.len(), relation.facing_reach(), &find, &mut all)?;
        }
        if relation.corner > relation.least {
            for quarter in &self.quarters {
                let find = |seeker: usize| corners::of_corner(quarter, relation, seeker);
                collect(quarter.seekers.len(), relation.corner, &find, &mut all)?;
            }
        }
        all.par_sort_unstable();
        all.dedup();
        Ok(all)
    }
}

/// Adds what all seekers find, each an owner and others, to `all`.
fn collect(
    seekers: usize,
    spacing: i32,
    find: &(impl Fn(usize) -> (u32, Vec<u32>) + Sync),
    all: &mut Vec<[u32; 2]>,
) -> Result<(), ExtractError> {
    let limit = MAX_PAIRS;
    for start in (0..seekers).step_by(BLOCK) {
        let count = AtomicUsize::new(0);
        let block = start..seekers.min(start + BLOCK);
        let found: Vec<(u32, Vec<u32>)> = (block.into_par_iter().with_min_len(64))
            .map(|seeker| {
                // Once there is too much in all, nothing more is kept; whether there is does not depend on the order.
                if count.load(Ordering::Relaxed) > limit {
                    return (0, Vec::new());
                }
                let (owner, mut others) = find(seeker);
                others.sort_unstable();
                others.dedup();
                count.fetch_add(others.len(), Ordering::Relaxed);
                (owner, others)
            })
            .collect();
        if count.load(Ordering::Relaxed) > limit {
            return Err(ExtractError::TooManyPairs { limit, spacing });
        }
        let pairs = found.into_iter().flat_map(|(owner, others)| {
            let others = others.into_iter().filter(move |&other| other != owner);
            others.map(move |other| [owner.min(other), owner.max(other)])
        });
        all.extend(pairs);
        // The same pair is found from many places of long outlines.
        if all.len() > limit {
            all.par_sort_unstable();
            all.dedup();
        }
        if all.len() > limit {
            return Err(ExtractError::TooManyPairs { limit, spacing });
        }
    }
    Ok(())
}

/// Items along Hilbert's curve, and the tree over them.
fn packed<T: Copy + Send + Sync>(
    mut items: Vec<T>,
    area: impl Fn(&T) -> Rect + Sync,
) -> (Vec<T>, PackedTree) {
    items.par_sort_by_cached_key(|item| hilbert::centre(&area(item)));
    let boxes = items.iter().map(area).collect();
    (items, PackedTree::new(boxes))
}

fn quarter(corners: &[(Corner, u32)], is_mirrored: bool) -> Quarter {
    let place = |corner: &Corner| match is_mirrored {
        false => corner.at,
        true => Point::new(-corner.at.x, corner.at.y),
    };
    let of = |is_upper: bool| -> Vec<(Point, u32)> {
        // An upper corner looks to the right where it is a right one, which the mirror turns round.
        let is_right = is_upper != is_mirrored;
        let own = corners
            .iter()
            .filter(|(c, _)| (c.is_upper, c.is_right) == (is_upper, is_right));
        own.map(|(corner, owner)| (place(corner), *owner)).collect()
    };
    let area = |&(at, _): &(Point, u32)| Rect { min: at, max: at };
    let (seekers, seeker_tree) = packed(of(true), area);
    let (targets, tree) = packed(of(false), area);
    Quarter {
        seekers,
        seeker_tree,
        targets,
        tree,
    }
}

fn whole(edge: u32, of: &Edge, owner: u32) -> Span {
    Span {
        edge,
        owner,
        from: of.from,
        to: of.to,
    }
}

/// Calls a function with each item that a query finds.
pub(super) struct Each<F>(pub(super) F);

impl<F: FnMut(u32)> Visitor for Each<F> {
    fn enter(&mut self, _: usize) -> bool {
        true
    }

    fn visit(&mut self, item: u32) {
        (self.0)(item);
    }
}

/// The rectangles that fragments own.
struct Touching<'a> {
    parts: &'a Parts,
    owners: &'a Owners,
    fragments: &'a Fragments,
}

impl Touching<'_> {
    /// The spans of an edge, by fragment.
    fn spans(&self, axis: usize, edge: usize, of: &Edge) -> Vec<Span> {
        let number = edge as u32;
        let fragments = self.fragments.of_feature(of.feature);
        if fragments.len() == 1 {
            return vec![whole(number, of, fragments.start)];
        }
        let turned = |rect: Rect| if axis == 0 { rect } else { rect.transposed() };
        let line = turned(Rect::new(of.from, of.at, of.to, of.at));
        let mut found: Vec<Span> = Vec::new();
        self.rects(fragments, line, |owner, rect| {
            let rect = turned(rect);
            let (from, to) = (rect.min.x.max(of.from), rect.max.x.min(of.to));
            if from < to {
                found.push(Span {
                    edge: number,
                    owner,
                    from,
                    to,
                });
            }
        });
        found.sort_unstable();
        joined(found)
    }

    /// A corner with each fragment that it is in.
    fn corners(&self, corner: &Corner) -> Vec<(Corner, u32)> {
        let fragments = self.fragments.of_feature(corner.feature);
        if fragments.len() == 1 {
            return vec![(*corner, fragments.start)];
        }
        let (min, max) = (corner.at, corner.at);
        let mut found = Vec::new();
        self.rects(fragments, Rect { min, max }, |owner, _| found.push(owner));
        found.sort_unstable();
        found.dedup();
        found.into_iter().map(|owner| (*corner, owner)).collect()
    }

    /// The rectangles of some fragments that touch an area.
    fn rects(&self, fragments: std::ops::Range<u32>, area: Rect, mut visit: impl FnMut(u32, Rect)) {
        let mut each = Each(|part| {
            let owner = self.owners.of(part);
            if fragments.contains(&owner) {
                visit(owner, self.parts.box_of(part));
            }
        });
        self.parts.tree().query(&area, &mut each);
    }
}

/// Spans of one edge, sorted, with those of one owner joined where they meet.
fn joined(spans: Vec<Span>) -> Vec<Span> {
    let mut found: Vec<Span> = Vec::with_capacity(spans.len());
    for span in spans {
        match found.last_mut() {
            Some(last) if last.owner == span.owner && span.from <= last.to => {
                last.to = last.to.max(span.to);
            }
            _ => found.push(span),
        }
    }
    found
}
