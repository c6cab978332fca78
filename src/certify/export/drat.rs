//! A refutation as DRAT text: the additions of LRAT without numbers and hints (Wetzler, Heule, Hunt, "DRAT-trim",
//! SAT 2014). Deletions are left out: a checker that keeps more clauses accepts no less.

use std::io::{self, BufRead, Write};

use crate::solve::refutation::Steps;

/// Writes a refutation.
///
/// # Errors
/// Those of the writer.
pub fn write(steps: &Steps, out: &mut dyn Write) -> io::Result<()> {
    for clause in steps.clauses.iter() {
        for literal in clause {
            write!(out, "{literal} ")?;
        }
        out.write_all(b"0\n")?;
    }
    Ok(())
}

/// Writes the refutation that LRAT text holds.
///
/// # Errors
/// Those of reader and writer.
pub fn of_lrat(mut lrat: impl BufRead, out: &mut dyn Write) -> io::Result<()> {
    let mut line = String::new();
    while lrat.read_line(&mut line)? > 0 {
        let mut words = line.split_ascii_whitespace().skip(1).peekable();
        if words.peek() != Some(&"d") {
            for literal in words.take_while(|&word| word != "0") {
                write!(out, "{literal} ")?;
            }
            out.write_all(b"0\n")?;
        }
        line.clear();
    }
    Ok(())
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    #[test]
    fn additions_stay_without_numbers_and_hints() {
        let mut out = Vec::new();
        of_lrat(&b"9 1 -2 0 3 4 0\n9 d 3 0\n10 0 9 1 0\n"[..], &mut out).unwrap();
        assert_eq!(String::from_utf8(out).unwrap(), "1 -2 0\n0\n");
    }
}
