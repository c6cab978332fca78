//! PATH: a centre line drawn with a width.
//!
//! What is drawn is the union of
//!
//! - for each segment of the centre line, the rectangle along it, half the width to either side;
//! - at each bend, what completes its outer corner: up to 90 degrees the corner of the two outer sides
//!   (a miter), beyond that both sides run on by half the width and are joined;
//! - at the ends: nothing (type 0), a half disc (type 1), half the width more (type 2), or BGNEXTN and
//!   ENDEXTN (type 4, which may be negative).
//!
//! Points inside a straight run are no bends. Paths along the axes are exact and become rectangles, one
//! a segment where a rectangle can take its corner along. Other outlines are rounded to the grid
//! (see `path_outline`). A path of width 0, also one without WIDTH, draws nothing. Odd widths are
//! refused, since their outline lies between grid points. A negative width is absolute: references
//! magnify the centre line and the extensions, not the width.

use super::element::Element;
use super::path_outline::{Direction, draw_if_area, half_disc, join};
use super::problem::Problem;
use super::records::{Fault, Record};
use super::transform::{Transform, Vector};
use crate::geometry::Point;

/// A path to draw: two points or more, without repeated ones or points inside a straight run.
#[derive(Clone, Debug)]
pub(super) struct Path {
    points: Vec<Vector>,
    half: i64,
    caps: [Cap; 2],
    /// Whether the width is absolute.
    pub absolute: bool,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Cap {
    Flush,
    Round,
    HalfWidth,
    Extension(i32),
}

/// Takes each piece of a path.
pub(super) type Sink<'s> = dyn FnMut(&[Vector]) -> Result<(), Problem> + 's;

impl Path {
    /// The path of an element, `None` when it draws nothing. `points` is working memory.
    pub(super) fn read(
        element: &Element<'_>,
        points: &mut Vec<Point>,
    ) -> Result<Option<Path>, Fault> {
        element.points(points)?;
        let width = number(&element.width)?;
        let caps = caps(element)?;
        if points.len() < 2 {
            return Err(element.wrong(Problem::Points {
                element: "PATH",
                found: points.len(),
                expected: "at least 2",
            }));
        }
        if width == 0 {
            return Ok(None);
        }
        if width % 2 != 0 {
            return Err(element.wrong(Problem::OddWidth(width.unsigned_abs())));
        }
        for &point in points.iter() {
            let on_grid = Vector::from(point).on_grid();
            on_grid.map_err(|problem| element.wrong(problem))?;
        }
        let path = Path {
            points: centre_line(points),
            half: i64::from(width).abs() / 2,
            caps,
            absolute: width < 0,
        };
        if path.points.len() < 2 {
            return Err(element.wrong(Problem::NoLength));
        }
        Ok(Some(path))
    }

    /// The path placed by a reference, whose magnification an absolute width does not follow.
    pub(super) fn placed(&self, transform: &Transform) -> Path {
        let mut path = self.clone();
        path.points
            .iter_mut()
            .for_each(|p| *p = transform.apply(*p));
        for cap in &mut path.caps {
            if let Cap::Extension(extension) = cap {
                // Too long a one is refused where the outline leaves the grid.
                let longer = i64::from(*extension).saturating_mul(transform.magnification());
                *extension = longer.clamp(i32::MIN.into(), i32::MAX.into()) as i32;
            }
        }
        path
    }

    /// Draws the path piece by piece.
    pub(super) fn draw(&self, sink: &mut Sink<'_>) -> Result<(), Problem> {
        let segments = self.segments()?;
        for (i, segment) in segments.iter().enumerate() {
            let mut run_on = [0, 0];
            if i > 0 {
                run_on[0] = self.run_on(&segments[i - 1], segment).1;
            }
            if let Some(next) = segments.get(i + 1) {
                let (end, start) = self.run_on(segment, next);
                run_on[1] = end;
                if end == 0 && start == 0 {
                    join(
                        segment.to,
                        segment.direction,
                        next.direction,
                        self.half,
                        sink,
                    )?;
                }
            }
            draw_if_area(&segment.outline(self.half, run_on), sink)?;
        }
        let ends = [segments.first(), segments.last()];
        for (end, cap) in self.caps.iter().enumerate() {
            if let (Cap::Round, Some(segment)) = (cap, ends[end]) {
                let (at, direction) = match end {
                    0 => (segment.from, segment.direction.reversed()),
                    _ => (segment.to, segment.direction),
                };
                draw_if_area(&half_disc(at, direction, self.half), sink)?;
            }
        }
        Ok(())
    }

