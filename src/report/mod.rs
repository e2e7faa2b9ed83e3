//! What people read: figures with as many digits as they are worth, and tables of them.

pub mod digits;
pub mod table;
