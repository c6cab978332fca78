//! The order of points along Hilbert's space-filling curve: points near each other on the curve are near
//! each other on the plane, which makes packed trees tight and numberings spatial.
//!
//! Source: D. Hilbert, "Ueber die stetige Abbildung einer Linie auf ein Flaechenstueck" (1891); the
//! bit-by-bit rotation is the usual integer form of it.

use super::Rect;

/// The place of the cell (`x`, `y`) of a 2^32 x 2^32 grid along the curve.
pub fn index(mut x: u32, mut y: u32) -> u64 {
    let mut place = 0u64;
    for bit in (0..32).rev() {
        let rx = x >> bit & 1;
        let ry = y >> bit & 1;
        place = place << 2 | u64::from((3 * rx) ^ ry);
        if ry == 0 {
            if rx == 1 {
                x = !x;
                y = !y;
            }
            std::mem::swap(&mut x, &mut y);
        }
    }
    place
}

/// The place of the centre of `area` along the curve over the whole coordinate range. The centre is taken
/// at half a database unit, so that it needs no rounding.
pub fn centre(area: &Rect) -> u64 {
    let middle = |low: i32, high: i32| {
        // Both within 2^30 of zero: the shifted sum is between 0 and 2^32 - 1.
        (i64::from(low) + i64::from(high) + (1 << 31)).clamp(0, i64::from(u32::MAX)) as u32
    };
    index(
        middle(area.min.x, area.max.x),
        middle(area.min.y, area.max.y),
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Consecutive places are neighbours, and all cells of a square have different ones: that is the
    /// curve, whatever its orientation.
    #[test]
    fn the_curve_visits_every_cell_and_never_jumps() {
        let mut cells: Vec<(u64, u32, u32)> = (0..64)
            .flat_map(|x| (0..64).map(move |y| (index(x, y), x, y)))
            .collect();
        cells.sort_unstable();
        for (place, cell) in cells.iter().enumerate() {
            assert_eq!(cell.0, place as u64);
        }
        for two in cells.windows(2) {
            let step = two[0].1.abs_diff(two[1].1) + two[0].2.abs_diff(two[1].2);
            assert_eq!(step, 1);
        }
    }
}
