//! `certificate export` as users run it: what it refuses, and what the files say. Formulas are refuted by
//! plain unit propagation along their proofs, and pseudo-Boolean problems minimised by plain backtracking.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use std::fs;
use std::path::{Path, PathBuf};

use cli_support::*;

const FORMATS: [&str; 4] = ["cnf", "lrat", "drat", "veripb"];

/// The cases of the audit's corpus of a kind.
fn corpus(kind: &str) -> Vec<PathBuf> {
    let cases = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/audit")
        .join(kind);
    let mut cases: Vec<PathBuf> = fs::read_dir(cases)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .collect();
    cases.sort();
    assert!(cases.len() >= 8, "{kind}: {} cases", cases.len());
    cases
}

fn input(case: &Path) -> PathBuf {
    let names = ["input.col", "input.json", "input.gds"];
    let inputs = names.iter().map(|name| case.join(name));
    inputs.into_iter().find(|path| path.exists()).unwrap()
}

/// Exports the certificate in `case` into `out` below `dir`.
fn export(dir: &Path, case: &Path, input: &Path, format: &str, out: &str) -> Run {
    let [case, input] = [case, input].map(|path| path.to_str().unwrap());
    let words = ["certificate", "export", case, "--input", input];
    run(
        dir,
        &[&words[..], &["--format", format, "--out", out]].concat(),
    )
}

/// A triangle on two masks, solved: its directory, with the input in it.
fn triangle() -> tempfile::TempDir {
    let dir = place();
    let words = ["solve", "k3.col", "--masks", "2", "--out", "solved"];
    assert_eq!(run(dir.path(), &words).code, 1);
    dir
}

fn read(path: PathBuf) -> String {
    fs::read_to_string(path).unwrap()
}

/// Worked out by hand from the format's page and from the problem; the units in the order of the certificate, which
/// lists the pairs of feature 2 first.
#[test]
fn a_triangle_on_two_masks() {
    let dir = triangle();
    let (dir, solved) = (dir.path(), dir.path().join("solved"));
    for format in FORMATS {
        let run = export(dir, &solved, &dir.join("k3.col"), format, format);
        assert_eq!((run.code, &*run.stderr), (0, ""), "{}", run.stdout);
        let last = format!("\n1 bound written as {format} to {format}\n");
        assert!(run.stdout.ends_with(&last), "{}", run.stdout);
    }
    let formula = "\
c conflicts-0: a colouring that violates less than 1; there is none
c variable 1: fragment 0 on mask 1
c variable 2: fragment 0 on mask 2
c variable 3: fragment 1 on mask 1
c variable 4: fragment 1 on mask 2
c variable 5: fragment 2 on mask 1
c variable 6: fragment 2 on mask 2
p cnf 6 12
1 2 0
-1 -2 0
3 4 0
-3 -4 0
5 6 0
-5 -6 0
-1 -5 0
-2 -6 0
-3 -5 0
-4 -6 0
-1 -3 0
-2 -4 0
";
    for format in ["cnf", "lrat", "drat"] {
        assert_eq!(read(dir.join(format).join("conflicts-0.cnf")), formula);
    }
    let problem = "\
* #variable= 9 #constraint= 9
* f3m2: fragment 3 is on mask 2
* p1_4: some close fragments of features 1 and 4 are on one mask
* s3_5: fragments 3 and 5 of a feature are on one mask that does not join them
* r3_5i1, ...: ways along that feature, as format.md says
* c3_4: fragments 3 and 4 of a feature are on two masks
min: 1 p0_1 1 p0_2 1 p1_2 ;
1 f0m1 1 f0m2 = 1 ;
1 f1m1 1 f1m2 = 1 ;
1 f2m1 1 f2m2 = 1 ;
1 ~f0m1 1 ~f1m1 1 p0_1 >= 1 ;
1 ~f0m2 1 ~f1m2 1 p0_1 >= 1 ;
1 ~f0m1 1 ~f2m1 1 p0_2 >= 1 ;
1 ~f0m2 1 ~f2m2 1 p0_2 >= 1 ;
1 ~f1m1 1 ~f2m1 1 p1_2 >= 1 ;
1 ~f1m2 1 ~f2m2 1 p1_2 >= 1 ;
";
    assert_eq!(read(dir.join("veripb/claim.opb")), problem);
    let proof = read(dir.join("veripb/claim.pbp"));
    assert!(proof.starts_with("pseudo-Boolean proof version 3.0\nf 12;\nsoli "));
    let bound = "pbc 1 p0_2 1 p1_2 1 p0_1 >= 1 : subproof";
    assert!(proof.lines().any(|line| line == bound), "{proof}");
    let lines: Vec<&str> = proof.lines().rev().take(3).collect();
    assert_eq!(
        [lines[0], lines[2]],
        ["end pseudo-Boolean proof;", "output NONE;"]
    );
    let words: Vec<&str> = lines[1].split(' ').collect();
    assert_eq!(
        [&words[..4], &words[5..]].concat(),
        ["conclusion", "BOUNDS", "1", ":", "1;"]
    );
}

