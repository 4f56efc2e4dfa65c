//! Values that others have printed, against what our functions and the simulator give.
//!
//! Each table names its source; a tolerance is half of the last digit that is printed, or what the source
//! itself states, and where it is neither, the test says what it is. Where sources disagree, both ends are
//! asserted as a band. Figures called "handbook law" are textbook formulas evaluated by hand for round inputs:
//! they hold the simulator against a value that it did not compute.

#![expect(clippy::approx_constant, reason = "a printed figure stands as it is printed")]

use strikeline_core::board::{OverDischarge, Threshold};
use strikeline_core::cell::{Branch, Cell, arrhenius};
use strikeline_core::charge;
use strikeline_core::driver;
use strikeline_core::load::LitDraw;
use strikeline_core::math::{Monotone, Polyline};
use strikeline_core::press::{self, PressOptions, PressStart};
use strikeline_core::replay::{self, Predicted, Recorded, ReplayStart};
use strikeline_core::report::{ChargeEnd, EventKind, Limit, NotFull, PressEnd, Protector};
use strikeline_core::setup::Setup;
use strikeline_core::units::{AmpHours, Amps, Celsius, Farads, Henries, Hertz, Ohms, Seconds, Volts, Watts};
use strikeline_core::wiring::{self, Conductor};
use strikeline_design::shipped;
use strikeline_tests::flat;

/// (what, what we give, what the source prints).
type Row = (String, f64, f64);

fn row(what: impl Into<String>, got: f64, printed: f64) -> Row {
    (what.into(), got, printed)
}

/// Every row within `tolerance` of what is printed; all that are not are named at once.
#[track_caller]
fn agree(source: &str, tolerance: f64, rows: &[Row]) {
    println!("{} values: {source}", rows.len());
    let off: Vec<String> = rows
        .iter()
        .filter(|(_, got, printed)| got.is_nan() || (got - printed).abs() > tolerance * (1.0 + 1e-9))
        .map(|(what, got, printed)| format!("{what}: {got}, printed {printed} ± {tolerance}"))
        .collect();
    assert!(off.is_empty(), "{source}:\n  {}", off.join("\n  "));
}

/// The same with a tolerance that is a fraction of what is printed.
#[track_caller]
fn agree_part(source: &str, part: f64, rows: &[Row]) {
    let parts: Vec<Row> =
        rows.iter().map(|(what, got, printed)| row(what.as_str(), got / printed, 1.0)).collect();
    agree(source, part, &parts);
}

/// Within a band that two or more sources span.
#[track_caller]
fn within(source: &str, rows: &[(String, f64, f64, f64)]) {
    println!("{} bands: {source}", rows.len());
    for (what, got, low, high) in rows {
        assert!((low..=high).contains(&got), "{source}: {what}: {got}, printed {low} to {high}");
    }
}

// Cell: internal resistance and open-circuit voltage.

/// A flat cell with `r0` and branches (resistance in Ω, time constant in s).
fn cell_with(voltage: f64, r0: f64, branches: &[(f64, f64)]) -> Cell {
    let mut cell = flat::cell(Volts(voltage), Ohms(r0));
    cell.branches = branches
        .iter()
        .map(|&(r, tau)| Branch { resistance: Ohms(r), time_constant: Seconds(tau) })
        .collect();
    cell
}

/// Replays (time in s, current in A from then on) from half charge at 25 °C.
fn replayed(cell: &Cell, record: &[(f64, f64)]) -> Vec<Predicted> {
    let start = ReplayStart { soc: 0.5, temperature: flat::ROOM, ambient: flat::ROOM };
    let record: Vec<Recorded> =
        record.iter().map(|&(t, i)| Recorded { time: Seconds(t), current: Amps(i) }).collect();
    replay::run(cell, &start, &record)
}

/// The d.c. two-level figure in mΩ: 0.2 It for 10 s, then 1 It for 1 s. A row of a replay is answered with its
/// own current, so each level is read in a second row of the same current.
fn two_level(cell: &Cell, one_it: f64) -> (f64, f64, f64) {
    let (low, high) = (0.2 * one_it, one_it);
    let read = replayed(cell, &[(0.0, low), (10.0, low), (10.0, high), (11.0, high)]);
    let (u1, u2) = (read[1].voltage.0, read[3].voltage.0);
    (u1, u2, 1e3 * (u1 - u2) / (high - low))
}

#[test]
fn published_direct_current_resistance_by_two_levels() {
    let source = "IEC 61960-3:2017, d.c. method (0.2 It for 10 s, 1 It for 1 s); worked figures by the exact RC response";
    let (u1, u2, r) = two_level(&cell_with(4.011, 0.050, &[]), 2.8);
    agree(source, 5e-4, &[row("U1", u1, 3.983), row("U2", u2, 3.871)]);
    agree(source, 5e-3, &[row("R_dc in mΩ", r, 50.00)]);
    agree(source, 5e-4, &[row("no branch", two_level(&cell_with(3.7, 0.030, &[]), 2.8).2, 30.000)]);
    let with = |tau: f64| two_level(&cell_with(3.7, 0.030, &[(0.020, tau)]), 2.8).2;
    agree(source, 5e-5, &[row("τ 5 s", with(5.0), 33.7480)]);
    agree(
        source,
        5e-4,
        &[
            row("τ 0.5 s", with(0.5), 47.293),
            row("τ 30 s", with(30.0), 30.773),
            row("τ without end", with(1e9), 30.000),
        ],
    );
}

#[test]
fn published_resistance_at_1_khz_does_not_see_the_branch() {
    let cell = cell_with(3.7, 0.030, &[(0.020, 5.0)]);
    // 100 periods of 1 kHz in steps of 20 µs, 0.1 A peak.
    let wave: Vec<(f64, f64)> = (0..5000)
        .map(|k| (f64::from(k) * 20e-6, 0.1 * (std::f64::consts::TAU * f64::from(k) / 50.0).sin()))
        .collect();
    let answer = replayed(&cell, &wave);
    let (mut ui, mut ii) = (0.0, 0.0);
    for ((_, i), p) in wave.iter().zip(&answer) {
        ui += (3.7 - p.voltage.0) * i;
        ii += i * i;
    }
    let ac = 1e3 * ui / ii;
    agree("IEC 61960-3, a.c. method; circuit law", 3e-4, &[row("Z at 1 kHz in mΩ", ac, 30.0000)]);
    let dc = two_level(&cell, 2.8).2;
    let settled = replayed(&cell, &[(0.0, 2.8), (1000.0, 2.8)])[1].voltage.0;
    agree(
        "ratio of the two, circuit law",
        1e-4,
        &[row("1 s step", dc / ac, 1.1249), row("settled", (3.7 - settled) / 2.8 * 1e3 / ac, 1.6667)],
    );
}

#[test]
fn published_resistance_over_charge_of_a_polymer_cell() {
    // s = 0 to 1 in steps of 1/400; the printed places lie on it.
    let soc: Vec<f64> = (0..=400).map(|k| f64::from(k) / 400.0).collect();
    let fit = |s: f64| 0.1562 * (-24.37 * s).exp() + 0.07446;
    let mut cell = cell_with(3.7, fit(0.5), &[]);
    cell.r0_shape =
        Polyline::new(soc.clone(), soc.iter().map(|s| fit(*s) / fit(0.5)).collect()).expect("rises");
    let printed = [(0.0, 230.66), (0.05, 120.64), (0.10, 88.12), (0.20, 75.65), (0.50, 74.46), (1.0, 74.46)];
    let rows: Vec<Row> =
        printed.iter().map(|&(s, r)| row(format!("s {s}"), 1e3 * cell.r0_at(s, flat::ROOM).0, r)).collect();
    agree(
        "M. Chen, G. A. Rincón-Mora, IEEE Trans. Energy Conversion 21 (2006), fit of an 850 mAh cell",
        5e-3,
        &rows,
    );
}

