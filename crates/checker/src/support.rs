//! The support function of the reachable set: S(t) = sup of an affine function over all admissible trajectories.
//!
//! Lemma (superposition; the suprema are attained, the last by switching signals): for starts c + sum of xi_j g_j, |xi_j| <= 1, and measurable
//! disturbances |w_k - m_k| <= r_k, with f(t) the function along the trajectory from c with all w_k = m_k,
//!     S(t) = f(t) + sum_j |h exp(A t) g_j| + sum_k r_k int_0^t |h exp(A s) b_k| ds (+ |coefficient| r_k where the function names w_k).
//! For the convex hull of points c + v_i the second part is the greatest of 0 and h exp(A t) v_i, for the ellipsoid of Q = sum d_i l_i l_i' it
//! is sqrt(sum d_i (h exp(A t) l_i)^2).

use crate::affine_form::AffineForm;
use crate::certificate::Factor;
use crate::error::{Duty, Obligation, Rejection, Rule};
use crate::limits::{Budget, Limits};
use crate::many::Part;
use crate::number::Direction::Up;
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::response::{Row, Sparse};
use crate::root::RootTable;
use crate::sequence::Flow;
use crate::statement::{Expression, Starts, Statement, Term, Variable};
use crate::substitution::column;
use crate::taylor::Taylor;
use crate::trace::{ClosedForm, Stretch};
use num_traits::{One, Signed, Zero};
use std::cmp::Ordering;

/// How the responses to the vectors of the starts are put together.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Shape {
    /// The sum of their sizes.
    Sum,
    /// The greatest of 0 and them.
    Hull,
    /// The square root of the sum of their squares with these weights > 0.
    Ellipsoid(Vec<Rational>),
}

/// What acts on the central trajectory.
#[derive(Clone, Debug)]
pub struct Inputs {
    /// How the vectors of the starts act.
    pub shape: Shape,
    /// The vectors of the starts.
    pub starts: Vec<Sparse>,
    /// Directions and sizes of the disturbances, then of the groups of uncertain terms.
    pub signals: Vec<(Sparse, Rational)>,
}

impl Inputs {
    /// The inputs of a plain statement; the groups' directions and sizes follow the disturbances. `None`: Q is not positive
    /// semidefinite.
    pub fn new(plain: &Statement, groups: Vec<(Sparse, Rational)>) -> Option<Self> {
        let sparse = |v: &[Rational]| -> Sparse {
            v.iter().enumerate().filter(|(_, x)| !x.is_zero()).map(|(i, x)| (i, x.clone())).collect()
        };
        let (shape, starts) = match &plain.starts {
            Starts::One => (Shape::Sum, Vec::new()),
            Starts::Box(radii) => (Shape::Sum, sparse(radii).into_iter().map(|entry| vec![entry]).collect()),
            Starts::Zonotope(generators) => (Shape::Sum, generators.iter().map(|g| sparse(g)).collect()),
            Starts::Hull(points) => {
                let offset = |p: &Vec<Rational>| {
                    let differences: Vec<Rational> = p.iter().zip(&plain.states).map(|(x, s)| x - &s.start).collect();
                    sparse(&differences)
                };
                (Shape::Hull, points.iter().map(offset).collect())
            }
            Starts::Ellipsoid(shape) => {
                let (weights, columns) = factored(shape)?;
                (Shape::Ellipsoid(weights), columns.iter().map(|c| sparse(c)).collect())
            }
        };
        let disturbances = plain.disturbances.iter().enumerate();
        let signals = disturbances.map(|(k, d)| (column(plain, Variable::Disturbance(k)), d.range.radius()));
        Some(Self { shape, starts, signals: signals.chain(groups).collect() })
    }
}

/// Q = sum d_i l_i l_i' with d_i > 0 (elimination without pivoting: of a positive semidefinite matrix a zero pivot has a zero row).
/// `None`: there is no such sum.
fn factored(shape: &[Vec<Rational>]) -> Option<(Vec<Rational>, Vec<Vec<Rational>>)> {
    let mut rest = shape.to_vec();
    let (mut weights, mut columns) = (Vec::new(), Vec::new());
    for k in 0..shape.len() {
        let row = rest.get(k)?.clone();
        let pivot = row.get(k)?.clone();
        if pivot.is_zero() && row.iter().all(Zero::is_zero) {
            continue;
        }
        if !pivot.is_positive() {
            return None;
        }
        let column: Vec<Rational> = row.iter().map(|x| x / &pivot).collect();
        for (line, l) in rest.iter_mut().zip(&column) {
            for (slot, x) in line.iter_mut().zip(&row) {
                *slot -= l * x;
            }
        }
        weights.push(pivot);
        columns.push(column);
    }
    Some((weights, columns))
}

