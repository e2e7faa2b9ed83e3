//! Centres in a central field against closed forms and the published-style tether rows.

use nalgebra::{Matrix3, Rotation3, Vector3};

use super::*;
use crate::geometry::box_facets;
use crate::moments::Moments;

fn point(at: [f64; 3], kg: f64) -> Mass {
    Mass {
        moments: Moments::point(Vector3::from(at), kg),
        bounds: [at, at],
        pieces: Vec::new(),
        point: true,
    }
}

/// A box of mass 1 per volume, turned and placed; with its shape, or by its moments only.
fn solid(half: [f64; 3], turn: &Matrix3<f64>, at: Vector3<f64>, shape: bool) -> Mass {
    let h = Vector3::from(half);
    let facets: Vec<[[f64; 3]; 3]> = box_facets((-h).into(), h.into())
        .into_iter()
        .map(|t| t.map(|p| (turn * Vector3::from(p) + at).into()))
        .collect();
    let volume = 8.0 * h.x * h.y * h.z;
    let own = Moments {
        second: Matrix3::from_diagonal(&(h.component_mul(&h) * (volume / 3.0))),
        zeroth: volume,
        ..Moments::zero(Vector3::zeros())
    };
    let r = h.norm();
    Mass {
        moments: own.placed(&crate::moments::Placement { turn: *turn, at }),
        bounds: [(at.add_scalar(-r)).into(), (at.add_scalar(r)).into()],
        pieces: match shape {
            true => vec![Piece {
                facets,
                apex: at.into(),
                density: 1.0,
            }],
            false => Vec::new(),
        },
        point: false,
    }
}

fn all(masses: &[Mass]) -> Moments {
    let near = masses[0].moments.about;
    let sum = masses
        .iter()
        .fold(Moments::zero(near), |sum, m| sum.plus(&m.moments));
    sum.shifted(sum.centre().unwrap())
}

fn of(masses: &[Mass], at: [f64; 3]) -> Central {
    central(masses, &all(masses), EARTH.gm, &Vector3::from(at)).unwrap()
}

/// REFERENCE: one tonne each, 100 m and 100 km tall, standing on the equator: shifts in km.
#[test]
fn tall_pairs_shift_as_computed() {
    let base = 6378.137e3;
    let c = of(
        &[point([0.0; 3], 1e3), point([100.0, 0.0, 0.0], 1e3)],
        [base, 0.0, 0.0],
    );
    let near = |a: f64, b: f64, digits: f64| assert!((a - b).abs() < digits * b.abs(), "{a} {b}");
    near(c.same_force.unwrap().x * 1e-3, -5.8794137e-7, 1e-8);
    near(c.weight_averaged.x * 1e-3, -7.8392183e-7, 1e-8);
    let c = of(
        &[point([0.0; 3], 1e3), point([1e5, 0.0, 0.0], 1e3)],
        [base, 0.0, 0.0],
    );
    near(
        c.same_force.unwrap().x * 1e-3,
        6427.55364783 - 6428.137,
        1e-8,
    );
    near(c.weight_averaged.x * 1e-3, 6427.35921672 - 6428.137, 1e-8);
}

/// REFERENCE: the tether, 20 t below and 600 t at 100,000 km.
#[test]
fn the_tether_rows() {
    for (altitude, mass, same, weighted) in [
        (0.0, 103152.330548, 33739.2159994, 16112.8863468),
        (10000.0, 103474.911194, 69711.5232432, 53781.138506),
        (35786.0, 104306.717645, 98217.6836965, 95138.2751349),
    ] {
        // Also with a 100 mm bracket on the ground in it, and the origin there.
        let low = [altitude * 1e3, 0.0, 0.0];
        let masses = [
            point(low, 20e3),
            point([1e8, 0.0, 0.0], 600e3),
            solid([0.05; 3], &Matrix3::identity(), Vector3::zeros(), true),
        ];
        // The bracket of 1 g is left out of those rows; down there it weighs up to 3e-7 of the rest.
        let c = of(&masses, [6378.137e3, 0.0, 0.0]);
        let centre = all(&masses).centre().unwrap().x + 6378.137e3;
        let at = |d: f64| (centre + d) * 1e-3;
        assert!((at(0.0) - mass).abs() < 5e-4, "{}", at(0.0));
        assert!(
            (at(c.same_force.unwrap().x) - same).abs() < 1e-6 * same,
            "{c:?}"
        );
        assert!(
            (at(c.weight_averaged.x) - weighted).abs() < 1e-6 * weighted,
            "{c:?}"
        );
        let two = of(&masses[..2], [6378.137e3, 0.0, 0.0]);
        let centre = all(&masses[..2]).centre().unwrap().x + 6378.137e3;
        let at = |d: f64| (centre + d) * 1e-3;
        assert!((at(0.0) - mass).abs() < 1e-6);
        assert!(
            (at(two.same_force.unwrap().x) - same).abs() < 1e-6,
            "{two:?}"
        );
        assert!(
            (at(two.weight_averaged.x) - weighted).abs() < 1e-6,
            "{two:?}"
        );
    }
}