/// The clauses of a DIMACS file.
fn clauses(cnf: &str) -> Vec<Vec<i32>> {
    let mut lines = cnf.lines().filter(|line| !line.starts_with('c'));
    let head: Vec<&str> = lines.next().unwrap().split(' ').collect();
    let clauses: Vec<Vec<i32>> = lines.map(literals).collect();
    let used = clauses.iter().flatten().map(|lit| lit.abs()).max().unwrap();
    assert_eq!(head[..2], ["p", "cnf"]);
    assert_eq!(head[2].parse(), Ok(used));
    assert_eq!(head[3].parse(), Ok(clauses.len()));
    clauses
}

/// The numbers of a line up to its first 0.
fn literals(line: &str) -> Vec<i32> {
    let numbers = line.split(' ').map(|word| word.parse().unwrap());
    numbers.take_while(|&number| number != 0).collect()
}

/// Whether unit propagation from "all of `clause` is false" ends in a contradiction.
fn follows(known: &[Vec<i32>], clause: &[i32]) -> bool {
    let mut holds: Vec<i32> = clause.iter().map(|literal| -literal).collect();
    loop {
        let before = holds.len();
        for clause in known {
            if clause.iter().any(|literal| holds.contains(literal)) {
                continue;
            }
            let mut open = clause.iter().filter(|&literal| !holds.contains(&-literal));
            match (open.next().copied(), open.next()) {
                (None, _) => return true,
                (Some(literal), None) => holds.push(literal),
                _ => {}
            }
        }
        if holds.len() == before {
            return false;
        }
    }
}

/// Every clause of a DRAT proof follows, and the last one is empty.
fn refutes(cnf: &str, drat: &str) -> bool {
    let mut known = clauses(cnf);
    for clause in drat.lines().map(literals) {
        if !follows(&known, &clause) {
            return false;
        }
        known.push(clause);
    }
    known.last().is_some_and(Vec::is_empty)
}

/// The least value of the objective of an OPB file, by trying everything, false first.
fn least(opb: &str) -> u64 {
    let mut search = Search::default();
    for line in opb.lines().filter(|line| !line.starts_with('*')) {
        let words: Vec<&str> = line.split_ascii_whitespace().collect();
        if words[0] == "min:" {
            for two in words[1..words.len() - 1].chunks(2) {
                let (variable, _) = search.literal(two[1]);
                search.costs.push((variable, two[0].parse().unwrap()));
            }
            continue;
        }
        let relation = words.iter().position(|word| word.contains('=')).unwrap();
        assert_eq!(words[relation + 1..], ["1", ";"]);
        let mut sum = Vec::new();
        for two in words[..relation].chunks(2) {
            assert_eq!(two[0], "1");
            sum.push(search.literal(two[1]));
        }
        search.constraints.push((sum, words[relation] == "="));
    }
    let mut values = vec![None; search.names.len()];
    let mut best = u64::MAX;
    search.search(&mut values, &mut best);
    best
}

#[derive(Default)]
struct Search {
    names: Vec<String>,
    costs: Vec<(usize, u64)>,
    /// Literals of which at least one, or exactly one, is true.
    constraints: Vec<(Vec<(usize, bool)>, bool)>,
}

impl Search {
    fn literal(&mut self, word: &str) -> (usize, bool) {
        let name = word.trim_start_matches('~');
        let found = self.names.iter().position(|known| known == name);
        let at = found.unwrap_or_else(|| {
            self.names.push(name.to_owned());
            self.names.len() - 1
        });
        (at, !word.starts_with('~'))
    }

