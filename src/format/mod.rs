//! One file a file format: bytes in, [`Soup`](crate::mesh::Soup) out, errors with their place.

mod bytes;

pub use bytes::Bytes;
