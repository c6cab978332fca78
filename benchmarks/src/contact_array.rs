//! An irregular array of contacts: a square grid of sites, each one taken or not, each contact off
//! its site by a jitter. One biconnected block covers nearly all of it, so that no reduction helps:
//! it measures the search for least cost itself.
//!
//! All lengths are database units. Contacts are squares, and distances are taken between their edges,
//! as for any shape, so that the array as a layout and the array as an instance are one problem. A
//! side of 0, the default, makes them points, which only an instance can hold.

use encodings::{Instance, InstanceBuilder, InstanceError};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64;

/// The parameters of an array; the default is the array of the speed target.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ContactArray {
    /// Sites in each direction.
    pub sites: u32,
    /// Distance of neighbouring sites.
    pub pitch: u32,
    /// The probability that a site has a contact, 0 to 1.
    pub presence: f64,
    /// The largest shift of a contact from its site, in each direction.
    pub jitter: u32,
    /// The side of a contact; 0 for a point.
    pub size: u32,
    /// Contacts nearer than this conflict on one mask.
    pub spacing: u32,
    /// What the random choices grow from.
    pub seed: u64,
}

impl Default for ContactArray {
    fn default() -> ContactArray {
        ContactArray {
            sites: 100,
            pitch: 100,
            presence: 0.5,
            jitter: 10,
            size: 0,
            spacing: 210,
            seed: 1181,
        }
    }
}

/// A contact: its corner of smallest coordinates.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Contact {
    /// Abscissa.
    pub x: i32,
    /// Ordinate.
    pub y: i32,
}

impl ContactArray {
    /// The contacts, row by row.
    pub fn contacts(&self) -> Vec<Contact> {
        let mut rng = Pcg64::seed_from_u64(self.seed);
        let jitter = self.jitter as i32;
        let mut contacts = Vec::new();
        for row in 0..self.sites {
            for column in 0..self.sites {
                if rng.random_bool(self.presence) {
                    contacts.push(Contact {
                        x: (column * self.pitch) as i32 + rng.random_range(-jitter..=jitter),
                        y: (row * self.pitch) as i32 + rng.random_range(-jitter..=jitter),
                    });
                }
            }
        }
        contacts
    }

    /// Whether two contacts are nearer than the spacing, from edge to edge.
    pub fn conflict(&self, a: Contact, b: Contact) -> bool {
        let gap = |a: i32, b: i32| i64::from(a.abs_diff(b).saturating_sub(self.size));
        let (x, y) = (gap(a.x, b.x), gap(a.y, b.y));
        x * x + y * y < i64::from(self.spacing) * i64::from(self.spacing)
    }

    /// The array as an instance: a feature of one fragment a contact, in the order of
    /// [`ContactArray::contacts`].
    ///
    /// # Errors
    /// `masks` is out of range.
    pub fn instance(&self, masks: u8) -> Result<Instance, InstanceError> {
        let contacts = self.contacts();
        let mut builder = InstanceBuilder::new(masks);
        for _ in &contacts {
            let fragment = builder.feature(1);
            builder.area(fragment, u64::from(self.size).pow(2).max(1));
        }
        // No contact comes more than twice the jitter below an earlier one, so that those a whole
        // reach below this one are out of the reach of all that follow.
        let reach = (self.spacing + self.size + 2 * self.jitter) as i32;
        let mut first = 0;
        for (b, &contact) in contacts.iter().enumerate() {
            while contacts[first].y < contact.y - reach {
                first += 1;
            }
            for (a, &earlier) in contacts[..b].iter().enumerate().skip(first) {
                if self.conflict(earlier, contact) {
                    builder.pair([[a as u32, b as u32]]);
                }
            }
        }
        builder.build()
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    #[test]
    fn the_default_is_the_array_of_the_speed_target() {
        let array = ContactArray::default();
        let contacts = array.contacts();
        assert_eq!(contacts.len(), 5062);
        let instance = array.instance(4).unwrap();
        assert_eq!(instance.feature_count(), 5062);
    }

    #[test]
    fn pairs_are_all_those_nearer_than_the_spacing() {
        for seed in 0..20 {
            let array = ContactArray {
                sites: 12,
                jitter: 60,
                size: 30,
                seed,
                ..Default::default()
            };
            let contacts = array.contacts();
            let mut expected = Vec::new();
            for b in 0..contacts.len() {
                for a in 0..b {
                    if array.conflict(contacts[a], contacts[b]) {
                        expected.push([a as u32, b as u32]);
                    }
                }
            }
            assert_eq!(array.instance(3).unwrap().edges(), expected);
        }
    }

    #[test]
    fn distances_are_taken_between_edges() {
        let array = ContactArray {
            size: 10,
            spacing: 5,
            ..Default::default()
        };
        let at = |x, y| Contact { x, y };
        assert!(array.conflict(at(0, 0), at(14, 0)));
        assert!(!array.conflict(at(0, 0), at(15, 0)));
        // A gap of 3 and 4 is a distance of exactly 5.
        assert!(!array.conflict(at(0, 0), at(13, 14)));
        assert!(array.conflict(at(0, 0), at(13, 13)));
    }
}
