//! The proof checker: LRAT, reverse unit propagation with hints.
//!
//! A line adds a clause that follows from those before it: assume all its literals false; then each
//! hint names a clause with one literal left, which must be true; the last hint names one with none left.
//! Source: Cruz-Filipe, Heule, Hunt, Kaufmann, Schneider-Kamp, "Efficient certified RAT verification"
//! (CADE 2017). Departure: no RAT steps, which these proofs have no need of; and a line must use
//! each of its hints.

use std::io::BufRead;

use rustc_hash::FxHashMap;

use super::formula::Formula;

/// Why a proof is none.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Failure {
    /// A line has not the form of LRAT.
    Form {
        /// The line, from 1.
        line: u64,
        /// What is wrong.
        message: String,
    },
    /// A line does not follow, or the last one is missing.
    Step {
        /// The line, from 1.
        line: u64,
        /// What is wrong.
        reason: String,
    },
}

/// Checks that a proof refutes the formula. Memory is proportional to formula and proof.
///
/// # Errors
/// The first line that is wrong.
pub fn check(formula: &Formula, mut proof: impl BufRead) -> Result<(), Failure> {
    let mut checker = Checker::new(formula);
    let mut text = String::new();
    let mut line = 0;
    let mut refuted = false;
    loop {
        text.clear();
        line += 1;
        let form = |message: String| Failure::Form { line, message };
        let read = proof
            .read_line(&mut text)
            .map_err(|error| form(error.to_string()))?;
        if read == 0 {
            break;
        }
        if refuted {
            return Err(form("after the empty clause".to_owned()));
        }
        let step = parse(&text).map_err(form)?;
        refuted = checker
            .step(&step)
            .map_err(|reason| Failure::Step { line, reason })?;
    }
    if refuted {
        return Ok(());
    }
    Err(Failure::Step {
        line,
        reason: "the proof ends without the empty clause".to_owned(),
    })
}

/// A line of a proof.
struct Step {
    id: u64,
    /// Clauses to delete, or literals.
    what: What,
}

enum What {
    Delete(Vec<u64>),
    Add { literals: Vec<i32>, hints: Vec<u64> },
}

fn parse(text: &str) -> Result<Step, String> {
    let mut words = text.split_ascii_whitespace().peekable();
    let id = number(words.next())?;
    let what = if words.next_if_eq(&"d").is_some() {
        What::Delete(numbers(&mut words)?)
    } else {
        let literals = numbers(&mut words)?;
        let hints = numbers(&mut words)?;
        What::Add { literals, hints }
    };
    match words.next() {
        None => Ok(Step { id, what }),
        Some(word) => Err(format!("{word:?} after the end of the line's last list")),
    }
}

fn number<N: std::str::FromStr>(word: Option<&str>) -> Result<N, String> {
    let word = word.ok_or("the line ends early: each list ends with 0")?;
    word.parse()
        .map_err(|_| format!("{word:?} is no number that is possible here"))
}

/// Numbers up to a 0.
fn numbers<'a, N>(words: &mut impl Iterator<Item = &'a str>) -> Result<Vec<N>, String>
where
    N: std::str::FromStr + Default + PartialEq,
{
    let mut list = Vec::new();
    loop {
        let next = number(words.next())?;
        if next == N::default() {
            return Ok(list);
        }
        list.push(next);
    }
}

struct Checker {
    literals: Vec<i32>,
    /// Where the literals of each clause that stands are.
    clauses: FxHashMap<u64, [usize; 2]>,
    last: u64,
    /// By variable: 1 true, -1 false, 0 open.
    values: Vec<i8>,
    trail: Vec<i32>,
}

impl Checker {
    fn new(formula: &Formula) -> Checker {
        let mut checker = Checker {
            literals: Vec::new(),
            clauses: FxHashMap::default(),
            last: formula.clauses().len() as u64,
            values: vec![0; formula.variables as usize + 1],
            trail: Vec::new(),
        };
        for (id, clause) in (1..).zip(formula.clauses()) {
            checker.insert(id, clause);
        }
        checker
    }

    fn insert(&mut self, id: u64, clause: &[i32]) {
        let start = self.literals.len();
        self.literals.extend_from_slice(clause);
        self.clauses.insert(id, [start, self.literals.len()]);
    }

    /// Takes a step; says whether it added the empty clause.
    fn step(&mut self, step: &Step) -> Result<bool, String> {
        match &step.what {
            What::Delete(ids) => {
                for id in ids {
                    let found = self.clauses.remove(id);
                    found.ok_or_else(|| format!("there is no clause {id} to delete"))?;
                }
                Ok(false)
            }
            What::Add { literals, hints } => {
                if step.id <= self.last {
                    return Err(format!("clause {} after clause {}", step.id, self.last));
                }
                self.last = step.id;
                let follows = self.follows(literals, hints);
                for literal in self.trail.drain(..) {
                    self.values[literal.unsigned_abs() as usize] = 0;
                }
                follows?;
                self.insert(step.id, literals);
                Ok(literals.is_empty())
            }
        }
    }

