//! How the mass of a bought-in item is spread: reading it, its moments, its extent.

use nalgebra::{Matrix3, SymmetricEigen, Vector3};

use super::file::Shape;
use super::reader::Reader;
use crate::error::Kind;
use crate::moments::Moments;
use crate::quantity::{Dimension, Quantity};

/// Reads `box`, `cylinder`, `sphere` or `inertia`; a point where none is given.
pub(super) fn read(r: &Reader<'_, '_>, mass: Option<f64>) -> Shape {
    let sides = r.lengths("box").map(|(sides, line)| {
        for side in sides {
            extent(r, "box", side, line);
        }
        Shape::Box(sides)
    });
    let cylinder = r.table("cylinder", "cylinder").and_then(|c| {
        let radius = c.quantity("radius", Dimension::Length);
        let height = c.quantity("height", Dimension::Length);
        for (key, found) in [("radius", radius), ("height", height)] {
            if c.entry(key).is_none() {
                c.missing(
                    key,
                    Kind::Usage,
                    "write cylinder = { radius = 40, height = 90 }",
                );
            }
            if let Some((length, line)) = found {
                extent(&c, key, length, line);
            }
        }
        c.finish();
        Some(Shape::Cylinder {
            radius: radius?.0,
            height: height?.0,
        })
    });
    let sphere = r
        .quantity("sphere", Dimension::Length)
        .map(|(radius, line)| {
            extent(r, "sphere", radius, line);
            Shape::Sphere(radius)
        });
    let inertia = inertia(r, mass);
    let stated = ["box", "cylinder", "sphere", "inertia"];
    let stated: Vec<_> = stated
        .into_iter()
        .filter(|key| r.entry(key).is_some())
        .collect();
    if stated.len() > 1 {
        let message = format!(
            "its shape is given {} times: {}",
            stated.len(),
            stated.join(", ")
        );
        r.shared
            .fault(r.line, Kind::Usage, message, "keep one of them");
    }
    let shape = sides.or(cylinder).or(sphere).or(inertia);
    shape.unwrap_or(Shape::Point)
}

fn extent(r: &Reader<'_, '_>, key: &str, length: Quantity, line: u64) {
    if length.value <= 0.0 {
        let message = format!("`{key}` has a length that is not above zero");
        let advice = "write a length above zero, or leave the shape out for a point";
        r.shared.fault(line, Kind::BadNumber, message, advice);
    }
}

fn inertia(r: &Reader<'_, '_>, mass: Option<f64>) -> Option<Shape> {
    let i = r.table("inertia", "inertia")?;
    let mut get = |key| i.quantity(key, Dimension::Inertia);
    let found = ["xx", "yy", "zz", "xy", "xz", "yz"].map(&mut get);
    for key in ["xx", "yy", "zz"] {
        if i.entry(key).is_none() {
            let advice = "state xx, yy and zz; the products xy, xz and yz are zero where left out";
            i.missing(key, Kind::Usage, advice);
        }
    }
    // A product that was typed but could not be read is among the faults already.
    let value = |n: usize| found[n].map(|(q, _)| q);
    let product = |n: usize| value(n).unwrap_or(Quantity::exact(0.0));
    let (line, shared) = (i.line, i.shared);
    i.finish();
    let elements = [
        value(0)?,
        value(1)?,
        value(2)?,
        product(3),
        product(4),
        product(5),
    ];
    let tensor = tensor_of(&elements);
    if let Some(why) = impossible(&tensor, mass) {
        let advice = "check the axes, the unit and the signs: off-diagonals are the tensor's own \
                      elements, −∫xy dm, about the item's centre of mass";
        shared.fault(line, Kind::ImpossibleInertia, why, advice);
    }
    Some(Shape::Inertia(Box::new(elements)))
}

/// The tensor of the elements xx, yy, zz, xy, xz, yz.
fn tensor_of(elements: &[Quantity; 6]) -> Matrix3<f64> {
    let [xx, yy, zz, xy, xz, yz] = elements.map(|q| q.value);
    Matrix3::new(xx, xy, xz, xy, yy, yz, xz, yz, zz)
}

/// ∫ d dᵀ dm of an inertia tensor: the tensor is trace(S)·1 − S, so S = trace(I)/2·1 − I.
pub(super) fn second_of(tensor: &Matrix3<f64>) -> Matrix3<f64> {
    Matrix3::identity() * (tensor.trace() / 2.0) - tensor
}

