//! Slices against one process.

use proptest::prelude::*;

use super::tests::{bits, stl, torus};
use super::*;
use crate::error::Kind;
use crate::geometry::LooseFacets;

/// All slices of bytes, through JSON.
fn slices(bytes: &[u8], n: u64) -> Vec<Partial> {
    (1..=n)
        .map(|k| {
            let partial = slice_of_memory(bytes, Slice::new(k, n).unwrap(), None).unwrap();
            let text = serde_json::to_string(&partial).unwrap();
            let back: Partial = serde_json::from_str(&text).unwrap();
            assert_eq!(back, partial);
            // 12 sums of a few f64, a box, an apex: no more for any slice.
            assert!(text.len() < 2500, "{text}");
            back
        })
        .collect()
}

fn text_of(triangles: &[[[f32; 3]; 3]]) -> Vec<u8> {
    use std::fmt::Write as _;
    let mut out = String::from("solid facet ring\n");
    for [a, b, c] in triangles {
        out += "facet normal 0 0 0\nouter loop\n";
        for p in [a, b, c] {
            let _ = writeln!(out, "vertex {:e} {:e} {:e}", p[0], p[1], p[2]);
        }
        out += "endloop\nendfacet\n";
    }
    (out + "endsolid ring\n").into_bytes()
}

#[test]
fn seven_slices_give_the_bits_of_one_process_and_miss_any_triangle() {
    // 24,000 triangles: six chunks, the last of them cut short.
    let triangles = torus(120, 100);
    let keys = Keys::published();
    let text = text_of(&triangles);
    let soup = crate::format::stl::parse_text(&text).unwrap();
    let whole_text = crate::mesh::each!(&soup.triangles, f => of_corners(f, &keys));
    let wide: Vec<_> = triangles
        .iter()
        .map(|t| t.map(|p| p.map(f64::from)))
        .collect();
    let facets = LooseFacets(&wide);
    let of_arrays = |k| slice_of_corners(&facets, Slice::new(k, 7).unwrap());
    let bytes = stl(&triangles);
    for (parts, want) in [
        (slices(&bytes, 7), of_memory(&bytes, &keys).unwrap()),
        (slices(&text, 7), whole_text),
        ((1..=7).map(of_arrays).collect(), of_corners(&facets, &keys)),
    ] {
        let got = Partial::sum(&parts).unwrap().totals().unwrap();
        assert_eq!(got, want);
        assert_eq!(bits(&got.solid), bits(&want.solid));
        assert!(got.certificate.cancels());
        for lost in 0..7 {
            let mut parts = parts.clone();
            parts.remove(lost);
            let e = Partial::sum(&parts).unwrap().totals().unwrap_err();
            assert_eq!(e.kind, Kind::Slices, "{lost}");
            parts.push(parts[0].clone());
            assert_eq!(Partial::sum(&parts).unwrap_err().kind, Kind::Slices);
        }
    }
    // Without any one triangle, spread over all slices and at their ends.
    for lost in (0..triangles.len())
        .step_by(997)
        .chain([4095, 4096, 23_999])
    {
        let mut open = triangles.clone();
        open.remove(lost);
        let sum = Partial::sum(&slices(&stl(&open), 7)).unwrap();
        assert!(!sum.totals().unwrap().certificate.cancels(), "{lost}");
    }
    // Another file of the same length and the same beginning.
    let mut other = triangles.clone();
    other[12_000].rotate_left(1);
    let (mut a, b) = (slices(&bytes, 7), slices(&stl(&other), 7));
    a[3] = b[3].clone();
    if a[0].identity() != b[0].identity() {
        assert_eq!(Partial::sum(&a).unwrap_err().kind, Kind::Slices);
    }
    other[0].rotate_left(1);
    a[0] = slices(&stl(&other), 7)[0].clone();
    let e = (a[0].clone() + a[1].clone()).unwrap_err();
    assert!(e.kind == Kind::Slices && e.message.contains("different files"));
}

#[test]
fn a_file_that_cannot_be_cut_is_refused_with_the_reason() {
    let obj = b"v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1 2 3\n";
    let e = slice_of_memory(obj, Slice::new(1, 2).unwrap(), None).unwrap_err();
    assert_eq!(e.kind, Kind::Usage);
    assert!(e.message.contains("vertices"), "{e}");
    for bad in ["0/3", "4/3", "1", "a/b", "1/99999999999"] {
        assert_eq!(bad.parse::<Slice>().unwrap_err().kind, Kind::Usage);
    }
    assert_eq!("2/7".parse::<Slice>().unwrap().to_string(), "2/7");
}

#[test]
fn partials_that_were_tampered_with_are_not_read() {
    let one = slice_of_memory(&stl(&torus(40, 30)), Slice::new(1, 1).unwrap(), None).unwrap();
    let good = serde_json::to_value(&one).unwrap();
    for (at, bad) in [
        ("/covers/0/from", serde_json::json!([3, 2])),
        ("/covers/0/from", serde_json::json!([0, 0])),
        ("/covers/0/to", serde_json::json!([0, 1])),
        ("/covers/0/triangles/start", serde_json::json!(1)),
        ("/covers/0/triangles/end", serde_json::json!(99_999)),
        ("/covers/0/triangles/end", serde_json::json!(5)),
        ("/certificate/0", serde_json::json!("+00000000000000f")),
        ("/certificate/0", serde_json::json!("f")),
        ("/bounds", serde_json::Value::Null),
        ("/unit", serde_json::json!("league")),
        ("/sums/volume", serde_json::Value::Null),
        ("/sums/second", serde_json::json!([[1.0]])),
    ] {
        let mut doc = good.clone();
        *doc.pointer_mut(at).unwrap() = bad;
        assert!(serde_json::from_value::<Partial>(doc).is_err(), "{at}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]
    #[test]
    fn any_number_of_slices_adds_in_any_order_and_grouping_to_the_same_bits(
        rings in 3u32..90,
        n in 1u64..40,
        text in any::<bool>(),
        order in any::<u64>(),
    ) {
        let mut triangles = torus(rings, 70);
        // Open at times: the sums must agree all the same.
        triangles.truncate(triangles.len() - usize::from(order % 3 == 0));
        let bytes = if text { text_of(&triangles) } else { stl(&triangles) };
        let mut parts = slices(&bytes, n);
        let one = slices(&bytes, 1).remove(0);
        let mut state = order | 1;
        while parts.len() > 1 {
            // Any two, put back anywhere.
            let mut pick = |len: usize| {
                state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
                (state >> 33) as usize % len
            };
            let a = parts.swap_remove(pick(parts.len()));
            let b = parts.swap_remove(pick(parts.len()));
            let at = pick(parts.len() + 1);
            parts.insert(at, (a + b).unwrap());
        }
        prop_assert_eq!(&parts[0], &one);
        let (got, want) = (parts[0].totals().unwrap(), one.totals().unwrap());
        prop_assert_eq!(bits(&got.solid), bits(&want.solid));
        prop_assert_eq!(got.certificate.cancels(), order % 3 != 0);
        if !text {
            prop_assert_eq!(got, of_memory(&bytes, &Keys::published()).unwrap());
        }
    }
}
