//! Accessors: positions and indices out of the buffers.

use super::buffers::{Buffers, missing};
use super::json::{Accessor, Root};
use super::{AGAIN, bad};
use crate::error::{Error, Kind, Result};

/// Type of a component, by the numbers that glTF has for them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Component {
    I8,
    U8,
    I16,
    U16,
    U32,
    F32,
}

impl Component {
    fn of(number: u32) -> Result<Self> {
        Ok(match number {
            5120 => Self::I8,
            5121 => Self::U8,
            5122 => Self::I16,
            5123 => Self::U16,
            5125 => Self::U32,
            5126 => Self::F32,
            other => return Err(bad(format!("{other} is no component type of glTF"))),
        })
    }

    fn size(self) -> usize {
        match self {
            Self::I8 | Self::U8 => 1,
            Self::I16 | Self::U16 => 2,
            Self::U32 | Self::F32 => 4,
        }
    }

    /// Value and, of whole numbers, what stands for one where they are normalised.
    fn value(self, bytes: &[u8]) -> (f64, f64) {
        match (self, bytes) {
            (Self::I8, &[a]) => (f64::from(a as i8), 127.0),
            (Self::U8, &[a]) => (f64::from(a), 255.0),
            (Self::I16, &[a, b]) => (f64::from(i16::from_le_bytes([a, b])), 32767.0),
            (Self::U16, &[a, b]) => (f64::from(u16::from_le_bytes([a, b])), 65535.0),
            (Self::U32, &[a, b, c, d]) => {
                (f64::from(u32::from_le_bytes([a, b, c, d])), 4_294_967_295.0)
            }
            (Self::F32, &[a, b, c, d]) => (f64::from(f32::from_le_bytes([a, b, c, d])), 1.0),
            // Slices are cut to the size above.
            _ => (f64::NAN, 1.0),
        }
    }
}

/// `count` elements of `size` bytes each, `stride` apart.
struct Elements<'a> {
    bytes: &'a [u8],
    stride: usize,
    size: usize,
    count: usize,
}

impl<'a> Elements<'a> {
    fn of(
        (view, stated): (&'a [u8], Option<u64>),
        offset: u64,
        count: u64,
        size: usize,
        what: &str,
    ) -> Result<Self> {
        let stride = stated.unwrap_or(size as u64);
        if stride < size as u64 || stride > 252 {
            return Err(bad(format!(
                "{what}: a stride of {stride} bytes for elements of {size}"
            )));
        }
        let end = match count {
            0 => Some(offset),
            n => (n - 1)
                .checked_mul(stride)
                .and_then(|x| x.checked_add(offset)?.checked_add(size as u64)),
        };
        if end.is_none_or(|e| e > view.len() as u64) {
            return Err(Error::new(
                Kind::CountMismatch,
                format!(
                    "{what}: {count} elements from byte {offset} on do not fit in the {} bytes of \
                     their buffer view",
                    view.len()
                ),
                AGAIN,
            ));
        }
        Ok(Self {
            bytes: &view[offset as usize..],
            stride: stride as usize,
            size,
            count: count as usize,
        })
    }

    fn iter(&self) -> impl Iterator<Item = &'a [u8]> {
        let (bytes, stride, size) = (self.bytes, self.stride, self.size);
        (0..self.count).map(move |i| &bytes[i * stride..i * stride + size])
    }
}

fn find(root: &Root, index: usize) -> Result<&Accessor> {
    root.accessors
        .get(index)
        .ok_or_else(|| missing("accessor", index, root.accessors.len()))
}

/// How many elements an accessor declares.
pub(super) fn count(root: &Root, index: usize) -> Result<u64> {
    Ok(find(root, index)?.count)
}

