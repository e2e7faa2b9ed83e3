//! Figures of one body, or of several together, in SI units.

use nalgebra::{Matrix3, Vector3};
use serde::Serialize;

use crate::moments::{Moments, SolidIntegrals, principal};
use crate::quantity::Quantity;

/// What a body is made of.
#[derive(Clone, Debug, PartialEq)]
pub struct Substance {
    /// The material's name; `None` for a bare density.
    pub name: Option<String>,
    /// kg/m³.
    pub density: Quantity,
}

/// The tensor about a stated point instead of the centre of mass.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct About {
    /// The point, m, in the file's frame.
    pub point_m: [f64; 3],
    /// Inertia tensor of the volume about the point, m⁵.
    pub volume_inertia_m5: [[f64; 3]; 3],
    /// Inertia tensor about the point, kg m²; `None` without a density.
    pub inertia_kg_m2: Option<[[f64; 3]; 3]>,
}

/// Volume, mass, centres and inertia, in the file's axes. Tensors are about the centre, with the
/// off-diagonal elements −∫xy.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Figures {
    /// Lower and upper corner of the box, m.
    pub bounds_m: Option<[[f64; 3]; 2]>,
    /// m³.
    pub volume_m3: Option<f64>,
    /// m².
    pub area_m2: Option<f64>,
    /// Centre of the volume, m.
    pub centroid_m: Option<[f64; 3]>,
    /// Inertia tensor of the volume about the centroid, m⁵.
    pub volume_inertia_m5: Option<[[f64; 3]; 3]>,
    /// Its principal values, ascending, m⁵.
    pub principal_volume_moments_m5: Option<[f64; 3]>,
    /// K/|V|: how many times larger the summed terms are than the volume.
    pub condition: Option<f64>,
    /// Name of the material.
    pub material: Option<String>,
    /// kg/m³.
    pub density_kg_m3: Option<f64>,
    /// kg.
    pub mass_kg: Option<f64>,
    /// m.
    pub centre_of_mass_m: Option<[f64; 3]>,
    /// Inertia tensor about the centre of mass, kg m².
    pub inertia_kg_m2: Option<[[f64; 3]; 3]>,
    /// Principal moments, ascending, kg m².
    pub principal_moments_kg_m2: Option<[f64; 3]>,
    /// Principal axes as rows, right-handed.
    pub principal_axes: Option<[[f64; 3]; 3]>,
    /// Indices of axes that the body leaves undetermined.
    pub axes_free: Option<Vec<usize>>,
    /// √(principal moment / mass), in their order, m.
    pub radii_of_gyration_m: Option<[f64; 3]>,
    /// The tensor about a point that was asked for.
    pub about: Option<About>,
}

impl Figures {
    /// Figures of a body from its integrals in the file's unit of `metres`.
    ///
    /// `about` is a point in the file's frame, m.
    pub fn of(
        solid: &SolidIntegrals,
        bounds: &[[f64; 3]; 2],
        metres: f64,
        substance: Option<&Substance>,
        about: Option<[f64; 3]>,
    ) -> Self {
        let volume = solid.moments.scaled(metres);
        let bounds_m = Some(bounds.map(|p| p.map(|x| x * metres)));
        let area = solid.area * metres * metres;
        Self::from_volume(&volume, area, solid.condition(), bounds_m, substance, about)
    }

    /// Figures from moments of volume in SI units.
    pub fn from_volume(
        volume: &Moments,
        area: f64,
        condition: Option<f64>,
        bounds_m: Option<[[f64; 3]; 2]>,
        substance: Option<&Substance>,
        about: Option<[f64; 3]>,
    ) -> Self {
        let finite = |x: f64| x.is_finite().then_some(x);
        let mut out = Self {
            bounds_m,
            area_m2: finite(area),
            condition,
            material: substance.and_then(|s| s.name.clone()),
            density_kg_m3: substance.map(|s| s.density.value),
            ..Self::unknown(bounds_m)
        };
        out.volume_m3 = finite(volume.zeroth);
        let (Some(centre), Some(inertia)) = (volume.centre(), volume.inertia()) else {
            return out;
        };
        let p = principal(&inertia);
        out.centroid_m = Some(centre.into());
        out.volume_inertia_m5 = Some(rows(&inertia));
        out.principal_volume_moments_m5 = Some(p.moments);
        out.principal_axes = Some(p.axes);
        out.axes_free = Some(p.free);
        // A principal moment that rounding has left below zero has a radius of zero.
        out.radii_of_gyration_m = Some(p.moments.map(|m| (m / volume.zeroth).max(0.0).sqrt()));
        let density = substance.map(|s| s.density.value);
        if let Some(density) = density {
            out.mass_kg = finite(volume.zeroth * density);
            out.centre_of_mass_m = out.centroid_m;
            out.inertia_kg_m2 = Some(rows(&(inertia * density)));
            out.principal_moments_kg_m2 = Some(p.moments.map(|m| m * density));
        }
        out.about = about.map(|point| {
            let here = volume.shifted(Vector3::from(point)).inertia_here();
            About {
                point_m: point,
                volume_inertia_m5: rows(&here),
                inertia_kg_m2: density.map(|d| rows(&(here * d))),
            }
        });
        out
    }