#[test]
fn published_arrhenius_factors() {
    type Factors = &'static [(f64, f64)];
    let table: [(&str, f64, Factors); 4] = [
        (
            "17.1 kJ/mol, electrolyte: BPX examples 2022 after Nyman 2008",
            17.1e3,
            &[(-20.0, 3.408), (-10.0, 2.503), (0.0, 1.880), (10.0, 1.441), (45.0, 0.648), (60.0, 0.484)],
        ),
        (
            "35 kJ/mol, electrodes: BPX examples 2022, Chen et al. 2020",
            35e3,
            &[(-20.0, 12.302), (-10.0, 6.540), (0.0, 3.641), (10.0, 2.113), (45.0, 0.412), (60.0, 0.227)],
        ),
        ("53.4 kJ/mol: Ecker et al. 2015", 53.4e3, &[(0.0, 7.182), (45.0, 0.258)]),
        ("55 kJ/mol: BPX examples 2022", 55e3, &[(0.0, 7.619), (45.0, 0.248)]),
    ];
    for (source, activation, printed) in table {
        let rows: Vec<Row> = printed
            .iter()
            .map(|&(t, factor)| row(format!("{t} °C"), arrhenius(activation, Celsius(t)), factor))
            .collect();
        agree(source, 5e-4, &rows);
        // The press uses a series between whole degrees: the same figures through a whole press.
        let mut cell = cell_with(3.7, 0.050, &[]);
        cell.r0_activation = activation;
        let rows: Vec<Row> = printed
            .iter()
            .map(|&(t, factor)| {
                let mut setup = flat::setup(
                    cell.clone(),
                    Ohms(0.0),
                    flat::load(LitDraw::Current(Amps(1.0))),
                    Seconds(0.01),
                );
                setup.usage.ambient = Celsius(t);
                let cell_end = flat::press(&setup, &[]).summary.cell_end.0;
                row(format!("press at {t} °C"), (3.7 - cell_end) / 0.050, factor)
            })
            .collect();
        agree(source, 5e-4, &rows);
    }
}

/// The fit of a polymer cell, the sign of its square as printed.
fn polymer_fit(s: f64) -> f64 {
    -1.031 * (-35.0 * s).exp() + 3.685 + 0.2156 * s - 0.1178 * s * s + 0.3201 * s * s * s
}

#[test]
fn published_open_circuit_voltage_of_a_polymer_cell() {
    let source =
        "M. Chen, G. A. Rincón-Mora, IEEE Trans. Energy Conversion 21 (2006), fit of an 850 mAh cell";
    // Our curve through 334 points of the fit, none of which is a printed place but the ends.
    let soc: Vec<f64> = (0..=333).map(|k| f64::from(k) / 333.0).collect();
    let mut cell = cell_with(3.7, 0.05, &[]);
    cell.ocv = Monotone::new(soc.clone(), soc.iter().map(|s| polymer_fit(*s)).collect()).expect("rises");
    let at = |s: f64| cell.open_circuit(s, flat::ROOM).0;
    let printed = [(0.0, 2.6540), (0.1, 3.6746), (0.2, 3.7250), (0.5, 3.8034), (0.8, 3.9460), (1.0, 4.1029)];
    let rows: Vec<Row> = printed.iter().map(|&(s, u)| row(format!("s {s}"), at(s), u)).collect();
    agree(source, 5e-5, &rows);
    let printed = [3.675, 3.725, 3.748, 3.773, 3.803, 3.841, 3.888, 3.946, 4.017];
    let rows: Vec<Row> =
        (1..10).zip(printed).map(|(k, u)| row(format!("{k}0 %"), at(f64::from(k) * 0.1), u)).collect();
    agree(source, 5e-4, &rows);
    // Two copies of the fit in public carry the square with the other sign; at full it would be 4.3385 V.
    assert!((at(1.0) - 4.3385).abs() > 0.2);
}

#[test]
fn published_open_circuit_voltages_between_their_points() {
    // Curves through every second per cent of four published sets give what the sets have at every tenth.
    let text = include_str!("../data/cells/ocv_parameter_sets.csv");
    let lines: Vec<Vec<f64>> = text
        .lines()
        .skip(1)
        .map(|line| line.split(',').map(|v| v.trim().parse().expect("a number")).collect())
        .collect();
    let printed: [(&str, usize, [f64; 9]); 3] = [
        ("Ai et al. 2020, LCO pouch", 1, [3.640, 3.695, 3.733, 3.762, 3.792, 3.837, 3.909, 3.994, 4.088]),
        ("Chen et al. 2020, NMC811", 2, [3.296, 3.485, 3.581, 3.667, 3.751, 3.841, 3.948, 4.042, 4.097]),
        ("Kim et al. 2011, NCA", 4, [3.247, 3.372, 3.492, 3.598, 3.685, 3.768, 3.874, 3.980, 4.080]),
    ];
    for (source, column, values) in printed {
        // Odd per cents and the ends.
        let rows: Vec<&Vec<f64>> = lines
            .iter()
            .filter(|r| {
                let per_cent = (r[0] * 100.0).round() as i32;
                per_cent % 2 == 1 || per_cent == 0 || per_cent == 100
            })
            .collect();
        let curve =
            Monotone::new(rows.iter().map(|r| r[0]).collect(), rows.iter().map(|r| r[column]).collect())
                .expect("rises");
        let rows: Vec<Row> = (1..10)
            .zip(values)
            .map(|(k, u)| row(format!("{k}0 %"), curve.at(f64::from(k) / 10.0), u))
            .collect();
        // 1 mV is what a fit is to be reproduced to; the sets are printed to 1 mV.
        agree(source, 1e-3, &rows);
    }
}

#[test]
fn published_shipped_polymer_cell_lies_among_the_published_ones() {
    // The sets differ by up to 95 mV here; a cell of this chemistry lies within 30 mV of what they span.
    let sets = [
        [3.725, 3.748, 3.773, 3.803, 3.841, 3.888, 3.946, 4.017],
        [3.695, 3.733, 3.762, 3.792, 3.837, 3.909, 3.994, 4.088],
        [3.706, 3.752, 3.788, 3.827, 3.874, 3.930, 3.998, 4.080],
        [3.692, 3.697, 3.715, 3.745, 3.765, 3.799, 3.849, 3.904],
    ];
    let cell = shipped::chemistry("lco_pouch").expect("shipped").cell(AmpHours(2.8));
    let rows: Vec<(String, f64, f64, f64)> = (0..8)
        .map(|k| {
            let soc = 0.2 + 0.1 * k as f64;
            let column = sets.map(|s| s[k]);
            let low = column.iter().copied().fold(f64::MAX, f64::min) - 0.030;
            let high = column.iter().copied().fold(f64::MIN, f64::max) + 0.030;
            (format!("{:.0} %", soc * 100.0), cell.open_circuit(soc, flat::ROOM).0, low, high)
        })
        .collect();
    within("Chen & Rincón-Mora 2006, Ai 2020, Ramadass 2004, Marquis 2019", &rows);
}

