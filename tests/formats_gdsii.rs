//! The real block against reference counts, and the ways a stream can be bad.

#![allow(clippy::unwrap_used, clippy::expect_used, missing_docs)]

use maskproof::formats::gdsii::{Request, read};
use maskproof::layout::LayerId;

const ROUTED: &[u8] = include_bytes!("data/routed_sky130.gds");

fn layer(layer: u16, datatype: u16) -> LayerId {
    LayerId { layer, datatype }
}

#[test]
fn the_routed_block_has_the_reference_counts() {
    for (id, shapes) in [(layer(67, 20), 8321), (layer(66, 44), 11946), (layer(67, 44), 26831)] {
        let layout = read(ROUTED, &Request::new("routed", id)).unwrap();
        assert_eq!(layout.top, "register_block");
        assert_eq!(layout.unit_pm, 1000);
        assert_eq!(layout.shapes.len(), shapes);
    }
}
