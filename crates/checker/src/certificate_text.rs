//! Certificates as JSON: reading with all its refusals, and writing.

use crate::certificate::{
    Angle, Auxiliary, Cell, Certificate, Cone, Evidence, Factor, FarField, Identity, Lead, Meeting, Node, Pivot,
    RealPart, RootFamily, RootRef, Sign, Sum,
};
use crate::error::Rejection;
use crate::field::{Field, dyadic_text};
use crate::json::{Value, object, text};
use crate::limits::{Limits, within};
use crate::many_text::{read_divisions, read_witness, write_divisions, write_witness};
use crate::polynomial::Polynomial;
use crate::region_text::{read_proof, write_proof};
use crate::statement::Statement;
use crate::statement_text::read_statement;
use num_traits::Signed;
use std::cmp::Ordering;

/// The `format` of a certificate.
pub(crate) const CERTIFICATE_FORMAT: &str = "keepout-certificate/1";

const SIGNS: [(char, Sign); 3] = [('-', Ordering::Less), ('0', Ordering::Equal), ('+', Ordering::Greater)];

impl Certificate {
    /// Reads a certificate from its JSON text.
    ///
    /// # Errors
    /// [`Rejection::Malformed`] with the place, or [`Rejection::LimitExceeded`].
    pub fn from_json(text: &str, limits: &Limits) -> Result<Self, Rejection> {
        read_certificate(&Field::root(&crate::json::read(text, limits)?, limits))
    }

    /// Refuses a value that the reader would not give: so one built in memory obeys the same rules and limits as a text.
    pub(crate) fn ensure_readable(&self, limits: &Limits) -> Result<(), Rejection> {
        if read_certificate(&Field::root(&self.to_json(), limits))? == *self {
            return Ok(());
        }
        let expected = "a value that its own text gives back";
        Err(Rejection::Malformed { place: "the certificate".into(), expected, found: "another value".into() })
    }

    /// The certificate as a JSON value.
    pub fn to_json(&self) -> Value {
        object(vec![
            ("format", text(CERTIFICATE_FORMAT)),
            ("statement", self.statement.to_json()),
            ("bits", text(self.bits)),
            ("families", list(&self.families, write_family)),
            ("traces", list(&self.traces, |factors| list(factors, write_factor))),
            ("auxiliaries", list(&self.auxiliaries, write_auxiliary)),
            ("identities", list(&self.identities, write_identity)),
            ("sums", list(&self.sums, write_sum)),
            ("evidence", write_evidence(&self.evidence, &self.statement)),
        ])
    }
}

fn read_certificate(field: &Field) -> Result<Certificate, Rejection> {
    field.only(
        &["format", "statement", "bits", "families", "traces", "auxiliaries", "identities", "sums", "evidence"],
        "a certificate: format, statement, bits, families, traces, auxiliaries, identities, sums, evidence",
    )?;
    let format = field.get("format")?;
    if format.text()? != CERTIFICATE_FORMAT {
        return Err(format.refuse("\"keepout-certificate/1\""));
    }
    let bits = field.get("bits")?.count_within("bits", field.limits().bits)?;
    if bits < 2 {
        return Err(field.get("bits")?.refuse("at least 2 bits"));
    }
    let families = read_families(&field.get("families")?)?;
    let roots = families.iter().map(|f| f.centres.len()).sum();
    let factors = |f: &Field| bounded(f, "roots", f.limits().roots)?.each(|f| read_factor(f, families.len()));
    let lists = |key| bounded(&field.get(key)?, "statement_entries", field.limits().statement_entries);
    let traces = lists("traces")?.each(factors)?;
    let auxiliaries = lists("auxiliaries")?.each(|f| {
        f.only(&["factors", "derivatives"], "an auxiliary function: factors, derivatives")?;
        let derivatives = bounded(&f.get("derivatives")?, "roots", f.limits().roots)?.each(Field::rational)?;
        Ok(Auxiliary { factors: factors(&f.get("factors")?)?, derivatives })
    })?;
    let functions = traces.len() + auxiliaries.len();
    let identities = lists("identities")?.each(|f| read_identity(f, functions))?;
    let sums = lists("sums")?.each(|f| {
        f.only(&["root", "parts", "factors"], "a sum: root, parts, factors")?;
        let parts = f.get("parts")?.each(|part| {
            part.only(&["times", "root"], "a part: times, root")?;
            Ok((read_integer(&part.get("times")?)?, read_root(&part.get("root")?, roots)?))
        })?;
        if parts.is_empty() || parts.len() > 2 {
            return Err(f.get("parts")?.refuse("one or two parts"));
        }
        Ok(Sum { root: read_root(&f.get("root")?, roots)?, parts, factors: factors(&f.get("factors")?)? })
    })?;
    let counts = Counts { families: families.len(), functions, roots, sums: sums.len() };
    let statement = read_statement(&field.get("statement")?)?;
    let evidence = read_evidence(&field.get("evidence")?, &counts, &statement)?;
    Ok(Certificate { statement, bits, families, traces, auxiliaries, identities, sums, evidence })
}

