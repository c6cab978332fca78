//! Random layouts and rules.

use super::raster::{Cell, Feature};
use super::*;
use maskproof::layout::{KeepOut, Metric, WideSpacing};
use rand::Rng;
use rand::seq::SliceRandom;
use rand_pcg::Pcg64Mcg;

/// Random layouts and rules.
pub struct Random(pub Pcg64Mcg);

impl Random {
    pub fn to(&mut self, end: i32) -> i32 {
        self.0.random_range(0..end)
    }

    pub fn rects(&mut self) -> Vec<[i32; 4]> {
        let size = 12 + self.to(14);
        let count = 2 + self.to(6);
        let one = |_| {
            let (x, y) = (self.to(size), self.to(size));
            let (long, wide) = (3 + self.to(16), 1 + self.to(4));
            match self.to(8) {
                0..4 => [x, y, x + long, y + wide],
                4..7 => [x, y, x + wide, y + long],
                _ => [x, y, x + 1 + long / 2, y + 1 + long / 3],
            }
        };
        (0..count).map(one).collect()
    }

    pub fn spacings(&mut self, rules: &mut Rules) {
        let most = 3 + self.to(7);
        rules.spacing = 1 + self.to(most);
        let s = &mut rules.spacings;
        if self.to(2) == 0 {
            s.metric = Metric::Square;
        }
        s.end_length = self.to(6);
        let kinds = [
            &mut s.side_to_side,
            &mut s.side_to_end,
            &mut s.end_to_end,
            &mut s.corner_to_corner,
        ];
        for kind in kinds {
            *kind = (self.to(2) == 0).then(|| 1 + self.to(most));
        }
        let rows = self.to(3);
        s.wide = (0..rows)
            .map(|_| WideSpacing {
                width: 1 + self.to(5),
                run_length: self.to(8),
                spacing: 1 + self.to(most + 2),
            })
            .collect();
    }

    pub fn rules(&mut self, policy: Policy) -> Rules {
        let mut rules = rules(1);
        self.spacings(&mut rules);
        let (overlap, length, corner) = (2 * self.to(2), self.to(6), self.to(3));
        rules.stitch = stitch(policy, overlap, length, corner);
        rules.stitch.weight = 1 + self.to(3) as u32;
        rules.stitch.most_per_feature = (self.to(3) == 0).then(|| self.to(4) as u32);
        rules.masks = 2 + self.to(3) as u8;
        rules
    }

    /// Shapes of another layer, with the distance from them.
    pub fn keep_outs(&mut self, rules: &mut Rules) -> Vec<([i32; 4], i32)> {
        let distance = self.to(4);
        rules.stitch.keep_outs = vec![KeepOut {
            layer: VIA,
            distance,
        }];
        let count = self.to(4);
        let via = |_| {
            let [x, y] = [self.to(30), self.to(30)];
            ([x, y, x + 1 + self.to(2), y + 1 + self.to(2)], distance)
        };
        (0..count).map(via).collect()
    }

    /// A point in or on a feature.
    pub fn point_of(&mut self, feature: &Feature) -> Point {
        let cells: Vec<&Cell> = feature.cells.iter().collect();
        let [x, y] = cells[self.to(cells.len() as i32) as usize];
        Point::new(x + self.to(2), y + self.to(2))
    }

    pub fn hand(&mut self, features: &[Feature], rules: &mut Rules) -> ByHand {
        let mut order: Vec<u32> = (0..features.len() as u32).collect();
        let mut found = ByHand {
            fixed: vec![None; features.len()],
            same: Vec::new(),
            different: Vec::new(),
        };
        if self.to(3) > 0 {
            return found;
        }
        let hand = &mut rules.hand;
        order.shuffle(&mut self.0);
        for &f in order.iter().take(self.to(3) as usize) {
            let mask = self.to(rules.masks.into()) as u8;
            found.fixed[f as usize] = Some(mask);
            let at = self.point_of(&features[f as usize]);
            hand.fixed.push((at, mask));
        }
        for (set, points) in [
            (&mut found.same, &mut hand.same),
            (&mut found.different, &mut hand.different),
        ] {
            order.shuffle(&mut self.0);
            *set = order.iter().take(self.to(4) as usize).copied().collect();
            let at = set.iter().map(|&f| self.point_of(&features[f as usize]));
            points.push(at.collect());
            set.sort_unstable();
        }
        found
    }
}

/// What was decided by hand, by features.
pub struct ByHand {
    pub fixed: Vec<Option<u8>>,
    pub same: Vec<u32>,
    pub different: Vec<u32>,
}

impl ByHand {
    pub fn names(&self, f: u32) -> bool {
        let is_fixed = self.fixed[f as usize].is_some();
        is_fixed || self.same.contains(&f) || self.different.contains(&f)
    }
}
