//! The fields.

use nalgebra::Vector3;

/// Standard gravity, m/s² (CGPM 1901).
pub const STANDARD_GRAVITY: f64 = 9.80665;

/// A field of gravity in which an assembly stands.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Field {
    /// The same everywhere.
    Uniform {
        /// m/s², zero or more.
        g: f64,
        /// Unit vector in the assembly's axes.
        down: Vector3<f64>,
    },
    /// Normal gravity of the Earth (WGS 84) at a place, taken as uniform over the assembly. It
    /// holds the centrifugal part of the Earth's rotation: it is what a balance on the ground
    /// feels.
    Earth {
        /// Geodetic latitude, rad.
        latitude: f64,
        /// Height above the ellipsoid, m.
        height: f64,
        /// Unit vector in the assembly's axes.
        down: Vector3<f64>,
    },
    /// Gravitation towards a point mass or a spherical body. It leaves rotation out: an orbiting
    /// or rotating assembly feels its own inertia besides.
    Central {
        /// Gravitational parameter, m³/s².
        gm: f64,
        /// The assembly's origin as seen from the field's centre, in the assembly's axes, m.
        at: Vector3<f64>,
    },
}

impl Field {
    /// Acceleration of free fall, m/s², in the assembly's axes, at the point `p` of its frame (m).
    /// None at the very centre of a central field.
    pub fn at(&self, p: &Vector3<f64>) -> Option<Vector3<f64>> {
        match self {
            Self::Uniform { g, down } => Some(down * *g),
            Self::Earth {
                latitude,
                height,
                down,
            } => Some(down * EARTH.normal_gravity(*latitude, *height)),
            Self::Central { gm, at } => {
                let r = at + p;
                let size = r.norm();
                // In this order nothing overflows for places up to 1e150 m away.
                let g = r * (-gm / size / size / size);
                g.iter().all(|x| x.is_finite()).then_some(g)
            }
        }
    }

    /// Whether it is the same at every point of the assembly.
    pub fn uniform(&self) -> bool {
        !matches!(self, Self::Central { .. })
    }
}

/// A rotating ellipsoid of revolution whose surface is level.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ellipsoid {
    /// Equatorial radius, m.
    pub a: f64,
    /// Flattening.
    pub f: f64,
    /// Gravitational parameter, m³/s².
    pub gm: f64,
    /// Rate of rotation, rad/s.
    pub omega: f64,
    /// Normal gravity at the equator, m/s².
    pub equator: f64,
    /// Normal gravity at the poles, m/s².
    pub pole: f64,
}

/// WGS 84: the defining and derived constants of the public standard.
pub const EARTH: Ellipsoid = Ellipsoid {
    a: 6_378_137.0,
    f: 1.0 / 298.257_223_563,
    gm: 3.986_004_418e14,
    omega: 7.292_115e-5,
    equator: 9.780_325_335_9,
    pole: 9.832_184_937_8,
};

impl Ellipsoid {
    /// Normal gravity at a geodetic latitude (rad) and a height above the ellipsoid (m): the closed
    /// formula of Somigliana on the surface, carried up by the second-order series in height of
    /// the WGS 84 standard (good to about 1e-6 of itself at 20 km; not meant for orbits).
    pub fn normal_gravity(&self, latitude: f64, height: f64) -> f64 {
        let sin2 = latitude.sin() * latitude.sin();
        let b = self.a * (1.0 - self.f);
        let e2 = self.f * (2.0 - self.f);
        let k = b * self.pole / (self.a * self.equator) - 1.0;
        let surface = self.equator * (1.0 + k * sin2) / (1.0 - e2 * sin2).sqrt();
        let m = self.omega * self.omega * self.a * self.a * b / self.gm;
        let h = height / self.a;
        surface * (1.0 - 2.0 * (1.0 + self.f + m - 2.0 * self.f * sin2) * h + 3.0 * h * h)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// REFERENCE: values at sea level (public geodesy sources for the constants, computed there),
    /// and a published documentation example of 9.7997 at 55°, 5000 m.
    #[test]
    fn normal_gravity_by_latitude_and_height() {
        for (degrees, want) in [
            (0.0, 9.7803253359),
            (30.0, 9.793247269),
            (45.0, 9.806197769),
            (60.0, 9.819176953),
            (90.0, 9.8321849378),
        ] {
            let g = EARTH.normal_gravity(f64::to_radians(degrees), 0.0);
            assert!((g - want).abs() < 2e-9, "{degrees}: {g}");
        }
        let g = EARTH.normal_gravity(55f64.to_radians(), 5000.0);
        assert!((g - 9.799667).abs() < 5e-7, "{g}");
    }

    /// REFERENCE: GM/r².
    #[test]
    fn gravitation_by_radius() {
        for (km, want) in [
            (6378.137, 9.79828548),
            (42164.0, 0.22420958),
            (35786.0, 0.31125151),
            (106378.137, 0.03522354),
        ] {
            let field = Field::Central {
                gm: EARTH.gm,
                at: Vector3::new(0.0, km * 1e3, 0.0),
            };
            let g = field.at(&Vector3::zeros()).unwrap();
            assert!((-g.y - want).abs() < 6e-9, "{km}: {g}");
            assert_eq!((g.x, g.z), (0.0, 0.0));
        }
        let field = Field::Central {
            gm: 1.0,
            at: Vector3::zeros(),
        };
        assert_eq!(field.at(&Vector3::zeros()), None);
        assert!(!field.uniform());
    }
}
