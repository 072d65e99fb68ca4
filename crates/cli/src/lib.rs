//! The engineer's side of Keepout: models, messages, commands. No mathematics of the proofs is in here.

pub mod command;
pub mod diagnostic;
pub mod expression;
pub mod matrix_market;
pub mod model;
pub mod number;
pub mod set;
