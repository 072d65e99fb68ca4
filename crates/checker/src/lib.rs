//! The trusted part.
pub mod number;
pub mod polynomial;
pub mod statement;
pub mod error;
pub mod json;
pub mod limits;
pub use limits::Limits;
