//! The stitch candidates that the policy `uncovered` places.
//!
//! A place of a run is covered by what, through it alone, makes both the run up to the place and the run from there on too close to another
//! feature: a body (where the line across is too close to it), two edges that face each other too closely, or two corners.
//! Each longest row of grid places that are not covered has one candidate, in its middle (rounded down), if the overlap fits it, no line end of
//! the run belongs to it, the place is legal, and the candidate before is the smallest fragment length away.
//!
//! A rectangle covers the places within a distance along that Pythagoras tells from the one across. What a slanted edge covers
//! is an interval, since the distance of an edge from a line that moves sideways is a convex function of the move. Least it
//! is at an end of the edge, or where the edge crosses a side of the run: one of the grid places next to them, or the end of
//! the run nearest to it, is in the interval, if any is. Halving finds the ends. Edges along the run that are too close from one place to another
//! leave those two places themselves uncovered: a part that ends there has nothing of them.

use super::distance::{Bodies, Edge, Within, edges, segments_closer};
use super::facing::{Facing, Part, Region, Tip};
use super::ground::Ground;
use super::near;
use super::runs::{Run, Runs};
use crate::audit::Rejection;
use crate::geometry::{Point, Rect};
use crate::layout::{Metric, StitchRules};
use rayon::prelude::*;

/// A run by its number, and an interval of its places.
type Covered = (u32, [i64; 2]);

/// The candidates on runs: their run, and their place; ascending.
pub(super) fn uncovered(runs: &Runs, ground: &Ground) -> Result<Vec<(u32, i32)>, Rejection> {
    let rules = &ground.rules.stitch;
    let runs = &runs.runs;
    let met = near_bodies(runs, ground)?;
    let by_edges = match &ground.facing {
        Some(facing) => by_edges(runs, facing)?,
        None => Vec::new(),
    };
    let on_run = |(number, run): (u32, &Run)| {
        let by_bodies = own(&met, number, |pair| pair[0]).iter().flat_map(|pair| {
            let within = ground.within_of(ground.features[pair[1] as usize]);
            covered_by(run, &ground.bodies, pair[1], within)
        });
        let by_edges = own(&by_edges, number, |one| one.0).iter();
        let mut covered: Vec<[i64; 2]> = by_bodies.chain(by_edges.map(|one| one.1)).collect();
        covered.sort_unstable();
        let places = places(run, &covered, rules);
        places.into_iter().map(move |place| (number, place))
    };
    let numbers = (0..runs.len() as u32).into_par_iter();
    let found: Vec<(u32, i32)> = numbers.zip(runs).flat_map_iter(on_run).collect();
    drop((met, by_edges));
    let line = |&(run, place): &(u32, i32)| runs[run as usize].line(place);
    let lines: Vec<Rect> = found.iter().map(line).collect();
    let hit = ground.kept_out(&lines)?;
    let free = found.into_iter().zip(hit).filter(|(_, hit)| hit.is_none());
    let mut kept: Vec<(u32, i32)> = Vec::new();
    for ((run, place), _) in free {
        let far = |before: &(u32, i32)| {
            let room = i64::from(place) - i64::from(before.1);
            before.0 != run || room >= i64::from(rules.fragment_length)
        };
        if kept.last().is_none_or(far) {
            kept.push((run, place));
        }
    }
    Ok(kept)
}

/// The middles of the rows of places that are not covered, as far as they are legal; ascending.
fn places(run: &Run, covered: &[[i64; 2]], rules: &StitchRules) -> Vec<i32> {
    let [from, to] = [run.along.min.x, run.along.max.x].map(i64::from);
    let mut found: Vec<i32> = Vec::new();
    let mut start = from;
    for &[first, last] in covered.iter().chain(&[[to + 1, to + 1]]) {
        let end = first - 1;
        if start <= end {
            let dead_end = (start == from && !run.goes_on[0]) || (end == to && !run.goes_on[1]);
            let fits = end - start >= i64::from(rules.overlap);
            let place = (start + (end - start) / 2) as i32;
            if !dead_end && fits && run.objection(place, rules).is_none() {
                found.push(place);
            }
        }
        start = start.max(last + 1);
    }
    found
}

/// Of a list sorted by runs, what is one run's.
fn own<T>(list: &[T], run: u32, of: impl Fn(&T) -> u32) -> &[T] {
    let rest = &list[list.partition_point(|one| of(one) < run)..];
    let other = rest.iter().position(|one| of(one) != run);
    &rest[..other.unwrap_or(rest.len())]
}

