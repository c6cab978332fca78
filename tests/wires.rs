//! The instances of random wires with stitches, against the least costs that RC2 over CaDiCaL
//! (python-sat 1.9) found for them: see tests/data/README.md. `check_graphs.py` recomputes two of
//! them live, the benchmark all three.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::enumerate::Least;
use common::solver::{USUAL, solve};
use encodings::Instance;
use maskproof::formats::instance_json;
use std::fs::File;
use std::io::BufReader;
use std::path::PathBuf;
use std::time::Duration;

const LIMIT: Duration = Duration::from_secs(300);

fn read(name: &str) -> Instance {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join(format!("tests/data/{name}.json"));
    instance_json::read(BufReader::new(File::open(path).unwrap()), name, None).unwrap()
}

/// Fragments, pairs and stitch edges as the source counts them, then the least cost by the program
/// as it runs.
fn check(name: &str, sizes: [usize; 4], least: Least) {
    let instance = read(name);
    let found_sizes = [
        instance.feature_count(),
        instance.fragment_count(),
        instance.pair_count(),
        instance.stitches().len(),
    ];
    assert_eq!(
        found_sizes, sizes,
        "{name}: features, fragments, pairs, stitch edges"
    );
    let found = solve(&instance, USUAL, LIMIT);
    let bounds = (found.conflicts, found.stitches);
    let expected = ((least.0, least.0), (least.1, least.1));
    assert_eq!(bounds, expected, "{name}");
    let cost = instance.cost(&found.colouring);
    assert_eq!(
        (cost.conflicts, cost.stitches),
        least,
        "{name}: the colouring"
    );
}

#[test]
fn small_wires_on_two_masks() {
    check("wires_s", [662, 1724, 953, 1062], (118, 13));
}

#[test]
fn wires_on_two_masks() {
    check("wires_m2", [2504, 6532, 3581, 4028], (451, 52));
}

#[test]
fn wires_on_three_masks() {
    check("wires_m3", [2504, 6325, 5880, 3821], (126, 54));
}
