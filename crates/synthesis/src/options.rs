//! What a search may spend.

use keepout_checker::Limits;

/// Settings of a search. All of them are counted in work, none in seconds: the same input gives the same outcome.
#[derive(Clone, Debug)]
pub struct Options {
    /// Cells and torus leaves that may be looked at for one claim, over all precisions. Default 60,000.
    pub effort: u64,
    /// The greatest precision, in mantissa bits. Default 2,048.
    pub max_bits: u32,
    /// Whether the margin of a clear single-inequality zone is looked for. Default true.
    pub margin: bool,
    /// The limits of the checker that is to accept the certificate.
    pub limits: Limits,
}

impl Default for Options {
    fn default() -> Self {
        Self { effort: 60_000, max_bits: 2_048, margin: true, limits: Limits::default() }
    }
}
