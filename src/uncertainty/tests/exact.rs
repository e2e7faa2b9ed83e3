//! Derivatives against differences, linear against sampled, the same bits on any threads.

use super::*;
use crate::moments::principal;

/// All figures of a whole: mass, centre, inertia, principal moments, radii of gyration.
fn figures(m: &Moments) -> Vec<f64> {
    let (c, i) = (m.centre().unwrap(), m.inertia().unwrap());
    let p = principal(&i).moments;
    let mut all = vec![m.zeroth, c.x, c.y, c.z];
    all.extend([0, 1, 2].map(|k| i[(k, k)]));
    all.extend([i[(0, 1)], i[(0, 2)], i[(1, 2)]]);
    all.extend(p);
    all.extend(p.map(|x| (x / m.zeroth).sqrt()));
    all
}

/// The standard uncertainties in the same order.
fn standards(u: &Uncertainty) -> Vec<f64> {
    let i = u.inertia_kg_m2.as_ref().unwrap().standard;
    let mut all = vec![u.mass_kg.standard];
    all.extend(u.centre_of_mass_m.standard);
    all.extend([i[0][0], i[1][1], i[2][2], i[0][1], i[0][2], i[1][2]]);
    all.extend(u.principal_moments_kg_m2.as_ref().unwrap().standard);
    all.extend(u.radii_of_gyration_m.as_ref().unwrap().standard);
    all
}

/// Every derivative against central differences of the full evaluation: of the moments by every
/// variable, and of all figures by the root of the sum of squares.
#[test]
fn derivatives_are_exact() {
    for seed in 0..40 {
        let model = assembly(seed, 1e-3);
        let whole = model.nominal();
        let tangents = model.tangents(whole.about);
        let mut squares = vec![0.0; figures(&whole).len()];
        for (n, (variable, tangent)) in model.variables().iter().zip(tangents.iter()).enumerate() {
            // Differences are off by h² of a third derivative of order 1 and by rounding/h.
            let h = 1e-5;
            let at = |x: f64| {
                let mut values = model.stated();
                values.set(VariableId(n), x);
                model.moments(&values, whole.about)
            };
            let (up, down) = (at(h), at(-h));
            let rate = |f: &dyn Fn(&Moments) -> f64| (f(&up) - f(&down)) / (2.0 * h);
            near(rate(&|m| m.zeroth), tangent.zeroth, 1e-8);
            for r in 0..3 {
                near(rate(&|m| m.first[r]), tangent.first[r], 1e-8);
                for c in 0..3 {
                    near(rate(&|m| m.second[(r, c)]), tangent.second[(r, c)], 1e-7);
                }
            }
            let (up, down) = (figures(&up), figures(&down));
            let u = variable.distribution.standard();
            for (square, (a, b)) in squares.iter_mut().zip(up.iter().zip(&down)) {
                *square += ((a - b) / (2.0 * h) * u).powi(2);
            }
        }
        let found = spread(&model, &whole).unwrap();
        assert!(found.axes_undetermined.is_empty(), "seed {seed}");
        for (n, (u, square)) in standards(&found).iter().zip(squares).enumerate() {
            near(*u, square.sqrt(), 1e-6 * square.sqrt() + 1e-11);
            assert!(*u > 0.0, "figure {n}");
        }
    }
}

/// Linear against sampled on 1,000 random assemblies whose relative uncertainties are small: the
/// standard deviation of n draws is good to about 1/√2n (less for bounded sources), and what is not
/// linear is of the order of the squared uncertainty.
#[test]
fn linear_agrees_with_draws_on_a_thousand_assemblies() {
    let n = 1024;
    let mut worst: f64 = 0.0;
    for seed in 0..1000 {
        let model = assembly(1000 + seed, 1e-3);
        let whole = model.nominal();
        let u = spread(&model, &whole).unwrap();
        let s = sample(&model, &whole, &[], &u, Sampling { n, seed }).unwrap();
        let mut pairs = vec![(u.mass_kg.standard, s.mass_kg.standard)];
        for k in 0..3 {
            let (i, j) = (u.inertia_kg_m2.as_ref(), s.inertia_kg_m2.as_ref());
            let (i, j) = (i.unwrap().standard, j.unwrap().standard);
            pairs.push((
                u.centre_of_mass_m.standard[k],
                s.centre_of_mass_m.standard[k],
            ));
            pairs.push((i[k][k], j[k][k]));
            pairs.push((i[k][(k + 1) % 3], j[k][(k + 1) % 3]));
            let (p, q) = (&u.principal_moments_kg_m2, &s.principal_moments_kg_m2);
            let (p, q) = (p.as_ref().unwrap(), q.as_ref().unwrap());
            pairs.push((p.standard[k], q.standard[k]));
        }
        for (linear, drawn) in pairs {
            let errors = (drawn / linear - 1.0) * (2.0 * n as f64).sqrt();
            worst = worst.max(errors.abs());
        }
    }
    // The largest of 13,000 normal deviates is near 4.
    assert!(worst < 5.5, "{worst}");
    assert!(worst > 2.0, "{worst}: nothing was drawn");
}

