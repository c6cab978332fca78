//! The lines of a pseudo-Boolean proof, format 3.0 of VeriPB, and the numbers of the constraints that they give.

use std::io::{self, Write};

use super::counter::Weighed;

/// A proof in the making.
pub struct Proof<'a> {
    out: &'a mut dyn Write,
    last: u64,
}

impl<'a> Proof<'a> {
    /// Begins the proof about a problem of so many constraints.
    ///
    /// # Errors
    /// Those of the writer, here and below.
    pub fn begin(out: &'a mut dyn Write, constraints: u64) -> io::Result<Proof<'a>> {
        writeln!(out, "pseudo-Boolean proof version 3.0\nf {constraints};")?;
        Ok(Proof {
            out,
            last: constraints,
        })
    }

    fn given(&mut self) -> u64 {
        self.last += 1;
        self.last
    }

    /// A comment.
    pub fn comment(&mut self, text: &str) -> io::Result<()> {
        writeln!(self.out, "% {text}")
    }

    /// A solution by the names of its literals; gives "the objective is less than that".
    pub fn solution<'n>(
        &mut self,
        literals: impl Iterator<Item = (&'n str, bool)>,
    ) -> io::Result<u64> {
        write!(self.out, "soli")?;
        for (name, value) in literals {
            write!(self.out, " {}{name}", if value { "" } else { "~" })?;
        }
        writeln!(self.out, ";")?;
        Ok(self.given())
    }

    /// What adding up gives, in reverse Polish notation.
    pub fn polish(&mut self, words: &[String]) -> io::Result<u64> {
        writeln!(self.out, "pol {};", words.join(" "))?;
        Ok(self.given())
    }

    fn constraint(&mut self, sum: &[Weighed], least: u64, names: &[String]) -> io::Result<()> {
        for &(literal, weight) in sum {
            let sign = if literal < 0 { "~" } else { "" };
            let name = &names[literal.unsigned_abs() as usize - 1];
            write!(self.out, "{weight} {sign}{name} ")?;
        }
        write!(self.out, ">= {least}")
    }

    /// A constraint that follows by unit propagation from others, in this order.
    pub fn propagated(
        &mut self,
        clause: &[i32],
        names: &[String],
        hints: impl Iterator<Item = u64>,
    ) -> io::Result<u64> {
        write!(self.out, "rup ")?;
        let clause: Vec<Weighed> = clause.iter().map(|&literal| (literal, 1)).collect();
        self.constraint(&clause, 1, names)?;
        write!(self.out, " : ~")?;
        for hint in hints {
            write!(self.out, " {hint}")?;
        }
        writeln!(self.out, ";")?;
        Ok(self.given())
    }

    /// "At least 0", which is so.
    pub fn nothing(&mut self) -> io::Result<u64> {
        writeln!(self.out, "rup >= 0;")?;
        Ok(self.given())
    }

    /// A constraint that may be assumed, by the witness that makes it true.
    pub fn redundant(
        &mut self,
        sum: &[Weighed],
        least: u64,
        names: &[String],
        witness: &str,
    ) -> io::Result<u64> {
        write!(self.out, "red ")?;
        self.constraint(sum, least, names)?;
        writeln!(self.out, " : {witness};")?;
        Ok(self.given())
    }

    /// Shows a constraint by contradiction: `show` gets the number of its negation.
    pub fn by_contradiction(
        &mut self,
        sum: &[Weighed],
        least: u64,
        names: &[String],
        show: impl FnOnce(&mut Self, u64) -> io::Result<()>,
    ) -> io::Result<u64> {
        write!(self.out, "pbc ")?;
        self.constraint(sum, least, names)?;
        writeln!(self.out, " : subproof")?;
        let negation = self.given();
        show(self, negation)?;
        writeln!(self.out, "qed : -1;")?;
        Ok(self.given())
    }

    /// Ends the proof: the objective is at least `lower` by a constraint, and a solution has `upper`.
    pub fn end(&mut self, lower: u128, by: u64, upper: u128) -> io::Result<()> {
        writeln!(self.out, "output NONE;")?;
        writeln!(self.out, "conclusion BOUNDS {lower} : {by} {upper};")?;
        writeln!(self.out, "end pseudo-Boolean proof;")
    }
}
