//! A charger filling the cell: trickle, constant current, then constant voltage until its own current is low.
//!
//! The charger sits at the board's output. Between it and the cell lie, in series, the board's pair and shunt
//! (where the arrangement leaves them in the path), the cell leads with joints and fuse, and a second protector.
//! What the device draws meanwhile hangs at the charger's output too, so the charger's current is the cell's and
//! the load's together.
//!
//! Over one step the cell's current is a straight line: charge, branches and temperature then have closed forms,
//! and at constant voltage the current at the step's end is the root of one rising function. A whole step and
//! two halves are compared; that sets the step and raises the order to three. The fastest branch sets no step.
//!
//! Signs: the charge current is positive here, the opposite of a discharge. Left out: a protector that opens
//! against charging, the warming of the pair by its own current, and a charger that folds back when hot. The
//! pair's supply is the cell's inner voltage, some tens of mV below the real one in a charge.

use crate::cell::MAX_BRANCHES;
use crate::math::{exp, powf};
use crate::ratings::Charger;
use crate::setup::{Arrangement, Setup};
use crate::units::{AmpHours, Amps, Celsius, Joules, Seconds, Volts, Watts};

/// Bound on the steps that are tried in one charge; some hundreds are usual.
pub const MAX_STEPS: u32 = 20_000;
/// The charge counts as beyond what the cell's curve describes from this state of charge. Our choice.
pub const BEYOND_FULL: f64 = 1.2;
/// State of charge whose time is told.
pub const MOSTLY: f64 = 0.8;
/// About as many places as a trace has.
const TRACE_PLACES: f64 = 60.0;
/// The largest change of the state of charge in one step: the trace is drawn from the steps.
const STEP_SOC: f64 = 0.02;

/// What the charger does.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Phase {
    /// The trickle current, below the trickle threshold.
    Trickle,
    /// The constant current.
    ConstantCurrent,
    /// The float voltage.
    ConstantVoltage,
}

/// What ended a charge.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum End {
    /// The charger's own current fell below its termination current.
    Terminated,
    /// The cell takes less than the termination current, but the load keeps the charger's above it.
    NeverTerminates,
    /// Below the trickle threshold the load takes the whole trickle current or more.
    NeverRecovers,
    /// The load takes the whole charge current or more: the cell gains nothing, or is drained.
    DischargesWhileCharging,
    /// The cell's voltage curve does not reach the float voltage: the model cannot say when it is full.
    BeyondFull,
    /// The bound of work was reached.
    WorkLimit,
}

/// One place of a charge.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ChargePoint {
    /// Since the charger was connected.
    pub time: Seconds,
    /// What the charger does.
    pub phase: Phase,
    /// Voltage at the charger's output.
    pub output: Volts,
    /// Voltage at the cell's terminals.
    pub cell: Volts,
    /// Into the cell; negative where the load drains it.
    pub current: Amps,
    /// State of charge; a little above 1 where the float voltage is above the full cell's.
    pub soc: f64,
    /// Of the cell.
    pub temperature: Celsius,
}

/// Where the energy went that the charger gave out.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ChargeLedger {
    /// Given out by the charger.
    pub output: Joules,
    /// Taken by the load.
    pub load: Joules,
    /// Stored at 25 °C: the open-circuit voltage over the charge put in, from the curve itself.
    pub stored: Joules,
    /// The same, for the curve's change with temperature.
    pub entropic: Joules,
    /// Lost in `R₀`.
    pub ohmic: Joules,
    /// Taken by the slow branches; a little of it comes back after the charge.
    pub polarisation: Joules,
    /// Lost between charger and cell.
    pub path: Joules,
}

impl ChargeLedger {
    /// What is not accounted for, over what was given out; 0 when nothing was.
    pub fn residual(&self) -> f64 {
        let parts =
            self.load.0 + self.stored.0 + self.entropic.0 + self.ohmic.0 + self.polarisation.0 + self.path.0;
        let size = self.output.0.abs().max(parts.abs());
        if size > 0.0 { (self.output.0 - parts) / size } else { 0.0 }
    }
}

