//! Damaged streams: an error or a layout, never a panic, and never a silent short layout.

use super::help::*;
use super::real::ROUTED;
use maskproof::formats::gdsii::coloured::Plan;
use maskproof::formats::gdsii::writer::PathStyle;
use maskproof::formats::gdsii::{Request, read};
use maskproof::layout::LayerId;
use rand::{Rng, SeedableRng};

/// A small library with every kind of element.
fn every_kind() -> Vec<u8> {
    library(|w| {
        cell(w, "leaf", |w| {
            w.rect(LAYER, rect(0, 0, 20, 10)).unwrap();
            w.boundary(LAYER, &[p(30, 0), p(40, 0), p(40, 30), p(35, 9)])
                .unwrap();
            w.box_element(LAYER, rect(50, 0, 60, 10)).unwrap();
            let custom = PathStyle {
                kind: 4,
                width: 10,
                extensions: Some([5, -2]),
            };
            w.path(LAYER, custom, &[p(0, 50), p(40, 50), p(60, 70), p(60, 99)])
                .unwrap();
            let round = PathStyle {
                kind: 1,
                width: -8,
                extensions: None,
            };
            w.path(LAYER, round, &[p(0, 90), p(40, 90), p(20, 80)])
                .unwrap();
            w.text(LAYER, p(5, 5), "label").unwrap();
        });
        cell(w, "row", |w| {
            w.aref(
                "leaf",
                turned(true, 1),
                [3, 2],
                [p(0, 0), p(300, 0), p(0, 200)],
            )
            .unwrap();
        });
        cell(w, "top", |w| {
            w.sref("row", turned(false, 3), 2, p(1000, 0)).unwrap();
            w.sref("leaf", turned(false, 0), 1, p(0, 0)).unwrap();
        });
    })
}

/// Reads in every way; only panics and endless loops can fail here.
fn read_all(bytes: &[u8]) {
    let request = Request {
        max_points: 1 << 16,
        ..Request::new("f.gds", LAYER)
    };
    let _ = read(bytes, &request);
    let other = |datatype| LayerId { layer: 1, datatype };
    let _ = read(
        bytes,
        &Request {
            fixed: &[(other(3), 1)],
            keep_outs: &[other(4)],
            labels: &[LAYER],
            ..request
        },
    );
    let masks = [
        LAYER,
        LayerId {
            layer: 8,
            datatype: 8,
        },
    ];
    let _ = Plan::new(bytes, "f.gds", "top", &masks[1..]);
}

#[test]
fn mutated_streams_never_panic() {
    let seed = every_kind();
    assert!(layout(&seed).unwrap().shapes.len() > 30);
    let mut random = rand_pcg::Pcg64::seed_from_u64(17);
    for _ in 0..6000 {
        let mut bytes = seed.clone();
        for _ in 0..random.random_range(1..5) {
            let at = random.random_range(0..bytes.len());
            match random.random_range(0..4) {
                0 => bytes[at] = random.random(),
                1 => bytes[at] ^= 1 << random.random_range(0..8),
                2 => drop(bytes.splice(at..at, [random.random(), random.random()])),
                _ => drop(bytes.drain(at..(at + random.random_range(1..9)).min(bytes.len()))),
            }
            if bytes.is_empty() {
                break;
            }
        }
        read_all(&bytes);
    }
}

#[test]
fn mutated_numbers_never_panic() {
    // Aimed at arithmetic: whole four-byte words of the stream become extreme.
    let seed = every_kind();
    let extremes = [
        i32::MIN,
        i32::MAX,
        -1,
        0,
        1,
        1 << 30,
        -(1 << 30),
        0x7fff_0000,
    ];
    let mut random = rand_pcg::Pcg64::seed_from_u64(23);
    for _ in 0..6000 {
        let mut bytes = seed.clone();
        for _ in 0..random.random_range(1..4) {
            let at = random.random_range(0..bytes.len() / 2 - 2) * 2;
            let value: i32 = extremes[random.random_range(0..extremes.len())];
            bytes[at..at + 4].copy_from_slice(&value.to_be_bytes());
        }
        read_all(&bytes);
    }
}

#[test]
fn random_bytes_never_panic() {
    let mut random = rand_pcg::Pcg64::seed_from_u64(29);
    for _ in 0..500 {
        let mut bytes = vec![0, 6, 0, 2];
        bytes.extend((0..random.random_range(0..300)).map(|_| random.random::<u8>()));
        read_all(&bytes);
    }
}

#[test]
fn every_cut_of_a_small_stream_is_refused() {
    let seed = every_kind();
    for cut in 0..seed.len() {
        assert!(layout(&seed[..cut]).is_err(), "cut at {cut}");
    }
}

#[test]
fn cuts_and_damage_of_the_real_block() {
    let id = LayerId {
        layer: 67,
        datatype: 20,
    };
    let request = Request::new("routed", id);
    for i in 0..60 {
        let cut = ROUTED.len() * i / 60;
        let error = read(&ROUTED[..cut], &request).unwrap_err();
        assert!(error.position().byte.unwrap() <= cut as u64);
    }
    let mut random = rand_pcg::Pcg64::seed_from_u64(31);
    let mut bytes = ROUTED.to_vec();
    for _ in 0..120 {
        let at = random.random_range(0..bytes.len());
        let before = std::mem::replace(&mut bytes[at], random.random());
        let _ = read(&bytes, &request);
        bytes[at] = before;
    }
}
