#![allow(clippy::unwrap_used, clippy::expect_used)]

use super::*;

const SMALL: &str = r#"{"format":"maskproof-instance","version":1,"masks":3,
"features":[2,1,1],
"areas":[5,6,7,8],
"allowed":[[3,[1,3]]],
"pairs":[[[0,2],[1,2]],[[2,3]]],
"stitches":[[1,0,4]]}"#;

fn error(text: &str) -> String {
    read(text.as_bytes(), "i.json", None)
        .unwrap_err()
        .to_string()
}

fn written(instance: &Instance) -> String {
    let mut out = Vec::new();
    write(instance, &mut out).unwrap();
    String::from_utf8(out).unwrap()
}

#[test]
fn reads_what_the_format_says() {
    let instance = read(SMALL.as_bytes(), "i.json", None).unwrap();
    assert_eq!(instance.masks(), 3);
    assert_eq!(instance.fragments_of(0), 0..2);
    assert_eq!(instance.feature_count(), 3);
    assert_eq!(instance.area(2), 7);
    assert_eq!(instance.allowed(3).bits(), 0b101);
    assert_eq!(instance.allowed(0).bits(), 0b111);
    assert_eq!(instance.pair(0), [[0, 2], [1, 2]]);
    let stitch = instance.stitches()[0];
    assert_eq!((stitch.a, stitch.b, stitch.weight), (0, 1, 4));
}

#[test]
fn the_documented_example_is_read() {
    let page = include_str!("instance-json.md");
    let example = page
        .split("```json\n")
        .nth(1)
        .unwrap()
        .split("```")
        .next()
        .unwrap();
    let instance = read(example.as_bytes(), "example", None).unwrap();
    assert_eq!(instance.fragment_count(), 6);
    assert_eq!(instance.self_spacings(), [[0, 2]]);
}

#[test]
fn what_is_written_is_read_again() {
    let first = read(SMALL.as_bytes(), "i.json", None).unwrap();
    let text = written(&first);
    let second = read(text.as_bytes(), "i.json", None).unwrap();
    assert_eq!(first, second);
    assert_eq!(text, written(&second));
    let empty = InstanceBuilder::new(2).build().unwrap();
    let again = read(written(&empty).as_bytes(), "i.json", None).unwrap();
    assert_eq!(empty, again);
}

#[test]
fn random_instances_survive_the_round_trip() {
    use rand::{Rng, SeedableRng};
    let mut random = rand_pcg::Pcg64::seed_from_u64(7);
    for _ in 0..200 {
        let mut builder = InstanceBuilder::new(random.random_range(1..=8));
        let mut firsts = Vec::new();
        for _ in 0..random.random_range(1..60) {
            let count = random.random_range(1..4);
            let first = builder.feature(count);
            for f in first..first + count - 1 {
                builder.stitch(f, f + 1, random.random_range(1..5));
            }
            builder.area(first, random.random());
            builder.allow(first, MaskSet::only(0));
            if count == 3 && random.random() {
                builder.self_spacing(first, first + 2);
            }
            firsts.push(first);
        }
        for two in firsts.windows(2) {
            builder.pair([[two[0], two[1]]]);
        }
        let instance = builder.build().unwrap();
        let text = written(&instance);
        assert_eq!(read(text.as_bytes(), "i.json", None).unwrap(), instance);
    }
}

#[test]
fn masks_can_be_overridden_unless_fixed() {
    let free = SMALL.replace("\"allowed\":[[3,[1,3]]],\n", "");
    assert_eq!(read(free.as_bytes(), "i.json", Some(5)).unwrap().masks(), 5);
    let fixed = read(SMALL.as_bytes(), "i.json", Some(4)).unwrap_err();
    assert!(fixed.to_string().contains("4 masks cannot be asked for"));
    assert_eq!(
        read(SMALL.as_bytes(), "i.json", Some(3)).unwrap().masks(),
        3
    );
}

