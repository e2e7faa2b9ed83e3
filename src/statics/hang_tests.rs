use proptest::prelude::*;

use super::*;

fn line(name: &str, at: [f64; 3]) -> Line {
    Line {
        name: name.into(),
        at: Vector3::from(at),
    }
}

fn fixed(c: [f64; 3], hook: [f64; 3], lines: &[Line], weight: f64) -> Result<Hanging> {
    hang(
        &Vector3::from(hook),
        lines,
        &-Vector3::z(),
        weight,
        &mut |_| Ok(Vector3::from(c)),
    )
}

#[test]
fn sling_factors() {
    // 1/cos from the vertical: 0°, 30°, 45°, 60°; from the horizontal 30° is the dangerous one.
    for (deg, want) in [
        (0.0, 1.0),
        (30.0, 1.1547),
        (45.0, std::f64::consts::SQRT_2),
        (60.0, 2.0),
    ] {
        let got = sling_factor(f64::to_radians(deg));
        assert!((got - want).abs() < 5e-5, "{deg}: {got}");
    }
    assert!((sling_factor((90.0_f64 - 30.0).to_radians()) - 2.0).abs() < 1e-12);
    assert_eq!(sling_factor(std::f64::consts::FRAC_PI_2), f64::INFINITY);
}

#[test]
fn from_one_point() {
    let h = fixed([0.3, 0.0, 0.0], [0.0, 0.0, 0.4], &[], 10.0).unwrap();
    assert!((h.lean - (0.3_f64).atan2(0.4)).abs() < 1e-13);
    assert!((h.turn * h.down + Vector3::z()).norm() < 1e-15);
    assert!(
        fixed([0.0; 3], [0.0; 3], &[], 10.0)
            .unwrap_err()
            .message
            .contains("every attitude")
    );
}

#[test]
fn two_slings_share_by_the_factor_and_swing_level() {
    // 60° between each sling and the vertical: half the weight each, times two.
    let s = 3f64.sqrt();
    let lines = [line("left", [-s, 0.0, 0.0]), line("right", [s, 0.0, 0.0])];
    let h = fixed([0.0, 0.0, -2.0], [0.0, 0.0, 1.0], &lines, 100.0).unwrap();
    for l in &h.lines {
        assert!((l.tension - 50.0 * sling_factor(l.from_vertical)).abs() < 1e-11);
        assert!((l.tension - 100.0).abs() < 1e-11 && (l.worst - l.tension).abs() < 1e-9);
        assert!((l.from_vertical.to_degrees() - 60.0).abs() < 1e-12);
    }
    // A centre beside the plane of both slings: the hook swings over it, lengths kept.
    let h = fixed([0.0, 0.5, -0.5], [0.0, 0.0, 1.0], &lines, 100.0).unwrap();
    let want = Vector3::new(0.0, -1.0, 1.0).normalize();
    assert!((h.hook - want).norm() < 1e-12, "{}", h.hook);
    assert!((h.lean.to_degrees() - 45.0).abs() < 1e-10);
}

#[test]
fn a_line_that_would_push_is_slack() {
    // The centre lies outside of the ends: the far line hangs loose, the other carries all.
    let lines = [line("near", [1.0, 0.0, 0.0]), line("far", [0.0, 0.0, 0.0])];
    let h = fixed([3.0, 0.0, 0.0], [0.5, 0.0, 0.2], &lines, 100.0).unwrap();
    assert!(h.lines[1].slack && h.lines[1].tension == 0.0);
    assert!((h.lines[0].tension - 100.0).abs() < 1e-12);
    assert!(h.lines[0].from_vertical.abs() < 1e-12);
    assert!((h.hook - lines[1].at).norm() <= (0.5f64).hypot(0.2) + 1e-12);
}

