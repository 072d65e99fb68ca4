//! Known inputs as states: a statement without drives whose solutions are those of another, joined by the inputs' own.
//!
//! The functions t^i exp(r t) cos(w t) and t^i exp(r t) sin(w t) of all inputs become states, and so do the inputs themselves, with
//! their own names, and t where the zone names it. Nothing rests on this: the checker sees, and prints, the new statement alone.

use keepout_checker::number::Rational;
use keepout_checker::statement::{
    Affine, Drive, Expression, Formula, Output, Phase, SignalTerm, State, Statement, Term, Variable, Wave,
};
use num_traits::{One, Zero};
use std::collections::BTreeMap;

/// The states of one exponent: for each power of t the position of the cosine's (or the only) state, and of the sine's.
type Modes = Vec<(usize, Option<usize>)>;

/// The statement with its inputs, and the time if it is named, as further states.
pub(crate) fn autonomous(statement: &Statement) -> Statement {
    let mut result = statement.clone();
    let Some(phase) = statement.phases.first() else { return result };
    let names_time = formula_names_time(&statement.zone.inside)
        || statement.outputs.iter().any(|o| names_time(&o.value))
        || statement.exponentials.iter().any(|e| e.argument.terms.iter().any(|(_, v)| *v == Variable::Time));
    if statement.drives.is_empty() && !names_time {
        return result;
    }
    let first = statement.states.len();
    let time = first + statement.drives.len();
    let mut builder = Builder { states: statement.states.clone(), rates: phase.rates.clone(), modes: BTreeMap::new() };
    for drive in &statement.drives {
        builder.add(&drive.name, drive.unit.clone(), Rational::zero(), Affine::default());
    }
    if names_time {
        let rate = Affine { terms: Vec::new(), offset: Rational::one() };
        let name = builder.new_name("time", statement);
        builder.add(&name, None, Rational::zero(), rate);
    }
    for drive in &statement.drives {
        for term in &drive.signal {
            builder.add_modes(term, statement);
        }
    }
    for (i, drive) in statement.drives.iter().enumerate() {
        builder.close(first + i, drive);
    }
    let renamed = |variable: Variable| match variable {
        Variable::Drive(i) => Variable::State(first + i),
        Variable::Time => Variable::State(time),
        Variable::State(_) | Variable::Output(_) | Variable::Exponential(_) | Variable::Disturbance(_) => variable,
    };
    for rate in &mut builder.rates {
        rate.terms.iter_mut().for_each(|(_, variable)| *variable = renamed(*variable));
    }
    result.states = builder.states;
    result.phases = vec![Phase { rates: builder.rates, uncertain: Vec::new() }];
    result.drives = Vec::new();
    let outputs = statement.outputs.iter();
    result.outputs = outputs.map(|o| Output { value: expression(&o.value, renamed), ..o.clone() }).collect();
    result.zone.inside = formula(&statement.zone.inside, renamed);
    for exponential in &mut result.exponentials {
        exponential.argument.terms.iter_mut().for_each(|(_, variable)| *variable = renamed(*variable));
    }
    result
}

struct Builder {
    states: Vec<State>,
    rates: Vec<Affine>,
    modes: BTreeMap<(Rational, Option<Rational>), Modes>,
}

impl Builder {
    fn add(&mut self, name: &str, unit: Option<String>, start: Rational, rate: Affine) -> usize {
        self.states.push(State { name: name.into(), unit, start });
        self.rates.push(rate);
        self.states.len() - 1
    }

    fn new_name(&self, name: &str, statement: &Statement) -> String {
        let mut name = name.to_string();
        let taken = |name: &String| {
            self.states.iter().any(|s| s.name == *name)
                || statement.outputs.iter().any(|o| o.name == *name)
                || statement.drives.iter().any(|d| d.name == *name)
        };
        while taken(&name) {
            name.push('_');
        }
        name
    }

