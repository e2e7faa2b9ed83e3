//! What people read: figures with as many digits as they are worth, and tables of them.

pub mod digits;
mod look;
pub mod table;
