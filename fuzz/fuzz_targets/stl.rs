//! Any bytes as STL of either kind: an answer or an error, and runs that cover all triangles.
#![no_main]

use bismar::format::{Bytes, stl};
use bismar::mesh::Triangles;
use libfuzzer_sys::fuzz_target;

fuzz_target!(|data: &[u8]| {
    for soup in [stl::parse(Bytes::Owned(data.to_vec())), stl::parse_text(data)].into_iter().flatten()
    {
        let count = match &soup.triangles {
            Triangles::Records(records) => records.count,
            Triangles::Loose(all) => all.len(),
            Triangles::Indexed { .. } => unreachable!("an STL has no indices"),
        };
        assert!(count > 0);
        assert_eq!(soup.runs.iter().map(|r| r.count).sum::<usize>(), count);
        assert!(soup.runs.iter().all(|r| (r.name as usize) < soup.names.len()));
    }
});
