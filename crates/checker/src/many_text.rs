//! Evidence about many trajectories as JSON.

use crate::certificate_text::{
    Counts, list, read_angles, read_factors, read_families, write_angle, write_factor, write_family,
};
use crate::error::Rejection;
use crate::field::Field;
use crate::json::{Value, object, text};
use crate::limits::within;
use crate::many::{Division, Functional, Part, Piece, Tail, TailLead, TimeCell, Witness};
use crate::number::Rational;
use crate::statement::{Statement, Variable};

fn entries<'a>(field: &Field<'a>) -> Result<Vec<Field<'a>>, Rejection> {
    let list = field.list()?;
    within("cells", list.len(), field.limits().cells)?;
    Ok(list)
}

fn each<T>(field: &Field, read: impl Fn(&Field) -> Result<T, Rejection>) -> Result<Vec<T>, Rejection> {
    entries(field)?.iter().map(read).collect()
}

fn rationals(field: &Field) -> Result<Vec<Rational>, Rejection> {
    each(field, |f| f.rational())
}

/// Reads the pieces.
pub(crate) fn read_divisions(field: &Field, statement: &Statement) -> Result<Vec<Division>, Rejection> {
    each(field, |f| {
        if f.optional("cut").is_some() {
            f.only(&["cut", "at"], "a cut: cut, at")?;
            let axes = statement.uncertain.len() + statement.states.len();
            return Ok(Division::Cut(f.get("cut")?.position(axes)?, f.get("at")?.rational()?));
        }
        f.only(
            &["families", "bounds", "functionals", "splits", "cells", "tail"],
            "a piece: families, bounds, functionals, splits, cells, tail",
        )?;
        let families = read_families(&f.get("families")?)?;
        let roots = families.iter().map(|f| f.centres.len()).sum();
        let counts = &Counts { families: families.len(), functions: 0, roots, sums: 0 };
        Ok(Division::Piece(Piece {
            families,
            bounds: rationals(&f.get("bounds")?)?,
            functionals: each(&f.get("functionals")?, |g| read_functional(g, statement))?,
            splits: each(&f.get("splits")?, |g| each(g, |p| read_part(p, counts, statement)))?,
            cells: each(&f.get("cells")?, read_cell)?,
            tail: f.optional("tail").map(|t| read_tail(&t, counts)).transpose()?,
        }))
    })
}

fn read_functional(field: &Field, statement: &Statement) -> Result<Functional, Rejection> {
    field.only(&["polynomials", "variables"], "a functional: polynomials, variables")?;
    let polynomials = each(&field.get("polynomials")?, |f| {
        f.only(&["polynomial", "times"], "a polynomial: polynomial, times")?;
        let count = usize::try_from(f.limits().statement_entries).unwrap_or(usize::MAX);
        Ok((f.get("polynomial")?.position(count)?, f.get("times")?.rational()?))
    })?;
    let variables = each(&field.get("variables")?, |f| {
        f.only(&["of", "times"], "a variable: of, times")?;
        let of = f.get("of")?;
        let name = of.text()?;
        let state = statement.states.iter().position(|s| s.name == name).map(Variable::State);
        let drive = statement.drives.iter().position(|d| d.name == name).map(Variable::Drive);
        let variable = state.or(drive).ok_or_else(|| of.refuse("the name of a state or a drive"))?;
        Ok((variable, f.get("times")?.rational()?))
    })?;
    Ok(Functional { polynomials, variables })
}

fn read_part(field: &Field, counts: &Counts, statement: &Statement) -> Result<Part, Rejection> {
    field.only(&["states", "factors", "central", "reduced"], "a part: states, factors, central, reduced")?;
    let reduced = each(&field.get("reduced")?, |f| {
        f.only(&["input", "factors"], "a reduced response: input, factors")?;
        let count = usize::try_from(f.limits().statement_entries).unwrap_or(usize::MAX);
        Ok((f.get("input")?.position(count)?, read_factors(&f.get("factors")?, counts)?))
    })?;
    Ok(Part {
        states: each(&field.get("states")?, |f| f.position(statement.states.len()))?,
        factors: read_factors(&field.get("factors")?, counts)?,
        central: read_factors(&field.get("central")?, counts)?,
        reduced,
    })
}

fn read_cell(field: &Field) -> Result<TimeCell, Rejection> {
    field.only(&["to", "order", "bits"], "a cell: to, order, bits")?;
    let order = field.get("order")?;
    let count = order.count_within("order", field.limits().order)?;
    if count == 0 {
        return Err(order.refuse("at least 1"));
    }
    let bits = field.get("bits")?.count_within("bits", field.limits().bits)?;
    if bits < 2 {
        return Err(field.get("bits")?.refuse("at least 2 bits"));
    }
    Ok(TimeCell { to: field.get("to")?.rational()?, order: count, bits })
}

