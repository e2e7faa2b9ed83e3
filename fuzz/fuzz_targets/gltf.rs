//! Any bytes as glTF, binary or JSON, with the bytes themselves as every neighbour: an answer or an
//! error; every index in range, every number finite, runs that cover all triangles.
#![no_main]

use bismar::format::{Bytes, gltf};
use bismar::mesh::Triangles;
use libfuzzer_sys::fuzz_target;

fuzz_target!(|data: &[u8]| {
    let neighbours = |_: &str| Ok(Bytes::Owned(data.to_vec()));
    for read in [gltf::parse_binary(data, &neighbours), gltf::parse_text(data, &neighbours)] {
        let soup = match read {
            Ok(soup) => soup,
            Err(error) => {
                assert!(!error.advice.is_empty());
                continue;
            }
        };
        let Triangles::Indexed { vertices, corners } = &soup.triangles else {
            unreachable!("a glTF has indices")
        };
        assert!(!corners.is_empty() && soup.unit.is_some());
        assert!(corners.iter().flatten().all(|&i| (i as usize) < vertices.len()));
        assert!(vertices.iter().flatten().all(|x| x.is_finite()));
        assert_eq!(soup.runs.iter().map(|r| r.count).sum::<usize>(), corners.len());
        assert!(soup.runs.iter().all(|r| (r.name as usize) < soup.names.len()));
    }
});
