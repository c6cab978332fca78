//! Runs the program as users do, and writes small inputs for it.
#![allow(dead_code, clippy::unwrap_used, clippy::expect_used)]

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// What a run of the program left behind.
pub struct Run {
    pub code: i32,
    pub stdout: String,
    pub stderr: String,
}

/// The program, to be run in `dir`.
pub fn program(dir: &Path, args: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_maskproof"));
    command.args(args).current_dir(dir);
    command
}

/// Runs the program in `dir`.
pub fn run(dir: &Path, args: &[&str]) -> Run {
    finished(program(dir, args).output().unwrap())
}

/// A finished run; a run that a signal ended has code -1.
pub fn finished(output: Output) -> Run {
    Run {
        code: output.status.code().unwrap_or(-1),
        stdout: String::from_utf8(output.stdout).unwrap(),
        stderr: String::from_utf8(output.stderr).unwrap(),
    }
}

/// The routed block; `tests/data/README.md` tells its origin.
pub fn routed() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/routed_sky130.gds")
}

/// All names in a directory, hidden ones too, sorted.
pub fn names(dir: &Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(dir)
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    names
}

/// A member of `result.json` in `dir`.
pub fn result(dir: &Path) -> serde_json::Value {
    serde_json::from_slice(&fs::read(dir.join("result.json")).unwrap()).unwrap()
}

/// A GDSII record.
pub fn record(kind: u16, data: &[u8]) -> Vec<u8> {
    let mut bytes = ((data.len() + 4) as u16).to_be_bytes().to_vec();
    bytes.extend(kind.to_be_bytes());
    bytes.extend(data);
    bytes
}

fn name(text: &str) -> Vec<u8> {
    let mut bytes = text.as_bytes().to_vec();
    bytes.resize(bytes.len().next_multiple_of(2), 0);
    bytes
}

fn numbers(values: &[i32]) -> Vec<u8> {
    values
        .iter()
        .flat_map(|value| value.to_be_bytes())
        .collect()
}

/// A rectangle on a layer.
pub fn boundary(layer: u16, datatype: u16, [x1, y1, x2, y2]: [i32; 4]) -> Vec<u8> {
    let corners = numbers(&[x1, y1, x2, y1, x2, y2, x1, y2, x1, y1]);
    [
        record(0x0800, &[]),
        record(0x0d02, &layer.to_be_bytes()),
        record(0x0e02, &datatype.to_be_bytes()),
        record(0x1003, &corners),
        record(0x1100, &[]),
    ]
    .concat()
}

/// A reference to a cell, put at the origin.
pub fn reference(cell: &str) -> Vec<u8> {
    [
        record(0x0a00, &[]),
        record(0x1206, &name(cell)),
        record(0x1003, &numbers(&[0, 0])),
        record(0x1100, &[]),
    ]
    .concat()
}

/// An array of a cell.
pub fn array(cell: &str, columns: u16, rows: u16) -> Vec<u8> {
    [
        record(0x0b00, &[]),
        record(0x1206, &name(cell)),
        record(
            0x1302,
            &[columns.to_be_bytes(), rows.to_be_bytes()].concat(),
        ),
        record(
            0x1003,
            &numbers(&[
                0,
                0,
                i32::from(columns as i16) * 1000,
                0,
                0,
                i32::from(rows as i16) * 1000,
            ]),
        ),
        record(0x1100, &[]),
    ]
    .concat()
}

/// A library of cells, 1 nm a database unit.
pub fn gds(cells: &[(&str, Vec<u8>)]) -> Vec<u8> {
    let time = [0u8; 24];
    let units = [
        0x3e, 0x41, 0x89, 0x37, 0x4b, 0xc6, 0xa7, 0xf0, 0x39, 0x44, 0xb8, 0x2f, 0xa0, 0x9b, 0x5a,
        0x54,
    ];
    let mut bytes = [
        record(0x0002, &600u16.to_be_bytes()),
        record(0x0102, &time),
        record(0x0206, &name("lib")),
        record(0x0305, &units),
    ]
    .concat();
    for (cell, elements) in cells {
        bytes.extend(record(0x0502, &time));
        bytes.extend(record(0x0606, &name(cell)));
        bytes.extend(elements);
        bytes.extend(record(0x0700, &[]));
    }
    bytes.extend(record(0x0400, &[]));
    bytes
}

/// Five squares in a row, 100 nm apart, on 1/0, and a lone one on 2/0.
pub fn row_of_squares() -> Vec<u8> {
    let squares = (0..5).flat_map(|i| boundary(1, 0, [i * 200, 0, i * 200 + 100, 100]));
    let lone = boundary(2, 0, [0, 0, 100, 100]);
    gds(&[("top", squares.chain(lone).collect())])
}

/// A pseudo-random graph as `.col`: each of the pairs is an edge with probability one half.
pub fn random_col(vertices: u32, mut seed: u64) -> String {
    let mut edges = String::new();
    let mut count = 0;
    for a in 1..=vertices {
        for b in a + 1..=vertices {
            // The linear congruential generator of Knuth's MMIX.
            seed = seed
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            if seed >> 63 == 1 {
                edges += &format!("e {a} {b}\n");
                count += 1;
            }
        }
    }
    format!("p edge {vertices} {count}\n{edges}")
}

/// The exit code of a wrong command line.
pub const USAGE: i32 = 2;

/// The exit code of a wrong input file.
pub const BAD_INPUT: i32 = 3;

/// Runs `solve ... --out out` in `dir` and checks the refusal: the code, a single line on stderr that
/// holds all of `said`, nothing on stdout, no new file.
pub fn refused(dir: &Path, args: &[&str], code: i32, said: &[&str]) {
    let before = names(dir);
    let run = run(dir, &[&["solve"], args, &["--out", "out"]].concat());
    let shown = format!("{args:?}: code {}, stderr {}", run.code, run.stderr);
    assert_eq!(run.code, code, "{shown}");
    assert!(run.stderr.starts_with("maskproof: "), "{shown}");
    assert_eq!(run.stderr.lines().count(), 1, "{shown}");
    for part in said {
        assert!(run.stderr.contains(part), "{part:?} is missing: {shown}");
    }
    assert_eq!(run.stdout, "", "{shown}");
    assert_eq!(names(dir), before, "{shown}");
}

/// A directory with the small inputs that the tests use.
pub fn place() -> tempfile::TempDir {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("row.gds"), row_of_squares()).unwrap();
    fs::write(
        dir.path().join("k3.col"),
        "p edge 3 3\ne 1 2\ne 1 3\ne 2 3\n",
    )
    .unwrap();
    dir
}

pub const RULES: [&str; 6] = ["--layer", "1/0", "--masks", "2", "--spacing", "150"];

pub fn with_rules<'a>(input: &'a str, more: &[&'a str]) -> Vec<&'a str> {
    [&[input], &RULES[..], more].concat()
}
