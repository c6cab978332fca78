#![allow(clippy::unwrap_used, clippy::expect_used)]

mod hand;
mod spacings;

use super::super::rules_toml::read;
use super::*;
use crate::formats::gdsii::Label;
use crate::layout::{Hand, Rules, Spacings, StitchRules};

const FULL: &str = r#"layer = "67/20"
masks = 3
spacing = "0.25 um"

[stitch]
policy = "uncovered"
overlap = "20 nm"
fragment_length = "60 nm"
corner = "30 nm"
weight = 2

[output]
datatypes = [201, 202, 203]
"#;

fn rules(text: &str) -> RawRules {
    read(text.as_bytes(), "r.toml").unwrap()
}

fn syntax(text: &str) -> String {
    read(text.as_bytes(), "r.toml").unwrap_err().to_string()
}

fn unresolved(text: &str, unit_pm: u64) -> String {
    rules(text)
        .resolve(&Sources::grid(unit_pm))
        .unwrap_err()
        .to_string()
}

#[test]
fn reads_and_resolves_every_rule() {
    let raw = rules(FULL);
    let rules = raw.resolve(&Sources::grid(500)).unwrap();
    let expected = Rules {
        layer: LayerId {
            layer: 67,
            datatype: 20,
        },
        masks: 3,
        spacing: 500,
        stitch: StitchRules {
            policy: Policy::Uncovered,
            overlap: 40,
            fragment_length: 120,
            corner: 60,
            weight: 2,
            ..StitchRules::default()
        },
        spacings: Default::default(),
        hand: Default::default(),
    };
    assert_eq!(rules, expected);
    let output = raw.output_layers(&rules).unwrap();
    assert_eq!(
        output.iter().map(|l| l.to_string()).collect::<Vec<_>>(),
        ["67/201", "67/202", "67/203"]
    );
}

/// An example of the documentation, counted from 0.
fn example(number: usize) -> RawRules {
    let page = include_str!("../rules.md");
    let example = page.split("```toml\n").nth(number + 1).unwrap();
    rules(example.split("```").next().unwrap())
}

#[test]
fn the_documented_examples_are_read() {
    let raw = example(0);
    let plain = raw.resolve(&Sources::grid(1000)).unwrap();
    assert_eq!(
        (plain.spacing, plain.masks, plain.stitch.overlap),
        (250, 3, 20)
    );
    assert_eq!(raw.output_layers(&plain).unwrap().len(), 3);
    assert_eq!(plain.spacings, Spacings::default());
    assert_eq!(plain.hand, Hand::default());
    let page = include_str!("../rules.md");
    assert_eq!(page.matches("```toml").count(), 3);
}

const PLAIN: &str = "layer = \"1/0\"\nmasks = 3\nspacing = \"100 nm\"\n";

/// The error of plain rules with more, whose first line is line 4.
fn wrong(more: &str) -> String {
    wrong_with(more, &[])
}

fn wrong_with(more: &str, labels: &[Label]) -> String {
    let text = format!("{PLAIN}{more}");
    let raw = match read(text.as_bytes(), "r.toml") {
        Ok(raw) => raw,
        Err(error) => return error.to_string(),
    };
    let sources = Sources {
        labels,
        ..Sources::grid(1000)
    };
    raw.resolve(&sources).unwrap_err().to_string()
}

#[track_caller]
fn refused(more: &str, expected: &str) {
    let message = wrong(more);
    assert!(message.starts_with(expected), "{message}");
}

#[test]
fn what_stitches_need_is_checked() {
    let stitch = |more: &str, expected: &str| refused(&format!("[stitch]\n{more}\n"), expected);
    stitch(
        "policy = \"listed\"",
        "r.toml:5:10: the policy \"listed\" needs a list",
    );
    stitch(
        "most_per_feature = 0",
        "r.toml:5:20: 0 stitches of a feature at most: it must be 1",
    );
    stitch(
        "most_per_feature = 4294967296",
        "r.toml:5:20: 4294967296 stitches",
    );
    stitch("list = 1", "r.toml:5:8: `list` must be the name of a file");
    stitch(
        "keep_out = 1",
        "r.toml:5:12: `keep_out` must be a list of tables",
    );
    let keep_out = |more: &str, expected: &str| {
        refused(&format!("[[stitch.keep_out]]\n{more}\n"), expected);
    };
    keep_out(
        "layer = \"2/0\"",
        "r.toml:4:1: [[stitch.keep_out]] without `distance`",
    );
    keep_out(
        "distance = \"2 nm\"",
        "r.toml:4:1: [[stitch.keep_out]] without `layer`",
    );
    keep_out(
        "layer = \"2/0\"\ndistance = \"0.5 nm\"",
        "r.toml:6:12: keep-out distance 0.5 nm is no whole number",
    );
    keep_out(
        "layers = 3",
        "r.toml:5:1: unknown key \"layers\": did you mean `layer`?",
    );
    keep_out("from = 3", "r.toml:5:1: unknown key \"from\"");
    let list = Some(Given::on_command_line("--stitch-list", "s.csv".into()));
    let raw = RawRules {
        list,
        ..RawRules::default()
    };
    let error = rules(PLAIN)
        .overridden_by(raw)
        .resolve(&Sources::grid(1000));
    let error = error.unwrap_err();
    assert!(error.is_usage());
    assert!(
        error
            .to_string()
            .starts_with("--stitch-list: only the policy \"listed\" reads")
    );
}

