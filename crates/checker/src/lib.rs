//! The trusted part.
pub mod statement;
