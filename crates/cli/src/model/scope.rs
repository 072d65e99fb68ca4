//! The names of a model, and what they mean in numbers, rates, signals, outputs and zones.

use super::unknown;
use crate::expression::{Function, Polynomial, Scope, Value};
use keepout_checker::statement::{Affine, Drive, Exponential, SignalTerm, Variable, Wave};
use num_rational::BigRational;
use num_traits::Zero;
use std::cell::RefCell;
use std::collections::HashMap;
use std::ops::Range;

/// What a declared name stands for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Kind {
    /// A constant; `None` until its value is known, or if it has none.
    Constant(Option<BigRational>),
    State(usize),
    Drive(usize),
    /// A named expression; `None` until its value is known, or if it has none.
    Output(usize, Option<Polynomial>),
    Disturbance(usize),
    /// An uncertain constant; `None` until its range is known, or if it has none.
    Uncertain(usize, Option<keepout_checker::statement::Range>),
}

impl Kind {
    pub(super) fn word(&self) -> &'static str {
        match self {
            Self::Constant(_) => "a constant",
            Self::State(_) => "a state",
            Self::Drive(_) => "a drive",
            Self::Output(..) => "an output",
            Self::Disturbance(_) => "a disturbance",
            Self::Uncertain(..) => "an uncertain constant",
        }
    }
}

/// All declared names with their places, in the order of declaration.
#[derive(Default)]
pub(super) struct Names {
    list: Vec<(String, Kind, Range<usize>)>,
    index: HashMap<String, usize>,
    /// The names of the outputs by their positions in the statement.
    outputs: HashMap<usize, String>,
    /// The exponentials in zones: found while these are read.
    exponentials: RefCell<Exponentials>,
}

/// What exp stands for in zones.
#[derive(Default)]
struct Exponentials {
    /// Arguments rate * t: such an exponential is a known input.
    rates: Vec<BigRational>,
    /// Other arguments.
    arguments: Vec<Affine>,
}

impl Names {
    pub(super) fn get(&self, name: &str) -> Option<&(String, Kind, Range<usize>)> {
        self.index.get(name).map(|i| &self.list[*i])
    }

    /// Adds a name; the caller has looked that it is new.
    pub(super) fn insert(&mut self, name: String, kind: Kind, span: Range<usize>) {
        self.index.insert(name.clone(), self.list.len());
        if let Kind::Output(i, _) = kind {
            self.outputs.insert(i, name.clone());
        }
        self.list.push((name, kind, span));
    }

    /// The name and the range of an uncertain constant.
    pub(super) fn uncertain(&self, position: usize) -> Option<(&str, &keepout_checker::statement::Range)> {
        self.list.iter().find_map(|(name, kind, _)| match kind {
            Kind::Uncertain(i, Some(range)) if *i == position => Some((name.as_str(), range)),
            _ => None,
        })
    }

    /// The constants with their values.
    pub(super) fn constants(&self) -> Vec<(String, BigRational)> {
        let value = |kind: &Kind| match kind {
            Kind::Constant(value) => value.clone(),
            _ => None,
        };
        self.list.iter().filter_map(|(name, kind, _)| Some((name.clone(), value(kind)?))).collect()
    }

    /// The number of declared drives.
    fn drives(&self) -> usize {
        self.list.iter().filter(|(_, kind, _)| matches!(kind, Kind::Drive(_))).count()
    }

    /// The value of an output.
    fn output(&self, position: usize) -> Option<&Polynomial> {
        match self.get(self.outputs.get(&position)?)? {
            (_, Kind::Output(_, value), _) => value.as_ref(),
            _ => None,
        }
    }

    /// The known inputs and the exponentials that stand for exp in zones, with names that no other thing has.
    pub(super) fn take_exponentials(&self) -> (Vec<Drive>, Vec<Exponential>) {
        let Exponentials { rates, arguments } = self.exponentials.take();
        let mut names = (1..).map(|k| format!("exp_{k}")).filter(|name| self.get(name).is_none());
        let mut next = || names.next().unwrap_or_default();
        let drives = rates.into_iter().map(|rate| {
            let one = BigRational::from_integer(1.into());
            let signal = vec![SignalTerm { coefficient: one, power: 0, rate, wave: Wave::One }];
            Drive { name: next(), unit: None, signal }
        });
        let drives = drives.collect();
        (drives, arguments.into_iter().map(|argument| Exponential { name: next(), argument }).collect())
    }