/// One charge by a charger.
#[derive(Debug, Clone, PartialEq)]
pub struct ChargeRun {
    /// What ended it.
    pub end: End,
    /// When it ended.
    pub time: Seconds,
    /// When the cell was at [`MOSTLY`]; `None`: it began above, or did not come there.
    pub to_mostly: Option<Seconds>,
    /// Charge put into the cell.
    pub charge: AmpHours,
    /// State of charge at the end.
    pub soc: f64,
    /// Time in trickle, constant current and constant voltage.
    pub phases: [Seconds; 3],
    /// Highest temperature of the cell.
    pub cell_temperature_max: Celsius,
    /// Largest heat in a linear charger, (V_in − V_out)·I.
    pub dissipation_max: Watts,
    /// Where the energy went.
    pub ledger: ChargeLedger,
    /// Some dozens of places, the first and the last among them.
    pub trace: Vec<ChargePoint>,
    /// Steps that were tried.
    pub steps: u32,
}

/// Where a charge begins and in what surroundings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ChargeStart {
    /// State of charge, 0 to 1; the cell is relaxed and at ambient temperature.
    pub soc: f64,
    /// Ambient temperature.
    pub ambient: Celsius,
    /// What the device draws meanwhile, 0 or more.
    pub load: Amps,
}

/// What a load that is left on does to a charge, from the charger's figures alone.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LoadLeftOn {
    /// Current into the cell at constant current; negative: it is drained while it is "charged".
    pub in_constant_current: Amps,
    /// Current into the cell below the trickle threshold; at 0 or less it never recovers.
    pub in_trickle: Amps,
    /// Whether the charger can see its termination current.
    pub terminates: bool,
}

/// What a load of `load` does to a charge by this charger, at its typical current.
///
/// The charger sees one current, the cell's and the load's together.
///
/// Source: charger makers' notes on load sharing.
pub fn load_left_on(charger: &Charger, load: Amps) -> LoadLeftOn {
    LoadLeftOn {
        in_constant_current: Amps(charger.current.typical) - load,
        in_trickle: charger.trickle - load,
        terminates: load < charger.termination,
    }
}

/// The largest mean load with which a charger of `current` still puts `capacity` in within a safety timer;
/// negative where it cannot even without a load. The constant-voltage tail is not counted, so it is an upper bound.
///
/// `∫(I − I_load) dt ≥ C`
///
/// Source: pin descriptions of one-cell chargers with a ten-hour timer.
pub fn largest_mean_load(capacity: AmpHours, current: Amps, timer: Seconds) -> Amps {
    current - Amps(capacity.0 * 3600.0 / timer.0)
}

/// Heat in a linear charger.
///
/// `P = (V_in − V_out)·I`
pub fn dissipation(input: Volts, output: Volts, current: Amps) -> Watts {
    current * (input - output)
}

/// Simulates one charge, with the charger's typical current and float voltage.
pub fn simulate(setup: &Setup, charger: &Charger, start: &ChargeStart) -> ChargeRun {
    Filling::new(setup, charger, start).run()
}

// The state and the sums beside it, in one list: all of it is raised in order together.
const Z: usize = 0;
const BRANCH: usize = 1;
const T: usize = 4;
const CHARGE: usize = 5;
/// What the charger gives to the cell's path.
const OUTPUT: usize = 6;
const ENTROPIC: usize = 7;
const OHMIC: usize = 8;
const POLAR: usize = 9;
const PATH: usize = 10;
/// ∫ of the voltage at the charger.
const VOLTS: usize = 11;
const LENGTH: usize = 12;
type Y = [f64; LENGTH];

/// What one step may be wrong by: charge as a fraction, a branch in V, the temperature in K.
const TOLERANCE: [f64; 5] = [1e-7, 1e-6, 1e-6, 1e-6, 1e-3];
/// What one step may be wrong by in energy, over that of a whole charge.
const ENERGY_WITHIN: f64 = 1e-8;
/// How finely the end of a phase is placed, as a fraction of a step.
const PLACED_WITHIN: f64 = 1e-9;

/// What is held over a step: the cell's current, or the voltage at the charger's output.
#[derive(Clone, Copy, PartialEq)]
enum Held {
    Current(f64),
    Voltage(f64),
}

/// The circuit at one place, before a current is known.
struct Now {
    ocv: f64,
    entropy: f64,
    r0: f64,
    path: f64,
    slow: f64,
}

impl Now {
    /// The voltage at the charger with `j` into the cell.
    fn output(&self, j: f64) -> f64 {
        self.ocv + self.slow + j * (self.r0 + self.path)
    }
}

