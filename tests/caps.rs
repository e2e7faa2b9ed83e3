//! The bounds of open bodies against the solids that they were cut from.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

#[path = "caps/solids.rs"]
mod solids;

use std::collections::{HashMap, HashSet};

use bismar::mesh::{Mesh, Run, Soup, Triangles};
use bismar::soundness::audit;
use bismar::soundness::cap::{self, Cap};
use bismar::soundness::mend::mend;
use rayon::prelude::*;
use solids::{Dice, Facets, KINDS, P, area, beyond, cross, cut_at, dot, mesh, solid, sub};

fn welded(facets: Facets) -> Mesh {
    let count = facets.len();
    let soup = Soup {
        triangles: Triangles::Loose(facets),
        names: vec![None],
        runs: vec![Run {
            first: 0,
            count,
            name: 0,
            material: None,
        }],
        ..Soup::default()
    };
    Mesh::new(soup, "part").unwrap()
}

type Key = [u64; 3];

fn key(p: &P) -> Key {
    p.map(f64::to_bits)
}

/// A connected patch round a facet drawn: either what lies in a ball, or what a smooth surface
/// holds together (a whole face of the CAD model), of at most a third of the facets.
fn patch(facets: &Facets, dice: &mut Dice) -> HashSet<usize> {
    let mut across: HashMap<(Key, Key), usize> = HashMap::new();
    for (i, t) in facets.iter().enumerate() {
        for k in 0..3 {
            across.insert((key(&t[k]), key(&t[(k + 1) % 3])), i);
        }
    }
    let normal = |t: &[P; 3]| {
        let n = cross(sub(t[1], t[0]), sub(t[2], t[0]));
        n.map(|x| x / dot(n, n).sqrt())
    };
    let seed = dice.below(facets.len());
    let centre = facets[seed][0];
    let ball = (dice.below(3) > 0).then(|| dice.between(0.15, 0.9));
    let flat = dice.between(0.8, 0.999);
    let mut taken = HashSet::from([seed]);
    let mut todo = vec![seed];
    while let Some(i) = todo.pop() {
        for k in 0..3 {
            let t = &facets[i];
            let Some(&j) = across.get(&(key(&t[(k + 1) % 3]), key(&t[k]))) else {
                continue;
            };
            let near = match ball {
                Some(r) => facets[j]
                    .iter()
                    .all(|p| dot(sub(*p, centre), sub(*p, centre)) < r * r),
                None => dot(normal(&facets[i]), normal(&facets[j])) > flat,
            };
            if near && taken.len() < facets.len() / 3 && taken.insert(j) {
                todo.push(j);
            }
        }
    }
    // Islands go with the patch: what stays is the largest piece.
    let mut seen = taken.clone();
    let mut pieces: Vec<Vec<usize>> = Vec::new();
    for start in 0..facets.len() {
        if !seen.insert(start) {
            continue;
        }
        let mut piece = vec![start];
        let mut at = 0;
        while let Some(&i) = piece.get(at) {
            at += 1;
            let t = &facets[i];
            piece.extend((0..3).filter_map(|k| {
                let j = *across.get(&(key(&t[(k + 1) % 3]), key(&t[k])))?;
                seen.insert(j).then_some(j)
            }));
        }
        pieces.push(piece);
    }
    pieces.sort_by_key(|p| std::cmp::Reverse(p.len()));
    taken.extend(pieces.into_iter().skip(1).flatten());
    taken
}

