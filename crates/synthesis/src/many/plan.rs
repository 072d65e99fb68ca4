//! Everything exact that a piece needs: inputs, functionals, annihilators, certified roots, closed forms.

use crate::enclosure::family;
use crate::problem::multiplicities;
use keepout_checker::affine_form::{AffineForm, expression};
use keepout_checker::certificate::RootFamily;
use keepout_checker::error::Rejection;
use keepout_checker::limits::{Budget, Limits};
use keepout_checker::many::{Functional, Part, Ranges};
use keepout_checker::number::Rational;
use keepout_checker::response::Sparse;
use keepout_checker::root::RootTable;
use keepout_checker::sequence::{Flow, Sequence};
use keepout_checker::statement::{Expression, Statement, Term, Variable};
use keepout_checker::substitution::{Group, substituted};
use keepout_checker::support::{Ground, Inputs, Support};
use keepout_core::{IntegerPolynomial, factorize, minimal_annihilator};
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// One piece with the closed forms of its functionals.
pub(crate) struct Plan {
    pub(crate) plain: Statement,
    pub(crate) groups: Vec<Group>,
    /// What is bounded: the forms of the groups that are not constant, then the functionals.
    pub(crate) supports: Vec<Support>,
    pub(crate) splits: Vec<Vec<Part>>,
    pub(crate) functionals: Vec<Functional>,
    /// The sizes of the groups' inputs are still 0.
    pub(crate) inputs: Inputs,
    pub(crate) families: Vec<RootFamily>,
    pub(crate) table: RootTable,
    pub(crate) bits: u32,
}

/// Why there is no plan.
#[derive(Clone, Debug)]
pub(crate) enum NoPlan {
    /// A functional is not affine in the states.
    NotAffine,
    /// A limit, or a precision that does not separate the roots.
    Rejected(Rejection),
}

impl From<Rejection> for NoPlan {
    fn from(rejection: Rejection) -> Self {
        Self::Rejected(rejection)
    }
}

/// Annihilators of one part before they are written in common families.
struct RawPart {
    states: Vec<usize>,
    row: IntegerPolynomial,
    central: IntegerPolynomial,
    reduced: Vec<(usize, IntegerPolynomial)>,
}

impl Plan {
    /// Plans one piece of a statement for these functionals over the polynomials of its zone.
    pub(crate) fn new(
        statement: &Statement,
        ranges: &Ranges,
        functionals: &[Functional],
        polynomials: &[Expression],
        (bits, integrated): (u32, bool),
        limits: &Limits,
    ) -> Result<Self, NoPlan> {
        let limits = Limits { work: u64::MAX, ..limits.clone() };
        let (plain, groups) = substituted(statement, ranges).ok_or(NoPlan::NotAffine)?;
        let signals = groups.iter().map(|g| (vec![(g.state, Rational::one())], Rational::zero())).collect();
        let inputs = Inputs::new(&plain, signals).ok_or(NoPlan::NotAffine)?;
        let forms = groups.iter().filter(|g| g.constant().is_none()).map(|g| Some(g.form.clone()));
        let listed = functionals.iter().map(|f| expression(f, polynomials));
        let expressions = forms.chain(listed).collect::<Option<Vec<_>>>().ok_or(NoPlan::NotAffine)?;
        let components = components(&plain);
        let raw = expressions
            .iter()
            .map(|e| raw_parts(e, &plain, &inputs, &components, &limits))
            .collect::<Result<Vec<_>, _>>()?;
        let mut all: Vec<IntegerPolynomial> = Vec::new();
        for part in raw.iter().flatten() {
            let reduced = part.reduced.iter().map(|(_, m)| m);
            for m in [&part.row, &part.central].into_iter().chain(reduced) {
                all.extend(factorize(m).factors.into_iter().map(|f| f.polynomial));
            }
        }
        all.push(IntegerPolynomial::variable());
        all.sort_by(|a, b| a.degree().cmp(&b.degree()).then_with(|| a.coefficients().cmp(b.coefficients())));
        all.dedup();
        let mut polynomials = IntegerPolynomial::coprime_base(&all);
        polynomials.retain(|f| f.degree() > 0);
        let families: Vec<RootFamily> = polynomials.iter().map(|f| family(f, bits)).collect();
        let mut budget = Budget::new(&limits);
        let table = RootTable::new(&families, bits, &mut budget)?;
        let split = |part: &RawPart| Part {
            states: part.states.clone(),
            factors: multiplicities(&part.row, &polynomials),
            central: multiplicities(&part.central, &polynomials),
            reduced: part.reduced.iter().map(|(i, m)| (*i, multiplicities(m, &polynomials))).collect(),
        };
        let splits: Vec<Vec<Part>> = raw.iter().map(|parts| parts.iter().map(split).collect()).collect();
        let ground = Ground { plain: &plain, inputs: &inputs, table: &table, bits, limits: &limits, integrated };
        let supports = expressions
            .iter()
            .zip(&splits)
            .map(|(e, parts)| Support::new(e, parts, 0, &ground, &mut budget))
            .collect::<Result<Vec<_>, _>>()?;
        let functionals = functionals.to_vec();
        Ok(Self { plain, groups, supports, splits, functionals, inputs, families, table, bits })
    }