/// A bracket of 100 mm at 6,378 km: the shifts are −1.5σ²/r and −2σ²/r along the radius, 1e-16 of
/// the radius, and still have seven digits (the next term is of the order σ/r = 1e-8).
#[test]
fn a_bracket_keeps_its_digits() {
    let r = 6378.137e3;
    for shape in [true, false] {
        let b = solid(
            [0.05; 3],
            &Matrix3::identity(),
            Vector3::new(0.3, 0.0, 0.0),
            shape,
        );
        // Seen from a far origin of the assembly's frame nothing changes but the frame.
        let c = of(std::slice::from_ref(&b), [r - 0.3, 0.0, 0.0]);
        let s2 = 0.05f64.powi(2) / 3.0;
        // A cube has the same spread along and across: −1.5 + 2·0.75 = 0, and −2 + 0·2.
        let weighted = -2.0 * s2 / r;
        assert!(
            (c.weight_averaged.x - weighted).abs() < 2e-7 * weighted.abs(),
            "{c:?}"
        );
        assert!(c.same_force.unwrap().x.abs() < 1e-6 * s2 / r, "{c:?}");
        assert!(c.torque.norm() < 1e-20, "{c:?}");
        assert!(!c.rough);
        let rod = solid(
            [0.05, 1e-6, 1e-6],
            &Matrix3::identity(),
            Vector3::zeros(),
            shape,
        );
        let c = of(std::slice::from_ref(&rod), [r, 0.0, 0.0]);
        let want = -1.5 * s2 / r;
        assert!(
            (c.same_force.unwrap().x - want).abs() < 2e-7 * want.abs(),
            "{c:?}"
        );
    }
}

/// Uniform radial rod of half-length l: the same-force radius is √(r²−l²), exactly. And the
/// weight-averaged point from ∫dr/r² and ∫dr/r.
#[test]
fn a_radial_rod_has_its_closed_form() {
    for (r, l) in [(7e6, 1e3), (7e6, 1e5), (7e6, 3e6), (7e6, 6e6)] {
        let rod = solid(
            [l, 1e-3, 1e-3],
            &Matrix3::identity(),
            Vector3::zeros(),
            true,
        );
        let c = of(std::slice::from_ref(&rod), [r, 0.0, 0.0]);
        // √(r²−l²) − r without cancellation.
        let want = -l * l / ((r * r - l * l).sqrt() + r);
        let got = c.same_force.unwrap().x;
        // A millimetre of thickness is 1e-6 of the shortest.
        assert!(
            (got - want).abs() < 3e-11 * want.abs(),
            "{r} {l}: {got} {want}"
        );
        let (a, b) = (r - l, r + l);
        let weighted = (b / a).ln() / (1.0 / a - 1.0 / b);
        let got = c.weight_averaged.x + r;
        assert!(
            (got - weighted).abs() < 1e-11 * r,
            "{r} {l}: {got} {weighted}"
        );
        assert!(!c.rough);
    }
}

/// REFERENCE: gravity-gradient torques: 3μ/r³ r̂×(I r̂) in the far limit, and exactly for two masses.
#[test]
fn gravity_gradient_torques() {
    // diag(10, 20, 30) by six points; r = 7000 km along (1,1,1).
    let second = Vector3::new(20.0, 10.0, 0.0);
    let body = Mass {
        moments: Moments {
            zeroth: 100.0,
            second: Matrix3::from_diagonal(&second),
            ..Moments::zero(Vector3::zeros())
        },
        bounds: [[-0.5; 3], [0.5; 3]],
        pieces: Vec::new(),
        point: false,
    };
    let at = Vector3::repeat(7e6 / 3f64.sqrt());
    let c = of(&[body], at.into());
    let want = Vector3::new(1.16210041e-5, -2.32420083e-5, 1.16210041e-5);
    assert!((c.torque - want).norm() < 3e-13, "{c:?}");
    // Two 50 kg masses 10 m apart at 45°, 6778.137 km: in size, toward the radial.
    let a = 5.0 * 0.5f64.sqrt();
    let c = of(
        &[point([a, a, 0.0], 50.0), point([-a, -a, 0.0], 50.0)],
        [6778.137e3, 0.0, 0.0],
    );
    assert!((c.torque.z + 4.79996439339e-3).abs() < 2e-13, "{c:?}");
    // 20 km long, 1000 kg each, 30°: the formula is 4.1e-6 low.
    let (x, y) = (1e4 * 0.75f64.sqrt(), 5e3);
    let r: f64 = 6778.137e3;
    let c = of(
        &[point([x, y, 0.0], 1e3), point([-x, -y, 0.0], 1e3)],
        [r, 0.0, 0.0],
    );
    let formula = 3.0 * EARTH.gm / r.powi(3) * 2e3 * x * y;
    let low = 1.0 - formula / c.torque.z.abs();
    assert!((low - 4.1e-6).abs() < 1e-7, "{low}");
}

