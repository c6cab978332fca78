//! References: orientations, arrays, tops, cycles, counts.

use super::help::*;
use maskproof::formats::gdsii::writer::Writer;
use maskproof::formats::gdsii::{Orientation, Request, read};
use maskproof::geometry::Rect;
use maskproof::layout::LayerId;

#[test]
fn the_eight_orientations_by_hand() {
    // The rectangle (1, 2) to (4, 3), placed at (100, 200).
    const TABLE: [(bool, u8, [i32; 4]); 8] = [
        (false, 0, [101, 202, 104, 203]),
        (false, 1, [97, 201, 98, 204]),
        (false, 2, [96, 197, 99, 198]),
        (false, 3, [102, 196, 103, 199]),
        (true, 0, [101, 197, 104, 198]),
        (true, 1, [102, 201, 103, 204]),
        (true, 2, [96, 202, 99, 203]),
        (true, 3, [97, 196, 98, 199]),
    ];
    for (reflected, turns, [x0, y0, x1, y1]) in TABLE {
        let bytes = library(|w| {
            cell(w, "leaf", |w| w.rect(LAYER, rect(1, 2, 4, 3)).unwrap());
            cell(w, "top", |w| {
                w.sref("leaf", turned(reflected, turns), 1, p(100, 200))
                    .unwrap()
            });
        });
        let shapes = layout(&bytes).unwrap().shapes;
        assert_eq!(
            rects(&shapes),
            [rect(x0, y0, x1, y1)],
            "{reflected} {turns}"
        );
    }
}

#[test]
fn nested_references_compose() {
    // leaf (0,0)-(2,1) -> mid: turned left, doubled, at (10, 0): (8,0)-(10,4)
    // -> top: reflected (y to -y), at (0, 100): (8,96)-(10,100).
    let bytes = library(|w| {
        cell(w, "top", |w| {
            w.sref("mid", turned(true, 0), 1, p(0, 100)).unwrap()
        });
        cell(w, "mid", |w| {
            w.sref("leaf", turned(false, 1), 2, p(10, 0)).unwrap()
        });
        cell(w, "leaf", |w| w.rect(LAYER, rect(0, 0, 2, 1)).unwrap());
    });
    assert_eq!(
        rects(&layout(&bytes).unwrap().shapes),
        [rect(8, 96, 10, 100)]
    );
}

#[test]
fn arrays_are_stepped_in_transformed_coordinates() {
    let bytes = library(|w| {
        cell(w, "leaf", |w| w.rect(LAYER, rect(0, 0, 2, 1)).unwrap());
        cell(w, "top", |w| {
            let points = [p(10, 10), p(10, 40), p(-10, 10)];
            w.aref("leaf", turned(false, 1), [3, 2], points).unwrap();
        });
    });
    let mut expected = Vec::new();
    for column in 0..3 {
        for row in 0..2 {
            let (x, y) = (10 - 10 * row, 10 + 10 * column);
            expected.push(rect(x - 1, y, x, y + 2));
        }
    }
    expected.sort();
    assert_eq!(rects(&layout(&bytes).unwrap().shapes), expected);
}

#[test]
fn polygons_and_boxes_are_placed_too() {
    let triangle = [p(0, 0), p(4, 0), p(0, 2)];
    let bytes = library(|w| {
        cell(w, "leaf", |w| {
            w.boundary(LAYER, &triangle).unwrap();
            w.box_element(LAYER, rect(5, 5, 6, 7)).unwrap();
            w.text(LAYER, p(0, 0), "not drawn").unwrap();
            w.rect(
                LayerId {
                    layer: 9,
                    datatype: 9,
                },
                rect(0, 0, 1, 1),
            )
            .unwrap();
        });
        cell(w, "top", |w| {
            w.sref("leaf", turned(false, 2), 1, p(0, 0)).unwrap()
        });
    });
    let shapes = layout(&bytes).unwrap().shapes;
    assert_eq!(shapes.len(), 2);
    let turned = [p(0, 0), p(-4, 0), p(0, -2)];
    assert_eq!(shapes.get(0), maskproof::layout::Shape::Polygon(&turned));
    assert_eq!(
        shapes.get(1),
        maskproof::layout::Shape::Rect(rect(-6, -7, -5, -5))
    );
}

