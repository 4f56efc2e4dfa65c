//! One step of the Dormand–Prince pair of orders 5 and 4, with its fourth-order interpolant.
//!
//! The caller keeps the step size and decides what an error means; sums that do not feed back
//! (energies, charge) ride along with the weights of order 5 and cost no stage.
//!
//! Source: J. R. Dormand, P. J. Prince, J. Comput. Appl. Math. 6 (1980) 19–26; the interpolant as in
//! E. Hairer, S. P. Nørsett, G. Wanner, Solving Ordinary Differential Equations I, 2nd ed., II.6.

const C: [f64; 5] = [1.0 / 5.0, 3.0 / 10.0, 4.0 / 5.0, 8.0 / 9.0, 1.0];
const A2: [f64; 1] = [1.0 / 5.0];
const A3: [f64; 2] = [3.0 / 40.0, 9.0 / 40.0];
const A4: [f64; 3] = [44.0 / 45.0, -56.0 / 15.0, 32.0 / 9.0];
const A5: [f64; 4] = [19372.0 / 6561.0, -25360.0 / 2187.0, 64448.0 / 6561.0, -212.0 / 729.0];
const A6: [f64; 5] = [9017.0 / 3168.0, -355.0 / 33.0, 46732.0 / 5247.0, 49.0 / 176.0, -5103.0 / 18656.0];
const B: [f64; 6] = [35.0 / 384.0, 0.0, 500.0 / 1113.0, 125.0 / 192.0, -2187.0 / 6784.0, 11.0 / 84.0];
/// Weights of order 5 less those of order 4.
const E: [f64; 7] =
    [71.0 / 57600.0, 0.0, -71.0 / 16695.0, 71.0 / 1920.0, -17253.0 / 339_200.0, 22.0 / 525.0, -1.0 / 40.0];
const D: [f64; 7] = [
    -12_715_105_075.0 / 11_282_082_432.0,
    0.0,
    87_487_479_700.0 / 32_700_410_799.0,
    -10_690_763_975.0 / 1_880_347_072.0,
    701_980_252_875.0 / 199_316_789_632.0,
    -1_453_857_185.0 / 822_651_844.0,
    69_997_945.0 / 29_380_423.0,
];

/// What the right-hand side gives at one place: the rates of the state and of the sums beside it.
pub(crate) trait Rates<const N: usize, const Q: usize>: Copy {
    fn rate(&self) -> &[f64; N];
    fn flow(&self) -> [f64; Q];
}

/// A step that has been computed, not yet taken.
pub(crate) struct Step<P, const N: usize, const Q: usize> {
    pub(crate) h: f64,
    pub(crate) from: [f64; N],
    pub(crate) to: [f64; N],
    /// The right-hand side at the end.
    pub(crate) last: P,
    /// Difference between the two orders.
    pub(crate) error: [f64; N],
    /// Growth of the sums.
    pub(crate) sums: [f64; Q],
    rates: [[f64; N]; 7],
}

fn along<const N: usize, const K: usize>(
    y: &[f64; N],
    h: f64,
    a: &[f64; K],
    rates: &[[f64; N]; 7],
) -> [f64; N] {
    let mut out = *y;
    for n in 0..N {
        let mut sum = 0.0;
        for k in 0..K {
            sum += a[k] * rates[k][n];
        }
        out[n] += h * sum;
    }
    out
}

/// One step of length `h` from `y` at `t`, where `first` is the right-hand side there.
#[inline]
pub(crate) fn step<P: Rates<N, Q>, const N: usize, const Q: usize>(
    y: &[f64; N],
    t: f64,
    h: f64,
    first: &P,
    mut at: impl FnMut(&[f64; N], f64) -> P,
) -> Step<P, N, Q> {
    let mut rates = [[0.0; N]; 7];
    let mut sums = [0.0; Q];
    let mut add = |weight: f64, p: &P| {
        let flow = p.flow();
        for q in 0..Q {
            sums[q] += h * weight * flow[q];
        }
    };
    rates[0] = *first.rate();
    add(B[0], first);
    let p = at(&along(y, h, &A2, &rates), t + C[0] * h);
    rates[1] = *p.rate();
    let p = at(&along(y, h, &A3, &rates), t + C[1] * h);
    rates[2] = *p.rate();
    add(B[2], &p);
    let p = at(&along(y, h, &A4, &rates), t + C[2] * h);
    rates[3] = *p.rate();
    add(B[3], &p);
    let p = at(&along(y, h, &A5, &rates), t + C[3] * h);
    rates[4] = *p.rate();
    add(B[4], &p);
    let p = at(&along(y, h, &A6, &rates), t + C[4] * h);
    rates[5] = *p.rate();
    add(B[5], &p);
    let to = along(y, h, &B, &rates);
    let last = at(&to, t + h);
    rates[6] = *last.rate();
    let mut error = [0.0; N];
    for n in 0..N {
        for k in 0..7 {
            error[n] += h * E[k] * rates[k][n];
        }
    }
    Step { h, from: *y, to, last, error, sums, rates }
}

impl<P, const N: usize, const Q: usize> Step<P, N, Q> {
    /// The state at the fraction `x` of the step, 0 to 1.
    pub(crate) fn at(&self, x: f64) -> [f64; N] {
        let w = 1.0 - x;
        core::array::from_fn(|n| {
            let rise = self.to[n] - self.from[n];
            let first = self.h * self.rates[0][n] - rise;
            let last = rise - self.h * self.rates[6][n] - first;
            let bend: f64 = self.rates.iter().zip(D).map(|(rates, d)| d * rates[n]).sum();
            self.from[n] + x * (rise + w * (first + x * (last + w * self.h * bend)))
        })
    }
}
