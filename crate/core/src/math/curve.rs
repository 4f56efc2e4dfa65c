//! Curves through points: straight lines, and the monotone piecewise cubic for open-circuit voltage.
//!
//! Both are checked once, where they are built; after that a value cannot fail. Outside their
//! points both are constant.

/// Why a list of points is not a curve. One variant, one thing to fix.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
pub enum CurveError {
    /// Too few points.
    #[error("a curve needs at least {min} points, not {got}")]
    TooFew {
        /// How many there are.
        got: usize,
        /// How many are needed.
        min: usize,
    },
    /// One list is longer than the other.
    #[error("{x} places but {y} values")]
    Unequal {
        /// Number of places.
        x: usize,
        /// Number of values.
        y: usize,
    },
    /// Something is not a finite number.
    #[error("point {index} is not a finite number")]
    NotFinite {
        /// Which point, from 0.
        index: usize,
    },
    /// The places do not rise.
    #[error("place {index} does not rise above the one before it")]
    NotRising {
        /// Which point, from 0.
        index: usize,
    },
}

fn check(x: &[f64], y: &[f64], min: usize) -> Result<(), CurveError> {
    if x.len() != y.len() {
        return Err(CurveError::Unequal { x: x.len(), y: y.len() });
    }
    if x.len() < min {
        return Err(CurveError::TooFew { got: x.len(), min });
    }
    for (index, (a, b)) in x.iter().zip(y).enumerate() {
        if !a.is_finite() || !b.is_finite() {
            return Err(CurveError::NotFinite { index });
        }
    }
    match (1..x.len()).find(|&k| x[k] <= x[k - 1]) {
        Some(index) => Err(CurveError::NotRising { index }),
        None => Ok(()),
    }
}

/// As [`piece`], trying the piece that was right last time first.
fn piece_near(xs: &[f64], x: f64, last: &core::cell::Cell<usize>) -> usize {
    let k = last.get();
    if k + 1 < xs.len() && xs[k] <= x && x < xs[k + 1] {
        return k;
    }
    let k = piece(xs, x);
    last.set(k);
    k
}

/// Which piece of a curve holds `x`: the last knot at or below it, kept inside the pieces.
fn piece(xs: &[f64], x: f64) -> usize {
    let above = xs.partition_point(|&knot| knot <= x);
    above.clamp(1, xs.len() - 1) - 1
}

/// One straight piece of a curve: `y = at + slope·(x − from)` for `from ≤ x ≤ to`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Segment {
    /// Where the piece begins; −∞ for the constant piece before the first point.
    pub from: f64,
    /// Where the piece ends; +∞ for the constant piece after the last point.
    pub to: f64,
    /// A place on the piece from which `slope` counts.
    pub x0: f64,
    /// Value at `x0`.
    pub y0: f64,
    /// Rise per unit of x.
    pub slope: f64,
}

/// Straight lines between points, constant outside them.
#[derive(Debug, Clone, PartialEq)]
pub struct Polyline {
    x: Vec<f64>,
    y: Vec<f64>,
    /// Slope of each piece, one fewer than the points.
    slope: Vec<f64>,
}

impl Polyline {
    /// Through the points (x, y), x rising; at least one point.
    ///
    /// # Errors
    /// Unequal lengths, no point, a number that is not finite, or places that do not rise.
    pub fn new(x: Vec<f64>, y: Vec<f64>) -> Result<Self, CurveError> {
        check(&x, &y, 1)?;
        let slope = (1..x.len()).map(|k| (y[k] - y[k - 1]) / (x[k] - x[k - 1])).collect();
        Ok(Self { x, y, slope })
    }

    /// The same value everywhere. A value that is not finite is taken as it is.
    pub fn constant(value: f64) -> Self {
        Self { x: vec![0.0], y: vec![value], slope: vec![] }
    }

    /// The places.
    pub fn x(&self) -> &[f64] {
        &self.x
    }

    /// The values.
    pub fn y(&self) -> &[f64] {
        &self.y
    }

    /// The piece that holds `x`; at a knot, the piece above it.
    pub fn segment(&self, x: f64) -> Segment {
        let (xs, ys) = (&self.x, &self.y);
        let last = xs.len() - 1;
        // What is not a number belongs to no piece; the first one answers with the same.
        if x < xs[0] || x.is_nan() {
            return Segment { from: f64::NEG_INFINITY, to: xs[0], x0: xs[0], y0: ys[0], slope: 0.0 };
        }
        if x >= xs[last] {
            return Segment { from: xs[last], to: f64::INFINITY, x0: xs[last], y0: ys[last], slope: 0.0 };
        }
        let k = piece(xs, x);
        Segment { from: xs[k], to: xs[k + 1], x0: xs[k], y0: ys[k], slope: self.slope[k] }
    }