    /// The same body where its mass is not that of a solid: `mass` are its mass moments in SI
    /// units. Volume figures stay the mesh's; axes and radii are then those of the mass.
    #[must_use]
    pub fn with_mass(mut self, mass: &Moments) -> Self {
        let (centre, inertia) = (mass.centre(), mass.inertia());
        let p = inertia.as_ref().map(principal);
        self.mass_kg = mass.zeroth.is_finite().then_some(mass.zeroth);
        self.centre_of_mass_m = centre.map(Into::into);
        self.inertia_kg_m2 = inertia.as_ref().map(rows);
        self.principal_moments_kg_m2 = p.as_ref().map(|p| p.moments);
        self.radii_of_gyration_m = p
            .as_ref()
            .map(|p| p.moments.map(|m| (m / mass.zeroth).max(0.0).sqrt()));
        self.principal_axes = p.as_ref().map(|p| p.axes);
        self.axes_free = p.map(|p| p.free);
        if let Some(about) = &mut self.about {
            let here = mass.shifted(Vector3::from(about.point_m)).inertia_here();
            about.inertia_kg_m2 = Some(rows(&here));
        }
        self
    }

    /// Nothing but the box is known.
    pub fn unknown(bounds_m: Option<[[f64; 3]; 2]>) -> Self {
        Self {
            bounds_m,
            volume_m3: None,
            area_m2: None,
            centroid_m: None,
            volume_inertia_m5: None,
            principal_volume_moments_m5: None,
            condition: None,
            material: None,
            density_kg_m3: None,
            mass_kg: None,
            centre_of_mass_m: None,
            inertia_kg_m2: None,
            principal_moments_kg_m2: None,
            principal_axes: None,
            axes_free: None,
            radii_of_gyration_m: None,
            about: None,
        }
    }
}

/// The box around both boxes.
pub fn box_union(a: Option<[[f64; 3]; 2]>, b: Option<[[f64; 3]; 2]>) -> Option<[[f64; 3]; 2]> {
    match (a, b) {
        (Some(a), Some(b)) => Some([
            [0, 1, 2].map(|k| a[0][k].min(b[0][k])),
            [0, 1, 2].map(|k| a[1][k].max(b[1][k])),
        ]),
        (one, other) => one.or(other),
    }
}

fn rows(m: &Matrix3<f64>) -> [[f64; 3]; 3] {
    [0, 1, 2].map(|i| [0, 1, 2].map(|j| m[(i, j)]))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn density_scales_products_of_inertia_about_the_centre() {
        // The 3-4-5 right-triangle prism, exact in rationals: V 30, centroid (1, 4/3, 5/2),
        // Ixx 535/6, Iyy 155/2, Izz 125/3, tensor xy +10.
        let (a, b, c) = (3.0, 4.0, 5.0);
        let p = |x: f64, y: f64, z: f64| [x + 100.0, y - 50.0, z + 7.0];
        let (v, w) = (
            [p(0.0, 0.0, 0.0), p(a, 0.0, 0.0), p(0.0, b, 0.0)],
            [p(0.0, 0.0, c), p(a, 0.0, c), p(0.0, b, c)],
        );
        let mut facets = vec![[v[0], v[2], v[1]], w];
        for i in 0..3 {
            let j = (i + 1) % 3;
            facets.extend([[v[i], v[j], w[j]], [v[i], w[j], w[i]]]);
        }
        let f = crate::geometry::LooseFacets(&facets);
        let solid =
            crate::moments::integrate(&f, crate::geometry::Select::All, facets[0][0], facets[0][0]);
        let steel = Substance {
            name: None,
            density: Quantity::exact(7850.0),
        };
        let got = Figures::of(&solid, &[[0.0; 3]; 2], 1.0, Some(&steel), None);
        assert!((got.volume_m3.unwrap() - 30.0).abs() < 1e-12);
        let i = got.inertia_kg_m2.unwrap();
        for (x, want) in [
            (i[0][0], 535.0 / 6.0),
            (i[1][1], 155.0 / 2.0),
            (i[2][2], 125.0 / 3.0),
            (i[0][1], 10.0),
            (i[0][2], 0.0),
            (i[1][2], 0.0),
        ] {
            assert!((x / 7850.0 - want).abs() < 1e-11, "{x} {want}");
        }
    }
}
