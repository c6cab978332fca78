//! Single releases are complete, and pairs are right: every unit of random instances is left out in turn
//! and the rest enumerated.

use encodings::{Instance, Mask};
use maskproof::explain::repair::{Obstacle, Way};

use crate::common::{enumerate, random};
use crate::{places, whole, with_units};

fn best(instance: &Instance) -> (u64, Vec<Mask>) {
    let mut best = (u64::MAX, Vec::new());
    enumerate::each_colouring(instance, |colouring| {
        let cost = enumerate::count(instance, colouring).0;
        if cost < best.0 {
            best = (cost, colouring.to_vec());
        }
    });
    best
}

fn without(instance: &Instance, units: &[u32]) -> u64 {
    let all = 0..instance.unit_count() as u32;
    let kept: Vec<u32> = all.filter(|unit| !units.contains(unit)).collect();
    enumerate::least(&with_units(instance, &kept)).0
}

#[test]
fn single_releases_are_those_that_enumeration_finds() {
    let (mut found, mut pairs) = (0, 0);
    for masks in 2..=5 {
        for seed in 2000..2120 {
            let instance = random::instance(masks, seed);
            let (limit, colouring) = best(&instance);
            if limit == 0 {
                continue;
            }
            let place = places(&instance, None, &colouring, &[whole(&instance, limit)]).remove(0);
            let mut singles: Vec<u32> = (place.repairs.iter())
                .filter(|repair| repair.units.len() == 1 && repair.fewer > 0)
                .map(|repair| repair.units[0])
                .collect();
            singles.sort_unstable();
            let units = 0..instance.unit_count() as u32;
            let expected: Vec<u32> = units
                .filter(|&unit| without(&instance, &[unit]) < limit)
                .collect();
            assert_eq!(singles, expected, "masks {masks}, seed {seed}");
            found += singles.len();
            for repair in place
                .repairs
                .iter()
                .filter(|repair| repair.units.len() == 2)
            {
                assert_eq!(repair.way, Way::Release(Obstacle::Graph));
                assert!(without(&instance, &repair.units) + repair.fewer <= limit);
                pairs += 1;
            }
        }
    }
    assert!(found > 500 && pairs > 50, "{found} {pairs}");
}