/// Two principal moments that the uncertainty exchanges: propagation samples them, and agrees with
/// the full Monte Carlo where the linear formula does not.
#[test]
fn principal_moments_that_lie_close() {
    let mut model = Model::default();
    // A ring of four nearly equal masses about z, and a heavy column.
    for (n, (x, y)) in [(1.0, 0.0), (-1.0, 0.0), (0.0, 1.0), (0.0, -1.0)]
        .into_iter()
        .enumerate()
    {
        let at = Vector3::new(x, y, 0.0);
        let kg = 1.0 + 1e-4 * n as f64;
        let by = model.variable(Variable::new(format!("mass {n}"), "kg", normal(0.01)));
        model.add(Contribution::new(Moments::point(at, kg)).adding(by, Moments::point(at, 1.0)));
    }
    let whole = model.nominal();
    let u = spread(&model, &whole).unwrap();
    assert_eq!(u.axes_undetermined, [0, 1]);
    let s = sample(&model, &whole, &[], &u, Sampling { n: 40_000, seed: 5 }).unwrap();
    let (p, q) = (
        u.principal_moments_kg_m2.unwrap(),
        s.principal_moments_kg_m2.unwrap(),
    );
    for k in 0..3 {
        // 1.1 % is two standard errors of 16,384 draws.
        near(p.standard[k], q.standard[k], 0.025 * q.standard[k]);
        // One standard error of the difference of the two quantiles is 0.025 standard deviations.
        near(p.low_95[k], q.low_95[k], 0.1 * q.standard[k]);
        near(p.high_95[k], q.high_95[k], 0.1 * q.standard[k]);
    }
    // Far apart they are not sampled.
    let model = assembly(7, 1e-3);
    let found = spread(&model, &model.nominal()).unwrap();
    assert!(found.axes_undetermined.is_empty());
}

/// An error that scales all inertia alike cannot turn the axes, however close the moments lie.
#[test]
fn a_common_factor_leaves_the_axes() {
    let mut model = Model::default();
    let by = model.variable(Variable::new("density", "1", rectangular(0.05)));
    let near_cube = Moments {
        zeroth: 1.0,
        second: Matrix3::from_diagonal(&Vector3::new(1.0, 1.001, 1.002)),
        ..Moments::zero(Vector3::zeros())
    };
    model.add(Contribution::new(near_cube).scaled(by, 1.0));
    let u = spread(&model, &model.nominal()).unwrap();
    assert!(u.axes_undetermined.is_empty());
    let p = u.principal_moments_kg_m2.unwrap();
    near(p.standard[0], 2.001 * 0.05 / 3.0_f64.sqrt(), 1e-12);
    near(p.high_95[2], 2.003 * (1.0 + 0.95 * 0.05), 1e-12);
    assert_eq!(u.radii_of_gyration_m.unwrap().standard, [0.0; 3]);
}

#[test]
fn the_same_bits_on_any_threads() {
    let model = assembly(11, 0.05);
    let whole = model.nominal();
    let run = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads);
        pool.build().unwrap().install(|| {
            let u = spread(&model, &whole).unwrap();
            let n = 10_001;
            let s = sample(&model, &whole, &[], &u, Sampling { n, seed: 9 }).unwrap();
            serde_json::to_string(&(u, s)).unwrap()
        })
    };
    let one = run(1);
    assert_eq!(one, run(2));
    assert_eq!(one, run(5));
}

/// Where a source is large, the linear answer is said to be not good enough; where it is small,
/// it is not.
#[test]
fn what_is_not_linear_is_said() {
    let mut model = Model::default();
    item(&mut model, 0, 2.0, 0.0, 0.0, 0.0);
    item(&mut model, 1, 3.0, 0.9, 0.1, 0.0);
    let whole = model.nominal();
    let u = spread(&model, &whole).unwrap();
    let n = 40_000;
    let s = sample(&model, &whole, &[], &u, Sampling { n, seed: 1 }).unwrap();
    let doubtful = &s.linear_not_good_enough;
    assert!(
        doubtful.contains(&"centre_of_mass_m.x".to_owned()),
        "{doubtful:?}"
    );
    assert!(!doubtful.contains(&"mass_kg".to_owned()), "{doubtful:?}");
    // A hundredth of that is linear.
    let mut model = Model::default();
    item(&mut model, 0, 2.0, 0.0, 0.0, 0.0);
    item(&mut model, 1, 3.0, 0.009, 0.1, 0.0);
    let u = spread(&model, &whole).unwrap();
    let s = sample(&model, &whole, &[], &u, Sampling { n, seed: 1 }).unwrap();
    assert_eq!(s.linear_not_good_enough, Vec::<String>::new());
}

/// Draws without any mass have no centre, and are counted.
#[test]
fn draws_without_mass() {
    let mut model = Model::default();
    item(&mut model, 0, 1.0, 1.0, 0.0, 0.0);
    let whole = model.nominal();
    let u = spread(&model, &whole).unwrap();
    let s = sample(&model, &whole, &[], &u, Sampling { n: 10_000, seed: 1 }).unwrap();
    // Φ(−1) = 0.158655.
    near(s.without_mass as f64 / 1e4, 0.158_655, 0.015);
}
