//! Masks by hand.

use super::*;
use crate::geometry::Point;

fn label(layer: &str, text: &str, x: i32, y: i32) -> Label {
    Label {
        layer: parse_layer(layer).unwrap(),
        text: text.to_owned(),
        at: Point { x, y },
    }
}

#[test]
fn masks_by_hand_are_read() {
    let raw = example(2);
    let layers = raw.layers().unwrap();
    let names = |layers: &[LayerId]| layers.iter().map(|l| l.to_string()).collect::<Vec<_>>();
    assert_eq!(layers.fixed, [(parse_layer("40/1").unwrap(), 0)]);
    assert_eq!(names(&layers.labels), ["41/0"]);
    assert_eq!(names(&layers.keep_outs), [""; 0]);
    let labels = [
        label("41/0", "pair", 5, 6),
        label("41/0", "other", 9, 9),
        label("42/0", "pair", 8, 8),
        label("41/0", "pair", 7, -8),
    ];
    let sources = Sources {
        labels: &labels,
        ..Sources::grid(1000)
    };
    let p = |x, y| Point { x, y };
    let hand = Hand {
        fixed_layers: layers.fixed,
        fixed: vec![(p(260, 500), 1)],
        same: vec![vec![p(5, 6), p(7, -8)]],
        different: vec![vec![p(10, 500), p(2010, 500)]],
    };
    assert_eq!(raw.resolve(&sources).unwrap().hand, hand);
}

#[test]
fn fixed_masks_are_checked() {
    let fixed = |more: &str, expected: &str| refused(&format!("[[fixed]]\n{more}\n"), expected);
    let points = "points = [[\"1 nm\", \"2 nm\"]]";
    fixed(
        points,
        "r.toml:4:1: [[fixed]] without `mask`: say which, from 1 on",
    );
    fixed("mask = 1", "r.toml:4:1: give either `layer` or `points`");
    fixed(
        &format!("mask = 1\nlayer = \"2/0\"\n{points}"),
        "r.toml:4:1: give either",
    );
    fixed(
        &format!("mask = 0\n{points}"),
        "r.toml:5:8: mask 0: the masks are numbered 1 to 3",
    );
    fixed(
        &format!("mask = 4\n{points}"),
        "r.toml:5:8: mask 4: the masks are numbered 1 to 3",
    );
    let with = |list: &str, expected: &str| fixed(&format!("mask = 1\npoints = {list}"), expected);
    with(
        "[[\"1 nm\", \"-0.5 nm\"]]",
        "r.toml:6:11: coordinate -0.5 nm is no whole number of database",
    );
    with(
        "[[\"1 nm\", \"2000 mm\"]]",
        "r.toml:6:11: coordinate 2000000000 nm is out of range: at most",
    );
    with("[[\"1 nm\", 2]]", "r.toml:6:20: \"2\" has no unit");
    with(
        "[[\"1 nm\"]]",
        "r.toml:6:11: `points` must be points of two coordinates each",
    );
    with(
        "[\"1 nm\"]",
        "r.toml:6:11: `points` must be points of two coordinates each",
    );
    with("[[\"1 nm\", \"x\"]]", "r.toml:6:20: \"x\" is no coordinate");
    with("3", "r.toml:6:10: `points` must be a list of points");
    fixed(
        "masks = 1",
        "r.toml:5:1: unknown key \"masks\": did you mean `mask`?",
    );
    refused("fixed = 1", "r.toml:4:9: `fixed` must be a list of tables");
}

#[test]
fn sets_are_checked() {
    let set = |more: &str, expected: &str| refused(&format!("[[same_mask]]\n{more}\n"), expected);
    set(
        "points = [[\"1 nm\", \"2 nm\"]]",
        "r.toml:4:1: a set of 1 point: two or more features",
    );
    set("points = []", "r.toml:4:1: a set of 0 points");
    set(
        "text = \"A\"",
        "r.toml:4:1: give either `points`, or `labels` with or without `text`",
    );
    set(
        "labels = \"5/6\"\ntext = 1",
        "r.toml:6:8: `text` must be the text of labels",
    );
    set(
        "label = 1",
        "r.toml:5:1: unknown key \"label\": did you mean `labels`?",
    );
    refused(
        "different_masks = 1",
        "r.toml:4:19: `different_masks` must be a list of tables",
    );
    let labels = [
        label("5/6", "A", 1, 1),
        label("5/6", "B", 2, 2),
        label("5/6", "A", 3, 3),
    ];
    let of_a = "[[different_masks]]\nlabels = \"5/6\"\ntext = \"A\"\n";
    let read = rules(&format!("{PLAIN}{of_a}"));
    let sources = Sources {
        labels: &labels,
        ..Sources::grid(1000)
    };
    let found = read.resolve(&sources).unwrap().hand.different;
    assert_eq!(found, [[Point { x: 1, y: 1 }, Point { x: 3, y: 3 }]]);
    let no_c = wrong_with(&of_a.replace("\"A\"", "\"C\""), &labels);
    assert_eq!(
        no_c,
        "r.toml:6:8: no text \"C\" on layer 5/6: the texts there are \"A\", \"B\""
    );
    let of_b = wrong_with(&of_a.replace("\"A\"", "\"B\""), &labels);
    assert_eq!(
        of_b,
        "r.toml:6:8: a set of 1 label \"B\" on layer 5/6: two or more features are needed"
    );
    let all = wrong_with("[[same_mask]]\nlabels = \"5/6\"\n", &labels);
    assert!(
        all.starts_with("r.toml:5:10: a set of 1 label \"B\""),
        "{all}"
    );
    let both = [&labels[..], &[label("5/6", "B", 0, 9)]].concat();
    let sources = Sources {
        labels: &both,
        ..Sources::grid(1000)
    };
    let all = rules(&format!("{PLAIN}[[same_mask]]\nlabels = \"5/6\"\n"));
    let all = all.resolve(&sources).unwrap().hand.same;
    assert_eq!(
        all,
        [
            [Point { x: 1, y: 1 }, Point { x: 3, y: 3 }],
            [Point { x: 2, y: 2 }, Point { x: 0, y: 9 }]
        ]
    );
}
