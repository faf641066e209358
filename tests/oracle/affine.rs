//! Quantities as affine forms of free parameters, and what an equation does to them.

use super::Rat;

/// `constant + Σ coefficients · parameters`.
#[derive(Debug, Clone, PartialEq)]
pub struct Form {
    /// One for each parameter.
    pub coefficients: Vec<Rat>,
    /// The rest.
    pub constant: Rat,
}

impl Form {
    /// The parameter `at` of `count`.
    pub fn parameter(at: usize, count: usize) -> Self {
        let mut form = Form { coefficients: vec![Rat::zero(); count], constant: Rat::zero() };
        form.coefficients[at] = Rat::one();
        form
    }

    /// Adds `factor` times another form.
    pub fn add(&mut self, other: &Form, factor: &Rat) {
        if factor.is_zero() {
            return;
        }
        for (mine, its) in self.coefficients.iter_mut().zip(&other.coefficients) {
            if !its.is_zero() {
                *mine += its * factor;
            }
        }
        if !other.constant.is_zero() {
            self.constant += &other.constant * factor;
        }
    }

    /// The first parameter it depends on.
    pub fn first(&self) -> Option<usize> {
        self.coefficients.iter().position(|c| !c.is_zero())
    }

    /// Replaces a parameter by a form that does not contain it.
    pub fn substitute(&mut self, step: &Step) {
        let factor = std::mem::take(&mut self.coefficients[step.parameter]);
        self.add(&step.form, &factor);
    }

    /// The form with the other sign.
    pub fn negated(&self) -> Form {
        Form { coefficients: self.coefficients.iter().map(|c| -c).collect(), constant: -&self.constant }
    }

    /// The form written in some of the parameters, on which alone it depends.
    pub fn only(&self, live: &[usize]) -> Form {
        let coefficients = live.iter().map(|&p| self.coefficients[p].clone()).collect();
        Form { coefficients, constant: self.constant.clone() }
    }

    /// The sign of its value, where that depends on no parameter; 0 where it does.
    pub fn sign(&self) -> i8 {
        match (self.first(), self.constant.is_positive(), self.constant.is_negative()) {
            (Some(_), _, _) | (None, false, false) => 0,
            (None, true, _) => 1,
            (None, _, true) => -1,
        }
    }

    /// The form with another constant added.
    pub fn plus(&self, constant: &Rat) -> Form {
        let mut form = self.clone();
        form.constant += constant;
        form
    }
}

/// A parameter that an equation has fixed in terms of the others.
#[derive(Debug, Clone)]
pub struct Step {
    parameter: usize,
    form: Form,
}

/// What `form = 0` says.
pub enum Equation {
    /// Nothing new.
    Holds,
    /// A contradiction.
    Fails,
    /// A parameter follows from the others.
    Fixes(Step),
}

/// Reads the equation `form = 0`.
pub fn equate(form: &Form) -> Equation {
    let Some(parameter) = form.first() else {
        return if form.constant.is_zero() { Equation::Holds } else { Equation::Fails };
    };
    let factor = -form.coefficients[parameter].recip();
    let mut solved = Form { coefficients: vec![Rat::zero(); form.coefficients.len()], constant: Rat::zero() };
    solved.add(form, &factor);
    solved.coefficients[parameter] = Rat::zero();
    Equation::Fixes(Step { parameter, form: solved })
}
