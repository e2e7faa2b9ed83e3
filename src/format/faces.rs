//! Polygons by indices, gathered while a file is read and cut once its vertices are known.

use super::obj::triangulate::{Scratch, triangulate_into};
use super::obj::{MAX_CORNERS, warp};
use crate::error::{Error, Kind, Result};
use crate::format::number::Written;
use crate::mesh::{ReaderNote, WarpedPolygon};

/// A polygon of more than three corners.
#[derive(Debug)]
struct Polygon {
    /// Its first corner.
    first: usize,
    size: usize,
    /// Byte of it in the text.
    at: usize,
}

/// The faces of one file.
#[derive(Debug, Default)]
pub(crate) struct Faces {
    corners: Vec<u32>,
    polygons: Vec<Polygon>,
    triangles: usize,
    /// Faces of fewer than three corners, and the byte of the first.
    ignored: Option<(usize, usize)>,
}

impl Faces {
    /// Room for what `bytes` can hold at four bytes a corner.
    pub(crate) fn with_room(faces: usize, bytes: usize) -> Self {
        Self {
            corners: Vec::with_capacity(faces.saturating_mul(3).min(bytes / 4)),
            ..Self::default()
        }
    }

    /// How many triangles they come to.
    pub(crate) fn triangles(&self) -> usize {
        self.triangles
    }

    /// Takes the next face, which stands at byte `at`. Its indices are in range.
    ///
    /// # Errors
    /// `too-large` for more than [`MAX_CORNERS`] corners.
    pub(crate) fn push(&mut self, indices: &[u32], at: usize) -> Result<()> {
        match indices.len() {
            0..=2 => {
                let (count, first) = self.ignored.unwrap_or((0, at));
                self.ignored = Some((count + 1, first));
                return Ok(());
            }
            3 => {}
            size if size > MAX_CORNERS => {
                return Err(Error::new(
                    Kind::TooLarge,
                    format!("a face has {size} corners; at most {MAX_CORNERS} are read"),
                    "export the mesh again as triangles",
                ));
            }
            size => self.polygons.push(Polygon {
                first: self.corners.len(),
                size,
                at,
            }),
        }
        self.triangles += indices.len() - 2;
        self.corners.extend_from_slice(indices);
        Ok(())
    }

    /// What to say of faces that were passed over; `line` gives the line of a byte.
    pub(crate) fn note(&self, line: impl Fn(usize) -> Option<u64>) -> Option<ReaderNote> {
        self.ignored.map(|(count, at)| ReaderNote {
            kind: "faces-ignored",
            message: format!("{count} faces of fewer than three corners were ignored"),
            line: line(at),
            advice: "they have no area; check the export if faces are missing",
        })
    }

    /// Cuts them into triangles of their own corners as polygons of an OBJ are, and measures those
    /// that are not flat. `text` is where the bytes given to [`Faces::push`] are counted in; none
    /// for a binary file, which has no lines.
    pub(crate) fn cut(
        self,
        vertices: &[[f64; 3]],
        written: Written,
        text: Option<&[u8]>,
    ) -> (Vec<[u32; 3]>, Vec<WarpedPolygon>) {
        let mut out = Vec::with_capacity(self.triangles);
        let mut warped = warp::Gathered::default();
        let mut scratch = Scratch::default();
        let mut points = Vec::new();
        let mut done = 0;
        for polygon in &self.polygons {
            let (plain, _) = self.corners[done..polygon.first].as_chunks::<3>();
            out.extend_from_slice(plain);
            done = polygon.first + polygon.size;
            let indices = &self.corners[polygon.first..done];
            points.clear();
            points.extend(indices.iter().map(|&i| vertices[i as usize]));
            let chosen = triangulate_into(&points, &mut scratch);
            if let Some(mut warp) = warp::measure(&points, chosen, written) {
                (warp.at, warp.first) = (polygon.at, out.len());
                warped.add(warp);
            }
            out.extend(chosen.iter().map(|t| t.map(|k| indices[k as usize])));
        }
        out.extend_from_slice(self.corners[done..].as_chunks::<3>().0);
        (out, warp::gather(text, vec![warped]))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn triangles_and_polygons_keep_their_order() {
        let vertices: Vec<[f64; 3]> = (0..6)
            .map(|i| [f64::from(i), f64::from(i * i), 0.0])
            .collect();
        let mut faces = Faces::default();
        faces.push(&[0, 1, 2], 0).unwrap();
        faces.push(&[1, 2], 10).unwrap();
        faces.push(&[2, 3, 4, 5], 20).unwrap();
        faces.push(&[3, 4, 5], 30).unwrap();
        assert_eq!(faces.triangles(), 4);
        assert_eq!(faces.note(|at| Some(at as u64)).unwrap().line, Some(10));
        let (cut, warped) = faces.cut(&vertices, Written::default(), None);
        assert_eq!(cut, [[0, 1, 2], [2, 3, 4], [2, 4, 5], [3, 4, 5]]);
        assert!(warped.is_empty());
        let mut faces = Faces::default();
        let e = faces.push(&vec![0; MAX_CORNERS + 1], 0).unwrap_err();
        assert_eq!(e.kind, Kind::TooLarge);
    }
}