/// The runs with the bodies of other features near them; sorted.
fn near_bodies(runs: &[Run], ground: &Ground) -> Result<Vec<[u32; 2]>, Rejection> {
    let count = runs.len() as u32;
    let mut boxes: Vec<Rect> = runs.iter().map(Run::area).collect();
    boxes.extend(&ground.bodies.boxes);
    let mut labels: Vec<u32> = runs.iter().map(|run| run.feature).collect();
    labels.extend(&ground.features);
    let near_run = |a, b| (a < count && count <= b).then(|| [a, b - count]);
    near::pairs(&boxes, &labels, ground.reach() - 1, near_run)
}

/// What edges and corners of other features cover of the runs; sorted.
fn by_edges(runs: &[Run], facing: &Facing) -> Result<Vec<Covered>, Rejection> {
    let region = |(owner, run): (u32, &Run)| Region {
        feature: run.feature,
        owner,
        rect: run.area(),
    };
    let regions: Vec<Region> = (0..).zip(runs).map(region).collect();
    let (mut parts, mut tips) = facing.within(&regions)?;
    let counts = [parts.len() as u32, tips.len() as u32];
    let (edges, corners) = (&facing.outlines.edges, &facing.outlines.corners);
    parts.extend((0..).zip(edges).map(|(edge, whole)| Part {
        owner: 0,
        edge,
        ends: whole.ends,
    }));
    tips.extend((0..corners.len() as u32).map(|corner| Tip { owner: 0, corner }));
    let labels: Vec<u32> = parts
        .iter()
        .map(|p| edges[p.edge as usize].feature)
        .collect();
    let mut covered = facing.parts(&parts, &labels, |a, b, [first, last]| {
        if counts[0] <= a || b < counts[0] {
            return None;
        }
        let Part { owner, edge, .. } = parts[a as usize];
        let edge = &edges[edge as usize];
        let places = match edge.upright == runs[owner as usize].upright {
            true => [i64::from(first) + 1, i64::from(last) - 1],
            false => [edge.at.into(); 2],
        };
        (places[0] <= places[1]).then_some((owner, places))
    })?;
    let labels: Vec<u32> = (tips.iter())
        .map(|tip| corners[tip.corner as usize].feature)
        .collect();
    covered.extend(facing.tips(&tips, &labels, |a, b| {
        if counts[1] <= a || b < counts[1] {
            return None;
        }
        let Tip { owner, corner } = tips[a as usize];
        let Point { x, y } = corners[corner as usize].at;
        let place = if runs[owner as usize].upright { y } else { x };
        Some((owner, [place.into(); 2]))
    })?);
    covered.par_sort_unstable();
    Ok(covered)
}

/// The places of a run that a body covers, as intervals.
fn covered_by(run: &Run, bodies: &Bodies, body: u32, within: Within) -> Vec<[i64; 2]> {
    if bodies.is_rect(body) {
        let area = bodies.boxes[body as usize];
        return by_rect(run, area, within).into_iter().collect();
    }
    let corners = bodies.corners(body);
    edges(&corners)
        .filter_map(|edge| by_edge(run, edge, within))
        .collect()
}

fn by_rect(run: &Run, area: Rect, within: Within) -> Option<[i64; 2]> {
    let [area, along] = [run.turned(area), run.along];
    let gap = |low: i32, high: i32| (i64::from(low) - i64::from(high)).max(0);
    let across = gap(area.min.y, along.max.y).max(gap(along.min.y, area.max.y));
    let spacing = i64::from(within.spacing);
    if across >= spacing {
        return None;
    }
    let beyond = match within.metric {
        // The largest number of which the square is less than what is left of the square of the spacing.
        Metric::Euclidean => (spacing * spacing - across * across - 1).isqrt(),
        Metric::Square => spacing - 1,
    };
    let first = (i64::from(area.min.x) - beyond).max(along.min.x.into());
    let last = (i64::from(area.max.x) + beyond).min(along.max.x.into());
    (first <= last).then_some([first, last])
}

fn by_edge(run: &Run, edge: Edge, within: Within) -> Option<[i64; 2]> {
    let Rect {
        min: low,
        max: high,
    } = run.along;
    let edge = edge.map(|p| run.turned(Rect { min: p, max: p }).min);
    let is_covered = |place: i64| {
        let x = place as i32;
        segments_closer([Point::new(x, low.y), Point::new(x, high.y)], edge, within)
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
