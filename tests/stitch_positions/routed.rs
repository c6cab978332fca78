//! Candidates of the policy `every-interval` on the routed block of `data/README.md`.

use super::layouts;
use maskproof::extract::{Extraction, extract};
use maskproof::formats::gdsii;
use maskproof::layout::{LayerId, Policy, Rules, StitchRules};

fn run(layer: u16, masks: u8, spacing: i32, policy: Policy) -> Extraction {
    let bytes = include_bytes!("../data/routed_sky130.gds");
    let id = LayerId {
        layer,
        datatype: 20,
    };
    let layout = gdsii::read(bytes, &gdsii::Request::new("routed_sky130.gds", id)).unwrap();
    let rules = Rules {
        stitch: StitchRules {
            policy,
            overlap: 40,
            fragment_length: 80,
            corner: 20,
            ..StitchRules::default()
        },
        ..Rules::plain(layouts::LAYER, masks, spacing)
    };
    let start = std::time::Instant::now();
    let found = extract(&layout, &rules, &|_| ()).unwrap();
    println!(
        "{id} {masks} masks {spacing}: {} features, {:?}, {} ties, {} pairs, {} self-spacings, {:?}",
        found.features.len(),
        found.candidates,
        found.instance.ties().len(),
        found.instance.pair_count(),
        found.instance.self_spacings().len(),
        start.elapsed()
    );
    for reason in ["too many candidates", "runs at right angles"] {
        let named = found
            .beyond_theorem
            .iter()
            .filter(|b| b.reason.name() == reason);
        println!("  beyond: {} {reason}", named.count());
    }
    found
}

#[test]
fn few_candidates_are_left_on_real_layers() {
    for (layer, masks, spacing) in [(67, 3, 250), (68, 2, 500), (69, 2, 400)] {
        let found = run(layer, masks, spacing, Policy::EveryInterval);
        assert!(found.candidates.after <= 5 * found.features.len());
        assert!(found.candidates.after <= found.candidates.before);
    }
}
