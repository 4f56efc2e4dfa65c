//! The shipped cells, derived from measured runs.
//!
//! Nothing is fitted to the run a cell is judged on. Open-circuit voltage: the voltage of the slow run,
//! raised by its own drop. Resistance in steady discharge: for the polymer pouch, the difference of two
//! rates at the same charge; for the others, the first minute of the fast run, with what comes after the
//! minute in the polymer pouch's proportion. The split into an ohmic part and branches: linear least
//! squares on the first minute, time constants given.

use strikeline_core::math::exp;

/// State-of-charge places of a derived curve.
pub const PLACES: [f64; 28] = [
    0.0, 0.01, 0.02, 0.03, 0.05, 0.07, 0.10, 0.13, 0.16, 0.20, 0.25, 0.30, 0.35, 0.40, 0.45, 0.50, 0.55,
    0.60, 0.65, 0.70, 0.75, 0.80, 0.85, 0.90, 0.95, 0.98, 0.99, 1.0,
];

/// Time constants of the three branches, in s. Our choice: a second, half a minute, minutes.
pub const TAUS: [f64; 3] = [1.5, 30.0, 250.0];

/// A measured run.
#[derive(Debug, Clone)]
pub struct Run {
    /// Time, in s.
    pub time_s: Vec<f64>,
    /// Current, in A.
    pub current_a: Vec<f64>,
    /// Voltage, in V; empty where the file has none.
    pub voltage_v: Vec<f64>,
    /// Surface temperature, in °C; empty where the file has none.
    pub temperature_c: Vec<f64>,
}

impl Run {
    /// From a text with a header of `time_s,current_A,…`.
    ///
    /// # Panics
    /// On a text that is not one: the files are our own.
    pub fn read(text: &str) -> Self {
        let mut lines = text.lines();
        let header: Vec<&str> = lines.next().expect("a header").split(',').collect();
        let column = |name: &str| header.iter().position(|h| *h == name);
        let mut columns = vec![Vec::new(); header.len()];
        for line in lines.filter(|l| !l.trim().is_empty()) {
            for (values, cell) in columns.iter_mut().zip(line.split(',')) {
                values.push(cell.trim().parse::<f64>().expect("a number"));
            }
        }
        let take = |name: &str| column(name).map(|k| columns[k].clone()).unwrap_or_default();
        Self {
            time_s: take("time_s"),
            current_a: take("current_A"),
            voltage_v: take("voltage_V"),
            temperature_c: take("temperature_degC"),
        }
    }

    /// Charge removed up to each row, in Ah.
    pub fn removed_ah(&self) -> Vec<f64> {
        let mut sum = 0.0;
        let mut out = vec![0.0];
        for k in 1..self.time_s.len() {
            sum += (self.time_s[k] - self.time_s[k - 1]) * self.current_a[k] / 3600.0;
            out.push(sum);
        }
        out
    }
}

/// Straight line between points, constant outside.
pub fn between(x: &[f64], y: &[f64], at: f64) -> f64 {
    let k = x.partition_point(|&v| v <= at);
    if k == 0 {
        return y[0];
    }
    if k == x.len() {
        return y[k - 1];
    }
    let w = (at - x[k - 1]) / (x[k] - x[k - 1]);
    y[k - 1] + w * (y[k] - y[k - 1])
}

/// A derived cell, at the measured cell's own size.
#[derive(Debug, Clone)]
pub struct Derived {
    /// Capacity from full to the end of the slow run, in Ah.
    pub capacity_ah: f64,
    /// Open-circuit voltage at [`PLACES`], in V.
    pub ocv_v: Vec<f64>,
    /// Ohmic resistance, in Ω.
    pub r0_ohm: f64,
    /// Branch resistances at half charge, in Ω.
    pub branches_ohm: [f64; 3],
    /// Factor on the branches at [`PLACES`].
    pub branch_shape: Vec<f64>,
    /// Resistance in steady discharge at half charge over that after a minute.
    pub steady_over_minute: f64,
    /// Heat capacity in J/K and cooling in W/K, where a thermal run was given.
    pub thermal: Option<(f64, f64)>,
}