/// Whether the patch is as the cap assumes: area, side, reach. The reach is the policy's own, which
/// is less than what the cap allows for long loops.
fn obeys(patch: &[[P; 3]], cap: &Cap, corners: &[[P; 3]]) -> bool {
    let total: f64 = patch.iter().map(area).sum();
    let far = patch
        .iter()
        .flatten()
        .map(|p| dot(sub(*p, cap.centre), sub(*p, cap.centre)).sqrt())
        .fold(0.0, f64::max);
    if total > 2.0 * cap.area || far > cap::reach(cap.area) {
        return false;
    }
    // Heights over the cap along its mean normal, at the patch's own vertices.
    let mut n = [0.0; 3];
    for t in corners {
        let m = cross(sub(t[1], t[0]), sub(t[2], t[0]));
        n = [0, 1, 2].map(|k| n[k] + m[k]);
    }
    let n = n.map(|x| x / dot(n, n).sqrt());
    let (mut above, mut below) = (0.0f64, 0.0f64);
    for p in patch.iter().flatten() {
        for t in corners {
            let m = cross(sub(t[1], t[0]), sub(t[2], t[0]));
            let fall = dot(m, n);
            if fall.abs() < 1e-12 * dot(m, m).sqrt() {
                continue;
            }
            let h = dot(m, sub(*p, t[0])) / fall;
            let foot = [0, 1, 2].map(|k| p[k] - h * n[k]);
            let within = (0..3).all(|i| {
                let e = cross(sub(t[(i + 1) % 3], t[i]), sub(foot, t[i]));
                dot(e, m) >= -1e-12 * dot(m, m)
            });
            if within {
                above = above.max(h);
                below = below.min(h);
            }
        }
    }
    above.min(-below) <= 1e-6 * cap.area.sqrt()
}

#[derive(Default, Debug)]
struct Tally {
    cut: usize,
    refused: usize,
    obey: usize,
    obey_flat: usize,
    held_anyway: usize,
    mended: usize,
    closest: f64,
    why: Vec<String>,
}

#[test]
fn every_patch_that_obeys_the_policy_lies_inside_the_bounds() {
    let solids = 2000;
    let tallies: Vec<Tally> = (0..solids)
        .into_par_iter()
        .map(|i| {
            let mut dice = Dice(0x9e37_79b9_7f4a_7c15 ^ (i as u64 + 1) << 20);
            dice.next();
            let mut whole = mesh(&*solid(i % KINDS, &mut dice), 10);
            // Half of them lose what lies beyond a plane: a flat loop, and a lump over it.
            let plane = (i / KINDS)
                .is_multiple_of(2)
                .then(|| (dice.below(3), dice.between(0.3, 1.15)));
            if let Some((axis, at)) = plane {
                whole = cut_at(&whole, axis, at as f32);
            }
            let sound = welded(whole.clone());
            let true_bodies = sound.bodies();
            assert!(true_bodies.len() == 1 && true_bodies[0].closed, "solid {i}");
            let truth = sound.solid(&true_bodies[0], None).unwrap();
            let mut tally = Tally::default();
            for round in 0..2 {
                let taken = match plane {
                    Some((axis, at)) if round == 0 => beyond(&whole, axis, at as f32),
                    _ => patch(&whole, &mut dice),
                };
                if taken.is_empty() || taken.len() == whole.len() {
                    continue;
                }
                let (gone, rest): (Vec<_>, Vec<_>) = whole
                    .iter()
                    .enumerate()
                    .partition(|(j, _)| taken.contains(j));
                let gone: Facets = gone.into_iter().map(|(_, t)| *t).collect();
                let open = welded(rest.into_iter().map(|(_, t)| *t).collect());
                tally.cut += 1;
                let estimates: Vec<_> = open
                    .bodies()
                    .iter()
                    .map(|b| cap::estimate(&open, b, None))
                    .collect();
                // What is mended is sound, and as far off as the cap says.
                if round == 0
                    && let Ok(mended) = mend(&open, "part").unwrap()
                {
                    let copy = Mesh::new(mended.soup, "part").unwrap();
                    assert!(
                        audit(&copy, 1.0, 1, bismar::soundness::Depth::Full).is_sound(),
                        "solid {i}"
                    );
                    if let [Ok(e)] = &estimates[..] {
                        let volume = copy.solid(&copy.bodies()[0], None).unwrap().moments.zeroth;
                        let v = e.solid.moments.zeroth;
                        assert!((volume - v).abs() <= 1e-12 * v, "solid {i}: {volume} {v}");
                        tally.mended += 1;
                    }
                }
                let [Ok(e)] = &estimates[..] else {
                    tally.refused += 1;
                    let why = match &estimates[..] {
                        [Err(e)] => e.reason.clone(),
                        many => format!("{} bodies", many.len()),
                    };
                    tally.why.push(why);
                    continue;
                };
                let (v, w) = (truth.moments.zeroth, e.solid.moments.zeroth);
                let off = (v - w).abs();
                let slack = 1e-9 * v;
                let [one] = &e.caps[..] else {
                    // One patch over several caps is nothing that each of them assumes.
                    continue;
                };
                let corners = one.corners(&open);
                if !obeys(&gone, one, &corners) {
                    tally.held_anyway += usize::from(off <= e.bounds.volume + slack);
                    continue;
                }
                tally.obey += 1;
                tally.obey_flat += usize::from(one.flat);
                tally.closest = tally.closest.max((off - slack) / e.bounds.volume);
                assert!(
                    off <= e.bounds.volume + slack,
                    "solid {i}: {v} is not {w} ± {}",
                    e.bounds.volume
                );
                let (c, d) = (
                    truth.moments.centre().unwrap(),
                    e.solid.moments.centre().unwrap(),
                );
                assert!(
                    (c - d).norm() <= e.bounds.centre + 1e-9,
                    "solid {i}: centre off by {}, not {}",
                    (c - d).norm(),
                    e.bounds.centre
                );
                let j = truth.moments.inertia().unwrap() - e.solid.moments.inertia().unwrap();
                assert!(
                    j.iter().all(|x| x.abs() <= e.bounds.inertia + 1e-9),
                    "solid {i}: inertia off by {j}, not {}",
                    e.bounds.inertia
                );
            }
            tally
        })
        .collect();
    let mut sum = Tally::default();
    let mut reasons: std::collections::BTreeMap<&str, usize> = std::collections::BTreeMap::new();
    for t in &tallies {
        sum.cut += t.cut;
        sum.refused += t.refused;
        sum.obey += t.obey;
        sum.obey_flat += t.obey_flat;
        sum.held_anyway += t.held_anyway;
        sum.mended += t.mended;
        sum.closest = sum.closest.max(t.closest);
        for why in &t.why {
            *reasons.entry(why).or_default() += 1;
        }
    }
    println!(
        "{} solids, {} patches: {} refused, {} obey the policy ({:.1} %, {} over flat loops), all inside; \
         {} of the others too; closest {:.2} of its bound",
        solids,
        sum.cut,
        sum.refused,
        sum.obey,
        100.0 * sum.obey as f64 / sum.cut as f64,
        sum.obey_flat,
        sum.held_anyway,
        sum.closest
    );
    println!("{} mended and sound; refused: {reasons:?}", sum.mended);
    assert!(sum.mended > 300);
    assert!(sum.obey > 1500 && sum.obey_flat > 300 && sum.closest > 0.3);
}

