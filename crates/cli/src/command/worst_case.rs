//! The trajectory that shows that a zone of many trajectories is entered, for people and their simulations.

use super::certify::decimal_value;
use crate::number::for_people;
use keepout_checker::certificate::Evidence;
use keepout_checker::many::Witness;
use keepout_checker::statement::{Rational, Statement};
use keepout_synthesis::Proof;
use serde_json::{Map, Value, json};

/// The most states of which the start is told in the report.
const MAX_TOLD: usize = 6;

/// The witness of a proof, if it has one.
pub(super) fn witness(proof: &Proof) -> Option<&Witness> {
    let Evidence::Witness(witness) = &proof.certificate().evidence else { return None };
    Some(witness)
}

/// How often disturbances jump, all together.
fn switches(witness: &Witness) -> usize {
    witness.signals.iter().map(|signal| signal.len().saturating_sub(1)).sum()
}

/// The line of the report.
pub(super) fn in_words(witness: &Witness, statement: &Statement) -> String {
    let value = |(name, x): (&String, &Rational)| format!("{name} = {}", for_people(x, 6));
    let starts = statement.states.iter().map(|s| &s.name).zip(&witness.start).map(value);
    let mut told: Vec<String> = starts.take(MAX_TOLD).collect();
    if statement.states.len() > MAX_TOLD {
        told.push("...".into());
    }
    let mut text = format!("worst case: start {}", told.join(", "));
    let uncertain: Vec<String> =
        statement.uncertain.iter().map(|u| &u.name).zip(&witness.uncertain).map(value).collect();
    if !uncertain.is_empty() {
        text.push_str(&format!("; {}", uncertain.join(", ")));
    }
    if !statement.disturbances.is_empty() {
        let plural = if switches(witness) == 1 { "switch" } else { "switches" };
        text.push_str(&format!("; {} {plural} of the disturbances", switches(witness)));
    }
    text
}

fn exact_and_decimal(x: &Rational) -> Value {
    json!({ "value": x.to_string(), "decimal": decimal_value(x) })
}

fn starts(witness: &Witness, statement: &Statement) -> Value {
    let states = statement.states.iter().zip(&witness.start);
    Value::Object(states.map(|(state, x)| (state.name.clone(), exact_and_decimal(x))).collect::<Map<_, _>>())
}

/// What the object of the zone says about it.
pub(super) fn summary(witness: &Witness, statement: &Statement) -> Value {
    json!({ "start": starts(witness, statement), "switches": switches(witness) })
}

/// The whole trajectory: instant, start, uncertain constants, and the disturbances, constant up to each `until`.
pub(super) fn to_json(witness: &Witness, statement: &Statement) -> String {
    let uncertain = statement.uncertain.iter().zip(&witness.uncertain);
    let uncertain: Map<_, _> = uncertain.map(|(u, x)| (u.name.clone(), exact_and_decimal(x))).collect();
    let step = |(until, value): &(Rational, Rational)| {
        json!({
            "until": until.to_string(), "until_decimal": decimal_value(until),
            "value": value.to_string(), "value_decimal": decimal_value(value),
        })
    };
    let signals = statement.disturbances.iter().zip(&witness.signals);
    let signals: Map<_, _> =
        signals.map(|(d, steps)| (d.name.clone(), Value::Array(steps.iter().map(step).collect()))).collect();
    let whole = json!({
        "at": witness.at.to_string(), "at_decimal": decimal_value(&witness.at),
        "start": starts(witness, statement), "uncertain": uncertain, "signals": signals,
    });
    format!("{whole:#}\n")
}
