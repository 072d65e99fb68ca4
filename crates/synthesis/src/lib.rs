//! Finds certificates: from a statement to a proof that the trusted checker has accepted.
//!
//! Search is free: candidates come from guesses and enclosures, and are returned only after [`keepout_checker::check`] has
//! verified them. What cannot be settled is reported as [`Outcome::Unsettled`] with the reason.
//!
//! Start at [`certify`]; [`certify_eventually`] is about large times alone, [`peak`] about extreme values.

mod autonomous;
mod certify;
mod enclosure;
mod explicit;
mod many;
mod margin;
mod options;
mod outcome;
mod problem;
mod region;
mod search;
mod strategy;

pub use certify::{certify, certify_eventually};
pub use explicit::{ExplicitSet, SetFormula, SetPolynomial, SetVariable, explicit};
pub use many::{Peak, peak};
pub use options::Options;
pub use outcome::{Error, Margin, Outcome, Place, Proof, Reason};
pub use region::{RegionFailure, certify_region};