#[test]
fn published_entropy_of_a_full_lco_cell() {
    let source = "Q. Huang, M. Yan, Z. Jiang, J. Power Sources 156 (2006) 541–546: ΔS = −29.78 J/(mol·K)";
    const FARADAY: f64 = 96_485.332;
    let mut cell = cell_with(4.1, 0.0, &[]);
    cell.entropy = Polyline::constant(-29.78 / FARADAY);
    let per_kelvin = cell.open_circuit(1.0, Celsius(26.0)).0 - cell.open_circuit(1.0, flat::ROOM).0;
    agree(source, 5e-5, &[row("dU/dT in mV/K", per_kelvin * 1e3, -0.3086)]);
    // One ampere in a cell without resistance at 298 K: all its heat is the reversible one.
    cell.heat_capacity_j_per_k = 1e3;
    let t = Celsius(298.0 - 273.15);
    let start = ReplayStart { soc: 0.9, temperature: t, ambient: t };
    let heat_in = |current: f64, seconds: f64| {
        let record = [0.0, seconds].map(|s| Recorded { time: Seconds(s), current: Amps(current) });
        let end = replay::run(&cell, &start, &record)[1];
        (end.temperature.0 - t.0) * 1e3
    };
    agree(source, 5e-4, &[row("reversible heat in kJ/mol", heat_in(1.0, 1.0) * FARADAY / 1e3, 8.874)]);
    agree(source, 5e-4, &[row("W at 3 A", heat_in(3.0, 1.0), 0.276)]);
    cell.entropy = Polyline::constant(-0.25e-3);
    let shift = cell.open_circuit(0.5, flat::ROOM).0 - cell.open_circuit(0.5, Celsius(60.0)).0;
    agree("Ai et al. 2020, −0.25 mV/K over 35 K", 5e-6, &[row("shift in V", shift, 8.75e-3)]);
}

#[test]
fn published_polarisation_of_a_polymer_cell() {
    let source = "M. Chen, G. A. Rincón-Mora 2006 at half charge, 1 It, by the circuit law";
    let cell = cell_with(3.803_365, 0.074_461, &[(0.046_690, 32.810), (0.049_840, 223.03)]);
    assert!((polymer_fit(0.5) - 3.803_365).abs() < 5e-6);
    let printed =
        [(0.0, 3.74007), (1.0, 3.73869), (10.0, 3.72779), (60.0, 3.69677), (600.0, 3.66090), (1e6, 3.65802)];
    let record: Vec<(f64, f64)> = printed.iter().map(|p| (p.0, 0.85)).collect();
    let rows: Vec<Row> = replayed(&cell, &record)
        .iter()
        .zip(&printed)
        .map(|(p, (t, u))| row(format!("{t} s"), p.voltage.0, *u))
        .collect();
    // The source's own inputs are printed to five digits: 1e-5 V.
    agree(source, 1e-5, &rows);
    // The same through a press with a constant draw, up to ten minutes.
    let times: Vec<f64> = printed[1..5].iter().map(|p| p.0).collect();
    let setup = flat::setup(cell, Ohms(0.0), flat::load(LitDraw::Current(Amps(0.85))), Seconds(700.0));
    let rows: Vec<Row> = flat::press(&setup, &times)
        .trace
        .iter()
        .zip(&printed[1..5])
        .map(|(s, (t, u))| row(format!("press, {t} s"), s.load.0, *u))
        .collect();
    agree(source, 1e-5, &rows);
}

#[test]
fn published_settling_of_a_branch() {
    // R = 1 Ω and 1 A: the voltage is the fraction.
    let cell = cell_with(3.7, 0.0, &[(1.0, 10.0)]);
    let printed = [(0.5, 0.39347), (1.0, 0.63212), (2.0, 0.86466), (3.0, 0.95021), (5.0, 0.99326)];
    let rows: Vec<Row> = printed
        .iter()
        .map(|&(n, part)| {
            let end = replayed(&cell, &[(0.0, 1.0), (10.0 * n, 1.0)])[1].voltage.0;
            row(format!("{n} τ"), 3.7 - end, part)
        })
        .collect();
    agree("handbook law 1 − e^(−t/τ); a forward Euler step would give 1 at t = τ", 5e-6, &rows);
    let cell = cell_with(3.7, 0.0, &[(0.020, 5.0)]);
    let steps: Vec<(f64, f64)> = (0..=10).map(|k| (f64::from(k), 3.0)).collect();
    let read = replayed(&cell, &steps);
    let drop = |k: usize| 1e3 * (3.7 - read[k].voltage.0);
    agree(
        "handbook law, 20 mΩ and 5 s at 3 A",
        5e-6,
        &[row("1 s, mV", drop(1), 10.87615), row("10 s, mV", drop(10), 51.87988)],
    );
    let halves: Vec<(f64, f64)> = (0..=20).map(|k| (0.5 * f64::from(k), 3.0)).collect();
    let fine = replayed(&cell, &halves);
    assert!((fine[20].voltage.0 - read[10].voltage.0).abs() < 1e-12, "two half steps are one");
}

// Maximum power transfer, through presses.

fn powered(voltage: f64, r: f64, lit: LitDraw) -> Setup {
    flat::setup(flat::cell(Volts(voltage), Ohms(r)), Ohms(0.0), flat::load(lit), Seconds(0.2))
}

#[test]
fn published_largest_power_of_a_source() {
    let source = "maximum power transfer (Jacobi), V²/4R";
    let delivered = |voltage: f64, r: f64, load: f64| {
        let s = flat::press(&powered(voltage, r, LitDraw::Resistance(Ohms(load))), &[]).summary;
        (s.current_end.0, s.load_end.0, s.current_end.0 * s.load_end.0)
    };
    let rows: Vec<Row> = [(0.050, 68.450), (0.100, 34.225), (0.150, 22.817)]
        .iter()
        .map(|&(r, p)| row(format!("{r} Ω"), delivered(3.7, r, r).2, p))
        .collect();
    agree(source, 5e-4, &rows);
    for r in [0.050, 0.100, 0.150] {
        let most = delivered(3.7, r, r).2;
        assert!(delivered(3.7, r, 0.9 * r).2 < most && delivered(3.7, r, 1.1 * r).2 < most);
    }
    let (i, u, _) = delivered(3.7, 0.050, 0.050);
    agree(source, 5e-3, &[row("A", i, 37.00)]);
    agree(source, 5e-4, &[row("V", u, 1.850)]);
    let rows: Vec<Row> = [(4.2, 2.10), (3.7, 1.85), (3.0, 1.50)]
        .iter()
        .map(|&(v, u)| row(format!("collapse from {v} V"), delivered(v, 0.15, 0.15).1, u))
        .collect();
    agree(source, 5e-3, &rows);
}

#[test]
fn published_constant_power_operating_points() {
    let source = "quadratic of a constant power behind a resistance";
    let s = flat::press(&powered(3.7, 0.15, LitDraw::Power(Watts(10.5))), &[]).summary;
    agree(source, 5e-5, &[row("A", s.current_end.0, 3.2718), row("V", s.load_end.0, 3.2092)]);
    assert_eq!(s.not_full, None);
    // 15 W is the most that 3.0 V behind 0.15 Ω can give; 15.1 W has no operating point.
    let just = flat::press(&powered(3.0, 0.15, LitDraw::Power(Watts(14.99))), &[]).summary;
    assert_eq!(just.not_full, None);
    let over = flat::press(&powered(3.0, 0.15, LitDraw::Power(Watts(15.1))), &[]).summary;
    assert_eq!(over.not_full, Some(NotFull::NoOperatingPoint));
    // An over-discharge threshold of 2.4 V is met before the collapse: at 8.667 A and 20.800 W.
    let s = flat::press(&powered(3.7, 0.15, LitDraw::Power(Watts(20.8))), &[]).summary;
    agree(
        source,
        5e-4,
        &[row("A at 20.8 W", s.current_end.0, 8.667), row("V at 20.8 W", s.load_end.0, 2.400)],
    );
    let mut board = flat::board(Ohms(1e-9), vec![]);
    board.over_discharge = Some(OverDischarge { threshold: Volts(2.4), delay: Seconds(0.1) });
    for (watts, end) in
        [(20.799, PressEnd::Released), (20.801, PressEnd::Opened(Limit::OverDischarge(Protector::Board)))]
    {
        let setup = flat::with_board(powered(3.7, 0.15, LitDraw::Power(Watts(watts))), board.clone());
        assert_eq!(flat::press(&setup, &[]).summary.end, end, "{source}: {watts} W");
    }
}