    /// The number of groups that are not constant.
    pub(crate) fn forms(&self) -> usize {
        self.supports.len() - self.functionals.len()
    }
}

/// The connected component of each state: states that occur in each other's rates.
fn components(plain: &Statement) -> Vec<usize> {
    let mut parent: Vec<usize> = (0..plain.states.len()).collect();
    fn root(parent: &mut [usize], mut i: usize) -> usize {
        while parent[i] != i {
            parent[i] = parent[parent[i]];
            i = parent[i];
        }
        i
    }
    for (i, rate) in plain.phases.iter().flat_map(|p| &p.rates).enumerate() {
        for (_, variable) in &rate.terms {
            if let Variable::State(j) = variable {
                let (a, b) = (root(&mut parent, i), root(&mut parent, *j));
                parent[a] = b;
            }
        }
    }
    (0..parent.len()).map(|i| root(&mut parent, i)).collect()
}

fn raw_parts(
    expression: &Expression,
    plain: &Statement,
    inputs: &Inputs,
    components: &[usize],
    limits: &Limits,
) -> Result<Vec<RawPart>, NoPlan> {
    let form = AffineForm::new(expression, plain).ok_or(NoPlan::NotAffine)?;
    let mut rows: BTreeMap<usize, Sparse> = BTreeMap::new();
    for (i, h) in &form.row {
        rows.entry(components[*i]).or_default().push((*i, h.clone()));
    }
    let mut rows: Vec<Sparse> = rows.into_values().collect();
    if rows.is_empty() {
        rows.push(Vec::new());
    }
    let flow = Flow::new(plain, limits);
    let mut parts = Vec::new();
    for (number, row) in rows.iter().enumerate() {
        let of_state =
            |(i, h): &(usize, Rational)| Term { coefficient: h.clone(), powers: vec![(Variable::State(*i), 1)] };
        let mut terms: Vec<Term> = row.iter().map(of_state).collect();
        if number == 0 {
            terms.extend(form.rest.iter().cloned());
        }
        let (_, sequence) = flow.trace(&Expression { terms }, &mut Budget::new(limits))?;
        let central = annihilator(&sequence)?;
        let orbit = Orbit::new(row, plain);
        let whole = orbit.annihilator(plain)?;
        // A response that leaves out exponents which do not decay must be told so.
        let lasting = orbit.size() <= 60 && may_last(&whole);
        let mut reduced = Vec::new();
        if lasting {
            let vectors = inputs.starts.iter().chain(inputs.signals.iter().map(|(v, _)| v));
            for (input, vector) in vectors.enumerate() {
                let own = orbit.response_annihilator(vector, whole.degree())?;
                if own.degree() > 0 && own.degree() < whole.degree() {
                    reduced.push((input, own));
                }
            }
        }
        parts.push(RawPart { states: row.iter().map(|(i, _)| *i).collect(), row: whole, central, reduced });
    }
    Ok(parts)
}

/// Whether a polynomial may have roots that are not to the left of the imaginary axis: by the Routh test in floating point.
fn may_last(m: &IntegerPolynomial) -> bool {
    factorize(m).factors.iter().any(|factor| {
        let centres = crate::strategy::root::centres(&factor.polynomial, 64);
        centres.iter().any(|(re, _)| re.sign() != Ordering::Less)
    })
}

