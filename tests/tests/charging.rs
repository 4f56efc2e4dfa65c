//! A charger filling drawn cells: laws, and draws far from sensible.

use strikeline_core::charger::{self, ChargePoint, ChargeRun, ChargeStart, End, MAX_STEPS, Phase};
use strikeline_core::ratings::{Band, Charger};
use strikeline_core::replay::{self, Recorded, ReplayStart};
use strikeline_core::setup::Setup;
use strikeline_core::units::{Amps, Celsius, Seconds, Volts};
use strikeline_tests::draw::Draw;

/// A charger that suits a cell: float voltage near the full cell's, between 0.2 and 1 It.
fn suited(draw: &mut Draw, setup: &Setup) -> Charger {
    let cell = &setup.cell;
    let it = cell.charge_as() / 3600.0;
    let full = cell.ocv.at(1.0);
    let current = it * draw.even(0.2, 1.0);
    Charger {
        current: Band::exact(current),
        float: Band::exact(full * draw.even(0.98, 1.01)),
        termination: Amps(current * draw.even(0.03, 0.2)),
        trickle_below: Volts(cell.ocv.at(0.0) + draw.even(-0.2, 0.1)),
        trickle: Amps(0.1 * current),
        input: Volts(full + 1.0),
        load_while_charging: Amps(0.0),
        ambient: (Celsius(10.0), Celsius(30.0)),
        power_limit: None,
    }
}

fn start(draw: &mut Draw) -> ChargeStart {
    ChargeStart { soc: draw.even(0.0, 0.6), ambient: Celsius(draw.even(0.0, 45.0)), load: Amps(0.0) }
}

fn finite(run: &ChargeRun) -> bool {
    let l = &run.ledger;
    let numbers = [
        run.time.0,
        run.charge.0,
        run.soc,
        run.cell_temperature_max.0,
        run.dissipation_max.0,
        l.output.0,
        l.stored.0,
        l.ohmic.0,
        l.polarisation.0,
        l.path.0,
        l.residual(),
    ];
    numbers.iter().all(|x| x.is_finite())
        && run.trace.iter().all(|p| {
            [p.time.0, p.output.0, p.cell.0, p.current.0, p.soc, p.temperature.0]
                .iter()
                .all(|x| x.is_finite())
        })
}

#[test]
fn law_what_goes_in_is_the_integral_and_the_ledger_closes() {
    let mut draw = Draw::new(71);
    let (mut worst, mut most, mut ended) = (0.0_f64, 0, 0);
    for case in 0..300 {
        let setup = draw.setup(1);
        let charger = suited(&mut draw, &setup);
        let start = start(&mut draw);
        let run = charger::simulate(&setup, &charger, &start);
        assert!(finite(&run), "case {case}: {run:?}");
        let put_in = (run.soc - start.soc) * setup.cell.charge_as() / 3600.0;
        assert!((run.charge.0 - put_in).abs() < 1e-9 * setup.cell.charge_as(), "case {case}");
        let phases: f64 = run.phases.iter().map(|p| p.0).sum();
        assert!((phases - run.time.0).abs() < 1e-9 * run.time.0.max(1.0), "case {case}");
        if run.end != End::WorkLimit {
            ended += 1;
            worst = worst.max(run.ledger.residual().abs());
            most = most.max(run.steps);
        }
        for pair in run.trace.windows(2) {
            assert!(pair[1].time >= pair[0].time && pair[1].soc >= pair[0].soc - 1e-12, "case {case}");
        }
        for p in run.trace.iter().filter(|p| p.phase == Phase::ConstantVoltage) {
            assert!((p.output.0 - charger.float.typical).abs() < 1e-9, "case {case}: {p:?}");
        }
        if run.end == End::Terminated {
            let last = run.trace.last().expect("one place at least");
            let ends = charger.termination.0;
            assert!(last.current.0 <= ends * (1.0 + 1e-6), "case {case}: {last:?}");
        }
    }
    assert!(worst < 1e-6, "the ledger parts by {worst}");
    assert!(ended == 300, "only {ended} of 300 ended by themselves");
    assert!(most < 1500, "{most} steps");
}

