//! Placeholder module docs; see lib.rs.
