//! Damaged certificates: thousands of changes to certificates of different inputs. Each is refused, or what
//! it says is true all the same: its bounds enclose the least cost by plain enumeration, and its
//! colouring costs what it claims.
//!
//! 2,000 changes here; `.ci/run` asks for 20,000 by MASKPROOF_MUTATIONS.

#![allow(clippy::unwrap_used)]

mod common;

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

use common::{enumerate, graphs, random};
use encodings::Instance;
use maskproof::audit::Verdict;
use maskproof::certificate;
use maskproof::formats::instance_json;
use maskproof::pipeline::{AuditJob, Control, Job, Unwatched, audit, run};
use rand::seq::IndexedRandom;
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;
use serde_json::{Value, json};

/// A certificate as `solve` wrote it, and the truth about its input.
struct Original {
    name: String,
    instance: Instance,
    least: enumerate::Least,
    input: PathBuf,
    certificate: Value,
    proofs: BTreeMap<String, String>,
}

/// The certificate of an instance, which the audit accepts.
fn original(name: String, instance: Instance, least: enumerate::Least, home: &Path) -> Original {
    let home = home.join(&name);
    fs::create_dir(&home).unwrap();
    let input = home.join("input.json");
    let mut bytes = Vec::new();
    instance_json::write(&instance, &mut bytes).unwrap();
    fs::write(&input, bytes).unwrap();
    let job = Job {
        input: input.clone(),
        out: Some(home.join("result")),
        threads: Some(1),
        ..Job::default()
    };
    run(&job, &Control::default(), &Unwatched).unwrap();
    let directory = home.join("result").join(certificate::DIRECTORY);
    let text = fs::read_to_string(directory.join(certificate::FILE)).unwrap();
    let mut proofs = BTreeMap::new();
    if let Ok(entries) = fs::read_dir(directory.join(certificate::PROOFS)) {
        for entry in entries {
            let entry = entry.unwrap();
            let name = entry.file_name().into_string().unwrap();
            proofs.insert(name, fs::read_to_string(entry.path()).unwrap());
        }
    }
    let verdict = audited(&directory, &input);
    assert!(
        matches!(verdict, Verdict::Accepted(_)),
        "{name}: {verdict:?}"
    );
    let certificate: Value = serde_json::from_str(&text).unwrap();
    assert_eq!(
        certificate["conflicts"],
        json!({"lower": least.0, "upper": least.0}),
        "{name}"
    );
    assert_eq!(
        certificate["stitches"],
        json!({"lower": least.1, "upper": least.1}),
        "{name}"
    );
    Original {
        name,
        instance,
        least,
        input,
        certificate,
        proofs,
    }
}

fn audited(directory: &Path, input: &Path) -> Verdict {
    let job = AuditJob {
        directory: directory.to_path_buf(),
        input: input.to_path_buf(),
        threads: Some(1),
        ..AuditJob::default()
    };
    // Bad rules may make the input unreadable, which is a refusal as well.
    audit(&job).unwrap_or_else(|error| {
        Verdict::Rejected(maskproof::audit::Rejection::new(
            maskproof::audit::Step::Rules,
            error.to_string(),
        ))
    })
}

/// Small instances that cost something: conflicts, and with `stitched` stitches too.
fn originals(home: &Path) -> Vec<Original> {
    let mut found = Vec::new();
    for masks in 2..=5 {
        let (mut plain, mut stitched, mut seed) = (0, 0, 40_000);
        while plain < 3 || stitched < 4 {
            seed += 1;
            let instance = random::instance(masks, seed);
            let least = enumerate::least(&instance);
            let wanted = match least {
                (_, 1..) if stitched < 4 => &mut stitched,
                (1.., 0) if plain < 3 => &mut plain,
                _ => continue,
            };
            *wanted += 1;
            found.push(original(
                format!("random-{masks}-{seed}"),
                instance,
                least,
                home,
            ));
        }
    }
    // Too large for evidence by enumeration, so that there are proofs to damage. Their least cost is
    // known: Mycielski's graphs and odd wheels are edge-critical (J. Mycielski, "Sur le coloriage des
    // graphes", 1955), so that one mask fewer than their chromatic number costs one conflict.
    for (name, graph, masks) in [
        ("myciel4", graphs::myciel(4), 4),
        ("myciel3", graphs::myciel(3), 3),
        ("wheel-31", graphs::wheel(31), 3),
    ] {
        found.push(original(
            name.to_owned(),
            graph.instance(masks),
            (1, 0),
            home,
        ));
    }
    found
}

