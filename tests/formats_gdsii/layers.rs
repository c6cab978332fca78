//! Several layers in one pass: fixed ones, keep-outs, labels.

use super::help::*;
use super::real::ROUTED;
use maskproof::formats::gdsii::writer::PathStyle;
use maskproof::formats::gdsii::{Label, Request, read, read_with_labels};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{LayerId, Layout, Shape, Shapes};

const FIRST: LayerId = LayerId {
    layer: 1,
    datatype: 21,
};
const SECOND: LayerId = LayerId {
    layer: 1,
    datatype: 22,
};
const VIA: LayerId = LayerId {
    layer: 9,
    datatype: 0,
};
const TEXT: LayerId = LayerId {
    layer: 83,
    datatype: 44,
};

fn request<'a>() -> Request<'a> {
    Request {
        fixed: &[(FIRST, 0), (SECOND, 2)],
        keep_outs: &[VIA],
        labels: &[TEXT],
        ..Request::new("f.gds", LAYER)
    }
}

fn read_error(bytes: &[u8], request: &Request<'_>) -> String {
    read(bytes, request).unwrap_err().to_string()
}

fn boxes(shapes: &Shapes) -> Vec<Rect> {
    let rect = |shape| match shape {
        Shape::Rect(rect) => rect,
        Shape::Polygon(vertices) => panic!("polygon {vertices:?}"),
    };
    shapes.iter().map(rect).collect()
}

#[test]
fn shapes_of_each_layer_find_their_place() {
    let bytes = library(|w| {
        cell(w, "leaf", |w| {
            w.rect(SECOND, rect(0, 0, 2, 1)).unwrap();
            w.rect(LAYER, rect(2, 0, 4, 1)).unwrap();
            w.rect(VIA, rect(0, 0, 1, 1)).unwrap();
            // Drawn in two pieces, the second one at the bend.
            let line = [p(10, 0), p(20, 0), p(20, 10)];
            let style = PathStyle {
                kind: 0,
                width: 2,
                extensions: None,
            };
            w.path(FIRST, style, &line).unwrap();
        });
        cell(w, "top", |w| {
            w.rect(FIRST, rect(50, 50, 60, 60)).unwrap();
            w.rect(LAYER, rect(70, 50, 80, 60)).unwrap();
            w.sref("leaf", turned(false, 0), 1, p(100, 0)).unwrap();
            w.text(TEXT, p(0, 0), "a").unwrap();
        });
    });
    let layout = read(&bytes, &request()).unwrap();
    let shapes = boxes(&layout.shapes);
    // Two of the layer, three of the first fixed one, one of the second.
    assert_eq!(shapes[..2], [rect(70, 50, 80, 60), rect(102, 0, 104, 1)]);
    assert_eq!(shapes[2], rect(50, 50, 60, 60));
    assert_eq!(shapes[5], rect(100, 0, 102, 1));
    assert_eq!(shapes.len(), 6);
    assert_eq!(layout.fixed, [(2, 0), (3, 0), (4, 0), (5, 2)]);
    let mut alone = Shapes::default();
    shapes[3..5].iter().for_each(|&rect| alone.push_rect(rect));
    // 11 by 2 along x and 2 by 11 up, which share the square of the bend: 22 + 22 - 4.
    assert_eq!(area(&alone, rect(100, -5, 130, 20)), 40);
    let [(layer, vias)] = layout.keep_outs.as_slice() else {
        panic!("{:?}", layout.keep_outs)
    };
    assert_eq!((*layer, boxes(vias)), (VIA, vec![rect(100, 0, 101, 1)]));
}

#[test]
fn layers_read_together_are_as_read_alone() {
    let layer = |layer, datatype| LayerId { layer, datatype };
    let (li1, contacts, met1, met2) = (layer(67, 20), layer(66, 44), layer(68, 20), layer(69, 20));
    let together = Request {
        fixed: &[(met2, 1)],
        keep_outs: &[contacts, met1],
        ..Request::new("routed", li1)
    };
    let together = read(ROUTED, &together).unwrap();
    let all = |shapes: &Shapes| -> Vec<Vec<Point>> {
        let outline = |shape| match shape {
            Shape::Rect(rect) => vec![rect.min, rect.max],
            Shape::Polygon(vertices) => vertices.to_vec(),
        };
        shapes.iter().map(outline).collect()
    };
    let alone = |id| all(&read(ROUTED, &Request::new("routed", id)).unwrap().shapes);
    let (own, fixed) = (alone(li1), alone(met2));
    assert!(own.len() > 1000 && fixed.len() > 100);
    assert_eq!(together.fixed.len(), fixed.len());
    assert_eq!(together.fixed[0], (own.len() as u32, 1));
    assert_eq!(all(&together.shapes), [own, fixed].concat());
    let [(_, one), (_, other)] = together.keep_outs.as_slice() else {
        panic!("two keep-outs")
    };
    assert_eq!(all(one), alone(contacts));
    assert_eq!(all(other), alone(met1));
}

fn labels(bytes: &[u8]) -> Vec<Label> {
    let request = Request {
        labels: &[TEXT],
        ..Request::new("f.gds", LAYER)
    };
    read_with_labels(bytes, &request).unwrap().1
}