#[test]
fn a_layer_has_one_purpose() {
    let keep_out =
        |layer| format!("[[stitch.keep_out]]\nlayer = \"{layer}\"\ndistance = \"1 nm\"\n");
    let fixed = |layer| format!("[[fixed]]\nmask = 1\nlayer = \"{layer}\"\n");
    refused(
        &fixed("1/0"),
        "r.toml:6:9: layer 1/0 is the layer to split and a fixed layer: one layer can only be one",
    );
    refused(
        &keep_out("1/0"),
        "r.toml:5:9: layer 1/0 is the layer to split and a keep-out of stitches",
    );
    let twice = fixed("2/0") + &fixed("2/0");
    refused(
        &twice,
        "r.toml:9:9: layer 2/0 is a fixed layer and that once more",
    );
    let both = keep_out("2/0") + &fixed("2/0");
    refused(
        &both,
        "r.toml:5:9: layer 2/0 is a fixed layer and a keep-out of stitches",
    );
}

#[test]
fn graphs_are_told_the_first_rule_that_they_cannot_follow() {
    let place = |text: &str| rules(text).layout_rule().map(|place| place.to_string());
    assert_eq!(place("masks = 3\n"), None);
    for (text, expected) in [
        ("[spacings]\nany_mask = \"1 nm\"\n", "r.toml:2:12"),
        ("[spacings]\nmetric = \"square\"\n", "r.toml:2:10"),
        ("[stitch]\nlist = \"f\"\n", "r.toml:2:8"),
        ("[stitch]\nmost_per_feature = 3\n", "r.toml:2:20"),
        (
            "[[stitch.keep_out]]\nlayer = \"1/2\"\ndistance = \"1 nm\"\n",
            "r.toml:2:9",
        ),
        ("[[fixed]]\nmask = 1\npoints = []\n", "r.toml:1:1"),
        ("[[same_mask]]\npoints = []\n", "r.toml:1:1"),
        ("[[different_masks]]\npoints = []\n", "r.toml:1:1"),
    ] {
        assert_eq!(place(text).as_deref(), Some(expected), "{text}");
    }
}

#[test]
fn defaults_are_the_documented_ones() {
    let raw = rules("layer = \"1/0\"\nmasks = 2\nspacing = \"10 nm\"\n");
    let rules = raw.resolve(&Sources::grid(1000)).unwrap();
    let stitch = StitchRules {
        policy: Policy::None,
        overlap: 0,
        fragment_length: 0,
        corner: 0,
        weight: 1,
        ..StitchRules::default()
    };
    assert_eq!(rules.stitch, stitch);
    let output = raw.output_layers(&rules).unwrap();
    assert_eq!(
        output.iter().map(|l| l.to_string()).collect::<Vec<_>>(),
        ["1/101", "1/102"]
    );
}

#[test]
fn the_command_line_overrides() {
    let given = RawRules {
        spacing: Some(Given::on_command_line(
            "--spacing",
            "180.5 nm".parse().unwrap(),
        )),
        masks: Some(Given::on_command_line("--masks", 9)),
        ..RawRules::default()
    };
    let both = rules(FULL).overridden_by(given.clone());
    assert_eq!(both.spacing, given.spacing);
    assert_eq!(both.layer, rules(FULL).layer);
    let error = both.resolve(&Sources::grid(1000)).unwrap_err();
    assert!(error.is_usage());
    assert_eq!(
        error.to_string(),
        "--masks: 9 masks: a layer is split over 2 to 8 masks"
    );
    let missing = RawRules::default()
        .resolve(&Sources::grid(1000))
        .unwrap_err();
    assert!(missing.is_usage());
    assert!(
        missing
            .to_string()
            .starts_with("no same-mask spacing is given: add --spacing")
    );
    assert!(
        RawRules::default()
            .layer()
            .unwrap_err()
            .to_string()
            .starts_with("no layer is given")
    );
}

#[test]
fn wrong_keys_name_the_nearest_right_one() {
    assert_eq!(
        syntax("layer = \"1/0\"\nspcing = \"1 nm\"\n"),
        "r.toml:2:1: unknown key \"spcing\": did you mean `spacing`?"
    );
    assert_eq!(
        syntax("[stitch]\n  overlp = \"2 nm\"\n"),
        "r.toml:2:3: unknown key \"overlp\": did you mean `overlap`?"
    );
    assert_eq!(
        syntax("[output]\nlayer = []\n"),
        "r.toml:2:1: unknown key \"layer\": did you mean `layers`?"
    );
    assert_eq!(
        syntax("overlap = \"2 nm\"\n"),
        "r.toml:1:1: key \"overlap\" belongs in the table [stitch]"
    );
}

