//! Cases built with a known answer: algebra on one side, a whole press or charge on the other.
//!
//! Tolerances are those of the solver as it states them (about a microvolt a step), widened to the size of the
//! thing that is compared, and far below what a person could measure.

use strikeline_core::board::{OverDischarge, Threshold};
use strikeline_core::cell::Branch;
use strikeline_core::charge;
use strikeline_core::load::LitDraw;
use strikeline_core::math::{Monotone, Polyline};
use strikeline_core::report::{ChargeEnd, EventKind, Limit, NotFull, PressEnd, PressReport, Protector};
use strikeline_core::setup::Setup;
use strikeline_core::units::{AmpHours, Amps, Celsius, Farads, Ohms, Seconds, Volts, Watts};
use strikeline_tests::draw::Draw;
use strikeline_tests::flat;

#[track_caller]
fn near(what: &str, got: f64, want: f64, tolerance: f64) {
    assert!((got - want).abs() <= tolerance, "{what}: {got}, by algebra {want} ± {tolerance}");
}

/// When something happens for the first time.
#[track_caller]
fn when(report: &PressReport, kind: EventKind) -> f64 {
    let event = report.events.iter().find(|e| e.kind == kind);
    event.unwrap_or_else(|| panic!("{kind:?} does not happen: {:?}", report.events)).time.0
}

fn constant(voltage: f64, r: f64, lit: LitDraw, press: f64) -> Setup {
    flat::setup(flat::cell(Volts(voltage), Ohms(r)), Ohms(0.0), flat::load(lit), Seconds(press))
}

const OVER_CURRENT: Limit = Limit::Stage(Protector::Board, 0);

#[test]
fn exact_capacitor_inrush() {
    let mut draw = Draw::new(1);
    for k in 0..200 {
        let (e, r) = (draw.even(2.5, 4.2), draw.log(0.01, 1.0));
        let (c, esr, stall) = (draw.log(1e-6, 0.01), draw.even(0.0, 0.2), draw.log(1.0, 1e4));
        let mut load = flat::capacitor(Farads(c), Ohms(stall));
        load.esr = Ohms(esr);
        let both = r * stall / (r + stall);
        let tau = c * (esr + both);
        let setup = flat::setup(flat::cell(Volts(e), Ohms(r)), Ohms(0.0), load, Seconds(20.0 * tau));
        let times: Vec<f64> = [0.0, 0.1, 0.5, 1.0, 2.0, 5.0].iter().map(|n| n * tau).collect();
        let last = e * stall / (r + stall);
        let report = flat::press(&setup, &times);
        assert_eq!(report.trace.len(), times.len());
        for (sample, t) in report.trace.iter().zip(&times) {
            let capacitor = last * (1.0 - (-t / tau).exp());
            // Two resistances meet at the load: v·(1/r + 1/stall + 1/esr) = e/r + v_C/esr.
            let at_load = (e * esr / r + capacitor) / (esr / r + esr / stall + 1.0);
            near(&format!("design {k}, capacitor at {t} s"), sample.capacitor.0, capacitor, 2e-5);
            near(&format!("design {k}, load at {t} s"), sample.load.0, at_load, 2e-5);
            near(&format!("design {k}, current at {t} s"), sample.current.0, (e - at_load) / r, 2e-5 / r);
        }
        near(
            &format!("design {k}, energy left"),
            report.summary.ledger.capacitor_left.0 / (0.5 * c * last * last),
            1.0,
            2e-5,
        );
    }
}

#[test]
fn exact_step_response_of_three_branches() {
    let branches = [(0.020, 0.7), (0.015, 20.0), (0.030, 300.0)];
    let mut setup = constant(3.9, 0.030, LitDraw::Current(Amps(2.5)), 900.0);
    setup.cell.parallel = 2;
    setup.cell.growth = 1.4;
    setup.cell.branches = branches
        .iter()
        .map(|&(r, tau)| Branch { resistance: Ohms(r), time_constant: Seconds(tau) })
        .collect();
    let times = [0.01, 0.1, 0.7, 3.0, 20.0, 100.0, 300.0, 900.0];
    let report = flat::press(&setup, &times);
    let lit = when(&report, EventKind::Lit);
    for sample in &report.trace {
        let t = sample.time.0 - lit;
        let slow: f64 = branches.iter().map(|(r, tau)| r * (1.0 - (-t / tau).exp())).sum();
        let want = 3.9 - 2.5 * 1.4 / 2.0 * (0.030 + slow);
        near(&format!("load after {t} s"), sample.load.0, want, 1e-5);
    }
    assert_eq!(report.trace.len(), times.len());
}