/// Resistance in steady discharge over the state of charge from two rates, in Ω.
fn steady(slow: &Run, fast: &Run, capacity: f64) -> Vec<f64> {
    let (q_slow, q_fast) = (slow.removed_ah(), fast.removed_ah());
    let (i_slow, i_fast) = (typical(&slow.current_a), typical(&fast.current_a));
    let at = |z: f64| {
        let q = (1.0 - z) * capacity;
        (between(&q_slow, &slow.voltage_v, q) - between(&q_fast, &fast.voltage_v, q)) / (i_fast - i_slow)
    };
    // The fast run ends first: below that its last place goes on rising as between the last two.
    let end = 1.0 - q_fast.last().expect("rows") / capacity;
    let lowest = PLACES.iter().position(|&z| z > end).expect("a place inside");
    let slope = (at(PLACES[lowest]) - at(PLACES[lowest + 1])) / (PLACES[lowest + 1] - PLACES[lowest]);
    // Near full neither run has settled yet: what stands at 85 % is the least there.
    let settled = at(0.85);
    PLACES
        .iter()
        .map(|&z| match z {
            z if z <= end => at(PLACES[lowest]) + slope * (PLACES[lowest] - z),
            z if z > 0.85 => at(z.min(0.95)).max(settled),
            z => at(z),
        })
        .collect()
}

fn typical(values: &[f64]) -> f64 {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted[sorted.len() / 2]
}

/// The split into an ohmic part and three branches whose sum in steady discharge is `steady`.
///
/// - `rise`: (time in s, resistance in Ω) in the first minute, the fall of the open-circuit voltage
///   taken off.
fn split(rise: &[(f64, f64)], steady: f64) -> (f64, [f64; 3]) {
    // A branch that comes out negative is none: it is left out and the rest solved again.
    let mut kept = [true; 3];
    loop {
        let x = least_squares(rise, steady, kept);
        match (1..3).find(|&j| x[j] < 0.0) {
            Some(j) => kept[j] = false,
            None => return (x[0], [x[1], x[2], steady - x[0] - x[1] - x[2]]),
        }
    }
}

/// R0, r1 and r2 of [`split`], those not kept at 0.
fn least_squares(rise: &[(f64, f64)], steady: f64, kept: [bool; 3]) -> [f64; 3] {
    let mut m = [[0.0; 4]; 3];
    for &(t, r) in rise {
        let grown = TAUS.map(|tau| 1.0 - exp(-t / tau));
        // r = R0 + r1·g1 + r2·g2 + (steady − R0 − r1 − r2)·g3
        let a = [1.0 - grown[2], grown[0] - grown[2], grown[1] - grown[2]];
        let rest = r - steady * grown[2];
        for j in 0..3 {
            for k in 0..3 {
                m[j][k] += a[j] * a[k];
            }
            m[j][3] += a[j] * rest;
        }
    }
    for j in (0..3).filter(|&j| !kept[j]) {
        m[j] = [0.0; 4];
        m[j][j] = 1.0;
    }
    // Gauss on three equations; the basis is well conditioned with points from 1 to 60 s.
    for j in 0..3 {
        for k in j + 1..3 {
            let f = m[k][j] / m[j][j];
            let pivot = m[j];
            for (value, above) in m[k].iter_mut().zip(pivot).skip(j) {
                *value -= f * above;
            }
        }
    }
    let mut x = [0.0; 3];
    for j in (0..3).rev() {
        let tail: f64 = (j + 1..3).map(|k| m[j][k] * x[k]).sum();
        x[j] = (m[j][3] - tail) / m[j][j];
    }
    x
}

