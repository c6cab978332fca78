//! Graphs in the `.col` format of the second DIMACS challenge.
//!
//! Source: "Clique and Coloring Problems Graph Format", DIMACS, 1993. Lines are `c` comments, one
//! `p edge N M` before the edges, and `e u v` with vertices 1..N; blanks and empty lines are free.
//! Published files also say `p col N M`, list edges once or in both directions, and let M count the
//! lines or the edges: both spellings are read, repeated edges are one edge, and M must be the number
//! of `e` lines or the number of different edges. Lines of the format's optional kinds (`n`, `d`,
//! `v`, `x`) are refused, since they ask for another problem.
//!
//! Each vertex is a feature of one fragment (vertex v is fragment v-1), each edge a conflict pair of
//! one fragment edge, in ascending order.

use super::error::{FormatError, Position};
use super::nearest::shown;
use encodings::{Instance, InstanceBuilder};
use thiserror::Error;

/// The most vertices that are read.
pub const MAX_VERTICES: u32 = 10_000_000;

/// What is wrong in a `.col` file.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
pub enum Problem {
    /// No `p` line at all, or an `e` line before it.
    #[error("{0}: a line `p edge VERTICES EDGES` must come before the edges")]
    NoProblemLine(&'static str),
    /// Two `p` lines.
    #[error("a second `p` line: there must be one")]
    SecondProblemLine,
    /// The line is of a kind that is not read.
    #[error("line begins with {0}: only `c`, `p` and `e` lines are read")]
    UnknownLine(String),
    /// The line has the wrong fields.
    #[error("{found} is not {expected}")]
    Fields {
        /// The line.
        found: String,
        /// The right form.
        expected: &'static str,
    },
    /// More vertices than are read.
    #[error("{0} vertices: at most {MAX_VERTICES} are read")]
    TooManyVertices(u64),
    /// A vertex that does not exist.
    #[error("vertex {vertex} is out of range: the `p` line announces vertices 1 to {count}")]
    OutOfRange {
        /// The number in the file.
        vertex: u64,
        /// How many vertices there are.
        count: u32,
    },
    /// An edge from a vertex to itself.
    #[error("edge from vertex {0} to itself: the two ends must differ")]
    Loop(u32),
    /// The announced count is wrong.
    #[error(
        "the `p` line announces {announced} edges, but there are {lines} `e` lines with {distinct} \
         different edges: it must announce one of these two numbers"
    )]
    WrongCount {
        /// M of the `p` line.
        announced: u64,
        /// How many `e` lines there are.
        lines: u64,
        /// How many different edges they list.
        distinct: u64,
    },
    /// The file is no text.
    #[error("line is not UTF-8 text: a `.col` file is plain text")]
    NotText,
}

/// Reads a graph as an instance of `masks` masks. `name` is the file's name, for errors.
///
/// Takes O(N + M log M) time, and memory for N vertices (17 bytes each) and the edges.
///
/// # Errors
/// The first wrong line, with its number; a wrong count is reported at the `p` line.
pub fn read(bytes: &[u8], name: &str, masks: u8) -> Result<Instance, FormatError> {
    let mut graph = Graph::default();
    let mut number = 0;
    for line in bytes.split(|&byte| byte == b'\n') {
        number += 1;
        graph
            .line(line, number)
            .map_err(|problem| FormatError::new(Position::line(name, number), problem))?;
    }
    let announced = graph.problem.ok_or_else(|| {
        let problem = Problem::NoProblemLine("the file ends without a `p` line");
        FormatError::new(Position::line(name, number), problem)
    })?;
    let edges = graph
        .distinct_edges(announced.edges)
        .map_err(|problem| FormatError::new(Position::line(name, announced.line), problem))?;
    let mut builder = InstanceBuilder::new(masks);
    for _ in 0..announced.vertices {
        builder.feature(1);
    }
    for [u, v] in edges {
        builder.pair([[u - 1, v - 1]]);
    }
    let instance = builder.build();
    instance.map_err(|error| FormatError::new(Position::file(name), error))
}

/// The `p` line.
#[derive(Clone, Copy)]
struct Announced {
    vertices: u32,
    edges: u64,
    line: u64,
}

#[derive(Default)]
struct Graph {
    problem: Option<Announced>,
    edges: Vec<[u32; 2]>,
}

impl Graph {
    fn line(&mut self, line: &[u8], number: u64) -> Result<(), Problem> {
        let line = line.trim_ascii();
        // Comments may be in any encoding.
        if line.is_empty() || (line[0] == b'c' && line.get(1).is_none_or(u8::is_ascii_whitespace)) {
            return Ok(());
        }
        let line = std::str::from_utf8(line).map_err(|_| Problem::NotText)?;
        let mut fields = line.split_ascii_whitespace();
        match fields.next() {
            Some("p") => self.problem_line(line, fields, number),
            Some("e") => self.edge_line(line, fields),
            first => Err(Problem::UnknownLine(shown(first.unwrap_or("")))),
        }
    }