#[test]
fn labels_go_with_their_cells() {
    // The images of (3, 1), worked out by hand: reflected about x first, then turned.
    let table = [
        (false, 0, p(3, 1)),
        (false, 1, p(-1, 3)),
        (false, 2, p(-3, -1)),
        (false, 3, p(1, -3)),
        (true, 0, p(3, -1)),
        (true, 1, p(1, 3)),
        (true, 2, p(-3, 1)),
        (true, 3, p(-1, -3)),
    ];
    for (reflected, quarter_turns, image) in table {
        let bytes = library(|w| {
            cell(w, "leaf", |w| w.text(TEXT, p(3, 1), "A").unwrap());
            cell(w, "mid", |w| {
                w.sref("leaf", turned(false, 0), 2, p(0, 0)).unwrap()
            });
            cell(w, "top", |w| {
                w.rect(LAYER, rect(0, 0, 1, 1)).unwrap();
                w.sref("mid", turned(reflected, quarter_turns), 1, p(100, 200))
                    .unwrap();
            });
        });
        let expected = Label {
            layer: TEXT,
            text: "A".to_owned(),
            at: p(2 * image.x + 100, 2 * image.y + 200),
        };
        assert_eq!(labels(&bytes), [expected]);
    }
}

#[test]
fn labels_of_arrays_come_in_the_order_of_the_file() {
    let bytes = library(|w| {
        cell(w, "leaf", |w| {
            w.text(TEXT, p(1, 0), "x").unwrap();
            w.text(VIA, p(1, 0), "not asked for").unwrap();
            w.rect(LAYER, rect(0, 0, 1, 1)).unwrap();
        });
        cell(w, "top", |w| {
            let points = [p(0, 0), p(20, 0), p(0, 10)];
            w.aref("leaf", turned(false, 0), [2, 1], points).unwrap();
            w.text(TEXT, p(-7, 8), "two words, odd").unwrap();
        });
    });
    let found = labels(&bytes);
    let found: Vec<(&str, Point)> = found.iter().map(|l| (l.text.as_str(), l.at)).collect();
    assert_eq!(
        found,
        [
            ("two words, odd", p(-7, 8)),
            ("x", p(1, 0)),
            ("x", p(11, 0))
        ]
    );
}

#[test]
fn layers_on_which_there_is_nothing_are_named() {
    let with = |layers: &[LayerId], text: bool| {
        one_cell(|w| {
            for &layer in layers {
                w.rect(layer, rect(0, 0, 1, 1)).unwrap();
            }
            if text {
                w.text(TEXT, p(0, 0), "a").unwrap();
            } else {
                w.text(VIA, p(0, 0), "a").unwrap();
            }
        })
    };
    let everything = [LAYER, FIRST, SECOND, VIA];
    assert!(read(&with(&everything, true), &request()).is_ok());
    let no_via = read_error(&with(&everything[..3], true), &request());
    assert!(
        no_via.contains(
            "cell \"top\": nothing is drawn on layer 9/0: layers present, with their shape counts, are \
             1/2 (1), 1/21 (1), 1/22 (1)"
        ),
        "{no_via}"
    );
    let no_fixed = read_error(&with(&[LAYER, FIRST, VIA], true), &request());
    assert!(
        no_fixed.contains("nothing is drawn on layer 1/22"),
        "{no_fixed}"
    );
    let no_text = read_error(&with(&everything, false), &request());
    assert!(
        no_text
            .contains("no text on layer 83/44: layers with texts, with their counts, are 9/0 (1)"),
        "{no_text}"
    );
    // All of it may be coloured already.
    let layout = read(&with(&everything[1..], true), &request()).unwrap();
    assert_eq!(layout.fixed, [(0, 0), (1, 2)]);
}

#[test]
fn what_is_flattened_is_counted_over_all_layers() {
    let bytes = one_cell(|w| {
        for layer in [LAYER, FIRST, SECOND, VIA] {
            w.rect(layer, rect(0, 0, 1, 1)).unwrap();
        }
        w.text(TEXT, p(0, 0), "12345678").unwrap();
    });
    // Four rectangles of two points, and 5 + 8/8 for the label.
    let with = |max_points| Request {
        max_points,
        ..request()
    };
    assert!(read(&bytes, &with(14)).is_ok());
    let message = read_error(&bytes, &with(13));
    assert!(
        message.contains(
            "layers 1/2, 1/21, 1/22, 9/0, 83/44 together have 4 shapes with 14 points in 0 placements: at most 13"
        ),
        "{message}"
    );
}

#[test]
fn texts_are_held_to_their_form_where_they_are_wanted() {
    let bytes = one_cell(|w| {
        w.rect(LAYER, rect(0, 0, 1, 1)).unwrap();
        w.text(TEXT, p(0, 0), "AB").unwrap();
    });
    let string = bytes.windows(2).rposition(|two| two == [0x19, 6]).unwrap() - 2;
    let without = [&bytes[..string], &bytes[string + 6..]].concat();
    let request = Request {
        labels: &[TEXT],
        ..Request::new("f.gds", LAYER)
    };
    let message = read_error(&without, &request);
    assert!(
        message.contains("TEXT without STRING: it must have one"),
        "{message}"
    );
    let plain: Layout = layout(&without).unwrap();
    assert_eq!(plain.shapes.len(), 1);
    let far = one_cell(|w| {
        w.rect(LAYER, rect(0, 0, 1, 1)).unwrap();
        w.text(TEXT, p(1 << 30, -(1 << 30) - 1), "A").unwrap();
    });
    assert!(read_error(&far, &request).contains("is out of range"));
    assert!(layout(&far).is_ok());
}