#[test]
fn exact_charge_that_a_press_takes() {
    let mut setup = constant(3.7, 0.030, LitDraw::Current(Amps(3.0)), 60.0);
    setup.cell.capacity = AmpHours(2.0);
    setup.cell.health = 0.8;
    setup.cell.parallel = 3;
    let s = flat::press(&setup, &[]).summary;
    // z falls by I·t/(3600·Q·h·n); before lighting hardly anything flows.
    let lit = s.lit.0;
    near("z", s.soc_start - s.soc_end, 3.0 * lit / (3600.0 * 2.0 * 0.8 * 3.0), 1e-9);
}

#[test]
fn exact_constant_power_roots() {
    let mut draw = Draw::new(2);
    for k in 0..500 {
        let (e, r) = (draw.even(2.5, 4.2), draw.log(0.02, 0.5));
        let most = e * e / (4.0 * r);
        let p = most * draw.even(0.05, 1.3);
        let mut setup = constant(e, r, LitDraw::Power(Watts(p)), 0.1);
        // Without an operating point it strikes again and again: not too often.
        setup.load.strike_time = Seconds(2e-3);
        let s = flat::press(&setup, &[]).summary;
        if p < 0.999 * most {
            let i = (e - (e * e - 4.0 * r * p).sqrt()) / (2.0 * r);
            assert_eq!(s.not_full, None, "design {k}: {e} V, {r} Ω, {p} W of {most} W");
            near(&format!("design {k}, A"), s.current_end.0, i, 1e-5 / r);
            near(&format!("design {k}, V"), s.load_end.0, e - i * r, 1e-5);
        } else if p > 1.001 * most {
            assert_eq!(s.not_full, Some(NotFull::NoOperatingPoint), "design {k}: {p} W of {most} W");
        }
    }
}

#[test]
fn exact_constant_power_collapses_with_the_cell() {
    // U = 2.6 + 1.6·z behind 0.15 Ω: the last operating point of 12 W is at U² = 4·R·P, U = 2.683 V.
    for (esr, capacitance) in [(0.0, 1e-6), (0.0, 1e-4), (0.05, 1e-5), (0.05, 1e-3)] {
        let mut setup = constant(3.5, 0.15, LitDraw::Power(Watts(12.0)), 60.0);
        setup.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![2.6, 4.2]).expect("rises");
        setup.cell.capacity = AmpHours(0.05);
        setup.load.hold = Volts(1.0);
        setup.load.start = Volts(0.5);
        setup.load.strike = Volts(3.0);
        setup.load.strike_time = Seconds(0.5);
        setup.load.esr = Ohms(esr);
        setup.load.capacitance = Farads(capacitance);
        let report = flat::press(&setup, &[]);
        let drop = report.events.iter().find(|e| e.kind == EventKind::Drop).expect("collapses");
        assert_eq!(report.summary.not_full, Some(NotFull::NoOperatingPoint));
        // Passing the point takes the capacitor a while: it drops a little later, never earlier.
        let collapse = (4.0_f64 * 0.15 * 12.0).sqrt();
        near(&format!("ESR {esr}, {capacitance} F"), 2.6 + 1.6 * drop.soc, collapse - 1e-3, 2e-3);
        assert!(report.summary.steps < 20_000, "{} steps", report.summary.steps);
    }
}

#[test]
fn exact_table_and_resistance_operating_points() {
    // From 3.0 A at 3 V down to 2.4 A at 4 V: i = 4.8 − 0.6 v; behind 0.1 Ω from 4.0 V: v = 4 − 0.1 i.
    let table = Polyline::new(vec![3.0, 4.0], vec![3.0, 2.4]).expect("rises");
    let s = flat::press(&constant(4.0, 0.1, LitDraw::Table(table.clone()), 0.1), &[]).summary;
    let v = (4.0 - 0.48) / 0.94;
    near("V on the table", s.load_end.0, v, 1e-6);
    // From 3.2 V the path ends below the table, where the draw is proportional: i = v.
    let s = flat::press(&constant(3.2, 0.1, LitDraw::Table(table), 0.1), &[]).summary;
    near("V below the table", s.load_end.0, 3.2 / 1.1, 1e-6);
    // Path and table meet three times from 4.0 V down to the hold voltage or below; the first counts:
    // 9 − 5·(v − 3) = 40 − 10·v.
    let table = Polyline::new(vec![2.0, 3.0, 3.6], vec![25.0, 9.0, 6.0]).expect("rises");
    let mut setup = constant(4.0, 0.1, LitDraw::Table(table), 0.1);
    setup.load.hold = Volts(2.05);
    setup.load.strike = Volts(3.9);
    setup.load.strike_time = Seconds(1e-3);
    let s = flat::press(&setup, &[]).summary;
    assert_eq!(s.not_full, None);
    near("V at the first of three", s.load_end.0, 3.2, 1e-6);
    let s = flat::press(&constant(3.2, 0.1, LitDraw::Resistance(Ohms(1.5)), 0.1), &[]).summary;
    near("V on a resistance", s.load_end.0, 3.0, 1e-6);
}

