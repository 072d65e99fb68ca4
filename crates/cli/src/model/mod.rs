//! The engineer's model: a TOML file, read exactly, into the parts of statements.
//!
//! Reading has two passes: all names are declared first, then all values are read, each with all names known. Every
//! fault is collected with its place; a model without faults is the only result.

mod dependency;
mod load;
mod matrix;
mod question;
mod scope;
mod section;
mod start;
mod table;
mod unknown;
mod zone;

pub use load::{MAX_BYTES, MAX_ENTRIES, Need, load, load_text};

use keepout_checker::statement::{
    Claim, Disturbance, Drive, Exponential, Formula, Output, Phase, Rational, Starts, State, Statement, Uncertain,
    Variable, Zone,
};
use num_traits::Zero;

/// A model without its zones' claims.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Model {
    /// The title; the file's name where the model gives none.
    pub title: String,
    /// The constants and their values, in the order of the file.
    pub constants: Vec<(String, Rational)>,
    /// The states in the order of the file.
    pub states: Vec<State>,
    /// The admissible starts about those of the states.
    pub starts: Starts,
    /// The known inputs in the order of the file.
    pub drives: Vec<Drive>,
    /// The unknown inputs in the order of the file.
    pub disturbances: Vec<Disturbance>,
    /// The uncertain constants in the order of the file.
    pub uncertain: Vec<Uncertain>,
    /// The named expressions in the order of the file; no value refers to an output.
    pub outputs: Vec<Output>,
    /// What exp stands for in zones.
    pub exponentials: Vec<Exponential>,
    /// The dynamics.
    pub phase: Phase,
    /// The keep-out zones in the order of the file, names distinct ignoring case.
    pub zones: Vec<Zone>,
    /// The text that the model was read from, byte for byte.
    pub source: String,
}

impl Model {
    /// The statement about one zone; its claim is `never` without a margin.
    ///
    /// # Panics
    /// If there is no such zone.
    pub fn statement(&self, zone: usize) -> Statement {
        self.about(self.zones[zone].clone())
    }

    /// The statement about a zone; its claim is `never` without a margin.
    pub fn about(&self, zone: Zone) -> Statement {
        Statement {
            title: self.title.clone(),
            states: self.states.clone(),
            starts: self.starts.clone(),
            disturbances: self.disturbances.clone(),
            uncertain: self.uncertain.clone(),
            drives: self.drives.clone(),
            outputs: self.outputs.clone(),
            exponentials: if has_exponential(&zone.inside) { self.exponentials.clone() } else { Vec::new() },
            phases: vec![self.phase.clone()],
            zone,
            claim: Claim::Never { margin: Rational::zero() },
        }
    }
}

fn has_exponential(formula: &Formula) -> bool {
    match formula {
        Formula::And(parts) | Formula::Or(parts) => parts.iter().any(has_exponential),
        Formula::Atom(atom) => {
            let mut variables = atom.polynomial.terms.iter().flat_map(|t| &t.powers);
            variables.any(|(variable, _)| matches!(variable, Variable::Exponential(_)))
        }
    }
}
