//! Paths against areas worked out by hand, against a plain restatement of what is drawn, and against
//! the length of its sides.
//!
//! Beside these tests, gdstk 1.0.2 was given 600 random paths of all types once: the union of its
//! polygons and ours had no difference along the axes and none a database unit wide at multiples of 45
//! degrees (round ends apart there by less than a unit too); at other angles they differ where a sharp
//! turn makes gdstk's single outline cross itself.

use super::help::*;
use maskproof::formats::gdsii::writer::PathStyle;
use maskproof::geometry::{Point, Rect};
use maskproof::layout::Shapes;
use rand::{Rng, SeedableRng};

fn style(kind: i16, width: i32) -> PathStyle {
    PathStyle {
        kind,
        width,
        extensions: None,
    }
}

fn draw(style: PathStyle, line: &[Point]) -> Shapes {
    layout(&one_cell(|w| w.path(LAYER, style, line).unwrap()))
        .unwrap()
        .shapes
}

#[test]
fn straight_paths_by_type() {
    let line = [p(0, 0), p(30, 0)];
    assert_eq!(rects(&draw(style(0, 10), &line)), [rect(0, -5, 30, 5)]);
    assert_eq!(rects(&draw(style(2, 10), &line)), [rect(-5, -5, 35, 5)]);
    let custom = |begin, end| PathStyle {
        extensions: Some([begin, end]),
        ..style(4, 10)
    };
    assert_eq!(rects(&draw(custom(7, 0), &line)), [rect(-7, -5, 30, 5)]);
    assert_eq!(rects(&draw(custom(-3, 11), &line)), [rect(3, -5, 41, 5)]);
    assert_eq!(rects(&draw(style(4, 10), &line)), [rect(0, -5, 30, 5)]);
    let up = [p(0, 30), p(0, 10), p(0, 0)];
    assert_eq!(rects(&draw(style(2, 10), &up)), [rect(-5, -5, 5, 35)]);
}

#[test]
fn bent_paths_by_hand() {
    // An L of arms 30 and 20, width 10: two rectangles that share the corner square. To the outside
    // (35 + 25) * 10 - 10 * 10 = 500 without caps.
    let line = [p(0, 0), p(30, 0), p(30, 20)];
    let window = rect(-20, -20, 60, 60);
    assert_eq!(area(&draw(style(0, 10), &line), window), 500);
    assert_eq!(area(&draw(style(2, 10), &line), window), 600);
    assert_eq!(draw(style(0, 10), &line).len(), 2);
    // A staircase whose middle arm of 4 is shorter than half the width: 30 x 10 flush, as far as the
    // right side of the arm, the same beyond its left side, 4 higher.
    let stairs = [p(0, 0), p(30, 0), p(30, 4), p(60, 4)];
    assert_eq!(
        area(&draw(style(0, 10), &stairs), rect(-20, -20, 80, 40)),
        35 * 10 + 35 * 10 - 10 * 6
    );
    // A line that turns back is drawn once, with half the width more where it turns.
    let back = [p(0, 0), p(30, 0), p(10, 0)];
    assert_eq!(area(&draw(style(0, 10), &back), window), 35 * 10);
    // Repeated points and points inside a straight run are no bends.
    let same = [p(0, 0), p(0, 0), p(10, 0), p(30, 0), p(30, 0)];
    assert_eq!(rects(&draw(style(0, 10), &same)), [rect(0, -5, 30, 5)]);
}

/// What the head of the module says, square by square.
fn restated(line: &[Point], half: i32, x: i32, y: i32) -> bool {
    // Doubled coordinates, so that the square's middle is an integer point.
    let at = p(2 * x + 1, 2 * y + 1);
    let rel = |q: Point| p(at.x - 2 * q.x, at.y - 2 * q.y);
    let dot = |a: Point, b: Point| a.x * b.x + a.y * b.y;
    let unit = |a: Point, b: Point| p((b.x - a.x).signum(), (b.y - a.y).signum());
    let in_segment = line.windows(2).any(|s| {
        let d = unit(s[0], s[1]);
        let across = p(-d.y, d.x);
        dot(rel(s[0]), d) > 0 && dot(rel(s[1]), d) < 0 && dot(rel(s[0]), across).abs() < 2 * half
    });
    in_segment
        || line.windows(3).any(|b| {
            let (d, e) = (unit(b[0], b[1]), unit(b[1], b[2]));
            let r = rel(b[1]);
            match dot(d, e) {
                // Straight on: no bend.
                1 => false,
                // Back: half the width more.
                -1 => {
                    let across = p(-d.y, d.x);
                    (1..2 * half).contains(&dot(r, d)) && dot(r, across).abs() < 2 * half
                }
                // The outer corner is ahead of the first segment and behind the second.
                _ => (1..2 * half).contains(&dot(r, d)) && (1..2 * half).contains(&-dot(r, e)),
            }
        })
}

