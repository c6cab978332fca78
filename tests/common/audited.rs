//! Certifies and audits what was solved, in memory.

use std::collections::BTreeMap;

use encodings::{Instance, Mask};
use maskproof::audit::{self, Fault, Tally};
use maskproof::certificate::{Certificate, Digest, Rules};
use maskproof::certify::{Effort, Facts, InMemory, Subject, certify};
use maskproof::reduce::Reduced;
use maskproof::solve::{PieceOutcome, Stop};

/// The certificate of a graph's outcomes, and its proofs.
pub fn certificate(
    instance: &Instance,
    reduced: &Reduced,
    outcomes: &[PieceOutcome],
    colouring: &[Mask],
) -> (Certificate, BTreeMap<String, Vec<u8>>) {
    let facts = Facts {
        input: Digest::of(b""),
        rules: Rules::of_graph(instance.masks()),
        features: Vec::new(),
        split: Vec::new(),
    };
    let subject = Subject {
        instance,
        reduced,
        outcomes,
        colouring,
    };
    let store = InMemory::default();
    let stop = Stop::default();
    let certified = certify(facts, &subject, &store, Effort::USUAL, &stop, &|_, _| ()).unwrap();
    (certified.certificate, store.into_proofs())
}

/// What the audit says of it.
pub fn audit(
    instance: &Instance,
    (certificate, proofs): &(Certificate, BTreeMap<String, Vec<u8>>),
) -> Result<Tally, Fault> {
    audit::check(&audit::graph::derive(instance), certificate, proofs)
}