/// How often a cell is halved where the sign of a signal's response is not certain.
const HALVINGS: u32 = 18;

/// How many halvings there are at most for one signal on one cell.
const STEPS: u32 = 200;

/// A functional with all its closed forms.
#[derive(Clone, Debug)]
pub struct Support {
    /// Along the central trajectory.
    pub central: ClosedForm,
    /// Its value at 0.
    pub start: Rational,
    /// The responses to the starts' vectors.
    pub responses: Vec<ClosedForm>,
    /// Their values at 0.
    pub starts: Vec<Rational>,
    /// The responses to the signals; of a witness their integrals.
    pub signals: Vec<ClosedForm>,
    /// What the disturbances that the functional names may add at once.
    pub direct: Rational,
}

/// Where a support function is built.
pub struct Ground<'a> {
    /// The plain statement.
    pub plain: &'a Statement,
    /// What acts on it.
    pub inputs: &'a Inputs,
    /// The certified roots.
    pub table: &'a RootTable,
    /// The mantissa bits.
    pub bits: u32,
    /// The limits.
    pub limits: &'a Limits,
    /// Whether integrals of the responses to signals are wanted in place of these.
    pub integrated: bool,
}

impl Support {
    /// Proves all closed forms of a functional.
    ///
    /// # Errors
    /// The first obligation that is not met.
    pub fn new(
        expression: &Expression,
        parts: &[Part],
        position: usize,
        on: &Ground,
        budget: &mut Budget,
    ) -> Result<Self, Rejection> {
        let affine = Duty::new(Rule::WorstCase, Obligation::FunctionalIsAffine, position);
        let annihilates = Duty::new(Rule::WorstCase, Obligation::FactorsAnnihilateResponse, position);
        let form = AffineForm::new(expression, on.plain).ok_or_else(|| affine.refuted())?;
        let mut listed: Vec<usize> = parts.iter().flat_map(|p| p.states.iter().copied()).collect();
        listed.sort_unstable();
        affine.ensure(!parts.is_empty() && listed.iter().eq(form.row.iter().map(|(i, _)| i)))?;
        let empty = || ClosedForm { terms: Vec::new() };
        let mut support = Self {
            central: empty(),
            start: Rational::zero(),
            responses: vec![empty(); on.inputs.starts.len()],
            starts: on.inputs.starts.iter().map(|v| dot(&form.row, v)).collect(),
            signals: vec![empty(); on.inputs.signals.len()],
            direct: Rational::zero(),
        };
        for (k, coefficient) in &form.disturbances {
            let radius = on.plain.disturbances.get(*k).ok_or_else(|| affine.refuted())?.range.radius();
            support.direct += coefficient.abs() * radius;
        }
        let flow = Flow::new(on.plain, on.limits);
        for (number, part) in parts.iter().enumerate() {
            let row: Sparse = form.row.iter().filter(|(i, _)| part.states.contains(i)).cloned().collect();
            let of_state =
                |(i, h): &(usize, Rational)| Term { coefficient: h.clone(), powers: vec![(Variable::State(*i), 1)] };
            let mut terms: Vec<Term> = row.iter().map(of_state).collect();
            if number == 0 {
                terms.extend(form.rest.iter().cloned());
            }
            support.add_central(&Expression { terms }, &part.central, annihilates, &flow, on, budget)?;
            let own_row = Row::new(on.plain, &row, &part.factors, on.table, annihilates, (on.limits, budget))?;
            let own = |input: usize| part.reduced.iter().find(|(i, _)| *i == input).map(|(_, f)| f.as_slice());
            for (j, (vector, slot)) in on.inputs.starts.iter().zip(&mut support.responses).enumerate() {
                let form = own_row.response(vector, own(j), false, on.table, annihilates, (on.bits, budget))?;
                slot.terms.extend(form.terms);
            }
            let first = on.inputs.starts.len();
            for (k, ((vector, _), slot)) in on.inputs.signals.iter().zip(&mut support.signals).enumerate() {
                let form = own_row.response(
                    vector,
                    own(first + k),
                    on.integrated,
                    on.table,
                    annihilates,
                    (on.bits, budget),
                )?;
                slot.terms.extend(form.terms);
            }
        }
        Ok(support)
    }

