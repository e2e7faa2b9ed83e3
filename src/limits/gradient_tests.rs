//! Values by hand and gradients by differences.

use nalgebra::{Matrix3, Vector3};
use proptest::prelude::*;

use super::*;
use crate::statics::{Stand, Support};

fn axis(at: [f64; 3], along: [f64; 3]) -> Axis {
    Axis {
        at: Vector3::from(at),
        along: Vector3::from(along).normalize(),
    }
}

fn stand() -> Stand {
    let at = [[-1.0, -0.8, 0.0], [1.2, -0.7, 0.0], [0.1, 0.9, 0.0]];
    let supports = at.iter().enumerate().map(|(i, p)| Support {
        name: i.to_string(),
        at: Vector3::from(*p),
    });
    Stand::new(supports.collect(), Vector3::z()).unwrap()
}

fn rotor() -> Box<Rotor> {
    Box::new(Rotor {
        axis: axis([0.1, -0.2, 0.3], [1.0, 2.0, -1.0]),
        planes: [-0.9, 1.3],
        speed: 50.0,
        grade: 0.02,
    })
}

fn every() -> Vec<Measured> {
    let tipping = |towards| Box::new(Tipping::new(stand().edges(), towards).unwrap());
    let (a, b) = stand().share(1).unwrap();
    let outline = vec![[1.0, -3.0], [9.0, -1.0], [12.0, 3.0], [1.0, 4.0]];
    let mut all = vec![
        Measured::Mass,
        Measured::Centre(1),
        Measured::Station(axis([1.0, 2.0, 3.0], [1.0, 1.0, 0.0])),
        Measured::Percent {
            from: axis([1.0, 0.0, 0.0], [1.0, 0.0, 0.0]),
            length: 1.7,
        },
        Measured::FromPoint(Vector3::new(0.3, 0.2, 0.1)),
        Measured::FromLine(axis([1.0, 0.0, 0.0], [0.0, 1.0, 1.0])),
        Measured::FromPlane(axis([0.0, 1.0, 0.0], [0.3, 1.0, 0.0])),
        Measured::Envelope(Box::new(
            Envelope::new(axis([0.0; 3], [1.0, 0.5, 0.0]), outline).unwrap(),
        )),
        Measured::Ratio { of: 0, to: 2 },
        Measured::Ratio { of: 2, to: 1 },
        Measured::Tip(tipping(None)),
        Measured::Tip(tipping(Some(Vector3::new(0.6, 0.8, 0.0)))),
        Measured::Reaction(Box::new(SupportShare {
            support: "1".into(),
            a,
            b,
            gravity: 9.80665,
        })),
        Measured::Unbalance(rotor(), Plane::A),
        Measured::Unbalance(rotor(), Plane::B),
    ];
    for (row, column) in [(0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2)] {
        for about in [None, Some(Vector3::new(0.5, -0.5, 0.25))] {
            all.push(Measured::Inertia { row, column, about });
        }
    }
    all
}

#[test]
fn names_are_told_apart_and_units_are_si() {
    let names: std::collections::BTreeSet<_> = every().iter().map(Measured::name).collect();
    assert_eq!(names.len(), 19, "{names:?}");
}

#[test]
fn values_by_hand() {
    // A rod of two masses: 2 kg at x = 0 and 6 kg at x = 4: centre 3, about it 2·9 + 6·1 = 24.
    let m = Moments::point(Vector3::zeros(), 2.0)
        .plus(&Moments::point(Vector3::new(4.0, 0.0, 0.0), 6.0));
    let value = |q: Measured| q.value(&m).unwrap();
    assert_eq!(value(Measured::Mass), 8.0);
    assert_eq!(value(Measured::Centre(0)), 3.0);
    let yy = |about| Measured::Inertia {
        row: 1,
        column: 1,
        about,
    };
    assert_eq!(value(yy(None)), 24.0);
    assert_eq!(value(yy(Some(Vector3::zeros()))), 96.0);
    assert_eq!(value(Measured::FromPoint(Vector3::new(0.0, 4.0, 0.0))), 5.0);
    assert_eq!(
        value(Measured::FromLine(axis([0.0; 3], [0.0, 0.0, 1.0]))),
        3.0
    );
    assert_eq!(
        value(Measured::FromPlane(axis([5.0, 0.0, 0.0], [1.0, 0.0, 0.0]))),
        -2.0
    );
    assert!(
        Measured::Mass
            .value(&Moments::zero(Vector3::zeros()))
            .is_none()
    );
    // A centre of 724 between edges at 517 and 1706: 17.4096 % of that chord (published inputs).
    let m = Moments::point(Vector3::new(724.0, 0.0, 0.0), 1.0);
    let chord = Measured::Percent {
        from: axis([517.0, 0.0, 0.0], [1.0, 0.0, 0.0]),
        length: 1706.0 - 517.0,
    };
    assert!((chord.value(&m).unwrap() - 0.174_096).abs() < 5e-7);
    // 0.4 m from the edge, 1.2 m high: 18.434949°.
    let at = [
        [-1.0, -0.4, 0.0],
        [1.0, -0.4, 0.0],
        [1.0, 0.4, 0.0],
        [-1.0, 0.4, 0.0],
    ];
    let supports = at.map(|p| Support {
        name: String::new(),
        at: Vector3::from(p),
    });
    let s = Stand::new(supports.to_vec(), Vector3::z()).unwrap();
    let tip = Measured::Tip(Box::new(Tipping::new(s.edges(), None).unwrap()));
    let m = Moments::point(Vector3::new(0.0, 0.0, 1.2), 5.0);
    assert!((tip.value(&m).unwrap().to_degrees() - 18.434_948_822_922).abs() < 1e-12);
}

