//! Which room uses which: the table in DEVELOPERS.md, checked against every path of the source.
//!
//! The rules are those of the design's section 3: a room names only the rooms that its row permits,
//! `solve` alone names a solver, `encodings` does no input or output and names no solver, and the
//! GDSII crate stays behind one module.
#![allow(clippy::unwrap_used, clippy::expect_used)]

#[path = "rooms/paths.rs"]
mod paths;

use paths::{NamedPath, named_paths};
use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

/// Crates that decide satisfiability or optimise, in use or thinkable.
const SOLVERS: &[&str] = &[
    "varisat",
    "good_lp",
    "microlp",
    "minilp",
    "highs",
    "highs_sys",
    "splr",
    "batsat",
    "cadical",
    "rustsat",
    "lp_modeler",
    "clarabel",
    "scip",
    "russcip",
    "coin_cbc",
    "screwsat",
    "minisat",
];

/// What the audit may use of `geometry`.
const NOUNS: &[&str] = &["Point", "Rect", "COORDINATE_LIMIT"];

/// The whole top level, hidden files and Cargo.lock apart.
const TOP_LEVEL: &[&str] = &[
    "Cargo.toml",
    "DEVELOPERS.md",
    "LICENSE",
    "README.md",
    "benchmarks",
    "encodings",
    "src",
    "tests",
];

type Table = BTreeMap<String, BTreeSet<String>>;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// The table under the heading "The rooms", row by row.
fn room_table(page: &str) -> Table {
    let section = page.split("## The rooms").nth(1).unwrap_or_default();
    section
        .lines()
        .skip_while(|line| !line.starts_with("|---"))
        .skip(1)
        .take_while(|line| line.starts_with('|'))
        .map(|line| {
            let cells: Vec<&str> = line.split('|').map(str::trim).collect();
            let uses = cells[2]
                .split(',')
                .map(str::trim)
                .filter(|name| !name.is_empty());
            (cells[1].to_owned(), uses.map(str::to_owned).collect())
        })
        .collect()
}

/// A source file of the library: its room and how deep below the crate's root its module lies.
fn place(relative: &Path) -> (String, usize) {
    let parts: Vec<&str> = relative.iter().map(|part| part.to_str().unwrap()).collect();
    let room = parts[0].trim_end_matches(".rs").to_owned();
    let is_root = ["lib", "main"].contains(&room.as_str());
    let is_mod = *parts.last().unwrap() == "mod.rs";
    let depth = parts.len() - usize::from(is_mod) - usize::from(is_root);
    (room, depth)
}

/// The files that another file takes in by `#[path]`, with their depth: one below that file.
fn taken_in(relative: &Path, source: &str) -> Vec<(PathBuf, usize)> {
    source
        .lines()
        .filter_map(|line| line.trim().strip_prefix("#[path = \"")?.strip_suffix("\"]"))
        .map(|name| (relative.with_file_name(name), place(relative).1 + 1))
        .collect()
}

/// What is wrong with one file of the library whose module lies `depth` below the crate's root, judged
/// by the table.
fn violations(table: &Table, relative: &Path, depth: usize, source: &str) -> Vec<String> {
    let room = place(relative).0;
    let is_root = ["lib", "main"].contains(&room.as_str());
    let mut wrong = Vec::new();
    if !is_root && !table.contains_key(&room) {
        wrong.push(format!(
            "{}: room {room} has no row in the table",
            relative.display()
        ));
    }
    for path in named_paths(source, depth) {
        let reason = if is_root {
            None
        } else {
            room_violation(table, &room, &path)
        };
        let reason = reason.or_else(|| crate_violation(relative, &room, &path));
        if let Some(reason) = reason {
            let (file, line) = (relative.display(), path.line);
            wrong.push(format!(
                "{file}:{line}: {}: {reason}",
                path.segments.join("::")
            ));
        }
    }
    wrong
}

