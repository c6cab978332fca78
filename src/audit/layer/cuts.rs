//! Features cut at their candidates.
//!
//! Each cut line divides the strips of its feature that it passes through. Pieces that share a point hang together, unless one
//! cut line holds all that they share. A line with connected pieces on both its sides separates nothing and is dropped. Where the
//! lines that are left do not connect all pieces of a feature, it hangs together by a line of no width only, and is not cut.

use super::distance::Bodies;
use super::features::Sets;
use super::near;
use super::runs::{Runs, mirrored};
use crate::audit::Rejection;
use crate::geometry::{Point, Rect};
use rayon::prelude::*;
use std::ops::Range;

/// A cut line.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Line {
    pub(super) feature: u32,
    pub(super) line: Rect,
    /// The parts of the feature to its left (below) and to its right (above).
    pub(super) sides: [u32; 2],
    /// The number of the run that it crosses.
    pub(super) run: u32,
}

/// A line to cut at, by its feature and the number of the run that it crosses.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Candidate {
    pub(super) feature: u32,
    pub(super) line: Rect,
    pub(super) run: u32,
}

/// A rectangle of a part of a feature.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Piece {
    pub(super) feature: u32,
    pub(super) part: u32,
    pub(super) rect: Rect,
}

/// The features that are cut; both lists are sorted.
#[derive(Debug, Default)]
pub(super) struct Cuts {
    pub(super) lines: Vec<Line>,
    pub(super) pieces: Vec<Piece>,
}

/// A list sorted by features, as far as it is one feature's.
pub(super) fn range_of<T>(list: &[T], feature: u32, of: impl Fn(&T) -> u32) -> Range<usize> {
    list.partition_point(|item| of(item) < feature)
        ..list.partition_point(|item| of(item) <= feature)
}

/// The rectangles of each feature; none for one with slanted edges.
pub(super) fn rects_of_features(
    bodies: &Bodies,
    features: &[u32],
) -> Vec<(u32, Option<Vec<Rect>>)> {
    let mut members: Vec<(u32, u32)> = features.iter().copied().zip(0..).collect();
    members.par_sort_unstable();
    let own: Vec<&[(u32, u32)]> = members.chunk_by(|one, other| one.0 == other.0).collect();
    let rect = |&(_, body): &(u32, u32)| bodies.is_rect(body).then(|| bodies.boxes[body as usize]);
    let rects = own
        .par_iter()
        .filter_map(|own| Some((own.first()?.0, own.iter().map(rect).collect())));
    rects.collect()
}

/// Cuts features at candidates, which are in the order of the features. Those runs are given.
pub(super) fn divided(candidates: &[Candidate], runs: &Runs) -> Result<Cuts, Rejection> {
    let lines: Vec<(u32, Rect)> = candidates
        .iter()
        .map(|one| (one.feature, one.line))
        .collect();
    let is_cut = |strip: &&(u32, Rect)| lines.binary_search_by_key(&strip.0, |line| line.0).is_ok();
    let strips: Vec<(u32, Rect)> = runs.strips.iter().filter(is_cut).copied().collect();
    let lines = &lines[..];
    let (pieces, beside) = pieces(lines, &strips)?;
    let parts = parts(lines, &pieces)?;
    let mut kept: Vec<Line> = (candidates.iter().zip(beside))
        .map(|(&Candidate { feature, line, run }, beside)| {
            let sides = beside.map(|piece| parts[piece as usize]);
            Line {
                feature,
                line,
                sides,
                run,
            }
        })
        .filter(|line| line.sides[0] != line.sides[1])
        .collect();
    kept.sort_unstable();
    let mut all: Vec<Piece> = (pieces.into_iter().zip(&parts))
        .map(|((feature, rect), &part)| Piece {
            feature,
            part,
            rect,
        })
        .collect();
    all.sort_unstable();
    // Which parts the lines connect again: all of the feature, or none is kept.
    let mut whole = Sets::new(all.len());
    kept.iter()
        .for_each(|line| whole.join(line.sides[0], line.sides[1]));
    let whole = whole.firsts();
    let is_cut = |own: &[Piece]| {
        let mut sets = own.iter().map(|piece| whole[piece.part as usize]);
        let first = sets.next();
        let part = own.first().map(|piece| piece.part);
        own.iter().any(|piece| Some(piece.part) != part) && sets.all(|set| Some(set) == first)
    };
    let cut = all.chunk_by(|one, other| one.feature == other.feature);
    let pieces: Vec<Piece> = cut.filter(|own| is_cut(own)).flatten().copied().collect();
    kept.retain(|line| !range_of(&pieces, line.feature, |piece| piece.feature).is_empty());
    Ok(Cuts {
        lines: kept,
        pieces,
    })
}