// Protection boards.

/// A press of a constant draw through a board, from a cell of `gate` volts without resistance to speak of.
fn through(gate: f64, board: strikeline_core::board::Board) -> Setup {
    let setup = flat::setup(
        flat::cell(Volts(gate), Ohms(1e-9)),
        Ohms(0.0),
        flat::load(LitDraw::Current(Amps(1e-3))),
        Seconds(0.1),
    );
    flat::with_board(setup, board)
}

fn over_current(millivolts: f64) -> Vec<strikeline_core::board::Stage> {
    vec![flat::stage("over_current", Volts::from_milli(millivolts), Seconds::from_milli(10.0))]
}

/// Trip current of a pair with one resistance.
fn trips_at(millivolts: f64, pair: f64, gate: f64) -> f64 {
    flat::trip_current(&through(gate, flat::board(Ohms(pair), over_current(millivolts))), Amps(40.0)).0
}

const GATES: [f64; 4] = [2.5, 3.1, 3.8, 4.5];
const PAIR_SHEET: &str = "Panasonic FC4B22270L1, TT4-ZZ-02012 rev. 1, R_SS(on) at 2 A";

/// Source-to-source resistance of one pair at the four gate voltages: (name, Ω).
const PAIRS: [(&str, [f64; 4]); 3] = [
    ("min", [14.0e-3, 13.5e-3, 12.5e-3, 12.0e-3]),
    ("typ", [22.0e-3, 19.0e-3, 18.0e-3, 17.0e-3]),
    ("max", [37.0e-3, 26.5e-3, 23.0e-3, 22.0e-3]),
];

fn pair_by_gate(ohms: [f64; 4], millivolts: f64) -> strikeline_core::board::Board {
    let mut board = flat::board(Ohms(0.0), over_current(millivolts));
    board.on_resistance = Polyline::new(GATES.to_vec(), ohms.to_vec()).expect("four points");
    board
}

#[test]
fn published_switch_pair_over_gate_voltage() {
    let at = |ohms: [f64; 4], gate: f64| {
        1e3 * flat::press(&through(gate, pair_by_gate(ohms, 1e4)), &[]).summary.pair_end.0
    };
    for (name, ohms) in PAIRS {
        let rows: Vec<Row> = GATES
            .iter()
            .zip(ohms)
            .map(|(g, r)| row(format!("{name} at {g} V"), at(ohms, *g), 1e3 * r))
            .collect();
        agree(PAIR_SHEET, 5e-4, &rows);
    }
    let (typ, max) = (PAIRS[1].1, PAIRS[2].1);
    agree(
        PAIR_SHEET,
        5e-3,
        &[
            row("typ at 3.7 V", at(typ, 3.7), 18.14),
            row("typ at 3.0 V", at(typ, 3.0), 19.50),
            row("max at 3.7 V", at(max, 3.7), 23.50),
            row("max at 3.0 V", at(max, 3.0), 28.25),
        ],
    );
    agree(
        PAIR_SHEET,
        5e-4,
        &[
            row("typ, 2.5 V over 4.5 V", at(typ, 2.5) / at(typ, 4.5), 1.294),
            row("max, 2.5 V over 4.5 V", at(max, 2.5) / at(max, 4.5), 1.682),
        ],
    );
}

#[test]
fn published_switch_pair_over_temperature() {
    let factor = |t: f64| {
        let mut board = flat::board(Ohms(0.050), vec![]);
        board.alpha_per_k = 0.004;
        let setup = through(3.7, board);
        let mut start = PressStart::relaxed(&setup, 0.5, flat::ROOM);
        start.switch_temperature = Celsius(t);
        // A microsecond: the switch has no time to cool.
        let mut short = setup.clone();
        short.usage.press = Seconds(1e-6);
        press::run(&short, &start, &PressOptions::default()).summary.pair_end.0 / 0.050
    };
    agree(
        "linear law at 0.4 % per K, as component references quote it",
        5e-4,
        &[
            row("60 °C", factor(60.0), 1.140),
            row("85 °C", factor(85.0), 1.240),
            row("100 °C", factor(100.0), 1.300),
            row("125 °C", factor(125.0), 1.400),
        ],
    );
    // Sources disagree: linear 1.30, exponential 1.349, measured curves 1.45 and 1.55 at 100 °C.
    within(
        "hot factor at 100 °C: linear law, exponential law (Infineon application note), two measured curves",
        &[("100 °C".into(), factor(100.0), 1.2995, 1.555)],
    );
}

#[test]
fn published_trip_currents() {
    let source = "DW01A data sheet (H&M Semiconductor): 150 ± 30 mV, over a pair of 50 mΩ";
    agree(
        source,
        5e-4,
        &[
            row("typ", trips_at(150.0, 0.050, 3.7), 3.000),
            row("min", trips_at(120.0, 0.050, 3.7), 2.400),
            row("max", trips_at(180.0, 0.050, 3.7), 3.600),
        ],
    );
    agree(
        "corners of a weak board: the same sheet with FS8205A (Fortune rev. 1.8) at 2.5 V and S8205A typical at 4.5 V",
        5e-4,
        &[
            row("low", trips_at(120.0, 2.0 * 0.037, 2.5), 1.622),
            row("high", trips_at(180.0, 2.0 * 0.020, 4.5), 4.500),
        ],
    );
    let by_gate = |which: usize, millivolts: f64, gate: f64| {
        flat::trip_current(&through(gate, pair_by_gate(PAIRS[which].1, millivolts)), Amps(40.0)).0
    };
    agree(
        "the same sense voltages over the pair of the four-voltage sheet at 3.8 V",
        5e-4,
        &[
            row("typ", by_gate(1, 150.0, 3.8), 8.333),
            row("low", by_gate(2, 120.0, 3.8), 5.217),
            row("high", by_gate(0, 180.0, 3.8), 14.400),
        ],
    );
    agree(
        "trip current at 2.5 V over that at 4.5 V: the four-voltage sheet typ; FS8205A max (37 and 28 mΩ)",
        5e-4,
        &[
            row("typ", by_gate(1, 150.0, 2.5) / by_gate(1, 150.0, 4.5), 0.773),
            row("FS8205A", trips_at(150.0, 0.074, 2.5) / trips_at(150.0, 0.056, 4.5), 0.757),
        ],
    );
    // Three parts sold under one number: 150 ± 30, 140 ± 30, 160 ± 20 mV; a board of that kind lies in 2.2 to 3.6 A.
    for millivolts in [150.0, 140.0, 160.0] {
        within(
            "DW01A sheets of H&M, UMW and a third maker over 50 mΩ",
            &[(format!("{millivolts} mV"), trips_at(millivolts, 0.050, 3.7), 2.2 - 1e-4, 3.6 + 1e-4)],
        );
    }
}

/// A pair of 50 mΩ with 0.4 % per K and 83 K/W, with `stages`, pressed for `seconds`.
fn warming(stages: Vec<strikeline_core::board::Stage>, seconds: f64) -> Setup {
    let mut board = flat::board(Ohms(0.050), stages);
    board.alpha_per_k = 0.004;
    board.thermal_k_per_w = 83.0;
    board.thermal_time = Seconds(0.1);
    let mut setup = through(3.7, board);
    setup.usage.press = Seconds(seconds);
    setup
}

