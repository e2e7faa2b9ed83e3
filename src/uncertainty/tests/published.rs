//! Numbers that others have printed, and numbers worked out by other means.

use super::*;

fn three(u: [f64; 3], ux: [f64; 3]) -> Model {
    let mut model = Model::default();
    for (n, (kg, mm)) in [(12.0, 100.0), (7.5, 250.0), (3.25, -80.0)]
        .into_iter()
        .enumerate()
    {
        item(&mut model, n, kg, u[n], mm * 1e-3, ux[n] * 1e-3);
    }
    model
}

/// The three items with one relative error that some of them share.
fn sharing(which: &[usize]) -> Uncertainty {
    let mut model = Model::default();
    let by = model.variable(Variable::new("density", "1", normal(0.01)));
    for (n, (kg, mm)) in [(12.0, 100.0), (7.5, 250.0), (3.25, -80.0)]
        .into_iter()
        .enumerate()
    {
        let at = Vector3::new(mm * 1e-3, 0.0, 0.0);
        let term = Contribution::new(Moments::point(at, kg));
        model.add(if which.contains(&n) {
            term.scaled(by, 1.0)
        } else {
            term
        });
    }
    spread(&model, &model.nominal()).unwrap()
}

/// Law of propagation (JCGM 100:2008, 5.1.2): ∂M/∂mᵢ = 1, ∂X/∂mᵢ = (xᵢ − X)/M, ∂X/∂xᵢ = mᵢ/M.
/// Our own numbers, worked out apart and confirmed by 4e6 draws (0.216518, 1.653702, +0.0567).
/// Forgetting that M moves too gives 2.083773.
#[test]
fn three_items() {
    let model = three([0.12, 0.15, 0.10], [1.0, 2.0, 5.0]);
    let u = spread(&model, &model.nominal()).unwrap();
    near(u.mass_kg.standard, 0.216_564, 5e-7);
    near(u.centre_of_mass_m.standard[0] * 1e3, 1.653_453, 5e-7);
    near(u.correlation[0][1], 0.056_685, 5e-7);
    assert_eq!(u.correlation[0][0], 1.0);
    assert_eq!(u.correlation[0][2], 0.0);
    // No source has half of either variance.
    near(
        u.mass_kg.high_95 - u.mass_kg.low_95,
        2.0 * 1.959_964 * 0.216_564,
        5e-6,
    );
    let shares: f64 = u.mass_kg.drivers.iter().map(|d| d.share).sum();
    near(shares, 1.0, 1e-15);
    assert_eq!(u.mass_kg.drivers[0].source, "mass 1");
    near(u.mass_kg.drivers[0].share, 0.15_f64.powi(2) / 0.0469, 1e-12);
}

/// A density that parts share: u(M) 0.195000 and u(X) 0.291052, not 0.141510 and 0.434676 as from
/// independent errors, which is wrong in opposite directions (0.195121 and 0.291312 from 4e6
/// draws). Where all share it, the centre cannot move at all.
#[test]
fn a_shared_density() {
    let two = sharing(&[0, 1]);
    near(two.mass_kg.standard, 0.195, 1e-12);
    near(two.centre_of_mass_m.standard[0] * 1e3, 0.291_052, 5e-7);
    let independent = three([0.12, 0.075, 0.0], [0.0; 3]);
    let apart = spread(&independent, &independent.nominal()).unwrap();
    near(apart.mass_kg.standard, 0.141_510, 5e-7);
    near(apart.centre_of_mass_m.standard[0] * 1e3, 0.434_676, 5e-7);
    let all = sharing(&[0, 1, 2]);
    near(all.mass_kg.standard, 0.2275, 1e-12);
    assert_eq!(all.centre_of_mass_m.standard, [0.0; 3]);
    assert_eq!(all.correlation[0][1], 0.0);
    assert!(all.centre_of_mass_m.drivers.is_empty());
}

/// The mean of draws is not the linear centre: it lies −Σ(xᵢ − X)uᵢ²/M² beside it (second order).
/// Masses 2 kg (u 0.02) at 0 and 3 kg (u 0.06) at 100 mm: 60 mm, u 0.53665631, mean 59.9952.
#[test]
fn the_mean_of_draws_is_not_the_linear_centre() {
    let mut model = Model::default();
    item(&mut model, 0, 2.0, 0.02, 0.0, 0.0);
    item(&mut model, 1, 3.0, 0.06, 0.1, 0.0);
    let whole = model.nominal();
    let u = spread(&model, &whole).unwrap();
    near(whole.about.x * 1e3, 60.0, 1e-12);
    near(u.centre_of_mass_m.standard[0] * 1e3, 0.536_656_31, 5e-9);
    let n = 1_000_000;
    let s = sample(&model, &whole, &[], &u, Sampling { n, seed: 3 }).unwrap();
    // One standard error of the mean is 0.00054: 60 is nine of them away.
    near(s.centre_of_mass_m.mean[0] * 1e3, 59.9952, 4.0 * 0.000_54);
    near(
        s.centre_of_mass_m.standard[0] * 1e3,
        0.536_7,
        4.0 * 0.000_38,
    );
    near(s.mass_kg.mean, 5.0, 4.0 * 0.0633e-3);
}

/// Ten resistors of 1000 Ω, calibrated against one standard of u 100 mΩ, in series: u is 1 Ω, and
/// not the 0.32 Ω of independent ones (JCGM 100:2008, 5.2.2, example). Here they are masses.
#[test]
fn ten_against_one_standard() {
    let mut model = Model::default();
    let by = model.variable(Variable::new("standard", "kg", normal(0.1)));
    for n in 0..10 {
        let at = Vector3::new(f64::from(n), 0.0, 0.0);
        let one = Moments::point(at, 1000.0);
        model.add(Contribution::new(one).adding(by, Moments::point(at, 1.0)));
    }
    let u = spread(&model, &model.nominal()).unwrap();
    near(u.mass_kg.standard, 1.0, 1e-12);
}

/// The additive model of JCGM 101:2008, 9.2 (numbers from memory of the printed tables): four
/// sources of standard deviation 1; rectangular ones among which one has 10, whose interval is
/// ±17.0 and not the ±19.9 of a normal distribution.
#[test]
fn the_additive_model_of_the_supplement() {
    let root = 3.0_f64.sqrt();
    let even = Combination::new(0.0, [(1.0, normal(1.0)); 4]);
    near(even.interval_95()[1], 3.92, 0.005);
    let parts = [root, root, root, 10.0 * root].map(|h| (1.0, rectangular(h)));
    let uneven = Combination::new(0.0, parts);
    near(uneven.standard(), 10.1, 0.05);
    near(uneven.interval_95()[1], 17.0, 0.05);
    near(1.959_964 * uneven.standard(), 19.9, 0.05);
}
