//! Sets of starts that are safe for ever.

use crate::autonomous::autonomous;
use crate::options::Options;
use crate::outcome::{Error, Proof};
use crate::strategy::region::find;
use keepout_checker::statement::Statement;

pub use crate::strategy::region::RegionFailure;

/// Searches a set of starts that contains the trajectory from some instant on, is invariant, and avoids the zone. The statement's
/// own claim is not looked at. Known inputs, and the time if the zone names it, become further states: the proof's statement has them.
///
/// # Guarantee
/// A proof has been verified by [`keepout_checker::check`] under `options.limits`.
///
/// # Errors
/// [`Error::Refused`] if the checker refuses what the search found, which is a defect of the search.
pub fn certify_region(statement: &Statement, options: &Options) -> Result<Result<Proof, RegionFailure>, Error> {
    let mut effort = options.effort;
    match find(&autonomous(statement), options, &mut effort) {
        Err(failure) => Ok(Err(failure)),
        Ok(certificate) => Proof::new(certificate, &options.limits).map(Ok).map_err(Error::Refused),
    }
}
