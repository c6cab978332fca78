//! Units of conflict by their numbers in the instance, and the bounds of a certificate as sets of them.
//!
//! A certificate names a unit by some of its fragment edges. Here it is taken whole: more edges violate it
//! more often, never less, and it is the whole spacing that a designer can release.

use std::collections::HashMap;

use encodings::{Instance, Tie};

use crate::certificate::{Certificate, Unit};
use crate::solve::places::Places;

/// Units of conflict of which every colouring violates at least `limit`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Bound {
    /// The least number of conflicts.
    pub limit: u64,
    /// The units, numbered as in [`Instance::unit_count`]: pairs first, then features with self-spacings.
    pub units: Vec<u32>,
}

/// Whether a unit is the self-spacings of a feature.
pub fn is_self_spacing(instance: &Instance, unit: u32) -> bool {
    instance.is_self_unit(unit)
}

/// The fragment edges of a unit.
pub fn edges(instance: &Instance, unit: u32) -> &[[u32; 2]] {
    instance.unit(unit)
}

/// The features that a unit joins (self-spacings: one, twice), smaller one first.
pub fn features_of(instance: &Instance, unit: u32) -> [u32; 2] {
    edges(instance, unit)[0].map(|fragment| instance.feature_of(fragment))
}

/// The features of some units, ascending.
pub fn features(instance: &Instance, units: &[u32]) -> Vec<u32> {
    let ends = units.iter().flat_map(|&unit| features_of(instance, unit));
    let mut features: Vec<u32> = ends.collect();
    features.sort_unstable();
    features.dedup();
    features
}

/// The ends of all edges of some units, and all fragments of features with self-spacings among
/// them, ascending.
pub fn fragments(instance: &Instance, units: &[u32]) -> Vec<u32> {
    let mut fragments = Vec::new();
    for &unit in units {
        fragments.extend(edges(instance, unit).iter().flatten());
        if is_self_spacing(instance, unit) {
            let [feature, _] = features_of(instance, unit);
            fragments.extend(instance.fragments_of(feature));
        }
    }
    fragments.sort_unstable();
    fragments.dedup();
    fragments
}

/// Some fragments, and all of the features that ties bind to theirs; ascending.
pub fn with_tied(places: &Places<'_>, mut fragments: Vec<u32>) -> Vec<u32> {
    let instance = places.instance;
    if instance.ties().is_empty() {
        return fragments;
    }
    let mut features: Vec<u32> = fragments.iter().map(|&f| instance.feature_of(f)).collect();
    features.dedup();
    let mut open = features.clone();
    while let Some(feature) = open.pop() {
        if !places.ties(feature).is_empty() {
            fragments.extend(instance.fragments_of(feature));
        }
        for other in places.tied_to(&[feature]) {
            if let Err(place) = features.binary_search(&other) {
                features.insert(place, other);
                open.push(other);
            }
        }
    }
    fragments.sort_unstable();
    fragments.dedup();
    fragments
}

/// The ties among some fragments, ascending, over their places in that list.
pub fn ties_among(places: &Places<'_>, fragments: &[u32]) -> Vec<Tie> {
    let instance = places.instance;
    let mut features: Vec<u32> = fragments.iter().map(|&f| instance.feature_of(f)).collect();
    features.dedup();
    let mut ties: Vec<u32> = features
        .iter()
        .flat_map(|&f| places.ties(f))
        .copied()
        .collect();
    ties.sort_unstable();
    ties.dedup();
    let place = |fragment: u32| fragments.binary_search(&fragment).ok().map(|at| at as u32);
    let among = ties
        .into_iter()
        .map(|tie| instance.ties()[tie as usize].renumbered(place));
    among.flatten().collect()
}

/// The bounds on conflicts of a certificate, in the numbers of the instance.
///
/// # Errors
/// A unit that the instance does not have: the bound, from 0, and what is wrong with it.
pub fn bounds_of(
    certificate: &Certificate,
    instance: &Instance,
) -> Result<Vec<Bound>, (usize, String)> {
    let number = numbers(instance);
    let mut bounds = Vec::with_capacity(certificate.conflict_bounds.len());
    for (i, bound) in certificate.conflict_bounds.iter().enumerate() {
        let units = bound.units.iter().map(|unit| find(instance, &number, unit));
        let units: Vec<u32> = units.collect::<Result<_, _>>().map_err(|why| (i, why))?;
        if bound.limit == 0 {
            return Err((i, "its limit is 0".to_owned()));
        }
        let mut sorted = units.clone();
        sorted.sort_unstable();
        if let Some(twice) = sorted.windows(2).find(|two| two[0] == two[1]) {
            let [f, g] = features_of(instance, twice[0]);
            return Err((i, format!("it names a unit of features {f} and {g} twice")));
        }
        bounds.push(Bound {
            limit: bound.limit,
            units,
        });
    }
    Ok(bounds)
}

/// The unit of each fragment edge.
fn numbers(instance: &Instance) -> HashMap<[u32; 2], u32> {
    let units = 0..instance.unit_count() as u32;
    units
        .flat_map(|unit| edges(instance, unit).iter().map(move |&edge| (edge, unit)))
        .collect()
}

fn find(instance: &Instance, number: &HashMap<[u32; 2], u32>, unit: &Unit) -> Result<u32, String> {
    let mut found = None;
    for edge @ [a, b] in unit {
        let unit = number.get(edge).copied();
        let unit = unit.ok_or_else(|| format!("fragments {a} and {b} are no unit of conflict"))?;
        if found.is_some_and(|before| before != unit) {
            let [f, g] = features_of(instance, unit);
            return Err(format!(
                "one of its units joins other features than {f} and {g} too"
            ));
        }
        found = Some(unit);
    }
    found.ok_or_else(|| "one of its units has no fragment edge".to_owned())
}