    /// The value at `x`.
    pub fn at(&self, x: f64) -> f64 {
        self.at_with_slope(x).0
    }

    /// Value and slope at `x`; outside the points the slope is 0.
    pub fn at_with_slope(&self, x: f64) -> (f64, f64) {
        let s = self.segment(x);
        (s.y0 + s.slope * (x - s.x0), s.slope)
    }

    /// As [`Polyline::at_with_slope`], for places that move little from call to call.
    #[inline]
    pub(crate) fn at_near(&self, x: f64, last: &core::cell::Cell<usize>) -> (f64, f64) {
        if self.slope.is_empty() {
            // A constant; what is not a number stays so.
            return (if x.is_nan() { x } else { self.y[0] }, 0.0);
        }
        let k = last.get();
        if let (Some(&from), Some(&to), Some(&slope), Some(&y)) =
            (self.x.get(k), self.x.get(k + 1), self.slope.get(k), self.y.get(k))
            && from <= x
            && x < to
        {
            return (y + slope * (x - from), slope);
        }
        self.at_far(x, last)
    }

    /// The same where the last piece is not the one.
    fn at_far(&self, x: f64, last: &core::cell::Cell<usize>) -> (f64, f64) {
        let end = self.x.len() - 1;
        if x.is_nan() {
            return (x, 0.0);
        }
        if x < self.x[0] {
            return (self.y[0], 0.0);
        }
        if x >= self.x[end] {
            return (self.y[end], 0.0);
        }
        let k = piece(&self.x, x);
        last.set(k);
        (self.y[k] + self.slope[k] * (x - self.x[k]), self.slope[k])
    }
}

/// The monotone piecewise cubic of Fritsch and Carlson, constant outside its points.
///
/// Inner slopes are the weighted harmonic mean of the neighbours' (Fritsch and Butland 1984), the
/// ends a three-point formula limited so that the curve keeps its shape, as general numeric
/// libraries do it.
///
/// Source: F. N. Fritsch, R. E. Carlson, SIAM J. Numer. Anal. 17 (1980) 238–246.
#[derive(Debug, Clone, PartialEq)]
pub struct Monotone {
    x: Vec<f64>,
    y: Vec<f64>,
    /// The cubic of each piece in powers of the distance from its left knot.
    cubic: Vec<[f64; 4]>,
}

impl Monotone {
    /// Through the points (x, y), x rising; at least two points.
    ///
    /// # Errors
    /// Unequal lengths, fewer than two points, a number that is not finite, or places that do not
    /// rise.
    pub fn new(x: Vec<f64>, y: Vec<f64>) -> Result<Self, CurveError> {
        check(&x, &y, 2)?;
        let slope = slopes(&x, &y);
        let cubic = (0..x.len() - 1)
            .map(|k| {
                let h = x[k + 1] - x[k];
                let secant = (y[k + 1] - y[k]) / h;
                let (d0, d1) = (slope[k], slope[k + 1]);
                [y[k], d0, (3.0 * secant - 2.0 * d0 - d1) / h, (d0 + d1 - 2.0 * secant) / (h * h)]
            })
            .collect();
        Ok(Self { x, y, cubic })
    }

    /// The places.
    pub fn x(&self) -> &[f64] {
        &self.x
    }

    /// The values.
    pub fn y(&self) -> &[f64] {
        &self.y
    }

    /// The value at `x`.
    pub fn at(&self, x: f64) -> f64 {
        self.at_with_slope(x).0
    }

    /// Value and slope at `x`; outside the points the slope is 0.
    pub fn at_with_slope(&self, x: f64) -> (f64, f64) {
        let last = self.x.len() - 1;
        if x < self.x[0] {
            return (self.y[0], 0.0);
        }
        if x > self.x[last] {
            return (self.y[last], 0.0);
        }
        let k = piece(&self.x, x);
        let c = self.cubic[k];
        let d = x - self.x[k];
        (c[0] + d * (c[1] + d * (c[2] + d * c[3])), c[1] + d * (2.0 * c[2] + 3.0 * d * c[3]))
    }

    /// As [`Monotone::at_with_slope`], for places that move little from call to call.
    pub(crate) fn at_near(&self, x: f64, last: &core::cell::Cell<usize>) -> (f64, f64) {
        let end = self.x.len() - 1;
        if x < self.x[0] || x > self.x[end] {
            return self.at_with_slope(x);
        }
        let k = piece_near(&self.x, x, last);
        let c = self.cubic[k];
        let d = x - self.x[k];
        (c[0] + d * (c[1] + d * (c[2] + d * c[3])), c[1] + d * (2.0 * c[2] + 3.0 * d * c[3]))
    }