#[test]
fn no_damaged_certificate_proves_what_is_not_so() {
    let count: usize =
        std::env::var("MASKPROOF_MUTATIONS").map_or(2_000, |count| count.parse().unwrap());
    let home = tempfile::tempdir().unwrap();
    let originals = originals(home.path());
    assert!(originals.len() >= 20);
    let proofs = originals
        .iter()
        .map(|original| original.proofs.len())
        .sum::<usize>();
    assert!(proofs > 0, "no proof to damage");
    let directory = home.path().join("damaged");
    fs::create_dir_all(directory.join(certificate::PROOFS)).unwrap();
    let mut rng = Pcg64Mcg::seed_from_u64(20_261_201);
    let (mut refused, mut unchanged, mut accepted) = (0, 0, 0);
    let mut of_kind: BTreeMap<&str, [usize; 2]> = BTreeMap::new();
    while refused + accepted < count {
        let original = originals.choose(&mut rng).unwrap();
        let mut certificate = original.certificate.clone();
        let mut proofs = original.proofs.clone();
        let Some(kind) = damage(&mut certificate, &mut proofs, &mut rng) else {
            continue;
        };
        if certificate == original.certificate && proofs == original.proofs {
            unchanged += 1;
            continue;
        }
        let text = serde_json::to_vec(&certificate).unwrap();
        fs::write(directory.join(certificate::FILE), text).unwrap();
        for (name, proof) in &proofs {
            fs::write(directory.join(certificate::PROOFS).join(name), proof).unwrap();
        }
        let verdict = audited(&directory, &original.input);
        let tally = of_kind.entry(kind).or_default();
        if matches!(verdict, Verdict::Accepted(_)) {
            assert_true(original, &certificate, kind);
            accepted += 1;
            tally[1] += 1;
        } else {
            refused += 1;
            tally[0] += 1;
        }
        for name in proofs.keys() {
            fs::remove_file(directory.join(certificate::PROOFS).join(name)).unwrap();
        }
    }
    println!("{refused} refused, {accepted} true all the same, {unchanged} without effect");
    for (kind, [refused, accepted]) in &of_kind {
        println!("  {kind}: {refused} refused, {accepted} true all the same");
    }
    assert!(of_kind.len() >= 12, "{of_kind:?}");
    assert!(refused > accepted);
}

/// What an accepted certificate says is so, by plain enumeration.
fn assert_true(original: &Original, certificate: &Value, kind: &str) {
    let name = &original.name;
    let (read, _) = certificate::read::read(&serde_json::to_vec(certificate).unwrap()).unwrap();
    assert_eq!(
        read.rules.masks(),
        original.instance.masks(),
        "{name}, {kind}"
    );
    let cost = enumerate::count(&original.instance, &read.colours);
    assert_eq!(
        (read.conflicts.upper, read.stitches.upper),
        cost,
        "{name}, {kind}"
    );
    assert!(
        read.conflicts.lower <= original.least.0,
        "{name}, {kind}: {certificate}"
    );
    if read.conflicts.is_tight() {
        assert!(
            read.stitches.lower <= original.least.1,
            "{name}, {kind}: {certificate}"
        );
    } else {
        assert_eq!(read.stitches.lower, 0, "{name}, {kind}");
    }
}

type Proofs = BTreeMap<String, String>;

/// Changes something; says what kind of change it was. None where the certificate has nothing of the kind.
fn damage(
    certificate: &mut Value,
    proofs: &mut Proofs,
    rng: &mut Pcg64Mcg,
) -> Option<&'static str> {
    match rng.random_range(0..16) {
        0 => colour(certificate, rng).map(|()| "a colour"),
        1 => in_list(certificate, rng, "units", |list, at| {
            list.push(list[at].clone())
        })
        .map(|()| "a unit twice"),
        2 => in_list(certificate, rng, "units", |list, at| drop(list.remove(at)))
            .map(|()| "a unit left out"),
        3 => raise(certificate, rng).map(|()| "a limit raised, and the claim with it"),
        4 => proof(proofs, rng, |lines, at, _| drop(lines.remove(at))).map(|()| "a proof line cut"),
        5 => proof(proofs, rng, |lines, at, rng| {
            let other = rng.random_range(0..lines.len());
            lines.swap(at, other);
        })
        .map(|()| "proof lines reordered"),
        6 => proof(proofs, rng, |lines, at, rng| number_in_line(lines, at, rng))
            .map(|()| "a number in a proof"),
        7 => any_number(certificate, rng).map(|()| "any number"),
        8 => any_list(certificate, rng).map(|()| "any list"),
        9 => member(certificate, rng).map(|()| "a member left out"),
        10 => digit_of_digest(certificate, rng).map(|()| "a digest"),
        11 => evidence(certificate, rng).map(|()| "other evidence"),
        12 => move_unit(certificate, rng).map(|()| "a unit moved to another bound"),
        13 => in_list(certificate, rng, "resolved", |list, at| {
            drop(list.remove(at))
        })
        .or_else(|| in_list(certificate, rng, "met", |list, at| drop(list.remove(at))))
        .map(|()| "a fact left out"),
        14 => bound_twice(certificate, rng).map(|()| "a bound twice, and the claim with it"),
        _ => precedence(certificate, rng).map(|()| "precedence"),
    }
}