    fn problem_line<'a>(
        &mut self,
        line: &str,
        mut fields: impl Iterator<Item = &'a str>,
        number: u64,
    ) -> Result<(), Problem> {
        if self.problem.is_some() {
            return Err(Problem::SecondProblemLine);
        }
        let wrong = || Problem::Fields {
            found: shown(line),
            expected: "`p edge VERTICES EDGES` with two numbers",
        };
        if !matches!(fields.next(), Some("edge" | "edges" | "col")) {
            return Err(wrong());
        }
        let [vertices, edges] = two_numbers(fields).ok_or_else(wrong)?;
        if vertices > u64::from(MAX_VERTICES) {
            return Err(Problem::TooManyVertices(vertices));
        }
        self.problem = Some(Announced {
            vertices: vertices as u32,
            edges,
            line: number,
        });
        Ok(())
    }

    fn edge_line<'a>(
        &mut self,
        line: &str,
        fields: impl Iterator<Item = &'a str>,
    ) -> Result<(), Problem> {
        let announced = self
            .problem
            .ok_or(Problem::NoProblemLine("an edge comes first"))?;
        let [u, v] = two_numbers(fields).ok_or_else(|| Problem::Fields {
            found: shown(line),
            expected: "`e VERTEX VERTEX` with two numbers",
        })?;
        let count = announced.vertices;
        if let Some(&vertex) = [u, v].iter().find(|&&n| n == 0 || n > u64::from(count)) {
            return Err(Problem::OutOfRange { vertex, count });
        }
        let (u, v) = (u as u32, v as u32);
        if u == v {
            return Err(Problem::Loop(u));
        }
        self.edges.push([u.min(v), u.max(v)]);
        Ok(())
    }

    fn distinct_edges(mut self, announced: u64) -> Result<Vec<[u32; 2]>, Problem> {
        let lines = self.edges.len() as u64;
        self.edges.sort_unstable();
        self.edges.dedup();
        let distinct = self.edges.len() as u64;
        if announced != lines && announced != distinct {
            return Err(Problem::WrongCount {
                announced,
                lines,
                distinct,
            });
        }
        Ok(self.edges)
    }
}

/// Exactly two decimal numbers.
fn two_numbers<'a>(mut fields: impl Iterator<Item = &'a str>) -> Option<[u64; 2]> {
    let mut number = || {
        let field = fields.next()?;
        let digits = field.bytes().all(|byte| byte.is_ascii_digit());
        digits.then(|| field.parse().ok()).flatten()
    };
    let both = [number()?, number()?];
    fields.next().is_none().then_some(both)
}

#[cfg(test)]
#[allow(clippy::unwrap_used, clippy::expect_used)]
mod tests {
    use super::*;

    fn error(text: &str) -> String {
        read(text.as_bytes(), "g.col", 3).unwrap_err().to_string()
    }

    #[test]
    fn reads_a_graph() {
        let text = "c a triangle and a lone vertex\r\n\np edge 4 3\n e 1 2\ne 3\t2\ne 1 3\n";
        let instance = read(text.as_bytes(), "g.col", 3).unwrap();
        assert_eq!(instance.masks(), 3);
        assert_eq!(instance.feature_count(), 4);
        assert_eq!(instance.fragment_count(), 4);
        assert_eq!(instance.edges(), [[0, 1], [0, 2], [1, 2]]);
    }

    #[test]
    fn both_directions_count_either_way() {
        for announced in [1, 2] {
            let text = format!("p col 2 {announced}\ne 1 2\ne 2 1\n");
            let instance = read(text.as_bytes(), "g.col", 2).unwrap();
            assert_eq!(instance.edges(), [[0, 1]]);
        }
        assert_eq!(
            error("c\np col 2 3\ne 1 2\ne 2 1\n"),
            "g.col:2: the `p` line announces 3 edges, but there are 2 `e` lines with 1 different \
             edges: it must announce one of these two numbers"
        );
    }

    #[test]
    fn wrong_lines_are_named() {
        assert!(error("").starts_with("g.col:1: the file ends without a `p` line"));
        assert!(error("e 1 2\n").starts_with("g.col:1: an edge comes first"));
        assert!(error("p edge 2 1\ne 1 1\n").starts_with("g.col:2: edge from vertex 1 to itself"));
        assert!(error("p edge 2 1\ne 1 3\n").starts_with("g.col:2: vertex 3 is out of range"));
        assert!(error("p edge 2 1\ne 0 1\n").starts_with("g.col:2: vertex 0 is out of range"));
        assert!(error("p edge 2 1\ne 1 +2\n").contains("is not `e VERTEX VERTEX`"));
        assert!(error("p edge 2 1\ne 1 2 3\n").contains("is not `e VERTEX VERTEX`"));
        assert!(error("p edge 2\n").contains("is not `p edge VERTICES EDGES`"));
        assert!(error("p edge 2 0\np edge 2 0\n").starts_with("g.col:2: a second `p` line"));
        assert!(error("p edge 2 0\nn 1 3\n").starts_with("g.col:2: line begins with \"n\""));
        assert!(error("p edge 4294967297 0\n").contains("at most 10000000"));
        assert!(error("p edge 99999999999999999999 0\n").contains("is not `p edge"));
        let not_text = read(b"p edge 1 0\n\xff\n", "g.col", 3).unwrap_err();
        assert!(
            not_text
                .to_string()
                .starts_with("g.col:2: line is not UTF-8")
        );
    }

    #[test]
    fn random_bytes_never_panic() {
        use rand::{Rng, SeedableRng};
        let mut random = rand_pcg::Pcg64::seed_from_u64(1);
        let seed = b"c x\np edge 5 4\ne 1 2\ne 2 3\ne 3 4\ne 4 5\n";
        for _ in 0..3000 {
            let mut bytes = seed.to_vec();
            for _ in 0..random.random_range(1..4) {
                let at = random.random_range(0..bytes.len());
                bytes[at] = random.random();
            }
            bytes.truncate(random.random_range(0..=bytes.len()));
            let _ = read(&bytes, "g.col", 3);
        }
    }
}
