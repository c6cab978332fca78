//! A canonical formula as DIMACS CNF, with comments that say what its variables mean.

use std::io::{self, Write};

use super::super::features::Features;
use super::bounds::Bound;
use crate::solve::refutation::Lists;

/// Writes the formula of a bound. Fragments are numbered from 0 and masks from 1, as in the certificate.
///
/// # Errors
/// Those of the writer.
pub fn write(
    features: &Features<'_>,
    bound: &Bound<'_>,
    formula: &Lists,
    out: &mut dyn Write,
) -> io::Result<()> {
    let Bound { name, limit, .. } = bound;
    writeln!(
        out,
        "c {name}: a colouring that violates less than {limit}; there is none"
    )?;
    let mut variable = 0;
    for &fragment in &bound.fragments {
        for mask in features.instance.allowed(fragment).iter() {
            variable += 1;
            let mask = mask + 1;
            writeln!(
                out,
                "c variable {variable}: fragment {fragment} on mask {mask}"
            )?;
        }
    }
    let literals = formula.iter().flatten();
    let last = literals.map(|lit| lit.unsigned_abs()).max();
    let last = last.unwrap_or(0).max(variable);
    if last > variable {
        let first = variable + 1;
        writeln!(
            out,
            "c variables {first} to {last}: prices, counters and ways along features"
        )?;
    }
    writeln!(out, "p cnf {last} {}", formula.len())?;
    for clause in formula.iter() {
        for literal in clause {
            write!(out, "{literal} ")?;
        }
        out.write_all(b"0\n")?;
    }
    Ok(())
}
