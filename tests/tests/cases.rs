//! The core against the reference solutions, within the limits that stand beside them: voltages 0.5 mV,
//! event times 0.1 % or 10 µs, presses exact to one, energies 0.1 %, events the same in kind and order.

use serde_json::Value;
use strikeline_tests::case;

const VOLTS: f64 = 0.5e-3;

fn number(value: &Value, key: &str) -> f64 {
    value[key].as_f64().unwrap_or(f64::NAN)
}

fn same_events(name: &str, want: &Value, got: &Value) {
    let (want, got) = (want.as_array().expect("events"), got.as_array().expect("events"));
    let kinds =
        |list: &[Value]| list.iter().map(|e| format!("{} {}", e["kind"], e["detail"])).collect::<Vec<_>>();
    assert_eq!(kinds(want), kinds(got), "{name}: kind or order of events");
    for (w, g) in want.iter().zip(got) {
        let (t, ours) = (number(w, "t_s"), number(g, "t_s"));
        let allowed = (1e-3 * t).max(10e-6);
        assert!((t - ours).abs() <= allowed, "{name}: {} at {ours} s, reference {t} s", w["kind"]);
        assert_eq!(w["mode"], g["mode"], "{name}: mode after {} at {t} s", w["kind"]);
        for key in ["V_load_V", "V_board_V", "V_cell_V"] {
            let (v, ours) = (number(w, key), number(g, key));
            assert!(
                (v - ours).abs() <= VOLTS,
                "{name}: {key} {ours} V after {} at {t} s, reference {v} V",
                w["kind"]
            );
        }
    }
}

fn same_trace(name: &str, want: &Value, got: &Value) {
    let times = |trace: &Value| -> Vec<f64> {
        trace["t_s"].as_array().expect("times").iter().filter_map(Value::as_f64).collect()
    };
    let (t_want, t_got) = (times(want), times(got));
    for (k, t) in t_want.iter().enumerate() {
        let found = t_got.iter().position(|x| (x - t).abs() <= 2e-6 * t + 1e-12);
        let j = found.unwrap_or_else(|| panic!("{name}: no sample at {t} s"));
        for key in ["V_load_V", "V_board_V", "V_cell_V", "v_C_V"] {
            let (v, ours) =
                (want[key][k].as_f64().expect("a voltage"), got[key][j].as_f64().expect("a voltage"));
            assert!((v - ours).abs() <= VOLTS, "{name}: {key} {ours} V at {t} s, reference {v} V");
        }
    }
}

fn same_energies(name: &str, want: &Value, got: &Value) {
    let source = number(want, "source");
    for (key, joules) in want.as_object().expect("energies") {
        let (joules, ours) = (joules.as_f64().expect("joules"), number(got, key));
        // What is a ten-millionth of the source is not held to a thousandth of itself.
        let allowed = (1e-3 * joules.abs()).max(1e-7 * source);
        assert!((joules - ours).abs() <= allowed, "{name}: {key} {ours} J, reference {joules} J");
    }
}

fn check(name: &str, text: &str) {
    let file = case::read(text).expect("a case");
    let want = file.result.expect("the reference's result");
    let got = file.case.solve().expect("a setup");
    let (w, g) = (&want["summary"], &got["summary"]);
    assert!(number(g, "ledger_residual_rel").abs() <= 1e-6, "{name}: ledger {}", g["ledger_residual_rel"]);
    same_energies(name, &w["energy_J"], &g["energy_J"]);
    if want["kind"] == "press" {
        same_events(name, &want["events"], &got["events"]);
        same_trace(name, &want["trace"], &got["trace"]);
        for key in ["full", "why_not_full", "ended", "opened_by", "drops", "end_mode", "started"] {
            assert_eq!(w[key], g[key], "{name}: {key}");
        }
        for key in ["T_cell_end_C", "T_switch_end_C", "T_switch2_end_C"] {
            assert!((number(w, key) - number(g, key)).abs() <= 0.01, "{name}: {key}");
        }
        return;
    }
    same_events(name, &want["events_first_press"], &got["events_first_press"]);
    same_events(name, &want["events_last_press"], &got["events_last_press"]);
    for key in ["presses", "full_presses"] {
        assert!(
            (number(w, key) - number(g, key)).abs() <= 1.0,
            "{name}: {key} {}, reference {}",
            g[key],
            w[key]
        );
    }
    assert_eq!(w["ended"], g["ended"], "{name}: what ended it");
    for key in ["recharge_mark_V", "mark_relaxed_before_V", "mark_in_use_before_V", "mark_in_use_after_V"] {
        let (a, b) = (number(w, key), number(g, key));
        assert!((a - b).abs() <= VOLTS, "{name}: {key} {b} V, reference {a} V");
    }
}

macro_rules! cases {
    ($($test:ident $file:literal;)*) => {
        $(#[test]
        fn $test() {
            check($file, include_str!(concat!("../data/cases/", $file, ".json")));
        })*
    };
}

cases! {
    exact_c01_current_strike_fails "c01_current_strike_fails";
    exact_c04_table_strike_fails "c04_table_strike_fails";
    exact_c06_trip_near_empty "c06_trip_near_empty";
    exact_c07_trip_when_warm "c07_trip_when_warm";
    exact_c09_aged_cell "c09_aged_cell";
    exact_c11_cold "c11_cold";
    exact_c16_second_protector "c16_second_protector";
    exact_c19_three_branches "c19_three_branches";
    exact_c20_flicker_at_the_end "c20_flicker_at_the_end";
    exact_p01_inrush_trips_short "p01_inrush_trips_short";
    exact_p02_inrush_passes "p02_inrush_passes";
    exact_p04_stalled_trips "p04_stalled_trips";
    exact_p06_trip_after_delay "p06_trip_after_delay";
    exact_p08_flicker "p08_flicker";
    exact_p09_peak_factor_trips "p09_peak_factor_trips";
    exact_p11_long_press_heating "p11_long_press_heating";
    exact_p13_pinned_at_start "p13_pinned_at_start";
    exact_p16_shunt_and_amps "p16_shunt_and_amps";
    exact_p25_strike_time_reset "p25_strike_time_reset";
    exact_p29_esr_jump_drops_at_once "p29_esr_jump_drops_at_once";
}
