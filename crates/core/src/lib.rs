//! The exact structure of exp(At) for a rational matrix A.
//!
//! Everything a certificate search needs to know about a linear system is here, exactly or by rigorous enclosure:
//! integer polynomials and their factors, characteristic polynomials, root discs, order and equality of real parts,
//! linear recurrences, matrix exponentials, and the ring of exponential polynomials. Floating-point numbers occur only
//! in `approx` modules, in functions whose names start with `approx_`; what they return is a proposal that is proved
//! before it is used.

pub mod blocks;
pub mod characteristic;
mod error;
pub mod exponential;
pub mod exponential_polynomial;
pub mod factor;
pub mod integer_polynomial;
pub mod lattice;
pub mod linear_recurrence;
pub mod matrix;
pub mod minimal_polynomial;
mod modular;
mod modular_polynomial;
pub mod root;
pub mod structure;
mod to_rational;

pub use blocks::SparseMatrix;
pub use characteristic::characteristic_polynomial;
pub use error::CoreError;
pub use exponential::{IntervalMatrix, enclose_exponential};
pub use exponential_polynomial::ExponentialPolynomial;
pub use factor::{Factor, Factorization, Irreducibility, factorize};
pub use integer_polynomial::IntegerPolynomial;
pub use linear_recurrence::minimal_annihilator;
pub use matrix::{IntegerMatrix, RationalMatrix};
pub use minimal_polynomial::{minimal_polynomial, minimal_polynomial_at};
pub use root::{RootDisc, enclose_roots};
pub use structure::{SpectralStructure, spectral_structure};
pub use to_rational::ToRational;
