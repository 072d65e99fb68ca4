//! From a statement and a certificate to a proof.

use crate::certificate::{Certificate, Evidence};
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::limits::{Budget, Limits};
use crate::model::{Model, Setting};
use crate::rules::{cone, cover, entry, equality, inseparable, region, witness, worst_case};
use crate::statement::{Claim, Statement};

/// A statement that has been proved. Only [`check`] makes one.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Verified {
    statement: Statement,
}

impl Verified {
    /// The statement.
    pub fn statement(&self) -> &Statement {
        &self.statement
    }
}

/// Proves a statement from a certificate.
///
/// # Errors
/// Why the certificate does not prove it; nothing is said about the plant.
pub fn check(statement: &Statement, certificate: &Certificate, limits: &Limits) -> Result<Verified, Rejection> {
    if *statement != certificate.statement {
        return Err(Rejection::OtherStatement);
    }
    // SOUND: the proof below relies on what the readers ensure (one phase, a rate for each state, declared names, monic
    // polynomials with all their roots, ...). Both types can be built in memory, so it is ensured here for each caller.
    certificate.ensure_readable(limits)?;
    let mut budget = Budget::new(limits);
    // One trajectory is a case of many.
    let is_many = matches!(certificate.evidence, Evidence::Many(_) | Evidence::Witness(_));
    if is_many || !statement.is_single() {
        check_many(certificate, limits, &mut budget)?;
        return Ok(Verified { statement: statement.clone() });
    }
    let model = Model::new(certificate, limits, &mut budget)?;
    let on = Setting { certificate, model: &model, limits };
    for (position, sum) in certificate.sums.iter().enumerate() {
        equality::check(position, sum, on, &mut budget)?;
    }
    let zone = &statement.zone;
    let fits = Duty::new(Rule::Cover, Obligation::EvidenceFitsClaim, 0);
    match (&statement.claim, &certificate.evidence) {
        (Claim::Never { .. }, Evidence::Never { cells, cone: None }) => {
            let until = zone.until.as_ref().ok_or_else(|| fits.refuted())?;
            cover::check(&zone.from, until, cells, on, &mut budget)?;
        }
        (Claim::Never { .. }, Evidence::Never { cells, cone: Some(cone) }) => {
            // The cone holds from its start on; cells are needed for the part of the window before it.
            if cone.far.from > zone.from {
                cover::check(&zone.from, &cone.far.from, cells, on, &mut budget)?;
            } else {
                fits.ensure(cells.is_empty())?;
            }
            cone::check(cone, on, &mut budget)?;
        }
        (Claim::Enters { from, to, first }, Evidence::Enters { before, from: start, cell }) => {
            let in_window = start >= &zone.from && zone.until.as_ref().is_none_or(|until| cell.to <= *until);
            let in_bracket = start >= from && cell.to <= *to;
            Duty::new(Rule::Entry, Obligation::InstantIsInWindow, 0).ensure(in_window && in_bracket)?;
            entry::check(start, cell, on, &mut budget)?;
            // Nothing comes before the window's start.
            if *first && *from > zone.from {
                cover::check(&zone.from, from, before, on, &mut budget)?;
            } else {
                fits.ensure(before.is_empty())?;
            }
        }
        (Claim::Eventually { from }, Evidence::Never { cells, cone: Some(cone) }) => {
            fits.ensure(cells.is_empty() && zone.until.is_none() && zone.from <= *from && cone.far.from <= *from)?;
            cone::check(cone, on, &mut budget)?;
        }
        (Claim::Inseparable, Evidence::Inseparable(meeting)) => {
            fits.ensure(zone.until.is_none())?;
            inseparable::check(meeting, on, &mut budget)?;
        }
        (Claim::Region(set), Evidence::Region(proof)) => {
            fits.ensure(zone.until.is_none() && statement.drives.is_empty())?;
            region::check(set, proof, on, &mut budget)?;
        }
        (_, Evidence::Never { .. } | Evidence::Enters { .. } | Evidence::Inseparable(_) | Evidence::Region(_))
        | (_, Evidence::Many(_) | Evidence::Witness(_)) => return Err(fits.refuted()),
    }
    Ok(Verified { statement: statement.clone() })
}

/// Proves a statement about many trajectories: of the rules, `equality`, `worst_case` and `witness` alone speak of these.
fn check_many(certificate: &Certificate, limits: &Limits, budget: &mut Budget) -> Checked {
    let fits = Duty::new(Rule::WorstCase, Obligation::EvidenceFitsClaim, 0);
    let model = Model::without_functions(certificate, budget)?;
    let on = Setting { certificate, model: &model, limits };
    for (position, sum) in certificate.sums.iter().enumerate() {
        equality::check(position, sum, on, budget)?;
    }
    let zone = &certificate.statement.zone;
    match (&certificate.statement.claim, &certificate.evidence) {
        (Claim::Never { .. }, Evidence::Many(divisions)) => worst_case::check(divisions, on, budget),
        (Claim::Enters { from, to, first: false }, Evidence::Witness(witness)) => {
            let at = &witness.at;
            let in_window = zone.from <= *at && zone.until.as_ref().is_none_or(|until| at <= until);
            Duty::new(Rule::Witness, Obligation::InstantIsInWindow, 0).ensure(in_window && from <= at && at <= to)?;
            witness::check(witness, on, budget)
        }
        _ => Err(fits.refuted()),
    }
}
