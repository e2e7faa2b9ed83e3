use std::collections::HashMap;
use std::io::{Cursor, Read, Seek, SeekFrom, Write};

use proptest::prelude::*;

use super::*;
use crate::error::Kind;
use crate::geometry::{LooseFacets, RecordFacets, Select};
use crate::moments::integrate;

/// A torus of `n` × `m` quads whose corners are no round numbers.
pub(super) fn torus(n: u32, m: u32) -> Vec<[[f32; 3]; 3]> {
    let at = |i: u32, j: u32| {
        let turn = |k: u32, of: u32| f64::from(k % of) / f64::from(of) * std::f64::consts::TAU;
        let (p, q) = (turn(i, n), turn(j, m));
        let r = 30.0 + 9.0 * q.cos();
        [
            (r * p.cos() + 100.1) as f32,
            (r * p.sin() - 70.7) as f32,
            (9.0 * q.sin()) as f32,
        ]
    };
    let mut out = Vec::new();
    for i in 0..n {
        for j in 0..m {
            let (a, b, c, d) = (at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1));
            out.extend([[a, b, c], [a, c, d]]);
        }
    }
    out
}

pub(super) fn stl(triangles: &[[[f32; 3]; 3]]) -> Vec<u8> {
    let mut out = vec![b' '; 80];
    out.extend((triangles.len() as u32).to_le_bytes());
    for t in triangles {
        out.extend([0; 12]);
        out.extend(t.iter().flatten().flat_map(|x| x.to_le_bytes()));
        out.extend([0; 2]);
    }
    out
}

fn file_of(bytes: &[u8]) -> std::fs::File {
    let mut file = tempfile::tempfile().unwrap();
    file.write_all(bytes).unwrap();
    file
}

fn cancels(triangles: &[[[f32; 3]; 3]], keys: &Keys) -> bool {
    of_memory(&stl(triangles), keys)
        .unwrap()
        .certificate
        .cancels()
}

/// The bits of the sums; `==` would let ±0 pass.
pub(super) fn bits(s: &SolidIntegrals) -> Vec<u64> {
    let m = &s.moments;
    let all = [m.zeroth, s.area];
    all.iter()
        .chain(m.about.iter())
        .chain(m.first.iter())
        .chain(m.second.iter())
        .map(|x| x.to_bits())
        .collect()
}

#[test]
fn every_way_of_reading_gives_the_bits_of_the_exact_path_on_any_number_of_threads() {
    // More than two batches of a stream, and a last chunk that is not full.
    let triangles = torus(307, 239);
    let bytes = stl(&triangles);
    let facets = RecordFacets::new(&bytes[84..]);
    let apex = triangles[0][0].map(f64::from);
    let wide: Vec<[[f64; 3]; 3]> = triangles
        .iter()
        .map(|t| t.map(|p| p.map(f64::from)))
        .collect();
    let want = bits(&integrate(&facets, Select::All, apex, [1.0; 3]));
    let keys = Keys::published();
    let mut certificates = Vec::new();
    for threads in [1, 2, 3, 7] {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .unwrap();
        pool.install(|| {
            let file = of_file(&file_of(&bytes), &keys).unwrap();
            let (stream, len) = of_stream(Cursor::new(&bytes), &keys).unwrap();
            let memory = of_memory(&bytes, &keys).unwrap();
            let corners = of_corners(&LooseFacets(&wide), &keys);
            assert_eq!(len, bytes.len() as u64);
            for got in [&file, &stream, &memory, &corners] {
                assert_eq!(got.triangles, triangles.len() as u64);
                assert_eq!(bits(&got.solid), want);
                assert_eq!(got.bounds, file.bounds);
                assert!(got.certificate.cancels());
            }
            // Without one triangle the certificate is not zero, and is the same all the same.
            let open = of_memory(&stl(&triangles[1..]), &keys).unwrap().certificate;
            assert!(!open.cancels());
            certificates.push(open);
        });
    }
    assert!(certificates.windows(2).all(|w| w[0] == w[1]));
    let low = |i: usize| {
        wide.iter()
            .flatten()
            .map(|p| p[i])
            .fold(f64::INFINITY, f64::min)
    };
    let high = |i: usize| {
        wide.iter()
            .flatten()
            .map(|p| p[i])
            .fold(f64::NEG_INFINITY, f64::max)
    };
    let got = of_memory(&bytes, &keys).unwrap();
    assert_eq!(got.bounds, Some([[0, 1, 2].map(low), [0, 1, 2].map(high)]));
    assert!(got.has_volume());
}

