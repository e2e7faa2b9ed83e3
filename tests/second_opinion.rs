//! The same meshes through parry3d-f64, a general-purpose geometry library: a second opinion on
//! volume, centroid and inertia.
//!
//! Agreement is asked to 1e-12, relative to the volume, the box diagonal and the tensor's norm.
//! What limits it are the other side's plain sums (it takes its tetrahedra about the mean vertex,
//! then about the centroid, without compensation): n roundings of terms that are at most
//! `condition` times the result. The meshes here stand near the origin and have conditions below
//! 10, where that is some 1e-14 for a thousand facets. Its tensor is summed here from its own
//! terms: what it hands out of a whole mesh are principal moments and their frame, and the tensor
//! put together of those again is off by up to 1e-9 where two moments agree.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/solids.rs"]
mod solids;

use bismar::masses::Figures;
use nalgebra::Matrix3;
use parry3d_f64::mass_properties::MassProperties;
use parry3d_f64::mass_properties::details::tetrahedron_unit_inertia_tensor_wrt_point;
use parry3d_f64::math::Vector;
use parry3d_f64::shape::Tetrahedron;
use solids::*;

fn agrees(name: &str, triangles: Vec<Tri>) {
    let points: Vec<Vector> = triangles
        .iter()
        .flatten()
        .map(|p| Vector::new(p[0], p[1], p[2]))
        .collect();
    let faces: Vec<[u32; 3]> = (0..triangles.len() as u32)
        .map(|t| [3 * t, 3 * t + 1, 3 * t + 2])
        .collect();
    let other = MassProperties::from_trimesh(1.0, &points, &faces);

    let mesh = mesh(triangles);
    let [body] = mesh.bodies() else {
        panic!("{name}")
    };
    let solid = mesh.solid(body, None).unwrap();
    assert!(solid.condition().unwrap() < 10.0, "{name}");
    let f = Figures::of(&solid, &body.bounds, 1.0, None, None);
    let v = f.volume_m3.unwrap();
    let off = (other.mass() - v) / v;
    assert!(off.abs() <= 1e-12, "{name}: volumes differ by {off:e}");

    let diagonal = (0..3)
        .map(|k| (body.bounds[1][k] - body.bounds[0][k]).powi(2))
        .sum::<f64>()
        .sqrt();
    let c = f.centroid_m.unwrap();
    let centre = [other.local_com.x, other.local_com.y, other.local_com.z];
    for k in 0..3 {
        let off = (centre[k] - c[k]) / diagonal;
        assert!(off.abs() <= 1e-12, "{name}: centroids differ by {off:e}");
    }
    let mut theirs = Matrix3::zeros();
    for f in &faces {
        let [p, q, r] = f.map(|i| points[i as usize]);
        let about = other.local_com;
        let volume = Tetrahedron::new(about, p, q, r).signed_volume();
        let unit = tetrahedron_unit_inertia_tensor_wrt_point(about, about, p, q, r);
        theirs += volume * Matrix3::from_column_slice(&unit.to_cols_array());
    }
    let i = f.volume_inertia_m5.unwrap();
    let ours = Matrix3::from_fn(|r, c| i[r][c]);
    let off = (theirs - ours).amax() / ours.norm();
    assert!(
        off <= 1e-12,
        "{name}: tensors differ by {off:e} of the norm"
    );
}

/// A turn by no special angle and a small step, so that no figure is zero by symmetry.
fn askew(t: &[Tri]) -> Vec<Tri> {
    let r = nalgebra::Rotation3::from_euler_angles(0.3, -1.1, 2.5);
    mapped(t, |p| {
        (r * nalgebra::Vector3::from(p) + nalgebra::Vector3::new(0.4, -0.2, 0.7)).into()
    })
}

#[test]
fn another_library_gives_the_same_figures() {
    let mut hollow = uv_sphere(3.0, 24);
    hollow.extend(reversed(&moved(
        &cuboid([0.0; 3], [1.0, 0.5, 0.8]),
        [0.2, 0.1, -0.3],
    )));
    let solids = [
        ("box", cuboid([0.0; 3], [2.0, 3.0, 4.0])),
        ("wedge", prism(&[[0.0, 0.0], [3.0, 0.0], [0.0, 4.0]], 5.0)),
        ("tetrahedron", corner_tetrahedron(5.0, 4.0, 3.0)),
        ("cylinder", cylinder(3.0, 5.0, 48)),
        ("tube", tube(3.0, 2.0, 5.0, 48)),
        ("cone", cone(3.0, 5.0, 32)),
        ("sphere", uv_sphere(3.0, 32)),
        ("icosphere", icosphere(3)),
        ("ellipsoid", ellipsoid(3.0, 2.0, 1.0, 32)),
        ("torus", torus(4.0, 1.0, 40)),
        ("paraboloid", paraboloid(3.0, 5.0, 32)),
        ("capsule", capsule(3.0, 5.0, 32)),
        ("cap", cap(3.0, 1.0, 32)),
        ("sphere with a void", hollow),
    ];
    for (name, t) in solids {
        agrees(name, askew(&t));
        agrees(name, t);
    }
}