/// The lengths of the lists that positions refer to.
pub(crate) struct Counts {
    pub(crate) families: usize,
    pub(crate) functions: usize,
    pub(crate) roots: usize,
    pub(crate) sums: usize,
}

pub(crate) fn bounded<'a>(field: &Field<'a>, limit: &'static str, max: u64) -> Result<Field<'a>, Rejection> {
    within(limit, field.list()?.len(), max)?;
    Ok(Field::clone(field))
}

pub(crate) fn read_integer(field: &Field) -> Result<i64, Rejection> {
    let value: i64 = field.text()?.parse().map_err(|_| field.refuse("a small integer"))?;
    let bits = usize::try_from(u64::BITS - value.unsigned_abs().leading_zeros()).unwrap_or(usize::MAX);
    within("multiplier_bits", bits, field.limits().multiplier_bits)?;
    Ok(value)
}

/// Families with at most as many roots together as the limit says.
pub(crate) fn read_families(field: &Field) -> Result<Vec<RootFamily>, Rejection> {
    let families = bounded(field, "roots", field.limits().roots)?.each(read_family)?;
    within("roots", families.iter().map(|f| f.centres.len()).sum(), field.limits().roots)?;
    Ok(families)
}

fn read_family(field: &Field) -> Result<RootFamily, Rejection> {
    field.only(&["polynomial", "centres"], "a family: polynomial, centres")?;
    let coefficients = bounded(&field.get("polynomial")?, "roots", field.limits().roots + 1)?.each(Field::rational)?;
    let polynomial = Polynomial::new(coefficients);
    if !polynomial.is_monic() || polynomial.degree() == 0 {
        return Err(field.get("polynomial")?.refuse("the coefficients of a monic polynomial, constant term first"));
    }
    let centres = bounded(&field.get("centres")?, "roots", field.limits().roots)?.each(|f| {
        f.only(&["re", "im"], "a centre: re, im")?;
        let (re, im) = (f.get("re")?.dyadic()?, f.get("im")?.dyadic()?);
        if im.sign() == Ordering::Less { Err(f.refuse("an imaginary part >= 0")) } else { Ok((re, im)) }
    })?;
    let roots: usize = centres.iter().map(|(_, im)| if im.sign() == Ordering::Equal { 1 } else { 2 }).sum();
    if roots != polynomial.degree() {
        return Err(field.get("centres")?.refuse("as many roots as the degree, each conjugate pair once"));
    }
    Ok(RootFamily { polynomial, centres })
}

fn read_factor(field: &Field, families: usize) -> Result<Factor, Rejection> {
    field.only(&["family", "multiplicity"], "a factor: family, multiplicity")?;
    let multiplicity = field.get("multiplicity")?.count_within("roots", field.limits().roots)?;
    if multiplicity == 0 {
        return Err(field.get("multiplicity")?.refuse("at least 1"));
    }
    Ok(Factor { family: field.get("family")?.position(families)?, multiplicity })
}

