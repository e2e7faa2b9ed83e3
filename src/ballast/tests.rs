use nalgebra::Vector3;
use proptest::prelude::*;

use super::*;
use crate::error::Result;
use crate::limits::{Axis, Measured, Plane, Rotor, Verdict, rad_per_s};

fn limit(name: &str, quantity: Measured, from: Option<f64>, to: Option<f64>) -> Limit {
    Limit {
        name: name.into(),
        quantity,
        from,
        to,
        line: 1,
    }
}

fn state(moments: Moments) -> State {
    State {
        phase: String::new(),
        moments,
        drivers: Vec::new(),
        only: None,
    }
}

fn point(x: f64, y: f64, z: f64, m: f64) -> Moments {
    Moments::point(Vector3::new(x, y, z), m)
}

fn problem(moments: Moments, places: Vec<Place>, limits: Vec<Limit>) -> Problem {
    Problem {
        places,
        limits,
        states: vec![state(moments)],
        diagonal: 1.0,
        sure: None,
    }
}

fn at(x: f64, y: f64, z: f64) -> Place {
    Place::point(&format!("{x} {y} {z}"), Vector3::new(x, y, z))
}

fn solve(p: &Problem) -> Trimmed {
    let t = trim(p, &mut |_| Ok(Vec::new())).unwrap();
    if t.outcome != Outcome::Impossible {
        for l in &t.after {
            assert_eq!(l.judged.verdict, Verdict::Holds, "{:?}", l.judged);
        }
    }
    t
}

/// The least ballast is proved: its lower bound meets it.
#[track_caller]
fn proved(t: &Trimmed, want: f64, close: f64) {
    assert_eq!(t.outcome, Outcome::Found, "{t:?}");
    let total = t.total_kg.unwrap();
    assert!((total - want).abs() <= close, "{total} {want}");
    assert!(
        t.gap_kg.unwrap() <= 1e-8 * (1.0 + total),
        "gap {:?}",
        t.gap_kg
    );
}

#[test]
fn published_ballast() {
    // W·Δ/(arm − target), W before adding. Handbook: 1876 lb at 32.2 in, limit 33.0, arm 228 →
    // 7.696 lb (first two seen in public text, the rest from memory); 4954 lb, 30.5 → 32.0 in, arm
    // 162 → 57.16 lb (seen).
    for (w, x, target, arm, want, close) in [
        (1876.0, 32.2, 33.0, 228.0, 7.696, 5e-4),
        (4954.0, 30.5, 32.0, 162.0, 57.16, 5e-3),
        (980.0, 2930.0, 3004.0, 3600.0, 121.678, 5e-4),
    ] {
        let c = limit("c", Measured::Centre(0), Some(target), None);
        let t = solve(&problem(
            point(x, 0.0, 0.0, w),
            vec![at(arm, 0.0, 0.0)],
            vec![c],
        ));
        proved(&t, w * (target - x) / (arm - target), 1e-9 * w);
        assert!((t.total_kg.unwrap() - want).abs() < close);
        assert_eq!(t.proof, Proof::Dual);
        // One more inch of target would save what the formula's derivative says.
        let price = w * (arm - x) / (arm - target).powi(2);
        assert!(
            (t.binding[0].price - price).abs() < 1e-6 * price,
            "{:?} {price}",
            t.binding
        );
    }
    // The tabulated 7.7 lb gives 33.0004 in.
    assert!(((1876.0 * 32.2 + 7.7 * 228.0_f64) / 1883.7 - 33.0004).abs() < 5e-5);
}

#[test]
fn before_or_after_adding() {
    // The classic slip: 980 kg after adding asks for 108.239 kg, before adding for 121.678 kg.
    let before = 980.0 - 980.0 * (3004.0 - 2930.0) / (3600.0 - 2930.0);
    let c = limit("c", Measured::Centre(0), Some(3004.0), None);
    let t = solve(&problem(
        point(2930.0, 0.0, 0.0, before),
        vec![at(3600.0, 0.0, 0.0)],
        vec![c],
    ));
    proved(&t, 980.0 - before, 1e-8);
    assert!((t.total_kg.unwrap() - 108.239).abs() < 5e-4);
}