    fn add_central(
        &mut self,
        expression: &Expression,
        factors: &[Factor],
        duty: Duty,
        flow: &Flow,
        on: &Ground,
        budget: &mut Budget,
    ) -> Result<(), Rejection> {
        let (order, sequence) = flow.trace(expression, budget)?;
        on.table.spend_product(factors, budget)?;
        let m = on.table.product(factors).ok_or_else(|| duty.refuted())?;
        // See `model`: N vanishing derivatives at 0 make m(d/dt) g zero.
        duty.ensure(m.degree() <= order.max(1) && sequence.is_annihilated(&m, order))?;
        let form =
            ClosedForm::new(factors, &sequence.derivatives(m.degree()), on.table, on.bits, duty.position, budget)?;
        self.central.terms.extend(form.terms);
        self.start += sequence.derivatives(1).into_iter().sum::<Rational>();
        Ok(())
    }

    /// The support function of the negated functional, whose start set is not symmetric for a hull.
    pub fn negated(&self) -> Self {
        let negative = |form: &ClosedForm| {
            let mut form = form.clone();
            for c in form.terms.iter_mut().flat_map(|t| &mut t.coefficients) {
                *c = Complex { re: c.re.neg(), im: c.im.neg() };
            }
            form
        };
        Self {
            central: negative(&self.central),
            start: -&self.start,
            responses: self.responses.iter().map(negative).collect(),
            starts: self.starts.iter().map(|x| -x).collect(),
            signals: self.signals.iter().map(negative).collect(),
            direct: self.direct.clone(),
        }
    }
}

fn dot(row: &Sparse, vector: &Sparse) -> Rational {
    let entry = |(i, h): &(usize, Rational)| vector.iter().find(|(j, _)| i == j).map(|(_, x)| h * x);
    row.iter().filter_map(entry).sum()
}

/// A support function on a cell.
pub struct OnCell {
    /// An upper bound of S on the cell.
    pub upper: Dyadic,
    /// Whether the cell begins at 0 with S(0) <= 0, and S(t) < 0 for all other t of it.
    pub leaves_zero: bool,
    /// Upper bounds of the integrals of the signals' responses up to the cell's end.
    pub integrals: Vec<Dyadic>,
}

impl Support {
    /// Bounds S on a stretch, given upper bounds of the integrals up to its start. `None`: an argument is out of range.
    pub fn on_cell(
        &self,
        inputs: &Inputs,
        reached: &[Dyadic],
        stretch: Stretch,
        budget: &mut Budget,
    ) -> Result<Option<OnCell>, Rejection> {
        let bits = stretch.bits;
        let Some(mut base) = self.central.taylor(0, stretch, budget)? else { return Ok(None) };
        base.add_constant(&Interval::rational(&self.direct, bits));
        let mut integrals = Vec::new();
        for ((form, (_, size)), before) in self.signals.iter().zip(&inputs.signals).zip(reached) {
            let Some(model) = form.taylor(0, stretch, budget)? else { return Ok(None) };
            let size = Interval::rational(size, bits);
            // SOUND(hi): sizes are not negative; upper bounds are added and multiplied, rounded up. Where the sign is certain, the
            // integral from the cell's start of |response| is that of the response or of its negative.
            let (within, inside) = match model.sign() {
                Some(sign) if sign != Ordering::Equal => (model.integral().abs_hi(), Some(sign)),
                Some(_) => (Dyadic::zero(), None),
                None => {
                    let mut steps = STEPS;
                    let within = model.size_integral(HALVINGS, &mut steps);
                    let (order, taken) = (model.coefficients.len(), STEPS - steps);
                    let work = order.saturating_mul(order).saturating_mul(2);
                    budget.spend(work.saturating_mul(usize::try_from(taken).unwrap_or(usize::MAX)), bits)?;
                    (within, None)
                }
            };
            match inside {
                Some(sign) => {
                    let factor = if sign == Ordering::Less { -Rational::one() } else { Rational::one() };
                    let mut primitive = Taylor::zero(1, &base.half_width, bits);
                    primitive.add_multiple(&factor, &model.primitive());
                    base.add_scaled(&size, &primitive);
                    base.add_constant(&Interval::point(before.mul(size.hi(), bits, Up)));
                }
                None => base.add_constant(&Interval::point(before.add(&within, bits, Up).mul(size.hi(), bits, Up))),
            }
            integrals.push(before.add(&within, bits, Up));
        }
        let mut models = Vec::new();
        for form in &self.responses {
            let Some(model) = form.taylor(0, stretch, budget)? else { return Ok(None) };
            models.push(model);
        }
        let order = usize::try_from(stretch.order).unwrap_or(usize::MAX);
        budget.spend((models.len() + 1).saturating_mul(order.saturating_mul(order)), bits)?;
        let upper = with_starts(&base, &models, &inputs.shape);
        let at_zero = *stretch.centre == *stretch.half_width && !stretch.half_width.is_zero();
        let leaves_zero = at_zero && upper.sign() != Ordering::Less && self.leaves_zero(inputs, stretch, budget)?;
        Ok(Some(OnCell { upper, leaves_zero, integrals }))
    }