fn room_violation(table: &Table, room: &str, path: &NamedPath) -> Option<String> {
    if !["crate", "maskproof"].contains(&path.segments[0].as_str()) {
        return None;
    }
    match path.segments.get(1).map(String::as_str) {
        None | Some("*" | "self") => Some("the whole crate is named: name a room".to_owned()),
        Some(used) if used == room => None,
        Some(used) if !table.contains_key(used) => Some(format!("{used} is no room")),
        Some(used) if !table.get(room)?.contains(used) => {
            Some(format!("room {room} may not use {used}"))
        }
        Some("geometry") if room == "audit" => {
            let noun = path.segments.get(2).map(String::as_str);
            let reason = || "the audit has a geometry of its own: it may use points and rectangles";
            (!noun.is_some_and(|noun| NOUNS.contains(&noun))).then(|| reason().to_owned())
        }
        Some(_) => None,
    }
}

fn crate_violation(relative: &Path, room: &str, path: &NamedPath) -> Option<String> {
    let first = path.segments[0].as_str();
    if SOLVERS.contains(&first) && room != "solve" {
        return Some("only the room solve may name a solver".to_owned());
    }
    let wrapper =
        relative.starts_with("formats/gdsii") || relative == Path::new("formats/gdsii.rs");
    (first == "gdsii" && !wrapper)
        .then(|| "only formats::gdsii may name the GDSII crate".to_owned())
}

/// What is wrong with one file of the member crate `encodings`.
fn encodings_violations(file: &str, source: &str) -> Vec<String> {
    named_paths(source, 8)
        .into_iter()
        .filter_map(|path| {
            let segments: Vec<&str> = path.segments.iter().map(String::as_str).collect();
            let reason = match segments[..] {
                [name, ..] if SOLVERS.contains(&name) => "encodings names no solver",
                ["maskproof", ..] => "encodings uses no room of the root package",
                ["std", "fs" | "io" | "net" | "process" | "env", ..] => "encodings does no I/O",
                ["std", "*"] => "the whole of std is named",
                _ => return None,
            };
            Some(format!(
                "{file}:{}: {}: {reason}",
                path.line,
                segments.join("::")
            ))
        })
        .collect()
}

fn rust_files(folder: &Path) -> Vec<PathBuf> {
    let mut files = Vec::new();
    let mut folders = vec![folder.to_owned()];
    while let Some(folder) = folders.pop() {
        for entry in fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|extension| extension == "rs") {
                files.push(path);
            }
        }
    }
    files.sort();
    files
}

