//! The pieces that what lies between stitches is made of: runs, which stitches cut, and the rest of a
//! feature, which they never do.
//!
//! A horizontal run is a slab cell. A vertical run passes through one slab cell or more, which may go on beyond
//! its ends: what they are without it are pieces of their own.

use super::super::super::runs::{Direction, Run};
use super::super::Legal;
use crate::geometry::Rect;

/// The runs of a feature and the rest of its cells.
pub(super) fn pieces(cells: &[Rect], runs: &[(Run, Legal)]) -> Vec<Rect> {
    let mut found: Vec<Rect> = runs
        .iter()
        .map(|(run, _)| run.direction.turn(run.along()))
        .collect();
    // For each cell the stretches of y that are part of runs.
    let mut taken: Vec<(usize, i32, i32)> = Vec::new();
    for (run, _) in runs {
        match run.direction {
            Direction::Horizontal => {
                let corner = crate::geometry::Point::new(run.from, run.low);
                if let Ok(cell) = cells.binary_search_by_key(&corner, |cell| cell.min) {
                    taken.push((cell, run.low, run.high));
                }
            }
            Direction::Vertical => {
                let first = cells.partition_point(|cell| cell.min.x < run.low);
                let under = cells[first..].iter().take_while(|c| c.min.x < run.high);
                for (offset, cell) in under.enumerate() {
                    if cell.min.y <= run.from && run.to <= cell.max.y {
                        taken.push((first + offset, run.from, run.to));
                    }
                }
            }
        }
    }
    taken.sort_unstable();
    let mut rest = &taken[..];
    for (index, cell) in cells.iter().enumerate() {
        let (here, later) = rest.split_at(rest.partition_point(|t| t.0 == index));
        rest = later;
        let mut low = cell.min.y;
        for &(_, from, to) in here {
            if low < from {
                found.push(Rect::new(cell.min.x, low, cell.max.x, from));
            }
            low = low.max(to);
        }
        if low < cell.max.y {
            found.push(Rect::new(cell.min.x, low, cell.max.x, cell.max.y));
        }
    }
    found
}
