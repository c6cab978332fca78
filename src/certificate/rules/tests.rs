#![allow(clippy::unwrap_used)]

use super::*;

fn plain() -> layout::Rules {
    layout::Rules::plain(parse_layer("67/20").unwrap(), 3, 250)
}

fn full() -> layout::Rules {
    let layer = |name| parse_layer(name).unwrap();
    let p = |x, y| Point { x, y };
    let row = |width, run_length, spacing| WideSpacing {
        width,
        run_length,
        spacing,
    };
    let keep_out = |name, distance| KeepOut {
        layer: layer(name),
        distance,
    };
    let listed = |x| Listed {
        feature: p(x, -2),
        at: p(3, 4),
    };
    layout::Rules {
        spacings: Spacings {
            metric: Metric::Square,
            end_length: 90,
            side_to_side: Some(240),
            side_to_end: Some(260),
            end_to_end: Some(280),
            corner_to_corner: Some(220),
            wide: vec![row(500, 400, 300), row(500, 800, 310), row(900, 1, 400)],
            any_mask: 100,
        },
        stitch: StitchRules {
            policy: Policy::Listed,
            overlap: 20,
            fragment_length: 60,
            corner: 30,
            weight: 7,
            keep_outs: vec![keep_out("66/44", 30), keep_out("1/2", 0)],
            most_per_feature: Some(2),
            listed: vec![listed(-1), listed(5)],
        },
        hand: Hand {
            fixed_layers: vec![(layer("67/22"), 2), (layer("67/21"), 0)],
            fixed: vec![(p(1, -1), 1)],
            same: vec![vec![p(1, 2), p(3, 4)], vec![p(5, 6), p(7, 8), p(9, 9)]],
            different: vec![vec![p(-1, -2), p(-3, -4)]],
        },
        ..plain()
    }
}

fn layer_rules(rules: &layout::Rules) -> LayerRules {
    match Rules::of_layer(rules, rules.stitch.policy.name(), "top", 500) {
        Rules::Layer(rules) => *rules,
        Rules::Graph(_) => LayerRules::default(),
    }
}

/// Certificates of plain rules, written before there were others, keep their digest.
#[test]
fn plain_rules_are_written_as_ever() {
    let text = serde_json::to_string(&Rules::of_layer(&plain(), "none", "top", 500)).unwrap();
    assert_eq!(
        text,
        r#"{"masks":3,"top":"top","layer":"67/20","unit_pm":500,"spacing":250,"stitch":"none","overlap":0,"fragment_length":0,"corner":0,"stitch_weight":1}"#
    );
}

#[test]
fn all_rules_are_written_as_documented() {
    let text = serde_json::to_string(&layer_rules(&full())).unwrap();
    let further = text.split(r#""stitch_weight":7,"#).nth(1).unwrap();
    assert_eq!(
        further,
        concat!(
            r#""metric":"square","end_length":90,"side_to_side":240,"side_to_end":260,"#,
            r#""end_to_end":280,"corner_to_corner":220,"#,
            r#""wide":[[500,400,300],[500,800,310],[900,1,400]],"any_mask":100,"#,
            r#""keep_outs":[["66/44",30],["1/2",0]],"most_stitches":2,"#,
            r#""listed":[[-1,-2,3,4],[5,-2,3,4]],"#,
            r#""fixed_layers":[["67/22",3],["67/21",1]],"fixed":[[1,-1,2]],"#,
            r#""same":[[[1,2],[3,4]],[[5,6],[7,8],[9,9]]],"different":[[[-1,-2],[-3,-4]]]}"#
        )
    );
    // The page names every member, in this order.
    let page = include_str!("../format.md");
    let table = page.split("| member | holds | left out |").nth(1).unwrap();
    let value: serde_json::Value = serde_json::from_str(&text).unwrap();
    let mut at = 0;
    for name in further.split('"').filter(|word| value.get(word).is_some()) {
        let place = table.find(&format!("`{name}`"));
        assert!(place.is_some_and(|place| place > at), "{name}");
        at = place.unwrap();
    }
}

#[test]
fn rules_come_back() {
    for rules in [plain(), full()] {
        let text = serde_json::to_string(&layer_rules(&rules)).unwrap();
        let read: Rules = serde_json::from_str(&text).unwrap();
        let Rules::Layer(read) = read else {
            panic!("{read:?}")
        };
        assert_eq!(read.resolve(), Ok(rules));
    }
}

#[test]
fn impossible_rules_are_refused() {
    type Change = fn(&mut LayerRules);
    let changes: [(Change, &str); 27] = [
        (|r| r.masks = 1, "mask"),
        (|r| r.masks = 9, "out of range"),
        (|r| r.spacing = 0, "out of range"),
        (|r| r.spacing = COORDINATE_LIMIT + 1, "out of range"),
        (|r| r.overlap = 21, "out of range"),
        (|r| r.corner = -1, "out of range"),
        (|r| r.fragment_length = -1, "out of range"),
        (|r| r.stitch_weight = 0, "out of range"),
        (|r| r.stitch = "some".to_owned(), "is no stitch policy"),
        (|r| r.stitch = "none".to_owned(), "reads no list"),
        (|r| r.layer = "67".to_owned(), "is no layer"),
        (|r| r.layer = "67/21".to_owned(), "67/21 is named twice"),
        (
            |r| r.keep_outs[0].0 = "67/22".to_owned(),
            "67/22 is named twice",
        ),
        (|r| r.keep_outs[0].1 = -1, "out of range"),
        (|r| r.metric = Some("round".to_owned()), "is no metric"),
        (|r| r.end_length = 0, "without end_length"),
        (|r| r.end_to_end = Some(0), "out of range"),
        (|r| r.corner_to_corner = Some(100), "any_mask"),
        (|r| r.any_mask = -1, "out of range"),
        (|r| r.wide.swap(0, 1), "not ascending"),
        (|r| r.wide[0][1] = 800, "not ascending"),
        (|r| r.wide[0][0] = 0, "out of range"),
        (|r| r.most_stitches = Some(0), "out of range"),
        (|r| r.listed.swap(0, 1), "not ascending"),
        (|r| r.fixed[0].2 = 4, "mask 4 of 3"),
        (|r| r.fixed_layers[0].1 = 0, "mask 0 of 3"),
        (|r| r.same[0].truncate(1), "fewer than two points"),
    ];
    for (i, (change, said)) in changes.into_iter().enumerate() {
        let mut rules = layer_rules(&full());
        change(&mut rules);
        let error = rules.resolve().unwrap_err();
        assert!(error.contains(said), "change {i}: {error}");
    }
    let mut rules = layer_rules(&full());
    rules.different[0][1] = [0, COORDINATE_LIMIT + 1];
    assert!(
        rules
            .resolve()
            .unwrap_err()
            .contains("a point is out of range")
    );
}
