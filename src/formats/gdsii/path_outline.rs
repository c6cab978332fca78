//! Outlines along directions that leave the grid: integer arithmetic with fixed rounding.
//!
//! A corner is a point of the centre line plus a distance along the segment and one across it, divided
//! by the segment's length, a square root. The root is taken by integer square root of the squared
//! length, shifted up to 126 bits; distances carry 16 fraction bits; the sum is rounded to the nearest
//! integer, halves away from zero. Along the axes the root is exact, and so is everything; else a
//! corner is off by at most half a database unit and a rounding error below 1/1000 of one.
//!
//! A half disc is drawn as half of a regular polygon of 32 corners on its circle, rounded likewise.

use super::path::Sink;
use super::problem::Problem;
use super::transform::Vector;
use crate::geometry::Point;

/// Fraction bits of distances.
const FRACTION: u32 = 16;

/// A direction: a vector that is not 0, its coordinates at most 2^31 in size.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Direction(Vector);

impl Direction {
    pub(super) fn new(vector: Vector) -> Direction {
        Direction(vector)
    }

    pub(super) fn reversed(self) -> Direction {
        Direction(self.0.times(-1))
    }

    pub(super) fn is_axial(self) -> bool {
        self.0.x == 0 || self.0.y == 0
    }

    pub(super) fn dot(self, other: Direction) -> i128 {
        i128::from(self.0.x) * i128::from(other.0.x) + i128::from(self.0.y) * i128::from(other.0.y)
    }

    pub(super) fn cross(self, other: Direction) -> i128 {
        self.dot(Direction(other.0.left().times(-1)))
    }

    /// The length, rounded down.
    pub(super) fn length(self) -> i64 {
        self.dot(self).isqrt() as i64
    }

    /// The vector that goes `along` the direction and `across` it to the left.
    pub(super) fn offset(self, along: i64, across: i64) -> Vector {
        self.fine_offset(
            i128::from(along) << FRACTION,
            i128::from(across) << FRACTION,
        )
    }

    /// The same for distances with [`FRACTION`] fraction bits.
    fn fine_offset(self, along: i128, across: i128) -> Vector {
        let squared = self.dot(self);
        let shift = (squared.leading_zeros() - 2) / 2;
        let root = (squared << (2 * shift)).isqrt();
        let (x, y) = (i128::from(self.0.x), i128::from(self.0.y));
        let part = |value: i128| round_div(value << shift, root << FRACTION);
        Vector {
            x: part(along * x - across * y),
            y: part(along * y + across * x),
        }
    }
}

/// The integer nearest to a quotient, halves away from zero.
fn round_div(value: i128, divisor: i128) -> i64 {
    let size = (value.abs() + divisor / 2) / divisor;
    (if value < 0 { -size } else { size }) as i64
}

/// The piece that completes the outer corner of a bend at `at`, if it has an area.
pub(super) fn join(
    at: Vector,
    first: Direction,
    second: Direction,
    half: i64,
    sink: &mut Sink<'_>,
) -> Result<(), Problem> {
    let cross = first.cross(second);
    // The outer side is the right one of a left turn. Of a line that turns back, the left side of the
    // way there and the left side of the way back are the two sides of one end.
    let outer = if cross > 0 { -half } else { half };
    let half_fine = i128::from(half) << FRACTION;
    let outer_fine = i128::from(outer) << FRACTION;
    let corner = |offset: Vector| at.plus(offset);
    let (from, to) = (first.offset(0, outer), second.offset(0, outer));
    if first.dot(second) >= 0 {
        // The miter lies half * tan(turn / 2) ahead of the first segment's outer corner, and
        // tan(turn / 2) is cross / (product of the lengths + dot).
        let product = first.dot(first) as u128 * second.dot(second) as u128;
        let shift = (product.leading_zeros() - 2) / 2;
        let root = (product << (2 * shift)).isqrt() as i128;
        let sum = root + (first.dot(second) << shift);
        let ahead = (half_fine * (cross.abs() << shift) + sum / 2) / sum;
        let miter = first.fine_offset(ahead, outer_fine);
        return draw_if_area(&[at, corner(from), corner(miter), corner(to)], sink);
    }
    let ahead = first.fine_offset(half_fine, outer_fine);
    let behind = second.fine_offset(-half_fine, outer_fine);
    let piece = [at, corner(from), corner(ahead), corner(behind), corner(to)];
    draw_if_area(&piece, sink)
}

/// Draws a piece, unless rounding has left nothing of it.
pub(super) fn draw_if_area(piece: &[Vector], sink: &mut Sink<'_>) -> Result<(), Problem> {
    let mut points: Vec<Point> = Vec::with_capacity(piece.len());
    for corner in piece {
        points.push(corner.on_grid()?);
    }
    super::boundary::simplify(&mut points);
    if points.len() < 3 || super::boundary::doubled_area(&points) == 0 {
        return Ok(());
    }
    sink(&points.into_iter().map(Vector::from).collect::<Vec<_>>())
}

/// cos(k pi / 16) for k = 0 to 16, times 2^30, rounded.
const COSINES: [i128; 17] = [
    1_073_741_824,
    1_053_110_176,
    992_008_094,
    892_783_698,
    759_250_125,
    596_538_995,
    410_903_207,
    209_476_638,
    0,
    -209_476_638,
    -410_903_207,
    -596_538_995,
    -759_250_125,
    -892_783_698,
    -992_008_094,
    -1_053_110_176,
    -1_073_741_824,
];

/// The half disc of radius `half` around `at`, on the side of `direction`.
pub(super) fn half_disc(at: Vector, direction: Direction, half: i64) -> Vec<Vector> {
    let fine = |cosine: i128| {
        let product = i128::from(half) * cosine;
        i128::from(round_div(product << FRACTION, 1 << 30))
    };
    // The sine of k pi / 16 is the cosine of (8 - k) pi / 16.
    let corners = (0..=16usize).map(|k| {
        let (along, across) = (COSINES[k.abs_diff(8)], -COSINES[k]);
        at.plus(direction.fine_offset(fine(along), fine(across)))
    });
    corners.collect()
}
