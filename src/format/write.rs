//! Meshes out: binary STL and OBJ, and which format a file's ending asks for.

use std::collections::HashMap;
use std::io::{self, Write};
use std::path::Path;

use super::Family;
use super::whole::write_whole;
use crate::error::{Error, Kind, Result};
use crate::geometry::Corners;
use crate::mesh::{Soup, Triangles, each};

/// The format that a path's ending asks for.
///
/// # Errors
/// `usage` for any other ending.
pub fn family_of(path: &Path) -> Result<Family> {
    let is_packed = path
        .extension()
        .is_some_and(|e| e.eq_ignore_ascii_case("gz"));
    match Family::from_path(path) {
        Some(family @ (Family::Stl | Family::Obj | Family::ThreeMf)) if !is_packed => Ok(family),
        _ => Err(Error::new(
            Kind::Usage,
            "the ending says no format that is written",
            "name the output .stl (binary), .obj or .3mf",
        )
        .in_file(path)),
    }
}

/// The soup as binary STL can hold it: coordinates rounded to f32, facets that this leaves with
/// two corners in one place left out.
#[derive(Debug)]
pub struct Narrowed {
    /// The triangles, with the names and runs of the original.
    pub soup: Soup,
    /// The farthest that a coordinate moved (file unit).
    pub largest_move: f64,
    /// Facets that were left out.
    pub collapsed: usize,
}

/// Rounds coordinates to f32. A number always goes to the same number, so that vertices which
/// were one stay one: no seam opens.
///
/// # Errors
/// `too-large` for a coordinate beyond f32.
pub fn narrowed(soup: &Soup) -> Result<Narrowed> {
    let mut largest_move = 0.0f64;
    let mut collapsed = 0;
    let mut triangles = Vec::new();
    let mut runs = Vec::with_capacity(soup.runs.len());
    for run in &soup.runs {
        let first = triangles.len();
        for t in run.first..run.first + run.count {
            let wide = corners(soup, t);
            let narrow = wide.map(|p| p.map(|x| f64::from(x as f32)));
            for (a, b) in wide.iter().flatten().zip(narrow.iter().flatten()) {
                if !b.is_finite() {
                    return Err(Error::new(
                        Kind::TooLarge,
                        format!("the coordinate {a} is more than binary STL can hold"),
                        "write OBJ instead",
                    ));
                }
                largest_move = largest_move.max((a - b).abs());
            }
            let [a, b, c] = narrow;
            let one = |x: [f64; 3], y: [f64; 3]| x == y;
            if (one(a, b) || one(b, c) || one(c, a)) && wide != narrow {
                collapsed += 1;
            } else {
                triangles.push(narrow);
            }
        }
        runs.push(crate::mesh::Run {
            first,
            count: triangles.len() - first,
            ..*run
        });
    }
    Ok(Narrowed {
        soup: Soup {
            triangles: Triangles::Loose(triangles),
            names: soup.names.clone(),
            materials: soup.materials.clone(),
            runs,
            unit: soup.unit,
            warped: Vec::new(),
            notes: Vec::new(),
        },
        largest_move,
        collapsed,
    })
}

pub(super) fn corners(soup: &Soup, t: usize) -> [[f64; 3]; 3] {
    each!(&soup.triangles, f => f.triangle(t))
}

/// Writes binary STL. Names and materials have no place in it.
///
/// # Errors
/// `too-large` beyond f32 or 2³² − 1 facets, `cannot-write`.
pub fn write_stl(path: &Path, soup: &Soup) -> Result<()> {
    let Ok(count) = u32::try_from(soup.triangles.count()) else {
        return Err(Error::new(
            Kind::TooLarge,
            "binary STL holds no more than 4294967295 facets",
            "write OBJ instead",
        )
        .in_file(path));
    };
    let narrow = soup.triangles.count();
    for t in 0..narrow {
        if corners(soup, t)
            .iter()
            .flatten()
            .any(|x| !(*x as f32).is_finite())
        {
            return Err(Error::new(
                Kind::TooLarge,
                "a coordinate is more than binary STL can hold",
                "write OBJ instead",
            )
            .in_file(path));
        }
    }
    write_whole(path, |w| {
        // Not "solid": text STL begins with that.
        let mut head = [b' '; 80];
        let words = b"binary STL, bismar";
        head[..words.len()].copy_from_slice(words);
        w.write_all(&head)?;
        w.write_all(&count.to_le_bytes())?;
        (0..soup.triangles.count()).try_for_each(|t| {
            let corners = corners(soup, t);
            let mut record = [0u8; 50];
            let numbers = std::iter::once(normal(&corners)).chain(corners).flatten();
            for (i, x) in numbers.enumerate() {
                record[4 * i..4 * i + 4].copy_from_slice(&(x as f32).to_le_bytes());
            }
            w.write_all(&record)
        })
    })
}