#[test]
fn random_paths_along_the_axes_are_as_restated() {
    let mut random = rand_pcg::Pcg64::seed_from_u64(11);
    for _ in 0..400 {
        let half = random.random_range(1..6);
        let mut line = vec![p(0, 0)];
        for _ in 0..random.random_range(1..7) {
            let last = line[line.len() - 1];
            let step = random.random_range(-9..10);
            let along_x = random.random();
            line.push(if along_x {
                p(last.x + step, last.y)
            } else {
                p(last.x, last.y + step)
            });
        }
        line.dedup();
        if line.len() < 2 {
            continue;
        }
        let shapes = draw(style(0, 2 * half), &line);
        for x in -65..65 {
            for y in -65..65 {
                let drawn = shapes.iter().any(|shape| covers(shape, x, y));
                assert_eq!(
                    drawn,
                    restated(&line, half, x, y),
                    "({x}, {y}) of {line:?}, {half}"
                );
            }
        }
    }
}

/// The shoelace area of each piece; pieces of one straight or bent path only touch here.
fn piece_areas(shapes: &Shapes) -> Vec<f64> {
    shapes
        .iter()
        .map(|shape| match shape {
            maskproof::layout::Shape::Rect(Rect { min, max }) => {
                f64::from(max.x - min.x) * f64::from(max.y - min.y)
            }
            maskproof::layout::Shape::Polygon(v) => {
                let twice: f64 = (0..v.len())
                    .map(|i| {
                        let (a, b) = (v[i], v[(i + 1) % v.len()]);
                        f64::from(a.x) * f64::from(b.y) - f64::from(b.x) * f64::from(a.y)
                    })
                    .sum();
                twice.abs() / 2.0
            }
        })
        .collect()
}

fn close(found: f64, expected: f64, relative: f64) {
    assert!(
        (found - expected).abs() <= relative * expected,
        "{found} against {expected}"
    );
}

#[test]
fn slanted_paths_are_rounded_by_less_than_a_unit() {
    // Length 5000, exactly: (3000, 4000). Corners are integers: the normal of half 500 is (-400, 300).
    let shapes = draw(style(0, 1000), &[p(0, 0), p(3000, 4000)]);
    assert_eq!(piece_areas(&shapes), [5_000_000.0]);
    let extended = draw(style(2, 1000), &[p(0, 0), p(3000, 4000)]);
    assert_eq!(piece_areas(&extended), [6_000_000.0]);
    // At 45 degrees corners are rounded: relative error below 2 units in the width.
    let diagonal = draw(style(0, 1000), &[p(0, 0), p(10_000, 10_000)]);
    close(
        piece_areas(&diagonal)[0],
        1000.0 * 200_000_000f64.sqrt(),
        0.002,
    );
}

#[test]
fn bends_are_mitered_up_to_a_right_angle() {
    // A turn by t adds a kite of two right triangles with the sides h and h tan(t / 2).
    let h = 10_000f64;
    let kite = |line: [Point; 3]| {
        let mut areas = piece_areas(&draw(style(0, 20_000), &line));
        areas.sort_by(f64::total_cmp);
        areas[0]
    };
    let at_45 = kite([p(0, 0), p(100_000, 0), p(200_000, 100_000)]);
    close(at_45, h * h * (std::f64::consts::PI / 8.0).tan(), 1e-3);
    let right = kite([p(0, 0), p(60_000, 80_000), p(140_000, 20_000)]);
    close(right, h * h, 1e-3);
    // A turn by 135 degrees: two squares run on, h by h, and the triangle between them, cut off at h.
    // Corners (0,0), (0,h), (h,h), then h (cos, sin) of the second side, by the shoelace formula.
    let sharp = kite([p(0, 0), p(100_000, 0), p(0, 100_000)]);
    let s = 0.5f64.sqrt();
    let second = (s * h, s * h);
    let ahead_of_second = (second.0 + s * h, second.1 - s * h);
    let corners = [(0.0, 0.0), (0.0, -h), (h, -h), ahead_of_second, second];
    let twice: f64 = (0..5)
        .map(|i| {
            let (a, b) = (corners[i], corners[(i + 1) % 5]);
            a.0 * b.1 - b.0 * a.1
        })
        .sum();
    close(sharp, twice.abs() / 2.0, 1e-3);
}