struct Filling<'a> {
    setup: &'a Setup,
    charger: &'a Charger,
    start: ChargeStart,
    charge_as: f64,
    /// Slope of the voltage curve beyond full.
    beyond: f64,
    /// Current into the cell at the constant current and in trickle.
    full: f64,
    trickle: f64,
    y: Y,
    time: f64,
    phase: Phase,
}

/// `(1 − e⁻ˣ)/x`, also where x is small.
fn mean_decay(x: f64) -> f64 {
    if x < 1e-3 { 1.0 - x / 2.0 + x * x / 6.0 - x * x * x / 24.0 } else { (1.0 - exp(-x)) / x }
}

impl<'a> Filling<'a> {
    fn new(setup: &'a Setup, charger: &'a Charger, start: &ChargeStart) -> Self {
        let (x, v) = (setup.cell.ocv.x(), setup.cell.ocv.y());
        let last = x.len() - 1;
        // A limited end slope can be 0 where the curve is not flat: then the last piece's mean slope.
        let chord = (v[last] - v[last - 1]) / (x[last] - x[last - 1]);
        let mut y = [0.0; LENGTH];
        y[Z] = start.soc;
        y[T] = start.ambient.0;
        Self {
            setup,
            charger,
            start: *start,
            charge_as: setup.cell.charge_as(),
            beyond: setup.cell.ocv.at_with_slope(x[last]).1.max(chord),
            full: charger.current.typical - start.load.0,
            trickle: charger.trickle.0 - start.load.0,
            y,
            time: 0.0,
            phase: Phase::Trickle,
        }
    }

    /// The open-circuit voltage at 25 °C and its slope; beyond full it rises on.
    fn curve(&self, z: f64) -> (f64, f64) {
        let (v, slope) = self.setup.cell.ocv.at_with_slope(z);
        if z > 1.0 { (v + (z - 1.0) * self.beyond, self.beyond) } else { (v, slope) }
    }

    fn now(&self, z: f64, t: f64, slow: f64) -> Now {
        let cell = &self.setup.cell;
        let entropy = cell.entropy.at(z);
        let ocv = self.curve(z).0 + (t - 25.0) * entropy;
        let board = match self.setup.arrangement {
            Arrangement::ThroughBoard | Arrangement::LoadAtCell => self.setup.board.as_ref(),
            Arrangement::SwitchBridged | Arrangement::NoBoard => None,
        };
        let pairs: f64 = [board, self.setup.second_protector.as_ref()]
            .into_iter()
            .flatten()
            .map(|b| {
                let hot = 1.0 + b.alpha_per_k * (self.start.ambient.0 - 25.0);
                b.on_resistance.at(ocv + slow) * hot / f64::from(b.pairs) + b.shunt.0
            })
            .sum();
        Now { ocv, entropy, r0: cell.r0_at(z, Celsius(t)).0, path: self.setup.path.ahead.0 + pairs, slow }
    }