#[test]
fn exact_switch_resistance_by_its_own_supply() {
    // R_on = 60 mΩ − 10 mΩ/V·(V_board − 2.5 V); I → V_board → R_on → I, one quadratic: with 3 A forced,
    // V_board = 3.6 − 3·0.05.
    let mut board = flat::board(Ohms(0.0), vec![]);
    board.on_resistance = Polyline::new(vec![2.5, 4.5], vec![0.060, 0.040]).expect("rises");
    board.pairs = 2;
    let setup = flat::with_board(constant(3.6, 0.050, LitDraw::Current(Amps(3.0)), 0.1), board.clone());
    let s = flat::press(&setup, &[]).summary;
    near("supply", s.board_end.0, 3.45, 1e-6);
    near("pair", s.pair_end.0, (0.060 - 0.010 * 0.95) / 2.0, 1e-8);
    // A resistance R_L: I·(0.05 + (0.06 − 0.01·(3.6 − 0.05·I − 2.5))/2 + R_L) = 3.6 → 0.00025·I² + b·I − 3.6 = 0.
    let setup = flat::with_board(constant(3.6, 0.050, LitDraw::Resistance(Ohms(1.0)), 0.1), board);
    let b: f64 = 0.050 + (0.060 - 0.010 * 1.1) / 2.0 + 1.0;
    let i = (-b + (b * b + 4.0 * 0.00025 * 3.6).sqrt()) / (2.0 * 0.00025);
    near("A", flat::press(&setup, &[]).summary.current_end.0, i, 1e-6);
}

#[test]
fn exact_trip_exactly_at_the_delay() {
    let stage = flat::stage("over_current", Volts(0.150), Seconds(12.3e-3));
    let of = |amps: f64, press: f64| {
        let board = flat::board(Ohms(0.050), vec![stage.clone()]);
        flat::press(&flat::with_board(constant(3.7, 0.030, LitDraw::Current(Amps(amps)), press), board), &[])
    };
    let report = of(4.0, 1.0);
    assert_eq!(report.summary.end, PressEnd::Opened(OVER_CURRENT));
    // The inrush runs the timer too; what counts is the last time that the threshold was exceeded.
    let over =
        report.events.iter().rfind(|e| e.kind == EventKind::Over(OVER_CURRENT)).expect("exceeded").time.0;
    near("opening", report.summary.end_time.0 - over, 12.3e-3, 1e-12);
    // A press that ends just before is released, one that ends just after is opened; at the same instant
    // opening comes first.
    let end = report.summary.end_time.0;
    assert_eq!(of(4.0, end * (1.0 - 1e-9)).summary.end, PressEnd::Released);
    assert_eq!(of(4.0, end).summary.end, PressEnd::Opened(OVER_CURRENT));
    assert_eq!(of(4.0, end * (1.0 + 1e-9)).summary.end, PressEnd::Opened(OVER_CURRENT));
    assert_eq!(of(2.9999, 1.0).summary.end, PressEnd::Released);
    assert_eq!(of(3.0001, 1.0).summary.end, PressEnd::Opened(OVER_CURRENT));
}

#[test]
fn exact_surge_against_a_delay() {
    // Unlit: i = (E/R_u + I_s·e^(−t/τ))/(1 + R/R_u); it leaves the threshold after τ·ln of a quotient.
    let (e, r, unlit, surge, tau, threshold) = (4.0, 0.10, 4.0, 6.0, 5e-3, 3.0);
    let of = |delay: f64| {
        let mut setup = constant(e, r, LitDraw::Current(Amps(1.0)), 0.1);
        setup.load.unlit = Ohms(unlit);
        setup.load.surge = Amps(surge);
        setup.load.surge_time = Seconds(tau);
        setup.load.start = Volts(1.0);
        setup.load.hold = Volts(8.0);
        setup.load.strike = Volts(9.0);
        let mut stage = flat::stage("surge", Volts(1.0), Seconds(delay));
        stage.threshold = Threshold::Current(Amps(threshold));
        flat::press(&flat::with_board(setup, flat::board(Ohms(1e-9), vec![stage])), &[])
    };
    let under = tau * (surge / (threshold * (1.0 + r / unlit) - e / unlit)).ln();
    let report = of(0.05);
    assert_eq!(report.summary.end, PressEnd::Released);
    let (from, to) = (when(&report, EventKind::StartReached), when(&report, EventKind::Under(OVER_CURRENT)));
    // The input capacitor of 1 µF carries a 10⁻⁵ of the surge.
    near("the surge leaves the threshold", to - from, under, 1e-4 * under);
    let over = when(&report, EventKind::Over(OVER_CURRENT));
    assert_eq!(of((to - over) * 1.001).summary.end, PressEnd::Released);
    assert_eq!(of((to - over) * 0.999).summary.end, PressEnd::Opened(OVER_CURRENT));
}