#[test]
fn an_equality_is_met_to_rounding() {
    let c = |k, v| limit(["x", "y"][k], Measured::Centre(k), Some(v), Some(v));
    let places = vec![at(1.0, 0.0, 0.0), at(0.0, 1.0, 0.0), at(-1.0, -1.0, 0.0)];
    let t = solve(&problem(
        point(-0.1, 0.02, 0.0, 100.0),
        places,
        vec![c(0, 0.0), c(1, 0.0)],
    ));
    // By hand: x₁ − x₃ = 10, x₂ − x₃ = −2, so x₃ = 2, x₁ = 12, x₂ = 0.
    proved(&t, 14.0, 1e-9);
    assert_eq!(t.ballast.len(), 2);
}

#[test]
fn nothing_needed_and_nothing_possible() {
    let c = limit("fore and aft", Measured::Centre(0), None, Some(0.5));
    let t = solve(&problem(
        point(0.4, 0.0, 0.0, 10.0),
        vec![at(-1.0, 0.0, 0.0)],
        vec![c.clone()],
    ));
    assert_eq!(
        (t.outcome, t.total_kg, t.proof),
        (Outcome::HoldsAlready, Some(0.0), Proof::Dual)
    );
    // The wrong side, an idle limit beside it: the conflict names those that matter.
    let limits = vec![
        limit("idle", Measured::Centre(1), None, Some(9.0)),
        limit("centre", Measured::Centre(0), None, Some(0.5)),
        limit("mass", Measured::Mass, None, Some(11.0)),
    ];
    let t = solve(&problem(
        point(0.9, 0.0, 0.0, 10.0),
        vec![at(-1.0, 0.0, 0.0)],
        limits,
    ));
    assert_eq!(t.outcome, Outcome::Impossible);
    assert_eq!(t.conflict, ["centre", "mass"]);
    assert_eq!((t.total_kg, t.gap_kg), (None, None));
    let t = solve(&problem(
        point(0.9, 0.0, 0.0, 10.0),
        vec![at(1.0, 0.0, 0.0)],
        vec![c],
    ));
    assert_eq!(t.conflict, ["fore and aft"]);
}

#[test]
fn distance_from_a_point_by_hand() {
    // Two places on the axes: the centre (0.3, 0.4)·100/(100 + m) must come within 0.1 of the
    // origin; against the centre the pull of both adds to a force along the line.
    let d = limit("d", Measured::FromPoint(Vector3::zeros()), None, Some(0.1));
    let t = solve(&problem(
        point(0.3, 0.4, 0.0, 100.0),
        vec![at(-3.0, -4.0, 0.0)],
        vec![d],
    ));
    // (50 − 5m)/(100 + m) = 0.1.
    proved(&t, 40.0 / 5.1, 1e-7);
    // d m/d r = −(100 + m)/(5 + r).
    let m = 40.0 / 5.1;
    assert!(
        (t.binding[0].price - (100.0 + m) / 5.1).abs() < 1e-5,
        "{:?}",
        t.binding
    );
}

#[test]
fn a_rotor_is_balanced_in_two_planes() {
    // 100 kg turning at 3000 rpm, G 6.3: 2005.352 g mm in all, half a plane. Unbalance of
    // 5000 g mm in plane A only; correction at radius 0.1 m opposite.
    let rotor = Rotor {
        axis: Axis {
            at: Vector3::zeros(),
            along: Vector3::z(),
        },
        planes: [0.0, 0.4],
        speed: rad_per_s(3000.0),
        grade: 6.3e-3,
    };
    let whole = point(0.0, 0.0, 0.2, 99.0).plus(&point(5e-3, 0.0, 0.0, 1.0));
    let limits = [Plane::A, Plane::B].map(|p| {
        limit(
            "u",
            Measured::Unbalance(Box::new(rotor.clone()), p),
            None,
            None,
        )
    });
    let places = vec![at(-0.1, 0.0, 0.0), at(0.1, 0.0, 0.0), at(0.0, 0.1, 0.0)];
    let t = solve(&problem(whole, places, limits.to_vec()));
    // 5e-3 − 0.1·m = G/ω·(100 + m)·(0.4 − z)/0.4 with z·(100 + m) = 99·0.2.
    let e = 6.3e-3 / rad_per_s(3000.0);
    let want = (5e-3 - e * (100.0 - 99.0 * 0.2 / 0.4)) / (0.1 + e);
    proved(&t, want, 1e-9);
}