    /// States for the exponent of a term, up to its power of t. The constant 1 needs none.
    fn add_modes(&mut self, term: &SignalTerm, statement: &Statement) {
        let key = exponent(term);
        let known = self.modes.entry(key.clone()).or_default().len();
        for i in known..=term.power as usize {
            let is_constant = key.0.is_zero() && key.1.is_none() && i == 0;
            let start = if i == 0 { Rational::one() } else { Rational::zero() };
            let number = self.modes.values().map(Vec::len).sum::<usize>() + 1;
            let before = i.checked_sub(1).map(|j| self.modes[&key][j]);
            // d/dt t^i e = i t^(i-1) e + r t^i e, and cos' = -w sin, sin' = w cos.
            let mut terms = Vec::new();
            let push = |terms: &mut Vec<(Rational, Variable)>, factor: Rational, state: usize| {
                if !factor.is_zero() {
                    terms.push((factor, Variable::State(state)));
                }
            };
            let power = Rational::from_integer(i.into());
            if is_constant {
                let position = self.add(&self.new_name("one", statement), None, start, Affine::default());
                self.modes.entry(key.clone()).or_default().push((position, None));
                continue;
            }
            let position = self.states.len();
            push(&mut terms, key.0.clone(), position);
            if let Some((cosine, _)) = before {
                push(&mut terms, power.clone(), cosine);
            }
            let Some(w) = &key.1 else {
                let name = self.new_name(&format!("mode_{number}"), statement);
                self.add(&name, None, start, Affine { terms, offset: Rational::zero() });
                self.modes.entry(key.clone()).or_default().push((position, None));
                continue;
            };
            push(&mut terms, -w, position + 1);
            let mut sine = Vec::new();
            push(&mut sine, w.clone(), position);
            push(&mut sine, key.0.clone(), position + 1);
            if let Some((_, Some(before))) = before {
                push(&mut sine, power, before);
            }
            let name = self.new_name(&format!("mode_{number}_cos"), statement);
            self.add(&name, None, start, Affine { terms, offset: Rational::zero() });
            let name = self.new_name(&format!("mode_{number}_sin"), statement);
            self.add(&name, None, Rational::zero(), Affine { terms: sine, offset: Rational::zero() });
            self.modes.entry(key.clone()).or_default().push((position, Some(position + 1)));
        }
    }

    /// Start and rate of the state that an input has become: the sums of those of its terms.
    fn close(&mut self, state: usize, drive: &Drive) {
        let mut rate: BTreeMap<Variable, Rational> = BTreeMap::new();
        let mut start = Rational::zero();
        for term in &drive.signal {
            let (plain, sine) = self.modes[&exponent(term)][term.power as usize];
            let own = if let Wave::Sine(_) = term.wave { sine.unwrap_or(plain) } else { plain };
            start += &term.coefficient * &self.states[own].start;
            for (factor, variable) in &self.rates[own].terms {
                *rate.entry(*variable).or_insert_with(Rational::zero) += factor * &term.coefficient;
            }
        }
        self.states[state].start = start;
        let terms = rate.into_iter().filter(|(_, factor)| !factor.is_zero());
        self.rates[state] = Affine { terms: terms.map(|(v, f)| (f, v)).collect(), offset: Rational::zero() };
    }
}

fn exponent(term: &SignalTerm) -> (Rational, Option<Rational>) {
    let frequency = match &term.wave {
        Wave::One => None,
        Wave::Cosine(w) | Wave::Sine(w) => Some(w.clone()),
    };
    (term.rate.clone(), frequency)
}

fn names_time(expression: &Expression) -> bool {
    expression.terms.iter().flat_map(|t| &t.powers).any(|(v, _)| *v == Variable::Time)
}

fn formula_names_time(formula: &Formula) -> bool {
    match formula {
        Formula::Atom(atom) => names_time(&atom.polynomial),
        Formula::And(parts) | Formula::Or(parts) => parts.iter().any(formula_names_time),
    }
}

fn expression(expression: &Expression, renamed: impl Fn(Variable) -> Variable) -> Expression {
    let term = |t: &Term| {
        let mut powers: Vec<(Variable, u32)> = t.powers.iter().map(|(v, k)| (renamed(*v), *k)).collect();
        powers.sort_unstable();
        Term { coefficient: t.coefficient.clone(), powers }
    };
    Expression { terms: expression.terms.iter().map(term).collect() }
}

fn formula(of: &Formula, renamed: impl Fn(Variable) -> Variable + Copy) -> Formula {
    match of {
        Formula::Atom(atom) => {
            let mut atom = atom.clone();
            atom.polynomial = expression(&atom.polynomial, renamed);
            Formula::Atom(atom)
        }
        Formula::And(parts) => Formula::And(parts.iter().map(|p| formula(p, renamed)).collect()),
        Formula::Or(parts) => Formula::Or(parts.iter().map(|p| formula(p, renamed)).collect()),
    }
}