#[test]
fn a_stream_that_comes_in_drops_is_read_as_well() {
    struct Drops<'a>(&'a [u8], usize);
    impl Read for Drops<'_> {
        fn read(&mut self, to: &mut [u8]) -> std::io::Result<usize> {
            self.1 = self.1 % 97 + 1;
            let n = self.1.min(self.0.len()).min(to.len());
            to[..n].copy_from_slice(&self.0[..n]);
            self.0 = &self.0[n..];
            Ok(n)
        }
    }
    let bytes = stl(&torus(40, 30));
    let keys = Keys::published();
    let (got, _) = of_stream(Drops(&bytes, 0), &keys).unwrap();
    assert_eq!(got, of_memory(&bytes, &keys).unwrap());
}

#[test]
fn a_length_that_disagrees_with_the_count_is_told_by_every_reader() {
    let keys = Keys::published();
    let whole = stl(&torus(60, 40));
    let mut more = whole.clone();
    more.push(0);
    let mut none = stl(&[]);
    let cases: Vec<(&[u8], Kind)> = vec![
        (&[], Kind::Empty),
        (&whole[..50], Kind::Truncated),
        (&whole[..84], Kind::Truncated),
        (&whole[..100], Kind::Truncated),
        (&whole[..84 + 50 * 4096], Kind::Truncated),
        (&whole[..whole.len() - 1], Kind::Truncated),
        (&more, Kind::CountMismatch),
        (&none, Kind::Empty),
    ];
    for (bytes, kind) in cases {
        let memory = of_memory(bytes, &keys).unwrap_err();
        let file = of_file(&file_of(bytes), &keys).unwrap_err();
        let stream = of_stream(bytes, &keys).unwrap_err();
        assert_eq!(
            (memory.kind, &memory),
            (kind, &file),
            "{} bytes",
            bytes.len()
        );
        assert_eq!((stream.kind, stream.byte), (kind, memory.byte), "{stream}");
    }
    none.push(1);
    assert_eq!(
        of_stream(&none[..], &keys).unwrap_err().kind,
        Kind::CountMismatch
    );
}

#[test]
fn a_coordinate_that_is_not_finite_is_named_wherever_it_stands() {
    let keys = Keys::published();
    let triangles = torus(60, 40);
    for (t, bad) in [
        (0, f32::NAN),
        (4095, f32::INFINITY),
        (4799, f32::NEG_INFINITY),
    ] {
        for k in 0..9 {
            let mut triangles = triangles.clone();
            triangles[t][k / 3][k % 3] = bad;
            let bytes = stl(&triangles);
            let e = of_memory(&bytes, &keys).unwrap_err();
            assert_eq!(e.kind, Kind::NotFinite);
            assert_eq!(e.byte, Some(84 + 50 * t as u64 + 12 + 4 * k as u64));
            assert_eq!(of_stream(&bytes[..], &keys).unwrap_err(), e);
            assert_eq!(of_file(&file_of(&bytes), &keys).unwrap_err(), e);
        }
    }
    // The largest f32 is finite, and so is all that it is summed into.
    let huge = triangles
        .iter()
        .map(|t| t.map(|p| p.map(|x| x.signum() * f32::MAX)));
    let totals = of_memory(&stl(&huge.collect::<Vec<_>>()), &keys).unwrap();
    assert!(
        totals.solid.area.is_finite() && totals.solid.moments.second.iter().all(|x| x.is_finite())
    );
}

