//! The straight runs of a feature along the axes, and which places on them may be cut.
//!
//! A run is a strip of the feature, from left to right or, in the mirror image at the line x = y, upwards, that is longer than
//! wide. At each end the feature stops (a line end), or goes on: another strip has a point in common with that side.

use super::strips;
use crate::audit::Rejection;
use crate::geometry::{Point, Rect};
use crate::layout::StitchRules;
use rayon::prelude::*;

/// A run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Run {
    /// Its feature.
    pub(super) feature: u32,
    /// Whether it runs along y.
    pub(super) upright: bool,
    /// The run, mirrored where it is upright: x is along it, y across.
    pub(super) along: Rect,
    /// Whether the feature goes on at its start and at its end.
    pub(super) goes_on: [bool; 2],
}

impl Run {
    /// What it covers.
    pub(super) fn area(&self) -> Rect {
        mirrored(self.along, self.upright)
    }

    /// What is given in coordinates of the layout in those along and across the run.
    pub(super) fn turned(&self, rect: Rect) -> Rect {
        mirrored(rect, self.upright)
    }

    /// The line across it at a place along.
    pub(super) fn line(&self, place: i32) -> Rect {
        let Rect { min, max } = self.along;
        mirrored(Rect::new(place, min.y, place, max.y), self.upright)
    }

    /// The place of a line, if it runs across from one side of the run to the other.
    pub(super) fn place_of(&self, line: Rect) -> Option<i32> {
        let (line, along) = (self.turned(line), self.along);
        let crosses = line.min.x == line.max.x
            && (along.min.x..=along.max.x).contains(&line.min.x)
            && [line.min.y, line.max.y] == [along.min.y, along.max.y];
        crosses.then_some(line.min.x)
    }

    /// What speaks against a cut at a place, or nothing: it is inside the run, its overlap ends on the run, at least the
    /// corner rule before a place where the feature goes on, and a line end is at least the smallest fragment length away.
    pub(super) fn objection(&self, place: i32, rules: &StitchRules) -> Option<String> {
        let (half, corner) = (i64::from(rules.overlap / 2), i64::from(rules.corner));
        let ends = [self.along.min.x, self.along.max.x];
        ends.into_iter()
            .zip(self.goes_on)
            .find_map(|(end, goes_on)| {
                let inwards = if end == self.along.min.x { 1 } else { -1 };
                let room = (i64::from(place) - i64::from(end)) * inwards;
                let (what, least) = match goes_on {
                    true => ("corner", half + corner),
                    false => ("line end", half.max(rules.fragment_length.into())),
                };
                let Point { x, y } = self.line(end).min;
                (room < least.max(1)).then(|| {
                    let least = least.max(1);
                    format!(
                        "it is {room} from the {what} at ({x}, {y}), at least {least} is needed"
                    )
                })
            })
    }
}

/// The mirror image at the line x = y, where it is wanted.
pub(super) fn mirrored(rect: Rect, is_wanted: bool) -> Rect {
    let turn = |p: Point| Point::new(p.y, p.x);
    match is_wanted {
        true => Rect {
            min: turn(rect.min),
            max: turn(rect.max),
        },
        false => rect,
    }
}

/// A rectangle grown by `half` to both sides of a line.
pub(super) fn widened(line: Rect, half: i32) -> Rect {
    let Rect { min, max } = line;
    let [dx, dy] = if min.x == max.x { [half, 0] } else { [0, half] };
    Rect::new(min.x - dx, min.y - dy, max.x + dx, max.y + dy)
}

/// The runs of some features, and the strips of these from left to right, both in the order of the features.
#[derive(Debug, Default)]
pub(super) struct Runs {
    pub(super) runs: Vec<Run>,
    pub(super) strips: Vec<(u32, Rect)>,
    /// For looking runs up: their feature, direction, lower and upper side, start and number, sorted.
    order: Vec<(u32, bool, i32, i32, i32, u32)>,
}

impl Runs {
    /// Of the features, with their rectangles; of those that are made of something else as well there are none.
    pub(super) fn new(features: Vec<(u32, Option<Vec<Rect>>)>) -> Result<Runs, Rejection> {
        let found: Vec<(u32, Vec<Rect>, Vec<Run>)> = (features.into_par_iter())
            .filter_map(|(feature, rects)| Some((feature, rects?)))
            .map(|(feature, rects)| {
                let found = of_feature(feature, &rects);
                let (strips, runs) = found.ok_or_else(|| strips::too_many(&rects))?;
                Ok((feature, strips, runs))
            })
            .collect::<Result<_, Rejection>>()?;
        let mut all = Runs::default();
        for (feature, strips, runs) in found {
            all.runs.extend(runs);
            all.strips
                .extend(strips.into_iter().map(|strip| (feature, strip)));
        }
        Ok(all)
    }

    /// The same, in which [`Runs::across`] finds runs.
    pub(super) fn ordered(mut self) -> Runs {
        let key = |(number, run): (u32, &Run)| {
            let Rect { min, max } = run.along;
            (run.feature, run.upright, min.y, max.y, min.x, number)
        };
        self.order = (0..).zip(&self.runs).map(key).collect();
        self.order.par_sort_unstable();
        self
    }

    /// The run of a feature that a line crosses from one side to the other, with its number, and where.
    pub(super) fn across(&self, feature: u32, line: Rect) -> Option<(u32, &Run, i32)> {
        let upright = line.min.y == line.max.y;
        let Rect { min, max } = mirrored(line, upright);
        let key = (feature, upright, min.y, max.y, min.x, u32::MAX);
        let before = self.order.partition_point(|run| *run <= key);
        let number = self.order[..before].last()?.5;
        let run = self.runs.get(number as usize)?;
        let place = (run.feature == feature && run.upright == upright)
            .then(|| run.place_of(line))
            .flatten()?;
        Some((number, run, place))
    }
}

/// The strips from left to right of a feature that is made of rectangles, and its runs; none where there are too many.
fn of_feature(feature: u32, rects: &[Rect]) -> Option<(Vec<Rect>, Vec<Run>)> {
    let turned: Vec<Rect> = rects.iter().map(|&rect| mirrored(rect, true)).collect();
    let strips = strips::of_rects(rects)?;
    let mut runs = along(feature, false, &strips);
    runs.extend(along(feature, true, &strips::of_rects(&turned)?));
    Some((strips, runs))
}

fn along(feature: u32, upright: bool, strips: &[Rect]) -> Vec<Run> {
    let sides = |x: fn(&Rect) -> i32| {
        let side = |strip: &Rect| (x(strip), strip.min.y, strip.max.y);
        let mut sides: Vec<(i32, i32, i32)> = strips.iter().map(side).collect();
        sides.sort_unstable();
        sides
    };
    let [left, right] = [sides(|strip| strip.min.x), sides(|strip| strip.max.x)];
    // Sides of the same kind and abscissa have no point in common: the highest that starts low enough tells.
    let meets = |sides: &[(i32, i32, i32)], x: i32, strip: &Rect| {
        let place = sides.partition_point(|side| (side.0, side.1) <= (x, strip.max.y));
        let last = sides[..place].last();
        last.is_some_and(|&(at, _, high)| at == x && strip.min.y <= high)
    };
    let long = strips.iter().filter(|strip| strip.width() > strip.height());
    let run = |strip: &Rect| Run {
        feature,
        upright,
        along: *strip,
        goes_on: [
            meets(&right, strip.min.x, strip),
            meets(&left, strip.max.x, strip),
        ],
    };
    long.map(run).collect()
}