/// Unit normal; zero for a facet without area, as is common practice (no source).
fn normal(t: &[[f64; 3]; 3]) -> [f64; 3] {
    let (u, v) = (
        [0, 1, 2].map(|k| t[1][k] - t[0][k]),
        [0, 1, 2].map(|k| t[2][k] - t[0][k]),
    );
    let n = [
        u[1] * v[2] - u[2] * v[1],
        u[2] * v[0] - u[0] * v[2],
        u[0] * v[1] - u[1] * v[0],
    ];
    let size = n.iter().map(|x| x * x).sum::<f64>().sqrt();
    if size > 0.0 && size.is_finite() {
        n.map(|x| x / size)
    } else {
        [0.0; 3]
    }
}

/// Writes OBJ: each place once as a vertex, in the shortest decimals that give the same f64 back,
/// names as `o`, materials as `usemtl`. A unit that the soup states stands in a comment: OBJ has no
/// place for it.
///
/// # Errors
/// `cannot-write`.
pub fn write_obj(path: &Path, soup: &Soup) -> Result<()> {
    write_whole(path, |w| obj(w, soup))
}

fn obj(w: &mut dyn Write, soup: &Soup) -> io::Result<()> {
    writeln!(w, "# written by bismar")?;
    if let Some(unit) = soup.unit {
        writeln!(w, "# lengths in {unit}")?;
    }
    let mut numbers: HashMap<[u64; 3], u64> = HashMap::new();
    let named = soup.names.iter().any(Option::is_some) || !soup.materials.is_empty();
    let mut said: Option<u32> = None;
    let mut material: Option<u32> = None;
    for run in soup.runs.iter().filter(|r| r.count > 0) {
        if named && said != Some(run.name) {
            match soup.names.get(run.name as usize).and_then(Option::as_ref) {
                Some(name) => writeln!(w, "o {}", one_line(name))?,
                // Ends the name before, and keeps the material from naming what follows.
                None => writeln!(w, "o")?,
            }
            said = Some(run.name);
        }
        if run.material != material
            && let Some(name) = run.material.and_then(|m| soup.materials.get(m as usize))
        {
            writeln!(w, "usemtl {}", one_line(name))?;
            material = run.material;
        }
        for t in run.first..run.first + run.count {
            let mut face = [0; 3];
            for (k, p) in corners(soup, t).iter().enumerate() {
                // −0 and 0 are one place.
                let key = p.map(|x| (x + 0.0).to_bits());
                let next = numbers.len() as u64 + 1;
                face[k] = *numbers.entry(key).or_insert(next);
                if face[k] == next {
                    let p = p.map(|x| decimal(x + 0.0));
                    writeln!(w, "v {} {} {}", p[0], p[1], p[2])?;
                }
            }
            writeln!(w, "f {} {} {}", face[0], face[1], face[2])?;
        }
    }
    Ok(())
}

/// The shortest decimals that give the same f64 back.
pub(super) fn decimal(x: f64) -> String {
    if x != 0.0 && !(1e-5..1e16).contains(&x.abs()) {
        format!("{x:e}")
    } else {
        format!("{x}")
    }
}

/// A name that stays on its line: a last `\` would go on to the next.
fn one_line(name: &str) -> String {
    let text: String = name
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    text.trim_end_matches('\\').trim().to_owned()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::format::{Bytes, read};
    use crate::mesh::Run;

    fn two_names() -> Soup {
        let a = [
            [0.1, 0.2, 1e-9],
            [1.0 / 3.0, -7.5e20, 2.0],
            [5.0, -0.0, 1.0],
        ];
        let b = [[5.0, 0.0, 1.0], [9.0, 9.0, 9.0], [0.1, 0.2, 1e-9]];
        Soup {
            triangles: Triangles::Loose(vec![a, b]),
            names: vec![Some("bracket #2".into()), None],
            materials: vec!["steel".into()],
            runs: vec![
                Run {
                    first: 0,
                    count: 1,
                    name: 0,
                    material: Some(0),
                },
                Run {
                    first: 1,
                    count: 1,
                    name: 1,
                    material: Some(0),
                },
            ],
            ..Soup::default()
        }
    }

    #[test]
    fn obj_comes_back_to_the_bit_with_its_names() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("a.obj");
        let soup = two_names();
        write_obj(&path, &soup).unwrap();
        let back = read(Bytes::open(&path).unwrap(), &path, None).unwrap();
        assert_eq!(back.names, soup.names);
        assert_eq!(back.materials, soup.materials);
        assert_eq!(back.triangles.count(), 2);
        for t in 0..2 {
            assert_eq!(corners(&back, t), corners(&soup, t));
        }
    }

    #[test]
    fn stl_is_rounded_and_says_how_far() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("a.stl");
        let narrow = narrowed(&two_names()).unwrap();
        assert_eq!(
            narrow.largest_move,
            (-7.5e20f64 - f64::from(-7.5e20f32)).abs()
        );
        write_stl(&path, &narrow.soup).unwrap();
        let back = read(Bytes::open(&path).unwrap(), &path, None).unwrap();
        for t in 0..2 {
            assert_eq!(corners(&back, t), corners(&narrow.soup, t));
        }
        let mut far = two_names();
        far.triangles = Triangles::Loose(vec![[[1e39; 3]; 3]; 2]);
        assert_eq!(narrowed(&far).unwrap_err().kind, Kind::TooLarge);
        assert_eq!(write_stl(&path, &far).unwrap_err().kind, Kind::TooLarge);
    }
}