fn annihilator(sequence: &Sequence) -> Result<IntegerPolynomial, NoPlan> {
    let m = minimal_annihilator(sequence.values()).ok_or(NoPlan::NotAffine)?;
    Ok(m.dilate_up(sequence.rate()).primitive_part())
}

/// The rows h A^k = values_k / (D rate^k), k = 0, 1, ..., as integers by entries.
struct Orbit {
    rate: BigInt,
    rows: Vec<BTreeMap<usize, BigInt>>,
}

impl Orbit {
    fn new(row: &Sparse, plain: &Statement) -> Self {
        // The states that the row depends on, closed under rates.
        let rates = &plain.phases[0].rates;
        let mut support: Vec<usize> = row.iter().map(|(i, _)| *i).collect();
        let mut known = vec![false; plain.states.len()];
        support.iter().for_each(|i| known[*i] = true);
        let mut rate = BigInt::one();
        let mut next = 0;
        while next < support.len() {
            for (factor, variable) in &rates[support[next]].terms {
                if let Variable::State(j) = variable {
                    rate = rate.lcm(factor.denom());
                    if !std::mem::replace(&mut known[*j], true) {
                        support.push(*j);
                    }
                }
            }
            next += 1;
        }
        let common = row.iter().fold(BigInt::one(), |d, (_, x)| d.lcm(x.denom()));
        let first = row.iter().map(|(i, x)| (*i, x.numer() * (&common / x.denom()))).collect();
        let mut rows: Vec<BTreeMap<usize, BigInt>> = vec![first];
        for _ in 0..2 * support.len() {
            let mut following: BTreeMap<usize, BigInt> = BTreeMap::new();
            for (i, value) in rows.last().into_iter().flatten() {
                for (factor, variable) in &rates[*i].terms {
                    if let Variable::State(j) = variable {
                        let weight = factor.numer() * (&rate / factor.denom());
                        *following.entry(*j).or_default() += value * weight;
                    }
                }
            }
            rows.push(following);
        }
        Self { rate, rows }
    }

    fn size(&self) -> usize {
        self.rows.len() / 2
    }

    /// The minimal annihilator of the response to a vector, from the first 2 count derivatives.
    fn response_annihilator(&self, vector: &Sparse, count: usize) -> Result<IntegerPolynomial, NoPlan> {
        let common = vector.iter().fold(BigInt::one(), |d, (_, x)| d.lcm(x.denom()));
        let value = |row: &BTreeMap<usize, BigInt>| -> BigInt {
            vector.iter().filter_map(|(i, x)| row.get(i).map(|r| r * x.numer() * (&common / x.denom()))).sum()
        };
        let values: Vec<BigInt> = self.rows.iter().take(2 * count.max(1)).map(value).collect();
        let m = minimal_annihilator(&values).ok_or(NoPlan::NotAffine)?;
        Ok(m.dilate_up(&self.rate).primitive_part())
    }

    /// An annihilator of all responses: of the response to a vector in general position, looked at row by row.
    fn annihilator(&self, plain: &Statement) -> Result<IntegerPolynomial, NoPlan> {
        for attempt in 0_i64..4 {
            let weight = |i: usize| Rational::from_integer(((i as i64 * 37 + attempt * 11) % 23 + 1).into());
            let vector: Sparse = (0..plain.states.len()).map(|i| (i, weight(i))).collect();
            let m = self.response_annihilator(&vector, self.size())?;
            if self.is_annihilated(&m) {
                return Ok(m);
            }
        }
        Err(NoPlan::NotAffine)
    }

    /// Whether sum_j m_j h A^j = 0.
    fn is_annihilated(&self, m: &IntegerPolynomial) -> bool {
        let mut sum: BTreeMap<usize, BigInt> = BTreeMap::new();
        let mut power = BigInt::one();
        for (c, row) in m.coefficients().iter().zip(&self.rows).rev() {
            for (i, x) in row {
                *sum.entry(*i).or_default() += x * c * &power;
            }
            power *= &self.rate;
        }
        sum.values().all(Zero::is_zero)
    }
}