fn read_identity(field: &Field, functions: usize) -> Result<Identity, Rejection> {
    field.only(&["target", "summands"], "an identity: target, summands")?;
    let summands = bounded(&field.get("summands")?, "degree", field.limits().degree)?
        .each(|f| bounded(f, "degree", f.limits().degree)?.each(|f| read_power(f, functions)))?;
    Ok(Identity { target: field.get("target")?.position(functions)?, summands })
}

/// `K^P`, P >= 1.
fn read_power(field: &Field, functions: usize) -> Result<(usize, u32), Rejection> {
    let refused = || field.refuse("\"K^P\", K the position of a function, P a power >= 1");
    let (function, power) = field.text()?.split_once('^').ok_or_else(refused)?;
    let function = function.parse::<usize>().ok().filter(|f| *f < functions).ok_or_else(refused)?;
    let power = power.parse::<u32>().ok().filter(|p| *p > 0).ok_or_else(refused)?;
    within("degree", usize::try_from(power).unwrap_or(usize::MAX), field.limits().degree)?;
    Ok((function, power))
}

/// `K` or `K*` for the conjugate.
fn read_root(field: &Field, roots: usize) -> Result<RootRef, Rejection> {
    let text = field.text()?;
    let plain = text.strip_suffix('*');
    let index = plain.unwrap_or(text).parse::<usize>().ok().filter(|i| *i < roots);
    let index = index.ok_or_else(|| field.refuse("the position of a root, with * for its conjugate"))?;
    Ok(RootRef { index, conjugate: plain.is_some() })
}

/// `K:S`, S one of - 0 +.
fn read_signed(field: &Field, length: usize) -> Result<(usize, Sign), Rejection> {
    let refused = || field.refuse("\"K:S\", K a position in a list above, S one of - 0 +");
    let (position, symbol) = field.text()?.split_once(':').ok_or_else(refused)?;
    let position = position.parse::<usize>().ok().filter(|p| *p < length).ok_or_else(refused)?;
    let found = SIGNS.iter().find(|(c, _)| symbol.len() == 1 && symbol.starts_with(*c)).ok_or_else(refused)?;
    Ok((position, found.1))
}

fn read_signs(field: &Field, counts: &Counts) -> Result<Vec<(usize, Sign)>, Rejection> {
    field.each(|f| read_signed(f, counts.functions))
}

fn read_pivot(field: &Field, counts: &Counts) -> Result<Option<usize>, Rejection> {
    field.optional("pivot").map(|pivot| pivot.position(counts.functions)).transpose()
}

fn read_cell(field: &Field, counts: &Counts) -> Result<Cell, Rejection> {
    field.only(&["to", "order", "signs", "start", "pivot"], "a cell: to, order, signs; start or pivot")?;
    let order = field.get("order")?.count_within("order", field.limits().order)?;
    let pivot = match (field.optional("start"), read_pivot(field, counts)?) {
        (None, None) => Pivot::None,
        (Some(start), None) => Pivot::Start(start.each(|f| {
            f.only(&["sign", "power"], "a function that vanishes at the start: sign, power")?;
            let (function, sign) = read_signed(&f.get("sign")?, counts.functions)?;
            let power = f.get("power")?.count_within("order", f.limits().order)?;
            Ok((function, power, sign))
        })?),
        (None, Some(pivot)) => Pivot::Function(pivot),
        (Some(_), Some(_)) => return Err(field.refuse("start or pivot, not both")),
    };
    if order == 0 {
        return Err(field.get("order")?.refuse("at least 1"));
    }
    Ok(Cell { to: field.get("to")?.rational()?, order, signs: read_signs(&field.get("signs")?, counts)?, pivot })
}