#[test]
fn numbers_that_are_too_large_are_named_without_types() {
    let text = r#"{"format":"maskproof-instance","version":1,"masks":2,"features":[99999999999]}"#;
    let error = read(text.as_bytes(), "i.json", None)
        .unwrap_err()
        .to_string();
    assert!(error.contains("99999999999"), "{error}");
    assert!(
        error.ends_with("a whole number from 0 to 4294967295 is needed"),
        "{error}"
    );
}

#[test]
fn errors_name_line_and_column() {
    let unknown = SMALL.replace("\"stitches\"", "\"stiches\"");
    assert_eq!(
        error(&unknown),
        "i.json:6:10: unknown key \"stiches\": did you mean `stitches`?"
    );
    let version = SMALL.replace("\"version\":1", "\"version\":2");
    assert!(
        error(&version).starts_with("i.json:1:"),
        "{}",
        error(&version)
    );
    assert!(error(&version).contains("version is 2: this program reads version 1"));
    let format = SMALL.replace("maskproof-instance", "maskproof-colouring");
    assert!(error(&format).contains("it must be \"maskproof-instance\""));
    assert!(error(&SMALL.replace("\"masks\":3,", "")).contains("key `masks` is missing"));
    assert!(error(&SMALL.replace("\"masks\":3", "\"masks\":9")).contains("1 to 8 are possible"));
    assert!(error(&SMALL.replace("\"masks\":3", "\"masks\":0")).contains("1 to 8 are possible"));
    let twice = SMALL.replace("\"masks\":3", "\"masks\":3,\"masks\":3");
    assert!(error(&twice).contains("key `masks` is given twice"));
    assert!(error("").starts_with("i.json:1:0: EOF"));
    assert!(error(&SMALL[..60]).contains("EOF"));
    assert_eq!(
        error(&format!("{SMALL} x")),
        "i.json:6:23: trailing characters"
    );
    assert!(error(&SMALL.replace("[2,1,1]", "[2,-1,1]")).starts_with("i.json:2:"));
    assert!(error(&SMALL.replace("[[2,3]]", "[]")).contains("at least one fragment edge"));
}

#[test]
fn errors_name_the_list_entry() {
    assert!(error(&SMALL.replace("[2,1,1]", "[2,0,1]")).contains("features[1]: no fragments"));
    assert!(error(&SMALL.replace("[3,[1,3]]", "[4,[1]]")).contains("allowed[0]: no fragment 4"));
    assert!(error(&SMALL.replace("[3,[1,3]]", "[3,[4]]")).contains("allowed[0]: no mask 4"));
    assert!(error(&SMALL.replace("[3,[1,3]]", "[3,[0]]")).contains("allowed[0]: no mask 0"));
    assert!(error(&SMALL.replace("[3,[1,3]]", "[3,[]]")).contains("may take no mask"));
    assert!(error(&SMALL.replace("[5,6,7,8]", "[5,6]")).contains("2 areas for 4 fragments"));
    assert!(error(&SMALL.replace("[[2,3]]", "[[2,9]]")).contains("fragment 9"));
}

#[test]
fn huge_counts_are_refused_before_memory_is_used() {
    let huge = r#"{"format":"maskproof-instance","version":1,"masks":3,"features":[4294967295],"pairs":[]}"#;
    assert!(error(huge).contains("features[0]: more than 268435456 fragments"));
    let many = huge.replace("4294967295", "1,200000000");
    assert!(error(&many).contains("features[1]: 199999999 or more stitches are needed"));
}

#[test]
fn random_bytes_never_panic() {
    use rand::{Rng, SeedableRng};
    let mut random = rand_pcg::Pcg64::seed_from_u64(3);
    for _ in 0..3000 {
        let mut bytes = SMALL.as_bytes().to_vec();
        for _ in 0..random.random_range(1..4) {
            let at = random.random_range(0..bytes.len());
            bytes[at] = random.random_range(b' '..b'~');
        }
        let _ = read(&bytes[..], "i.json", None);
    }
}
