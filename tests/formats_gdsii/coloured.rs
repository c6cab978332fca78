//! The coloured copy.

use super::help::*;
use super::real::ROUTED;
use maskproof::formats::gdsii::coloured::Plan;
use maskproof::formats::gdsii::{Orientation, Request, read};
use maskproof::geometry::Point;
use maskproof::layout::{LayerId, Shape};

const MASKS: [LayerId; 2] = [
    LayerId {
        layer: 1,
        datatype: 101,
    },
    LayerId {
        layer: 1,
        datatype: 102,
    },
];

fn two_cells() -> Vec<u8> {
    library(|w| {
        cell(w, "top", |w| {
            w.rect(LAYER, rect(0, 0, 1, 1)).unwrap();
            w.sref("leaf", Orientation::default(), 1, p(0, 0)).unwrap();
        });
        cell(w, "leaf", |w| {
            w.text(
                LayerId {
                    layer: 5,
                    datatype: 6,
                },
                p(0, 0),
                "x",
            )
            .unwrap()
        });
    })
}

fn polygons() -> Vec<(u8, Vec<Point>)> {
    vec![
        (1, vec![p(0, 0), p(9, 0), p(9, 9), p(0, 9)]),
        (0, vec![p(0, 0), p(9, 0), p(0, 9)]),
        (1, vec![p(20, 20), p(29, 20), p(29, 29)]),
    ]
}

#[test]
fn the_input_is_kept_and_the_masks_are_added() {
    let bytes = [&two_cells()[..], &[0; 100]].concat();
    let plan = Plan::new(&bytes, "f.gds", "top", &MASKS).unwrap();
    let mut out = Vec::new();
    plan.write(polygons(), &mut out).unwrap();
    let mut again = Vec::new();
    plan.write(polygons(), &mut again).unwrap();
    assert_eq!(out, again);
    // The old layer reads as before, the new ones as given, in order.
    let old = layout(&out).unwrap();
    assert_eq!(rects(&old.shapes), [rect(0, 0, 1, 1)]);
    let second = read(&out, &Request::new("f.gds", MASKS[1])).unwrap();
    assert_eq!(second.shapes.get(0), Shape::Rect(rect(0, 0, 9, 9)));
    assert_eq!(second.shapes.get(1), Shape::Polygon(&polygons()[2].1));
    // Without what was added, nothing but the padding is gone.
    let mut nothing = Vec::new();
    plan.write(Vec::<(u8, Vec<Point>)>::new(), &mut nothing)
        .unwrap();
    assert_eq!(nothing, two_cells());
    assert!(plan.write([(2, vec![p(0, 0)])], &mut Vec::new()).is_err());
}

#[test]
fn occupied_layers_are_refused() {
    let bytes = two_cells();
    let on = |layer, datatype| {
        let masks = [LayerId { layer, datatype }];
        Plan::new(&bytes, "f.gds", "top", &masks)
            .map(|_| ())
            .map_err(|error| error.to_string())
    };
    assert!(
        on(1, 2)
            .unwrap_err()
            .contains("cell \"top\": output layer 1/2 is already in use here")
    );
    assert!(
        on(5, 6)
            .unwrap_err()
            .contains("cell \"leaf\": output layer 5/6 is already in use")
    );
    assert!(on(1, 3).is_ok());
    assert!(
        Plan::new(&bytes, "f.gds", "tip", &MASKS)
            .unwrap_err()
            .to_string()
            .contains("no cell \"tip\"")
    );
}

#[test]
fn the_real_block_can_be_coloured() {
    let masks = [101, 102].map(|datatype| LayerId {
        layer: 67,
        datatype,
    });
    let plan = Plan::new(ROUTED, "routed", "register_block", &masks).unwrap();
    let mut out = Vec::new();
    plan.write(polygons(), &mut out).unwrap();
    let li1 = LayerId {
        layer: 67,
        datatype: 20,
    };
    let before = read(ROUTED, &Request::new("routed", li1)).unwrap();
    let after = read(&out, &Request::new("routed", li1)).unwrap();
    assert!(before.shapes.iter().eq(after.shapes.iter()));
    assert_eq!(
        read(&out, &Request::new("routed", masks[1]))
            .unwrap()
            .shapes
            .len(),
        2
    );
}

#[test]
fn long_outlines_take_several_records() {
    let comb: Vec<Point> = (0..5000)
        .flat_map(|i| [p(4 * i, 0), p(4 * i, 9), p(4 * i + 2, 9), p(4 * i + 2, 0)])
        .chain([p(19_998, -5), p(0, -5)])
        .collect();
    let bytes = two_cells();
    let plan = Plan::new(&bytes, "f.gds", "top", &MASKS).unwrap();
    let mut out = Vec::new();
    plan.write([(0, &comb)], &mut out).unwrap();
    let shapes = read(&out, &Request::new("f.gds", MASKS[0])).unwrap().shapes;
    let Shape::Polygon(vertices) = shapes.get(0) else {
        panic!()
    };
    assert!(vertices.len() > 19_990);
}
