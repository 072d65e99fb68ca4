//! The trusted part of Keepout.
//!
//! **Promise.** If [`check`] returns a [`Verified`], then the claim of its statement is true: of each admissible solution of the
//! statement's differential equation, driven by exactly the statement's known inputs: from each admissible start, for all
//! disturbances and uncertain quantities within their ranges; where there are none of these, of the one solution that has the
//! statement's start (for the claim `region`: of all solutions with starts in its set, too). The exact meaning of a claim stands at [`statement::Claim`].
//!
//! **Assumptions.** That the lines of this crate do what their comments say; that `num-bigint`, `num-integer`,
//! `num-rational` and `num-traits` compute correctly; that compiler and machine do. Nothing else: not the program that found the
//! certificate, no floating-point number, no tolerance. That the statement describes the plant is not claimed.
//!
//! Reading order: `statement`, `certificate`, `check`, `rules/`, `model`, `trace`, `root`, `far_field`, `lead`, `range`, `region`,
//! `expansion`, `many`, `division`, `substitution`, `support`, `tail`, `affine_form`, `response`, `taylor`, `admissible`, `sequence`, `formula`, `exponential`, `signs`, `number/`;
//! `words` and `decimal` print a statement for people, `statement_text`, `certificate_text`, `set_text`, `many_text`, `field`, `json` read and write texts.

pub use check::{Verified, check};
pub use error::Rejection;
pub use limits::Limits;

pub mod affine_form;
pub mod certificate;
pub mod decimal;
pub mod error;
pub mod expansion;
pub mod exponential;
pub mod formula;
pub mod json;
pub mod lead;
pub mod limits;
pub mod many;
pub mod model;
pub mod number;
pub mod polynomial;
pub mod range;
pub mod region;
pub mod response;
pub mod root;
pub mod sequence;
pub mod signs;
pub mod statement;
pub mod substitution;
pub mod support;
pub mod tail;
pub mod taylor;
pub mod trace;

mod admissible;
mod bisection;
mod certificate_text;
mod check;
mod combination;
mod division;
mod far_field;
mod field;
mod many_text;
mod region_text;
mod rules;
mod set_text;
mod set_words;
mod statement_text;
mod words;
