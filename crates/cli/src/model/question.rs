//! Expressions that are asked about on the command line, in the names of a model.

use super::Model;
use super::scope::{Kind, NameScope, Names, Place};
use crate::diagnostic::{Diagnostic, Diagnostics};
use crate::expression::{Node, Polynomial, Scope, constant, parse, polynomial};
use keepout_checker::statement::Expression;
use num_rational::BigRational;
use num_traits::One;

impl Model {
    /// An affine expression in states, drives, outputs, constants and t; `option` is where it stands, for messages.
    ///
    /// # Errors
    /// What is wrong with it, with its place in the text.
    pub fn affine(&self, text: &str, option: &str) -> Result<Expression, Diagnostics> {
        let names = self.names();
        let scope = NameScope { names: &names, place: Place::Question };
        let value = parse(text).and_then(|node| affine(&node, &scope));
        value.map(|p| p.expression()).map_err(|d| refused(d, text, option))
    }

    /// A number: a literal, or arithmetic on constants.
    ///
    /// # Errors
    /// What is wrong with it, with its place in the text.
    pub fn number(&self, text: &str, option: &str) -> Result<BigRational, Diagnostics> {
        let names = self.names();
        let scope = NameScope { names: &names, place: Place::Number };
        parse(text).and_then(|node| constant(&node, &scope)).map_err(|d| refused(d, text, option))
    }

    fn names(&self) -> Names {
        let mut names = Names::default();
        let mut insert = |name: &str, kind| names.insert(name.to_string(), kind, 0..0);
        self.constants.iter().for_each(|(name, value)| insert(name, Kind::Constant(Some(value.clone()))));
        self.states.iter().enumerate().for_each(|(i, s)| insert(&s.name, Kind::State(i)));
        self.drives.iter().enumerate().for_each(|(i, d)| insert(&d.name, Kind::Drive(i)));
        self.disturbances.iter().enumerate().for_each(|(i, d)| insert(&d.name, Kind::Disturbance(i)));
        self.uncertain.iter().enumerate().for_each(|(i, u)| insert(&u.name, Kind::Uncertain(i, Some(u.range.clone()))));
        for (i, output) in self.outputs.iter().enumerate() {
            insert(&output.name, Kind::Output(i, Some(expanded(&output.value))));
        }
        names
    }
}

fn refused(diagnostic: Diagnostic, text: &str, option: &str) -> Diagnostics {
    let shown = if text.is_empty() { " " } else { text };
    Diagnostics { file: option.to_string(), text: shown.to_string(), list: vec![diagnostic] }
}

fn affine(node: &Node, scope: &NameScope) -> Result<Polynomial, Diagnostic> {
    let value = polynomial(node, scope)?;
    if value.weighted_degree(&|variable| scope.degree(variable)) > 1 {
        return Err(Diagnostic::new(
            node.span.clone(),
            "the expression is affine in states, drives and t, outputs expanded: this is not",
        )
        .help("ask about a sum of constants times states, drives, outputs and t; others may be asked about as zones"));
    }
    Ok(value)
}

fn expanded(expression: &Expression) -> Polynomial {
    let mut sum = Polynomial::default();
    for term in &expression.terms {
        let mut product = Polynomial::constant(term.coefficient.clone());
        for (variable, power) in &term.powers {
            (0..*power).for_each(|_| product = product.mul(&Polynomial::variable(*variable)));
        }
        sum.add_scaled(&product, &BigRational::one());
    }
    sum
}
