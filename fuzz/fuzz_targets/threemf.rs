//! Any bytes as a 3MF package, and as the model in one: an answer or an error; every index in range,
//! every number finite, runs that cover all triangles.
#![no_main]

use bismar::format::threemf;
use bismar::mesh::{Soup, Triangles};
use libfuzzer_sys::fuzz_target;

fn judge(read: bismar::Result<Soup>) {
    let soup = match read {
        Ok(soup) => soup,
        Err(error) => return assert!(!error.advice.is_empty()),
    };
    let Triangles::Indexed { vertices, corners } = &soup.triangles else {
        unreachable!("a 3MF has indices")
    };
    assert!(!corners.is_empty() && soup.unit.is_some());
    assert!(corners.iter().flatten().all(|&i| (i as usize) < vertices.len()));
    assert!(vertices.iter().flatten().all(|x| x.is_finite()));
    assert_eq!(soup.runs.iter().map(|r| r.count).sum::<usize>(), corners.len());
    assert!(soup.runs.iter().all(|r| (r.name as usize) < soup.names.len()));
}

fuzz_target!(|data: &[u8]| {
    judge(threemf::parse(data));
    judge(threemf::parse_model(data));
});
