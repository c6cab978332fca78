//! A plain checker of LRAT text without RAT steps: every hint must be unit in turn, and the last one false
//! (Cruz-Filipe, Heule, Hunt, Kaufmann and Schneider-Kamp, CADE 2017).

use std::collections::{BTreeMap, BTreeSet};

/// Checks that `proof` refutes `formula`; says at which line it does not.
pub fn check(formula: &[Vec<i32>], proof: &str) -> Result<(), String> {
    let mut clauses: BTreeMap<u64, Vec<i32>> = (1..).zip(formula.iter().cloned()).collect();
    let mut last = formula.len() as u64;
    let mut ended = false;
    for (i, line) in proof.lines().enumerate() {
        let at = |message: &str| Err(format!("line {}: {message}: {line}", i + 1));
        let words: Vec<&str> = line.split(' ').collect();
        if words.get(1) == Some(&"d") {
            for id in &words[2..words.len() - 1] {
                if clauses.remove(&id.parse().unwrap()).is_none() {
                    return at("deletes what is not there");
                }
            }
            continue;
        }
        let numbers: Vec<i64> = words.iter().map(|word| word.parse().unwrap()).collect();
        let id = numbers[0] as u64;
        if id <= last || *numbers.last().unwrap() != 0 {
            return at("a number out of order, or no end");
        }
        let end = numbers.iter().position(|&number| number == 0).unwrap();
        let clause: Vec<i32> = numbers[1..end].iter().map(|&lit| lit as i32).collect();
        let hints = &numbers[end + 1..numbers.len() - 1];
        let mut holds: BTreeSet<i32> = clause.iter().map(|lit| -lit).collect();
        let mut contradiction = false;
        for (place, hint) in hints.iter().enumerate() {
            let Some(hint) = clauses.get(&(*hint as u64)) else {
                return at("a hint names no clause");
            };
            let open: Vec<i32> = hint
                .iter()
                .copied()
                .filter(|lit| !holds.contains(&-lit))
                .collect();
            match open[..] {
                [] if place + 1 == hints.len() => contradiction = true,
                [unit] if !holds.contains(&unit) => {
                    holds.insert(unit);
                }
                _ => return at("a hint is not unit"),
            }
        }
        if !contradiction {
            return at("no contradiction");
        }
        ended = clause.is_empty();
        last = id;
        clauses.insert(id, clause);
    }
    if ended {
        Ok(())
    } else {
        Err("no empty clause at the end".to_owned())
    }
}