fn read_cells(field: &Field, counts: &Counts) -> Result<Vec<Cell>, Rejection> {
    bounded(field, "cells", field.limits().cells)?.each(|f| read_cell(f, counts))
}

fn read_lead(field: &Field, counts: &Counts) -> Result<Lead, Rejection> {
    field.only(&["function", "roots", "line", "doubled"], "a lead: function, roots; line or doubled")?;
    let real_part = match (field.optional("line"), field.optional("doubled")) {
        (None, None) => RealPart::Single,
        (Some(line), None) => RealPart::Line(line.rational()?),
        (None, Some(doubled)) => RealPart::Doubled(doubled.each(|f| f.position(counts.sums))?),
        (Some(_), Some(_)) => return Err(field.refuse("line or doubled, not both")),
    };
    Ok(Lead {
        function: field.get("function")?.position(counts.functions)?,
        roots: bounded(&field.get("roots")?, "roots", field.limits().roots)?.each(|f| f.position(counts.roots))?,
        real_part,
    })
}

/// The angles of roots.
pub(crate) fn read_angles(field: &Field, counts: &Counts) -> Result<Vec<Angle>, Rejection> {
    bounded(field, "roots", field.limits().roots)?.each(|f| {
        f.only(&["root", "turns", "sum"], "an angle: root, turns, sum")?;
        Ok(Angle {
            root: f.get("root")?.position(counts.roots)?,
            turns: bounded(&f.get("turns")?, "dimension", f.limits().dimension)?.each(read_integer)?,
            sum: f.optional("sum").map(|s| s.position(counts.sums)).transpose()?,
        })
    })
}

/// The factors of an annihilator.
pub(crate) fn read_factors(field: &Field, counts: &Counts) -> Result<Vec<Factor>, Rejection> {
    bounded(field, "roots", field.limits().roots)?.each(|f| read_factor(f, counts.families))
}

fn read_far_field(field: &Field, counts: &Counts) -> Result<FarField, Rejection> {
    field.only(&["from", "base", "angles", "leads"], "a far field: from, base, angles, leads")?;
    let base =
        bounded(&field.get("base")?, "dimension", field.limits().dimension)?.each(|f| f.position(counts.roots))?;
    let angles = read_angles(&field.get("angles")?, counts)?;
    let leads = bounded(&field.get("leads")?, "statement_entries", field.limits().statement_entries)?
        .each(|f| read_lead(f, counts))?;
    Ok(FarField { from: field.get("from")?.rational()?, base, angles, leads })
}

fn read_cone(field: &Field, counts: &Counts) -> Result<Cone, Rejection> {
    field.only(&["far", "nodes"], "a cone: far, nodes")?;
    let far = read_far_field(&field.get("far")?, counts)?;
    let nodes = read_nodes(&field.get("nodes")?, far.base.len(), counts)?;
    Ok(Cone { far, nodes })
}

/// The bisection of a torus of this dimension.
pub(crate) fn read_nodes(field: &Field, dimension: usize, counts: &Counts) -> Result<Vec<Node>, Rejection> {
    bounded(field, "nodes", field.limits().nodes)?.each(|f| match f.optional("split") {
        Some(axis) => {
            f.only(&["split"], "one key")?;
            Ok(Node::Split(axis.position(dimension)?))
        }
        None => {
            f.only(&["signs", "pivot"], "a leaf: signs, pivot; or split")?;
            Ok(Node::Leaf(read_signs(&f.get("signs")?, counts)?, read_pivot(f, counts)?))
        }
    })
}

