//! Whether what nothing can be paid for can be kept at all, asked before anything is solved.

use encodings::{Instance, Tie};

use super::error::PipelineError;
use super::subject::Subject;
use crate::layout::length::Micrometres;
use crate::report::assemble::Places;
use crate::solve::legal::{self, Statement};

/// The most statements that are listed; a contradiction is hardly ever longer.
const MOST_LISTED: usize = 20;

/// Refuses an instance whose ties and allowed masks contradict each other.
///
/// # Errors
/// The statements of a contradiction, none of which can be left out.
pub fn check(subject: &Subject) -> Result<(), PipelineError> {
    let instance = subject.instance();
    if instance.ties().is_empty() {
        return Ok(());
    }
    let Some(found) = legal::contradiction(instance) else {
        return Ok(());
    };
    let (input, statements) = subject.with_facts(|facts| {
        let unit_pm = facts.layer.as_ref().map(|layer| layer.unit_pm);
        let listed = found.iter().take(MOST_LISTED);
        let mut said: Vec<String> = listed
            .map(|&statement| say(instance, statement, facts.places, unit_pm))
            .collect();
        if found.len() > MOST_LISTED {
            said.push(format!("and {} more", found.len() - MOST_LISTED));
        }
        (facts.input.clone(), said)
    });
    Err(PipelineError::Contradiction { input, statements })
}

fn say(
    instance: &Instance,
    statement: Statement,
    places: &dyn Places,
    unit_pm: Option<u64>,
) -> String {
    let name = |fragment: u32| {
        let feature = instance.feature_of(fragment);
        match (places.fragment(fragment), unit_pm) {
            (Some(area), Some(unit_pm)) => {
                let um = |value| Micrometres::new(value, unit_pm);
                format!(
                    "feature {feature} at ({}, {}) um",
                    um(area.min.x),
                    um(area.min.y)
                )
            }
            _ => format!("fragment {fragment} of feature {feature}"),
        }
    };
    match statement {
        Statement::Allowed(fragment) => {
            let masks: Vec<String> = (instance.allowed(fragment).iter())
                .map(|mask| (mask + 1).to_string())
                .collect();
            format!("{} is on mask {}", name(fragment), masks.join(" or "))
        }
        Statement::Tie(tie) => match &instance.ties()[tie as usize] {
            Tie::Same([a, b]) => format!("{} and {} share a mask", name(*a), name(*b)),
            Tie::Different([a, b]) => {
                format!("{} and {} are on different masks", name(*a), name(*b))
            }
            Tie::AtMost { most, stitches } => format!(
                "{} has at most {most} stitches at {} places",
                name(stitches[0].a),
                stitches.len()
            ),
        },
    }
}
