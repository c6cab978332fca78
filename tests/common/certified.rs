//! A certificate of a layer with nothing in it but what the layer is: its rules, features, cuts, and a colouring.

use maskproof::certificate::{Certificate, Claim, Digest, Rules as Subject};
use maskproof::certify::layer::members;
use maskproof::extract::Extraction;
use maskproof::layout::{Layout, Rules};

/// A certificate that names the features and cuts of an extraction, and claims nothing.
pub fn certificate(layout: &Layout, rules: &Rules, found: &Extraction) -> Certificate {
    let (features, split) = members(&layout.shapes, &found.features, &found.fragments);
    Certificate {
        input: Digest {
            sha256: String::new(),
            bytes: 0,
        },
        rules: Subject::of_layer(
            rules,
            rules.stitch.policy.name(),
            &layout.top,
            layout.unit_pm,
        ),
        conflicts: Claim { lower: 0, upper: 0 },
        stitches: Claim { lower: 0, upper: 0 },
        features,
        split,
        colours: vec![0; found.instance.fragment_count()],
        conflict_bounds: Vec::new(),
        stitch_bounds: Vec::new(),
    }
}
