//! The forms of "at most one", compared with counting, on lists long enough for the product form to
//! nest: no literal and every single one is possible, no two are, whatever the others do.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::dpll::satisfiable;
use common::vertex_pairs;
use encodings::at_most_one::{pairwise, product, sequential};
use encodings::literal::{Formula, Lit, VarAllocator};

fn check(name: &str, form: impl Fn(&[Lit], &mut Formula)) {
    for n in (0..=12).chain([36, 37, 50]) {
        let mut formula = Formula::default();
        let lits: Vec<Lit> = (0..n).map(|_| formula.fresh()).collect();
        form(&lits, &mut formula);
        let none: Vec<Lit> = lits.iter().map(|&lit| !lit).collect();
        assert!(satisfiable(&formula, &none), "{name}: none of {n}");
        for i in 0..n as usize {
            let mut only = none.clone();
            only[i] = lits[i];
            assert!(satisfiable(&formula, &only), "{name}: {i} of {n}");
        }
        for [a, b] in vertex_pairs(n) {
            let both = [lits[a as usize], lits[b as usize]];
            assert!(!satisfiable(&formula, &both), "{name}: {a}, {b} of {n}");
        }
    }
}

#[test]
fn every_form_on_long_lists() {
    check("pairwise", pairwise);
    check("sequential", sequential);
    check("product", product);
}
