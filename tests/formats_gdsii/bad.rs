//! Bad elements and bad streams: one clear error with its byte.

use super::help::*;
use maskproof::geometry::{COORDINATE_LIMIT, Point};

/// A record by hand.
fn record(kind: u8, data_type: u8, body: &[u8]) -> Vec<u8> {
    let length = (4 + body.len()) as u16;
    [&length.to_be_bytes()[..], &[kind, data_type], body].concat()
}

fn xy(points: &[(i32, i32)]) -> Vec<u8> {
    let body: Vec<u8> = points
        .iter()
        .flat_map(|&(x, y)| [x.to_be_bytes(), y.to_be_bytes()].concat())
        .collect();
    record(0x10, 3, &body)
}

const LAYER_RECORD: [u8; 6] = [0, 6, 0x0d, 2, 0, 1];
const DATATYPE_RECORD: [u8; 6] = [0, 6, 0x0e, 2, 0, 2];
const SQUARE: [(i32, i32); 5] = [(0, 0), (5, 0), (5, 5), (0, 5), (0, 0)];

/// A library whose only cell holds these records after a good square.
fn with(records: &[&[u8]]) -> Vec<u8> {
    let bytes = one_cell(|w| w.rect(LAYER, rect(0, 0, 1, 1)).unwrap());
    let end = bytes.len() - 8;
    [&bytes[..end], &records.concat(), &bytes[end..]].concat()
}

fn boundary(xys: &[Vec<u8>]) -> Vec<u8> {
    let start = record(0x08, 0, &[]);
    let end = record(0x11, 0, &[]);
    with(&[&start, &LAYER_RECORD, &DATATYPE_RECORD, &xys.concat(), &end])
}

/// The byte behind the good square, where the element under test begins.
fn element_at() -> usize {
    with(&[]).len() - 8
}

#[test]
fn boundaries_must_be_closed_polygons() {
    let wrong = |points: &[(i32, i32)], expected: &str| {
        let message = error(&boundary(&[xy(points)]));
        let start = format!("f.gds: byte {}, cell \"top\": ", element_at());
        assert!(message.starts_with(&start), "{message}");
        assert!(message.contains(expected), "{message}");
    };
    assert_eq!(layout(&boundary(&[xy(&SQUARE)])).unwrap().shapes.len(), 2);
    wrong(&[], "BOUNDARY has 0 points: it must have at least 4");
    wrong(&[(0, 0), (5, 5), (0, 0)], "BOUNDARY has 3 points");
    wrong(&SQUARE[..4], "BOUNDARY is not closed: it ends at (0, 5)");
    wrong(
        &[(0, 0), (5, 0), (9, 0), (0, 0)],
        "BOUNDARY encloses no area",
    );
    wrong(
        &[(0, 0), (5, 0), (5, 0), (0, 0), (0, 0)],
        "BOUNDARY encloses no area",
    );
    wrong(
        &[(3, 3), (3, 3), (3, 3), (3, 3)],
        "BOUNDARY encloses no area",
    );
    let far = COORDINATE_LIMIT + 1;
    wrong(
        &[(0, 0), (far, 0), (0, 5), (0, 0)],
        "coordinate (1073741825, 0) is out of range",
    );
    wrong(
        &[(0, 0), (i32::MIN, 0), (0, 5), (0, 0)],
        "coordinate (-2147483648, 0) is out of range",
    );
    let limit = COORDINATE_LIMIT;
    assert!(
        layout(&boundary(&[xy(&[
            (-limit, 0),
            (limit, 0),
            (0, 5),
            (-limit, 0)
        ])]))
        .is_ok()
    );
}

#[test]
fn long_point_lists_are_joined() {
    let joined = layout(&boundary(&[xy(&SQUARE[..2]), xy(&SQUARE[2..])])).unwrap();
    assert_eq!(rects(&joined.shapes), [rect(0, 0, 1, 1), rect(0, 0, 5, 5)]);
    // A comb of 10,000 teeth: 40,000 points, which the writer spreads over several records.
    let teeth: Vec<Point> = (0..10_000)
        .flat_map(|i| [p(4 * i, 0), p(4 * i, 9), p(4 * i + 2, 9), p(4 * i + 2, 0)])
        .chain([p(39_998, -5), p(0, -5)])
        .collect();
    let bytes = one_cell(|w| w.boundary(LAYER, &teeth).unwrap());
    let shapes = layout(&bytes).unwrap().shapes;
    let maskproof::layout::Shape::Polygon(vertices) = shapes.get(0) else {
        panic!()
    };
    assert!(vertices.len() >= 39_999);
}

#[test]
fn records_are_read_in_any_order() {
    let end = record(0x11, 0, &[]);
    let path = record(0x09, 0, &[]);
    let (pathtype, width) = (record(0x21, 2, &[0, 2]), record(0x0f, 3, &[0, 0, 0, 4]));
    let line = xy(&[(0, 0), (9, 0)]);
    let bytes = with(&[
        &path,
        &line,
        &width,
        &pathtype,
        &DATATYPE_RECORD,
        &LAYER_RECORD,
        &end,
    ]);
    assert_eq!(
        rects(&layout(&bytes).unwrap().shapes)[0],
        rect(-2, -2, 11, 2)
    );
}