    fn here(&self, y: &Y) -> Now {
        self.now(y[Z], y[T], y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2])
    }

    fn held(&self) -> Held {
        match self.phase {
            Phase::Trickle => Held::Current(self.trickle),
            Phase::ConstantCurrent => Held::Current(self.full),
            Phase::ConstantVoltage => Held::Voltage(self.charger.float.typical),
        }
    }

    fn current(&self, y: &Y, held: Held) -> f64 {
        match held {
            Held::Current(j) => j,
            Held::Voltage(v) => {
                let now = self.here(y);
                (v - now.ocv - now.slow) / (now.r0 + now.path)
            }
        }
    }

    /// One step of length `h`, the current a straight line in it. `None`: no current was found for its end.
    fn once(&self, y: &Y, h: f64, held: Held) -> Option<Y> {
        let cell = &self.setup.cell;
        let branches = cell.branches.len().min(MAX_BRANCHES);
        let from = self.here(y);
        let j0 = self.current(y, held);
        let cooling = cell.cooling_w_per_k;
        let capacity = cell.heat_capacity_j_per_k;
        let settle = |t: f64, heat: f64, h: f64| {
            // C·dT/dt = P − G (T − T_a), P constant
            let x = h * cooling / capacity;
            t + (heat - cooling * (t - self.start.ambient.0)) / capacity * h * mean_decay(x)
        };
        let warm = |j: f64, slow: f64, r0: f64, entropy: f64, t: f64| {
            j * (slow + j * r0) + j * Celsius(t).kelvin() * entropy
        };
        let heat = warm(j0, from.slow, from.r0, from.entropy, y[T]);
        let t_mid = settle(y[T], heat, 0.5 * h);
        // Near enough for the branches' resistances at the end.
        let t_end = settle(y[T], heat, h);
        let mut j1 = j0;
        for _ in 0..40 {
            let mean = 0.5 * (j0 + j1);
            let z_mid = y[Z] + h * (3.0 * j0 + j1) / 8.0 / self.charge_as;
            let mut to = *y;
            to[Z] += h * mean / self.charge_as;
            let (mut slow_sum, mut stiffness) = (0.0, 0.0);
            for (k, branch) in cell.branches.iter().enumerate().take(branches) {
                let r = cell.branch_at(k, to[Z], Celsius(t_end)).0;
                let tau = branch.time_constant.0;
                let x = h / tau;
                let (gone, late) = (x * mean_decay(x), 1.0 - mean_decay(x));
                let w = y[BRANCH + k];
                // τ·dw/dt = R·j − w, with R·j in a straight line over the step
                let (f0, f1) = (cell.branch_at(k, y[Z], Celsius(y[T])).0 * j0, r * j1);
                to[BRANCH + k] = w * (1.0 - gone) + f0 * gone + (f1 - f0) * late;
                // ∫w dt from the same equation
                slow_sum += 0.5 * (f0 + f1) * h - tau * (to[BRANCH + k] - w);
                stiffness += r * late;
            }
            let slow_end = to[BRANCH] + to[BRANCH + 1] + to[BRANCH + 2];
            let middle = self.now(z_mid, t_mid, slow_sum / h);
            let square = (j0 * j0 + j0 * j1 + j1 * j1) / 3.0;
            let bend = (j1 - j0) * (slow_end - from.slow) / 12.0;
            let polar = h * (mean * slow_sum / h + bend);
            let heat = polar / h + square * middle.r0 + mean * Celsius(t_mid).kelvin() * middle.entropy;
            to[T] = settle(y[T], heat, h);
            let end = self.here(&to);
            if let Held::Voltage(v) = held {
                let missing = end.output(j1) - v;
                let slope = self.curve(to[Z]).1 * h / (2.0 * self.charge_as) + stiffness + end.r0 + end.path;
                let by = missing / slope;
                if !by.is_finite() {
                    return None;
                }
                if by.abs() > 1e-12 * (j0.abs() + j1.abs()) + 1e-15 {
                    j1 -= by;
                    continue;
                }
            }
            let charge = h * mean;
            to[CHARGE] += charge;
            let simpson = |a: f64, m: f64, b: f64| (a + 4.0 * m + b) / 6.0;
            let along = |a: f64, m: f64, b: f64| h * simpson(j0 * a, mean * m, j1 * b);
            let entropic = along(
                (y[T] - 25.0) * from.entropy,
                (t_mid - 25.0) * middle.entropy,
                (to[T] - 25.0) * end.entropy,
            );
            let ohmic = h * square * simpson(from.r0, middle.r0, end.r0);
            let path = h * square * simpson(from.path, middle.path, end.path);
            to[ENTROPIC] += entropic;
            to[OHMIC] += ohmic;
            to[POLAR] += polar;
            to[PATH] += path;
            // At constant voltage nothing of the cell goes into what the charger gives: the ledger proves the step.
            let (volts, output) = match held {
                Held::Voltage(v) => (v * h, v * charge),
                Held::Current(j) => {
                    let resistive = simpson(from.r0 + from.path, middle.r0 + middle.path, end.r0 + end.path);
                    let volts = h * (simpson(from.ocv, middle.ocv, end.ocv) + j * resistive) + slow_sum;
                    (volts, j * volts)
                }
            };
            to[VOLTS] += volts;
            to[OUTPUT] += output;
            return Some(to);
        }
        None
    }

    /// A step and its error over what it may be.
    fn step(&self, y: &Y, h: f64, held: Held) -> Option<(Y, f64)> {
        let whole = self.once(y, h, held)?;
        let half = self.once(y, 0.5 * h, held)?;
        let halves = self.once(&half, 0.5 * h, held)?;
        let mut out = halves;
        let mut worst = 0.0_f64;
        let energy = ENERGY_WITHIN * self.charge_as * self.charger.float.typical;
        for k in 0..LENGTH {
            let error = (halves[k] - whole[k]) / 3.0;
            out[k] += error;
            if !error.is_finite() {
                return None;
            }
            if let Some(allowed) = TOLERANCE.get(k) {
                worst = worst.max(error.abs() / allowed);
            } else if k == OUTPUT {
                worst = worst.max(error.abs() / energy);
            }
        }
        Some((out, worst))
    }

    /// How far past the end of its phase a state is: negative before, 0 at it.
    fn past(&self, y: &Y) -> f64 {
        let now = self.here(y);
        match self.phase {
            Phase::Trickle => now.output(self.trickle) - self.charger.trickle_below.0,
            Phase::ConstantCurrent => now.output(self.full) - self.charger.float.typical,
            Phase::ConstantVoltage => self.least() - self.current(y, self.held()),
        }
    }

    /// The cell's current with which the constant voltage ends.
    fn least(&self) -> f64 {
        let (ends, load) = (self.charger.termination.0, self.start.load.0);
        if load < ends { ends - load } else { ends }
    }

    /// The phase that a state begins, or what ends the charge at once; `after` the phase that has just ended.
    fn enter(&mut self, after: Option<Phase>) -> Option<End> {
        let now = self.here(&self.y);
        let low = after.is_none() && now.output(self.trickle) < self.charger.trickle_below.0;
        if low {
            self.phase = Phase::Trickle;
            return (self.trickle <= 0.0).then_some(End::NeverRecovers);
        }
        if self.full <= 0.0 {
            self.phase = Phase::ConstantCurrent;
            return Some(End::DischargesWhileCharging);
        }
        self.phase = Phase::ConstantCurrent;
        if after == Some(Phase::ConstantCurrent) || self.past(&self.y) >= 0.0 {
            self.phase = Phase::ConstantVoltage;
            if self.past(&self.y) >= 0.0 {
                return Some(self.full_end());
            }
        }
        None
    }

    fn full_end(&self) -> End {
        if self.start.load < self.charger.termination { End::Terminated } else { End::NeverTerminates }
    }

    /// The length at which `of` turns from negative to positive inside a step of length `h`.
    fn meet(&self, h: f64, held: Held, of: &dyn Fn(&Y) -> f64) -> Option<(f64, Y)> {
        let (mut a, mut b) = (0.0, h);
        let (mut fa, mut fb) = (of(&self.y), of(&self.step(&self.y, h, held)?.0));
        for _ in 0..60 {
            if b - a <= PLACED_WITHIN * h {
                break;
            }
            let straight = b - fb * (b - a) / (fb - fa);
            let m = if straight > a && straight < b { straight } else { 0.5 * (a + b) };
            let fm = of(&self.step(&self.y, m, held)?.0);
            // Illinois: the end that stays counts half.
            if fm < 0.0 {
                (a, fa) = (m, fm);
                fb *= 0.5;
            } else {
                (b, fb) = (m, fm);
                fa *= 0.5;
            }
            if fm.abs() < 1e-12 {
                b = m;
                break;
            }
        }
        Some((b, self.step(&self.y, b, held)?.0))
    }

    fn point(&self) -> ChargePoint {
        let now = self.here(&self.y);
        let j = self.current(&self.y, self.held());
        ChargePoint {
            time: Seconds(self.time),
            phase: self.phase,
            output: Volts(now.output(j)),
            cell: Volts(now.ocv + now.slow + j * now.r0),
            current: Amps(j),
            soc: self.y[Z],
            temperature: Celsius(self.y[T]),
        }
    }

    fn run(mut self) -> ChargeRun {
        let mut points = Vec::new();
        let mut to_mostly = None;
        let mut phases = [Seconds(0.0); 3];
        let mut steps = 0;
        let mut h: f64 = 1.0;
        let mut end = self.enter(None);
        points.push(self.point());
        while end.is_none() {
            let held = self.held();
            let j = self.current(&self.y, held).abs();
            h = h.min(STEP_SOC * self.charge_as / j.max(1e-12));
            steps += 1;
            if steps > MAX_STEPS {
                end = Some(End::WorkLimit);
                break;
            }
            let (to, error) = match self.step(&self.y, h, held) {
                Some((to, error)) if error <= 1.0 => (to, error),
                Some((_, error)) => {
                    h *= (0.9 * powf(error, -1.0 / 3.0)).clamp(0.1, 0.9);
                    continue;
                }
                None => {
                    h *= 0.1;
                    continue;
                }
            };
            let grown = h * (0.9 * powf(error.max(1e-6), -1.0 / 3.0)).clamp(0.3, 4.0);
            let mut taken = (h, to);
            let mut ended = false;
            if self.past(&to) >= 0.0 {
                match self.meet(h, held, &|y| self.past(y)) {
                    Some(met) => taken = met,
                    None => {
                        h *= 0.1;
                        continue;
                    }
                }
                ended = true;
            }
            if to_mostly.is_none()
                && self.y[Z] < MOSTLY
                && taken.1[Z] >= MOSTLY
                && let Some((after, _)) = self.meet(taken.0, held, &|y| y[Z] - MOSTLY)
            {
                to_mostly = Some(Seconds(self.time + after));
            }
            self.y = taken.1;
            self.time += taken.0;
            let in_phase = &mut phases[self.phase as usize];
            *in_phase = Seconds(in_phase.0 + taken.0);
            points.push(self.point());
            h = grown;
            if self.y[Z] >= BEYOND_FULL {
                end = Some(End::BeyondFull);
            } else if ended {
                end = match self.phase {
                    Phase::ConstantVoltage => Some(self.full_end()),
                    phase => self.enter(Some(phase)),
                };
                // The current may have jumped: the branches begin anew.
                h = h.min(1.0);
                points.push(self.point());
            } else if self.phase == Phase::ConstantVoltage && self.current(&self.y, held) > self.full * 1.001
            {
                // A cell that warms takes more again: the constant current limits once more.
                self.phase = Phase::ConstantCurrent;
                points.push(self.point());
            }
        }
        self.report(end.unwrap_or(End::WorkLimit), &points, to_mostly, phases, steps)
    }

    fn report(
        &self,
        end: End,
        points: &[ChargePoint],
        to_mostly: Option<Seconds>,
        phases: [Seconds; 3],
        steps: u32,
    ) -> ChargeRun {
        let load = self.start.load;
        let hottest = points.iter().map(|p| p.temperature.0).fold(self.start.ambient.0, f64::max);
        // Within a phase the output rises and the current falls: it is hottest at a phase's first place.
        let dissipation_max = points
            .iter()
            .map(|p| dissipation(self.charger.input, p.output, Amps((p.current + load).0.max(0.0))).0)
            .fold(0.0, f64::max);
        let cell_ocv = &self.setup.cell.ocv;
        let (z0, z1) = (self.start.soc, self.y[Z]);
        let below = |z: f64| z.min(1.0);
        let beyond = |z: f64| {
            let d = (z - 1.0).max(0.0);
            d * (self.curve(1.0).0 + 0.5 * d * self.beyond)
        };
        let stored = cell_ocv.integral(below(z0), below(z1)) + beyond(z1) - beyond(z0);
        let taken = load.0 * self.y[VOLTS];
        let (ohmic, polar, path, entropic) = (self.y[OHMIC], self.y[POLAR], self.y[PATH], self.y[ENTROPIC]);
        ChargeRun {
            end,
            time: Seconds(self.time),
            to_mostly,
            charge: AmpHours(self.y[CHARGE] / 3600.0),
            soc: z1,
            phases,
            cell_temperature_max: Celsius(hottest),
            dissipation_max: Watts(dissipation_max),
            ledger: ChargeLedger {
                output: Joules(self.y[OUTPUT] + taken),
                load: Joules(taken),
                stored: Joules(stored * self.charge_as),
                entropic: Joules(entropic),
                ohmic: Joules(ohmic),
                polarisation: Joules(polar),
                path: Joules(path),
            },
            trace: thinned(points),
            steps,
        }
    }
}

