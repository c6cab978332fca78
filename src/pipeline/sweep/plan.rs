//! The combinations of a sweep, in order: by spacing, stitch policy, overlap and fragment length as they were
//! given, then by number of masks, ascending.
//!
//! Without stitches there is nothing to overlap and no fragment to be short, so the policy `none` stands once a
//! spacing.

use crate::formats::length::Length;
use crate::formats::rules::{Given, RawRules};
use crate::layout::{Policy, Rules};

/// What varies. An empty list leaves the rules' one value.
#[derive(Clone, Debug, Default)]
pub struct Choices {
    /// Numbers of masks.
    pub masks: Vec<Given<u64>>,
    /// Same-mask spacings.
    pub spacings: Vec<Given<Length>>,
    /// Stitch policies.
    pub policies: Vec<Given<Policy>>,
    /// Overlaps of a stitch.
    pub overlaps: Vec<Given<Length>>,
    /// Smallest fragment lengths.
    pub fragment_lengths: Vec<Given<Length>>,
}

/// The rules of each combination.
pub fn combinations(base: &RawRules, choices: &Choices) -> Vec<RawRules> {
    let masks = ascending(of(&choices.masks, &base.masks));
    let policies = of(&choices.policies, &base.policy);
    let reads_list = |policy: &Option<Given<Policy>>| value(policy) == Policy::Listed;
    let any_list = policies.iter().any(reads_list);
    let mut all = Vec::new();
    for spacing in of(&choices.spacings, &base.spacing) {
        for policy in &policies {
            let stitches = value(policy) != Policy::None;
            let lengths = |list, one| first_only(of(list, one), !stitches);
            for overlap in lengths(&choices.overlaps, &base.overlap) {
                for fragment_length in lengths(&choices.fragment_lengths, &base.fragment_length) {
                    all.extend(masks.iter().map(|masks| {
                        RawRules {
                            masks: masks.clone(),
                            spacing: spacing.clone(),
                            policy: policy.clone(),
                            overlap: overlap.clone(),
                            fragment_length: fragment_length.clone(),
                            // The list is for those combinations that read one.
                            list: base
                                .list
                                .clone()
                                .filter(|_| !any_list || reads_list(policy)),
                            ..base.clone()
                        }
                    }));
                }
            }
        }
    }
    all
}

fn of<T: Clone>(list: &[Given<T>], one: &Option<Given<T>>) -> Vec<Option<Given<T>>> {
    match list {
        [] => vec![one.clone()],
        list => list.iter().cloned().map(Some).collect(),
    }
}

fn ascending(mut masks: Vec<Option<Given<u64>>>) -> Vec<Option<Given<u64>>> {
    masks.sort_by_key(|masks| masks.as_ref().map(|masks| masks.value));
    masks
}

fn first_only<T>(mut list: Vec<T>, only: bool) -> Vec<T> {
    if only {
        list.truncate(1);
    }
    list
}

fn value(policy: &Option<Given<Policy>>) -> Policy {
    policy.as_ref().map_or(Policy::None, |policy| policy.value)
}

/// Whether the extraction of one of two combinations is that of the other with another number of masks.
///
/// What was decided by hand names masks, and is checked against their number. The candidates of
/// `every-interval` are thinned by a rule that counts masks.
pub fn extracts_alike(one: &Rules, other: &Rules) -> bool {
    let looks_at_masks =
        one.stitch.policy == Policy::EveryInterval || one.hand != Default::default();
    let masks = one.masks;
    *one == Rules {
        masks,
        ..other.clone()
    } && (!looks_at_masks || one.masks == other.masks)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::layout::LayerId;

    fn given<T: Copy>(values: &[T]) -> Vec<Given<T>> {
        let one = |&value| Given::on_command_line("--x", value);
        values.iter().map(one).collect()
    }

    #[test]
    fn every_combination_stands_once() {
        let length = |nm: u64| Length { pm: nm * 1000 };
        let choices = Choices {
            masks: given(&[4, 2]),
            spacings: given(&[length(250), length(230)]),
            policies: given(&[Policy::None, Policy::Uncovered]),
            overlaps: given(&[length(20), length(40)]),
            fragment_lengths: Vec::new(),
        };
        let base = RawRules {
            fragment_length: given(&[length(100)]).pop(),
            ..RawRules::default()
        };
        let shown: Vec<String> = (combinations(&base, &choices).iter())
            .map(|raw| {
                let nm = |length: &Option<Given<Length>>| {
                    length.as_ref().map_or(0, |length| length.value.pm / 1000)
                };
                let masks = raw.masks.as_ref().map_or(0, |masks| masks.value);
                let (spacing, overlap) = (nm(&raw.spacing), nm(&raw.overlap));
                let length = nm(&raw.fragment_length);
                format!(
                    "{spacing} {} {overlap} {length} {masks}",
                    value(&raw.policy).name()
                )
            })
            .collect();
        assert_eq!(
            shown,
            [
                "250 none 20 100 2",
                "250 none 20 100 4",
                "250 uncovered 20 100 2",
                "250 uncovered 20 100 4",
                "250 uncovered 40 100 2",
                "250 uncovered 40 100 4",
                "230 none 20 100 2",
                "230 none 20 100 4",
                "230 uncovered 20 100 2",
                "230 uncovered 20 100 4",
                "230 uncovered 40 100 2",
                "230 uncovered 40 100 4",
            ]
        );
    }

    #[test]
    fn extractions_are_shared_only_where_masks_do_not_matter() {
        let layer = LayerId {
            layer: 1,
            datatype: 0,
        };
        let plain = |masks| Rules::plain(layer, masks, 100);
        assert!(extracts_alike(&plain(2), &plain(3)));
        let mut wider = plain(3);
        wider.spacing = 101;
        assert!(!extracts_alike(&plain(2), &wider));
        let every = |masks| {
            let mut rules = plain(masks);
            rules.stitch.policy = Policy::EveryInterval;
            rules
        };
        assert!(!extracts_alike(&every(2), &every(3)));
        assert!(extracts_alike(&every(3), &every(3)));
        let fixed = |masks| {
            let mut rules = plain(masks);
            rules.hand.fixed_layers = vec![(layer, 1)];
            rules
        };
        assert!(!extracts_alike(&fixed(2), &fixed(3)));
    }
}