#[test]
fn published_trip_current_falls_as_the_switch_warms() {
    // A switch at 100 °C, held there by an ambient of 100 °C: 3.000 A / 1.3.
    let mut hot = warming(over_current(150.0), 0.05);
    hot.board.as_mut().expect("fitted").thermal_k_per_w = 0.0;
    hot.usage.ambient = Celsius(100.0);
    agree(
        "150 mV over 50 mΩ at 100 °C, 0.4 % per K",
        5e-4,
        &[row("A", flat::trip_current(&hot, Amps(10.0)).0, 2.308)],
    );
    let source =
        "self-heated fixed point R = R25/(1 − R25·α·Rθ·I²); 83 K/W of GF6968A (Vishay/General Semiconductor)";
    let setup = warming(over_current(150.0), 30.0);
    let trip = flat::trip_current(&setup, Amps(10.0));
    agree(source, 5e-5, &[row("A", trip.0, 2.6502)]);
    let mut held = setup.clone();
    held.load.lit = LitDraw::Current(trip);
    let warm = flat::press(&held, &[]).summary.switch_temperature_end.0;
    agree(source, 5e-3, &[row("°C", warm, 58.00)]);
    // The limit: beside it each further second warms less or more than the one before.
    let grows = |amps: f64| {
        let mut free = warming(vec![], 0.4);
        free.cell = flat::cell(Volts(50.0), Ohms(1e-9));
        free.load.lit = LitDraw::Current(Amps(amps));
        let t: Vec<f64> =
            flat::press(&free, &[0.1, 0.2, 0.3]).trace.iter().map(|s| s.switch_temperature.0).collect();
        t[2] - t[1] > t[1] - t[0]
    };
    let (mut low, mut high) = (5.0, 10.0);
    while high - low > 1e-5 {
        let middle = 0.5 * (low + high);
        if grows(middle) { high = middle } else { low = middle }
    }
    agree(source, 5e-4, &[row("no steady state above, A", low, 7.762)]);
}

#[test]
fn published_delays_open_after_their_time() {
    let ms = Seconds::from_milli;
    let us = Seconds::from_micro;
    let three = "S-8261 series (SII/ABLIC) rev. 1.9, table 9, AAU/AAX/ABA; 0.15, 0.50 and 1.2 V over 50 mΩ";
    for (column, delays) in [
        ("min", [ms(7.2), ms(1.8), us(220.0)]),
        ("typ", [ms(9.0), ms(2.24), us(320.0)]),
        ("max", [ms(11.0), ms(2.7), us(380.0)]),
    ] {
        let stages = [0.15, 0.50, 1.2]
            .iter()
            .zip(delays)
            .map(|(v, delay)| flat::stage("stage", Volts(*v), delay))
            .collect();
        let setup = through(3.7, flat::board(Ohms(0.050), stages));
        // Each draw exceeds one more threshold; the shortest delay that runs decides.
        let rows: Vec<Row> = [5.0, 15.0, 30.0]
            .iter()
            .enumerate()
            .map(|(k, amps)| row(format!("{column}, {amps} A"), opens_after(&setup, *amps, k), delays[k].0))
            .collect();
        agree(three, 1e-9, &rows);
    }
    let two = "DW01A electrical characteristics: over-current 10 typ 20 max ms, short 5 typ 50 max µs";
    for delays in [[ms(10.0), us(5.0)], [ms(20.0), us(50.0)]] {
        let stages = vec![
            flat::stage("over_current", Volts(0.150), delays[0]),
            flat::stage("short", Volts(1.35), delays[1]),
        ];
        let setup = through(3.7, flat::board(Ohms(0.050), stages));
        let rows = [5.0, 30.0].iter().enumerate();
        let rows: Vec<Row> = rows
            .map(|(k, amps)| row(format!("{amps} A"), opens_after(&setup, *amps, k), delays[k].0))
            .collect();
        agree(two, 1e-9, &rows);
    }
}

/// Time from a stage's threshold being exceeded by a draw of `amps` to the opening by it.
fn opens_after(setup: &Setup, amps: f64, stage: usize) -> f64 {
    let mut setup = setup.clone();
    setup.load.lit = LitDraw::Current(Amps(amps));
    let limit = Limit::Stage(Protector::Board, stage);
    let events = flat::press(&setup, &[]).events;
    let last = events.last().expect("a press has events");
    assert_eq!(last.kind, EventKind::Opened(limit), "{amps} A");
    let over = events.iter().rfind(|e| e.kind == EventKind::Over(limit)).expect("its timer started");
    last.time.0 - over.time.0
}

#[test]
fn published_over_discharge_opens_after_its_time() {
    let source = "S-8261 series rev. 1.9, table 9: 115/144/173 ms; 2.4 V";
    let rows: Vec<Row> = [0.115, 0.144, 0.173]
        .iter()
        .map(|&delay| {
            let mut board = flat::board(Ohms(0.050), vec![]);
            board.over_discharge = Some(OverDischarge { threshold: Volts(2.4), delay: Seconds(delay) });
            let mut setup = through(3.0, board);
            setup.cell = flat::cell(Volts(3.0), Ohms(0.150));
            setup.load.lit = LitDraw::Current(Amps(4.5));
            setup.usage.press = Seconds(1.0);
            let limit = Limit::OverDischarge(Protector::Board);
            let report = flat::press(&setup, &[]);
            assert_eq!(report.summary.end, PressEnd::Opened(limit));
            let over =
                report.events.iter().rfind(|e| e.kind == EventKind::Over(limit)).expect("its timer started");
            row(format!("{delay} s"), report.summary.end_time.0 - over.time.0, delay)
        })
        .collect();
    agree(source, 1e-9, &rows);
}

#[test]
fn published_board_drop_and_drain() {
    let source = "Ohm's law over 50 mΩ";
    for (amps, drop, watts) in [(3.0, 0.150, 0.45), (10.0, 0.500, 5.0)] {
        let mut setup = through(3.7, flat::board(Ohms(0.050), vec![]));
        setup.load.lit = LitDraw::Current(Amps(amps));
        let s = flat::press(&setup, &[]).summary;
        agree(source, 5e-4, &[row(format!("V at {amps} A"), s.board_end.0 - s.load_end.0, drop)]);
        // What the first microseconds before the draw and the input capacitor add is below this digit.
        agree(source, 5e-3, &[row(format!("W at {amps} A"), s.ledger.pair.0 / s.end_time.0, watts)]);
    }
    // 3 µA typical (DW01A) empties 2.8 Ah in a very long rest.
    let mut setup = flat::setup(
        flat::cell(Volts(3.7), Ohms(0.050)),
        Ohms(0.0),
        flat::load(LitDraw::Current(Amps(1e-6))),
        Seconds(1e-3),
    );
    setup.cell.capacity = AmpHours(2.8);
    setup.usage.standby = Amps(3e-6);
    setup.usage.max_presses = 2;
    const YEAR: f64 = 365.25 * 86_400.0;
    setup.usage.rest = Seconds(200.0 * YEAR);
    let report = charge::run(&setup);
    assert_eq!(report.end, ChargeEnd::EmptyInRest);
    agree("DW01A, 3 µA typ", 0.05, &[row("years", report.clock.0 / YEAR, 106.5)]);
}

// Conductors.

#[test]
fn published_copper() {
    agree("IEC 60028:1925", 5e-7, &[row("Ω·mm²/m at 20 °C", wiring::COPPER_20, 0.017241)]);
    let printed = [(-20.0, 0.84280), (0.0, 0.92140), (25.0, 1.01965), (60.0, 1.15720), (90.0, 1.27510)];
    let rows: Vec<Row> =
        printed.iter().map(|&(t, f)| row(format!("{t} °C"), wiring::copper_factor(Celsius(t)), f)).collect();
    agree("IEC 60028:1925, 0.00393 per K", 5e-6, &rows);
    // The factors to 20 °C printed with IEC 60228 come from 0.004 per K, those of IEC 60028 from 0.00393.
    let sources = [
        (5.0, 1.064, 1.0626),
        (10.0, 1.042, 1.0409),
        (25.0, 0.980, 0.9807),
        (50.0, 0.893, 0.8946),
        (70.0, 0.833, 0.8358),
        (100.0, 0.758, 0.7608),
    ];
    let rows: Vec<(String, f64, f64, f64)> = sources
        .iter()
        .map(|&(t, a, b): &(f64, f64, f64)| {
            let low = if a < b { a - 5e-4 } else { b - 5e-5 };
            let high = if a < b { b + 5e-5 } else { a + 5e-4 };
            (format!("{t} °C"), 1.0 / wiring::copper_factor(Celsius(t)), low, high)
        })
        .collect();
    within("IEC 60228 correction table and IEC 60028", &rows);
}

