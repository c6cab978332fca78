//! Spacings by what faces what.

use super::*;
use crate::layout::{KeepOut, Metric, WideSpacing};

#[test]
fn every_spacing_is_read() {
    // Half a nanometre a unit.
    let rules = example(1).resolve(&Sources::grid(500)).unwrap();
    let row = |width, run_length, spacing| WideSpacing {
        width,
        run_length,
        spacing,
    };
    let spacings = Spacings {
        metric: Metric::Square,
        end_length: 200,
        side_to_side: Some(280),
        side_to_end: Some(320),
        end_to_end: Some(360),
        corner_to_corner: Some(240),
        wide: vec![row(1000, 1000, 400), row(3000, 2000, 600)],
        any_mask: 140,
    };
    assert_eq!(rules.spacings, spacings);
    assert_eq!(rules.stitch.policy, Policy::EveryInterval);
    assert_eq!(rules.stitch.most_per_feature, Some(4));
    let keep_out = |layer, distance| KeepOut {
        layer: parse_layer(layer).unwrap(),
        distance,
    };
    assert_eq!(
        rules.stitch.keep_outs,
        [keep_out("67/44", 60), keep_out("68/44", 80)]
    );
}

#[test]
fn spacings_are_checked() {
    let spacings = |more: &str, expected: &str| {
        refused(&format!("[spacings]\n{more}\n"), expected);
    };
    spacings(
        "end_to_end = \"80 nm\"",
        "r.toml:5:14: `end_to_end` needs `end_length`: an edge shorter than that is a line end",
    );
    spacings(
        "side_to_end = \"80 nm\"",
        "r.toml:5:15: `side_to_end` needs",
    );
    spacings(
        "side_to_end = \"80 nm\"\nend_length = \"0 nm\"",
        "r.toml:5:15: `side_to_end` needs",
    );
    spacings(
        "any_mask = \"100 nm\"",
        "r.toml:5:12: any-mask spacing 100 nm must be smaller than every same-mask spacing: \
         spacing is 100 nm",
    );
    spacings(
        "any_mask = \"60 nm\"\ncorner_to_corner = \"50 nm\"",
        "r.toml:5:12: any-mask spacing 60 nm must be smaller than every same-mask spacing: \
         corner_to_corner is 50 nm",
    );
    spacings(
        "side_to_side = \"0 nm\"",
        "r.toml:5:16: side-to-side spacing is 0",
    );
    spacings(
        "corner_to_corner = \"10.5 nm\"",
        "r.toml:5:20: corner-to-corner spacing 10.5 nm is no whole number of database units",
    );
    spacings(
        "metric = \"manhattan\"",
        "r.toml:5:10: \"manhattan\" is no metric: write",
    );
    spacings(
        "metric = 1",
        "r.toml:5:10: `metric` must be \"euclidean\" or \"square\", not \"1\"",
    );
    spacings(
        "end_lenght = 1",
        "r.toml:5:1: unknown key \"end_lenght\": did you mean `end_length`?",
    );
    spacings("wide = 1", "r.toml:5:8: `wide` must be a list of tables");
    refused("spacings = 3", "r.toml:4:12: `spacings` must be a table");
    refused(
        "end_length = \"1 nm\"",
        "r.toml:4:1: key \"end_length\" belongs in the table [spacings]",
    );
}

#[test]
fn rows_of_wide_features_are_checked() {
    let row = |width: &str, run: &str, spacing: &str| {
        format!(
            "[[spacings.wide]]\nwidth = \"{width} nm\"\nrun_length = \"{run} nm\"\nspacing = \"{spacing} nm\"\n"
        )
    };
    let sorted = rules(&format!(
        "{PLAIN}{}{}",
        row("9", "2", "300"),
        row("9", "1", "200")
    ));
    let wide = sorted.resolve(&Sources::grid(1000)).unwrap().spacings.wide;
    assert_eq!(
        wide.iter().map(|row| row.spacing).collect::<Vec<_>>(),
        [200, 300]
    );
    let two = row("9", "1", "300") + &row("9", "1", "200");
    refused(
        &two,
        "r.toml:8:1: a second row for width 9 nm and run length 1 nm: one is right",
    );
    refused(
        &row("0", "1", "2"),
        "r.toml:5:9: width of wide features is 0",
    );
    refused(
        &row("1", "0", "2"),
        "r.toml:6:14: run length of wide features is 0",
    );
    refused(
        &row("1", "1", "0"),
        "r.toml:7:11: spacing of wide features is 0",
    );
    refused(
        "[[spacings.wide]]\nwidth = \"1 nm\"\nspacing = \"2 nm\"\n",
        "r.toml:4:1: [[spacings.wide]] without `run_length`: a row has",
    );
    refused(
        &(row("9", "1", "30") + "[spacings]\nany_mask = \"30 nm\""),
        "r.toml:",
    );
    let any = "[spacings]\nany_mask = \"30 nm\"\n".to_owned() + &row("9", "1", "30");
    refused(&any, "r.toml:5:12: any-mask spacing 30 nm must be smaller");
}

#[test]
fn spacings_by_mask_are_refused() {
    for (more, place) in [
        ("mask_pairs = [[1, 2]]", "4:1"),
        ("[spacings]\nby_mask = 3", "5:1"),
        ("[spacings]\n1-2 = \"30 nm\"", "5:1"),
        ("[spacings]\nside_to_side = { 1-2 = \"30 nm\" }", "5:16"),
        ("[spacings]\nend_to_end = [\"30 nm\", \"40 nm\"]", "5:14"),
    ] {
        let expected =
            format!("r.toml:{place}: a spacing between a particular pair of masks is not");
        refused(more, &expected);
    }
    let table = "layer = \"1/0\"\nmasks = 3\nspacing = { \"1-2\" = \"30 nm\" }\n";
    assert!(syntax(table).starts_with("r.toml:3:11: a spacing between a particular pair"));
}