fn read_tail(field: &Field, counts: &Counts) -> Result<Tail, Rejection> {
    field.only(&["from", "base", "angles", "leads"], "a tail: from, base, angles, leads")?;
    let base = each(&field.get("base")?, |f| f.position(counts.roots))?;
    within("dimension", base.len(), field.limits().dimension)?;
    let angles = read_angles(&field.get("angles")?, counts)?;
    let leads = each(&field.get("leads")?, |f| {
        f.only(&["power", "roots", "nodes"], "leading terms: power, roots, nodes")?;
        let list = f.get("nodes")?.list()?;
        within("nodes", list.len(), f.limits().nodes)?;
        let node = |n: &Field| match n.text()? {
            "leaf" => Ok(None),
            _ => n.position(base.len()).map(Some),
        };
        Ok(TailLead {
            power: f.get("power")?.count_within("degree", f.limits().degree)?,
            roots: each(&f.get("roots")?, |r| r.position(counts.roots))?,
            nodes: list.iter().map(node).collect::<Result<_, _>>()?,
        })
    })?;
    Ok(Tail { from: field.get("from")?.rational()?, base, angles, leads })
}

/// Reads a witness.
pub(crate) fn read_witness(field: &Field, counts: &Counts, statement: &Statement) -> Result<Witness, Rejection> {
    field.only(
        &["at", "start", "weights", "uncertain", "signals", "splits", "functionals"],
        "a witness: at, start, weights, uncertain, signals, splits, functionals",
    )?;
    let level = |f: &Field| {
        f.only(&["until", "value"], "a stretch of a signal: until, value")?;
        Ok((f.get("until")?.rational()?, f.get("value")?.rational()?))
    };
    Ok(Witness {
        at: field.get("at")?.rational()?,
        start: rationals(&field.get("start")?)?,
        weights: rationals(&field.get("weights")?)?,
        uncertain: rationals(&field.get("uncertain")?)?,
        signals: each(&field.get("signals")?, |f| each(f, level))?,
        splits: each(&field.get("splits")?, |g| each(g, |p| read_part(p, counts, statement)))?,
        functionals: each(&field.get("functionals")?, |g| read_functional(g, statement))?,
    })
}

fn write_functional(functional: &Functional, statement: &Statement) -> Value {
    let polynomial = |(p, w): &(usize, Rational)| object(vec![("polynomial", text(p)), ("times", text(w))]);
    let variable = |(v, w): &(Variable, Rational)| object(vec![("of", text(statement.name(*v))), ("times", text(w))]);
    object(vec![
        ("polynomials", list(&functional.polynomials, polynomial)),
        ("variables", list(&functional.variables, variable)),
    ])
}

fn write_part(part: &Part) -> Value {
    let reduced = |(input, factors): &(usize, Vec<_>)| {
        object(vec![("input", text(input)), ("factors", list(factors, write_factor))])
    };
    object(vec![
        ("states", list(&part.states, |i| text(i))),
        ("factors", list(&part.factors, write_factor)),
        ("central", list(&part.central, write_factor)),
        ("reduced", list(&part.reduced, reduced)),
    ])
}

fn write_tail(tail: &Tail) -> Value {
    let node = |node: &Option<usize>| node.map_or_else(|| text("leaf"), text);
    let lead = |lead: &TailLead| {
        object(vec![
            ("power", text(lead.power)),
            ("roots", list(&lead.roots, |r| text(r))),
            ("nodes", list(&lead.nodes, node)),
        ])
    };
    object(vec![
        ("from", text(&tail.from)),
        ("base", list(&tail.base, |b| text(b))),
        ("angles", list(&tail.angles, write_angle)),
        ("leads", list(&tail.leads, lead)),
    ])
}

pub(crate) fn write_divisions(divisions: &[Division], statement: &Statement) -> Value {
    let cell =
        |cell: &TimeCell| object(vec![("to", text(&cell.to)), ("order", text(cell.order)), ("bits", text(cell.bits))]);
    list(divisions, |division| match division {
        Division::Cut(axis, at) => object(vec![("cut", text(axis)), ("at", text(at))]),
        Division::Piece(piece) => {
            let mut fields = vec![
                ("families", list(&piece.families, write_family)),
                ("bounds", list(&piece.bounds, |b| text(b))),
                ("functionals", list(&piece.functionals, |f| write_functional(f, statement))),
                ("splits", list(&piece.splits, |parts| list(parts, write_part))),
                ("cells", list(&piece.cells, cell)),
            ];
            fields.extend(piece.tail.as_ref().map(|t| ("tail", write_tail(t))));
            object(fields)
        }
    })
}

pub(crate) fn write_witness(witness: &Witness, statement: &Statement) -> Value {
    let level = |(until, value): &(Rational, Rational)| object(vec![("until", text(until)), ("value", text(value))]);
    object(vec![
        ("at", text(&witness.at)),
        ("start", list(&witness.start, |x| text(x))),
        ("weights", list(&witness.weights, |x| text(x))),
        ("uncertain", list(&witness.uncertain, |x| text(x))),
        ("signals", list(&witness.signals, |signal| list(signal, level))),
        ("splits", list(&witness.splits, |parts| list(parts, write_part))),
        ("functionals", list(&witness.functionals, |f| write_functional(f, statement))),
    ])
}
