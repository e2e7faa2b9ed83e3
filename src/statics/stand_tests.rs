use proptest::prelude::*;

use super::*;

fn stand(at: &[[f64; 2]]) -> Result<Stand> {
    let supports = at.iter().enumerate().map(|(i, p)| Support {
        name: format!("foot {i}"),
        at: Vector3::new(p[0], p[1], 0.0),
    });
    Stand::new(supports.collect(), Vector3::z())
}

fn forces(r: &Reactions) -> Vec<f64> {
    r.reactions.iter().map(|r| r.force.unwrap()).collect()
}

#[test]
fn three_supports_by_hand() {
    // Shares of a centre in a triangle: barycentric coordinates, worked out by hand.
    let s = stand(&[[0.0, 0.0], [4.0, 0.0], [1.0, 3.0]]).unwrap();
    let r = s.reactions(&Vector3::new(1.5, 0.8, 7.0), 1.0);
    for (got, want) in
        forces(&r)
            .iter()
            .zip([0.425, 0.308_333_333_333_333_3, 0.266_666_666_666_666_7])
    {
        assert!((got - want).abs() < 1e-15, "{got} {want}");
    }
    assert!(!r.tips && !r.indeterminate);
    // Outside: one support would have to pull.
    let r = s.reactions(&Vector3::new(1.5, -0.3, 7.0), 100.0);
    assert!((forces(&r)[2] + 10.0).abs() < 1e-13);
    assert!(r.tips && r.reactions[0].least.is_none());
}

#[test]
fn three_wheels_weighed_give_back_what_the_scales_showed() {
    // 475 lb at 55 in, 1046 and 1040 lb at 121 in: 2561 lb at 108.75869 in (inputs of a published
    // weight-and-balance handbook; the answer follows). Track width taken as 80 in.
    let s = stand(&[[55.0, 0.0], [121.0, -40.0], [121.0, 40.0]]).unwrap();
    let y = 40.0 * (1040.0 - 1046.0) / 2561.0;
    let x = (475.0 * 55.0 + 2086.0 * 121.0) / 2561.0;
    assert!((x - 108.75869_f64).abs() < 5e-6);
    let r = s.reactions(&Vector3::new(x, y, 30.0), 2561.0);
    for (got, want) in forces(&r).iter().zip([475.0, 1046.0, 1040.0]) {
        assert!((got - want).abs() < 1e-10, "{got} {want}");
    }
}

#[test]
fn four_supports_as_springs_and_as_a_rigid_load_may_stand() {
    // Equal springs at (±1, ±0.5), centre (0.2, 0.1): worked out from R = α + βx + γy.
    let s = stand(&[[-1.0, -0.5], [1.0, -0.5], [1.0, 0.5], [-1.0, 0.5]]).unwrap();
    let r = s.reactions(&Vector3::new(0.2, 0.1, 0.0), 1.0);
    for (got, want) in forces(&r).iter().zip([0.15, 0.25, 0.35, 0.25]) {
        assert!((got - want).abs() < 1e-15, "{got} {want}");
    }
    assert!(r.indeterminate);
    // Set of equilibria: R + t(1, −1, 1, −1), so t runs from −0.15 to 0.25.
    for (r, (least, most)) in
        r.reactions
            .iter()
            .zip([(0.0, 0.4), (0.0, 0.4), (0.2, 0.6), (0.0, 0.4)])
    {
        assert!((r.least.unwrap() - least).abs() < 1e-14, "{r:?}");
        assert!((r.most.unwrap() - most).abs() < 1e-14, "{r:?}");
    }
    // In the middle it can stand on either diagonal: nothing to half each.
    let r = s.reactions(&Vector3::zeros(), 1.0);
    assert!(
        r.reactions
            .iter()
            .all(|r| r.least == Some(0.0) && (r.most.unwrap() - 0.5).abs() < 1e-15)
    );
}

