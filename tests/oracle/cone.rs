//! Corners and directions of {t : a·t + b ≥ 0 for each row}, by the double description method (Motzkin, Raiffa,
//! Thompson & Thrall 1953) on the homogenized cone, lines kept apart.

use super::Rat;
use super::affine::Form;

/// A point or direction; the last entry is the homogenizing coordinate.
type Vector = Vec<Rat>;

struct Ray {
    vector: Vector,
    /// Bit for each constraint that it meets with equality.
    tight: u128,
}

/// What a polyhedron is made of: all points are convex sums of corners plus sums of directions (with factors ≥ 0)
/// plus any sums of lines.
pub struct Shape {
    /// Corners, in parameter space.
    pub corners: Vec<Vector>,
    /// Directions without end.
    pub directions: Vec<Vector>,
    /// Directions without end both ways.
    pub lines: Vec<Vector>,
}

fn dot(a: &Vector, b: &Vector) -> Rat {
    let mut sum = Rat::zero();
    for (x, y) in a.iter().zip(b) {
        if !x.is_zero() && !y.is_zero() {
            sum += x * y;
        }
    }
    sum
}

/// `a − b·factor`.
fn minus(a: &Vector, b: &Vector, factor: &Rat) -> Vector {
    a.iter().zip(b).map(|(x, y)| x - y * factor).collect()
}

/// The shape of all `t` in `dimensions` dimensions at which every form is ≥ 0; nothing where there is none.
pub fn shape(forms: &[Form], dimensions: usize) -> Option<Shape> {
    let mut cone = Cone::whole(dimensions + 1);
    let mut height = vec![Rat::zero(); dimensions + 1];
    height[dimensions] = Rat::one();
    cone.cut(height);
    for form in forms {
        let mut row = form.coefficients.clone();
        row.push(form.constant.clone());
        cone.cut(row);
    }
    cone.finish(dimensions)
}

struct Cone {
    lines: Vec<Vector>,
    rays: Vec<Ray>,
    cuts: u32,
}

impl Cone {
    fn whole(size: usize) -> Self {
        let unit = |at: usize| (0..size).map(|n| if n == at { Rat::one() } else { Rat::zero() }).collect();
        Cone { lines: (0..size).map(unit).collect(), rays: Vec::new(), cuts: 0 }
    }

    /// Keeps what lies on the side row · x ≥ 0.
    fn cut(&mut self, row: Vector) {
        let bit = 1u128 << self.cuts;
        self.cuts += 1;
        if let Some(at) = self.lines.iter().position(|line| !dot(&row, line).is_zero()) {
            self.cut_line(&row, at, bit);
        } else {
            self.cut_rays(&row, bit);
        }
    }

    /// A line crosses the boundary: half of it stays, everything else is moved along it into the boundary.
    fn cut_line(&mut self, row: &Vector, at: usize, bit: u128) {
        let mut line = self.lines.swap_remove(at);
        let mut slope = dot(row, &line);
        if slope.is_negative() {
            line.iter_mut().for_each(|x| *x = -&*x);
            slope = -slope;
        }
        for other in &mut self.lines {
            *other = minus(other, &line, &(dot(row, other) / &slope));
        }
        for ray in &mut self.rays {
            ray.vector = minus(&ray.vector, &line, &(dot(row, &ray.vector) / &slope));
            ray.tight |= bit;
        }
        // a line met every constraint so far with equality
        self.rays.push(Ray { vector: line, tight: bit - 1 });
    }

    fn cut_rays(&mut self, row: &Vector, bit: u128) {
        let values: Vec<Rat> = self.rays.iter().map(|ray| dot(row, &ray.vector)).collect();
        let mut fresh = Vec::new();
        for (p, up) in values.iter().enumerate().filter(|(_, v)| v.is_positive()) {
            for (n, down) in values.iter().enumerate().filter(|(_, v)| v.is_negative()) {
                let common = self.rays[p].tight & self.rays[n].tight;
                let between = |(k, ray): (usize, &Ray)| k != p && k != n && ray.tight & common == common;
                if self.rays.iter().enumerate().any(between) {
                    continue;
                }
                let vector = minus(&self.rays[n].vector, &self.rays[p].vector, &(down / up));
                fresh.push(Ray { vector, tight: common | bit });
            }
        }
        let mut values = values.iter();
        self.rays.retain_mut(|ray| {
            let value = values.next().cloned().unwrap_or_else(Rat::zero);
            if value.is_zero() {
                ray.tight |= bit;
            }
            !value.is_negative()
        });
        self.rays.extend(fresh);
    }

    fn finish(self, dimensions: usize) -> Option<Shape> {
        let mut shape = Shape { corners: Vec::new(), directions: Vec::new(), lines: Vec::new() };
        for ray in self.rays {
            let mut vector = ray.vector;
            let height = vector.remove(dimensions);
            if height.is_zero() {
                shape.directions.push(vector);
            } else {
                vector.iter_mut().for_each(|x| *x /= &height);
                shape.corners.push(vector);
            }
        }
        shape.lines = self.lines;
        for line in &mut shape.lines {
            line.truncate(dimensions);
        }
        if shape.corners.is_empty() { None } else { Some(shape) }
    }
}