#[test]
fn published_largest_resistances_of_conductors() {
    let sizes = [0.5, 0.75, 1.0, 1.5, 2.5, 4.0, 6.0, 10.0, 16.0];
    let small = [0.05, 0.08, 0.11, 0.12, 0.14, 0.22, 0.25, 0.34];
    let tables: [(&str, Conductor, &[f64], &[f64]); 6] = [
        (
            "IEC 60228:2004, tables 1 and 2, plain",
            Conductor::Solid,
            &sizes,
            &[36.0, 24.5, 18.1, 12.1, 7.41, 4.61, 3.08, 1.83, 1.15],
        ),
        (
            "IEC 60228:2004, tables 1 and 2, metal-coated",
            Conductor::SolidTinned,
            &sizes,
            &[36.7, 24.8, 18.2, 12.2, 7.56, 4.70, 3.11, 1.84, 1.16],
        ),
        (
            "IEC 60228:2004, tables 3 and 4, plain",
            Conductor::Flexible,
            &sizes,
            &[39.0, 26.0, 19.5, 13.3, 7.98, 4.95, 3.30, 1.91, 1.21],
        ),
        (
            "IEC 60228:2004, tables 3 and 4, metal-coated",
            Conductor::FlexibleTinned,
            &sizes,
            &[40.1, 26.7, 20.0, 13.7, 8.21, 5.09, 3.39, 1.95, 1.24],
        ),
        (
            "DIN VDE 0295, a cable maker's extract, plain",
            Conductor::Flexible,
            &small,
            &[380.0, 237.0, 170.0, 150.0, 134.0, 96.0, 76.0, 53.0],
        ),
        (
            "DIN VDE 0295, a cable maker's extract, tinned",
            Conductor::FlexibleTinned,
            &small,
            &[392.0, 244.0, 175.0, 155.0, 138.0, 99.0, 79.0, 56.0],
        ),
    ];
    for (source, conductor, areas, printed) in tables {
        // A kilometre there and back at 20 °C is twice the figure.
        let rows: Vec<Row> = areas
            .iter()
            .zip(printed)
            .map(|(a, r)| {
                row(format!("{a} mm²"), wiring::lead(1000.0, *a, conductor, wiring::REFERENCE).0 / 2.0, *r)
            })
            .collect();
        agree(source, 1e-9, &rows);
    }
    let over_ideal = |c: Conductor| wiring::per_km_20(0.75, c) / wiring::per_km_20(0.75, Conductor::Ideal);
    agree(
        "IEC 60228 limit over pure copper, 0.75 mm²",
        5e-5,
        &[
            row("flexible", over_ideal(Conductor::Flexible), 1.1310),
            row("stranded", over_ideal(Conductor::Solid), 1.0658),
        ],
    );
}

#[test]
fn published_lead_drops() {
    let source = "IEC 60228 class 5 at 20 °C, 0.10 m there and back, 3 A";
    let r = |area: f64| wiring::lead(0.10, area, Conductor::Flexible, wiring::REFERENCE);
    agree(source, 5e-6, &[row("Ω, 0.75 mm²", r(0.75).0, 5.20e-3)]);
    let drop = |area: f64| {
        let load = flat::load(LitDraw::Current(Amps(3.0)));
        let s =
            flat::press(&flat::setup(flat::cell(Volts(3.7), Ohms(0.05)), r(area), load, Seconds(0.01)), &[]);
        s.summary.cell_end.0 - s.summary.load_end.0
    };
    agree(source, 5e-6, &[row("V, 0.75 mm²", drop(0.75), 15.60e-3), row("V, 1.5 mm²", drop(1.5), 7.98e-3)]);
}

#[test]
fn published_wire_gauges() {
    let gauges = [18.0, 20.0, 22.0, 24.0, 26.0, 28.0, 30.0];
    let rows = |printed: [f64; 7], of: &dyn Fn(f64) -> f64| -> Vec<Row> {
        gauges.iter().zip(printed).map(|(g, p)| row(format!("AWG {g}"), of(*g), p)).collect()
    };
    agree(
        "ASTM B258 diameters in mm",
        5e-5,
        &rows([1.0237, 0.8118, 0.6438, 0.5106, 0.4049, 0.3211, 0.2546], &wiring::awg_diameter_mm),
    );
    // The tables agree among themselves and with the law to 0.05 %.
    agree_part(
        "university physics wire table, Ω per 1000 ft at 20 °C",
        5e-4,
        &rows([6.385, 10.15, 16.14, 25.67, 40.81, 64.90, 103.2], &|g| wiring::awg_per_km_20(g) * 0.3048),
    );
    agree_part(
        "the same in Ω per km",
        5e-4,
        &rows([20.95, 33.31, 52.96, 84.21, 133.90, 212.92, 338.55], &wiring::awg_per_km_20),
    );
    agree_part(
        "supplier chart, AWG 12, the 20 °C value",
        5e-4,
        &[row("Ω/1000 ft", wiring::awg_per_km_20(12.0) * 0.3048, 1.588)],
    );
}

#[test]
fn published_let_through_of_conductors() {
    let k = |from: f64, to: f64| wiring::adiabatic_k(Celsius(from), Celsius(to));
    agree(
        "IEC 60364-5-54 annex A, formula",
        5e-3,
        &[
            row("70 to 160 °C", k(70.0, 160.0), 115.00),
            row("70 to 140 °C", k(70.0, 140.0), 102.80),
            row("90 to 250 °C", k(90.0, 250.0), 143.08),
            row("60 to 200 °C", k(60.0, 200.0), 140.94),
            row("85 to 220 °C", k(85.0, 220.0), 134.17),
            row("180 to 350 °C", k(180.0, 350.0), 132.49),
            row("30 to 350 °C", k(30.0, 350.0), 201.24),
        ],
    );
    agree(
        "IEC 60364-4-43 and -5-54, integers of the tables",
        0.5,
        &[
            row("70 to 160 °C", k(70.0, 160.0), 115.0),
            row("70 to 140 °C", k(70.0, 140.0), 103.0),
            row("90 to 250 °C", k(90.0, 250.0), 143.0),
            row("60 to 200 °C", k(60.0, 200.0), 141.0),
            row("85 to 220 °C", k(85.0, 220.0), 134.0),
            row("180 to 350 °C", k(180.0, 350.0), 132.0),
            row("30 to 160 °C", k(30.0, 160.0), 143.0),
            row("30 to 250 °C", k(30.0, 250.0), 176.0),
            row("30 to 500 °C", k(30.0, 500.0), 228.0),
            row("30 to 200 °C", k(30.0, 200.0), 159.0),
            row("30 to 150 °C", k(30.0, 150.0), 138.0),
        ],
    );
    let source = "IEC 60364-4-43, 434.5.2: PVC 115, silicone 132";
    agree(
        source,
        0.5,
        &[
            row("115, 0.22 mm²", wiring::let_through_a2s(115.0, 0.22), 640.0),
            row("115, 0.5 mm²", wiring::let_through_a2s(115.0, 0.5), 3306.0),
            row("115, 0.75 mm²", wiring::let_through_a2s(115.0, 0.75), 7439.0),
            row("115, 1.5 mm²", wiring::let_through_a2s(115.0, 1.5), 29756.0),
            row("132, 0.75 mm²", wiring::let_through_a2s(132.0, 0.75), 9801.0),
            row("132, 1.5 mm²", wiring::let_through_a2s(132.0, 1.5), 39204.0),
        ],
    );
    agree(
        source,
        5e-4,
        &[
            row("50 A, 0.22 mm²", wiring::time_to_limit(115.0, 0.22, Amps(50.0)).0, 0.256),
            row("50 A, 0.75 mm²", wiring::time_to_limit(115.0, 0.75, Amps(50.0)).0, 2.976),
        ],
    );
}