    fn follows(&mut self, literals: &[i32], hints: &[u64]) -> Result<(), String> {
        for &literal in literals {
            match self.value(literal)? {
                0 => self.assume(-literal),
                -1 => {}
                _ => return Err(format!("{literal} and its negation in one clause")),
            }
        }
        for (i, id) in hints.iter().enumerate() {
            let [start, end] = *self
                .clauses
                .get(id)
                .ok_or_else(|| format!("there is no clause {id}"))?;
            let mut left = None;
            for at in start..end {
                let literal = self.literals[at];
                match self.value(literal)? {
                    -1 => {}
                    0 if left.is_none() || left == Some(literal) => left = Some(literal),
                    _ => return Err(format!("hint {id} is not unit: it decides nothing")),
                }
            }
            match left {
                Some(literal) => self.assume(literal),
                None if i + 1 == hints.len() => return Ok(()),
                None => return Err(format!("hint {id} is false before the last hint")),
            }
        }
        Err("the hints come to no contradiction".to_owned())
    }

    /// 1 where the literal is true, -1 where it is false, 0 where it is open.
    fn value(&self, literal: i32) -> Result<i8, String> {
        let value = self.values.get(literal.unsigned_abs() as usize);
        let value = value
            .ok_or_else(|| format!("variable {} is not in the formula", literal.unsigned_abs()))?;
        Ok(if literal < 0 { -value } else { *value })
    }

    fn assume(&mut self, literal: i32) {
        self.values[literal.unsigned_abs() as usize] = if literal < 0 { -1 } else { 1 };
        self.trail.push(literal);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The eight clauses over three variables.
    fn all_of_three() -> Formula {
        Formula::of(&[
            &[1, 2, 3],
            &[1, 2, -3],
            &[1, -2, 3],
            &[1, -2, -3],
            &[-1, 2, 3],
            &[-1, 2, -3],
            &[-1, -2, 3],
            &[-1, -2, -3],
        ])
    }

    const PROOF: &str = "9 1 2 0 1 2 0\n10 1 0 9 3 4 0\n11 -1 2 0 5 6 0\n12 0 10 11 7 8 0\n";

    fn reason(proof: &str) -> String {
        match check(&all_of_three(), proof.as_bytes()) {
            Ok(()) => "none".to_owned(),
            Err(Failure::Form { line, message }) => format!("form {line}: {message}"),
            Err(Failure::Step { line, reason }) => format!("step {line}: {reason}"),
        }
    }

    /// Worked out by hand.
    #[test]
    fn a_refutation_is_accepted() {
        assert_eq!(reason(PROOF), "none");
        let deleting = PROOF.replace("10 1 0", "9 d 1 2 0\n10 1 0");
        assert_eq!(reason(&deleting), "none");
    }

    #[test]
    fn each_wrong_line_is_named() {
        let with = |old: &str, new: &str| {
            assert!(PROOF.contains(old));
            reason(&PROOF.replacen(old, new, 1))
        };
        assert_eq!(
            with("12 0 10 11 7 8 0\n", ""),
            "step 4: the proof ends without the empty clause"
        );
        assert_eq!(
            with("9 3 4 0", "9 3 0"),
            "step 2: the hints come to no contradiction"
        );
        assert_eq!(
            with("9 3 4 0", "3 9 4 0"),
            "step 2: hint 3 is not unit: it decides nothing"
        );
        assert_eq!(
            with("9 3 4 0", "9 3 4 4 0"),
            "step 2: hint 4 is false before the last hint"
        );
        assert_eq!(with("9 3 4 0", "9 3 77 0"), "step 2: there is no clause 77");
        assert_eq!(with("10 1 0", "9 1 0"), "step 2: clause 9 after clause 9");
        assert_eq!(
            with("10 1 0", "10 4 0"),
            "step 2: variable 4 is not in the formula"
        );
        assert_eq!(
            with("10 1 0", "10 1 -1 0"),
            "step 2: -1 and its negation in one clause"
        );
        assert_eq!(
            with("10 1 0 9 3 4 0", "10 d 44 0"),
            "step 2: there is no clause 44 to delete"
        );
        assert_eq!(
            with("12 0", "9 d 9 0\n12 1 0 9 0\n13 0"),
            "step 5: there is no clause 9"
        );
        assert_eq!(
            with("12 0 10 11 7 8 0\n", "12 0 10 11 7 8 0\n13 1 0 10 0\n"),
            "form 5: after the empty clause"
        );
    }

    #[test]
    fn what_is_no_lrat_is_refused() {
        for (proof, expected) in [
            (
                "9 1 2 0 1 2",
                "form 1: the line ends early: each list ends with 0",
            ),
            (
                "9 1 2 0 -1 2 0",
                "form 1: \"-1\" is no number that is possible here",
            ),
            (
                "9 1 2147483648 0 1 0",
                "form 1: \"2147483648\" is no number that is possible here",
            ),
            (
                "18446744073709551616 1 0 1 0",
                "form 1: \"18446744073709551616\" is no number that is possible here",
            ),
            (
                "9 -2147483648 0 1 0",
                "step 1: variable 2147483648 is not in the formula",
            ),
            (
                "9 1 2 0 1 2 0 5",
                "form 1: \"5\" after the end of the line's last list",
            ),
            ("\n", "form 1: the line ends early: each list ends with 0"),
            ("", "step 1: the proof ends without the empty clause"),
        ] {
            assert_eq!(reason(proof), expected);
        }
        assert!(matches!(
            check(&all_of_three(), &b"9 \xff"[..]),
            Err(Failure::Form { line: 1, .. })
        ));
    }

    /// A formula that holds the empty clause still needs the line that says so.
    #[test]
    fn nothing_is_concluded_without_a_line() {
        let formula = Formula::of(&[&[1], &[]]);
        assert!(check(&formula, &b""[..]).is_err());
        assert_eq!(check(&formula, &b"3 0 2 0\n"[..]), Ok(()));
    }
}
