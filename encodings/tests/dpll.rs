//! The plain solver of these tests, compared with trying every assignment of random formulas.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::Random;
use common::dpll::Dpll;
use encodings::literal::{ClauseSink, Formula, Lit, VarAllocator};

#[test]
fn random_formulas() {
    let mut rng = Random(1962);
    let mut answers = [0, 0];
    for _ in 0..3000 {
        let mut formula = Formula::default();
        let lits: Vec<Lit> = (0..1 + rng.below(8)).map(|_| formula.fresh()).collect();
        let draw = |rng: &mut Random| {
            let lit = lits[rng.below(lits.len() as u32) as usize];
            if rng.chance(50) { lit } else { !lit }
        };
        for _ in 0..rng.below(30) {
            let clause: Vec<Lit> = (0..1 + rng.below(4)).map(|_| draw(&mut rng)).collect();
            formula.clause(&clause);
        }
        let fixed: Vec<Lit> = (0..rng.below(3)).map(|_| draw(&mut rng)).collect();
        let (mut count, mut with_fixed) = (0, false);
        for bits in 0..1u32 << lits.len() {
            let holds = |lit: &Lit| (bits >> (lit.variable() - 1) & 1 == 1) == lit.is_positive();
            if formula.clauses.iter().all(|c| c.iter().any(holds)) {
                count += 1;
                with_fixed |= fixed.iter().all(holds);
            }
        }
        let mut solver = Dpll::new(&formula);
        assert_eq!(solver.models(), count, "{formula:?}");
        assert_eq!(
            solver.satisfiable(&fixed),
            with_fixed,
            "{formula:?} {fixed:?}"
        );
        assert_eq!(solver.satisfiable(&[]), count > 0, "{formula:?}");
        answers[usize::from(with_fixed)] += 1;
    }
    assert!(answers[0] > 300 && answers[1] > 300, "{answers:?}");
}