#[test]
fn minus_zero_is_zero() {
    let keys = Keys::published();
    let cube = |z: [f32; 2]| {
        // One half of each edge is written with either zero.
        let mut t = torus(3, 3);
        for (i, p) in t.iter_mut().flatten().enumerate() {
            let snap = |x: f32| if x.abs() < 12.0 { z[i % 2] } else { x };
            *p = p.map(snap);
        }
        t
    };
    assert!(
        cube([0.0, -0.0])
            .iter()
            .flatten()
            .flatten()
            .any(|x| x.to_bits() == 1 << 31)
    );
    assert!(cancels(&cube([0.0, -0.0]), &keys));
    let wide: Vec<_> = cube([0.0, -0.0])
        .iter()
        .map(|t| t.map(|p| p.map(f64::from)))
        .collect();
    assert!(of_corners(&LooseFacets(&wide), &keys).certificate.cancels());
}

#[test]
fn all_kernels_give_the_same_certificate_and_box() {
    // Every processor has the plain one; the others are compared with it where they run.
    let triangles = torus(41, 29);
    let open = stl(&triangles[5..]);
    let facets = RecordFacets::new(&open[84..]);
    let keys = Keys::from_seed(77);
    let n = triangles.len() - 5;
    let got = kernel::part(&kernel::OfRecords(facets), 0..n, [0.0; 3], &keys);
    let plain = kernel::plain(&kernel::OfRecords(facets), 0..n, [0.0; 3], &keys);
    assert_eq!(got.certificate, plain.certificate);
    assert_eq!(got.bounds, plain.bounds);
    assert_eq!(
        bits(&got.sums.finish([0.0; 3])),
        bits(&plain.sums.finish([0.0; 3]))
    );
}

/// Whether directed edges cancel, by counting.
fn cancels_exactly(triangles: &[[[f32; 3]; 3]]) -> bool {
    let mut count: HashMap<[[u32; 3]; 2], i64> = HashMap::new();
    for t in triangles {
        let v = t.map(|p| p.map(|x| (x + 0.0).to_bits()));
        for k in 0..3 {
            let (a, b) = (v[k], v[(k + 1) % 3]);
            *count.entry([a, b]).or_default() += 1;
            *count.entry([b, a]).or_default() -= 1;
        }
    }
    count.values().all(|&n| n == 0)
}

proptest! {
    #[test]
    fn certificates_agree_with_counted_edges(
        // Few places, so that edges often meet, corners coincide, and signs and scales repeat.
        raw in prop::collection::vec(prop::array::uniform9(-1i8..=1), 1..9),
        close in any::<bool>(),
        scale in prop::sample::select(vec![1.0f32, 0.1, 1024.0]),
        seed in any::<u64>(),
    ) {
        let mut triangles: Vec<[[f32; 3]; 3]> = raw
            .iter()
            .map(|v| [0, 3, 6].map(|k| [0, 1, 2].map(|i| f32::from(v[k + i]) * scale)))
            .collect();
        if close {
            // The boundary of each triangle, closed by a cone.
            let tip = [7.5, 0.0, 0.0];
            for t in triangles.clone() {
                triangles.extend([[t[1], t[0], tip], [t[2], t[1], tip], [t[0], t[2], tip]]);
            }
        }
        let exact = cancels_exactly(&triangles);
        prop_assert!(exact || !close);
        prop_assert_eq!(cancels(&triangles, &Keys::from_seed(seed)), exact);
        let wide: Vec<_> = triangles.iter().map(|t| t.map(|p| p.map(f64::from))).collect();
        let wide = of_corners(&LooseFacets(&wide), &Keys::from_seed(seed));
        prop_assert_eq!(wide.certificate.cancels(), exact);
    }

    #[test]
    fn certificates_of_parts_add(cut in 1usize..1799) {
        let triangles = torus(30, 30);
        let keys = Keys::published();
        let of = |part: &[[[f32; 3]; 3]]| of_memory(&stl(part), &keys).unwrap().certificate;
        let (a, b) = triangles.split_at(cut);
        prop_assert!(!of(a).cancels());
        prop_assert!(of(a).plus(of(b)).cancels());
        prop_assert_eq!(Certificate::from_words(of(a).words()), of(a));
    }
}