#[test]
fn law_more_current_is_never_slower_and_more_load_never_faster() {
    let mut draw = Draw::new(72);
    for case in 0..150 {
        let setup = draw.setup(1);
        let slow = suited(&mut draw, &setup);
        let from = start(&mut draw);
        let mut fast = slow;
        fast.current = Band::exact(1.3 * slow.current.typical);
        fast.trickle = slow.trickle * 1.3;
        let times = [slow, fast].map(|c| charger::simulate(&setup, &c, &from));
        // A cell that is charged faster is warmer too, which changes what it takes by a little.
        if let [Some(a), Some(b)] = [times[0].to_mostly, times[1].to_mostly] {
            assert!(b.0 <= a.0 * (1.0 + 1e-6), "case {case}: {a} at the lower current, {b} at the higher");
        }
        let load = Amps(0.5 * slow.termination.0);
        let loaded = charger::simulate(&setup, &slow, &ChargeStart { load, ..from });
        if let [Some(a), Some(b)] = [times[0].to_mostly, loaded.to_mostly] {
            assert!(b.0 >= a.0 * (1.0 - 1e-6), "case {case}: {a} alone, {b} with a load");
        }
    }
}

#[test]
fn law_a_replay_of_the_constant_current_ends_at_the_same_voltage() {
    let mut draw = Draw::new(74);
    let mut seen = 0;
    for case in 0..200 {
        let setup = draw.setup(1);
        let charger = suited(&mut draw, &setup);
        let from = start(&mut draw);
        let run = charger::simulate(&setup, &charger, &from);
        let [trickle, constant, _] = run.phases;
        let end = run.trace.iter().rfind(|p| p.phase == Phase::ConstantCurrent);
        // In one go: a cell that warms can take the constant current a second time.
        let plain =
            |e: &&ChargePoint| trickle.0 == 0.0 && e.time == constant && constant.0 > 60.0 && e.soc < 1.0;
        let Some(end) = end.filter(plain) else { continue };
        seen += 1;
        let begin = ReplayStart { soc: from.soc, temperature: from.ambient, ambient: from.ambient };
        let current = Amps(-charger.current.typical);
        let record = [Recorded { time: Seconds(0.0), current }, Recorded { time: constant, current }];
        let replayed = replay::run(&setup.cell, &begin, &record)[1];
        let apart = (replayed.voltage - end.cell).0;
        assert!(apart.abs() < 1e-3, "case {case}: {} and {}", replayed.voltage, end.cell);
        assert!((replayed.temperature - end.temperature).0.abs() < 0.05, "case {case}");
    }
    assert!(seen > 100, "only {seen} of 200 have a constant current of a minute");
}

#[test]
fn hostile_chargers_stay_bounded_and_finite() {
    let mut draw = Draw::new(73);
    let mut met = [0; 6];
    for case in 0..2000 {
        let mut setup = draw.setup(1);
        if draw.chance(0.2) {
            setup.cell.heat_capacity_j_per_k = draw.log(1e-3, 1.0);
        }
        if draw.chance(0.2) {
            for branch in &mut setup.cell.branches {
                branch.time_constant.0 = draw.log(1e-6, 1e7);
            }
        }
        let current = draw.log(1e-3, 50.0);
        let charger = Charger {
            current: Band::exact(current),
            float: Band::exact(draw.even(2.0, 5.0)),
            termination: Amps(current * draw.log(1e-4, 0.99)),
            trickle_below: Volts(draw.even(0.0, 4.0)),
            trickle: Amps(if draw.chance(0.1) { 0.0 } else { current * draw.log(1e-4, 0.99) }),
            input: Volts(draw.even(2.5, 30.0)),
            load_while_charging: Amps(0.0),
            ambient: (Celsius(10.0), Celsius(30.0)),
            power_limit: None,
        };
        let from = ChargeStart {
            soc: draw.unit(),
            ambient: Celsius(draw.even(-40.0, 70.0)),
            load: Amps(if draw.chance(0.5) { 0.0 } else { draw.log(1e-3, 60.0) }),
        };
        let run = charger::simulate(&setup, &charger, &from);
        assert!(finite(&run), "case {case}: {run:?}");
        assert!(
            run.steps <= MAX_STEPS + 1 && run.trace.len() < 100,
            "case {case}: {} places",
            run.trace.len()
        );
        met[run.end as usize] += 1;
        let left = charger::load_left_on(&charger, from.load);
        match run.end {
            End::Terminated => assert!(left.terminates, "case {case}"),
            End::NeverTerminates => assert!(!left.terminates, "case {case}"),
            End::NeverRecovers => assert!(left.in_trickle.0 <= 0.0, "case {case}"),
            End::DischargesWhileCharging => assert!(left.in_constant_current.0 <= 0.0, "case {case}"),
            End::BeyondFull | End::WorkLimit => {}
        }
    }
    assert!(met[..5].iter().all(|n| *n > 20), "every end is met: {met:?}");
    assert!(met[5] < 5, "{} of 2000 reach the bound of work", met[5]);
}