#[test]
fn tops_are_chosen_or_listed() {
    let bytes = library(|w| {
        for name in ["chip", "$$$CONTEXT$$$"] {
            cell(w, name, |w| w.rect(LAYER, rect(0, 0, 1, 1)).unwrap());
        }
    });
    let message = error(&bytes);
    assert!(
        message.contains("several top cells: chip, $$$CONTEXT$$$; choose one with --top"),
        "{message}"
    );
    let request = Request {
        top: Some("chip"),
        ..Request::new("f.gds", LAYER)
    };
    assert_eq!(read(&bytes, &request).unwrap().top, "chip");
    let request = Request {
        top: Some("chop"),
        ..Request::new("f.gds", LAYER)
    };
    let message = read(&bytes, &request).unwrap_err().to_string();
    assert!(
        message.contains("no cell \"chop\": top cells are chip, $$$CONTEXT$$$"),
        "{message}"
    );
    assert!(error(&library(|_| ())).contains("the library has no cells"));
}

#[test]
fn broken_hierarchies_are_refused() {
    let place =
        |w: &mut Bytes, name: &str| w.sref(name, Orientation::default(), 1, p(0, 0)).unwrap();
    let cycle = library(|w| {
        cell(w, "top", |w| place(w, "a"));
        cell(w, "a", |w| place(w, "b"));
        cell(w, "b", |w| place(w, "a"));
    });
    assert!(
        error(&cycle).contains("cell \"b\": cells contain each other: a places b places a;"),
        "{}",
        error(&cycle)
    );
    let itself = library(|w| cell(w, "a", |w| place(w, "a")));
    assert!(error(&itself).contains("a places a;"));
    let aside = library(|w| {
        cell(w, "top", |w| w.rect(LAYER, rect(0, 0, 1, 1)).unwrap());
        cell(w, "a", |w| place(w, "a"));
    });
    assert!(error(&aside).contains("a places a;"));
    let missing = library(|w| cell(w, "top", |w| place(w, "ghost")));
    assert!(error(&missing).contains("cell \"top\": cell \"ghost\" is placed but not defined"));
    let twice = library(|w| {
        cell(w, "a", |w| w.rect(LAYER, rect(0, 0, 1, 1)).unwrap());
        cell(w, "a", |w| w.rect(LAYER, rect(0, 0, 1, 1)).unwrap());
    });
    assert!(error(&twice).contains("second cell \"a\", after the one at byte"));
}

#[test]
fn arrays_that_make_no_sense_are_refused() {
    let array = |size, points| {
        library(|w: &mut Bytes| {
            cell(w, "leaf", |w| w.rect(LAYER, rect(0, 0, 2, 1)).unwrap());
            cell(w, "top", |w| {
                w.aref("leaf", Orientation::default(), size, points)
                    .unwrap()
            });
        })
    };
    let points = [p(0, 0), p(30, 0), p(0, 30)];
    assert!(error(&array([0, 1], points)).contains("array of 0 columns and 1 rows"));
    assert!(error(&array([3, -1], points)).contains("array of 3 columns and -1 rows"));
    let uneven = error(&array([4, 3], points));
    assert!(
        uneven.contains("array of cell \"leaf\" spans (30, 0) in 4 steps"),
        "{uneven}"
    );
    assert!(layout(&array([3, 3], points)).is_ok());
    assert!(layout(&array([1, 1], [p(0, 0), p(7, 0), p(0, 7)])).is_ok());
    let far = [p(0, 0), p(2_147_483_646, 0), p(0, 1)];
    assert!(
        error(&array([3, 1], far)).contains("out of range"),
        "{}",
        error(&array([3, 1], far))
    );
}

/// Six levels of 1000 x 1000 each: 10^36 shapes in a file of a kilobyte.
#[test]
fn absurd_counts_are_refused_before_memory_is_used() {
    let bytes = library(|w| {
        cell(w, "c0", |w| w.rect(LAYER, rect(0, 0, 2, 1)).unwrap());
        for level in 1..7 {
            cell(w, &format!("c{level}"), |w| {
                let points = [p(0, 0), p(1000, 0), p(0, 1000)];
                let below = format!("c{}", level - 1);
                w.aref(&below, Orientation::default(), [1000, 1000], points)
                    .unwrap();
            });
        }
    });
    let message = error(&bytes);
    assert!(message.contains("18446744073709551615 shapes"), "{message}");
    assert!(
        message.contains("at most 268435456 points and placements"),
        "{message}"
    );
    let request = Request {
        max_points: 10,
        ..Request::new("f.gds", LAYER)
    };
    let six = one_cell(|w| (0..6).for_each(|i| w.rect(LAYER, rect(i, 0, i + 1, 1)).unwrap()));
    let message = read(&six, &request).unwrap_err().to_string();
    assert!(
        message.contains("6 shapes with 12 points in 0 placements"),
        "{message}"
    );
}