    /// Whether S(0) <= 0 and (S(t) - S(0)) / t < 0 for 0 < t <= the cell's end.
    ///
    /// Why: a response that does not vanish at 0 has its sign there on the whole cell where that is certain; of one that does, the size
    /// divided by t is at most that of its slope; the integral of |response| divided by t is at most the greatest |response|.
    fn leaves_zero(&self, inputs: &Inputs, stretch: Stretch, budget: &mut Budget) -> Result<bool, Rejection> {
        if inputs.shape != Shape::Sum {
            return Ok(false);
        }
        let start = self.starts.iter().fold(&self.start + &self.direct, |sum, x| sum + x.abs());
        let (zero, end) = (Rational::zero(), stretch.centre + stretch.half_width);
        let from_zero = Stretch { centre: &zero, half_width: &end, ..stretch };
        let slope = |form: &ClosedForm, budget: &mut Budget| -> Result<Option<Taylor>, Rejection> {
            Ok(form.taylor(1, from_zero, budget)?.and_then(|model| model.slope()))
        };
        if start.is_positive() {
            return Ok(false);
        }
        let Some(mut total) = slope(&self.central, budget)? else { return Ok(false) };
        for (form, value) in self.responses.iter().zip(&self.starts) {
            let Some(own) = slope(form, budget)? else { return Ok(false) };
            if value.is_zero() {
                total.add_constant(&Interval::point(own.range().abs_hi()));
                continue;
            }
            let sign = if value.is_positive() { Ordering::Greater } else { Ordering::Less };
            let model = form.taylor(0, stretch, budget)?;
            if model.and_then(|m| m.sign()) != Some(sign) {
                return Ok(false);
            }
            total.add_multiple(&value.signum(), &own);
        }
        for (form, (_, size)) in self.signals.iter().zip(&inputs.signals) {
            let Some(model) = form.taylor(0, stretch, budget)? else { return Ok(false) };
            let greatest = Interval::point(model.range().abs_hi());
            total.add_constant(&greatest.mul(&Interval::rational(size, stretch.bits), stretch.bits));
        }
        Ok(total.range().hi().sign() == Ordering::Less)
    }
}

/// An upper bound of base + what the starts add.
fn with_starts(base: &Taylor, models: &[Taylor], shape: &Shape) -> Dyadic {
    let bits = base.bits;
    let one = Rational::one();
    match shape {
        Shape::Sum => {
            let mut total = base.clone();
            for model in models {
                match model.sign() {
                    Some(Ordering::Less) => total.add_multiple(&-&one, model),
                    Some(Ordering::Equal) => {}
                    Some(Ordering::Greater) => total.add_multiple(&one, model),
                    None => total.add_constant(&Interval::point(model.range().abs_hi())),
                }
            }
            total.range().hi().clone()
        }
        Shape::Hull => {
            let corner = |model: &Taylor| {
                let mut total = base.clone();
                total.add_multiple(&one, model);
                total.range().hi().clone()
            };
            models.iter().map(corner).fold(base.range().hi().clone(), Dyadic::max)
        }
        Shape::Ellipsoid(weights) => {
            let mut square = Taylor::zero(1, &base.half_width, bits);
            for (weight, model) in weights.iter().zip(models) {
                square.add_multiple(weight, &model.mul(model));
            }
            // Lemma: sqrt(q) <= (q / s + s) / 2 for each s > 0 (arithmetic and geometric mean), nearly equal where s^2 is near q.
            let near = square.coefficients.first().map_or_else(Dyadic::zero, |c| c.hi().sqrt_up(bits));
            let mut total = base.clone();
            match Interval::point(near.clone()).recip(bits) {
                Some(inverse) => {
                    total.add_scaled(&inverse.scale(-1), &square);
                    total.add_constant(&Interval::point(near.scale(-1)));
                }
                None => total.add_constant(&Interval::point(square.range().hi().sqrt_up(bits))),
            }
            total.range().hi().clone()
        }
    }
}