#[test]
fn inertia_from_below_is_a_cone() {
    // A rod's Izz about its centre must reach 30 kg m²: two masses at ±r about a centred whole.
    let whole = point(0.0, 0.0, 0.0, 50.0);
    let i = limit(
        "i",
        Measured::Inertia {
            row: 2,
            column: 2,
            about: None,
        },
        Some(30.0),
        None,
    );
    let places = vec![at(2.0, 0.0, 0.0), at(-2.0, 0.0, 0.0)];
    let t = solve(&problem(whole, places.clone(), vec![i.clone()]));
    // 4·(m₁ + m₂) − (2(m₁ − m₂))²/(50 + m) ≥ 30: least at m₁ = m₂ = 3.75.
    proved(&t, 7.5, 1e-6);
    // One place alone moves the centre: 4m − 4m²/(50 + m) = 200m/(50 + m) = 30 → m = 1500/170.
    let t = solve(&problem(whole, places[..1].to_vec(), vec![i]));
    proved(&t, 1500.0 / 170.0, 1e-6);
}

#[test]
fn unit_weights_and_at_least() {
    let c = limit("c", Measured::Centre(0), None, Some(0.0));
    let mut near = at(-0.5, 0.0, 0.0);
    near.step = Some(0.4);
    let t = solve(&problem(
        point(0.1, 0.0, 0.0, 10.0),
        vec![near.clone()],
        vec![c.clone()],
    ));
    // 2 kg at −0.5 would do; 0.4 kg pieces: exactly five.
    proved(&t, 2.0, 1e-12);
    assert_eq!(t.ballast[0].units, Some(5));
    // Plates of at least 3 kg near, or 1.5 kg pieces far: 1.5 kg at −1 is enough (1 kg needed).
    near.step = None;
    near.least = 3.0;
    let mut far = at(-1.0, 0.0, 0.0);
    far.step = Some(1.5);
    let t = solve(&problem(
        point(0.1, 0.0, 0.0, 10.0),
        vec![near, far],
        vec![c],
    ));
    proved(&t, 1.5, 1e-9);
    assert_eq!((t.proof, t.ballast.len()), (Proof::Gap, 1));
}

#[test]
fn an_outline_that_moves_with_the_mass() {
    use crate::limits::Envelope;
    // The forward end moves aft as it gets heavier: x ≥ 1 + (m − 100)/100.
    let axis = Axis {
        at: Vector3::zeros(),
        along: Vector3::x(),
    };
    let e = Envelope::new(
        axis,
        vec![[100.0, 1.0], [200.0, 2.0], [200.0, 9.0], [100.0, 9.0]],
    )
    .unwrap();
    let limits = vec![
        limit("e", Measured::Mass, Some(100.0), Some(200.0)),
        limit("e", Measured::Envelope(Box::new(e)), None, None),
    ];
    let t = solve(&problem(
        point(0.9, 0.0, 0.0, 110.0),
        vec![at(5.0, 0.0, 0.0)],
        limits,
    ));
    // 99 + 5m = (110 + m)²/100: m² + 220m + 12100 = 9900 + 500m.
    let want = 140.0 - (140.0_f64 * 140.0 - 2200.0).sqrt();
    proved(&t, want, 1e-6);
    assert_eq!(t.proof, Proof::Dual);
}

#[test]
fn what_is_not_convex_is_searched_and_said_so() {
    // Ratio of the largest to the middle principal moment up to 1.2.
    let whole = point(1.0, 0.0, 0.0, 5.0)
        .plus(&point(-1.0, 0.0, 0.0, 5.0))
        .plus(&point(0.0, 0.5, 0.0, 2.0))
        .plus(&point(0.0, -0.5, 0.0, 2.0));
    let r = limit("r", Measured::Ratio { of: 2, to: 1 }, Some(1.2), None);
    let places = vec![at(0.0, 1.5, 0.0), at(0.0, -1.5, 0.0), at(0.0, 0.0, 1.0)];
    let t = solve(&problem(whole, places, vec![r]));
    // By hand with a pair at ±1.5: (11 + 2.25·m)/10 = 1.2 → m = 4/9; Iyy = 10 stays.
    assert_eq!(
        (t.outcome, t.proof, t.gap_kg),
        (Outcome::Found, Proof::Local, None)
    );
    assert!(t.total_kg.unwrap() < 4.0 / 9.0 + 1e-3, "{:?}", t.total_kg);
    // An off-axis product about the centre brought to nothing.
    let whole = point(1.0, 1.0, 0.0, 1.0)
        .plus(&point(-1.0, -1.0, 0.0, 1.0))
        .plus(&point(0.0, 0.0, 0.0, 8.0));
    let p = limit(
        "p",
        Measured::Inertia {
            row: 0,
            column: 1,
            about: None,
        },
        Some(-0.2),
        Some(0.2),
    );
    let places = vec![at(1.0, -1.0, 0.0), at(-1.0, 1.0, 0.0)];
    let t = solve(&problem(whole, places, vec![p]));
    assert_eq!(t.proof, Proof::Local);
    // Ixy = −∫xy = −2 before; a pair of m/2 each adds m. One alone: m − m²/(10 + m): more.
    assert!((t.total_kg.unwrap() - 1.8).abs() < 1e-5, "{:?}", t.total_kg);
}

