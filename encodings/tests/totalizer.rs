//! The incremental totalizer, compared with plain addition: seven inputs with either sign, outputs asked
//! for in random orders, and totalizers over the outputs of others, as a core-guided search nests them.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::Random;
use common::dpll::satisfiable;
use encodings::literal::{Formula, Lit, VarAllocator};
use encodings::totalizer::Totalizer;

const INPUTS: usize = 7;

/// Seven fresh literals, some of them negations.
fn inputs(formula: &mut Formula, random: &mut Random) -> Vec<Lit> {
    (0..INPUTS)
        .map(|_| {
            let lit = formula.fresh();
            if random.chance(50) { lit } else { !lit }
        })
        .collect()
}

/// The literals that make exactly the inputs with a set bit true.
fn fix(inputs: &[Lit], bits: u32) -> Vec<Lit> {
    let sign = |(i, &lit): (usize, &Lit)| if bits >> i & 1 == 1 { lit } else { !lit };
    inputs.iter().enumerate().map(sign).collect()
}

/// For each assignment of the inputs, "not this output" is possible exactly where fewer than `count` of
/// what it counts hold, and the output itself always is.
fn check(
    formula: &Formula,
    inputs: &[Lit],
    output: Lit,
    count: u32,
    sum: impl Fn(u32) -> u32,
    what: &str,
) {
    for bits in 0..1u32 << INPUTS {
        let mut fixed = fix(inputs, bits);
        fixed.push(!output);
        let possible = satisfiable(formula, &fixed);
        assert_eq!(possible, sum(bits) < count, "{what}, inputs {bits:b}");
        fixed.pop();
        fixed.push(output);
        assert!(satisfiable(formula, &fixed), "{what}, inputs {bits:b}");
    }
}

#[test]
fn seven_inputs_in_any_order_of_asking() {
    let mut random = Random(7);
    for round in 0..40 {
        let mut formula = Formula::default();
        let inputs = inputs(&mut formula, &mut random);
        let mut totalizer = Totalizer::new(&inputs);
        assert_eq!(totalizer.input_count(), 7);
        assert!(formula.clauses.is_empty(), "nothing is asked for yet");
        let mut asked: Vec<(u32, Lit)> = Vec::new();
        for _ in 0..1 + random.below(7) {
            let count = 1 + random.below(7);
            let output = totalizer.at_least(count, &mut formula).unwrap();
            let size = (formula.variables, formula.clauses.len());
            assert_eq!(totalizer.at_least(count, &mut formula), Some(output));
            let after = (formula.variables, formula.clauses.len());
            assert_eq!(size, after, "asking again adds nothing");
            asked.push((count, output));
            // Outputs made earlier keep their meaning.
            for &(count, output) in &asked {
                let what = format!("round {round}, asked {asked:?}, output {count}");
                check(
                    &formula,
                    &inputs,
                    output,
                    count,
                    |bits| bits.count_ones(),
                    &what,
                );
            }
        }
        all_at_once(&formula, &inputs, &asked);
    }
}

/// Several outputs assumed false at once: the smallest decides.
fn all_at_once(formula: &Formula, inputs: &[Lit], asked: &[(u32, Lit)]) {
    let least = asked.iter().map(|&(count, _)| count).min().unwrap();
    for bits in 0..1u32 << INPUTS {
        let mut fixed = fix(inputs, bits);
        fixed.extend(asked.iter().map(|&(_, output)| !output));
        assert_eq!(satisfiable(formula, &fixed), bits.count_ones() < least);
    }
}

/// Only the sums asked for are paid for: the first output of n inputs needs n - 1 fresh variables.
#[test]
fn small_counts_stay_small() {
    for n in 2..=40u32 {
        let mut formula = Formula::default();
        let inputs: Vec<Lit> = (0..n).map(|_| formula.fresh()).collect();
        let mut totalizer = Totalizer::new(&inputs);
        totalizer.at_least(1, &mut formula).unwrap();
        assert_eq!(formula.variables, n + n - 1, "{n} inputs");
        assert_eq!(totalizer.at_least(n + 1, &mut formula), None);
    }
}

/// Outputs of inner totalizers with what they say, asked for in random order.
struct Part {
    lit: Lit,
    /// The inputs counted, as bits.
    of: u32,
    count: u32,
}

impl Part {
    fn holds(&self, bits: u32) -> bool {
        (bits & self.of).count_ones() >= self.count
    }
}

/// A totalizer over the inputs whose bits are set, with some of its outputs.
fn inner(formula: &mut Formula, inputs: &[Lit], of: u32, random: &mut Random) -> Vec<Part> {
    let own: Vec<Lit> = inputs
        .iter()
        .enumerate()
        .filter(|(i, _)| of >> i & 1 == 1)
        .map(|(_, &lit)| lit)
        .collect();
    let mut totalizer = Totalizer::new(&own);
    let mut counts: Vec<u32> = (1..=own.len() as u32).collect();
    random.shuffle(&mut counts);
    counts.truncate(1 + random.below(3) as usize);
    counts
        .into_iter()
        .map(|count| Part {
            lit: totalizer.at_least(count, formula).unwrap(),
            of,
            count,
        })
        .collect()
}

#[test]
fn totalizers_nest() {
    let mut random = Random(11);
    for round in 0..60 {
        let mut formula = Formula::default();
        let inputs = inputs(&mut formula, &mut random);
        // Two inner totalizers, which may share inputs, and one over outputs of both and an input.
        let mut parts = Vec::new();
        for _ in 0..2 {
            let of = 1 + random.below((1 << INPUTS) - 1);
            parts.extend(inner(&mut formula, &inputs, of, &mut random));
        }
        parts.push(Part {
            lit: inputs[0],
            of: 1,
            count: 1,
        });
        let lits: Vec<Lit> = parts.iter().map(|part| part.lit).collect();
        let mut outer = Totalizer::new(&lits);
        let sum = |bits| parts.iter().filter(|part| part.holds(bits)).count() as u32;
        let mut counts: Vec<u32> = (1..=outer.input_count()).collect();
        random.shuffle(&mut counts);
        for count in counts {
            let output = outer.at_least(count, &mut formula).unwrap();
            let what = format!("round {round}, output {count} of {}", parts.len());
            check(&formula, &inputs, output, count, sum, &what);
        }
    }
}
