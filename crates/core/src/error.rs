//! What can go wrong in this crate, one variant for each reason.

use thiserror::Error;

/// Why a result could not be given.
#[derive(Clone, Debug, Error, PartialEq, Eq)]
#[non_exhaustive]
pub enum CoreError {
    /// A matrix that must be square is not.
    #[error("the matrix must be square, found {rows} rows and {columns} columns")]
    NotSquare {
        /// Rows found.
        rows: usize,
        /// Columns found.
        columns: usize,
    },
    /// Two shapes that must agree do not.
    #[error("{what}: expected length {expected}, found {found}")]
    Shape {
        /// The object with the wrong length.
        what: &'static str,
        /// Length needed.
        expected: usize,
        /// Length found.
        found: usize,
    },
    /// A constant polynomial has no roots to enclose.
    #[error("a polynomial of positive degree is needed, found a constant")]
    ConstantPolynomial,
    /// A polynomial with a repeated factor was given where a square-free one is needed.
    #[error("the polynomial has a repeated factor; take its square-free part first")]
    NotSquareFree,
    /// The precision or effort allowed did not suffice.
    #[error("{what} needs more than the limit of {limit}")]
    LimitExceeded {
        /// The bounded quantity.
        what: &'static str,
        /// Its limit.
        limit: u64,
    },
}