#[test]
fn worst_states_are_added_until_there_are_none() {
    // The centre before ballast runs over x = 0.3·sin: the worst is at its crest, between steps.
    let run = |at: f64| point(0.3 * at.sin(), 0.0, 0.0, 10.0);
    let c = limit("c", Measured::Centre(0), None, Some(0.0));
    let mut p = problem(run(0.0), vec![at(-1.0, 0.0, 0.0)], vec![c]);
    p.states[0].phase = "turn".into();
    let mut rounds = 0;
    let t = trim(&p, &mut |x: &[f64]| -> Result<Vec<State>> {
        rounds += 1;
        let worst = std::f64::consts::FRAC_PI_2;
        let broken = run(worst)
            .plus(&point(-1.0, 0.0, 0.0, x[0]))
            .centre()
            .unwrap()
            .x
            > 1e-12;
        Ok(if broken {
            vec![State {
                phase: "turn at its crest".into(),
                ..state(run(worst))
            }]
        } else {
            Vec::new()
        })
    })
    .unwrap();
    assert_eq!(rounds, 2);
    proved(&t, 3.0, 1e-9);
    assert_eq!(t.binding[0].phase.as_deref(), Some("turn at its crest"));
    assert_eq!(t.after[0].phase.as_deref(), Some("turn at its crest"));
}

#[test]
fn certainty_leaves_k_standard_deviations() {
    let mut p = problem(
        point(0.2, 0.0, 0.0, 100.0),
        vec![at(-1.0, 0.0, 0.0)],
        vec![limit("c", Measured::Centre(0), None, Some(0.0))],
    );
    // The first moment is off by 1 kg m and the ballast by 1 %.
    p.states[0].drivers = vec![Moments {
        first: Vector3::new(1.0, 0.0, 0.0),
        ..Moments::zero(Vector3::zeros())
    }];
    p.places[0].relative = 0.01;
    p.sure = Some(Sure {
        probability: 0.99,
        seed: 1,
    });
    let t = solve(&p);
    // Bonferroni over the two ends of one limit; (m − 20)² = k²·(1 + (0.01·m)²).
    let k = certain::factor(0.005);
    let (a, b, c) = (1.0 - 1e-4 * k * k, -40.0, 400.0 - k * k);
    let want = (-b + (b * b - 4.0 * a * c).sqrt()) / (2.0 * a);
    proved(&t, want, 1e-6);
    let s = t.sampled.unwrap();
    assert_eq!(s.n, 100_000);
    // One end only can break, at half of what is left: 99.5 % within sampling error.
    assert!(
        (s.held - 0.995).abs() < 4.0 * (0.005_f64 * 0.995 / 1e5).sqrt(),
        "{s:?}"
    );
    // A cone: the distance from a line, in two directions.
    let mut p = problem(
        point(0.2, 0.1, 0.0, 100.0),
        vec![at(-1.0, 0.0, 0.0), at(0.0, -1.0, 0.0)],
        vec![limit(
            "d",
            Measured::FromLine(Axis {
                at: Vector3::zeros(),
                along: Vector3::z(),
            }),
            None,
            Some(0.05),
        )],
    );
    let e = |x: f64, y: f64| Moments {
        first: Vector3::new(x, y, 0.0),
        ..Moments::zero(Vector3::zeros())
    };
    p.states[0].drivers = vec![e(0.5, 0.0), e(0.0, 0.5)];
    p.sure = Some(Sure {
        probability: 0.95,
        seed: 2,
    });
    let t = solve(&p);
    assert!(t.sampled.unwrap().held >= 0.947, "{:?}", t.sampled);
    assert!(t.total_kg > solve(&Problem { sure: None, ..p }).total_kg);
}

