//! Triangles by index, whatever they are stored as.

/// A sequence of triangles that hands out the corners of any one of them, in the file's unit.
pub trait Corners: Sync {
    /// How many triangles there are.
    fn count(&self) -> usize;
    /// The corners of triangle `t`, which must be below [`Corners::count`].
    fn triangle(&self, t: usize) -> [[f64; 3]; 3];
    /// The same triangles as records of f32, where that is what they are: half the bytes to move.
    #[inline(always)]
    fn as_records(&self) -> Option<RecordFacets<'_>> {
        None
    }
}

/// Binary STL records of 50 bytes: a normal and three corners of three little-endian f32, and two
/// bytes of attribute.
#[derive(Clone, Copy, Debug)]
pub struct RecordFacets<'a>(&'a [[u8; 50]]);

impl<'a> RecordFacets<'a> {
    /// Over the records in `bytes`; a last incomplete one is left out.
    pub fn new(bytes: &'a [u8]) -> Self {
        Self(bytes.as_chunks::<50>().0)
    }

    /// The corners as the f32 values of the file.
    #[inline(always)]
    pub fn raw(&self, t: usize) -> [[f32; 3]; 3] {
        let r = &self.0[t];
        let f = |at: usize| f32::from_le_bytes([r[at], r[at + 1], r[at + 2], r[at + 3]]);
        [
            [f(12), f(16), f(20)],
            [f(24), f(28), f(32)],
            [f(36), f(40), f(44)],
        ]
    }

    /// The facet normal as the file states it.
    pub fn stated_normal(&self, t: usize) -> [f32; 3] {
        let r = &self.0[t];
        let f = |at: usize| f32::from_le_bytes([r[at], r[at + 1], r[at + 2], r[at + 3]]);
        [f(0), f(4), f(8)]
    }
}

impl Corners for RecordFacets<'_> {
    #[inline(always)]
    fn count(&self) -> usize {
        self.0.len()
    }
    #[inline(always)]
    fn triangle(&self, t: usize) -> [[f64; 3]; 3] {
        self.raw(t).map(|p| p.map(f64::from))
    }
    #[inline(always)]
    fn as_records(&self) -> Option<RecordFacets<'_>> {
        Some(*self)
    }
}

/// Three corners a triangle, nothing shared.
#[derive(Clone, Copy, Debug)]
pub struct LooseFacets<'a>(pub &'a [[[f64; 3]; 3]]);

impl Corners for LooseFacets<'_> {
    #[inline(always)]
    fn count(&self) -> usize {
        self.0.len()
    }
    #[inline(always)]
    fn triangle(&self, t: usize) -> [[f64; 3]; 3] {
        self.0[t]
    }
}

/// Corners as indices into vertices.
#[derive(Clone, Copy, Debug)]
pub struct IndexedFacets<'a> {
    /// Vertex coordinates.
    pub vertices: &'a [[f64; 3]],
    /// Three indices a triangle, each in range.
    pub corners: &'a [[u32; 3]],
}

impl Corners for IndexedFacets<'_> {
    #[inline(always)]
    fn count(&self) -> usize {
        self.corners.len()
    }
    #[inline(always)]
    fn triangle(&self, t: usize) -> [[f64; 3]; 3] {
        self.corners[t].map(|i| self.vertices[i as usize])
    }
}

/// Which triangles of a sequence are meant, in ascending order.
#[derive(Clone, Copy, Debug)]
pub enum Select<'a> {
    /// All of them.
    All,
    /// The listed ones.
    List(&'a [u32]),
}

impl Select<'_> {
    /// How many are meant, out of `all`.
    pub fn len(&self, all: usize) -> usize {
        match self {
            Self::All => all,
            Self::List(list) => list.len(),
        }
    }

    /// The index of the `i`-th one.
    #[inline(always)]
    pub fn get(&self, i: usize) -> usize {
        match self {
            Self::All => i,
            Self::List(list) => list[i] as usize,
        }
    }
}

/// The twelve facets of the box between two corners, facing outward.
pub fn box_facets(lo: [f64; 3], hi: [f64; 3]) -> Vec<[[f64; 3]; 3]> {
    let corner = |n: usize| std::array::from_fn(|k| if n >> k & 1 == 0 { lo[k] } else { hi[k] });
    let sides = [
        [0, 2, 3, 1],
        [4, 5, 7, 6],
        [0, 1, 5, 4],
        [2, 6, 7, 3],
        [0, 4, 6, 2],
        [1, 3, 7, 5],
    ];
    let halves = sides
        .into_iter()
        .flat_map(|[a, b, c, d]| [[a, b, c], [a, c, d]]);
    halves.map(|t| t.map(corner)).collect()
}