#[test]
fn exact_trip_of_a_warming_switch() {
    // τ·dΔ/dt = A·(1 + α·Δ) − Δ with A = I²·R·Rθ; the sense voltage I·R·(1 + α·Δ) reaches its threshold.
    let (i, r25, alpha, r_theta, tau, threshold, delay) = (2.8, 0.050, 0.004, 83.0, 2.0, 0.150, 9e-3);
    let mut board = flat::board(Ohms(r25), vec![flat::stage("oc", Volts(threshold), Seconds(delay))]);
    board.alpha_per_k = alpha;
    board.thermal_k_per_w = r_theta;
    board.thermal_time = Seconds(tau);
    let report =
        flat::press(&flat::with_board(constant(3.7, 0.030, LitDraw::Current(Amps(i)), 60.0), board), &[]);
    let a: f64 = i * i * r25 * r_theta;
    let rate = (1.0 - alpha * a) / tau;
    let rise: f64 = (threshold / (i * r25) - 1.0) / alpha;
    let want = -(1.0 - rise * rate * tau / a).ln() / rate;
    assert_eq!(report.summary.end, PressEnd::Opened(OVER_CURRENT));
    let got = report.summary.end_time.0 - delay - when(&report, EventKind::Lit);
    near("threshold reached", got, want, 1e-4 * want);
}

#[test]
fn exact_over_discharge_of_a_falling_cell() {
    // U = 3 + z, 4 A from 10 A·s: U falls by 0.4 V/s; supply = U − 4·(0.05 + 0.01).
    let mut setup = constant(3.5, 0.050, LitDraw::Current(Amps(4.0)), 10.0);
    setup.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![3.0, 4.0]).expect("rises");
    setup.cell.capacity = AmpHours(10.0 / 3600.0);
    setup.path.ahead = Ohms(0.010);
    let mut board = flat::board(Ohms(0.030), vec![]);
    board.over_discharge = Some(OverDischarge { threshold: Volts(3.0), delay: Seconds(0.144) });
    let report = flat::press(&flat::with_board(setup, board), &[]);
    assert_eq!(report.summary.end, PressEnd::Opened(Limit::OverDischarge(Protector::Board)));
    let got = report.summary.end_time.0 - when(&report, EventKind::Lit);
    near("opening", got, (3.5 - 0.24 - 3.0) / 0.4 + 0.144, 1e-5);
}

#[test]
fn exact_empty_cell_ends_a_press() {
    let mut setup = constant(3.7, 0.050, LitDraw::Current(Amps(2.0)), 100.0);
    setup.cell.capacity = AmpHours(10.0 / 3600.0);
    let report = flat::press(&setup, &[]);
    assert_eq!(report.summary.end, PressEnd::CellEmpty);
    // 5 A·s were there; what charged the input capacitor is missing at the end.
    let want = (5.0 - 1e-6 * 3.6) / 2.0;
    near("empty", report.summary.end_time.0 - when(&report, EventKind::Lit), want, 1e-7);
}

#[test]
fn exact_lighting_jumps_over_the_capacitors_resistance() {
    let (e, r, esr, i) = (3.7, 0.1, 0.03, 3.0);
    let mut setup = constant(e, r, LitDraw::Current(Amps(i)), 0.1);
    setup.load.esr = Ohms(esr);
    setup.load.capacitance = Farads(1e-3);
    setup.load.strike_time = Seconds(0.01);
    setup.load.unlit = Ohms(1e9);
    let report = flat::press(&setup, &[]);
    let lit = report.events.iter().find(|e| e.kind == EventKind::Lit).expect("lights");
    // Charged for 75 time constants; the draw divides over path and capacitor.
    near("V just after", lit.load.0, e - i * r * esr / (r + esr), 1e-6);
    near("A just after", lit.current.0, i * esr / (r + esr), 1e-5);
}