#[test]
fn rooms_use_only_what_the_table_permits() {
    let table = room_table(&fs::read_to_string(root().join("DEVELOPERS.md")).unwrap());
    assert!(
        table.len() >= 8,
        "the table of rooms was not found: {table:?}"
    );
    let src = root().join("src");
    let files = rust_files(&src);
    assert!(files.len() >= 8, "too few sources under {}", src.display());
    let sources: Vec<(&Path, String)> = files
        .iter()
        .map(|file| {
            (
                file.strip_prefix(&src).unwrap(),
                fs::read_to_string(file).unwrap(),
            )
        })
        .collect();
    let moved: BTreeMap<PathBuf, usize> = sources
        .iter()
        .flat_map(|(relative, source)| taken_in(relative, source))
        .collect();
    let wrong: Vec<String> = sources
        .iter()
        .flat_map(|(relative, source)| {
            let depth = moved.get(*relative).copied().unwrap_or(place(relative).1);
            violations(&table, relative, depth, source)
        })
        .collect();
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

#[test]
fn the_table_is_a_flow() {
    let mut page = fs::read_to_string(root().join("DEVELOPERS.md")).unwrap();
    let table = room_table(&page);
    for (room, uses) in &table {
        for used in uses {
            assert!(
                table.contains_key(used),
                "{room} may use {used}, which has no row"
            );
        }
    }
    // Rooms are listed in flow order: a row names only rows above it.
    page = page.split("## The rooms").nth(1).unwrap().to_owned();
    let row = |room: &str| page.find(&format!("\n| {room} |")).unwrap();
    for (room, uses) in &table {
        for used in uses {
            assert!(
                row(used) < row(room),
                "{room} may use {used}, which comes after it"
            );
        }
    }
}

#[test]
fn encodings_does_no_io_and_names_no_solver() {
    let src = root().join("encodings/src");
    let wrong: Vec<String> = rust_files(&src)
        .iter()
        .flat_map(|file| {
            let name = file.strip_prefix(&src).unwrap().to_str().unwrap();
            encodings_violations(name, &fs::read_to_string(file).unwrap())
        })
        .collect();
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
    let manifest = fs::read_to_string(root().join("encodings/Cargo.toml")).unwrap();
    let manifest: toml::Table = manifest.parse().unwrap();
    let needed = manifest["dependencies"].as_table().unwrap();
    let solver = needed
        .keys()
        .find(|name| SOLVERS.contains(&name.replace('-', "_").as_str()));
    assert_eq!(solver, None, "encodings links a solver");
}

/// The files that git tracks, or without git those that are there, by their first part.
fn top_level() -> BTreeSet<String> {
    let listed = Command::new("git")
        .arg("ls-files")
        .current_dir(root())
        .output();
    let names: BTreeSet<String> = match listed {
        Ok(output) if output.status.success() && !output.stdout.is_empty() => {
            String::from_utf8(output.stdout)
                .unwrap()
                .lines()
                .map(|line| line.split('/').next().unwrap().to_owned())
                .collect()
        }
        _ => fs::read_dir(root())
            .unwrap()
            .map(|entry| entry.unwrap().file_name().into_string().unwrap())
            .filter(|name| name != "target")
            .collect(),
    };
    names
        .into_iter()
        .filter(|name| !name.starts_with('.') && name != "Cargo.lock")
        .collect()
}

#[test]
fn the_top_level_is_the_permitted_one() {
    let permitted: BTreeSet<String> = TOP_LEVEL.iter().map(|&name| name.to_owned()).collect();
    assert_eq!(top_level(), permitted);
}

const MADE_UP_PAGE: &str = "
## The rooms, and what each may use

| room | may use |
|---|---|
| geometry | |
| layout | geometry |
| solve | layout |
";

#[test]
fn the_table_is_read_as_written() {
    let table = room_table(MADE_UP_PAGE);
    let uses = |room: &str| table[room].iter().map(String::as_str).collect::<Vec<_>>();
    assert_eq!(table.len(), 3);
    assert_eq!(uses("geometry"), [""; 0]);
    assert_eq!(uses("solve"), ["layout"]);
}

/// How many violations the checker sees in a made-up file.
fn seen(relative: &str, source: &str) -> usize {
    let relative = Path::new(relative);
    violations(
        &room_table(MADE_UP_PAGE),
        relative,
        place(relative).1,
        source,
    )
    .len()
}

#[test]
fn the_checker_sees_each_kind_of_violation() {
    assert_eq!(seen("layout/mod.rs", "use crate::solve::Outcome;"), 1);
    assert_eq!(
        seen(
            "layout/mod.rs",
            "use crate::{geometry::Point, solve::{A, B}};"
        ),
        2
    );
    assert_eq!(
        seen("layout/mod.rs", "fn f() -> crate::solve::A { todo() }"),
        1
    );
    assert_eq!(seen("layout/mod.rs", "use super::solve::A;"), 1);
    assert_eq!(seen("layout/shapes.rs", "use super::super::solve::A;"), 1);
    assert_eq!(
        seen(
            "layout/shapes.rs",
            "mod tests { use super::super::super::solve::A; }"
        ),
        1
    );
    assert_eq!(seen("layout/mod.rs", "use crate as everything;"), 1);
    assert_eq!(seen("layout/mod.rs", "use crate::*;"), 1);
    assert_eq!(seen("layout/mod.rs", "use maskproof::solve::A;"), 1);
    assert_eq!(seen("layout/mod.rs", "use varisat::Solver;"), 1);
    assert_eq!(seen("layout/mod.rs", "use varisat as v;"), 1);
    assert_eq!(
        seen("layout/mod.rs", "let s = ::varisat::Solver::new();"),
        1
    );
    assert_eq!(seen("layout/mod.rs", "extern crate varisat;"), 1);
    assert_eq!(seen("layout/mod.rs", "use gdsii::Library;"), 1);
    assert_eq!(seen("cellar/mod.rs", ""), 1);
    assert_eq!(seen("geometry/mod.rs", "use crate::attic::A;"), 1);
    assert_eq!(
        encodings_violations("a.rs", "use std::{fs, fmt, io::Write};").len(),
        2
    );
    assert_eq!(encodings_violations("a.rs", "use varisat::Lit;").len(), 1);
}

#[test]
fn the_audit_uses_the_nouns_of_geometry_only() {
    let page =
        "## The rooms\n| room | may use |\n|---|---|\n| geometry | |\n| audit | geometry |\n";
    let table = room_table(page);
    let seen = |source| violations(&table, Path::new("audit/layer/near.rs"), 3, source).len();
    assert_eq!(seen("use crate::geometry::{Point, Rect};"), 0);
    assert_eq!(seen("let l = crate::geometry::COORDINATE_LIMIT;"), 0);
    assert_eq!(seen("use crate::geometry::slabs::cells_of_rects;"), 1);
    assert_eq!(
        seen("use crate::geometry::{Point, distance::squared_gap};"),
        1
    );
    assert_eq!(seen("use crate::geometry::*;"), 1);
    assert_eq!(seen("use crate::geometry;"), 1);
    assert_eq!(seen("let d = crate::geometry::distance::squared_gap;"), 1);
}

#[test]
fn a_file_taken_in_by_path_lies_deeper() {
    let source = "#[cfg(test)]\n#[path = \"shapes_tests.rs\"]\nmod tests;\n";
    let moved = taken_in(Path::new("layout/shapes.rs"), source);
    assert_eq!(moved, [(PathBuf::from("layout/shapes_tests.rs"), 3)]);
    let table = room_table(MADE_UP_PAGE);
    let seen = |source| violations(&table, &moved[0].0, moved[0].1, source).len();
    assert_eq!(seen("use super::super::rules::A;"), 0);
    assert_eq!(seen("use super::super::super::solve::A;"), 1);
}

#[test]
fn the_checker_lets_the_permitted_pass() {
    assert_eq!(
        seen(
            "layout/mod.rs",
            "use crate::geometry::Point; pub(crate) fn f() {}"
        ),
        0
    );
    assert_eq!(
        seen(
            "layout/shapes.rs",
            "use super::LayerId; use crate::layout::rules::A;"
        ),
        0
    );
    assert_eq!(
        seen(
            "layout/mod.rs",
            "mod tests { use super::*; use super::rules::A; }"
        ),
        0
    );
    assert_eq!(
        seen("solve/sat.rs", "use varisat::Solver; use crate::layout::A;"),
        0
    );
    assert_eq!(
        seen(
            "layout/mod.rs",
            "// use crate::solve::A;\n/* crate::solve */"
        ),
        0
    );
    assert_eq!(
        seen(
            "layout/mod.rs",
            r##"let a = "crate::solve"; let b = r#"x"crate::solve"#;"##
        ),
        0
    );
    assert_eq!(
        seen(
            "layout/mod.rs",
            "let c = '\"'; fn f<'a>(x: &'a str) {} let d = '\\'';"
        ),
        0
    );
    assert_eq!(
        encodings_violations("a.rs", "use std::{fmt, collections::BTreeMap};").len(),
        0
    );
}