    /// The segments, those at the ends with their caps.
    fn segments(&self) -> Result<Vec<Segment>, Problem> {
        let last = self.points.len() - 2;
        let caps = self.caps.map(|cap| match cap {
            Cap::Flush | Cap::Round => 0,
            Cap::HalfWidth => self.half,
            Cap::Extension(extension) => extension.into(),
        });
        let mut segments = Vec::with_capacity(self.points.len() - 1);
        for (i, ends) in self.points.windows(2).enumerate() {
            let segment = Segment {
                from: ends[0],
                to: ends[1],
                direction: Direction::new(ends[1].minus(ends[0])),
                caps: [
                    if i == 0 { caps[0] } else { 0 },
                    if i == last { caps[1] } else { 0 },
                ],
            };
            if segment.length() <= 0 {
                let extension = |cap: i64| cap as i32;
                return Err(Problem::Extensions(extension(caps[0]), extension(caps[1])));
            }
            segments.push(segment);
        }
        Ok(segments)
    }

    /// How far two segments run on beyond the bend between them: the first at its end, the second at
    /// its start. Where one of them covers the inner side of the bend, the other one may run on and
    /// take the outer corner along; otherwise the corner is a piece of its own, and both are 0.
    fn run_on(&self, first: &Segment, second: &Segment) -> (i64, i64) {
        let (a, b) = (first.direction, second.direction);
        if !a.is_axial() || !b.is_axial() {
            (0, 0)
        } else if a.dot(b) != 0 || second.length() >= self.half {
            // The line turns back, or the second segment covers the inner side.
            (self.half, 0)
        } else if first.length() >= self.half {
            (0, self.half)
        } else {
            (0, 0)
        }
    }
}

/// A straight part of a path.
struct Segment {
    from: Vector,
    to: Vector,
    direction: Direction,
    /// What is added at either end, or taken off.
    caps: [i64; 2],
}

impl Segment {
    /// The length, rounded down, with the caps.
    fn length(&self) -> i64 {
        self.direction.length() + self.caps[0] + self.caps[1]
    }

    fn outline(&self, half: i64, run_on: [i64; 2]) -> [Vector; 4] {
        let [back, ahead] = [-(self.caps[0] + run_on[0]), self.caps[1] + run_on[1]];
        let corner = |at: Vector, along, across| at.plus(self.direction.offset(along, across));
        [
            corner(self.from, back, -half),
            corner(self.to, ahead, -half),
            corner(self.to, ahead, half),
            corner(self.from, back, half),
        ]
    }
}

fn number(record: &Option<Record<'_>>) -> Result<i32, Fault> {
    record.as_ref().map_or(Ok(0), Record::i32)
}

fn caps(element: &Element<'_>) -> Result<[Cap; 2], Fault> {
    let Some(record) = &element.pathtype else {
        return Ok([Cap::Flush; 2]);
    };
    Ok(match record.i16()? {
        0 => [Cap::Flush; 2],
        1 => [Cap::Round; 2],
        2 => [Cap::HalfWidth; 2],
        4 => [
            Cap::Extension(number(&element.begin_extension)?),
            Cap::Extension(number(&element.end_extension)?),
        ],
        other => return Err(Problem::PathType(other).at(record.offset)),
    })
}

/// The points without repeated ones and those inside a straight run.
fn centre_line(points: &[Point]) -> Vec<Vector> {
    let mut line: Vec<Vector> = Vec::with_capacity(points.len());
    for &point in points {
        let next = Vector::from(point);
        if line.last() == Some(&next) {
            continue;
        }
        if let &[.., a, b] = line.as_slice() {
            let (first, second) = (Direction::new(b.minus(a)), Direction::new(next.minus(b)));
            if first.cross(second) == 0 && first.dot(second) > 0 {
                line.pop();
            }
        }
        line.push(next);
    }
    line
}