    /// Gives a declared name its value.
    pub(super) fn set(&mut self, name: &str, kind: Kind) {
        if let Some(i) = self.index.get(name) {
            self.list[*i].1 = kind;
        }
    }
}

/// Where an expression stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Place {
    /// A number: constants only.
    Number,
    /// An entry of a matrix: constants and uncertain constants.
    Entry,
    Rate,
    Signal,
    Output,
    Zone,
    /// An expression on the command line.
    Question,
}

/// All declared names, as seen from one place.
pub(super) struct NameScope<'a> {
    pub(super) names: &'a Names,
    pub(super) place: Place,
}

/// Stands for a value that could not be read, so that what uses it is looked at all the same. A model with such a name is
/// refused, whatever comes of it.
fn stand_in() -> Value {
    Value::Constant(BigRational::new(104_729.into(), 7_919.into()))
}

fn refused(message: String, help: &str) -> Value {
    Value::Refused(message, help.into())
}

impl NameScope<'_> {
    fn time(&self) -> Value {
        match self.place {
            Place::Rate => refused(
                "a rate does not use t".into(),
                "declare a [drive] with the time-dependent part and use its name",
            ),
            Place::Number | Place::Entry => refused("t is not a constant".into(), "use numbers and constants only"),
            Place::Signal | Place::Output | Place::Zone | Place::Question => Value::Variable(Variable::Time),
        }
    }

    fn meaning(&self, name: &str, kind: &Kind) -> Value {
        let word = kind.word();
        match (kind, self.place) {
            (Kind::Constant(Some(value)), _) => Value::Constant(value.clone()),
            (Kind::Disturbance(_) | Kind::Uncertain(..), Place::Zone) => refused(
                format!("`{name}` is {word}: a zone does not use it"),
                "describe the zone by states, drives, outputs, constants and t",
            ),
            (Kind::Disturbance(_) | Kind::Uncertain(..), Place::Question) => refused(
                format!("`{name}` is {word}: the expression does not use it"),
                "ask about states, drives, outputs, constants and t",
            ),
            (Kind::Disturbance(_) | Kind::Uncertain(..), Place::Output) => refused(
                format!("`{name}` is {word}: an output does not use it"),
                "describe the output by states, drives, constants and t; a nominal value stands under [constants]",
            ),
            (Kind::Uncertain(..), Place::Number) => refused(
                format!("`{name}` is {word}: only rates use it"),
                "use an exact value, or declare what depends on it under [uncertain], with a range of its own",
            ),
            (Kind::Uncertain(..), Place::Signal) => refused(
                format!("`{name}` is {word}: a signal does not use it"),
                "multiply the drive by it in a rate, or declare a [disturbance] for what is not known of the signal",
            ),
            (Kind::Uncertain(i, Some(_)), Place::Rate | Place::Entry) => Value::Variable(unknown::factor(*i, false)),
            (Kind::Constant(None) | Kind::Uncertain(_, None), _) => stand_in(),
            (
                Kind::State(_) | Kind::Drive(_) | Kind::Output(..) | Kind::Disturbance(_),
                Place::Number | Place::Entry,
            ) => refused(format!("`{name}` is {word}, not a constant"), "use numbers and constants only"),
            (Kind::State(_) | Kind::Drive(_) | Kind::Output(..) | Kind::Disturbance(_), Place::Signal) => refused(
                format!("`{name}` is {word}: a signal uses only constants and t"),
                "feedback belongs into a rate; a signal is known beforehand",
            ),
            (Kind::Output(..), Place::Rate) => refused(
                format!("`{name}` is an output: a rate does not use outputs"),
                "write the expression of the output in its place",
            ),
            (Kind::Disturbance(i), Place::Rate) => Value::Variable(Variable::Disturbance(*i)),
            (Kind::State(i), Place::Rate | Place::Output | Place::Zone | Place::Question) => {
                Value::Variable(Variable::State(*i))
            }
            (Kind::Drive(i), Place::Rate | Place::Output | Place::Zone | Place::Question) => {
                Value::Variable(Variable::Drive(*i))
            }
            (Kind::Output(_, Some(value)), Place::Output) => Value::Polynomial(value.clone()),
            (Kind::Output(_, None), Place::Output) => stand_in(),
            (Kind::Output(i, _), Place::Zone | Place::Question) => Value::Variable(Variable::Output(*i)),
        }
    }
}