fn read_meeting(field: &Field, counts: &Counts) -> Result<Meeting, Rejection> {
    field.only(&["far", "angles", "zeros", "signs"], "evidence for inseparable: far, angles, zeros, signs")?;
    let far = read_far_field(&field.get("far")?, counts)?;
    let angles = bounded(&field.get("angles")?, "dimension", field.limits().dimension)?.each(|f| {
        f.only(&["centre", "radius"], "an interval of angles: centre, radius")?;
        let radius = f.get("radius")?.rational()?;
        if radius.is_negative() { Err(f.refuse("a radius >= 0")) } else { Ok((f.get("centre")?.rational()?, radius)) }
    })?;
    let zeros = field.get("zeros")?.each(|f| {
        f.only(&["function", "axis"], "a zero: function, axis")?;
        Ok((f.get("function")?.position(counts.functions)?, f.get("axis")?.position(far.base.len())?))
    })?;
    Ok(Meeting { far, angles, zeros, signs: read_signs(&field.get("signs")?, counts)? })
}

fn read_evidence(field: &Field, counts: &Counts, statement: &Statement) -> Result<Evidence, Rejection> {
    if let Some(never) = field.optional("never") {
        field.only(&["never"], "one key")?;
        never.only(&["cells", "cone"], "evidence for never: cells, cone")?;
        let cone = never.optional("cone").map(|f| read_cone(&f, counts)).transpose()?;
        return Ok(Evidence::Never { cells: read_cells(&never.get("cells")?, counts)?, cone });
    }
    if let Some(meeting) = field.optional("inseparable") {
        field.only(&["inseparable"], "one key")?;
        return Ok(Evidence::Inseparable(read_meeting(&meeting, counts)?));
    }
    if let Some(region) = field.optional("region") {
        field.only(&["region"], "one key")?;
        return Ok(Evidence::Region(read_proof(&region, counts)?));
    }
    if let Some(many) = field.optional("many") {
        field.only(&["many"], "one key")?;
        return Ok(Evidence::Many(read_divisions(&many, statement)?));
    }
    if let Some(witness) = field.optional("witness") {
        field.only(&["witness"], "one key")?;
        return Ok(Evidence::Witness(Box::new(read_witness(&witness, counts, statement)?)));
    }
    field.only(&["enters"], "evidence: never, enters, inseparable, region, many or witness")?;
    let enters = field.get("enters")?;
    enters.only(&["before", "from", "cell"], "evidence for enters: before, from, cell")?;
    Ok(Evidence::Enters {
        before: read_cells(&enters.get("before")?, counts)?,
        from: enters.get("from")?.rational()?,
        cell: read_cell(&enters.get("cell")?, counts)?,
    })
}

pub(crate) fn list<T>(items: &[T], write: impl Fn(&T) -> Value) -> Value {
    Value::List(items.iter().map(write).collect())
}

pub(crate) fn write_family(family: &RootFamily) -> Value {
    let centre = |(re, im): &(_, _)| object(vec![("re", text(dyadic_text(re))), ("im", text(dyadic_text(im)))]);
    object(vec![
        ("polynomial", list(family.polynomial.coefficients(), |x| text(x))),
        ("centres", list(&family.centres, centre)),
    ])
}

pub(crate) fn write_factor(factor: &Factor) -> Value {
    object(vec![("family", text(factor.family)), ("multiplicity", text(factor.multiplicity))])
}

fn write_auxiliary(w: &Auxiliary) -> Value {
    object(vec![("factors", list(&w.factors, write_factor)), ("derivatives", list(&w.derivatives, |x| text(x)))])
}

fn write_identity(identity: &Identity) -> Value {
    let power = |(function, power): &(usize, u32)| Value::Text(format!("{function}^{power}"));
    let summands = list(&identity.summands, |factors| list(factors, power));
    object(vec![("target", text(identity.target)), ("summands", summands)])
}

fn write_root(root: RootRef) -> Value {
    Value::Text(format!("{}{}", root.index, if root.conjugate { "*" } else { "" }))
}

fn write_sum(sum: &Sum) -> Value {
    let part = |(times, root): &(i64, RootRef)| object(vec![("times", text(times)), ("root", write_root(*root))]);
    object(vec![
        ("root", write_root(sum.root)),
        ("parts", list(&sum.parts, part)),
        ("factors", list(&sum.factors, write_factor)),
    ])
}