#[test]
fn exact_flicker_period() {
    let mut draw = Draw::new(3);
    let mut checked = 0;
    for k in 0..300 {
        let (e, r, unlit) = (draw.even(3.0, 4.2), draw.log(0.05, 0.3), draw.log(10.0, 100.0));
        let (c, strike_time) = (draw.log(1e-5, 5e-3), draw.log(1e-4, 5e-3));
        let off = e * unlit / (r + unlit);
        let strike = off * draw.even(0.85, 0.98);
        let hold = strike * draw.even(0.80, 0.95);
        let settled = hold * draw.even(0.6, 0.95);
        let i = (e - settled) / r;
        let (tau_off, tau_on) = (c * r * unlit / (r + unlit), c * r);
        let rise = tau_off * ((off - hold) / (off - strike)).ln();
        let lights_at = off - (off - strike) * (-strike_time / tau_off).exp();
        let fall = tau_on * ((lights_at - settled) / (hold - settled)).ln();
        let period = rise + strike_time + fall;
        let mut setup = constant(e, r, LitDraw::Current(Amps(i)), 12.0 * period + 20.0 * tau_off);
        setup.load.unlit = Ohms(unlit);
        setup.load.start = Volts(0.5 * hold);
        setup.load.strike = Volts(strike);
        setup.load.hold = Volts(hold);
        setup.load.strike_time = Seconds(strike_time);
        setup.load.capacitance = Farads(c);
        let report = flat::press(&setup, &[]);
        let drops: Vec<f64> =
            report.events.iter().filter(|e| e.kind == EventKind::Drop).map(|e| e.time.0).collect();
        assert!(
            drops.len() >= 10,
            "design {k}: {} drops in {} periods",
            drops.len(),
            setup.usage.press.0 / period
        );
        assert_eq!(report.summary.not_full, Some(NotFull::SagBelowHold), "design {k}");
        for pair in drops.windows(2) {
            near(&format!("design {k}, period"), pair[1] - pair[0], period, (1e-4 * period).max(1e-8));
            checked += 1;
        }
    }
    assert!(checked > 2500, "{checked} periods");
}

#[test]
fn exact_presses_of_a_charge() {
    // U = 3 + z, 2 A for 10 s a press from 1 Ah behind 0.1 Ω, 20 A·s of 3600 each. It holds 3.3 V while
    // z ≥ 0.5 at the end of the press, and strikes at 3.505 V while z ≥ 0.505 at its beginning: 90 presses,
    // the last from 0.5056 to 0.5.
    let mut setup = constant(3.5, 0.1, LitDraw::Current(Amps(2.0)), 10.0);
    setup.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![3.0, 4.0]).expect("rises");
    setup.cell.capacity = AmpHours(1.0);
    setup.load.start = Volts(2.0);
    setup.load.hold = Volts(3.2995);
    setup.load.strike = Volts(3.505);
    setup.load.strike_time = Seconds(0.01);
    setup.usage.press = Seconds(10.01);
    setup.usage.max_presses = 1000;
    setup.usage.rest = Seconds(5.0);
    let report = charge::run(&setup);
    assert_eq!(report.full_presses, 90);
    assert_eq!(report.first_imperfect, Some(90));
    // A press takes 2 A while it is lit, 10 s but for the microsecond of the inrush.
    near("recharge mark", report.recharge_mark.expect("full presses").0, 3.5, 1e-5);
    assert!(report.ledger.residual().abs() < 1e-6);
    assert_eq!(report.end, ChargeEnd::NoLitTime(NotFull::StrikeVoltageNotReached));
    assert_eq!(report.presses.len(), 91);
    near("z at the end", report.soc_left, 0.5, 1e-6);
}

#[test]
fn exact_cell_cools_in_a_rest() {
    // Two presses with a rest: heat in, exponential cooling, heat in.
    let mut setup = constant(3.7, 0.1, LitDraw::Current(Amps(3.0)), 10.0);
    setup.cell.heat_capacity_j_per_k = 30.0;
    setup.cell.cooling_w_per_k = 0.1;
    setup.usage.ambient = Celsius(10.0);
    setup.usage.rest = Seconds(200.0);
    setup.usage.max_presses = 2;
    let report = charge::run(&setup);
    let (last, tau): (f64, f64) = (9.0 * 0.1 / 0.1, 300.0);
    let press = |rise: f64| last + (rise - last) * (-10.0_f64 / tau).exp();
    let want = press(press(0.0) * (-200.0_f64 / tau).exp());
    near("rise", report.presses[1].summary.cell_temperature_end.0 - 10.0, want, 1e-3);
}