#[test]
fn a_spring_that_would_pull_lets_go() {
    // Near a corner the far foot would pull by −0.05 of the weight; the other three carry alone.
    let s = stand(&[[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]]).unwrap();
    let c = Vector3::new(0.6, 0.6, 0.0);
    let r = s.reactions(&c, 1.0);
    for (got, want) in forces(&r).iter().zip([0.0, 0.2, 0.6, 0.2]) {
        assert!((got - want).abs() < 1e-14, "{got} {want}");
    }
    let r = s.reactions(&Vector3::new(1.1, 0.0, 0.0), 1.0);
    assert!(r.tips && r.reactions.iter().all(|r| r.force.is_none()));
}

#[test]
fn too_few_and_in_line_are_refused() {
    assert!(
        stand(&[[0.0, 0.0]])
            .unwrap_err()
            .message
            .contains("1 support ")
    );
    assert!(stand(&[[0.0, 0.0], [1.0, 0.0]]).is_err());
    let line = stand(&[[0.0, 0.0], [1.0, 1.0], [3.0, 3.0], [0.1, 0.1]]).unwrap_err();
    assert!(line.message.contains("one line"), "{line}");
    assert!(stand(&vec![[0.0, 0.0]; 65]).is_err());
}

proptest! {
    /// Forces sum to the weight and balance its moment; none pulls; each lies between its least
    /// and most; and no other equilibrium has a smaller sum of squares: R = max(0, α + β·x).
    #[test]
    fn springs_balance(
        at in prop::collection::vec(prop::array::uniform2(-1.0..1.0f64), 4..9),
        weights in prop::collection::vec(0.0..1.0f64, 9),
        sparse in 0usize..9,
    ) {
        let Ok(s) = stand(&at) else { return Ok(()) };
        // A centre inside of the hull, at its rim where most weights are zero.
        let w: Vec<f64> = (0..at.len()).map(|i| if i <= sparse { weights[i] } else { 0.0 }).collect();
        let sum: f64 = w.iter().sum();
        prop_assume!(sum > 1e-3);
        let c: Vector3<f64> = s.supports().iter().zip(&w).map(|(s, w)| s.at * (w / sum)).sum();
        let r = s.reactions(&c, 50.0);
        prop_assume!(!r.tips); // Rounding may put a centre on the rim outside by an ulp.
        let f = forces(&r);
        prop_assert!((f.iter().sum::<f64>() - 50.0).abs() < 1e-10);
        let moment: Vector3<f64> = s.supports().iter().zip(&f).map(|(s, f)| s.at * *f).sum();
        prop_assert!((moment - c * 50.0).norm() < 1e-9, "{moment} {}", c * 50.0);
        for (r, f) in r.reactions.iter().zip(&f) {
            prop_assert!(*f >= 0.0);
            prop_assert!(*f >= r.least.unwrap() - 1e-8 && *f <= r.most.unwrap() + 1e-8, "{r:?}");
        }
        // Optimality: a plane fits the carrying feet, and lies at or below zero at the others.
        let carrying: Vec<usize> = (0..f.len()).filter(|&i| f[i] > 1e-7).collect();
        let rows = |i: usize| [1.0, s.supports()[i].at.x, s.supports()[i].at.y];
        let a = DMatrix::from_fn(carrying.len(), 3, |k, c| rows(carrying[k])[c]);
        let b = DVector::from_fn(carrying.len(), |k, _| f[carrying[k]]);
        let plane = nnls::least_squares(&a, &b);
        prop_assert!((&a * &plane - &b).amax() < 1e-6, "no plane fits {f:?}");
        if carrying.len() > 3 {
            for i in 0..f.len() {
                let r = rows(i);
                let at = plane[0] * r[0] + plane[1] * r[1] + plane[2] * r[2];
                prop_assert!(at <= f[i] + 1e-5, "foot {i} would push: {at}, {f:?}");
            }
        }
    }
}