fn write_signed(position: usize, sign: Sign) -> Value {
    let symbol = SIGNS.iter().find(|(_, s)| *s == sign).map_or('?', |(c, _)| *c);
    Value::Text(format!("{position}:{symbol}"))
}

fn write_signs(signs: &[(usize, Sign)]) -> Value {
    list(signs, |(position, sign)| write_signed(*position, *sign))
}

fn write_cell(cell: &Cell) -> Value {
    let order = |(function, power, sign): &(usize, u32, Sign)| {
        object(vec![("sign", write_signed(*function, *sign)), ("power", text(power))])
    };
    let mut fields = vec![("to", text(&cell.to)), ("order", text(cell.order)), ("signs", write_signs(&cell.signs))];
    match &cell.pivot {
        Pivot::None => {}
        Pivot::Start(start) => fields.push(("start", list(start, order))),
        Pivot::Function(pivot) => fields.push(("pivot", text(pivot))),
    }
    object(fields)
}

pub(crate) fn write_angle(angle: &Angle) -> Value {
    let mut fields = vec![("root", text(angle.root)), ("turns", list(&angle.turns, |n| text(n)))];
    fields.extend(angle.sum.map(|sum| ("sum", text(sum))));
    object(fields)
}

fn write_far_field(far: &FarField) -> Value {
    let lead = |lead: &Lead| {
        let mut fields = vec![("function", text(lead.function)), ("roots", list(&lead.roots, |r| text(r)))];
        match &lead.real_part {
            RealPart::Single => {}
            RealPart::Line(line) => fields.push(("line", text(line))),
            RealPart::Doubled(sums) => fields.push(("doubled", list(sums, |s| text(s)))),
        }
        object(fields)
    };
    object(vec![
        ("from", text(&far.from)),
        ("base", list(&far.base, |b| text(b))),
        ("angles", list(&far.angles, write_angle)),
        ("leads", list(&far.leads, lead)),
    ])
}

fn write_cone(cone: &Cone) -> Value {
    object(vec![("far", write_far_field(&cone.far)), ("nodes", list(&cone.nodes, write_node))])
}

pub(crate) fn write_node(node: &Node) -> Value {
    match node {
        Node::Split(axis) => object(vec![("split", text(axis))]),
        Node::Leaf(signs, pivot) => {
            let mut fields = vec![("signs", write_signs(signs))];
            fields.extend(pivot.map(|pivot| ("pivot", text(pivot))));
            object(fields)
        }
    }
}

fn write_meeting(meeting: &Meeting) -> Value {
    let interval = |(centre, radius): &(_, _)| object(vec![("centre", text(centre)), ("radius", text(radius))]);
    let zero = |(function, axis): &(usize, usize)| object(vec![("function", text(function)), ("axis", text(axis))]);
    object(vec![
        ("far", write_far_field(&meeting.far)),
        ("angles", list(&meeting.angles, interval)),
        ("zeros", list(&meeting.zeros, zero)),
        ("signs", write_signs(&meeting.signs)),
    ])
}

fn write_evidence(evidence: &Evidence, statement: &Statement) -> Value {
    match evidence {
        Evidence::Never { cells, cone } => {
            let mut fields = vec![("cells", list(cells, write_cell))];
            fields.extend(cone.as_ref().map(|c| ("cone", write_cone(c))));
            object(vec![("never", object(fields))])
        }
        Evidence::Enters { before, from, cell } => {
            let fields = vec![("before", list(before, write_cell)), ("from", text(from)), ("cell", write_cell(cell))];
            object(vec![("enters", object(fields))])
        }
        Evidence::Inseparable(meeting) => object(vec![("inseparable", write_meeting(meeting))]),
        Evidence::Region(proof) => object(vec![("region", write_proof(proof))]),
        Evidence::Many(divisions) => object(vec![("many", write_divisions(divisions, statement))]),
        Evidence::Witness(witness) => object(vec![("witness", write_witness(witness, statement))]),
    }
}
