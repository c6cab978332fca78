//! The smallest movement of a feature along an axis that makes a distance large enough.
//!
//! While a rectangle moves along an axis, it is too close to another one over one interval of the way:
//! their distance across does not change, and the distance along decides. So the way is too close over a
//! union of intervals, and the smallest movement ends just behind those that hang together from the
//! start. Outlines with slanted edges are taken by their boxes first; a bisection with exact comparisons
//! then shortens the movement, not always to the smallest.

use super::gap::Region;
use super::repair::Movement;
use crate::geometry::Rect;

/// The four directions along the axes.
const DIRECTIONS: [[i32; 2]; 4] = [[1, 0], [-1, 0], [0, 1], [0, -1]];

/// The movements of feature `a` or of feature `b`, each given with its regions, by which the two are no
/// longer closer than `spacing`: the smallest one for each feature and direction, none longer than the
/// spacing; the shortest first, then that of the smaller box.
pub fn candidates(a: (u32, &[Region]), b: (u32, &[Region]), spacing: i32) -> Vec<Movement> {
    let mut found = Vec::new();
    for ((feature, moved), (_, still)) in [(a, b), (b, a)] {
        let size = bounds(moved).map_or(0, |area| area.width() + area.height());
        for (turn, direction) in DIRECTIONS.into_iter().enumerate() {
            if let Some(d) = least(moved, still, direction, spacing) {
                let by = direction.map(|step| step * d);
                found.push((d, size, feature, turn, Movement { feature, by }));
            }
        }
    }
    found.sort_unstable();
    found.into_iter().map(|(.., movement)| movement).collect()
}

fn bounds(regions: &[Region]) -> Option<Rect> {
    let boxes = regions.iter().map(Region::bounds);
    boxes.reduce(|all, one| all.union(&one))
}

/// The smallest movement of `moved` along `direction`, at most the spacing.
fn least(moved: &[Region], still: &[Region], direction: [i32; 2], spacing: i32) -> Option<i32> {
    let reach = bounds(moved)?.grown(spacing).grown(spacing);
    let mut close: Vec<[i64; 2]> = Vec::new();
    for other in still.iter().map(Region::bounds) {
        if other.touches(&reach) {
            let along = |rect: &Rect| aligned(rect, direction);
            let ways = moved.iter().map(Region::bounds);
            close.extend(ways.filter_map(|one| interval(along(&one), along(&other), spacing)));
        }
    }
    close.sort_unstable();
    let mut d = 1;
    for [from, to] in close {
        if from > d {
            break;
        }
        d = d.max(to + 1);
    }
    let d = i32::try_from(d).ok().filter(|&d| d <= spacing)?;
    let is_slanted = |region: &Region| matches!(region, Region::Outline(_));
    if moved.iter().chain(still).any(is_slanted) {
        return Some(shortened(moved, still, direction, spacing, d));
    }
    Some(d)
}

/// A rectangle as [along from, along to, across from, across to], looking along the direction.
fn aligned(rect: &Rect, [dx, dy]: [i32; 2]) -> [i64; 4] {
    let [x0, y0, x1, y1] = [rect.min.x, rect.min.y, rect.max.x, rect.max.y].map(i64::from);
    match (dx, dy) {
        (1, _) => [x0, x1, y0, y1],
        (-1, _) => [-x1, -x0, y0, y1],
        (_, 1) => [y0, y1, x0, x1],
        _ => [-y1, -y0, x0, x1],
    }
}

/// The movements of `a` along the axis that leave it closer than `spacing` to `b`: from and to.
fn interval(a: [i64; 4], b: [i64; 4], spacing: i32) -> Option<[i64; 2]> {
    let across = (b[2] - a[3]).max(a[2] - b[3]).max(0);
    let spacing = i64::from(spacing);
    if across >= spacing {
        return None;
    }
    // The largest integer whose square is below s^2 - across^2.
    let beyond = (spacing * spacing - across * across - 1).isqrt();
    Some([b[0] - a[1] - beyond, b[1] - a[0] + beyond])
}

/// A movement of at most `enough`, which suffices, that suffices too.
fn shortened(
    moved: &[Region],
    still: &[Region],
    direction: [i32; 2],
    spacing: i32,
    enough: i32,
) -> i32 {
    let is_close = |d: i32| {
        let by = direction.map(|step| step * d);
        let pair = |one: &Region| {
            let there = one.moved(by);
            there.is_none_or(|one| still.iter().any(|other| one.is_closer(other, spacing)))
        };
        moved.iter().any(pair)
    };
    let (mut low, mut high) = (0, enough);
    while high - low > 1 {
        let middle = low + (high - low) / 2;
        if is_close(middle) {
            low = middle;
        } else {
            high = middle;
        }
    }
    high
}
