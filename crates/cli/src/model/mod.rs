//! The engineer's model: a TOML file, read exactly, into the parts of statements.

mod load;
mod matrix;
mod scope;
mod table;
mod zone;

pub use load::{Need, load, load_text};

use keepout_checker::number::Rational;
use keepout_checker::statement::{Claim, Drive, Output, Phase, State, Statement, Zone};
use num_traits::Zero;

/// A model without its zones' claims.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Model {
    /// The title; the file's name where the model gives none.
    pub title: String,
    /// The states in the order of the file.
    pub states: Vec<State>,
    /// The known inputs in the order of the file.
    pub drives: Vec<Drive>,
    /// The named expressions in the order of the file.
    pub outputs: Vec<Output>,
    /// The dynamics.
    pub phase: Phase,
    /// The keep-out zones in the order of the file.
    pub zones: Vec<Zone>,
}

impl Model {
    /// The statement about one zone; its claim is `never` without a margin.
    ///
    /// # Panics
    /// If there is no such zone.
    pub fn statement(&self, zone: usize) -> Statement {
        Statement {
            title: self.title.clone(),
            states: self.states.clone(),
            drives: self.drives.clone(),
            outputs: self.outputs.clone(),
            phases: vec![self.phase.clone()],
            zone: self.zones[zone].clone(),
            claim: Claim::Never { margin: Rational::zero() },
        }
    }
}