/// The rise of the resistance in the first minute of a run.
fn first_minute(run: &Run, capacity: f64, ocv: &[f64], full_v: f64) -> Vec<(f64, f64)> {
    let current = typical(&run.current_a);
    let removed = run.removed_ah();
    [1.0, 2.0, 3.0, 5.0, 10.0, 20.0, 30.0, 45.0, 59.0]
        .map(|t| {
            let k = run.time_s.partition_point(|&x| x < t).min(run.time_s.len() - 1);
            let fall = full_v - between(&PLACES, ocv, 1.0 - removed[k] / capacity).min(full_v);
            (run.time_s[k], (full_v - run.voltage_v[k] - fall) / current)
        })
        .to_vec()
}

/// Heat capacity and cooling from a discharge with its cool-down.
///
/// The cool-down gives the time constant, by a straight line through the logarithm; the discharge
/// gives the heat capacity, by least squares of the rise on the heat.
fn thermal(run: &Run, cooling: &Run, cell: &Derived, entropy: &[(f64, f64)]) -> (f64, f64) {
    let ambient = cooling.temperature_c.iter().copied().fold(f64::INFINITY, f64::min) - 0.02;
    let begin = cooling.current_a.iter().rposition(|&i| i > 0.0).expect("a discharge") + 1;
    let (mut n, mut st, mut sl, mut stt, mut stl) = (0.0, 0.0, 0.0, 0.0, 0.0);
    for k in begin..cooling.time_s.len() - 1 {
        let t = cooling.time_s[k] - cooling.time_s[begin];
        let l = strikeline_core::math::ln(cooling.temperature_c[k] - ambient);
        n += 1.0;
        st += t;
        sl += l;
        stt += t * t;
        stl += t * l;
    }
    let tau = -(n * stt - st * st) / (n * stl - st * sl);
    let removed = run.removed_ah();
    let (x, y): (Vec<f64>, Vec<f64>) = entropy.iter().copied().unzip();
    let (mut response, mut top, mut bottom) = (0.0, 0.0, 0.0);
    for k in 1..run.time_s.len() {
        let h = run.time_s[k] - run.time_s[k - 1];
        let z = (1.0 - removed[k - 1] / cell.capacity_ah).max(0.0);
        let i = run.current_a[k];
        let heat = i * (between(&PLACES, &cell.ocv_v, z) - run.voltage_v[k - 1])
            - i * (run.temperature_c[k - 1] + 273.15) * between(&x, &y, z);
        let decay = exp(-h / tau);
        response = response * decay + heat * tau * (1.0 - decay);
        top += response * response;
        bottom += response * (run.temperature_c[k] - run.temperature_c[0]);
    }
    let capacity = top / bottom;
    (capacity, capacity / tau)
}

/// `dU/dT` of an LCO pouch over the state of charge, in V/K.
///
/// Source: Ai et al., J. Electrochem. Soc. 167 (2020) 013512, entropic fits.
pub const LCO_ENTROPY: [(f64, f64); 7] = [
    (0.0, -0.449e-3),
    (0.1, -0.534e-3),
    (0.2, -0.479e-3),
    (0.5, -0.248e-3),
    (0.8, -0.153e-3),
    (0.9, -0.097e-3),
    (1.0, -0.046e-3),
];

/// The polymer pouch, from its 0.1 It and 0.5 It runs.
pub fn lco_pouch() -> Derived {
    let slow = Run::read(include_str!("../data/cells/enertech_lco_pouch_cc_0p1C.csv"));
    let fast = Run::read(include_str!("../data/cells/enertech_lco_pouch_cc_0p5C.csv"));
    let cooling = Run::read(include_str!("../data/cells/enertech_lco_pouch_thermal_0p5C.csv"));
    let removed = slow.removed_ah();
    let capacity = *removed.last().expect("rows");
    let resistance = steady(&slow, &fast, capacity);
    let i_slow = typical(&slow.current_a);
    let full = slow.voltage_v[0];
    let mut ocv: Vec<f64> = PLACES
        .iter()
        .zip(&resistance)
        .map(|(&z, r)| between(&removed, &slow.voltage_v, (1.0 - z) * capacity) + i_slow * r)
        .collect();
    *ocv.last_mut().expect("places") = full;
    let half = between(&PLACES, &resistance, 0.5);
    let rise = first_minute(&fast, capacity, &ocv, full);
    let (r0, branches) = split(&rise, half);
    let minute = rise.last().expect("points").1;
    let shape = resistance.iter().map(|r| (r - r0) / (half - r0)).collect();
    let mut cell = Derived {
        capacity_ah: capacity,
        ocv_v: ocv,
        r0_ohm: r0,
        branches_ohm: branches,
        branch_shape: shape,
        steady_over_minute: half / minute,
        thermal: None,
    };
    cell.thermal = Some(thermal(&fast, &cooling, &cell, &LCO_ENTROPY));
    cell
}

