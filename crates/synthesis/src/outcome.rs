//! What a search returns.

use keepout_checker::certificate::Certificate;
use keepout_checker::error::Rejection;
use keepout_checker::number::Rational;
use keepout_checker::statement::Statement;
use keepout_checker::{Limits, Verified, check};
use thiserror::Error;

/// A statement with its certificate, accepted by the checker.
#[derive(Clone, Debug)]
pub struct Proof {
    verified: Verified,
    certificate: Certificate,
}

impl Proof {
    /// Has the checker verify a certificate for the statement that it embeds.
    pub(crate) fn new(certificate: Certificate, limits: &Limits) -> Result<Self, Rejection> {
        let verified = check(&certificate.statement, &certificate, limits)?;
        Ok(Self { verified, certificate })
    }

    /// The proved statement.
    pub fn statement(&self) -> &Statement {
        self.verified.statement()
    }

    /// The certificate that the checker accepted.
    pub fn certificate(&self) -> &Certificate {
        &self.certificate
    }
}

/// Where a margin is nearly attained.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Place {
    /// Near this instant (a guess, not proved).
    Near(Rational),
    /// In the limit of large times (a guess, not proved).
    Late,
    /// Again and again, at ever later times (a guess, not proved).
    Recurring,
}

/// How far a trajectory stays from a zone, in the unit of the zone's polynomial.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Margin {
    /// A certified lower bound: the proof of the outcome is for the zone widened by it.
    pub certified: Rational,
    /// An upper bound of the true margin (rigorous in its computation, not certified).
    pub at_most: Option<Rational>,
    /// Where the margin is nearly attained.
    pub place: Place,
}

/// Why a zone could not be settled.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Reason {
    /// The trajectory comes so close to the zone's border in this bracket that the precision does not tell whether it touches.
    Touches {
        /// The bracket's start.
        from: Rational,
        /// The bracket's end.
        to: Rational,
    },
    /// The leading terms for large times touch the zone's border, or come too close to tell.
    TouchesInTheLimit {
        /// The last start of a cone that was tried.
        tried: Rational,
    },
    /// Leading growth rates seem to be equal, but this was not proved.
    EqualRates,
    /// The work allowed was used up.
    Effort {
        /// The stretch of time from the window's start in which the zone is proved clear.
        clear_until: Rational,
    },
    /// Many trajectories, and a polynomial of the zone is not affine in the states.
    NotAffine,
    /// A claim about the trajectory cone needs a window without an end.
    WindowEnds,
    /// A limit of the checker would be exceeded.
    Limit(Rejection),
}

/// What became of a keep-out zone.
#[derive(Clone, Debug)]
pub enum Outcome {
    /// Never entered.
    Clear {
        /// The proof; its statement carries the certified margin.
        proof: Box<Proof>,
        /// The margin, where the zone is a single inequality and a margin was looked for.
        margin: Option<Margin>,
    },
    /// Entered in the bracket of the proof's claim.
    Enters {
        /// The proof.
        proof: Box<Proof>,
    },
    /// Not known to be entered, but each trajectory cone meets the zone: no o-minimal invariant keeps the trajectory clear of it.
    Inseparable {
        /// The proof.
        proof: Box<Proof>,
    },
    /// From the start in the proof's claim on the trajectory cone avoids the zone. Only where that was asked for.
    Eventually {
        /// The proof.
        proof: Box<Proof>,
    },
    /// None of these is proved.
    Unsettled {
        /// Why.
        reason: Reason,
        /// What was tried.
        tried: String,
    },
}

/// A statement that cannot be worked on, or a certificate that the checker refused.
#[derive(Debug, Error)]
pub enum Error {
    /// The checker refused a certificate that the search believed in: a defect of the search. Nothing wrong is claimed.
    #[error("the checker refused the certificate that was found: {0}")]
    Refused(#[source] Rejection),
}