#[test]
fn prices_are_what_one_more_unit_buys() {
    let c = |to: f64| {
        vec![
            limit("x", Measured::Centre(0), None, Some(to)),
            limit("y", Measured::Centre(1), None, Some(0.02)),
        ]
    };
    let mut near = at(-1.0, 0.2, 0.0);
    near.most = Some(6.0);
    let places = vec![near, at(-0.6, -0.3, 0.0), at(0.1, -1.0, 0.0)];
    let whole = point(0.2, 0.05, 0.0, 60.0);
    let total = |to: f64| {
        solve(&problem(whole, places.clone(), c(to)))
            .total_kg
            .unwrap()
    };
    let t = solve(&problem(whole, places.clone(), c(0.0)));
    let h = 1e-5;
    let slope = (total(-h) - total(h)) / (2.0 * h);
    let price = t.binding.iter().find(|b| b.limit == "x").unwrap().price;
    assert!(
        (price - slope).abs() < 1e-4 * slope.abs(),
        "{price} {slope}"
    );
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    /// Unit weights against every combination of up to five of each.
    #[test]
    fn brute_force(
        spots in prop::collection::vec(prop::array::uniform2(-1.0..1.0f64), 3),
        steps in prop::array::uniform3(0.2..1.5f64),
        c in prop::array::uniform2(-0.2..0.2f64),
        band in 0.02..0.1f64,
    ) {
        let whole = point(c[0], c[1], 0.0, 20.0);
        let limits: Vec<Limit> = (0..2)
            .map(|k| limit(["x", "y"][k], Measured::Centre(k), Some(-band), Some(band)))
            .collect();
        let places: Vec<Place> = spots.iter().zip(&steps).map(|(s, w)| {
            let mut p = at(s[0], s[1], 0.0);
            p.step = Some(*w);
            p.most = Some(5.0 * w);
            p
        }).collect();
        let t = solve(&problem(whole, places.clone(), limits.clone()));
        let mut best = f64::INFINITY;
        for n in 0..216_u32 {
            let k = [n % 6, n / 6 % 6, n / 36].map(f64::from);
            let m = places.iter().zip(&k).zip(&steps).fold(whole, |m, ((p, k), w)| m.plus(&p.per_kg.weighted(k * w)));
            if limits.iter().all(|l| l.judge_whole(&m, 1.0).verdict == Verdict::Holds) {
                best = best.min(k.iter().zip(&steps).map(|(k, w)| k * w).sum());
            }
        }
        match t.total_kg {
            Some(total) => prop_assert!((total - best).abs() < 1e-9, "{total} {best}"),
            None => prop_assert!(best.is_infinite(), "missed {best}"),
        }
    }

    /// Linear limits and cones together: the dual bound meets the answer, and no random feasible
    /// masses are lighter.
    #[test]
    fn duality_certifies_the_least(
        spots in prop::collection::vec(prop::array::uniform3(-1.0..1.0f64), 4),
        c in prop::array::uniform3(-0.3..0.3f64),
        r in 0.02..0.2f64,
        tries in prop::collection::vec(prop::array::uniform4(0.0..60.0f64), 40),
    ) {
        let whole = point(c[0], c[1], c[2], 50.0);
        let limits = vec![
            limit("d", Measured::FromLine(Axis { at: Vector3::zeros(), along: Vector3::z() }), None, Some(r)),
            limit("z", Measured::Centre(2), Some(-0.2), Some(0.2)),
            limit("m", Measured::Mass, None, Some(200.0)),
        ];
        let places: Vec<Place> = spots.iter().map(|s| at(s[0], s[1], s[2])).collect();
        let t = solve(&problem(whole, places.clone(), limits.clone()));
        let feasible = |x: &[f64]| {
            let m = places.iter().zip(x).fold(whole, |m, (p, x)| m.plus(&p.per_kg.weighted(*x)));
            limits.iter().all(|l| l.judge_whole(&m, 1.0).verdict == Verdict::Holds)
        };
        let lightest = tries.iter().filter(|x| feasible(&x[..])).map(|x| x.iter().sum::<f64>())
            .fold(f64::INFINITY, f64::min);
        match t.total_kg {
            Some(total) => {
                prop_assert!(t.gap_kg.unwrap() <= 1e-6 * (1.0 + total), "{:?}", t.gap_kg);
                prop_assert!(lightest >= total - 1e-6);
            }
            None => prop_assert!(lightest.is_infinite()),
        }
    }
}