/// Pieces with their features, and for each line a piece on either side.
type Divided = (Vec<(u32, Rect)>, Vec<[u32; 2]>);

/// Divides the strips by the lines.
fn pieces(lines: &[(u32, Rect)], strips: &[(u32, Rect)]) -> Result<Divided, Rejection> {
    let count = lines.len() as u32;
    let boxes: Vec<Rect> = lines.iter().chain(strips).map(|one| one.1).collect();
    let labels: Vec<u32> = (0..boxes.len() as u32)
        .map(|i| u32::from(i < count))
        .collect();
    let passes = |line: u32, strip: u32| {
        let [Rect { min, max }, strip_at] = [boxes[line as usize], boxes[strip as usize]];
        let [low, high] = [strip_at.min, strip_at.max];
        let inside = min.x < high.x && low.x < max.x && min.y < high.y && low.y < max.y;
        // All lines through a strip run the same way: runs of both directions do not cross.
        let place = if min.x == max.x { min.x } else { min.y };
        inside.then_some((strip - count, place, line))
    };
    let mut rest = &near::pairs(&boxes, &labels, 0, passes)?[..];
    let mut found = Vec::with_capacity(boxes.len());
    let mut beside = vec![[0; 2]; lines.len()];
    for (number, &(feature, strip)) in (0..).zip(strips) {
        let (own, later) = rest.split_at(rest.partition_point(|hit| hit.0 == number));
        rest = later;
        let mut left = strip;
        for &(_, place, line) in own {
            let mut below = left;
            let line_at = lines[line as usize].1;
            if line_at.min.x == line_at.max.x {
                (below.max.x, left.min.x) = (place, place);
            } else {
                (below.max.y, left.min.y) = (place, place);
            }
            beside[line as usize] = [0, 1].map(|more| found.len() as u32 + more);
            found.push((feature, below));
        }
        found.push((feature, left));
    }
    Ok((found, beside))
}

/// For each piece the first one of those that it hangs together with.
fn parts(lines: &[(u32, Rect)], pieces: &[(u32, Rect)]) -> Result<Vec<u32>, Rejection> {
    let lines = Sorted::new(lines);
    let boxes: Vec<Rect> = pieces.iter().map(|piece| piece.1).collect();
    let labels: Vec<u32> = (0..boxes.len() as u32).collect();
    let hang = |a: u32, b: u32| {
        let [p, q] = [&boxes[a as usize], &boxes[b as usize]];
        let min = Point::new(p.min.x.max(q.min.x), p.min.y.max(q.min.y));
        let max = Point::new(p.max.x.min(q.max.x), p.max.y.min(q.max.y));
        (!lines.hold(Rect { min, max })).then_some([a, b])
    };
    let mut sets = Sets::new(pieces.len());
    for [a, b] in near::pairs(&boxes, &labels, 0, hang)? {
        sets.join(a, b);
    }
    Ok(sets.firsts())
}

/// The upright lines, and the others in the mirror image at the line x = y. Those of one abscissa have no point in
/// common: they are sides of strips.
struct Sorted([Vec<Rect>; 2]);

impl Sorted {
    fn new(lines: &[(u32, Rect)]) -> Sorted {
        let mut sorted = [Vec::new(), Vec::new()];
        for &(_, line) in lines {
            match line.min.x == line.max.x {
                true => sorted[0].push(line),
                false => sorted[1].push(mirrored(line, true)),
            }
        }
        sorted.iter_mut().for_each(|lines| lines.sort_unstable());
        Sorted(sorted)
    }

    /// Whether one line holds all of what two pieces share.
    fn hold(&self, shared: Rect) -> bool {
        let shared = [shared, mirrored(shared, true)];
        self.0.iter().zip(shared).any(|(lines, shared)| {
            let before = &lines[..lines.partition_point(|line| line.min <= shared.min)];
            before.last().is_some_and(|line| line.covers(&shared))
        })
    }
}