    fn search(&self, values: &mut Vec<Option<bool>>, best: &mut u64) {
        let count = |sum: &[(usize, bool)], wanted: fn(bool) -> bool| {
            let known = sum
                .iter()
                .filter_map(|&(at, sign)| Some(values[at]? == sign));
            known.filter(|&holds| wanted(holds)).count()
        };
        let possible = self.constraints.iter().all(|(sum, exactly)| {
            count(sum, |holds| !holds) < sum.len() && !(*exactly && count(sum, |holds| holds) > 1)
        });
        let paid = self
            .costs
            .iter()
            .filter(|(at, _)| values[*at] == Some(true));
        let cost: u64 = paid.map(|(_, cost)| cost).sum();
        if !possible || cost >= *best {
            return;
        }
        // Prices come first in the file and are forced in the end, so the last variables are tried first.
        let Some(next) = values.iter().rposition(Option::is_none) else {
            *best = cost;
            return;
        };
        for value in [false, true] {
            values[next] = Some(value);
            self.search(values, best);
        }
        values[next] = None;
    }
}

#[test]
fn every_correct_certificate_in_every_format() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let mut shown = 0;
    for case in corpus("correct") {
        let name = case.file_name().unwrap().to_str().unwrap().to_owned();
        let certificate: serde_json::Value =
            serde_json::from_str(&read(case.join("certificate/certificate.json"))).unwrap();
        let bounds: Vec<String> = ["conflicts", "stitches"]
            .iter()
            .zip(["conflict_bounds", "stitch_bounds"])
            .flat_map(|(level, member)| {
                let count = certificate[member].as_array().unwrap().len();
                (0..count).map(move |i| format!("{level}-{i}"))
            })
            .collect();
        for format in FORMATS {
            let out = format!("{name}-{format}");
            let run = export(dir, &case, &input(&case), format, &out);
            assert_eq!(run.code, 0, "{name}: {}{}", run.stdout, run.stderr);
            let ends: &[&str] = if format == "cnf" {
                &["cnf"]
            } else {
                &["cnf", format]
            };
            let each = bounds
                .iter()
                .flat_map(|b| ends.iter().map(move |end| format!("{b}.{end}")));
            let mut files: Vec<String> = each.collect();
            files.sort();
            if format == "veripb" {
                files = vec!["claim.opb".to_owned(), "claim.pbp".to_owned()];
            }
            assert_eq!(names(&dir.join(out)), files, "{name}");
        }
        let path = |format: &str, file: &str| dir.join(format!("{name}-{format}")).join(file);
        for bound in &bounds {
            let cnf = read(path("drat", &format!("{bound}.cnf")));
            assert_eq!(read(path("cnf", &format!("{bound}.cnf"))), cnf);
            let drat = read(path("drat", &format!("{bound}.drat")));
            assert!(refutes(&cnf, &drat), "{name}, {bound}: {drat}");
            let kept = |line: &&str| !line.contains(" d ");
            let lrat = read(path("lrat", &format!("{bound}.lrat")));
            let additions = lrat
                .lines()
                .filter(kept)
                .map(|line| literals(line)[1..].to_vec());
            assert!(additions.eq(drat.lines().map(literals)), "{name}, {bound}");
            shown += 1;
        }
        let opb = read(path("veripb", "claim.opb"));
        let cost = |level: &str| certificate[level]["upper"].as_u64().unwrap();
        let weights = opb.lines().find(|line| line.starts_with("min:")).unwrap();
        let words: Vec<&str> = weights.split_ascii_whitespace().collect();
        let stitches = words.windows(2).filter(|two| two[1].starts_with('c'));
        let heavier: u64 = 1 + stitches
            .map(|two| two[0].parse::<u64>().unwrap())
            .sum::<u64>();
        // Each colouring of the corpus is of least cost, those that prove nothing too.
        assert_eq!(
            least(&opb),
            heavier * cost("conflicts") + cost("stitches"),
            "{name}"
        );
    }
    assert!(shown >= 8, "{shown} bounds");
}

/// A proof that does not refute is seen by the checker above.
#[test]
fn plain_propagation_refuses_what_does_not_follow() {
    let cnf = "p cnf 2 3\n1 2 0\n-1 2 0\n1 -2 0\n";
    assert!(!refutes(cnf, "1 0\n0\n"));
    assert!(!refutes(cnf, "1 0\n"));
    assert!(refutes(
        "p cnf 2 4\n1 2 0\n-1 2 0\n1 -2 0\n-1 -2 0\n",
        "1 0\n0\n"
    ));
    assert_eq!(least("min: 3 aa 2 bb ;\n1 aa 1 bb = 1 ;\n"), 2);
    assert_eq!(
        least("min: 3 aa 2 bb ;\n1 aa 1 ~bb >= 1 ;\n1 bb 1 cc >= 1 ;\n"),
        0
    );
}

