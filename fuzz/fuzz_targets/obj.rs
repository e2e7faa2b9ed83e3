//! Any bytes as OBJ: an answer or an error; every index in range, every number finite.
#![no_main]

use bismar::format::obj;
use bismar::mesh::Triangles;
use libfuzzer_sys::fuzz_target;

fuzz_target!(|data: &[u8]| {
    let Ok(soup) = obj::parse(data) else { return };
    let Triangles::Indexed { vertices, corners } = &soup.triangles else {
        unreachable!("an OBJ has indices")
    };
    assert!(!corners.is_empty());
    assert!(corners.iter().flatten().all(|&i| (i as usize) < vertices.len()));
    assert!(vertices.iter().flatten().all(|x| x.is_finite()));
    assert_eq!(soup.runs.iter().map(|r| r.count).sum::<usize>(), corners.len());
    for w in &soup.warped {
        assert!(w.first + w.count <= corners.len() && w.line.is_some_and(|l| l > 0));
        assert!(w.volume_low <= 0.0 && w.volume_high >= 0.0 && w.deviation.is_finite());
    }
});
