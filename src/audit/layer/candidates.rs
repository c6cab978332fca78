//! The stitch candidates that the policy `uncovered` places.
//!
//! A place of a run is covered when the line across it is closer to another feature than the spacing. Each longest row of grid
//! places that are not covered has one candidate, in its middle (rounded down), if the overlap fits it, no line end of
//! the run belongs to it, the place is legal, and the candidate before is the smallest fragment length away.
//!
//! A rectangle covers the places within a distance along that Pythagoras tells from the one across. What a slanted edge covers
//! is an interval, since the distance of an edge from a line that moves sideways is a convex function of the move. Least it
//! is at an end of the edge, or where the edge crosses a side of the run: one of the grid places next to them, or the end of
//! the run nearest to it, is in the interval, if any is. Halving finds the ends.

use super::distance::{Bodies, Edge, edges, segments_closer};
use super::near;
use super::runs::Run;
use crate::audit::Rejection;
use crate::geometry::{Point, Rect};
use crate::layout::Rules;
use rayon::prelude::*;

/// The candidates on runs: their run, and their line. `features` are those of the bodies.
pub(super) fn uncovered(
    runs: &[Run],
    bodies: &Bodies,
    features: &[u32],
    rules: &Rules,
) -> Result<Vec<(usize, Rect)>, Rejection> {
    let count = runs.len() as u32;
    let mut boxes: Vec<Rect> = runs.iter().map(Run::area).collect();
    boxes.extend(&bodies.boxes);
    let mut labels: Vec<u32> = runs.iter().map(|run| run.feature).collect();
    labels.extend(features);
    let near_run = |a, b| (a < count && count <= b).then(|| [a, b - count]);
    let met = near::pairs(&boxes, &labels, rules.spacing - 1, near_run)?;
    drop((boxes, labels));
    let on_run = |(number, run): (usize, &Run)| {
        let start = met.partition_point(|pair| (pair[0] as usize) < number);
        let own = met[start..]
            .iter()
            .take_while(|pair| pair[0] as usize == number);
        let mut covered: Vec<[i64; 2]> = own
            .flat_map(|pair| covered_by(run, bodies, pair[1], rules.spacing))
            .collect();
        covered.sort_unstable();
        let places = places(run, &covered, rules);
        places
            .into_iter()
            .map(|place| (number, run.line(place)))
            .collect::<Vec<_>>()
    };
    let found = runs.par_iter().enumerate().flat_map_iter(on_run);
    Ok(found.collect())
}

/// The places of the candidates of one run, ascending.
fn places(run: &Run, covered: &[[i64; 2]], rules: &Rules) -> Vec<i32> {
    let [from, to] = [run.along.min.x, run.along.max.x].map(i64::from);
    let rules = &rules.stitch;
    let mut found: Vec<i32> = Vec::new();
    let mut start = from;
    for &[first, last] in covered.iter().chain(&[[to + 1, to + 1]]) {
        let end = first - 1;
        if start <= end {
            let dead_end = (start == from && !run.goes_on[0]) || (end == to && !run.goes_on[1]);
            let fits = end - start >= i64::from(rules.overlap);
            let place = (start + (end - start) / 2) as i32;
            let far = |before: &i32| {
                i64::from(place) - i64::from(*before) >= i64::from(rules.fragment_length)
            };
            let legal = || run.objection(place, rules).is_none();
            if !dead_end && fits && legal() && found.last().is_none_or(far) {
                found.push(place);
            }
        }
        start = start.max(last + 1);
    }
    found
}

/// The places of a run that a body covers, as intervals.
fn covered_by(run: &Run, bodies: &Bodies, body: u32, spacing: i32) -> Vec<[i64; 2]> {
    if bodies.is_rect(body) {
        let area = bodies.boxes[body as usize];
        return by_rect(run, area, spacing.into()).into_iter().collect();
    }
    let corners = bodies.corners(body);
    edges(&corners)
        .filter_map(|edge| by_edge(run, edge, spacing))
        .collect()
}

fn by_rect(run: &Run, area: Rect, spacing: i64) -> Option<[i64; 2]> {
    let [area, along] = [run.turned(area), run.along];
    let gap = |low: i32, high: i32| (i64::from(low) - i64::from(high)).max(0);
    let across = gap(area.min.y, along.max.y).max(gap(along.min.y, area.max.y));
    // The largest number of which the square is less than what is left of the square of the spacing.
    let left = spacing * spacing - across * across;
    let beyond = if left > 0 {
        (left - 1).isqrt()
    } else {
        return None;
    };
    let first = (i64::from(area.min.x) - beyond).max(along.min.x.into());
    let last = (i64::from(area.max.x) + beyond).min(along.max.x.into());
    (first <= last).then_some([first, last])
}

fn by_edge(run: &Run, edge: Edge, spacing: i32) -> Option<[i64; 2]> {
    let Rect {
        min: low,
        max: high,
    } = run.along;
    let edge = edge.map(|p| run.turned(Rect { min: p, max: p }).min);
    let limit = i128::from(spacing) * i128::from(spacing);
    let is_covered = |place: i64| {
        let x = place as i32;
        segments_closer([Point::new(x, low.y), Point::new(x, high.y)], edge, limit)
    };
    let [from, to] = [low.x, high.x].map(i64::from);
    let crossings = [low.y, high.y]
        .into_iter()
        .filter_map(|y| crossing(edge, y));
    let ends = edge.map(|end| i64::from(end.x)).into_iter();
    let near = ends.chain(crossings.flat_map(|x| [x, x + 1]));
    let inside = near
        .map(|place| place.clamp(from, to))
        .find(|&place| is_covered(place))?;
    Some([from, to].map(|end| {
        let (mut covered, mut beyond) = (inside, end + (end - inside).signum());
        while (beyond - covered).abs() > 1 {
            let middle = covered + (beyond - covered) / 2;
            match is_covered(middle) {
                true => covered = middle,
                false => beyond = middle,
            }
        }
        covered
    }))
}

/// Where an edge crosses a height, rounded down.
fn crossing([a, b]: Edge, y: i32) -> Option<i64> {
    let less = |p: i32, q: i32| i64::from(p) - i64::from(q);
    if (a.y < y) == (b.y < y) {
        return None;
    }
    let (dx, dy) = (less(b.x, a.x), less(b.y, a.y));
    Some(i64::from(a.x) + (less(y, a.y) * dx).div_euclid(dy))
}
