//! From a statement to an outcome.

use crate::many::settle_many;
use crate::margin::margin;
use crate::options::Options;
use crate::outcome::{Error, Outcome, Proof, Reason};
use crate::search::{Finding, settle, settle_eventually};
use keepout_checker::certificate::Certificate;
use keepout_checker::number::Rational;
use keepout_checker::statement::Statement;
use num_traits::Zero;

/// Settles the zone of a statement. The statement's own claim is not looked at: the outcome's proof carries the claim that
/// was proved.
///
/// # Guarantee
/// A proof in the outcome has been verified by [`keepout_checker::check`] under `options.limits`.
///
/// # Errors
/// [`Error::Refused`] if the checker refuses what the search found, which is a defect of the search.
///
/// # Example
/// ```
/// use keepout_checker::statement::*;
/// use keepout_synthesis::{Options, Outcome, certify};
///
/// // x' = -x from 1 never reaches 2.
/// let number = |n: i64| Rational::from_integer(n.into());
/// let x = |power| vec![(Variable::State(0), power)];
/// let polynomial = Expression { terms: vec![
///     Term { coefficient: number(1), powers: x(1) },
///     Term { coefficient: number(-2), powers: vec![] },
/// ] };
/// let statement = Statement {
///     title: "decay".into(),
///     states: vec![State { name: "x".into(), unit: None, start: number(1) }],
///     starts: Starts::One,
///     drives: vec![],
///     disturbances: vec![],
///     uncertain: vec![],
///     outputs: vec![],
///     exponentials: vec![],
///     phases: vec![Phase {
///         rates: vec![Affine { terms: vec![(number(-1), Variable::State(0))], offset: number(0) }],
///         uncertain: vec![],
///     }],
///     zone: Zone {
///         name: "two".into(),
///         reference: None,
///         inside: Formula::Atom(Atom { polynomial, relation: Relation::NonNegative }),
///         from: number(0),
///         until: None,
///     },
///     claim: Claim::Never { margin: number(0) },
/// };
/// let Ok(Outcome::Clear { margin: Some(margin), .. }) = certify(&statement, &Options::default()) else { panic!() };
/// assert!(margin.certified > Rational::new(999_999.into(), 1_000_000.into()) && margin.certified < number(1));
/// ```
pub fn certify(statement: &Statement, options: &Options) -> Result<Outcome, Error> {
    if !statement.is_single() {
        return settle_many(statement, options);
    }
    let mut effort = options.effort;
    match settle(statement, &Rational::zero(), options, &mut effort) {
        Finding::Open(reason) => Ok(unsettled(reason, options, effort)),
        Finding::Enters(certificate) => Ok(Outcome::Enters { proof: proved(certificate, options)? }),
        Finding::Inseparable(certificate) => Ok(Outcome::Inseparable { proof: proved(certificate, options)? }),
        Finding::Never(certificate) => {
            let proof = proved(certificate, options)?;
            let widened = if options.margin { margin(&proof, options) } else { None };
            let (proof, margin) = widened.map_or((proof, None), |(wide, margin)| (Box::new(wide), Some(margin)));
            Ok(Outcome::Clear { proof, margin })
        }
    }
}

/// Settles whether the trajectory cone avoids the zone from some instant on, whatever happens before: the outcome is
/// [`Outcome::Eventually`], [`Outcome::Inseparable`] or [`Outcome::Unsettled`]. The statement's own claim is not looked at.
///
/// # Guarantee
/// A proof in the outcome has been verified by [`keepout_checker::check`] under `options.limits`.
///
/// # Errors
/// [`Error::Refused`] if the checker refuses what the search found, which is a defect of the search.
pub fn certify_eventually(statement: &Statement, options: &Options) -> Result<Outcome, Error> {
    let mut effort = options.effort;
    if statement.zone.until.is_some() {
        return Ok(unsettled(Reason::WindowEnds, options, effort));
    }
    match settle_eventually(statement, options, &mut effort) {
        Finding::Never(certificate) => Ok(Outcome::Eventually { proof: proved(certificate, options)? }),
        Finding::Enters(certificate) => Ok(Outcome::Enters { proof: proved(certificate, options)? }),
        Finding::Inseparable(certificate) => Ok(Outcome::Inseparable { proof: proved(certificate, options)? }),
        Finding::Open(reason) => Ok(unsettled(reason, options, effort)),
    }
}

fn proved(certificate: Certificate, options: &Options) -> Result<Box<Proof>, Error> {
    Proof::new(certificate, &options.limits).map(Box::new).map_err(Error::Refused)
}

fn unsettled(reason: Reason, options: &Options, effort: u64) -> Outcome {
    let tried = format!(
        "cells of a cover, leading terms at doubling times, precisions of 96 to {} bits; {} of {} units of work used",
        options.max_bits,
        options.effort - effort,
        options.effort
    );
    Outcome::Unsettled { reason, tried }
}
