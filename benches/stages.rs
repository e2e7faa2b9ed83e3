//! Each stage by itself, in memory, beside the limit: reading the same bytes and summing them.
#![allow(clippy::unwrap_used, clippy::expect_used, missing_docs)]

use std::hint::black_box;
use std::path::Path;
use std::time::Duration;

use bismar::format::{Bytes, obj, stl};
use bismar::geometry::{RecordFacets, Select};
use bismar::mesh::{Mesh, Soup};
use bismar::moments::integrate;
use bismar::stream::{Keys, of_memory, of_stream};
use criterion::{BatchSize, Criterion, Throughput, criterion_group, criterion_main};

mod support;

/// The sum of all words, in parallel: what any single reading costs at least.
fn sum_of_bytes(bytes: &[u8]) -> u64 {
    use rayon::prelude::*;
    let part = |c: &[u8]| {
        let (words, _) = c.as_chunks::<8>();
        let add = |s: u64, w: &[u8; 8]| s.wrapping_add(u64::from_le_bytes(*w));
        words.iter().fold(0, add)
    };
    bytes.par_chunks(1 << 20).map(part).sum()
}

fn welded(soup: Soup) -> Mesh {
    Mesh::new(soup, "made").unwrap()
}

fn binary(c: &mut Criterion) {
    let rings = support::rings_for(500_000);
    let ordered: Vec<_> = support::sphere(rings, 50.0, [12.5, -3.0, 80.0]).collect();
    let meshes = [
        ("shuffled", support::shuffled(ordered.clone())),
        ("slivers", support::slivers(125_000)),
        ("1000 nested shells", support::nested_spheres(1000, 500)),
        ("ordered", ordered),
    ];
    for (name, triangles) in &meshes {
        let bytes = support::binary_stl(triangles);
        let mut group = c.benchmark_group(format!("binary STL, {name}"));
        group.throughput(Throughput::Elements(triangles.len() as u64));
        group.bench_function("limit: sum of the bytes", |b| {
            b.iter(|| sum_of_bytes(black_box(&bytes)));
        });
        let facets = RecordFacets::new(&bytes[84..]);
        group.bench_function("moments and area", |b| {
            b.iter(|| integrate(&facets, Select::All, [12.5, -3.0, 80.0], [12.0, -3.0, 80.0]));
        });
        let keys = Keys::published();
        group.bench_function("moments, area, box and certificate", |b| {
            b.iter(|| of_memory(black_box(&bytes), &keys).unwrap());
        });
        group.bench_function("the same from a stream", |b| {
            b.iter(|| of_stream(black_box(&bytes[..]), &keys).unwrap());
        });
        group.bench_function("weld, match, shells and bodies", |b| {
            b.iter_batched(
                || stl::parse_binary(Bytes::Owned(bytes.clone())).unwrap(),
                welded,
                BatchSize::PerIteration,
            );
        });
        group.bench_function("all checks on the welded mesh", |b| {
            let mesh = welded(stl::parse_binary(Bytes::Owned(bytes.clone())).unwrap());
            b.iter(|| {
                bismar::soundness::audit(
                    black_box(&mesh),
                    0.001,
                    3,
                    bismar::soundness::Depth::Surface,
                )
            });
        });
        group.finish();
    }
}

fn text(c: &mut Criterion) {
    let triangles: Vec<_> =
        support::sphere(support::rings_for(130_000), 50.0, [12.5, -3.0, 80.0]).collect();
    let stl_text = support::text_stl(&triangles);
    let one = support::obj(&[("ball".to_owned(), triangles)]);
    let many = support::obj(&support::row_of_spheres(200, 650));
    let mut group = c.benchmark_group("text");
    for (name, bytes) in [
        ("STL", &stl_text),
        ("OBJ", &one),
        ("OBJ, 200 bodies", &many),
    ] {
        group.throughput(Throughput::Bytes(bytes.len() as u64));
        group.bench_function(format!("{name}: limit, sum of the bytes"), |b| {
            b.iter(|| sum_of_bytes(black_box(bytes)));
        });
        group.bench_function(format!("{name}: read"), |b| {
            b.iter(|| match name {
                "STL" => stl::parse_text(black_box(bytes)).unwrap(),
                _ => obj::parse(black_box(bytes)).unwrap(),
            });
        });
        group.bench_function(format!("{name}: read and weld"), |b| {
            b.iter(|| {
                let owned = Bytes::Owned(bytes.clone());
                welded(bismar::format::read(owned, Path::new("made.x"), None).unwrap())
            });
        });
    }
    group.finish();
}

criterion_group! {
    name = stages;
    config = Criterion::default()
        .sample_size(10)
        .warm_up_time(Duration::from_millis(300))
        .measurement_time(Duration::from_millis(1200));
    targets = binary, text
}
criterion_main!(stages);
