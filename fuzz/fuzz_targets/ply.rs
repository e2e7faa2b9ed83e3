//! Any bytes as PLY: an answer or an error; every index in range, every number finite.
#![no_main]

use bismar::format::ply;
use bismar::mesh::Triangles;
use libfuzzer_sys::fuzz_target;

fuzz_target!(|data: &[u8]| {
    let soup = match ply::parse(data) {
        Ok(soup) => soup,
        Err(error) => return assert!(!error.advice.is_empty()),
    };
    let Triangles::Indexed { vertices, corners } = &soup.triangles else {
        unreachable!("a PLY has indices")
    };
    assert!(!corners.is_empty());
    assert!(corners.iter().flatten().all(|&i| (i as usize) < vertices.len()));
    assert!(vertices.iter().flatten().all(|x| x.is_finite()));
    assert_eq!(soup.runs.iter().map(|r| r.count).sum::<usize>(), corners.len());
});