// Input capacitors, through presses.

#[test]
fn published_inrush() {
    let source = "RC law: 4.2 V, 0.1 Ω, 1000 µF";
    let cell = flat::cell(Volts(4.2), Ohms(0.04));
    let load = flat::capacitor(Farads::from_micro(1000.0), Ohms(1e9));
    let setup = flat::setup(cell, Ohms(0.06), load, Seconds(0.01));
    let printed = [(0.0, 42.000), (50e-6, 25.474), (100e-6, 15.451), (300e-6, 2.091)];
    let times: Vec<f64> = printed.iter().map(|p| p.0).collect();
    let report = flat::press(&setup, &times);
    let rows: Vec<Row> =
        report.trace.iter().zip(&printed).map(|(s, (t, i))| row(format!("{t} s"), s.current.0, *i)).collect();
    assert_eq!(rows.len(), 4);
    agree(source, 5e-4, &rows);
    let s = &report.summary;
    agree(source, 5e-5, &[row("A²s", s.i2t_a2s, 0.0882)]);
    agree(
        source,
        5e-6,
        &[
            row("J stored", s.ledger.capacitor_left.0, 8.82e-3),
            row("J lost", s.ledger.cell_ohmic.0 + s.ledger.after.0, 8.82e-3),
        ],
    );
}

#[test]
fn published_pre_charge() {
    let source = "RC law: 4.2 V, 10 Ω, 1000 µF";
    let load = flat::capacitor(Farads::from_micro(1000.0), Ohms(1e9));
    let setup = flat::setup(flat::cell(Volts(4.2), Ohms(0.0)), Ohms(10.0), load.clone(), Seconds(0.1));
    let trace = flat::press(&setup, &[0.0, 0.05]).trace;
    agree(source, 5e-3, &[row("A at first", trace[0].current.0, 0.42)]);
    agree(source, 5e-5, &[row("charged after 50 ms", trace[1].capacitor.0 / 4.2, 0.9933)]);
    // How much must be added to 0.1 Ω so that the inrush stays under an instant 3 A trip.
    let trips = |ohms: f64| {
        let mut board = flat::board(Ohms(1e-9), vec![flat::stage("instant", Volts(1.0), Seconds(0.0))]);
        board.stages[0].threshold = Threshold::Current(Amps(3.0));
        let setup = flat::setup(flat::cell(Volts(4.2), Ohms(0.1)), Ohms(ohms), load.clone(), Seconds(0.01));
        flat::press(&flat::with_board(setup, board), &[]).summary.end != PressEnd::Released
    };
    let (mut low, mut high) = (0.0, 5.0);
    while high - low > 1e-6 {
        let middle = 0.5 * (low + high);
        if trips(middle) { low = middle } else { high = middle }
    }
    agree("Ohm's law: 4.2 V under 3 A", 5e-3, &[row("Ω", high, 1.30)]);
}

/// A load fed through 1 kΩ, so that its capacitor alone carries it: time from lighting at `full` to the drop at
/// `hold`, and the voltage just after lighting.
fn carried(full: f64, hold: f64, lit: LitDraw, capacitance: f64, esr: f64) -> (f64, f64) {
    let mut load = flat::load(lit);
    load.strike = Volts(full);
    load.hold = Volts(hold);
    load.capacitance = Farads(capacitance);
    load.esr = Ohms(esr);
    let setup = flat::setup(flat::cell(Volts(full + 1e-3), Ohms(1e3)), Ohms(0.0), load, Seconds(3000.0));
    let report = flat::press(&setup, &[]);
    let find = |kind: EventKind| report.events.iter().find(|e| e.kind == kind).expect("it lights and drops");
    let (lit, drop) = (find(EventKind::Lit), find(EventKind::Drop));
    (drop.time.0 - lit.time.0, lit.load.0)
}

#[test]
fn published_hold_up_by_a_capacitor() {
    // The path adds at most 0.3 mA to 3 A: the times are those of the capacitor alone to 10⁻⁴.
    let current = LitDraw::Current(Amps(3.0));
    let (time, _) = carried(4.2, 3.9, current.clone(), 0.100, 0.0);
    agree_part("charge balance: 3 A, 0.3 V, 0.100 F", 5e-4, &[row("s", time, 0.010)]);
    let (time, _) = carried(4.2, 3.9, LitDraw::Power(Watts(10.0)), 82.30e-3, 0.0);
    agree_part("energy balance: 10 W, 4.2 to 3.9 V, 82.30 mF", 5e-4, &[row("s", time, 0.010)]);
    let (time, after) = carried(4.2, 4.2 - 0.7283, current, 4700e-6, 0.030);
    agree("3 A in 30 mΩ", 5e-4, &[row("V", 4.2 - after, 0.090)]);
    agree_part("3 A, 4700 µF and 30 mΩ: 728.3 mV", 1e-3, &[row("s", time, 1e-3)]);
}

// The estimator for resonant drivers.

#[test]
fn published_tank() {
    let khz = |f: f64| Hertz(f * 1e3);
    let nf = |c: f64| Farads(c * 1e-9);
    let source = "Thomson's formula, figures as a coil builder states them";
    let f = driver::tank_frequency(Henries(10.23e-6), nf(440.0));
    // The inductance is printed to 0.005 µH, which is 0.018 kHz.
    agree(source, 0.018, &[row("kHz, 10.23 µH and 440 nF", f.0 / 1e3, 75.002)]);
    let own = driver::own_capacitance(khz(320.0), khz(76.0), nf(220.0));
    let coil = driver::tank_inductance(khz(320.0), own);
    let with = Farads(own.0 + 220e-9);
    agree(
        source,
        5e-4,
        &[
            row("nF, 320 to 76 kHz with 220 nF", own.0 * 1e9, 13.151),
            row("µH of that coil", coil.0 * 1e6, 18.809),
            row("µH from the second frequency", driver::tank_inductance(khz(76.0), with).0 * 1e6, 18.809),
            row("µH, 440 nF at 75 kHz", driver::tank_inductance(khz(75.0), nf(440.0)).0 * 1e6, 10.234),
            row("µH, 453.15 nF at 75 kHz", driver::tank_inductance(khz(75.0), nf(453.15)).0 * 1e6, 9.937),
            row("nF with 77 kHz", driver::own_capacitance(khz(320.0), khz(77.0), nf(220.0)).0 * 1e9, 13.521),
            row("nF with 325 kHz", driver::own_capacitance(khz(325.0), khz(76.0), nf(220.0)).0 * 1e9, 12.726),
        ],
    );
    // The two statements about one coil do not fit together: with 440 nF added it would not reach 75 kHz.
    agree(source, 5e-3, &[row("kHz", driver::tank_frequency(coil, nf(453.15)).0 / 1e3, 54.51)]);
    agree(source, 0.05, &[row("kHz with 20 nF", driver::tank_frequency(coil, nf(20.0)).0 / 1e3, 259.5)]);
    let part = |times: f64| {
        driver::tank_frequency(coil, nf(100.0 * times)) / driver::tank_frequency(coil, nf(100.0))
    };
    agree(source, 5e-5, &[row("C × 4", part(4.0), 0.5000), row("C × 2", part(2.0), 0.7071)]);
}

