//! Runs at right angles whose stitches can trade places.
//!
//! Let a horizontal lane carry the part of a feature from t - h on, and a vertical lane the part of one from w - h on,
//! both towards larger places (those of the lanes). Where the first lies beyond the second along x and the second
//! beyond the first along y, their corners are nearest, dx = t - h - (far side of the vertical run) and
//! dy = w - h - (far side of the horizontal run) apart, and they are not close when dx^2 + dy^2 >= s^2. Both distances
//! shrink as stitches are pushed: t can go lower where w stays higher, so there is no lowest pair. In the
//! three other quadrants one of the two distances grows as its stitch is pushed, and the constraint is
//! monotone: t >= phi(w) or w >= phi(t) with a growing phi, or one that pushing only loosens.
//!
//! The trade is real only where legal places have 0 < dx, dy < s with dx^2 + dy^2 >= s^2: if dx >= s or dy >= s is
//! needed, each is a bound on one stitch alone. With the square metric max(dx, dy) >= s is just that, and
//! nothing is ever traded.

use super::lanes::Lane;
use crate::layout::rules::Metric;

/// Whether stitches of a horizontal and of a vertical lane, with half the overlap `half`, can trade places.
pub(super) fn trade(
    horizontal: &Lane,
    vertical: &Lane,
    half: i32,
    spacing: i32,
    metric: Metric,
) -> bool {
    if metric == Metric::Square {
        return false;
    }
    let largest = |lane: &Lane, other: &Lane| {
        let far = if lane.mirrored {
            -i64::from(other.run.low)
        } else {
            i64::from(other.run.high)
        };
        let start = far + i64::from(half);
        let place = lane.legal.last_up_to(start + i64::from(spacing) - 1)?;
        let gap = i64::from(place) - start;
        (gap > 0).then_some(gap)
    };
    let gaps = largest(horizontal, vertical).zip(largest(vertical, horizontal));
    let spacing = i64::from(spacing);
    gaps.is_some_and(|(dx, dy)| dx * dx + dy * dy >= spacing * spacing)
}
