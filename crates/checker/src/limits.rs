//! What the checker is willing to do: every loop over untrusted data is bounded by one of these numbers.

use crate::error::Rejection;

/// Upper bounds on the size of a statement and a certificate, and on the work of checking it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Limits {
    /// Bytes of one JSON text.
    pub text_bytes: u64,
    /// Nesting of JSON arrays and objects.
    pub nesting: u64,
    /// Characters of one number.
    pub number_length: u64,
    /// States, drives, outputs, terms, atoms: entries of any one list of a statement.
    pub statement_entries: u64,
    /// Total degree of a zone's polynomial, outputs expanded; powers of t in a drive.
    pub degree: u64,
    /// Derivatives at 0 that prove an annihilator, times the degree of the zone's polynomial: products of sequences cost as much.
    pub derivatives: u64,
    /// Degree of a polynomial in a certificate, multiplicities counted; roots of all families together.
    pub roots: u64,
    /// Mantissa bits.
    pub bits: u64,
    /// Terms of a Taylor polynomial.
    pub order: u64,
    /// Cells of a cover.
    pub cells: u64,
    /// Splits above one leaf of a torus bisection.
    pub depth: u64,
    /// Nodes of a torus bisection.
    pub nodes: u64,
    /// Base frequencies of a torus.
    pub dimension: u64,
    /// Bits of a multiplier in a sum of roots, and of a turn.
    pub multiplier_bits: u64,
    /// Elementary steps: one is about one product of two 64-bit complex numbers.
    pub work: u64,
}

impl Default for Limits {
    fn default() -> Self {
        Self {
            text_bytes: 1 << 25,
            nesting: 64,
            number_length: 10_000,
            statement_entries: 10_000,
            degree: 24,
            derivatives: 4_000,
            roots: 3_000,
            bits: 20_000,
            order: 400,
            cells: 200_000,
            depth: 200,
            nodes: 400_000,
            dimension: 8,
            multiplier_bits: 16,
            work: 5_000_000_000,
        }
    }
}

/// Refuses `found` beyond `max`.
pub(crate) fn within(limit: &'static str, found: usize, max: u64) -> Result<(), Rejection> {
    let found = u64::try_from(found).unwrap_or(u64::MAX);
    if found <= max { Ok(()) } else { Err(Rejection::LimitExceeded { limit, max, found }) }
}

/// The work that is left.
#[derive(Debug)]
pub struct Budget {
    max: u64,
    spent: u64,
}

impl Budget {
    /// All of the work that the limits allow.
    pub fn new(limits: &Limits) -> Self {
        Self { max: limits.work, spent: 0 }
    }

    /// Accounts for `steps` products of numbers of `bits` bits.
    pub fn spend(&mut self, steps: usize, bits: u32) -> Result<(), Rejection> {
        let words = u64::from(bits / 64 + 1);
        let cost = u64::try_from(steps).unwrap_or(u64::MAX).saturating_mul(words.saturating_mul(words));
        self.spent = self.spent.saturating_add(cost);
        if self.spent <= self.max {
            return Ok(());
        }
        Err(Rejection::LimitExceeded { limit: "work", max: self.max, found: self.spent })
    }
}
