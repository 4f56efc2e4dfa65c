//! Times one charge, natively: median of many runs, with the work counted beside it.
//!
//! `cargo run --release -p strikeline-tests --example bench`

use std::time::Instant;

use strikeline_core::charge;
use strikeline_tests::case;

fn main() {
    demo();
    let cases = [
        ("cases/c01_current_strike_fails.json", include_str!("../data/cases/c01_current_strike_fails.json")),
        ("cases/c11_cold.json", include_str!("../data/cases/c11_cold.json")),
    ];
    for (name, text) in cases {
        let setup = match case::read(text).map_err(|e| e.to_string()).and_then(|f| f.case.setup()) {
            Ok(setup) => setup,
            Err(message) => {
                eprintln!("{name}: {message}");
                continue;
            }
        };
        time(name, &setup);
        // The same parts pressed for a second at a time: a few hundred presses.
        let mut short = setup.clone();
        short.usage.press = strikeline_core::units::Seconds(2.0);
        time(&format!("{name}, 2 s presses"), &short);
    }
}

/// The demo of the page: what a changed field costs before it is drawn.
fn demo() {
    let design = strikeline_design::design::Design::demo();
    let mut parts = [const { Vec::new() }; 3];
    for _ in 0..51 {
        let begin = Instant::now();
        let Ok(checked) = strikeline_design::check::check(&design) else { return };
        let after_check = begin.elapsed();
        let answers = strikeline_design::report::answer(&checked);
        let after_answer = begin.elapsed();
        let text = strikeline_design::link::encode(&design);
        std::hint::black_box((answers, text));
        let spans = [after_check, after_answer - after_check, begin.elapsed() - after_answer];
        for (list, span) in parts.iter_mut().zip(spans) {
            list.push(span.as_secs_f64() * 1e3);
        }
    }
    let median = |list: &mut Vec<f64>| {
        list.sort_by(f64::total_cmp);
        list[list.len() / 2]
    };
    let [a, b, c] = &mut parts;
    println!("the demo: check {:.3} ms, answers {:.3} ms, link {:.3} ms", median(a), median(b), median(c));
}

fn time(name: &str, setup: &strikeline_core::setup::Setup) {
    let mut times = Vec::new();
    let mut report = charge::run(setup);
    for _ in 0..51 {
        let begin = Instant::now();
        report = charge::run(setup);
        times.push(begin.elapsed().as_secs_f64());
    }
    times.sort_by(f64::total_cmp);
    let median = times[times.len() / 2];
    let presses = report.presses.len();
    println!(
        "{name}: {:.3} ms for {presses} presses, {:.2} µs and {:.1} steps each",
        median * 1e3,
        median * 1e6 / presses as f64,
        report.steps as f64 / presses as f64,
    );
}