#[test]
fn round_ends_are_half_discs() {
    let shapes = draw(style(1, 2000), &[p(0, 0), p(5000, 0)]);
    let areas = piece_areas(&shapes);
    assert_eq!(areas[0], 10_000_000.0);
    // Half of a regular 32-gon of radius 1000.
    let half_polygon = 8.0 * 1e6 * (std::f64::consts::PI / 16.0).sin() * 2.0 / 2.0;
    close(areas[1], half_polygon, 1e-3);
    close(areas[2], half_polygon, 1e-3);
    for shape in shapes.iter() {
        if let maskproof::layout::Shape::Polygon(v) = shape {
            assert_eq!(v.len(), 17);
            assert!(
                v.iter().all(|q| q.x <= 0 || q.x >= 5000),
                "the ends are outside"
            );
        }
    }
    // Tiny ones lose corners, not their sense.
    assert!(draw(style(1, 2), &[p(0, 0), p(7, 0)]).len() <= 3);
}

#[test]
fn widths_follow_magnification_unless_absolute() {
    let placed = |width| {
        let bytes = library(|w| {
            cell(w, "wire", |w| {
                w.path(LAYER, style(0, width), &[p(0, 0), p(10, 0)])
                    .unwrap()
            });
            cell(w, "top", |w| {
                w.sref("wire", turned(false, 0), 3, p(0, 0)).unwrap();
                w.sref("wire", turned(false, 1), 2, p(100, 0)).unwrap();
            });
        });
        rects(&layout(&bytes).unwrap().shapes)
    };
    assert_eq!(placed(4), [rect(0, -6, 30, 6), rect(96, 0, 104, 20)]);
    assert_eq!(placed(-4), [rect(0, -2, 30, 2), rect(98, 0, 102, 20)]);
    let top = draw(style(0, -4), &[p(0, 0), p(10, 0)]);
    assert_eq!(rects(&top), [rect(0, -2, 10, 2)]);
}

#[test]
fn paths_without_width_draw_nothing() {
    let bytes = one_cell(|w| {
        w.path(LAYER, style(0, 0), &[p(0, 0), p(10, 0)]).unwrap();
        w.rect(LAYER, rect(0, 0, 1, 1)).unwrap();
    });
    assert_eq!(layout(&bytes).unwrap().shapes.len(), 1);
}

#[test]
fn bad_paths_are_refused() {
    let wrong = |style: PathStyle, line: &[Point]| {
        error(&one_cell(|w| w.path(LAYER, style, line).unwrap()))
    };
    let line = [p(0, 0), p(30, 0)];
    assert!(wrong(style(0, 9), &line).contains("path width 9 is odd"));
    assert!(wrong(style(0, i32::MIN + 1), &line).contains("path width 2147483647 is odd"));
    assert!(wrong(style(3, 10), &line).contains("path type 3"));
    assert!(wrong(style(0, 10), &[p(5, 5), p(5, 5)]).contains("two different points"));
    assert!(wrong(style(0, 10), &[p(5, 5)]).contains("1 points: it must have at least 2"));
    let eaten = PathStyle {
        extensions: Some([-10, -20]),
        ..style(4, 10)
    };
    assert!(wrong(eaten, &line).contains("extensions -10 and -20 leave nothing"));
    assert!(wrong(style(0, i32::MIN), &[p(0, 1), p(30, 1)]).contains("out of range"));
    assert!(wrong(style(0, 10), &[p(0, 0), p(i32::MAX, 5)]).contains("out of range"));
    let far = PathStyle {
        extensions: Some([0, i32::MAX]),
        ..style(4, 10)
    };
    assert!(wrong(far, &line).contains("out of range"));
}
