//! Laws over drawn designs.

use strikeline_core::charge;
use strikeline_core::press::{self, PressOptions, PressStart};
use strikeline_core::report::{ChargeEnd, ChargeReport, PressEnd};
use strikeline_core::setup::Setup;
use strikeline_core::units::{Amps, Ohms};
use strikeline_design::check::check;
use strikeline_design::design::Design;

struct Draw(u64);

impl Draw {
    /// Uniform from `low` to `high`.
    fn from(&mut self, low: f64, high: f64) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        low + (high - low) * (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    fn one<'a>(&mut self, of: &[&'a str]) -> &'a str {
        of[(self.from(0.0, of.len() as f64) as usize).min(of.len() - 1)]
    }

    fn design(&mut self) -> Design {
        let mut d = Design::demo();
        let mut set = |key: &str, text: String| assert!(d.set(key, &text), "{key}");
        set("cell.chemistry", self.one(&["lco_pouch", "nmc_pouch", "nmc_cylinder"]).into());
        set("cell.capacity", format!("{:.3} Ah", self.from(0.2, 1.5)));
        set("cell.growth", format!("{:.3}", self.from(0.8, 2.5)));
        set("cell.health", format!("{:.1} %", self.from(60.0, 100.0)));
        set("use.ambient", format!("{:.1} °C", self.from(-15.0, 40.0)));
        set("use.press", format!("{:.2} s", self.from(2.0, 20.0)));
        set("use.rest", format!("{:.1} s", self.from(0.5, 60.0)));
        set("board.stage1", format!("{:.0} mV", self.from(60.0, 400.0)));
        set("board.delay1", format!("{:.1} ms", self.from(1.0, 30.0)));
        set("board.pair", format!("{:.1} mΩ", self.from(10.0, 80.0)));
        set("board.sense", self.one(&["pair", "shunt"]).into());
        set("board.shunt", format!("{:.1} mΩ", self.from(1.0, 10.0)));
        set(
            "board.arrangement",
            self.one(&["through_board", "through_board", "load_at_cell", "no_board"]).into(),
        );
        set("second.fitted", self.one(&["no", "no", "yes"]).into());
        set("load.law", self.one(&["current", "power", "resistance", "table"]).into());
        set("load.current", format!("{:.2} A", self.from(0.5, 4.0)));
        set("load.power", format!("{:.2} W", self.from(2.0, 14.0)));
        set("load.resistance", format!("{:.2} Ω", self.from(0.9, 6.0)));
        set("load.strike", format!("{:.2} V", self.from(3.05, 3.6)));
        set("load.hold", format!("{:.2} V", self.from(2.7, 2.95)));
        // A second at least between two strikes, so that flicker stays countable.
        set("load.strike_time", format!("{:.0} ms", self.from(300.0, 900.0)));
        set(
            "load.surge",
            format!("{:.2} A", self.one(&["0", "1"]).parse::<f64>().unwrap_or(0.0) * self.from(0.0, 6.0)),
        );
        set("load.capacitance", format!("{:.0} µF", self.from(20.0, 1500.0)));
        set(
            "load.esr",
            format!("{:.1} mΩ", self.one(&["0", "1"]).parse::<f64>().unwrap_or(0.0) * self.from(0.0, 60.0)),
        );
        set("load.peak", format!("{:.2}", self.from(1.0, 1.6)));
        d
    }
}

fn drawn(seed: u64, n: usize, mut look: impl FnMut(&Setup)) {
    let mut draw = Draw(seed);
    let mut sound = 0;
    for _ in 0..n {
        if let Ok(checked) = check(&draw.design()) {
            sound += 1;
            look(&checked.nominal);
        }
    }
    assert!(sound * 10 >= n * 9, "only {sound} of {n} drawn designs are sound");
}

fn finite(report: &ChargeReport) -> bool {
    report.presses.iter().all(|p| {
        let s = &p.summary;
        [
            s.load_end.0,
            s.current_end.0,
            s.soc_end,
            s.cell_temperature_end.0,
            s.charge_as,
            s.i2t_a2s,
            p.rested.0,
        ]
        .iter()
        .all(|x| x.is_finite())
    })
}

