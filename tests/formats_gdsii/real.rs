//! The routed block against reference values.

use maskproof::formats::gdsii::{Request, read};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{LayerId, Shape};
use std::cell::RefCell;

pub const ROUTED: &[u8] = include_bytes!("../data/routed_sky130.gds");

const fn layer(layer: u16, datatype: u16) -> LayerId {
    LayerId { layer, datatype }
}

/// Shapes before merging, the sum of their areas, and the box of all: gdstk 1.0.2, `get_polygons` with
/// paths, layer by layer. No path of the block has a bend, so each is one polygon there as here.
const REFERENCE: [(LayerId, usize, i64, [i32; 4]); 5] = [
    (
        layer(67, 20),
        8321,
        9_505_593_350,
        [2760, 2635, 158240, 108885],
    ),
    (
        layer(66, 44),
        11946,
        345_239_400,
        [2935, 3110, 158065, 108505],
    ),
    (
        layer(67, 44),
        26831,
        775_415_900,
        [2905, 2635, 158095, 108885],
    ),
    (
        layer(68, 20),
        5540,
        9_143_098_850,
        [2760, 2480, 158240, 109780],
    ),
    (
        layer(69, 20),
        1726,
        486_424_000,
        [18310, 2535, 140670, 110685],
    ),
];

#[test]
fn shapes_are_those_of_gdstk() {
    for (id, count, area, bounds) in REFERENCE {
        let layout = read(ROUTED, &Request::new("routed", id)).unwrap();
        assert_eq!(layout.top, "register_block");
        assert_eq!(layout.unit_pm, 1000);
        assert_eq!(layout.shapes.len(), count, "{id}");
        let mut sum = 0;
        let mut all = [i32::MAX, i32::MAX, i32::MIN, i32::MIN];
        for shape in layout.shapes.iter() {
            let vertices = vertices(shape);
            let doubled: i64 = (0..vertices.len())
                .map(|i| {
                    let (a, b) = (vertices[i], vertices[(i + 1) % vertices.len()]);
                    i64::from(a.x) * i64::from(b.y) - i64::from(b.x) * i64::from(a.y)
                })
                .sum();
            sum += doubled.abs() / 2;
            for v in vertices {
                all = [
                    all[0].min(v.x),
                    all[1].min(v.y),
                    all[2].max(v.x),
                    all[3].max(v.y),
                ];
            }
        }
        assert_eq!((sum, all), (area, bounds), "{id}");
    }
}

fn vertices(shape: Shape<'_>) -> Vec<Point> {
    match shape {
        Shape::Polygon(vertices) => vertices.to_vec(),
        Shape::Rect(Rect { min, max }) => {
            vec![
                min,
                Point { x: max.x, y: min.y },
                max,
                Point { x: min.x, y: max.y },
            ]
        }
    }
}

#[test]
fn an_absent_layer_is_answered_with_those_present() {
    let error = read(ROUTED, &Request::new("routed", layer(67, 21))).unwrap_err();
    let message = error.to_string();
    assert!(
        message.contains("nothing is drawn on layer 67/21"),
        "{message}"
    );
    for present in [
        "66/44 (11946)",
        "67/20 (8321)",
        "67/44 (26831)",
        "69/20 (1726)",
    ] {
        assert!(message.contains(present), "{message}");
    }
    assert_eq!(error.position().cell.as_deref(), Some("register_block"));
}

#[test]
fn a_named_top_and_progress() {
    let calls = RefCell::new(Vec::new());
    let request = Request {
        top: Some("register_block"),
        progress: &|done, all| calls.borrow_mut().push((done, all)),
        ..Request::new("routed", layer(67, 20))
    };
    assert_eq!(read(ROUTED, &request).unwrap().shapes.len(), 8321);
    let size = ROUTED.len() as u64;
    assert_eq!(calls.borrow().last(), Some(&(size, size)));
}