fn colour(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let mut digits = certificate["colours"].as_str()?.as_bytes().to_vec();
    let at = rng.random_range(0..digits.len());
    digits[at] = *b"123456789"[..].choose(rng)?;
    if rng.random_bool(0.5) {
        // With the claim adjusted to whatever it may be, only the count can tell.
        for level in ["conflicts", "stitches"] {
            let upper = certificate[level]["upper"].as_u64()?;
            certificate[level]["upper"] = json!((upper + rng.random_range(0..3)).saturating_sub(1));
        }
    }
    certificate["colours"] = json!(String::from_utf8(digits).ok()?);
    Some(())
}

/// One of the bounds of both levels.
fn some_bound<'a>(
    certificate: &'a mut Value,
    rng: &mut Pcg64Mcg,
) -> Option<(&'static str, &'a mut Value)> {
    let level = *["conflict_bounds", "stitch_bounds"].choose(rng)?;
    let bounds = certificate[level].as_array_mut()?;
    let at = rng.random_range(0..bounds.len().max(1));
    Some((level, bounds.get_mut(at)?))
}

fn in_list(
    certificate: &mut Value,
    rng: &mut Pcg64Mcg,
    member: &str,
    change: impl FnOnce(&mut Vec<Value>, usize),
) -> Option<()> {
    let (_, bound) = some_bound(certificate, rng)?;
    let mut list = bound.get_mut(member)?.as_array_mut()?;
    if member == "units" && rng.random_bool(0.3) {
        let inner = rng.random_range(0..list.len());
        list = list[inner].as_array_mut()?;
    }
    let at = rng.random_range(0..list.len().max(1));
    list.get(at)?;
    change(list, at);
    Some(())
}

fn raise(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let (level, bound) = some_bound(certificate, rng)?;
    let limit = bound["limit"].as_u64()?;
    bound["limit"] = json!(limit + 1);
    let claim = if level == "conflict_bounds" {
        "conflicts"
    } else {
        "stitches"
    };
    let lower = certificate[claim]["lower"].as_u64()?;
    certificate[claim]["lower"] = json!(lower + 1);
    if rng.random_bool(0.7) {
        certificate[claim]["upper"] = json!(lower + 1);
        // A colouring of that cost may exist: change colours until chance helps.
        let mut digits = certificate["colours"].as_str()?.as_bytes().to_vec();
        let at = rng.random_range(0..digits.len());
        digits[at] = *b"12345"[..].choose(rng)?;
        certificate["colours"] = json!(String::from_utf8(digits).ok()?);
    }
    Some(())
}

fn proof(
    proofs: &mut Proofs,
    rng: &mut Pcg64Mcg,
    change: impl FnOnce(&mut Vec<String>, usize, &mut Pcg64Mcg),
) -> Option<()> {
    let names: Vec<String> = proofs.keys().cloned().collect();
    let text = proofs.get_mut(names.choose(rng)?)?;
    let mut lines: Vec<String> = text.lines().map(str::to_owned).collect();
    if lines.is_empty() {
        return None;
    }
    let at = rng.random_range(0..lines.len());
    change(&mut lines, at, rng);
    *text = lines.iter().map(|line| format!("{line}\n")).collect();
    Some(())
}

fn number_in_line(lines: &mut [String], at: usize, rng: &mut Pcg64Mcg) {
    let mut words: Vec<String> = lines[at].split(' ').map(str::to_owned).collect();
    let place = rng.random_range(0..words.len());
    let number: i64 = words[place].parse().unwrap_or(1);
    let other = match rng.random_range(0..6) {
        0 => number + 1,
        1 => number - 1,
        2 => -number,
        3 => 0,
        4 => i64::from(u32::MAX) * rng.random_range(1..5),
        _ => rng.random_range(1..40),
    };
    if rng.random_bool(0.2) {
        words.remove(place);
    } else {
        words[place] = other.to_string();
    }
    lines[at] = words.join(" ");
}

/// The places of all values of a kind within a value.
fn places(value: &Value, wanted: &impl Fn(&Value) -> bool) -> Vec<String> {
    let mut found = Vec::new();
    let mut open = vec![(String::new(), value)];
    while let Some((at, value)) = open.pop() {
        if wanted(value) {
            found.push(at.clone());
        }
        match value {
            Value::Array(list) => {
                open.extend(
                    list.iter()
                        .enumerate()
                        .map(|(i, value)| (format!("{at}/{i}"), value)),
                );
            }
            Value::Object(members) => {
                open.extend(
                    members
                        .iter()
                        .map(|(name, value)| (format!("{at}/{name}"), value)),
                );
            }
            _ => {}
        }
    }
    found
}

