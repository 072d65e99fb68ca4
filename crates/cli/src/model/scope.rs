//! What names mean in rates, signals, outputs and zones.

use crate::expression::{Scope, Value};
use keepout_checker::statement::Variable;
use num_rational::BigRational;

/// What a declared name stands for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Kind {
    Constant(BigRational),
    State(usize),
    Drive(usize),
    Output(usize),
    /// A constant whose value could not be read: no further complaint.
    Broken,
}

/// Where an expression stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Place {
    Rate,
    Signal,
    Output,
    Zone,
}

/// All declared names, as seen from one place.
pub(super) struct NameScope<'a> {
    pub(super) names: &'a [(String, Kind)],
    pub(super) place: Place,
}

impl Scope for NameScope<'_> {
    fn look_up(&self, name: &str) -> Option<Value> {
        let refused = |message: &str, help: &str| Some(Value::Refused(message.into(), Some(help.into())));
        if name == "t" {
            return match self.place {
                Place::Rate => {
                    refused("a rate does not use t", "declare a [drive] with the time-dependent part and use its name")
                }
                Place::Signal | Place::Output | Place::Zone => Some(Value::Variable(Variable::Time)),
            };
        }
        let kind = &self.names.iter().find(|(n, _)| n == name)?.1;
        Some(match (kind, self.place) {
            (Kind::Constant(value), _) => Value::Constant(value.clone()),
            (Kind::Broken, _) => Value::Refused(format!("`{name}` has no value: see above"), None),
            (Kind::State(_) | Kind::Drive(_) | Kind::Output(_), Place::Signal) => {
                return refused(
                    "a signal uses only constants and t",
                    "feedback belongs into a rate; a signal is known beforehand",
                );
            }
            (Kind::Output(_), Place::Rate) => {
                return refused("a rate does not use an output", "write the expression of the output in its place");
            }
            (Kind::State(i), _) => Value::Variable(Variable::State(*i)),
            (Kind::Drive(i), _) => Value::Variable(Variable::Drive(*i)),
            (Kind::Output(i), _) => Value::Variable(Variable::Output(*i)),
        })
    }

    fn names(&self) -> Vec<String> {
        let allowed = |kind: &Kind| match self.place {
            Place::Signal => matches!(kind, Kind::Constant(_)),
            Place::Rate => !matches!(kind, Kind::Output(_)),
            Place::Output | Place::Zone => true,
        };
        let mut names: Vec<String> = self.names.iter().filter(|(_, k)| allowed(k)).map(|(n, _)| n.clone()).collect();
        if self.place != Place::Rate {
            names.push("t".into());
        }
        names.truncate(30);
        names
    }

    fn function_hint(&self) -> (&'static str, &'static str) {
        match self.place {
            Place::Rate | Place::Output => (
                "exp, sin and cos are not allowed here: the model is linear",
                "declare a [drive] for a known signal, or linearise",
            ),
            Place::Signal => ("this argument is not allowed", "arguments are r*t or w*t"),
            Place::Zone => (
                "exp, sin and cos are not supported in zones yet",
                "declare a [drive] for a known signal and use its name",
            ),
        }
    }

    fn splits(&self) -> bool {
        self.place == Place::Zone
    }
}
