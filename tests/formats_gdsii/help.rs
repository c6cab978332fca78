//! Small libraries, and plain ways to see what shapes cover.

use maskproof::formats::FormatError;
use maskproof::formats::gdsii::writer::Writer;
use maskproof::formats::gdsii::{Orientation, Request, read};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{LayerId, Layout, Shape, Shapes};

/// The layer of the tests.
pub const LAYER: LayerId = LayerId {
    layer: 1,
    datatype: 2,
};

pub type Bytes = Writer<Vec<u8>>;

pub fn p(x: i32, y: i32) -> Point {
    Point { x, y }
}

pub fn rect(x0: i32, y0: i32, x1: i32, y1: i32) -> Rect {
    Rect {
        min: p(x0, y0),
        max: p(x1, y1),
    }
}

pub fn turned(reflected: bool, quarter_turns: u8) -> Orientation {
    Orientation {
        reflected,
        quarter_turns,
    }
}

/// A library of 1 nm database units.
pub fn library(fill: impl FnOnce(&mut Bytes)) -> Vec<u8> {
    let mut writer = Writer::new(Vec::new(), 1000).unwrap();
    fill(&mut writer);
    writer.finish().unwrap()
}

pub fn cell(writer: &mut Bytes, name: &str, fill: impl FnOnce(&mut Bytes)) {
    writer.begin_cell(name).unwrap();
    fill(writer);
    writer.end_cell().unwrap();
}

/// A library of one cell.
pub fn one_cell(fill: impl FnOnce(&mut Bytes)) -> Vec<u8> {
    library(|writer| cell(writer, "top", fill))
}

pub fn layout(bytes: &[u8]) -> Result<Layout, FormatError> {
    read(bytes, &Request::new("f.gds", LAYER))
}

pub fn error(bytes: &[u8]) -> String {
    layout(bytes).unwrap_err().to_string()
}

/// The rectangles, sorted; there must be nothing else.
pub fn rects(shapes: &Shapes) -> Vec<Rect> {
    let mut rects: Vec<Rect> = shapes
        .iter()
        .map(|shape| match shape {
            Shape::Rect(rect) => rect,
            Shape::Polygon(vertices) => panic!("polygon {vertices:?}"),
        })
        .collect();
    rects.sort();
    rects
}

/// Whether the middle of the grid square at (x, y) is inside a shape, by winding number.
pub fn covers(shape: Shape<'_>, x: i32, y: i32) -> bool {
    let corners;
    let vertices = match shape {
        Shape::Polygon(vertices) => vertices,
        Shape::Rect(Rect { min, max }) => {
            corners = [min, p(max.x, min.y), max, p(min.x, max.y)];
            &corners
        }
    };
    let (x, y) = (i64::from(2 * x + 1), i64::from(2 * y + 1));
    let mut winding = 0;
    for (i, a) in vertices.iter().enumerate() {
        let b = vertices[(i + 1) % vertices.len()];
        let (ax, ay) = (i64::from(2 * a.x), i64::from(2 * a.y));
        let (bx, by) = (i64::from(2 * b.x), i64::from(2 * b.y));
        if (ay <= y) != (by <= y) {
            let side = (bx - ax) * (y - ay) - (x - ax) * (by - ay);
            if by > ay && side > 0 {
                winding += 1;
            } else if by < ay && side < 0 {
                winding -= 1;
            }
        }
    }
    winding != 0
}

/// The area of the union: the grid squares whose middles are covered, exact for shapes along the axes.
pub fn area(shapes: &Shapes, window: Rect) -> i64 {
    let mut count = 0;
    for x in window.min.x..window.max.x {
        for y in window.min.y..window.max.y {
            count += i64::from(shapes.iter().any(|shape| covers(shape, x, y)));
        }
    }
    count
}