/// The places evenly spread in time, with both sides of every change of phase.
fn thinned(points: &[ChargePoint]) -> Vec<ChargePoint> {
    let apart = points.last().map_or(0.0, |p| p.time.0) / TRACE_PLACES;
    let mut out: Vec<ChargePoint> = Vec::new();
    for (k, point) in points.iter().enumerate() {
        let changes = points.get(k + 1).is_none_or(|next| next.phase != point.phase)
            || k.checked_sub(1).is_none_or(|before| points[before].phase != point.phase);
        let far = out.last().is_none_or(|last| point.time.0 - last.time.0 >= apart);
        if changes || far {
            out.push(*point);
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::cell::{Branch, Cell, CellLimits};
    use crate::load::{LitDraw, Load};
    use crate::math::{Monotone, Polyline, ln};
    use crate::ratings::Band;
    use crate::setup::{Path, Use};
    use crate::units::{Farads, Ohms};

    /// 1 Ah, 3.0 V empty and 4.2 V full in a straight line, 60 mΩ behind 40 mΩ of leads.
    fn straight() -> Setup {
        Setup {
            cell: Cell {
                parallel: 1,
                capacity: AmpHours(1.0),
                health: 1.0,
                growth: 1.0,
                ocv: Monotone::new(vec![0.0, 1.0], vec![3.0, 4.2]).expect("two points"),
                entropy: Polyline::constant(0.0),
                r0: Ohms::from_milli(60.0),
                r0_shape: Polyline::constant(1.0),
                r0_activation: 0.0,
                branches: vec![],
                branch_shape: Polyline::constant(1.0),
                branch_activation: 0.0,
                heat_capacity_j_per_k: 20.0,
                cooling_w_per_k: 0.05,
                limits: CellLimits::default(),
            },
            second_protector: None,
            path: Path { ahead: Ohms::from_milli(40.0), after: Ohms(1.0) },
            board: None,
            arrangement: Arrangement::NoBoard,
            load: Load {
                lit: LitDraw::Current(Amps(1.0)),
                unlit: Ohms(100.0),
                stall: None,
                start: Volts(1.0),
                strike: Volts(2.0),
                strike_time: Seconds(1e-3),
                hold: Volts(1.5),
                surge: Amps(0.0),
                surge_time: Seconds(1e-3),
                capacitance: Farads(1e-6),
                esr: Ohms(0.0),
                peak_factor: 1.0,
            },
            usage: Use {
                press: Seconds(1.0),
                rest: Seconds(1.0),
                ambient: Celsius(25.0),
                standby: Amps(0.0),
                max_presses: 1,
            },
        }
    }

    fn charger() -> Charger {
        Charger {
            current: Band::exact(1.0),
            float: Band::exact(4.2),
            termination: Amps(0.1),
            trickle_below: Volts(2.9),
            trickle: Amps(0.1),
            input: Volts(5.0),
            load_while_charging: Amps(0.0),
            ambient: (Celsius(10.0), Celsius(30.0)),
            power_limit: None,
        }
    }

    fn from(soc: f64, load: f64) -> ChargeStart {
        ChargeStart { soc, ambient: Celsius(25.0), load: Amps(load) }
    }

    fn near(got: f64, want: f64, within: f64, what: &str) {
        assert!((got - want).abs() <= within, "{what}: {got}, not {want}");
    }

    #[test]
    fn exact_constant_current_then_an_exponential() {
        let run = simulate(&straight(), &charger(), &from(0.1, 0.0));
        assert_eq!(run.end, End::Terminated);
        // 3 + 1.2 z + 1 A · 0.1 Ω = 4.2 V at z = 11/12.
        near(run.phases[1].0, (11.0 / 12.0 - 0.1) * 3600.0, 1e-3, "constant current");
        // j = (4.2 − U)/R decays with τ = R·Q/(dU/dz) = 300 s from 1 A to 0.1 A.
        near(run.phases[2].0, 300.0 * ln(10.0), 1e-2, "constant voltage");
        near(run.soc, 1.0 - 0.1 * 0.1 / 1.2, 1e-7, "state of charge");
        near(run.to_mostly.expect("it passes 80 %").0, 0.7 * 3600.0, 1e-3, "to 80 %");
        near(run.charge.0, run.soc - 0.1, 1e-9, "charge put in, in Ah");
        // At the first place: 3.12 V and 0.1 V over the resistances.
        near(run.dissipation_max.0, 5.0 - 3.22, 1e-9, "heat in the charger");
        for p in run.trace.iter().filter(|p| p.phase == Phase::ConstantVoltage) {
            let want = exp(-(p.time.0 - run.phases[1].0) / 300.0);
            near(p.current.0, want, 2e-5, "current at constant voltage");
        }
    }

    #[test]
    fn exact_trickle_takes_its_own_time() {
        let mut setup = straight();
        setup.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![2.5, 4.2]).expect("two points");
        let run = simulate(&setup, &charger(), &from(0.0, 0.0));
        // 2.5 + 1.7 z + 0.01 V = 2.9 V
        near(run.phases[0].0, 0.39 / 1.7 * 36_000.0, 1e-2, "trickle");
        assert_eq!(run.end, End::Terminated);
    }

    #[test]
    fn exact_a_load_that_stays_on() {
        // The charger sees 0.1 A when the cell takes 0.05 A; above 0.1 A of load it never does.
        let run = simulate(&straight(), &charger(), &from(0.1, 0.05));
        assert_eq!(run.end, End::Terminated);
        near(run.phases[2].0, 300.0 * ln(0.95 / 0.05), 1e-2, "constant voltage");
        near(run.ledger.load.0, 0.05 * volt_seconds(&run), 2.0, "energy of the load");
        let end = |soc: f64, load: f64| simulate(&straight(), &charger(), &from(soc, load)).end;
        assert_eq!((end(0.1, 0.15), end(0.1, 0.6)), (End::NeverTerminates, End::NeverTerminates));
        assert_eq!(
            (end(0.5, 1.0), end(0.5, 3.0)),
            (End::DischargesWhileCharging, End::DischargesWhileCharging)
        );
        // Such a load pulls a low cell below the trickle threshold, and there it stays.
        assert_eq!(end(0.1, 3.0), End::NeverRecovers);
        assert_eq!(end(1.0, 0.0), End::Terminated);
        let mut low = straight();
        low.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![2.5, 4.2]).expect("two points");
        assert_eq!(simulate(&low, &charger(), &from(0.0, 0.15)).end, End::NeverRecovers);
        // A flat curve below the float voltage: nothing tells when the cell is full.
        low.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![3.3, 3.3]).expect("two points");
        assert_eq!(simulate(&low, &charger(), &from(0.5, 0.0)).end, End::BeyondFull);
    }

    /// ∫V dt over the trace, by trapezoids.
    fn volt_seconds(run: &ChargeRun) -> f64 {
        run.trace
            .windows(2)
            .map(|w| 0.5 * (w[0].output.0 + w[1].output.0) * (w[1].time.0 - w[0].time.0))
            .sum()
    }

    #[test]
    fn exact_heat_warms_an_insulated_cell() {
        let mut setup = straight();
        setup.cell.cooling_w_per_k = 0.0;
        let run = simulate(&setup, &charger(), &from(0.1, 0.0));
        // ∫j²R₀ dt: constant current, then the square of an exponential.
        let joules = 0.06 * (run.phases[1].0 + 150.0 * (1.0 - 0.01));
        near(run.ledger.ohmic.0, joules, 1e-3 * joules, "ohmic loss");
        near(run.cell_temperature_max.0, 25.0 + run.ledger.ohmic.0 / 20.0, 1e-6, "temperature");
    }

    #[test]
    fn exact_a_branch_delays_by_its_own_voltage() {
        let mut setup = straight();
        setup.cell.branches = vec![Branch { resistance: Ohms(0.05), time_constant: Seconds(20.0) }];
        let run = simulate(&setup, &charger(), &from(0.1, 0.0));
        // Settled long before: 3 + 1.2 z + 1 A · 0.15 Ω = 4.2 V.
        near(run.phases[1].0, (1.05 / 1.2 - 0.1) * 3600.0, 1e-3, "constant current");
        assert!(run.ledger.residual().abs() < 1e-7, "{}", run.ledger.residual());
        assert!(run.steps < 1000, "{} steps", run.steps);
    }

    #[test]
    fn exact_the_charger_is_behind_the_boards_pair() {
        use crate::board::{Board, Release, SensePoint};
        let mut setup = straight();
        setup.board = Some(Board {
            on_resistance: Polyline::constant(0.05),
            alpha_per_k: 0.0,
            pairs: 1,
            thermal_k_per_w: 0.0,
            thermal_time: Seconds(1.0),
            shunt: Ohms(0.05),
            sense: SensePoint::Pair,
            stages: vec![],
            over_discharge: None,
            release: Release::LoadRemoved,
        });
        for (arrangement, r) in [
            (Arrangement::ThroughBoard, 0.2),
            (Arrangement::LoadAtCell, 0.2),
            (Arrangement::SwitchBridged, 0.1),
            (Arrangement::NoBoard, 0.1),
        ] {
            setup.arrangement = arrangement;
            let run = simulate(&setup, &charger(), &from(0.1, 0.0));
            near(run.phases[1].0, ((1.2 - r) / 1.2 - 0.1) * 3600.0, 1e-3, "constant current");
        }
    }
}
