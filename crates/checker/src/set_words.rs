//! The parts of a statement that make it one about many trajectories, in plain words.

use crate::decimal::fraction_and_decimal;
use crate::statement::{Range, Rational, Starts, Statement, UncertainTerm, Variable};
use crate::words::{declared, raised, section, sum};

pub(crate) const MANY_PREFACE: &str = "\
This statement speaks of all admissible trajectories: the solutions of the equations below from each admissible start, driven by
exactly the known inputs, each measurable disturbance within its range, and all values of the uncertain quantities within theirs.
It says nothing about other starts or inputs, nor whether the equations describe the plant. All numbers are exact. A decimal
in parentheses repeats the number before it; where it says \"about\" it is cut off, and the fraction counts. t is time, counted from
0 in the unit of the model; x' is the derivative of x with respect to t.
";

impl Statement {
    pub(crate) fn set_of_starts_lines(&self, lines: &mut Vec<String>) {
        let title = match &self.starts {
            Starts::One => "States, and their exact values at t = 0:",
            Starts::Box(_) => {
                "States, and the ranges of their values at t = 0 (all combinations are admissible, both ends count):"
            }
            Starts::Zonotope(_) => "States, and their values at t = 0 in the centre of the admissible starts:",
            Starts::Ellipsoid(_) => "States, and their values c at t = 0 in the centre of the admissible starts:",
            Starts::Hull(_) => "States, and their values at t = 0 at the first of some points:",
        };
        section(lines, title);
        for (i, state) in self.states.iter().enumerate() {
            let radius = if let Starts::Box(radii) = &self.starts { radii.get(i) } else { None };
            let ends = |r: &Rational| range_words(&Range { from: &state.start - r, to: &state.start + r });
            let value = radius.map_or_else(|| fraction_and_decimal(&state.start), ends);
            lines.push(declared(&state.name, &value, state.unit.as_ref()));
        }
        let vector =
            |v: &Vec<Rational>| format!("  ({})", v.iter().map(fraction_and_decimal).collect::<Vec<_>>().join(", "));
        let (explained, vectors) = match &self.starts {
            Starts::One | Starts::Box(_) => return,
            Starts::Zonotope(generators) => (
                "The admissible starts are the centre plus each sum of these vectors with factors between -1 and 1:",
                generators,
            ),
            Starts::Ellipsoid(shape) => (
                "The admissible starts are all x with h x <= h c + sqrt(h Q h') for each row vector h; the rows of Q:",
                shape,
            ),
            Starts::Hull(points) => {
                ("The admissible starts are the convex hull of this point and the following:", points)
            }
        };
        lines.push(explained.into());
        lines.extend(vectors.iter().map(vector));
    }

    pub(crate) fn unknown_lines(&self, lines: &mut Vec<String>) {
        if !self.disturbances.is_empty() {
            section(
                lines,
                "Disturbances, any measurable functions of time with values in these ranges (both ends count):",
            );
        }
        for d in &self.disturbances {
            lines.push(declared(&d.name, &range_words(&d.range), d.unit.as_ref()));
        }
        if !self.uncertain.is_empty() {
            section(lines, "Uncertain quantities, any values in these ranges (both ends count):");
        }
        for u in &self.uncertain {
            let kind = if u.varying { ", may vary with time" } else { ", constant" };
            lines.push(declared(&u.name, &format!("{}{kind}", range_words(&u.range)), u.unit.as_ref()));
        }
    }

    /// What the uncertain terms of a state's rate add to its known terms.
    pub(crate) fn uncertain_words(&self, state: usize) -> String {
        let terms = self.phases.iter().flat_map(|p| &p.uncertain).filter(|t| t.state == state);
        let words = sum(terms.map(|t| (&t.factor, self.uncertain_factors(t))));
        if words == "0" { String::new() } else { format!(" + ({words})") }
    }

    fn uncertain_factors(&self, term: &UncertainTerm) -> Vec<String> {
        let factor = |(position, power): &(usize, i32)| {
            let name = self.uncertain.get(*position).map_or("?", |u| u.name.as_str());
            let positive = raised(name, power.unsigned_abs());
            if *power < 0_i32 { format!("(1 / {positive})") } else { positive }
        };
        let variable = |v: Variable| self.name(v).to_string();
        term.powers.iter().map(factor).chain(term.of.map(variable)).collect()
    }
}

fn range_words(range: &Range) -> String {
    format!("between {} and {}", fraction_and_decimal(&range.from), fraction_and_decimal(&range.to))
}