/// A half-ball on a flat disc attains the bound; the facets of a sphere come near from below.
#[test]
fn a_half_ball_attains_the_flat_bound() {
    let n = 200;
    let angle = |i: usize, of: usize| std::f64::consts::TAU * i as f64 / of as f64;
    let at = |i: usize, j: usize| -> P {
        // Exact poles and equator: the rim is flat.
        let lat = angle(j, 2 * n) - std::f64::consts::FRAC_PI_2;
        let (s, c) = if j == 0 {
            (-1.0, 0.0)
        } else if 2 * j == n {
            (0.0, 1.0)
        } else if j == n {
            (1.0, 0.0)
        } else {
            (lat.sin(), lat.cos())
        };
        let a = angle(i % n, n);
        [c * a.cos(), c * a.sin(), s]
    };
    let mut whole = Vec::new();
    for j in 0..n {
        for i in 0..n {
            let (a, b, c, d) = (at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1));
            if j > 0 {
                whole.push([a, b, c]);
            }
            if j + 1 < n {
                whole.push([a, c, d]);
            }
        }
    }
    let truth = welded(whole.clone());
    let v = truth
        .solid(&truth.bodies()[0], None)
        .unwrap()
        .moments
        .zeroth;
    let open = welded(
        whole
            .into_iter()
            .filter(|t| t.iter().any(|p| p[2] < 0.0))
            .collect(),
    );
    let e = cap::estimate(&open, &open.bodies()[0], None).unwrap();
    assert!(e.caps.len() == 1 && e.caps[0].flat);
    let ratio = (v - e.solid.moments.zeroth) / e.bounds.volume;
    // The error of 200 facets round is (2π/200)²/4 or so, of volume and area alike.
    assert!((1.0 - ratio).abs() < 1e-3, "{ratio}");
    assert!((e.bounds.volume / (2.0 / 3.0 * std::f64::consts::PI) - 1.0).abs() < 1e-3);
}