#[test]
fn moved_cargo() {
    // 180 lb moved by 32 in in 2700 lb moves the centre by 2.13 in; 3200 lb, 1.5 in, 25 in asks
    // for 192 lb (published handbook examples).
    let whole = Moments::point(Vector3::zeros(), 2700.0);
    let shift = Moments::point(Vector3::new(32.0, 0.0, 0.0), 180.0)
        .plus(&Moments::point(Vector3::zeros(), -180.0));
    let moved = whole.plus(&shift);
    assert!((Measured::Centre(0).value(&moved).unwrap() - 2.13).abs() < 5e-3);
    assert!((3200.0_f64 * 1.5 / 25.0 - 192.0).abs() < 1e-12);
}

#[test]
fn dynamic_bands() {
    let m = Moments::point(Vector3::new(2.0, 0.0, 0.0), 5.0);
    let envelope = every().remove(7);
    let limit = Limit {
        name: "e".into(),
        quantity: envelope,
        from: None,
        to: None,
        line: 1,
    };
    let j = limit.judge_whole(&m, 1.0);
    assert_eq!(j.from, Some(-2.0));
    assert_eq!(j.verdict, Verdict::Holds);
    let limit = Limit {
        name: "u".into(),
        quantity: Measured::Unbalance(rotor(), Plane::A),
        from: None,
        to: None,
        line: 1,
    };
    let j = limit.judge_whole(&m, 1.0);
    assert!(j.to.unwrap() > 0.0 && j.verdict == Verdict::Broken);
    assert_eq!(limit.shape(End::To), Shape::Cone);
}

proptest! {
    /// Central differences agree with the exact gradient, of values and of margins.
    #[test]
    fn gradients(
        places in prop::collection::vec(prop::array::uniform3(-1.0..1.0f64), 5),
        masses in prop::collection::vec(0.5..2.0f64, 5),
        d in prop::array::uniform10(-1.0..1.0f64),
    ) {
        let m = places.iter().zip(&masses).fold(Moments::zero(Vector3::zeros()), |m, (p, w)| {
            m.plus(&Moments::point(Vector3::new(p[0], p[1], p[2] + 1.5), *w))
        });
        let change = Moments {
            about: Vector3::new(0.2, 0.1, 0.4),
            zeroth: d[0],
            first: Vector3::new(d[1], d[2], d[3]),
            second: Matrix3::new(d[4], d[7], d[8], d[7], d[5], d[9], d[8], d[9], d[6]),
        };
        let h = 1e-5;
        for q in every() {
            let limit = Limit { name: String::new(), from: Some(0.0), to: Some(1.0), line: 1, quantity: q.clone() };
            // Kinks: a corner of the outline, two edges as near, moments alike, a share at its end.
            let kink = match &q {
                Measured::Envelope(_) => (m.zeroth - 9.0).abs() < 0.01 || m.zeroth < 1.01,
                Measured::Ratio { .. } => {
                    let p = crate::moments::principal(&m.inertia().unwrap()).moments;
                    p[1] - p[0] < 0.02 || p[2] - p[1] < 0.02 || p[0] < 0.02
                }
                Measured::Tip(t) => {
                    let c = m.centre().unwrap();
                    let mut angles: Vec<f64> = t.edges.iter()
                        .map(|e| e.angle(&t.towards.unwrap_or(e.outward), &c)).collect();
                    angles.sort_by(f64::total_cmp);
                    angles.len() > 1 && angles[1] - angles[0] < 0.01
                }
                Measured::Unbalance(r, p) => {
                    let (_, free) = r.share(&m.centre().unwrap(), *p);
                    (free - 0.3).abs() < 0.01 || (free - 0.7).abs() < 0.01 || r.unbalance(&m, *p).norm() < 0.05
                }
                Measured::FromPoint(_) | Measured::FromLine(_) => q.value(&m).unwrap() < 0.05,
                _ => false,
            };
            if kink { continue }
            let (up, down) = (m.plus(&change.weighted(h)), m.plus(&change.weighted(-h)));
            let check = |f: &dyn Fn(&Moments) -> Option<f64>, g: Option<Gradient>| -> Result<(), TestCaseError> {
                let (Some(a), Some(b)) = (f(&up), f(&down)) else { return Ok(()) };
                let want = (a - b) / (2.0 * h);
                let got = g.unwrap().of(&change);
                // Second order of the differences: 1e-10 times third derivatives of a few thousand.
                prop_assert!((got - want).abs() <= 2e-6 * (1.0 + want.abs()), "{}: {got} {want}", q.name());
                Ok(())
            };
            check(&|m| q.value(m), q.gradient(&m))?;
            for end in [End::From, End::To] {
                if limit.margin(&m, end).is_some() {
                    check(&|m| limit.margin(m, end), limit.margin_gradient(&m, end))?;
                }
            }
        }
    }
}