#[test]
fn the_same_bytes_on_one_thread_and_two() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let block = routed();
    let block = block.to_str().unwrap();
    let rules = ["--layer", "68/20", "--masks", "2", "--spacing", "500"];
    let words = ["solve", block, "--out", "solved", "--stitch", "uncovered"];
    assert_eq!(run(dir, &[&words[..], &rules].concat()).code, 1);
    for format in FORMATS {
        for threads in ["1", "2"] {
            let out = format!("{format}-{threads}");
            let words = ["certificate", "export", "solved", "--input", block];
            let more = ["--format", format, "--out", &out, "--threads", threads];
            assert_eq!(run(dir, &[&words[..], &more].concat()).code, 0);
        }
        let [one, two] = ["1", "2"].map(|threads| dir.join(format!("{format}-{threads}")));
        let files = names(&one);
        assert!(files.len() >= 2, "{files:?}");
        assert_eq!(files, names(&two));
        for file in files {
            let [one, two] = [&one, &two].map(|out| fs::read(out.join(&file)).unwrap());
            assert!(one == two, "{format}: {file} differs");
        }
    }
}

#[test]
fn what_the_audit_refuses_is_not_exported() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    for (kind, code) in [("incorrect", 5), ("malformed", 3)] {
        for (case, format) in corpus(kind).iter().zip(FORMATS.iter().cycle()) {
            let input = input(case);
            let run = export(dir, case, &input, format, "out");
            let words = [
                "audit",
                case.to_str().unwrap(),
                "--input",
                input.to_str().unwrap(),
            ];
            let audited = cli_support::run(dir, &words);
            assert_eq!(run.code, code, "{}: {}", case.display(), run.stdout);
            assert_eq!((run.stdout, run.stderr), (audited.stdout, audited.stderr));
            assert_eq!(names(dir), [""; 0], "{}", case.display());
        }
    }
}

#[test]
fn nothing_that_stands_at_out_is_replaced() {
    let dir = triangle();
    let (dir, solved) = (dir.path(), dir.path().join("solved"));
    let input = dir.join("k3.col");
    fs::create_dir(dir.join("mine")).unwrap();
    fs::write(dir.join("mine/notes.txt"), "mine").unwrap();
    fs::write(dir.join("file"), "mine").unwrap();
    fs::create_dir(dir.join("empty")).unwrap();
    let before = names(dir);
    for out in ["mine", "file", "solved", ".", ".."] {
        for format in FORMATS {
            let run = export(dir, &solved, &input, format, out);
            assert_eq!((run.code, &*run.stdout), (USAGE, ""), "{out}");
            assert!(
                run.stderr.starts_with("maskproof: --out: "),
                "{}",
                run.stderr
            );
            assert_eq!(run.stderr.lines().count(), 1, "{}", run.stderr);
        }
    }
    assert_eq!(names(dir), before);
    assert_eq!(names(&dir.join("mine")), ["notes.txt"]);
    assert!(solved.join("result.json").exists());
    for (format, code) in [("drat", 0), ("cnf", USAGE)] {
        assert_eq!(export(dir, &solved, &input, format, "empty").code, code);
    }
    assert_eq!(
        names(&dir.join("empty")),
        ["conflicts-0.cnf", "conflicts-0.drat"]
    );
    assert_eq!(names(dir), before);
}

#[test]
fn the_command_line_says_what_is_missing() {
    let dir = triangle();
    let dir = dir.path();
    let export = ["certificate", "export", "solved"];
    let [input, drat] = [["--input", "k3.col"], ["--format", "drat"]];
    let cases: [(Vec<&str>, i32, &str); 5] = [
        (
            [&export[..], &input, &drat].concat(),
            USAGE,
            "--out is missing",
        ),
        (
            [&export[..], &input, &["--out", "out"]].concat(),
            USAGE,
            "--format is missing",
        ),
        (
            [&export[..], &input, &["--format", "svg", "--out", "out"]].concat(),
            USAGE,
            "one of cnf, lrat, drat, veripb is needed",
        ),
        (
            [
                &export[..],
                &["--input", "none.col"],
                &drat,
                &["--out", "out"],
            ]
            .concat(),
            BAD_INPUT,
            "none.col",
        ),
        (
            vec!["certificate", "import"],
            USAGE,
            "import: no such command",
        ),
    ];
    for (words, code, said) in cases {
        let run = run(dir, &words);
        assert_eq!(run.code, code, "{words:?}: {}", run.stderr);
        assert!(run.stderr.contains(said), "{words:?}: {}", run.stderr);
        assert_eq!(run.stderr.lines().count(), 1);
        assert!(!dir.join("out").exists());
    }
}