/// A long body tilted in the field: a point mass at its centre errs by more than 1e-6; the closed
/// form of its own attraction on the field's centre is the second opinion on the force, and the
/// torque is that of the force along the line through the field's centre.
#[test]
fn a_tilted_beam_against_the_closed_form_of_its_own_attraction() {
    let tilt = Rotation3::from_axis_angle(&Vector3::z_axis(), 0.6);
    let r = 6778.137e3;
    for long in [2e4, 2e5, 2e6, 4e6] {
        let beam = solid(
            [long, 0.05 * long, 0.02 * long],
            tilt.matrix(),
            Vector3::zeros(),
            true,
        );
        let mass = beam.moments.zeroth;
        let facets = beam.pieces[0].facets.clone();
        let c = of(std::slice::from_ref(&beam), [r, 0.0, 0.0]);
        let centre = Vector3::new(-r, 0.0, 0.0);
        let pull = attraction(&facets, 1.0, &centre).acceleration;
        // What it does to the centre, turned round.
        let force = -pull * EARTH.gm;
        // The closed form loses the square of the distance in digits.
        let sizes = r / long;
        let allowed = 5e-13 + 1e-15 * sizes * sizes;
        assert!(
            (c.force - force).norm() < allowed * force.norm(),
            "{long}: {c:?} {force}"
        );
        let as_point = EARTH.gm / r / r * mass;
        let off = (c.force - Vector3::new(-as_point, 0.0, 0.0)).norm() / as_point;
        assert!(off > 1e-6, "{off}");
        // All the forces pass through the field's centre: about it there is no torque.
        let about_centre = c.torque + Vector3::new(r, 0.0, 0.0).cross(&force);
        assert!(
            about_centre.norm() < 10.0 * allowed * r * force.norm(),
            "{about_centre}"
        );
        assert!(c.torque.norm() > 1e-7 * r * force.norm(), "{c:?}");
    }
}

/// A body of half-size s at distance r: whether six points or tetrahedra stand for it must not show
/// where the one takes over from the other.
#[test]
fn the_series_takes_over_without_a_step() {
    let turn = Rotation3::from_euler_angles(0.3, 0.5, 0.7);
    let at = [0.6 * 1e6, 0.64 * 1e6, 0.48 * 1e6];
    for s in [10.0, 40.0, 60.0] {
        let half = [s * 0.8, s * 0.5, s * 0.3];
        let with = of(&[solid(half, turn.matrix(), Vector3::zeros(), true)], at);
        let without = of(&[solid(half, turn.matrix(), Vector3::zeros(), false)], at);
        let size = with.weight_averaged.norm();
        // What the series leaves out is (s/r)² of what it gives, for a body with a middle.
        assert!((with.weight_averaged - without.weight_averaged).norm() < 1e-7 * size);
        assert!((with.torque - without.torque).norm() < 1e-7 * with.torque.norm());
    }
}

#[test]
fn where_pulls_cancel_there_is_no_same_force_point() {
    let c = of(
        &[point([1e7, 0.0, 0.0], 1.0), point([-1e7, 0.0, 0.0], 1.0)],
        [0.0, 1e-9, 0.0],
    );
    assert_eq!(c.same_force, None);
    assert!(c.weight_averaged.norm() < 1e-6, "{c:?}");
    // Around the field's centre, off it by a thousandth: directly by hand.
    let (a, b) = (1.001e7, -0.999e7);
    let c = of(
        &[point([a, 0.0, 0.0], 1.0), point([b, 0.0, 0.0], 1.0)],
        [0.0; 3],
    );
    let pull = EARTH.gm * (1.0 / (b * b) - 1.0 / (a * a));
    assert!((c.force.x - pull).abs() < 1e-12 * pull, "{c:?}");
    let weighted = (1.0 / a + 1.0 / b) / (1.0 / (a * a) + 1.0 / (b * b)) - 1e4;
    assert!((c.weight_averaged.x - weighted).abs() < 1e-6, "{c:?}");
    let same = -(2.0 * EARTH.gm / pull).sqrt() - 1e4;
    assert!(
        (c.same_force.unwrap().x - same).abs() < 1e-6 * same.abs(),
        "{c:?}"
    );
    assert!(central(&[], &Moments::zero(Vector3::zeros()), 1.0, &Vector3::x()).is_none());
}