#[test]
fn wrong_values_are_named() {
    assert!(syntax("spacing = 250\n").starts_with("r.toml:1:11: \"250\" has no unit"));
    assert!(syntax("spacing = 0.25\n").contains("has no unit"));
    assert!(syntax("spacing = true\n").contains("`spacing` must be a length"));
    assert!(syntax("masks = \"3\"\n").contains("`masks` must be a whole number"));
    assert!(syntax("masks = -3\n").contains("`masks` must be a whole number"));
    assert!(syntax("layer = 67\n").contains("`layer` must be a layer such as"));
    assert!(syntax("layer = \"67\"\n").contains("is no layer"));
    assert!(syntax("layer = \"67/70000\"\n").contains("is no layer"));
    assert!(syntax("stitch = 1\n").contains("`stitch` must be a table"));
    assert!(syntax("output = {}\n").contains("`output` must be a table"));
    assert!(syntax("[output]\ndatatypes = 3\n").contains("must be a list of datatypes"));
    assert!(syntax("[output]\ndatatypes = [70000]\n").contains("numbers from 0 to 65535"));
    assert!(syntax("[output]\ndatatypes = [1]\nlayers = [\"1/1\"]\n").contains("not both"));
    assert!(syntax("[stitch]\npolicy = \"uncoverd\"\n").contains("did you mean \"uncovered\"?"));
    assert!(syntax("masks = 3\nmasks = 4\n").starts_with("r.toml:2:1: duplicate key"));
    assert!(syntax("masks = \n").starts_with("r.toml:1:"));
    let not_text = read(b"masks = 3\n\xff", "r.toml").unwrap_err().to_string();
    assert!(not_text.starts_with("r.toml:2:1: not UTF-8"));
}

#[test]
fn ranges_are_checked_on_the_grid() {
    let with = |from: &str, to: &str| unresolved(&FULL.replace(from, to), 1000);
    assert!(with("\"0.25 um\"", "\"250.5 nm\"").starts_with(
        "r.toml:3:11: spacing 250.5 nm is no whole number of database units: one is 1 nm"
    ));
    assert!(with("\"0.25 um\"", "\"0 nm\"").starts_with("r.toml:3:11: spacing is 0"));
    assert!(with("\"0.25 um\"", "\"1073741825 nm\"").contains("at most 1073741824 nm"));
    assert!(
        rules(&FULL.replace("\"0.25 um\"", "\"1073741824 nm\""))
            .resolve(&Sources::grid(1000))
            .is_ok()
    );
    assert!(with("20 nm", "21 nm").starts_with("r.toml:7:11: stitch overlap 21 nm is an odd"));
    for masks in ["0", "1", "9", "300"] {
        let error = with("masks = 3", &format!("masks = {masks}"));
        assert!(
            error.starts_with(&format!("r.toml:2:9: {masks} mask")),
            "{error}"
        );
    }
    assert!(with("weight = 2", "weight = 0").contains("stitch weight 0"));
    assert!(with("weight = 2", "weight = 4294967297").contains("stitch weight 4294967297"));
    assert!(unresolved("layer = \"1/0\"\nmasks = 3\n", 1000).contains("no same-mask spacing"));
}

#[test]
fn output_layers_are_checked() {
    let output = |list: &str| {
        let raw = rules(&FULL.replace("datatypes = [201, 202, 203]", list));
        raw.output_layers(&raw.resolve(&Sources::grid(1000)).unwrap())
    };
    assert!(
        output("datatypes = [1, 2]")
            .unwrap_err()
            .to_string()
            .contains("2 output layers for 3")
    );
    assert!(
        output("datatypes = [1, 2, 1]")
            .unwrap_err()
            .to_string()
            .contains("67/1 is used twice")
    );
    assert!(
        output("datatypes = [1, 2, 20]")
            .unwrap_err()
            .to_string()
            .contains("67/20 is used twice")
    );
    let layers = output("layers = [\"1/0\", \"2/0\", \"3/0\"]").unwrap();
    assert_eq!(
        layers[2],
        LayerId {
            layer: 3,
            datatype: 0
        }
    );
    let own = "layer = \"1/102\"\nmasks = 2\nspacing = \"1 nm\"\n";
    let raw = rules(own);
    let error = raw
        .output_layers(&raw.resolve(&Sources::grid(1000)).unwrap())
        .unwrap_err();
    assert!(error.to_string().contains("choose them with `output`"));
}

#[test]
fn random_bytes_never_panic() {
    use rand::{Rng, SeedableRng};
    let mut random = rand_pcg::Pcg64::seed_from_u64(5);
    let page = include_str!("../rules.md");
    let seeds: Vec<&str> = page
        .split("```toml\n")
        .skip(1)
        .map(|rest| rest.split("```").next().unwrap())
        .chain([FULL])
        .collect();
    for round in 0..6000 {
        let mut bytes = seeds[round % seeds.len()].as_bytes().to_vec();
        for _ in 0..random.random_range(1..4) {
            let at = random.random_range(0..bytes.len());
            bytes[at] = random.random_range(9..128);
        }
        if let Ok(raw) = read(&bytes, "r.toml") {
            let _ = raw
                .resolve(&Sources::grid(1000))
                .and_then(|rules| raw.output_layers(&rules));
        }
    }
}