#[test]
fn a_triangle_with_two_corners_alike_adds_nothing() {
    let keys = Keys::published();
    let (p, q) = ([1.5f32, -2.0, 3.25], [0.1, 0.2, 0.3]);
    for t in [[p, p, q], [p, q, p], [q, p, p], [p, p, p]] {
        assert!(cancels(&[t], &keys));
    }
    assert!(!cancels(&[[p, q, [0.0; 3]]], &keys));
}

/// The structure of real meshes that a weak hash would fall for: the openings are symmetric, lie
/// in planes, have whole coordinates, differ in one sign or one bit.
#[test]
fn openings_that_mirror_each_other_do_not_cancel() {
    let keys = Keys::published();
    let ring = |n: usize, r: f32, z: f32| -> Vec<[f32; 3]> {
        (0..n)
            .map(|i| {
                let a = i as f64 / n as f64 * std::f64::consts::TAU;
                [
                    (f64::from(r) * a.cos()) as f32,
                    (f64::from(r) * a.sin()) as f32,
                    z,
                ]
            })
            .collect()
    };
    // Pipes without ends.
    for (n, r, z) in [
        (4, 1.0, 1.0),
        (6, 2.0, 5.0),
        (64, 10.0, 40.0),
        (360, 7.0, 0.5),
    ] {
        let (low, high) = (ring(n, r, -z), ring(n, r, z));
        let mut pipe = Vec::new();
        for i in 0..n {
            let j = (i + 1) % n;
            pipe.extend([[low[i], low[j], high[j]], [low[i], high[j], high[i]]]);
        }
        assert!(!cancels_exactly(&pipe) && !cancels(&pipe, &keys));
    }
    // Grids of whole numbers, each without its rim.
    for step in [1.0f32, 2.0, 64.0, 4096.0, 0.25] {
        let p = |i: i16, j: i16| [f32::from(i) * step, f32::from(j) * step, 0.0];
        let mut sheet = Vec::new();
        for i in -8..8 {
            for j in -8..8 {
                sheet.extend([
                    [p(i, j), p(i + 1, j), p(i + 1, j + 1)],
                    [p(i, j), p(i + 1, j + 1), p(i, j + 1)],
                ]);
            }
        }
        assert!(!cancels(&sheet, &keys));
    }
    // A crack of one bit, in each bit of each coordinate of one corner.
    let whole = torus(12, 10);
    for k in 0..3 {
        for bit in 0..32 {
            let mut cracked = whole.clone();
            let x = &mut cracked[7][1][k];
            *x = f32::from_bits(x.to_bits() ^ (1 << bit));
            if x.is_finite() {
                assert!(!cancels(&cracked, &keys), "axis {k}, bit {bit}");
            }
        }
    }
}

/// Each bit of a vertex moves about half of the bits of each of the four words that stand for it.
/// With 400 vertices a share has a standard deviation of 0.025: 0.15 is six of them.
#[test]
fn every_bit_of_a_vertex_reaches_every_bit_of_its_points() {
    let keys = Keys::published();
    let vertices: Vec<[f32; 3]> = (0..400u16)
        .map(|i| {
            [
                f32::from(i % 20),
                f32::from(i / 20) * -2.0,
                f32::from(i % 7) * 0.5,
            ]
        })
        .collect();
    for k in 0..3 {
        for bit in 0..31 {
            let mut moved = [[0u32; 64]; 4];
            for v in &vertices {
                let mut w = *v;
                w[k] = f32::from_bits((v[k] + 0.0).to_bits() ^ (1 << bit));
                let (a, b) = (
                    certificate::points_of(*v, &keys),
                    certificate::points_of(w, &keys),
                );
                for (word, counts) in moved.iter_mut().enumerate() {
                    for (at, n) in counts.iter_mut().enumerate() {
                        *n += ((a[word] ^ b[word]) >> at & 1) as u32;
                    }
                }
            }
            for (word, counts) in moved.iter().enumerate() {
                for (at, &n) in counts.iter().enumerate() {
                    let share = f64::from(n) / 400.0;
                    assert!(
                        (share - 0.5).abs() < 0.15,
                        "axis {k} bit {bit}: word {word} bit {at}: {share}"
                    );
                }
            }
        }
    }
}

