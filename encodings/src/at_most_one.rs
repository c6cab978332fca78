//! Three forms of "at most one of these literals".
//!
//! | form | clauses | fresh variables | best for |
//! |---|---|---|---|
//! | [`pairwise`] | n(n-1)/2 | 0 | up to about 6 literals: masks of a fragment |
//! | [`sequential`] | 3n-4 | n-1 | long lists; unit propagation complete |
//! | [`product`] | 2n + O(sqrt n) | O(sqrt n) | very long lists |
//!
//! Sources: Sinz, "Towards an optimal CNF encoding of Boolean cardinality constraints", CP 2005
//! (sequential counter); Chen, "A new SAT encoding of the at-most-one constraint", ModRef 2010
//! (product). Both from memory.

use crate::literal::{ClauseSink, Lit, VarAllocator};

/// No two of `lits`: a clause for each two.
pub fn pairwise(lits: &[Lit], sink: &mut impl ClauseSink) {
    for (i, &a) in lits.iter().enumerate() {
        for &b in &lits[i + 1..] {
            sink.clause(&[!a, !b]);
        }
    }
}

/// Sequential counter: s_i says that one of the first i literals holds.
pub fn sequential<S: ClauseSink + VarAllocator>(lits: &[Lit], sink: &mut S) {
    let mut seen: Option<Lit> = None;
    for (i, &lit) in lits.iter().enumerate() {
        if let Some(seen) = seen {
            sink.clause(&[!seen, !lit]);
        }
        if i + 1 < lits.len() {
            let next = sink.fresh();
            sink.clause(&[!lit, next]);
            if let Some(seen) = seen {
                sink.clause(&[!seen, next]);
            }
            seen = Some(next);
        }
    }
}

/// Product form: the literals fill a grid; at most one row and at most one column is in use.
pub fn product<S: ClauseSink + VarAllocator>(lits: &[Lit], sink: &mut S) {
    if lits.len() <= 6 {
        return pairwise(lits, sink);
    }
    let columns = lits.len().isqrt() + usize::from(lits.len().isqrt().pow(2) < lits.len());
    let rows = lits.len().div_ceil(columns);
    let row_used: Vec<Lit> = (0..rows).map(|_| sink.fresh()).collect();
    let column_used: Vec<Lit> = (0..columns).map(|_| sink.fresh()).collect();
    for (i, &lit) in lits.iter().enumerate() {
        sink.clause(&[!lit, row_used[i / columns]]);
        sink.clause(&[!lit, column_used[i % columns]]);
    }
    product(&row_used, sink);
    product(&column_used, sink);
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::literal::Formula;

    /// Every assignment of n literals extends to a model exactly when at most one literal holds.
    fn agrees(form: impl Fn(&[Lit], &mut Formula)) {
        for n in 0..=8u32 {
            let mut formula = Formula::default();
            let lits: Vec<Lit> = (0..n).map(|_| formula.fresh()).collect();
            form(&lits, &mut formula);
            for bits in 0..1u32 << n {
                let fixed: Vec<Lit> = (0..n as usize)
                    .map(|i| {
                        if bits >> i & 1 == 1 {
                            lits[i]
                        } else {
                            !lits[i]
                        }
                    })
                    .collect();
                assert_eq!(
                    formula.satisfiable_with(&fixed),
                    bits.count_ones() <= 1,
                    "{n} literals, assignment {bits:b}"
                );
            }
        }
    }

    #[test]
    fn every_form_is_at_most_one() {
        agrees(pairwise);
        agrees(sequential);
        agrees(product);
    }
}
