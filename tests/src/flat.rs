//! Designs with flat curves: nothing depends on charge or temperature unless a test makes it so, and the
//! answers are formulas.

use strikeline_core::board::{Board, Release, SensePoint, Stage, Threshold};
use strikeline_core::cell::{Cell, CellLimits};
use strikeline_core::load::{LitDraw, Load};
use strikeline_core::math::{Monotone, Polyline};
use strikeline_core::press::{self, PressOptions, PressStart};
use strikeline_core::report::{PressEnd, PressReport};
use strikeline_core::setup::{Arrangement, Path, Setup, Use};
use strikeline_core::units::{AmpHours, Amps, Celsius, Farads, Ohms, Seconds, Volts};

/// Room temperature, the reference of cells and switches.
pub const ROOM: Celsius = Celsius(25.0);

/// A cell that hardly empties or warms: a constant voltage behind `R₀`, no branch.
pub fn cell(voltage: Volts, r0: Ohms) -> Cell {
    Cell {
        parallel: 1,
        capacity: AmpHours(1e9),
        health: 1.0,
        growth: 1.0,
        ocv: Monotone::new(vec![0.0, 1.0], vec![voltage.0; 2]).expect("two points"),
        entropy: Polyline::constant(0.0),
        r0,
        r0_shape: Polyline::constant(1.0),
        r0_activation: 0.0,
        branches: vec![],
        branch_shape: Polyline::constant(1.0),
        branch_activation: 0.0,
        heat_capacity_j_per_k: 1e12,
        cooling_w_per_k: 0.0,
        limits: CellLimits::default(),
    }
}

/// A board whose switch pair has one resistance whatever its voltage and temperature.
pub fn board(pair: Ohms, stages: Vec<Stage>) -> Board {
    Board {
        on_resistance: Polyline::constant(pair.0),
        alpha_per_k: 0.0,
        pairs: 1,
        thermal_k_per_w: 0.0,
        thermal_time: Seconds(1.0),
        shunt: Ohms(0.0),
        sense: SensePoint::Pair,
        stages,
        over_discharge: None,
        release: Release::LoadRemoved,
    }
}

/// A stage over the sense voltage.
pub fn stage(name: &str, threshold: Volts, delay: Seconds) -> Stage {
    Stage { name: name.into(), threshold: Threshold::Sense(threshold), delay }
}

/// A load that lights at once, at almost any voltage, and then draws `lit`.
pub fn load(lit: LitDraw) -> Load {
    Load {
        lit,
        unlit: Ohms(1e9),
        stall: None,
        start: Volts(0.01),
        strike: Volts(0.03),
        strike_time: Seconds::from_micro(1.0),
        hold: Volts(0.02),
        surge: Amps(0.0),
        surge_time: Seconds(1e-3),
        capacitance: Farads::from_micro(1.0),
        esr: Ohms(0.0),
        peak_factor: 1.0,
    }
}

/// A load that never starts: its input capacitor, and a resistance beside it.
pub fn capacitor(capacitance: Farads, stall: Ohms) -> Load {
    Load {
        stall: Some(stall),
        start: Volts(1e3),
        hold: Volts(2e3),
        strike: Volts(3e3),
        capacitance,
        ..load(LitDraw::Current(Amps(0.0)))
    }
}

/// Cell and load with nothing but `after` between them, pressed for `press`.
pub fn setup(cell: Cell, after: Ohms, load: Load, press: Seconds) -> Setup {
    Setup {
        cell,
        second_protector: None,
        path: Path { ahead: Ohms(0.0), after },
        board: None,
        arrangement: Arrangement::NoBoard,
        load,
        usage: Use { press, rest: Seconds(0.0), ambient: ROOM, standby: Amps(0.0), max_presses: 1 },
    }
}

/// The same with a board in the path.
pub fn with_board(mut setup: Setup, board: Board) -> Setup {
    setup.board = Some(board);
    setup.arrangement = Arrangement::ThroughBoard;
    setup
}

/// One press from half charge, relaxed, at ambient temperature, with samples at `times`.
pub fn press(setup: &Setup, times: &[f64]) -> PressReport {
    let start = PressStart::relaxed(setup, 0.5, setup.usage.ambient);
    let options =
        PressOptions { samples: times.iter().map(|t| Seconds(*t)).collect(), ..PressOptions::default() };
    press::run(setup, &start, &options)
}

/// The largest constant draw, up to `most`, that a press survives; the smallest one that opens the path is
/// within 10⁻⁶ of it.
pub fn trip_current(setup: &Setup, most: Amps) -> Amps {
    let mut setup = setup.clone();
    let (mut low, mut high) = (0.0, most.0);
    while high - low > 1e-6 * most.0 {
        let middle = 0.5 * (low + high);
        setup.load.lit = LitDraw::Current(Amps(middle));
        match press(&setup, &[]).summary.end {
            PressEnd::Opened(_) => high = middle,
            PressEnd::Released => low = middle,
            other => panic!("{middle} A: {other:?}"),
        }
    }
    Amps(low)
}