#[test]
fn elements_must_be_complete() {
    let (start, end) = (record(0x08, 0, &[]), record(0x11, 0, &[]));
    let square = xy(&SQUARE);
    let message = error(&with(&[&start, &DATATYPE_RECORD, &square, &end]));
    assert!(message.contains("BOUNDARY without LAYER"), "{message}");
    let message = error(&with(&[&start, &LAYER_RECORD, &square, &end]));
    assert!(message.contains("BOUNDARY without DATATYPE"), "{message}");
    let message = error(&with(&[&start, &LAYER_RECORD, &DATATYPE_RECORD, &end]));
    assert!(message.contains("BOUNDARY without XY"), "{message}");
    let message = error(&with(&[&start, &LAYER_RECORD, &LAYER_RECORD]));
    assert!(
        message.contains("second LAYER in one BOUNDARY"),
        "{message}"
    );
    let message = error(&with(&[&start, &record(0x12, 6, b"ab")]));
    assert!(message.contains("record SNAME in a BOUNDARY"), "{message}");
    let message = error(&with(&[&start]));
    assert!(message.contains("record ENDSTR in a BOUNDARY"), "{message}");
    let odd = record(0x10, 3, &[0; 12]);
    let message = error(&with(&[
        &start,
        &LAYER_RECORD,
        &DATATYPE_RECORD,
        &odd,
        &end,
    ]));
    assert!(
        message.contains("XY holds 12 bytes of data type 3: pairs"),
        "{message}"
    );
    let wrong_type = record(0x10, 2, &[0; 16]);
    let message = error(&with(&[
        &start,
        &LAYER_RECORD,
        &DATATYPE_RECORD,
        &wrong_type,
        &end,
    ]));
    assert!(
        message.contains("XY holds 16 bytes of data type 2: pairs"),
        "{message}"
    );
    let reference = [
        record(0x0a, 0, &[]),
        record(0x12, 6, b"\0\0"),
        xy(&[(0, 0)]),
        end.clone(),
    ];
    let message = error(&with(&[&reference.concat()]));
    assert!(message.contains("SNAME is empty"), "{message}");
    let crooked_box = [
        record(0x2d, 0, &[]),
        LAYER_RECORD.to_vec(),
        record(0x2e, 2, &[0, 2]),
        xy(&SQUARE[..4]),
        end,
    ];
    let message = error(&with(&[&crooked_box.concat()]));
    assert!(
        message.contains("BOX has 4 points: it must have 5"),
        "{message}"
    );
}

#[test]
fn streams_must_be_whole() {
    let good = with(&[]);
    assert!(error(&[]).contains("f.gds: byte 0: no HEADER record"));
    assert!(error(b"hello, world").contains("no HEADER record"));
    let endless = &good[..good.len() - 4];
    assert!(
        error(endless).contains("before ENDLIB: an ENDLIB record must close it"),
        "{}",
        error(endless)
    );
    assert!(error(endless).contains(&format!("byte {}:", endless.len())));
    let padded = [&good[..], &[0; 2048]].concat();
    assert!(layout(&padded).is_ok());
    let cut = error(&good[..good.len() - 20]);
    assert!(
        cut.contains("the file is cut short") || cut.contains("the file ends"),
        "{cut}"
    );
    let zero = with(&[&[0, 0, 8, 0]]);
    assert!(error(&zero).contains(&format!(
        "byte {}, cell \"top\": record length 0",
        element_at()
    )));
    assert!(error(&with(&[&[0, 5, 8, 0, 0]])).contains("record length 5"));
    assert!(error(&with(&[&[0, 4, 0x77, 0]])).contains("unknown record type 0x77"));
    assert!(error(&with(&[&record(0x05, 2, &[0; 24])])).contains("record BGNSTR inside a cell"));
}

#[test]
fn records_that_other_readers_do_not_know_are_read_over() {
    let good = with(&[]);
    let libname = good.windows(4).position(|w| w == [0, 8, 2, 6]).unwrap();
    let libdirsize = record(0x39, 2, &[0, 1]);
    let bytes = [&good[..libname], &libdirsize, &good[libname..]].concat();
    assert!(layout(&bytes).is_ok());
    let strname = good
        .windows(8)
        .position(|w| w == b"\0\x08\x06\x06top\0")
        .unwrap()
        + 8;
    let strclass = record(0x34, 1, &[0, 1]);
    let bytes = [&good[..strname], &strclass, &good[strname..]].concat();
    assert!(layout(&bytes).is_ok());
    // Names in another encoding than UTF-8.
    let mut latin = good.clone();
    latin[strname - 4] = 0xe9;
    assert_eq!(layout(&latin).unwrap().top, "\u{fffd}op");
}

#[test]
fn units_must_be_whole_picometres() {
    let good = with(&[]);
    let nanometre = [0x39, 0x44, 0xb8, 0x2f, 0xa0, 0x9b, 0x5a, 0x54];
    let at = good.windows(8).position(|w| w == nanometre).unwrap();
    let unit = |raw: [u8; 8]| [&good[..at], &raw, &good[at + 8..]].concat();
    // 0.15 pm, and 0.
    assert!(error(&unit([0x36, 0x44, 0, 0, 0, 0, 0, 0])).contains("a whole number of picometres"));
    assert!(error(&unit([0; 8])).contains("database unit of 0 m"));
    assert_eq!(layout(&good).unwrap().unit_pm, 1000);
}

#[test]
fn layers_are_unsigned() {
    let high = maskproof::layout::LayerId {
        layer: 60_000,
        datatype: 40_000,
    };
    let bytes = one_cell(|w| w.rect(high, rect(0, 0, 1, 1)).unwrap());
    let request = maskproof::formats::gdsii::Request::new("f.gds", high);
    assert_eq!(
        maskproof::formats::gdsii::read(&bytes, &request)
            .unwrap()
            .shapes
            .len(),
        1
    );
    assert!(error(&bytes).contains("present, with their shape counts, are 60000/40000 (1)"));
}