#[test]
fn published_push_pull_winding() {
    let source = "volt-second balance of an ideal current-fed push-pull";
    agree(source, 5e-7, &[row("centre tap over input", driver::centre_tap_peak(Volts(1.0)).0, 1.570796)]);
    let printed = [(3.0, 9.425), (3.3, 10.367), (3.7, 11.624), (4.0, 12.566), (4.2, 13.195)];
    let rows: Vec<Row> =
        printed.iter().map(|&(v, p)| row(format!("{v} V"), driver::winding_peak(Volts(v)).0, p)).collect();
    agree(source, 5e-4, &rows);
    agree(
        source,
        5e-5,
        &[
            row("effective, 3.3 V", driver::winding_rms(Volts(3.3)).0, 7.3308),
            row("effective, 4.0 V", driver::winding_rms(Volts(4.0)).0, 8.8858),
            row("per turn, 2 + 2 at 3.3 V", driver::secondary_peak(Volts(3.3), 4.0, 1.0).0, 2.5918),
            row("per turn, 3 + 3 at 4.0 V", driver::secondary_peak(Volts(4.0), 6.0, 1.0).0, 2.0944),
        ],
    );
    agree(source, 0.5, &[row("500 turns, V", driver::secondary_peak(Volts(3.3), 4.0, 500.0).0, 1296.0)]);
    agree(source, 5e-4, &[row("A into 5.428 Ω", driver::feed_current(Volts(3.3), Ohms(5.428)).0, 3.000)]);
    let tank = driver::tank_current(Volts(10.367), Henries(10.23e-6), Farads(440e-9));
    agree(source, 5e-4, &[row("A in the tank", tank.0, 2.150)]);
    // A simulation in time with ideal switches found 10.370 V for 3.3 V; 1 % is what it states.
    agree_part(
        "simulation in time, ideal switches",
        1e-2,
        &[row("V", driver::winding_peak(Volts(3.3)).0, 10.370)],
    );
}

#[test]
fn published_air() {
    let density = |t: f64| driver::air_density(1.01325, Celsius(t));
    agree(
        "spark-gap correction note: δ = (p/760)·293/(273 + T)",
        5e-5,
        &[
            row("0 °C", density(0.0), 1.0733),
            row("20 °C", density(20.0), 1.0),
            row("40 °C", density(40.0), 0.9361),
        ],
    );
    let rows: Vec<Row> = [(0.0, 1013.25), (1000.0, 898.75), (2000.0, 794.95), (3000.0, 701.09)]
        .iter()
        .map(|&(h, p)| row(format!("{h} m"), 1e3 * driver::standard_pressure_bar(h), p))
        .collect();
    agree("ISO 2533:1975, hPa", 5e-3, &rows);
}

#[test]
fn published_breakdown_of_gaps() {
    let gaps = [1.0, 2.0, 5.0, 10.0];
    let t = Celsius(20.0);
    let uniform = |d: f64, p: f64| driver::uniform_breakdown(d, p, t).0 / 1e3;
    let source = "uniform field, V = 2.44·pd + 2.12·√pd (high-voltage textbooks)";
    for (pressure, printed) in
        [(1.0, [4.560, 7.878, 16.940, 31.104]), (1.01325, [4.606, 7.963, 17.133, 31.472])]
    {
        let rows: Vec<Row> = gaps
            .iter()
            .zip(printed)
            .map(|(d, v)| row(format!("{d} mm, {pressure} bar"), uniform(*d, pressure), v))
            .collect();
        agree(source, 5e-4, &rows);
    }
    let rows: Vec<Row> = [(0.0, 4.606), (1000.0, 4.203), (2000.0, 3.830), (3000.0, 3.486)]
        .iter()
        .map(|&(h, v)| row(format!("1 mm at {h} m"), uniform(1.0, driver::standard_pressure_bar(h)), v))
        .collect();
    agree(source, 5e-4, &rows);
    // Measured: sphere gaps, spheres of 5, 10, 15 and 25 cm.
    let spheres = [(5.0, [17.4, 16.9, 16.8, 16.9]), (10.0, [32.0, 31.7, 31.4, 31.2])];
    for (gap, printed) in spheres {
        let rows: Vec<Row> =
            printed.iter().map(|v| row(format!("{gap} mm"), uniform(gap, 1.013), *v)).collect();
        agree_part("sphere-gap table (IEC 60052, IEEE 4): ± 3 %", 3e-2, &rows);
    }
    let rows: Vec<Row> = gaps
        .iter()
        .zip([4.61, 3.98, 3.43, 3.15])
        .map(|(d, e)| row(format!("{d} mm"), uniform(*d, 1.01325) / d, e))
        .collect();
    agree("mean field in kV/mm", 5e-3, &rows);
    // Needle points, and the whole band against every source that we have for 1 mm: 3.65 kV (Peek, 40 kHz) to
    // 7.40 kV (a fit made for far smaller gaps) for smooth electrodes.
    let needle = [(5.0, 4.2), (10.0, 8.5), (15.0, 13.0), (20.0, 17.5), (25.0, 22.0), (30.0, 26.9)];
    let rows: Vec<Row> = needle
        .iter()
        .map(|&(kv, gap)| {
            row(format!("{gap} mm"), driver::needle_breakdown(gap, 1.01325, Celsius(25.0)).0 / 1e3, kv)
        })
        .collect();
    agree("needle gaps, AIEE table at 760 mmHg and 25 °C", 1e-9, &rows);
    let band = driver::breakdown(1.0, 0.0, t);
    for (source, kv) in [
        ("Townsend form", 5.035),
        ("formula I", 4.345),
        ("linear rule", 4.35),
        ("Peek, 60 Hz", 4.95),
        ("Peek, 40 kHz", 3.65),
        ("needle points", 1.19),
    ] {
        // The smooth-field sources scatter by 10 % about our upper end; none lies below the needles.
        let (low, high) = (band.low.0 / 1e3, band.high.0 / 1e3 * 1.10);
        assert!(
            (low * 0.97..=high).contains(&kv),
            "{source}: {kv} kV at 1 mm, our band is {low} to {high} kV"
        );
    }
    let strike = driver::strike_voltage(band, 4.0, 500.0);
    assert!((driver::secondary_peak(strike.high, 4.0, 500.0).0 - band.high.0).abs() < 1e-9);
}

// Heat.

#[test]
fn published_lumped_heating() {
    let source = "energy balance: 50 mΩ, 55 g, 1000 J/(kg·K), 60 s";
    let mut cell = cell_with(3.7, 0.050, &[]);
    cell.heat_capacity_j_per_k = 55.0;
    for (amps, printed, digit) in [(3.0, 0.4909, 5e-5), (10.0, 5.455, 5e-4), (30.0, 49.09, 5e-3)] {
        let end = replayed(&cell, &[(0.0, amps), (60.0, amps)])[1];
        agree(source, digit, &[row(format!("K at {amps} A"), end.temperature.0 - 25.0, printed)]);
        let mut setup =
            flat::setup(cell.clone(), Ohms(0.0), flat::load(LitDraw::Current(Amps(amps))), Seconds(60.0));
        setup.load.capacitance = Farads::from_micro(1.0);
        let pressed = flat::press(&setup, &[]).summary.cell_temperature_end.0 - 25.0;
        agree(source, digit, &[row(format!("press, K at {amps} A"), pressed, printed)]);
    }
    let source = "lumped body: 0.45 W, 10 W/(m²·K), 78 cm², 55 g";
    cell.cooling_w_per_k = 0.078;
    let rise = |t: f64| replayed(&cell, &[(0.0, 3.0), (t, 3.0)])[1].temperature.0 - 25.0;
    agree(source, 5e-4, &[row("K at last", rise(1e5), 5.769), row("K at 600 s", rise(600.0), 3.306)]);
    // The time constant: 63.212 % of the rise after 705.1 s.
    agree(source, 5e-5, &[row("part after τ", rise(705.1) / rise(1e5), 0.63212)]);
}