#[test]
fn law_ledger_closes_and_nothing_is_nan() {
    let (mut worst, mut limited) = (0.0_f64, 0);
    drawn(0x1a3_0001, 1000, |setup| {
        let mut setup = setup.clone();
        setup.usage.max_presses = 12;
        let report = charge::run(&setup);
        assert!(finite(&report), "{setup:?}");
        let residual = report.ledger.residual().abs();
        assert!(residual <= 1e-6, "ledger {residual} for {setup:?}");
        worst = worst.max(residual);
        limited += i32::from(report.end == ChargeEnd::WorkLimit);
    });
    println!("worst ledger residual {worst:.1e}, {limited} runs at their bound");
}

#[test]
fn law_no_run_exceeds_its_bound_silently() {
    drawn(0x1a3_0002, 300, |setup| {
        let start = PressStart::relaxed(setup, 1.0, setup.usage.ambient);
        let report = charge::run_from(setup, &start, 2000);
        let allowed = 2000 + charge::STEPS_PER_PRESS * report.presses.len() as u64;
        assert!(
            report.steps <= allowed || report.end == ChargeEnd::WorkLimit,
            "{} steps, ended {:?}",
            report.steps,
            report.end
        );
        // A press is left at the bound, give or take the last step.
        assert!(report.steps < allowed + 1000, "{} steps where {allowed} are allowed", report.steps);
    });
}

#[test]
fn law_a_trip_never_comes_before_its_shortest_delay() {
    let mut trips = 0;
    drawn(0x1a3_0003, 2000, |setup| {
        let start = PressStart::relaxed(setup, 0.4, setup.usage.ambient);
        let report = press::run(setup, &start, &PressOptions { max_events: 2000, ..PressOptions::default() });
        if let PressEnd::Opened(_) = report.summary.end {
            trips += 1;
            let boards = setup.board_in_path().into_iter().chain(setup.second_protector.as_ref());
            let shortest = boards
                .flat_map(|b| {
                    b.stages
                        .iter()
                        .map(|s| s.delay.0)
                        .chain(b.over_discharge.iter().map(|o| o.delay.0))
                        .collect::<Vec<_>>()
                })
                .fold(f64::INFINITY, f64::min);
            assert!(report.summary.end_time.0 >= shortest * (1.0 - 1e-12), "{} s", report.summary.end_time.0);
        }
    });
    assert!(trips > 100, "only {trips} trips were drawn");
}

/// With a constant lit draw, more resistance brings the end nearer. The draw before the arc lights is a
/// resistance and falls a little with the voltage, so a press takes a little less charge: one press more is
/// within the law where the curve is steep.
#[test]
fn law_presses_do_not_rise_with_resistance() {
    let mut compared = 0;
    drawn(0x1a3_0004, 150, |setup| {
        let mut stiff = setup.clone();
        stiff.load.lit = strikeline_core::load::LitDraw::Current(Amps(1.5));
        stiff.load.esr = Ohms(0.0);
        let mut soft = stiff.clone();
        soft.path.after = soft.path.after + Ohms(0.02);
        let (a, b) = (charge::run(&stiff), charge::run(&soft));
        let ends = |r: &ChargeReport| matches!(r.end, ChargeEnd::NoLitTime(_));
        if ends(&a) && ends(&b) {
            compared += 1;
            assert!(
                b.full_presses <= a.full_presses + 1,
                "{} then {} full presses",
                a.full_presses,
                b.full_presses
            );
        }
    });
    assert!(compared >= 30, "only {compared} pairs could be compared");
}

/// The energy from the source is the integral of the voltage curve over the charge, found without time.
#[test]
fn law_source_is_the_integral_of_the_voltage_curve() {
    drawn(0x1a3_0005, 200, |setup| {
        let mut setup = setup.clone();
        setup.cell.entropy = strikeline_core::math::Polyline::constant(0.0);
        setup.usage.max_presses = 5;
        let report = charge::run(&setup);
        let curve = setup.cell.charge_as() * setup.cell.ocv.integral(report.soc_left, 1.0);
        let source = report.ledger.source.0;
        assert!((curve - source).abs() <= 2e-6 * source + 1e-6, "{source} J, the curve gives {curve} J");
    });
}