#[test]
fn a_file_of_over_4_gib_is_read_beyond_its_end_of_32_bits() {
    // The last triangles of a sparse file; all before are the origin three times, and add nothing.
    let tetrahedron = |s: f32| {
        let p = [[0.0; 3], [s, 0.0, 0.0], [0.0, s, 0.0], [0.0, 0.0, s]];
        [[0, 2, 1], [0, 1, 3], [1, 2, 3], [0, 3, 2]].map(|f| f.map(|i: usize| p[i]))
    };
    let count = 86_000_000u64;
    let mut file = tempfile::tempfile().unwrap();
    file.set_len(84 + 50 * count).unwrap();
    file.seek(SeekFrom::Start(80)).unwrap();
    file.write_all(&(count as u32).to_le_bytes()).unwrap();
    file.seek(SeekFrom::Start(84 + 50 * (count - 4))).unwrap();
    file.write_all(&stl(&tetrahedron(6.0))[84..]).unwrap();
    let keys = Keys::published();
    let from = count / CHUNK as u64 - 1;
    // Without optimisation the whole file takes minutes: its end alone is read then.
    let got = if cfg!(debug_assertions) {
        let (n, apex, total) = records::chunks_of_file(&file, |all| from..all, &keys).unwrap();
        super::Totals::new(n, apex, &total)
    } else {
        of_file(&file, &keys).unwrap()
    };
    assert_eq!(got.triangles, count);
    assert_eq!(got.solid.moments.zeroth, 36.0);
    assert!(got.certificate.cancels());
    assert_eq!(got.bounds, Some([[0.0; 3], [6.0; 3]]));
}

/// More than 2³² edges, made as they are read; a minute with optimisation, hours without.
#[test]
#[ignore = "reads 72 GB that are made on the fly: run it with --release"]
fn more_than_2_to_the_32_edges_are_counted_and_cancel() {
    struct Made {
        head: Vec<u8>,
        block: Vec<u8>,
        at: u64,
        end: u64,
    }
    impl Read for Made {
        fn read(&mut self, to: &mut [u8]) -> std::io::Result<usize> {
            let left = (self.end - self.at).min(to.len() as u64) as usize;
            let from = match (self.at as usize).checked_sub(84) {
                None => &self.head[self.at as usize..],
                Some(at) => &self.block[at % self.block.len()..],
            };
            let n = left.min(from.len());
            to[..n].copy_from_slice(&from[..n]);
            self.at += n as u64;
            Ok(n)
        }
    }
    let solid = torus(64, 32);
    let times = (1u64 << 32) / 3 / solid.len() as u64 + 2;
    let count = times * solid.len() as u64;
    let bytes = stl(&solid);
    let mut head = vec![0; 80];
    head.extend((count as u32).to_le_bytes());
    let made = Made {
        head,
        block: bytes[84..].to_vec(),
        at: 0,
        end: 84 + 50 * count,
    };
    let keys = Keys::published();
    let (got, len) = of_stream(made, &keys).unwrap();
    let once = of_memory(&bytes, &keys).unwrap();
    assert!(3 * got.triangles > 1 << 32 && len == 84 + 50 * count);
    assert!(got.certificate.cancels());
    let ratio = got.solid.moments.zeroth / (once.solid.moments.zeroth * times as f64);
    // Compensated sums: a few roundings in all, however many terms.
    assert!((ratio - 1.0).abs() < 1e-14, "{ratio}");
}