    /// ∫ y dx from `a` to `b`, exact piece by piece; `a` and `b` inside the points.
    pub fn integral(&self, a: f64, b: f64) -> f64 {
        if b < a {
            return -self.integral(b, a);
        }
        let mut sum = 0.0;
        for k in 0..self.x.len() - 1 {
            let (from, to) = (a.max(self.x[k]), b.min(self.x[k + 1]));
            if from < to {
                let c = self.cubic[k];
                let primitive = |d: f64| d * (c[0] + d * (c[1] / 2.0 + d * (c[2] / 3.0 + d * c[3] / 4.0)));
                sum += primitive(to - self.x[k]) - primitive(from - self.x[k]);
            }
        }
        sum
    }
}

fn slopes(x: &[f64], y: &[f64]) -> Vec<f64> {
    let n = x.len();
    let h: Vec<f64> = (1..n).map(|k| x[k] - x[k - 1]).collect();
    let secant: Vec<f64> = (1..n).map(|k| (y[k] - y[k - 1]) / h[k - 1]).collect();
    if n == 2 {
        return vec![secant[0]; 2];
    }
    let mut d = vec![0.0; n];
    for k in 1..n - 1 {
        let (left, right) = (secant[k - 1], secant[k]);
        if left * right > 0.0 {
            let w1 = 2.0 * h[k] + h[k - 1];
            let w2 = h[k] + 2.0 * h[k - 1];
            d[k] = (w1 + w2) / (w1 / left + w2 / right);
        }
    }
    d[0] = end_slope(h[0], h[1], secant[0], secant[1]);
    d[n - 1] = end_slope(h[n - 2], h[n - 3], secant[n - 2], secant[n - 3]);
    d
}

/// The three-point slope at an end, limited to keep the curve's shape.
fn end_slope(h0: f64, h1: f64, secant0: f64, secant1: f64) -> f64 {
    let d = ((2.0 * h0 + h1) * secant0 - h0 * secant1) / (h0 + h1);
    if d * secant0 <= 0.0 {
        0.0
    } else if secant0 * secant1 < 0.0 && d.abs() > 3.0 * secant0.abs() {
        3.0 * secant0
    } else {
        d
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_polyline_is_constant_outside_and_straight_inside() {
        let p = Polyline::new(vec![1.0, 2.0, 4.0], vec![10.0, 20.0, 0.0]).expect("three points");
        let got: Vec<f64> = [0.0, 1.0, 1.5, 2.0, 3.0, 4.0, 9.0].iter().map(|&x| p.at(x)).collect();
        assert_eq!(got, [10.0, 10.0, 15.0, 20.0, 10.0, 0.0, 0.0]);
    }

    #[test]
    fn exact_what_is_not_a_number_stays_so() {
        let last = core::cell::Cell::new(0);
        assert!(Polyline::constant(1.0).at(f64::NAN).is_nan());
        assert!(Polyline::constant(1.0).at_near(f64::NAN, &last).0.is_nan());
        let p = Polyline::new(vec![0.0, 1.0], vec![0.0, 1.0]).expect("two points");
        assert!(p.at(f64::NAN).is_nan());
        let m = Monotone::new(vec![0.0, 1.0], vec![0.0, 1.0]).expect("two points");
        assert!(m.at(f64::NAN).is_nan());
    }

    #[test]
    fn exact_monotone_meets_its_points_and_does_not_overshoot() {
        let x = vec![0.0, 1.0, 2.0, 3.0, 5.0];
        let y = vec![0.0, 0.1, 2.0, 2.0, 2.5];
        let m = Monotone::new(x.clone(), y.clone()).expect("five points");
        for (a, b) in x.iter().zip(&y) {
            assert!((m.at(*a) - b).abs() < 1e-15);
        }
        let mut before = f64::NEG_INFINITY;
        for k in 0..=500 {
            let v = m.at(f64::from(k) * 0.01);
            assert!(v >= before - 1e-15, "falls at {k}");
            before = v;
        }
    }

    #[test]
    fn exact_integral_of_a_straight_line() {
        let m = Monotone::new(vec![0.0, 0.5, 2.0], vec![1.0, 2.0, 5.0]).expect("three points");
        assert!((m.integral(0.25, 1.75) - 1.5 * 3.0).abs() < 1e-14);
    }

    #[test]
    fn exact_points_are_refused_with_the_reason() {
        assert_eq!(Polyline::new(vec![1.0, 1.0], vec![0.0, 0.0]), Err(CurveError::NotRising { index: 1 }));
        assert_eq!(
            Monotone::new(vec![0.0, f64::NAN], vec![0.0, 0.0]),
            Err(CurveError::NotFinite { index: 1 })
        );
    }
}