#[test]
fn three_and_four_lines() {
    let corners = [
        [1.0, 1.0, 0.0],
        [-1.0, 1.0, 0.0],
        [-1.0, -1.0, 0.0],
        [1.0, -1.0, 0.0],
    ];
    let four: Vec<Line> = corners
        .iter()
        .enumerate()
        .map(|(i, c)| line(&i.to_string(), *c))
        .collect();
    let h = fixed([0.0, 0.0, -1.0], [0.0, 0.0, 2f64.sqrt()], &four, 100.0).unwrap();
    for l in &h.lines {
        // 45° each: a quarter × √2; two across may come to carry all: a half × √2.
        assert!((l.tension - 25.0 * 2f64.sqrt()).abs() < 1e-11, "{l:?}");
        assert!((l.worst - 50.0 * 2f64.sqrt()).abs() < 1e-10, "{l:?}");
    }
    let three = &four[..3];
    let h = fixed([-0.3, 0.3, -1.0], [0.0, 0.0, 2.0], three, 100.0).unwrap();
    let up = -h.down;
    let sum: Vector3<f64> = h
        .lines
        .iter()
        .zip(three)
        .map(|(f, l)| (h.hook - l.at).normalize() * f.tension)
        .sum();
    assert!((sum - up * 100.0).norm() < 1e-10);
    assert!(fixed([0.0; 3], [0.0, 0.0, 1.0], &four[..1], 1.0).is_err());
}

#[test]
fn what_flows_moves_the_attitude() {
    // The centre runs against the lean like a shallow liquid: c = c0 + k·(level part of down).
    let k = 0.2;
    let h = hang(
        &Vector3::new(0.0, 0.0, 1.0),
        &[],
        &-Vector3::z(),
        1.0,
        &mut |d| Ok(Vector3::new(0.1 + k * d.x, 0.0, 0.0)),
    )
    .unwrap();
    // tan φ = 0.1 + k sin φ, by hand with φ the lean.
    let phi = h.lean;
    assert!((phi.tan() - (0.1 + k * phi.sin())).abs() < 1e-12);
    // More than the height of the hook allows: it runs away, and is told so or ends far over.
    let far = hang(
        &Vector3::new(0.0, 0.0, 0.1),
        &[],
        &-Vector3::z(),
        1.0,
        &mut |d| Ok(Vector3::new(0.1 + k * d.x, 0.0, 0.0)),
    );
    if let Ok(h) = far {
        assert!((h.lean.tan() * 0.1 - (0.1 + k * h.lean.sin())).abs() < 1e-10);
    }
}

proptest! {
    /// Whatever carries: no line pushes, none is longer than drawn, forces hold the weight, and
    /// the centre hangs below the hook.
    #[test]
    fn hung_in_balance(
        c in prop::array::uniform3(-0.9..0.9f64),
        n in 2usize..5,
        jitter in prop::collection::vec(-0.3..0.3f64, 12),
    ) {
        let corners = [[1.0, 1.0], [-1.0, -1.0], [-1.0, 1.0], [1.0, -1.0]];
        let lines: Vec<Line> = (0..n).map(|i| line(&i.to_string(), [
            corners[i][0] + jitter[3 * i], corners[i][1] + jitter[3 * i + 1], jitter[3 * i + 2],
        ])).collect();
        let hook = Vector3::new(0.0, 0.0, 2.5);
        let center = Vector3::new(c[0], c[1], c[2] - 1.0);
        let h = hang(&hook, &lines, &-Vector3::z(), 80.0, &mut |_| Ok(center)).unwrap();
        let sum: Vector3<f64> = h.lines.iter().zip(&lines)
            .map(|(f, l)| (h.hook - l.at).normalize() * f.tension).sum();
        prop_assert!((sum + h.down * 80.0).norm() < 1e-6, "{sum} {}", h.down);
        prop_assert!(((center - h.hook).normalize() - h.down).norm() < 1e-9);
        for (f, l) in h.lines.iter().zip(&lines) {
            prop_assert!(f.tension >= 0.0 && f.worst >= f.tension - 1e-9);
            prop_assert!((h.hook - l.at).norm() <= (hook - l.at).norm() + 1e-7);
        }
    }
}