fn any_number(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let found = places(certificate, &Value::is_number);
    let value = certificate.pointer_mut(found.choose(rng)?)?;
    let number = value.as_i64()?;
    *value = match rng.random_range(0..12) {
        0 => json!(number.wrapping_add(1)),
        1 => json!(number.wrapping_sub(1)),
        2 => json!(0),
        3 => json!(u32::MAX),
        4 => json!(u64::MAX),
        5 => json!(i64::MIN),
        6 => json!(i32::MAX),
        7 => json!(1u64 << 53),
        8 => json!(-1),
        9 => json!(0.5),
        10 => json!(u64::from(u32::MAX) + 1 + number.unsigned_abs()),
        _ => json!(rng.random_range(0..12)),
    };
    Some(())
}

fn any_list(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let found = places(certificate, &|value| {
        value.as_array().is_some_and(|list| !list.is_empty())
    });
    let list = certificate
        .pointer_mut(found.choose(rng)?)?
        .as_array_mut()?;
    let (at, other) = (
        rng.random_range(0..list.len()),
        rng.random_range(0..list.len()),
    );
    match rng.random_range(0..4) {
        0 => drop(list.remove(at)),
        1 => list.insert(other, list[at].clone()),
        2 => list.swap(at, other),
        _ => list.clear(),
    }
    Some(())
}

fn member(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let found = places(certificate, &Value::is_object);
    let members = certificate
        .pointer_mut(found.choose(rng)?)?
        .as_object_mut()?;
    let names: Vec<String> = members.keys().cloned().collect();
    members.remove(names.choose(rng)?)?;
    Some(())
}

fn digit_of_digest(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let place = *["/rules_sha256", "/input/sha256"].choose(rng)?;
    let value = certificate.pointer_mut(place)?;
    let mut digits = value.as_str()?.as_bytes().to_vec();
    let at = rng.random_range(0..digits.len());
    digits[at] = *b"0123456789abcdefABCDEFg"[..].choose(rng)?;
    *value = json!(String::from_utf8(digits).ok()?);
    Some(())
}

fn evidence(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let name = certificate.pointer("/conflict_bounds/0/by/proof").cloned();
    let fragments = certificate["colours"].as_str()?.len() as u32;
    let mut fragment = || rng.random_range(0..fragments);
    let cycle: Vec<u32> = (0..3 + fragment() % 3).map(|_| fragment()).collect();
    let by = match fragment() % 3 {
        0 => json!("enumeration"),
        1 => json!({ "cycle": cycle }),
        _ => json!({ "proof": name.unwrap_or(json!("conflicts-0.lrat")), "precedence": cycle }),
    };
    let (_, bound) = some_bound(certificate, rng)?;
    bound["by"] = by;
    Some(())
}

fn move_unit(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let (level, bound) = some_bound(certificate, rng)?;
    let units = bound["units"].as_array_mut()?;
    let at = rng.random_range(0..units.len().max(1));
    let unit = if rng.random_bool(0.5) {
        units.get(at)?.clone()
    } else {
        units.remove(at)
    };
    let bounds = certificate[level].as_array_mut()?;
    let to = rng.random_range(0..bounds.len());
    bounds[to]["units"].as_array_mut()?.push(unit);
    Some(())
}

fn bound_twice(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let (level, bound) = some_bound(certificate, rng)?;
    let (bound, limit) = (bound.clone(), bound["limit"].as_u64()?);
    certificate[level].as_array_mut()?.push(bound);
    let claim = if level == "conflict_bounds" {
        "conflicts"
    } else {
        "stitches"
    };
    for end in ["lower", "upper"] {
        let value = certificate[claim][end].as_u64()?;
        certificate[claim][end] = json!(value + limit);
    }
    Some(())
}

fn precedence(certificate: &mut Value, rng: &mut Pcg64Mcg) -> Option<()> {
    let found = places(certificate, &|value| value.get("precedence").is_some());
    let list = certificate
        .pointer_mut(found.choose(rng)?)?
        .get_mut("precedence")?
        .as_array_mut()?;
    match rng.random_range(0..4) {
        0 => list.reverse(),
        1 => list.push(json!(rng.random_range(0..20))),
        2 => drop(list.pop()),
        _ => {
            let at = rng.random_range(0..list.len().max(1));
            *list.get_mut(at)? = json!(rng.random_range(0..20));
        }
    }
    Some(())
}