/// `R(s)/R(0.5)` of a polymer cell: nothing near empty is in a first minute, so it is taken from print.
///
/// Source: M. Chen, G. A. Rincón-Mora, IEEE Trans. Energy Conversion 21 (2006), `R_series(s)`.
fn published_shape(z: f64) -> f64 {
    let r = |s: f64| 0.1562 * exp(-24.37 * s) + 0.07446;
    r(z) / r(0.5)
}

/// A cell from its C/20 run and the first minute of its 1C run.
fn from_first_minute(slow: &Run, fast: &Run, steady_over_minute: f64) -> Derived {
    let removed = slow.removed_ah();
    let capacity = *removed.last().expect("rows");
    let i_slow = typical(&slow.current_a);
    let full = slow.voltage_v[0];
    let raw: Vec<f64> =
        PLACES.iter().map(|&z| between(&removed, &slow.voltage_v, (1.0 - z) * capacity)).collect();
    // The drop of the slow run itself is taken off in a second round.
    let minute = first_minute_against(fast, slow, &removed).last().expect("points").1;
    let steady = minute * steady_over_minute;
    let ocv: Vec<f64> =
        PLACES.iter().zip(&raw).map(|(&z, v)| (v + i_slow * steady * published_shape(z)).min(full)).collect();
    let mut ocv = ocv;
    *ocv.last_mut().expect("places") = full;
    let (r0, branches) = split(&first_minute_against(fast, slow, &removed), steady);
    Derived {
        capacity_ah: capacity,
        ocv_v: ocv,
        r0_ohm: r0,
        branches_ohm: branches,
        branch_shape: PLACES.iter().map(|&z| published_shape(z)).collect(),
        steady_over_minute,
        thermal: None,
    }
}

/// The rise in the first minute against the slow run at the same charge: near full the slow run's own
/// transient is in both.
fn first_minute_against(fast: &Run, slow: &Run, removed_slow: &[f64]) -> Vec<(f64, f64)> {
    let current = typical(&fast.current_a) - typical(&slow.current_a);
    let removed = fast.removed_ah();
    [1.0, 2.0, 3.0, 5.0, 10.0, 20.0, 30.0, 45.0, 59.0]
        .map(|t| {
            let k = fast.time_s.partition_point(|&x| x < t).min(fast.time_s.len() - 1);
            let slow_v = between(removed_slow, &slow.voltage_v, removed[k]);
            (fast.time_s[k], (slow_v - fast.voltage_v[k]) / current)
        })
        .to_vec()
}

/// The NMC pouch.
pub fn nmc_pouch() -> Derived {
    from_first_minute(
        &Run::read(include_str!("../data/cells/ae_nmc111_pouch_cc_0p05C.csv")),
        &Run::read(include_str!("../data/cells/ae_nmc111_pouch_cc_1C.csv")),
        lco_pouch().steady_over_minute,
    )
}

/// The LFP cylinder.
pub fn lfp_cylinder() -> Derived {
    from_first_minute(
        &Run::read(include_str!("../data/cells/ae_lfp_18650_cc_0p05C.csv")),
        &Run::read(include_str!("../data/cells/ae_lfp_18650_cc_1C.csv")),
        lco_pouch().steady_over_minute,
    )
}