/// All elements as N numbers each, with the sparse replacements in place.
fn numbers<const N: usize>(
    root: &Root,
    buffers: &Buffers<'_>,
    index: usize,
    component: Component,
) -> Result<Vec<[f64; N]>> {
    let accessor = find(root, index)?;
    let what = format!("accessor {index}");
    let width = component.size();
    let number = |bytes: &[u8]| {
        let (value, one) = component.value(bytes);
        // Section 3.11 of the specification: −128 and −127 both stand for −1.
        if accessor.normalized {
            (value / one).max(-1.0)
        } else {
            value
        }
    };
    let element = |bytes: &[u8]| {
        let mut out = [0.0; N];
        for (x, part) in out.iter_mut().zip(bytes.chunks_exact(width)) {
            *x = number(part);
        }
        out
    };
    let mut out = match accessor.buffer_view {
        Some(view) => {
            let view = buffers.view(root, view)?;
            let all = Elements::of(view, accessor.byte_offset, accessor.count, N * width, &what)?;
            all.iter().map(element).collect()
        }
        None => {
            // Zeros where nothing else is said; nothing but the declared count limits them.
            if accessor.count > buffers.total() {
                return Err(Error::new(
                    Kind::TooLarge,
                    format!(
                        "{what} declares {} elements and holds no bytes",
                        accessor.count
                    ),
                    AGAIN,
                ));
            }
            vec![[0.0; N]; accessor.count as usize]
        }
    };
    if let Some(sparse) = &accessor.sparse {
        let what = format!("accessor {index}, sparse");
        let kind = Component::of(sparse.indices.component_type)?;
        if !matches!(kind, Component::U8 | Component::U16 | Component::U32) {
            return Err(bad(format!(
                "{what}: indices must be unsigned whole numbers"
            )));
        }
        let at = Elements::of(
            buffers.view(root, sparse.indices.buffer_view)?,
            sparse.indices.byte_offset,
            sparse.count,
            kind.size(),
            &what,
        )?;
        let values = Elements::of(
            buffers.view(root, sparse.values.buffer_view)?,
            sparse.values.byte_offset,
            sparse.count,
            N * width,
            &what,
        )?;
        let total = out.len();
        for (i, value) in at.iter().zip(values.iter()) {
            let i = kind.value(i).0 as usize;
            let Some(slot) = out.get_mut(i) else {
                return Err(Error::new(
                    Kind::BadIndex,
                    format!("{what}: element {i} is replaced, and there are {total}"),
                    AGAIN,
                ));
            };
            *slot = element(value);
        }
    }
    Ok(out)
}

/// Positions.
pub(super) fn positions(root: &Root, buffers: &Buffers<'_>, index: usize) -> Result<Vec<[f64; 3]>> {
    let accessor = find(root, index)?;
    let component = Component::of(accessor.component_type)?;
    if accessor.kind != "VEC3" || component == Component::U32 {
        return Err(bad(format!(
            "accessor {index} holds no positions (VEC3 of floats)"
        )));
    }
    let out = numbers::<3>(root, buffers, index, component)?;
    if let Some((i, p)) = out
        .iter()
        .enumerate()
        .find(|(_, p)| !p.iter().all(|x| x.is_finite()))
    {
        return Err(Error::new(
            Kind::NotFinite,
            format!("accessor {index}: position {i} is {p:?}"),
            "export the mesh again; the program that wrote it could not compute this coordinate",
        ));
    }
    Ok(out)
}

/// Indices, each below `vertices`.
pub(super) fn indices(
    root: &Root,
    buffers: &Buffers<'_>,
    index: usize,
    vertices: usize,
) -> Result<Vec<u32>> {
    let accessor = find(root, index)?;
    let component = Component::of(accessor.component_type)?;
    let is_unsigned = matches!(component, Component::U8 | Component::U16 | Component::U32);
    if accessor.kind != "SCALAR" || !is_unsigned || accessor.normalized {
        return Err(bad(format!(
            "accessor {index} holds no indices (unsigned scalars)"
        )));
    }
    let out: Vec<u32> = numbers::<1>(root, buffers, index, component)?
        .into_iter()
        .map(|[x]| x as u32)
        .collect();
    if let Some((i, found)) = out
        .iter()
        .enumerate()
        .find(|(_, v)| **v as usize >= vertices)
    {
        return Err(Error::new(
            Kind::BadIndex,
            format!(
                "accessor {index}: index {i} refers to vertex {found}; vertices count from 0 and \
                 there are {vertices}"
            ),
            AGAIN,
        ));
    }
    Ok(out)
}