/// Which inequality of an inertia tensor (kg m², about the centre) fails, or `None` where a body
/// can have it: no principal moment is negative, and none exceeds the sum of the other two.
/// A billionth of the largest is left for rounding of what was typed.
pub fn impossible(tensor: &Matrix3<f64>, mass: Option<f64>) -> Option<String> {
    if tensor.iter().any(|x| !x.is_finite()) {
        return Some("this inertia is not finite".into());
    }
    let largest = tensor.iter().fold(0.0_f64, |a, x| a.max(x.abs()));
    if mass == Some(0.0) && largest > 0.0 {
        return Some("no body has an inertia and no mass".into());
    }
    if largest == 0.0 {
        return None;
    }
    // Scaled, so that no square underflows or overflows.
    let scaled = tensor / largest;
    let slack = 1e-9;
    let names = ["xx", "yy", "zz"];
    for (n, name) in names.into_iter().enumerate() {
        let value = scaled[(n, n)];
        if value < -slack {
            return Some(format!(
                "no body has this inertia: {name} is negative, and every moment must be 0 or more"
            ));
        }
    }
    for (n, name) in names.into_iter().enumerate() {
        let (a, b) = ((n + 1) % 3, (n + 2) % 3);
        let sum = scaled[(a, a)] + scaled[(b, b)];
        if scaled[(n, n)] > sum + slack {
            let (a, b) = (names[a.min(b)], names[a.max(b)]);
            let (value, sum) = (tensor[(n, n)], sum * largest);
            return Some(format!(
                "no body has this inertia: {name} ≤ {a} + {b} must hold, and {value} > {sum} kg m²"
            ));
        }
    }
    let mut p: Vec<f64> = SymmetricEigen::new(scaled)
        .eigenvalues
        .iter()
        .copied()
        .collect();
    p.sort_by(f64::total_cmp);
    let shown: Vec<f64> = p.iter().map(|x| x * largest).collect();
    if p[0] < -slack {
        return Some(format!(
            "no body has this inertia: its least principal moment is {:.6e} kg m², and every one \
             must be 0 or more",
            shown[0]
        ));
    }
    if p[2] > p[0] + p[1] + slack {
        return Some(format!(
            "no body has this inertia: its largest principal moment must not exceed the sum of \
             the other two, and {:.6e} > {:.6e} + {:.6e} kg m²",
            shown[2], shown[0], shown[1]
        ));
    }
    None
}

impl Shape {
    /// Mass moments about the item's centre, in its own axes. Solids are uniform: textbook closed
    /// forms (box m·a²/12 along each side, cylinder m·r²/4 across and m·h²/12 along, sphere
    /// m·r²/5, as ∫x² dm).
    pub fn moments(&self, mass: f64) -> Moments {
        let second = match self {
            Self::Point => Matrix3::zeros(),
            Self::Box(sides) => {
                let sides = Vector3::from(sides.map(|s| s.value));
                Matrix3::from_diagonal(&(sides.component_mul(&sides) * (mass / 12.0)))
            }
            Self::Cylinder { radius, height } => {
                let across = mass * radius.value * radius.value / 4.0;
                let along = mass * height.value * height.value / 12.0;
                Matrix3::from_diagonal(&Vector3::new(across, across, along))
            }
            Self::Sphere(radius) => {
                Matrix3::identity() * (mass * radius.value * radius.value / 5.0)
            }
            Self::Inertia(elements) => second_of(&tensor_of(elements)),
        };
        Moments {
            zeroth: mass,
            second,
            ..Moments::zero(Vector3::zeros())
        }
    }

    /// Half the sides of its box along the axes after `turn`, in m. A point and a stated inertia
    /// have no known extent: zero.
    pub fn half_extent(&self, turn: &Matrix3<f64>) -> Vector3<f64> {
        match self {
            Self::Point | Self::Inertia(_) => Vector3::zeros(),
            Self::Box(sides) => turn.abs() * Vector3::from(sides.map(|s| s.value)) / 2.0,
            Self::Cylinder { radius, height } => turn.column(2).map(|along| {
                let across = (1.0 - along * along).max(0.0).sqrt();
                height.value / 2.0 * along.abs() + radius.value * across
            }),
            Self::Sphere(radius) => Vector3::repeat(radius.value),
        }
    }
}
