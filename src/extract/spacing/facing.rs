//! Edges that face each other too closely: 2 and 4 of the relation in [`super`].
//!
//! Each part of an edge that faces up asks the tree of those that face down for what lies above it, less than the largest
//! spacing away. Two parts are too close by the spacing of their kinds, or by a row of the table of wide
//! features: whether the row holds at all is a matter of the two whole edges, and whether it holds for these parts
//! one of the stretch that they share.

use super::Relation;
use super::faces::{Each, Faces, Span};
use super::outlines::Axis;
use crate::geometry::Rect;

/// The owner of a span that faces up, and those of the spans that it is too close to.
pub(super) fn of_span(
    faces: &Faces,
    relation: &Relation,
    axis: usize,
    span: &Span,
) -> (u32, Vec<u32>) {
    let (edges, below) = (&faces.outlines.axes[axis], &faces.sides[axis][0]);
    let mut found = Vec::new();
    let mut each = Each(|item| {
        let other = &below.spans[item as usize];
        let shared = [span.from.max(other.from), span.to.min(other.to)];
        if other.owner != span.owner
            && found.last() != Some(&other.owner)
            && shared[0] < shared[1]
            && are_close(edges, relation, [span.edge, other.edge], shared)
        {
            found.push(other.owner);
        }
    });
    let at = edges.edges[span.edge as usize].at;
    let area = reach([span.from, span.to], at, true, relation);
    below.tree.query(&area, &mut each);
    (span.owner, found)
}

/// The places in front of a stretch of an edge that are nearer than the largest spacing of edges.
pub(super) fn reach([from, to]: [i32; 2], at: i32, is_up: bool, relation: &Relation) -> Rect {
    let most = relation.facing_reach() - 1;
    match is_up {
        true => Rect::new(from, at, to, at.saturating_add(most)),
        false => Rect::new(from, at.saturating_sub(most), to, at),
    }
}

/// The gap between two edges that face each other.
pub(super) fn gap(edges: &Axis, pair: [u32; 2]) -> i64 {
    let [a, b] = pair.map(|edge| i64::from(edges.edges[edge as usize].at));
    (a - b).abs()
}

/// The spacing of two edges by their kinds.
pub(super) fn spacing(edges: &Axis, relation: &Relation, pair: [u32; 2]) -> i64 {
    let are_ends = pair.map(|edge| edges.edges[edge as usize].is_end);
    relation.of_kinds(are_ends).into()
}

/// Whether two edges that face each other are too close, as seen by parts that share a stretch.
fn are_close(edges: &Axis, relation: &Relation, pair: [u32; 2], shared: [i32; 2]) -> bool {
    if gap(edges, pair) < spacing(edges, relation, pair) {
        return true;
    }
    let deep = &edges.deep;
    rows_that_hold(edges, relation, pair).any(|(edge, row)| {
        let width = relation.wide[row].width;
        deep.length(edge, row, width, shared) > 0
    })
}

/// The rows of the table that hold for two edges, each with the edge that is the wide one.
pub(super) fn rows_that_hold<'a>(
    edges: &'a Axis,
    relation: &'a Relation,
    pair: [u32; 2],
) -> impl Iterator<Item = (u32, usize)> + 'a {
    let [a, b] = pair.map(|edge| edges.edges[edge as usize]);
    let common = [a.from.max(b.from), a.to.min(b.to)];
    let gap = gap(edges, pair);
    let near = (relation.wide.iter().enumerate()).filter(move |(_, row)| gap < row.spacing.into());
    near.flat_map(move |(number, row)| {
        let long = move |&edge: &u32| {
            let length = edges.deep.length(edge, number, row.width, common);
            length >= row.run_length.into()
        };
        let wide = pair.into_iter().filter(long);
        wide.map(move |edge| (edge, number))
    })
}
