//! Whether truths lie where the intervals say.

use super::*;

/// Truths of random assemblies drawn from the stated sources, and whether mass, each component of
/// the centre and the moment xx lie in their 95 % intervals: 10,000 truths for each figure.
/// Counted apart: figures with a source of more than half of the variance, and the others. Without
/// a bias: with one, intervals reach over all of it, and hold at least as many.
#[test]
fn ten_thousand_truths() {
    let (assemblies, truths) = (100, 100);
    // Inside and all, without and with a dominant source.
    let mut counts = [[0_u32; 2]; 2];
    for seed in 0..assemblies {
        let model = biased(5000 + seed, 0.01, 0.0);
        let whole = model.nominal();
        let u = spread(&model, &whole).unwrap();
        let i = u.inertia_kg_m2.as_ref().unwrap();
        let c = &u.centre_of_mass_m;
        let share = |k: usize| c.drivers.iter().fold(0.0_f64, |m, d| m.max(d.share[k]));
        let axis = |k: usize| (c.low_95[k], c.high_95[k], share(k));
        let xx = i.drivers.iter().fold(0.0_f64, |m, d| m.max(d.share[0][0]));
        let intervals = [
            (
                u.mass_kg.low_95,
                u.mass_kg.high_95,
                u.mass_kg.drivers[0].share,
            ),
            axis(0),
            axis(1),
            axis(2),
            (i.low_95[0][0], i.high_95[0][0], xx),
        ];
        let mut draws = Draws::new(77, seed);
        for _ in 0..truths {
            let mut values = model.stated();
            for (n, v) in model.variables().iter().enumerate() {
                values.set(VariableId(n), v.distribution.draw(&mut draws));
            }
            let truth = model.moments(&values, whole.about);
            let c = truth.centre().unwrap();
            let xx = truth.inertia().unwrap()[(0, 0)];
            let found = [truth.zeroth, c.x, c.y, c.z, xx];
            for (x, (low, high, share)) in found.iter().zip(intervals) {
                let [inside, all] = &mut counts[usize::from(share > 0.5)];
                *inside += u32::from((low..=high).contains(x));
                *all += 1;
            }
        }
    }
    for [inside, all] in counts {
        assert!(all > 10_000, "{counts:?}");
        let part = f64::from(inside) / f64::from(all);
        assert!((0.94..=0.96).contains(&part), "{part} of {counts:?}");
    }
}

/// A single rectangular source: the exact quantile covers 95 %, where 1.96 standard deviations
/// would cover everything. A bias of one side: the interval reaches over all of it, and a truth to
/// which all of it applies lies inside.
#[test]
fn single_sources() {
    let bias = Distribution::Interval {
        low: 0.0,
        high: 0.1,
    };
    for (source, sided) in [(rectangular(0.1), false), (bias, true)] {
        let mut model = Model::default();
        let by = model.variable(Variable::new("density", "1", source));
        let one = Moments::point(Vector3::zeros(), 10.0);
        model.add(Contribution::new(one).scaled(by, 1.0));
        // A point has no inertia; a second one gives it.
        model.add(Contribution::new(Moments::point(Vector3::x(), 1.0)));
        let u = spread(&model, &model.nominal()).unwrap().mass_kg;
        let mut draws = Draws::new(1, 1);
        let truths: Vec<f64> = (0..10_000)
            .map(|_| 11.0 + 10.0 * source.draw(&mut draws))
            .collect();
        let inside = truths
            .iter()
            .filter(|x| (u.low_95..=u.high_95).contains(*x));
        let part = inside.count() as f64 / 1e4;
        if sided {
            assert_eq!((part, u.low_95, u.high_95), (1.0, 11.0, 12.0));
            continue;
        }
        assert!((0.94..=0.96).contains(&part), "{part}");
        let wide = 1.959_964 * u.standard;
        let middle = 0.5 * (u.low_95 + u.high_95);
        assert!(truths.iter().all(|x| (x - middle).abs() < wide));
    }
}
