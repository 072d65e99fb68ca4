//! Numbers: exact rationals, and enclosures with dyadic end points.
//!
//! Rounding happens in `dyadic` alone; `interval` chooses its direction. Everything built on intervals is an
//! enclosure by construction: if each operand contains its true value, so does the result.

mod complex;
mod dyadic;
mod interval;

pub use complex::Complex;
pub use dyadic::{Direction, Dyadic};
pub use interval::Interval;

pub use crate::statement::Rational;