#[test]
fn chains_of_cells_do_not_use_the_call_stack() {
    let depth = 200_000;
    let bytes = library(|w: &mut Writer<Vec<u8>>| {
        cell(w, "c0", |w| w.rect(LAYER, rect(0, 0, 2, 1)).unwrap());
        for level in 1..depth {
            let below = format!("c{}", level - 1);
            cell(w, &format!("c{level}"), |w| {
                w.sref(&below, Orientation::default(), 1, p(1, 0)).unwrap();
            });
        }
    });
    let shapes = layout(&bytes).unwrap().shapes;
    assert_eq!(rects(&shapes), [rect(depth - 1, 0, depth + 1, 1)]);
}

#[test]
fn only_references_that_draw_are_judged() {
    let build = |leaf_layer: LayerId, angle: &[u8; 8]| {
        let bytes = library(|w| {
            cell(w, "leaf", |w| w.rect(leaf_layer, rect(0, 0, 2, 1)).unwrap());
            cell(w, "top", |w| {
                w.rect(LAYER, rect(0, 0, 1, 1)).unwrap();
                w.sref("leaf", turned(false, 1), 1, p(50, 0)).unwrap();
            });
        });
        // The writer only knows right angles: 90 is 42 5a 00 ...
        let right = [0x42, 0x5a, 0, 0, 0, 0, 0, 0];
        let at = bytes.windows(8).position(|window| window == right).unwrap();
        [&bytes[..at], angle, &bytes[at + 8..]].concat()
    };
    let slanted = [0x42, 0x2d, 0, 0, 0, 0, 0, 0];
    let message = error(&build(LAYER, &slanted));
    assert!(
        message.contains("cell \"leaf\" is placed at 45 degrees: only multiples of 90"),
        "{message}"
    );
    let other = LayerId {
        layer: 7,
        datatype: 7,
    };
    assert_eq!(layout(&build(other, &slanted)).unwrap().shapes.len(), 1);
    // 90.00000000000001, as a writer may say that counts in radians.
    let sloppy = [0x42, 0x5a, 0, 0, 0, 0, 0, 0x03];
    let expected: Vec<Rect> = vec![rect(0, 0, 1, 1), rect(49, 0, 50, 2)];
    assert_eq!(
        rects(&layout(&build(LAYER, &sloppy)).unwrap().shapes),
        expected
    );
}

#[test]
fn magnifications_are_whole_numbers() {
    let build = |mag: [u8; 8]| {
        let bytes = library(|w| {
            cell(w, "leaf", |w| w.rect(LAYER, rect(0, 0, 2, 1)).unwrap());
            cell(w, "top", |w| {
                w.sref("leaf", Orientation::default(), 3, p(0, 0)).unwrap()
            });
        });
        let three = [0x41, 0x30, 0, 0, 0, 0, 0, 0];
        let at = bytes.windows(8).position(|window| window == three).unwrap();
        [&bytes[..at], &mag, &bytes[at + 8..]].concat()
    };
    let shapes = layout(&build([0x41, 0x40, 0, 0, 0, 0, 0, 0]))
        .unwrap()
        .shapes;
    assert_eq!(rects(&shapes), [rect(0, 0, 8, 4)]);
    let half_more = error(&build([0x41, 0x18, 0, 0, 0, 0, 0, 0]));
    assert!(
        half_more.contains("magnification 1.5: a whole number from 1"),
        "{half_more}"
    );
    assert!(error(&build([0; 8])).contains("magnification 0"));
    assert!(error(&build([0xc1, 0x20, 0, 0, 0, 0, 0, 0])).contains("magnification -2"));
    assert!(error(&build([0x7f, 0xff, 0, 0, 0, 0, 0, 0])).contains("a whole number from 1"));
    // 2^30: the rectangle leaves the grid.
    assert!(error(&build([0x48, 0x40, 0, 0, 0, 0, 0, 0])).contains("out of range"));
}