impl Scope for NameScope<'_> {
    fn look_up(&self, name: &str) -> Option<Value> {
        if name == "t" {
            return Some(self.time());
        }
        self.names.get(name).map(|(_, kind, _)| self.meaning(name, kind))
    }

    fn names(&self) -> Vec<String> {
        let allowed = |kind: &Kind| match self.place {
            Place::Number | Place::Signal => matches!(kind, Kind::Constant(_)),
            Place::Entry => matches!(kind, Kind::Constant(_) | Kind::Uncertain(..)),
            Place::Rate => !matches!(kind, Kind::Output(..)),
            Place::Output | Place::Zone | Place::Question => {
                !matches!(kind, Kind::Disturbance(_) | Kind::Uncertain(..))
            }
        };
        let mut names: Vec<String> =
            self.names.list.iter().filter(|(_, k, _)| allowed(k)).map(|(n, ..)| n.clone()).collect();
        if !matches!(self.place, Place::Rate | Place::Number | Place::Entry) {
            names.insert(0, "t".into());
        }
        names
    }

    fn function_hint(&self, function: Function) -> (String, String) {
        let name = function.name();
        let drive = "declare a [drive] for a known signal and use its name; a nonlinear plant has to be linearised";
        match (self.place, function) {
            (Place::Number | Place::Entry, _) => (
                format!("{name} is not exact in a constant"),
                "give the value as an exact number, or a range around it under [uncertain]".into(),
            ),
            (Place::Rate, _) => (format!("{name} is not allowed in a rate"), drive.into()),
            (Place::Output, _) => (format!("{name} is not allowed in an output"), drive.into()),
            (Place::Signal, _) => (
                format!("{name} is not allowed in the argument of another function"),
                "a signal is a sum of products of t^k, exp(r*t), sin(w*t), cos(w*t)".into(),
            ),
            (Place::Question, _) => (format!("{name} is not allowed here"), drive.into()),
            (Place::Zone, Function::Exp | Function::Sin | Function::Cos | Function::Abs) => (
                format!("{name} is not allowed in a zone"),
                format!("declare a [drive] such as signal = \"{name}(2*t)\" and use its name"),
            ),
        }
    }

    fn reciprocal(&self, divisor: &Polynomial) -> Option<Result<Polynomial, (String, String)>> {
        let is_rate = matches!(self.place, Place::Rate | Place::Entry);
        (is_rate && unknown::is_uncertain(divisor)).then(|| unknown::reciprocal(divisor, self.names))
    }

    fn splits(&self) -> bool {
        self.place == Place::Zone
    }

    fn exponential(&self, argument: &Polynomial) -> Option<Variable> {
        let mut known = self.names.exponentials.borrow_mut();
        let terms: Vec<(BigRational, Variable)> =
            argument.terms().filter_map(|(powers, c)| Some((c.clone(), powers.first()?.0))).collect();
        let offset = argument.terms().find(|(powers, _)| powers.is_empty());
        let offset = offset.map_or_else(BigRational::zero, |(_, c)| c.clone());
        if let ([(rate, Variable::Time)], true) = (terms.as_slice(), offset.is_zero()) {
            let position = position_or_push(&mut known.rates, rate.clone());
            return Some(Variable::Drive(self.names.drives() + position));
        }
        Some(Variable::Exponential(position_or_push(&mut known.arguments, Affine { terms, offset })))
    }

    fn expanded(&self, value: &Polynomial) -> Polynomial {
        let mut sum = Polynomial::default();
        for (powers, c) in value.terms() {
            let mut product = Polynomial::constant(c.clone());
            for (variable, power) in powers {
                let factor = match variable {
                    Variable::Output(i) => self.names.output(*i).cloned().unwrap_or_default(),
                    _ => Polynomial::variable(*variable),
                };
                (0..*power).for_each(|_| product = product.mul(&factor));
            }
            sum.add_scaled(&product, &BigRational::from_integer(1.into()));
        }
        sum
    }

    fn degree(&self, variable: Variable) -> u32 {
        let Variable::Output(position) = variable else { return 1 };
        self.names.output(position).map_or(1, Polynomial::degree)
    }
}

fn position_or_push<T: PartialEq>(list: &mut Vec<T>, item: T) -> usize {
    list.iter().position(|known| *known == item).unwrap_or_else(|| {
        list.push(item);
        list.len() - 1
    })
}
