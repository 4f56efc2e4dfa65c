//! The hazards: for every threshold a design just inside and one just outside it, and published figures against the
//! functions that the checks use.
//!
//! The designs are flat ones, so that currents and temperatures are formulas. A side is a ten-thousandth from the
//! threshold, or what the test says.

use strikeline_core::arrangements::{self, By, Given};
use strikeline_core::board::{Board, OverDischarge, Threshold};
use strikeline_core::charge;
use strikeline_core::hazard::{
    self, Case, Circumstances, ContactPart, Hazards, Kind, Level, NotJudged, StoredTier, hazards,
};
use strikeline_core::load::LitDraw;
use strikeline_core::margins::{self, Corners};
use strikeline_core::math::{Monotone, Polyline};
use strikeline_core::press::{self, PressOptions, PressStart};
use strikeline_core::ratings::{
    Band, CellRatings, Charger, Contact, Fuse, FuseKind, Keeping, LeadRating, Output, OverCharge, Ratings,
};
use strikeline_core::report::{Limit, PressEnd, Protector};
use strikeline_core::setup::{Arrangement, Setup};
use strikeline_core::time_current;
use strikeline_core::units::{AmpHours, Amps, Celsius, Farads, Ohms, Seconds, Volts, Watts};
use strikeline_core::verdict::{self, Word};
use strikeline_core::wiring;
use strikeline_tests::draw::Draw;
use strikeline_tests::flat;

/// A design with everything that the checks look at.
#[derive(Clone)]
struct Design {
    nominal: Setup,
    early: Option<Board>,
    late: Option<Board>,
    ratings: Ratings,
    /// Whether a charge at the coldest temperature is given.
    cold: bool,
    /// What the weak parts have more in the path.
    weak_ohm: f64,
}

/// 3.7 V behind 50 mΩ, a 50 mΩ board that trips at 3 A and at 2.4 V, 2 A for 0.1 s: nothing is wrong with it.
fn sound() -> Design {
    let mut cell = flat::cell(Volts(3.7), Ohms(0.05));
    cell.capacity = AmpHours(2.8);
    let mut nominal = flat::with_board(
        flat::setup(cell, Ohms(0.0), flat::load(LitDraw::Current(Amps(2.0))), Seconds(0.1)),
        board(),
    );
    nominal.usage.max_presses = 2;
    let ratings = Ratings {
        cell: CellRatings {
            it: Amps(2.8),
            continuous: Some(Amps(5.0)),
            pulse: Some(Amps(10.0)),
            pulse_time: Seconds(1.0),
            charge: Some(Amps(1.4)),
            voltage_max: Volts(4.2),
            voltage_min: Volts(2.4),
            discharge_window: (Celsius(-20.0), Celsius(60.0)),
            charge_window: (Celsius(0.0), Celsius(45.0)),
        },
        charger: Some(Charger {
            current: Band { low: 0.9, typical: 1.0, high: 1.1 },
            float: Band { low: 4.137, typical: 4.2, high: 4.2 },
            termination: Amps(0.1),
            trickle_below: Volts(2.9),
            trickle: Amps(0.1),
            input: Volts(5.0),
            load_while_charging: Amps(0.0),
            ambient: (Celsius(5.0), Celsius(35.0)),
            power_limit: Some(Watts(3.0)),
        }),
        board_over_charge: Some(OverCharge {
            threshold: Band { low: 4.25, typical: 4.3, high: 4.35 },
            charge_sense: None,
        }),
        second_over_charge: None,
        fuse: None,
        leads: vec![lead(0.75)],
        button: Contact { current: Some(Amps(50.0)), voltage: Some(Volts(12.0)) },
        connector: Contact { current: Some(Amps(50.0)), voltage: Some(Volts(12.0)) },
        output: Output { voltage: Some(Volts(12.0)), capacitance: None },
        keeping: Keeping {
            presses_per_day: 10.0,
            storage_days: 90.0,
            held_hours: 0.0,
            cold: flat::ROOM,
            closed_case: false,
            parallel_mismatch: Volts(0.0),
        },
        load_estimated: false,
    };
    Design { nominal, early: None, late: None, ratings, cold: false, weak_ohm: 0.0 }
}

fn board() -> Board {
    let mut board = flat::board(Ohms(0.05), vec![flat::stage("over_current", Volts(0.15), Seconds(0.01))]);
    board.over_discharge = Some(OverDischarge { threshold: Volts(2.4), delay: Seconds(0.04) });
    // So small that it stays cold, but known.
    board.thermal_k_per_w = 1e-6;
    board
}

/// The same board with another threshold.
fn board_at(volts: f64) -> Board {
    let mut board = board();
    board.stages[0].threshold = Threshold::Sense(Volts(volts));
    board
}

/// Flexible copper in PVC, 0.1 m one way.
fn lead(area_mm2: f64) -> LeadRating {
    LeadRating {
        cell_side: true,
        area_mm2,
        length_m: 0.1,
        ohm_per_m_20: wiring::per_km_20(area_mm2, wiring::Conductor::Flexible) * 1e-3,
        initial: Celsius(70.0),
        last: Celsius(160.0),
        continuous: Celsius(70.0),
    }
}

fn quick(rating: f64) -> Fuse {
    Fuse { rating: Amps(rating), kind: FuseKind::Quick, breaking: Some(Amps(1500.0)), resistance: None }
}

impl Design {
    fn look(&self) -> Hazards {
        let charged = charge::run(&self.nominal);
        let cold = self.cold.then(|| {
            let mut setup = self.nominal.clone();
            setup.usage.ambient = self.ratings.keeping.cold;
            charge::run(&setup)
        });
        let with = |board: &Option<Board>| {
            let mut setup = self.nominal.clone();
            setup.board = board.clone().or(setup.board);
            setup
        };
        let (low, high) = (with(&self.early), with(&self.late));
        let mut weak = self.nominal.clone();
        weak.path.after = weak.path.after + Ohms(self.weak_ohm);
        hazards(&Circumstances {
            corners: Corners { low: &low, typical: &self.nominal, high: &high },
            weak: &weak,
            charge: &charged,
            weak_charge: None,
            cold_charge: cold.as_ref(),
            ratings: &self.ratings,
        })
    }

    fn draw(&mut self, amps: f64) {
        self.nominal.load.lit = LitDraw::Current(Amps(amps));
    }

    fn charger(&mut self) -> &mut Charger {
        self.ratings.charger.as_mut().expect("a sound design has one")
    }

    fn no_board(&mut self) {
        self.nominal.arrangement = Arrangement::NoBoard;
    }

    fn over_discharge(&mut self, od: Option<OverDischarge>) {
        self.nominal.board.as_mut().expect("a sound design has one").over_discharge = od;
    }
}

fn level(found: &Hazards, of: impl Fn(&Kind) -> bool) -> Option<Level> {
    found.findings.iter().find(|f| of(&f.kind)).map(|f| f.level)
}

const NONE: Option<Level> = None;
const NOTE: Option<Level> = Some(Level::Note);
const LOOK: Option<Level> = Some(Level::Look);
const STOP: Option<Level> = Some(Level::Stop);

/// One parameter on two sides of a threshold.
#[track_caller]
fn edge(
    what: &str,
    of: impl Fn(&Kind) -> bool,
    set: impl Fn(&mut Design, f64),
    sides: [(f64, Option<Level>); 2],
) {
    for (value, want) in sides {
        let mut design = sound();
        set(&mut design, value);
        let found = design.look();
        let got = level(&found, &of);
        assert_eq!(got, want, "{what} at {value}: {:?}", found.findings);
    }
}

/// The two sides of `at`, a ten-thousandth away: below, above.
fn around(at: f64, below: Option<Level>, above: Option<Level>) -> [(f64, Option<Level>); 2] {
    [(at * (1.0 - 1e-4), below), (at * (1.0 + 1e-4), above)]
}

macro_rules! is {
    ($kind:pat) => {
        |kind: &Kind| matches!(kind, $kind)
    };
}

#[test]
fn exact_a_sound_design_has_notes_only() {
    let found = sound().look();
    let other: Vec<_> = found.findings.iter().filter(|f| f.level != Level::Note).collect();
    assert!(other.is_empty(), "{other:?}");
    assert!(!found.has_stop());
    assert!(found.not_judged.is_empty(), "{:?}", found.not_judged);
    assert!(found.checks_made >= 35, "{} checks", found.checks_made);
    println!("{} checks", found.checks_made);
}

#[test]
fn exact_nuisance_trip() {
    let trip = is!(Kind::NuisanceTrip { .. });
    edge("draw against a 3 A trip", trip, |d, i| d.draw(i), around(3.0, NONE, LOOK));
    let banded = |d: &mut Design, i: f64| {
        d.draw(i);
        d.early = Some(board_at(0.12));
        d.late = Some(board_at(0.18));
    };
    edge("draw against the band's lower end", trip, banded, around(2.4, NONE, LOOK));
    let certain = is!(Kind::NuisanceTrip { certain: true, .. });
    edge("draw against the band's upper end", certain, banded, around(3.6, NONE, LOOK));
    let peaked = |d: &mut Design, i: f64| {
        d.draw(i);
        d.nominal.load.peak_factor = 1.5;
    };
    edge("peak draw", trip, peaked, around(2.0, NONE, LOOK));
    let late = |d: &mut Design, delay: f64| {
        d.draw(3.5);
        d.nominal.board.as_mut().expect("a board").stages[0].delay = Seconds(delay);
    };
    edge("delay against the press", trip, late, [(0.0999, LOOK), (0.1001, NONE)]);
    // 2 A + 5 A·exp(−t/τ) is above 3 A for τ·ln 5; the delay is 10 ms.
    let surge = |d: &mut Design, tau: f64| {
        d.nominal.load.surge = Amps(5.0);
        d.nominal.load.surge_time = Seconds(tau);
    };
    let tau = 0.01 / 5.0_f64.ln();
    edge("surge against the delay", trip, surge, [(0.998 * tau, NONE), (1.002 * tau, LOOK)]);
    let mut design = sound();
    banded(&mut design, 3.3);
    let found = design.look();
    let kind = found.findings.iter().map(|f| &f.kind).find(|k| trip(k)).expect("it trips");
    let Kind::NuisanceTrip { limit, case, soc, draw, trip, certain } = kind else { panic!("{kind:?}") };
    assert_eq!((*limit, *case), (Limit::Stage(Protector::Board, 0), Case::Ambient));
    assert!(!certain && *soc == 1.0 && (draw.0 - 3.3).abs() < 1e-4, "{kind:?}");
    for (got, want) in [(trip.low, 2.4), (trip.typical, 3.0), (trip.high, 3.6)] {
        assert!((got - want).abs() < 1e-9, "{trip:?}");
    }
}

#[test]
fn exact_nuisance_trip_in_the_cold_alone() {
    // The draw is a resistance: 2.9 A warm; a cell whose voltage rises in the cold by 1 mV/K gives more.
    let design = |cold: f64| {
        let mut d = sound();
        d.nominal.load.lit = LitDraw::Resistance(Ohms(3.7 / 2.9 - 0.1));
        d.nominal.cell.entropy = Polyline::constant(-5e-3);
        d.ratings.keeping.cold = Celsius(cold);
        d.cold = true;
        d
    };
    // (3.7 + 0.005·x)/(3.7/2.9) = 3 A at x = 25.517 K.
    let cold = is!(Kind::NuisanceTrip { case: Case::Cold, .. });
    let warm = is!(Kind::NuisanceTrip { case: Case::Ambient, .. });
    let degrees = 25.0 - (3.0 * 3.7 / 2.9 - 3.7) / 5e-3;
    for (t, want) in [(degrees + 0.05, NONE), (degrees - 0.05, LOOK)] {
        let found = design(t).look();
        assert_eq!(level(&found, cold), want, "{t} °C: {:?}", found.findings);
        assert_eq!(level(&found, warm), NONE);
    }
    let mut without = design(0.0);
    without.cold = false;
    assert_eq!(without.look().not_judged, [NotJudged::ColdCharge]);
}

#[test]
fn exact_board_never_trips_on_a_short() {
    let never = is!(Kind::NeverTripsOnShort { .. });
    // 3 A flow through 3.7/3 Ω, of which 0.1 Ω are cell and board.
    let after = 3.7 / 3.0 - 0.1;
    let leads = |d: &mut Design, ohm: f64| {
        d.draw(1.0);
        d.nominal.path.after = Ohms(ohm);
    };
    edge("leads too long", never, leads, around(after, NONE, STOP));
    let late = |d: &mut Design, ohm: f64| {
        leads(d, ohm);
        d.late = Some(board_at(0.18));
    };
    edge("late board", never, late, around(3.7 / 3.6 - 0.1, NONE, STOP));
    // A weak cell: its voltage breaks down, so over-discharge detection opens instead.
    let weak = |d: &mut Design, ohm: f64| {
        d.draw(0.5);
        d.nominal.cell.r0 = Ohms(ohm);
    };
    edge("cell too weak", never, weak, around(3.7 / 3.0 - 0.05, NONE, LOOK));
    // 3 A are twelve times 0.25 A: a quick fuse of that rating is open within 20 ms.
    let fused = |d: &mut Design, rating: f64| {
        leads(d, 1.001 * after);
        d.ratings.fuse = Some(quick(rating));
    };
    // 2.1 times the rating opens within half an hour; the lead stands 3 A for 7439/9 s = 826 s.
    edge("fuse instead", never, fused, [(0.25, LOOK), (1.45, STOP)]);
}

#[test]
fn exact_short_ahead_of_the_board() {
    let ahead = is!(Kind::ShortAheadOfBoard { .. });
    let mut d = sound();
    let found = d.look();
    assert_eq!(level(&found, ahead), NOTE);
    // 3.7 V over the cell's own 50 mΩ.
    let current = number(&d, |k| match k {
        Kind::ShortAheadOfBoard { current, .. } => Some(current.0),
        _ => None,
    });
    assert!((current - 74.0).abs() < 1e-9, "{current}");
    d.ratings.fuse = Some(quick(3.0));
    assert_eq!(level(&d.look(), ahead), NONE);
    d.ratings.fuse = None;
    d.nominal.second_protector = Some(board());
    assert_eq!(level(&d.look(), ahead), NONE);
    d.nominal.second_protector = None;
    d.nominal.board = None;
    d.no_board();
    assert_eq!(level(&d.look(), ahead), NONE, "there it is told as a short without protection");
}

/// The current at which a quick fuse between 2.1 times its rating (1800 s) and 2.75 times (3 s) takes as long as the
/// lead stands: both are straight lines over the logarithm of the current.
fn fuse_meets_lead(rating: f64) -> f64 {
    let k2s2 = (226.0 * 0.75 * (394.5_f64 / 304.5).ln().sqrt()).powi(2);
    let slope = 600.0_f64.ln() / (2.75_f64 / 2.1).ln();
    (((1800.0 / k2s2).ln() + slope * (2.1 * rating).ln()) / (slope - 2.0)).exp()
}

#[test]
fn exact_the_gravest_short_is_told() {
    // Full, 2.98 A open the fuse in time; empty, the current may be too small for that, and nothing opens.
    let never = is!(Kind::NeverTripsOnShort { .. });
    let design = |d: &mut Design, empty: f64| {
        d.draw(0.5);
        d.nominal.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![empty, 3.7]).expect("two points");
        d.nominal.path.after = Ohms(1.14);
        d.ratings.fuse = Some(quick(1.0));
    };
    edge("empty cell", never, design, around(1.24 * fuse_meets_lead(1.0), STOP, LOOK));
    // The stage is there, but it does not open on the short: a fuse that cannot interrupt it is all there is.
    let breaking = is!(Kind::FuseBreaking { .. });
    let small = |d: &mut Design, i: f64| {
        design(d, 2.7);
        d.ratings.fuse = Some(Fuse { breaking: Some(Amps(i)), ..quick(1.0) });
    };
    edge("breaking capacity", breaking, small, around(3.7 / 1.24, STOP, NONE));
}

#[test]
fn exact_short_without_protection() {
    let bare = is!(Kind::ShortUnprotected { .. });
    let mut d = sound();
    assert_eq!(level(&d.look(), bare), NONE);
    for arrangement in [Arrangement::LoadAtCell, Arrangement::SwitchBridged, Arrangement::NoBoard] {
        d.nominal.arrangement = arrangement;
        assert_eq!(level(&d.look(), bare), STOP);
    }
    // 37 A; the lead stands k²S²/I². Between 2.1 times (30 min) and 2.75 times (3 s) the gates are a line.
    let k = 226.0 * (394.5_f64 / 304.5).ln().sqrt();
    let limit = (k * 0.75 / 37.0).powi(2);
    let part = (1800.0 / limit).ln() / (1800.0_f64 / 3.0).ln();
    let multiple = 2.1 * (2.75_f64 / 2.1).powf(part);
    let fused = |d: &mut Design, rating: f64| {
        d.no_board();
        d.nominal.path.after = Ohms(0.05);
        d.ratings.fuse = Some(quick(rating));
    };
    edge("fuse against the lead", bare, fused, around(37.0 / multiple, LOOK, STOP));
    // At 37 A it is in time; with weak parts the current may be too small for that.
    let weak = |d: &mut Design, ohm: f64| {
        fused(d, 3.7);
        d.weak_ohm = ohm;
    };
    let until = 3.7 / fuse_meets_lead(3.7) - 0.1;
    edge("weak parts", bare, weak, around(until, LOOK, STOP));
    // It counts only if it can interrupt the current.
    let breaking = |d: &mut Design, i: f64| {
        fused(d, 5.0);
        d.ratings.fuse.as_mut().expect("a fuse").breaking = Some(Amps(i));
    };
    edge("breaking capacity", bare, breaking, around(37.0, STOP, LOOK));
    let mut d = sound();
    fused(&mut d, 5.0);
    let found = d.look();
    let Kind::ShortUnprotected { full, quick_fuse, fuse_clears, lead_limit, .. } =
        &found.findings.iter().find(|f| bare(&f.kind)).expect("no board").kind
    else {
        panic!("{found:?}")
    };
    assert!((full.current.0 - 37.0).abs() < 1e-9);
    assert!((lead_limit.expect("a lead").0 - limit).abs() < 1e-9);
    // 7.4 times: between 0.4 s at 4 and 0.04 s at 10 times.
    let clears = 0.4 * 0.1_f64.powf((7.4_f64 / 4.0).ln() / 2.5_f64.ln());
    assert!((fuse_clears.expect("it clears").0 - clears).abs() < 1e-9);
    let (least, most) = quick_fuse.expect("one fits");
    assert!((least.0 - 2.0).abs() < 1e-4 && (most.0 - 37.0 / multiple).abs() < 1e-6, "{least} to {most}");
    // A draw above what such a fuse carries: none fits.
    let fits = is!(Kind::ShortUnprotected { quick_fuse: Some(_), .. });
    let drawn = |d: &mut Design, i: f64| {
        fused(d, 5.0);
        d.draw(i);
    };
    edge("draw against the largest fuse", fits, drawn, around(37.0 / multiple, LOOK, NONE));
}

#[test]
fn exact_what_an_arrangement_loses() {
    let loses = is!(Kind::ArrangementLoses { .. });
    let bare = is!(Kind::OverDischargeUnprotected { .. });
    let mut d = sound();
    assert_eq!((level(&d.look(), loses), level(&d.look(), bare)), (NONE, NONE));
    d.over_discharge(None);
    assert_eq!((level(&d.look(), loses), level(&d.look(), bare)), (NONE, STOP));
    let mut d = sound();
    d.no_board();
    let found = d.look();
    assert_eq!((level(&found, loses), level(&found, bare)), (STOP, STOP));
    assert!(found.has_stop());
    // A fuse is left against a short circuit, and nothing against over-discharge.
    d.ratings.fuse = Some(quick(3.0));
    assert_eq!(level(&d.look(), loses), STOP);
    d.ratings.fuse = None;
    // A second protector in the wrap stays in the path.
    d.nominal.second_protector = Some(board());
    let found = d.look();
    assert_eq!((level(&found, loses), level(&found, bare)), (LOOK, NONE));
    let Kind::ArrangementLoses { left, through_board, .. } =
        &found.findings.iter().find(|f| loses(&f.kind)).expect("no board").kind
    else {
        panic!("{found:?}")
    };
    assert_eq!((left.over_current, left.short_circuit, left.over_discharge, left.over_charge), (1, 1, 1, 0));
    assert_eq!(
        (through_board.over_current, through_board.over_discharge, through_board.over_charge),
        (2, 2, 1)
    );
}

/// Which layers the four arrangements keep: (arrangement, board in the load's path, board against over-charge).
#[test]
fn exact_layers_of_the_four_arrangements() {
    let mut d = sound();
    d.nominal.second_protector = Some(board());
    d.ratings.second_over_charge = d.ratings.board_over_charge;
    d.ratings.board_over_charge = Some(OverCharge {
        threshold: Band { low: 4.25, typical: 4.3, high: 4.35 },
        charge_sense: Some(Band { low: 0.08, typical: 0.1, high: 0.12 }),
    });
    d.ratings.fuse = Some(quick(5.0));
    let charged = charge::run(&d.nominal);
    let (mut low, mut high) = (d.nominal.clone(), d.nominal.clone());
    (low.board, high.board) = (Some(board_at(0.12)), Some(board_at(0.18)));
    let given = Given {
        corners: Corners { low: &low, typical: &d.nominal, high: &high },
        charge: &charged,
        ratings: &d.ratings,
    };
    let of = |layers: &[arrangements::Layer]| layers.iter().map(|l| l.by).collect::<Vec<_>>();
    use Protector::{Board as B, Second as S};
    for (a, (load, charger)) in arrangements::compare(&given).iter().zip([
        (true, true),
        (false, true),
        (false, false),
        (false, false),
    ]) {
        let with = |board: bool, first: By, second: Vec<By>| {
            board.then_some(first).into_iter().chain(second).collect::<Vec<_>>()
        };
        let currents = with(load, By::Stage(B, 0), vec![By::Stage(S, 0), By::Fuse]);
        assert_eq!(of(&a.over_current), currents, "{:?}", a.arrangement);
        assert_eq!(of(&a.short_circuit), currents, "{:?}", a.arrangement);
        let low = with(load, By::OverDischarge(B), vec![By::OverDischarge(S)]);
        assert_eq!(of(&a.over_discharge), low, "{:?}", a.arrangement);
        let full = with(charger, By::OverCharge(B), vec![By::OverCharge(S)]);
        assert_eq!(of(&a.over_charge), full, "{:?}", a.arrangement);
        let back = with(charger, By::ChargeOverCurrent(B), vec![]);
        assert_eq!(of(&a.charge_over_current), back, "{:?}", a.arrangement);
        if load {
            let band = a.over_current[0].full.expect("a stage has a current");
            for (got, want) in [(band.low, 2.4), (band.typical, 3.0), (band.high, 3.6)] {
                assert!((got - want).abs() < 1e-9, "{band:?}");
            }
            let back = a.charge_over_current[0].full.expect("a sense voltage has a current");
            assert!((back.typical - 2.0).abs() < 1e-9, "{back:?}");
        }
        // 0.05 of cell, 0.05 of each pair that is in the path.
        let total = 0.1 + if load { 0.05 } else { 0.0 };
        let short = &a.short_full;
        assert!((short.current.0 - 3.7 / total).abs() < 1e-9, "{:?}", a.arrangement);
        let heat = short.cell + short.second + short.ahead + short.pair + short.after;
        assert!((heat.0 - 3.7 * short.current.0).abs() < 1e-9, "all of the power is somewhere: {heat}");
    }
}

#[test]
fn law_trip_current_is_that_of_the_margins_where_the_path_can_give_it() {
    let mut draw = Draw::new(7);
    let mut met = 0;
    for _ in 0..200 {
        let mut d = sound();
        let volts = draw.even(2.5, 4.2);
        d.nominal.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![volts; 2]).expect("two points");
        d.nominal.cell.r0 = Ohms(draw.log(0.01, 0.3));
        d.nominal.path.ahead = Ohms(draw.log(1e-3, 0.1));
        d.nominal.load.peak_factor = draw.even(1.0, 2.0);
        let mut second = board_at(draw.even(0.05, 0.5));
        second.on_resistance = Polyline::new(vec![2.0, 4.0], vec![0.08, 0.03]).expect("two points");
        d.nominal.board = Some(second.clone());
        d.nominal.second_protector = Some(second.clone());
        let mut start = PressStart::relaxed(&d.nominal, 0.5, flat::ROOM);
        start.switch_temperature = Celsius(draw.even(-20.0, 100.0));
        let mut place = margins::Place::rested(0.5, flat::ROOM);
        place.switch = start.switch_temperature;
        for protector in [Protector::Board, Protector::Second] {
            let Some(trip) = margins::trip_current(&d.nominal, &place, Limit::Stage(protector, 0)) else {
                continue;
            };
            let factor = d.nominal.load.peak_factor;
            let ours = arrangements::trip_needed(&d.nominal, protector, &second.stages[0], &start, factor);
            assert!((ours / trip - 1.0).abs() < 1e-8, "{protector:?}: {ours} against {trip}");
            met += 1;
        }
    }
    assert!(met > 200, "{met} of 400 can be reached");
}

#[test]
fn exact_held_button() {
    // U = 2 + 2z through R in all: z' = −U/(R·Q), so U = 4·exp(−2t/(R·Q)). The terminals are at U·10/10.5.
    let mut d = sound();
    d.no_board();
    d.nominal.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![2.0, 4.0]).expect("two points");
    d.nominal.cell.r0 = Ohms(0.5);
    d.nominal.load.unlit = Ohms(10.0);
    let start = PressStart::relaxed(&d.nominal, 1.0, flat::ROOM);
    let held = arrangements::held(&d.nominal, &start);
    let rq = 10.5 * 2.8 * 3600.0;
    let at = |volts: f64| 0.5 * rq * (4.0 / (volts * 1.05)).ln();
    let near = |what: &str, got: Option<Seconds>, want: f64| {
        let got = got.expect(what).0;
        assert!((got / want - 1.0).abs() < 1e-5, "{what}: {got} s, by algebra {want} s");
    };
    near("3.0 V", held.to_3_0, at(3.0));
    near("2.5 V", held.to_2_5, at(2.5));
    near("2.0 V", held.to_2_0, at(2.0));
    near("empty", held.to_empty, 0.5 * rq * 2.0_f64.ln());
    assert!((held.draw.0 - 4.0 / 10.5).abs() < 1e-9 && held.opened.is_none());
    // A board that opens at 2.8 V of supply, 40 ms later, keeps it from 2.5 V.
    let mut board = board();
    board.on_resistance = Polyline::constant(0.0);
    board.over_discharge = Some(OverDischarge { threshold: Volts(2.8), delay: Seconds(0.04) });
    let through = flat::with_board(d.nominal.clone(), board);
    let held = arrangements::held(&through, &start);
    let (protector, opened) = held.opened.expect("it opens");
    assert_eq!(protector, Protector::Board);
    assert!((opened.0 / (at(2.8) + 0.04) - 1.0).abs() < 1e-5, "{opened}");
    near("3.0 V before it opens", held.to_3_0, at(3.0));
    assert_eq!((held.to_2_5, held.to_2_0, held.to_empty), (None, None, None));
    // One that opens at 1.9 V is not reached before the cell is empty, and then at once; 2.0 V comes before it.
    let mut late = through.clone();
    late.board.as_mut().expect("a board").over_discharge =
        Some(OverDischarge { threshold: Volts(1.9), delay: Seconds(0.04) });
    late.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![2.4, 4.0]).expect("two points");
    let held = arrangements::held(&late, &start);
    let empty = held.to_empty.expect("it runs out");
    let (protector, opened) = held.opened.expect("it opens");
    assert_eq!((protector, opened), (Protector::Board, Seconds(empty.0 + 0.04)));
    assert_eq!(held.to_2_0, Some(empty));
    assert!(held.to_2_5.expect("it falls").0 < empty.0);
    late.board.as_mut().expect("a board").over_discharge =
        Some(OverDischarge { threshold: Volts(2.2), delay: Seconds(0.04) });
    assert_eq!(arrangements::held(&late, &start).to_2_0, None, "it opens at 2.2 V");
    // Branches that have settled are resistance: 0.3 Ω behind 20 s and 0.2 Ω at once are 0.5 Ω to 10⁻³ of an hour.
    let mut slow = d.nominal.clone();
    slow.cell.r0 = Ohms(0.2);
    slow.cell.branches =
        vec![strikeline_core::cell::Branch { resistance: Ohms(0.3), time_constant: Seconds(20.0) }];
    let held = arrangements::held(&slow, &start);
    let got = held.to_3_0.expect("it falls").0;
    assert!((got - at(3.0)).abs() < 20.0, "{got} s against {} s", at(3.0));
}

#[test]
fn exact_held_button_is_what_a_long_press_gives() {
    // The same fall by the press's own equations, with a cell that has everything.
    let mut d = sound();
    d.no_board();
    let cell = &mut d.nominal.cell;
    cell.capacity = AmpHours(0.8);
    cell.ocv = Monotone::new(vec![0.0, 0.1, 0.5, 1.0], vec![2.0, 3.4, 3.7, 4.2]).expect("four points");
    cell.r0_shape = Polyline::new(vec![0.0, 0.2, 1.0], vec![2.5, 1.2, 0.9]).expect("three points");
    cell.r0_activation = 20_000.0;
    cell.branches = vec![
        strikeline_core::cell::Branch { resistance: Ohms(0.02), time_constant: Seconds(3.0) },
        strikeline_core::cell::Branch { resistance: Ohms(0.04), time_constant: Seconds(60.0) },
    ];
    cell.heat_capacity_j_per_k = 20.0;
    cell.cooling_w_per_k = 0.05;
    d.nominal.load.unlit = Ohms(5.0);
    d.nominal.load.strike = Volts(9.0);
    d.nominal.load.hold = Volts(8.0);
    d.nominal.usage.press = Seconds(20_000.0);
    let start = PressStart::relaxed(&d.nominal, 0.4, flat::ROOM);
    let held = arrangements::held(&d.nominal, &start);
    let times = [held.to_3_0, held.to_2_5, held.to_2_0].map(|t| t.expect("it falls").0);
    let options =
        strikeline_core::press::PressOptions { samples: times.map(Seconds).to_vec(), ..Default::default() };
    let report = strikeline_core::press::run(&d.nominal, &start, &options);
    for (sample, want) in report.trace.iter().zip([3.0, 2.5, 2.0]) {
        assert!((sample.cell.0 - want).abs() < 2e-3, "{} V at {} s, wanted {want}", sample.cell, sample.time);
    }
    assert_eq!(report.trace.len(), 3);
}

#[test]
fn exact_over_charge() {
    let none = is!(Kind::NoOverChargeLayer { .. });
    let mut d = sound();
    assert_eq!(level(&d.look(), none), NONE);
    d.nominal.arrangement = Arrangement::LoadAtCell;
    assert_eq!(level(&d.look(), none), NONE, "the charger still sits behind the board");
    for arrangement in [Arrangement::SwitchBridged, Arrangement::NoBoard] {
        d.nominal.arrangement = arrangement;
        assert_eq!(level(&d.look(), none), STOP);
    }
    let float = is!(Kind::FloatAboveCell { .. });
    edge("float tolerance", float, |d, v| d.charger().float.high = v, around(4.2, NONE, LOOK));
    let typical = |d: &mut Design, v: f64| {
        d.charger().float.typical = v;
        d.charger().float.high = 4.3;
    };
    edge("float", float, typical, around(4.2, LOOK, STOP));
    let high = is!(Kind::OverChargeTooHigh { .. });
    let threshold = |d: &mut Design, v: f64| {
        d.ratings.board_over_charge.as_mut().expect("a board").threshold.high = v;
    };
    edge("over-charge detection", high, threshold, around(4.35, NONE, STOP));
}

#[test]
fn exact_charging() {
    let above = is!(Kind::ChargeAboveLimit { .. });
    let limit = |d: &mut Design, i: f64| d.ratings.cell.charge = Some(Amps(i));
    edge("charge current by tolerance", above, limit, around(1.1, LOOK, NONE));
    edge("charge current", above, limit, around(1.0, STOP, LOOK));
    let two = |d: &mut Design, i: f64| {
        limit(d, i);
        d.nominal.cell.parallel = 2;
    };
    edge("charge current of each of two", above, two, around(0.55, LOOK, NONE));
    let it = is!(Kind::ChargeAboveIt { .. });
    edge("1 It, allowed by its maker", it, |d, i| d.ratings.cell.it = Amps(i), around(1.0, NOTE, NONE));
    let unknown = |d: &mut Design, i: f64| {
        d.ratings.cell.it = Amps(i);
        d.ratings.cell.charge = None;
    };
    edge("1 It, maker's limit unknown", it, unknown, around(1.0, STOP, NONE));
    let t = is!(Kind::ChargeTemperature { .. });
    let cold = |d: &mut Design, t: f64| d.charger().ambient.0 = Celsius(t);
    let hot = |d: &mut Design, t: f64| d.charger().ambient.1 = Celsius(t);
    edge("charged in the cold", t, cold, [(0.0, NONE), (-0.01, STOP)]);
    edge("charged in the heat", t, hot, [(45.0, NONE), (45.01, LOOK)]);
    edge("charged above any window", t, hot, [(60.0, LOOK), (60.01, STOP)]);
    let trickle = is!(Kind::TrickleAboveLimit { .. });
    edge("trickle", trickle, |d, i| d.charger().trickle = Amps(i), around(0.28, NONE, LOOK));
    let hot = is!(Kind::ChargerHot { .. });
    let power = |d: &mut Design, p: f64| d.charger().power_limit = Some(Watts(p));
    edge("charger's heat", hot, power, around(1.1 * 2.1, LOOK, NONE));
    let closed = |d: &mut Design, p: f64| {
        power(d, p);
        d.ratings.keeping.closed_case = true;
    };
    edge("charger's heat in a closed case", hot, closed, around(2.0 * 1.1 * 2.1, LOOK, NONE));
}

#[test]
fn exact_charging_while_loaded() {
    let load = |d: &mut Design, i: f64| d.charger().load_while_charging = Amps(i);
    let ends = is!(Kind::TerminationNeverReached { .. });
    edge("termination", ends, load, [(0.0999, NONE), (0.1, LOOK)]);
    let trickle = is!(Kind::TrickleNeverRecovers { .. });
    edge("trickle", trickle, load, [(0.0999, NONE), (0.1, LOOK)]);
    let bare = |d: &mut Design, i: f64| {
        load(d, i);
        d.over_discharge(None);
    };
    edge("trickle without over-discharge protection", trickle, bare, [(0.0999, NONE), (0.1, STOP)]);
    let press = is!(Kind::PressWhileCharging { .. });
    edge("press while charging", press, |d, i| d.charger().current.low = i, around(2.0, NOTE, NONE));
}

#[test]
fn exact_stored_energy_and_high_voltage() {
    let stored =
        |tier: StoredTier| move |k: &Kind| matches!(k, Kind::StoredEnergy { tier: t, .. } if *t == tier);
    let output = |volts: f64| {
        move |d: &mut Design, c: f64| {
            d.ratings.output = Output { voltage: Some(Volts(volts)), capacitance: Some(Farads(c)) };
        }
    };
    edge("0.1 µF at 400 V", stored(StoredTier::Capacitance), output(400.0), around(1e-7, NONE, STOP));
    edge("45 µC at 5 kV", stored(StoredTier::Charge), output(5e3), around(9e-9, NONE, STOP));
    edge("45 µC at 15 kV", stored(StoredTier::Charge), output(15e3), around(3e-9, NONE, STOP));
    edge("350 mJ at 20 kV", stored(StoredTier::Energy), output(20e3), around(1.75e-9, NONE, STOP));
    for (volts, tier) in [
        (42.4, None),
        (42.41, Some(StoredTier::Capacitance)),
        (450.0, Some(StoredTier::Capacitance)),
        (450.1, Some(StoredTier::Charge)),
        (15e3, Some(StoredTier::Charge)),
        (15_001.0, Some(StoredTier::Energy)),
    ] {
        assert_eq!(hazard::stored_tier(Volts(volts)), tier, "{volts} V");
    }
    let any = is!(Kind::StoredEnergy { .. });
    edge("1 mF at 42.4 V", any, output(42.4), [(1e-3, NONE), (1e-2, NONE)]);
    edge("1 mF at 42.5 V", any, output(42.5), [(1e-8, NONE), (1e-3, STOP)]);
    let high = is!(Kind::HighVoltage { .. });
    let volts = |d: &mut Design, v: f64| d.ratings.output.voltage = Some(Volts(v));
    edge("high voltage", high, volts, around(42.4, NOTE, LOOK));
    let mut d = sound();
    d.ratings.output.voltage = None;
    assert_eq!(level(&d.look(), high), LOOK);
    assert_eq!(d.look().not_judged, [NotJudged::OutputVoltage]);
    volts(&mut d, 1e4);
    assert_eq!(d.look().not_judged, [NotJudged::OutputCapacitance]);
}

#[test]
fn exact_cell_over_its_rating() {
    let over = is!(Kind::CellOverRating { .. });
    // Presses of 0.1 s without rest: the effective current is the draw.
    let continuous = |d: &mut Design, i: f64| d.ratings.cell.continuous = Some(Amps(i));
    edge("continuous", over, continuous, around(2.0, LOOK, NONE));
    edge("continuous by half", over, continuous, around(2.0 / 1.5, STOP, LOOK));
    edge("pulse", over, |d, i| d.ratings.cell.pulse = Some(Amps(i)), around(2.0, STOP, NONE));
    // A quarter of the time on: half of it is effective.
    let pulsed = |d: &mut Design, i: f64| {
        continuous(d, i);
        d.nominal.usage.rest = Seconds(0.3);
    };
    edge("effective current of pulses", over, pulsed, around(1.0, LOOK, NONE));
    let long = |d: &mut Design, pulse: f64| {
        pulsed(d, 1.5);
        d.ratings.cell.pulse_time = Seconds(pulse);
    };
    edge("press longer than a pulse", over, long, around(0.1, LOOK, NONE));
    let stuck = |d: &mut Design, hours: f64| {
        pulsed(d, 1.5);
        d.ratings.keeping.held_hours = hours;
    };
    edge("held button", over, stuck, [(0.0, NONE), (0.01, LOOK)]);
    let two = |d: &mut Design, i: f64| {
        continuous(d, i);
        d.nominal.cell.parallel = 2;
    };
    edge("each of two cells", over, two, around(1.0, LOOK, NONE));
    let low = is!(Kind::CellBelowWindow { .. });
    // 3.7 V − 2 A·50 mΩ.
    let least = |d: &mut Design, v: f64| d.ratings.cell.voltage_min = Volts(v);
    edge("lowest voltage", low, least, around(3.6, NONE, LOOK));
    let sagging = |d: &mut Design, r: f64| {
        d.nominal.cell.r0 = Ohms(r);
        d.over_discharge(None);
    };
    edge("below 2.0 V", low, sagging, around(1.7 / 2.0, LOOK, STOP));
    let window = is!(Kind::DischargeTemperature { .. });
    edge("hot use", window, |d, t| d.nominal.usage.ambient = Celsius(t), [(60.0, NONE), (60.01, LOOK)]);
    edge("cold use", window, |d, t| d.ratings.keeping.cold = Celsius(t), [(-20.0, NONE), (-20.01, LOOK)]);
}

#[test]
fn exact_a_trip_in_the_inrush_is_no_draw() {
    // 37 A into the empty capacitor open a stage without delay. What the parts carry is the draw that was to come.
    let mut d = sound();
    d.nominal.board.as_mut().expect("a board").stages.push(flat::stage("short", Volts(0.5), Seconds(0.0)));
    d.ratings.cell.voltage_min = Volts(2.5);
    let found = d.look();
    assert_eq!(level(&found, is!(Kind::NuisanceTrip { limit: Limit::Stage(_, 1), .. })), LOOK);
    assert_eq!(level(&found, is!(Kind::CellOverRating { .. })), NONE);
    assert_eq!(level(&found, is!(Kind::CellBelowWindow { .. })), NONE);
    let rated = |d: &mut Design, i: f64| {
        d.nominal.board.as_mut().expect("a board").stages.push(flat::stage(
            "short",
            Volts(0.5),
            Seconds(0.0),
        ));
        d.ratings.button.current = Some(Amps(i));
    };
    edge("draw that was to come", is!(Kind::ContactCurrent { .. }), rated, around(2.0, LOOK, NONE));
}

#[test]
fn exact_heat_of_the_cell() {
    let hot = is!(Kind::CellHot { .. });
    let touch = is!(Kind::Touch { .. });
    // 2 A through 50 mΩ are 0.2 W; a held button lasts until it has settled.
    let held = |d: &mut Design, cooling: f64| {
        d.ratings.keeping.held_hours = 1.0;
        d.nominal.cell.heat_capacity_j_per_k = 1.0;
        d.nominal.cell.cooling_w_per_k = cooling;
    };
    edge("60 °C", hot, held, around(0.2 / 35.0, LOOK, NONE));
    edge("80 °C", hot, held, around(0.2 / 55.0, STOP, LOOK));
    edge("48 °C to the touch", touch, held, around(0.2 / 23.0, LOOK, NONE));
    edge("65 °C to the touch", touch, held, around(0.2 / 40.0, STOP, LOOK));
    let closed = |d: &mut Design, cooling: f64| {
        held(d, cooling);
        d.ratings.keeping.closed_case = true;
    };
    edge("60 °C in a closed case", hot, closed, around(0.4 / 35.0, LOOK, NONE));
    // Not held: 0.02 J a press into 0.2 mJ/K are 100 K in a press, 2 presses.
    let pressed = |d: &mut Design, capacity: f64| d.nominal.cell.heat_capacity_j_per_k = capacity;
    edge(
        "60 °C in the charge",
        hot,
        pressed,
        [(0.04 / 35.1, LOOK), (0.04 / 34.9, NONE)].map(|(c, l)| (c, l)),
    );
}

#[test]
fn exact_heat_of_switches_and_leads() {
    let hot = is!(Kind::SwitchHot { .. });
    let held = |alpha: f64| {
        move |d: &mut Design, thermal: f64| {
            d.ratings.keeping.held_hours = 1.0;
            let board = d.nominal.board.as_mut().expect("a board");
            board.thermal_k_per_w = thermal;
            board.thermal_time = Seconds(1e6);
            board.alpha_per_k = alpha;
        }
    };
    // 2 A through 50 mΩ are 0.2 W.
    edge("100 °C", hot, held(0.0), around(75.0 / 0.2, NONE, LOOK));
    edge("150 °C", hot, held(0.0), around(125.0 / 0.2, LOOK, STOP));
    let runs = is!(Kind::SwitchHot { runs_away: true, .. });
    edge("no steady state", runs, held(0.004), around(1.0 / (0.2 * 0.004), NONE, STOP));
    let closed = |d: &mut Design, thermal: f64| {
        held(0.0)(d, thermal);
        d.ratings.keeping.closed_case = true;
    };
    edge("100 °C in a closed case", hot, closed, around(37.5 / 0.2, NONE, LOOK));
    let mut d = sound();
    d.nominal.board.as_mut().expect("a board").thermal_k_per_w = 0.0;
    assert_eq!(d.look().not_judged, [NotJudged::SwitchHeat(Protector::Board)]);

    let lead_hot = is!(Kind::LeadHot { .. });
    // 4 A²·0.380 Ω/m of 0.05 mm² over 10 W/(m²·K)·π·d; copper gains 0.393 % a kelvin above 20 °C.
    let around_m = core::f64::consts::PI * (4.0 * 0.05 / core::f64::consts::PI).sqrt() * 1e-3;
    let rise = 4.0 * 0.380 / (10.0 * around_m);
    let settled = (25.0 + rise * (1.0 - 0.00393 * 20.0)) / (1.0 - 0.00393 * rise);
    let rated = |last: f64| {
        move |d: &mut Design, t: f64| {
            let mut lead = lead(0.05);
            lead.continuous = Celsius(t);
            lead.last = Celsius(last);
            d.ratings.leads = vec![lead];
        }
    };
    edge("lead for good", lead_hot, rated(1e3), around(settled, LOOK, NONE));
    let survives = |d: &mut Design, t: f64| rated(t)(d, 70.0);
    edge("lead at its end", lead_hot, survives, around(settled, STOP, LOOK));
}

#[test]
fn exact_contacts() {
    for part in [ContactPart::Button, ContactPart::Connector] {
        fn set(d: &mut Design, part: ContactPart) -> &mut Contact {
            match part {
                ContactPart::Button => &mut d.ratings.button,
                ContactPart::Connector => &mut d.ratings.connector,
            }
        }
        let current = move |d: &mut Design, i: f64| set(d, part).current = Some(Amps(i));
        let over = move |k: &Kind| matches!(k, Kind::ContactCurrent { part: p, .. } if *p == part);
        edge("contact", over, current, around(2.0, LOOK, NONE));
        edge("contact by twice", over, current, around(1.0, STOP, LOOK));
        // The empty input capacitor draws 3.7 V over 0.1 Ω at first.
        let surge = move |k: &Kind| matches!(k, Kind::ContactSurge { part: p, .. } if *p == part);
        edge("surge", surge, current, around(37.0, NOTE, NONE));
        edge("surge by five times", surge, current, around(7.4, LOOK, NOTE));
        let voltage = move |k: &Kind| matches!(k, Kind::ContactVoltage { part: p, .. } if *p == part);
        let volts = move |d: &mut Design, v: f64| set(d, part).voltage = Some(Volts(v));
        edge("contact voltage", voltage, volts, around(3.7, LOOK, NONE));
        let mut d = sound();
        *set(&mut d, part) = Contact { current: None, voltage: None };
        assert_eq!(d.look().not_judged, [NotJudged::ContactCurrent(part), NotJudged::ContactVoltage(part)]);
    }
}

#[test]
fn exact_fuses() {
    let breaking = is!(Kind::FuseBreaking { .. });
    let most = |d: &mut Design, i: f64| d.ratings.fuse = Some(Fuse { breaking: Some(Amps(i)), ..quick(3.0) });
    edge("breaking capacity, board in the path", breaking, most, around(37.0, LOOK, NONE));
    let alone = |d: &mut Design, i: f64| {
        most(d, i);
        d.no_board();
        d.nominal.path.after = Ohms(0.05);
    };
    edge("breaking capacity, nothing else", breaking, alone, around(37.0, STOP, NONE));
    let slow = is!(Kind::FuseTooSlow { .. });
    let rating = |d: &mut Design, i: f64| d.ratings.fuse = Some(quick(i));
    // 37 A as in the short without protection; the lead stands 5.4 s.
    let k = 226.0 * (394.5_f64 / 304.5).ln().sqrt();
    let part = (1800.0 / (k * 0.75 / 37.0).powi(2)).ln() / 600.0_f64.ln();
    let multiple = 2.1 * (2.75_f64 / 2.1).powf(part);
    edge("fuse slower than the lead", slow, rating, around(37.0 / multiple, NONE, LOOK));
    let opens = is!(Kind::FuseOpensOnLoad { .. });
    edge("draw against the fuse's rating", opens, rating, around(2.0, LOOK, NONE));
    let melting = |d: &mut Design, i2t: f64| {
        let kind = FuseKind::MeltingI2t(Band { low: i2t, typical: 2.0 * i2t, high: 2.0 * i2t });
        d.ratings.fuse = Some(Fuse { kind, ..quick(1.9) });
    };
    // 4 A² for the press of 0.1 s; it is above its rating in both.
    let sooner = is!(Kind::FuseOpensOnLoad { earliest: Some(_), .. });
    edge("above its rating", sooner, melting, [(0.3, LOOK), (0.5, LOOK)]);
    let ptc = |d: &mut Design, hold: f64| {
        let kind = FuseKind::Ptc { trip: Amps(2.0 * hold), time: Seconds(10.8), at: Amps(5.0 * hold) };
        d.ratings.fuse = Some(Fuse { kind, ..quick(hold) });
        d.nominal.usage.ambient = Celsius(23.0);
        d.ratings.keeping.cold = Celsius(23.0);
    };
    edge("draw against the PTC's hold current", opens, ptc, around(2.0, LOOK, NONE));
    let warm = |d: &mut Design, hold: f64| {
        ptc(d, hold);
        d.nominal.usage.ambient = Celsius(60.0);
    };
    edge("the same at 60 °C", opens, warm, around(2.0 / 0.72, LOOK, NONE));
    let backup = is!(Kind::FuseBackupOnly { .. });
    // At 37 A a time-lag fuse of 3.7 A (ten times) takes 10 ms at least; the board opens after its delay.
    let delay = |d: &mut Design, t: f64| {
        d.ratings.fuse = Some(Fuse { kind: FuseKind::TimeLag, ..quick(3.7) });
        d.nominal.board.as_mut().expect("a board").stages[0].delay = Seconds(t);
    };
    edge("fuse behind the board", backup, delay, around(0.01, NOTE, NONE));
    let heat = is!(Kind::FuseHeat { .. });
    let ohm = |d: &mut Design, r: f64| {
        rating(d, 3.0);
        if let Some(fuse) = &mut d.ratings.fuse {
            fuse.resistance = Some(Ohms(r));
        }
    };
    edge("1.6 W in the fuse", heat, ohm, around(0.4, NONE, LOOK));
    let mut d = sound();
    d.ratings.fuse = Some(Fuse { breaking: None, ..quick(3.0) });
    assert_eq!(d.look().not_judged, [NotJudged::FuseBreaking, NotJudged::FuseHeat]);
}

#[test]
fn exact_what_protection_lets_through_and_standby() {
    let through = is!(Kind::LetsThrough { .. });
    let continuous = |d: &mut Design, i: f64| {
        d.draw(1.0);
        d.ratings.cell.continuous = Some(Amps(i));
    };
    edge("3 A that never trip", through, continuous, around(3.0, NOTE, NONE));
    edge("twice the rating", through, continuous, around(1.5, LOOK, NOTE));
    let standby = is!(Kind::StandbyDrain { .. });
    let days = |d: &mut Design, days: f64| {
        d.nominal.usage.standby = Amps(1e-3);
        d.ratings.keeping.storage_days = days;
    };
    // 2.8 Ah less two presses of 2 A for 0.1 s, at 1 mA.
    let left = (2.8 - 0.4 / 3600.0) / 1e-3 / 24.0;
    edge("days on the shelf", standby, days, around(left, NONE, LOOK));
}

#[test]
fn exact_wrong_cells_transport_and_the_rest() {
    let mismatch = is!(Kind::ParallelMismatch { .. });
    let two = |d: &mut Design, limit: f64| {
        d.nominal.cell.parallel = 2;
        d.ratings.keeping.parallel_mismatch = Volts(0.1);
        d.ratings.cell.charge = Some(Amps(limit));
    };
    // 0.1 V over 2 × 50 mΩ.
    edge("equalising current", mismatch, two, around(1.0, LOOK, NOTE));
    edge("five times the charge limit", mismatch, two, around(0.2, STOP, LOOK));
    edge("equal cells", mismatch, |d, n| d.nominal.cell.parallel = n as u32, [(1.0, NONE), (2.0, NONE)]);
    let reversed = is!(Kind::ReversedCell { .. });
    edge("reversed cell", reversed, |d, n| d.nominal.cell.parallel = n as u32, [(1.0, NOTE), (2.0, LOOK)]);
    let transport = is!(Kind::Transport { .. });
    let capacity = |d: &mut Design, q: f64| d.nominal.cell.capacity = AmpHours(q);
    edge("20 Wh", transport, capacity, around(20.0 / 3.7, NOTE, LOOK));
    let many = |d: &mut Design, q: f64| {
        capacity(d, q);
        d.nominal.cell.parallel = 6;
    };
    edge("100 Wh", transport, many, around(100.0 / 6.0 / 3.7, NOTE, LOOK));
    let below = is!(Kind::DetectionBelowWindow { .. });
    let least = |d: &mut Design, v: f64| d.ratings.cell.voltage_min = Volts(v);
    edge("detection below the window", below, least, around(2.4, NONE, NOTE));
    let estimated = is!(Kind::LoadEstimated);
    edge("estimate", estimated, |d, x| d.ratings.load_estimated = x > 0.0, [(0.0, NONE), (1.0, NOTE)]);
    assert_eq!(level(&sound().look(), is!(Kind::SwellingAndDisposal)), NOTE);
    let mut d = sound();
    d.ratings.charger = None;
    d.ratings.leads.clear();
    d.ratings.cell.continuous = None;
    d.ratings.cell.pulse = None;
    let not = d.look().not_judged;
    let want = [NotJudged::Charger, NotJudged::CellContinuous, NotJudged::CellPulse, NotJudged::Leads];
    assert_eq!(not, want);
}

/// A design with as much wrong as one can have.
fn wrong() -> Design {
    let mut d = sound();
    d.no_board();
    d.draw(7.0);
    d.nominal.cell.parallel = 2;
    d.ratings.keeping.parallel_mismatch = Volts(0.5);
    d.ratings.keeping.held_hours = 8.0;
    d.ratings.cell.continuous = Some(Amps(1.0));
    d.ratings.cell.charge = Some(Amps(0.2));
    d.ratings.leads = vec![lead(0.05), lead(0.75)];
    d.ratings.output = Output { voltage: Some(Volts(1e4)), capacitance: Some(Farads(1e-6)) };
    d.ratings.button.current = Some(Amps(0.05));
    d.charger().load_while_charging = Amps(0.2);
    d.charger().ambient = (Celsius(-10.0), Celsius(50.0));
    d
}

#[test]
fn law_findings_are_sorted_and_always_the_same() {
    let first = wrong().look();
    assert!(first.findings.len() > 15, "{} findings", first.findings.len());
    assert!(first.findings.is_sorted_by_key(|f| f.level));
    assert!(first.has_stop());
    assert!(first.findings.iter().all(|f| !hazard::source(&f.kind).is_empty()));
    for _ in 0..3 {
        assert_eq!(wrong().look(), first);
    }
}

#[test]
fn exact_a_stop_is_never_a_design_that_holds() {
    let d = sound();
    let mut running = d.nominal.clone();
    running.usage.max_presses = 100_000;
    running.cell.capacity = AmpHours(1e-3);
    let charged = charge::run(&running);
    let works = verdict::judge(&charged, &charged);
    assert_eq!(works.word, Word::Holds);
    let sound = verdict::weigh(works, &d.look());
    assert_eq!((sound.word, sound.stops), (Word::Holds, 0));
    let weighed = verdict::weigh(works, &wrong().look());
    assert_eq!(weighed.word, Word::Fails);
    assert!(weighed.stops > 3);
    assert_eq!(weighed.works, works);
}

/// One published figure: where it stands, what we give, what is printed, and what it may be off by, as a fraction.
struct Printed(&'static str, f64, f64, f64);

/// Half of the last of four printed digits.
const DIGITS: f64 = 1e-3;

fn resistive(volts: f64, r0: f64, after: f64) -> Setup {
    let load = flat::load(LitDraw::Current(Amps(0.0)));
    flat::setup(flat::cell(Volts(volts), Ohms(r0)), Ohms(after), load, Seconds(0.1))
}

fn trips(volts: f64, pair_mohm: f64, supply: f64, t: f64) -> f64 {
    let stage = flat::stage("over_current", Volts(volts), Seconds(0.01));
    let mut board = flat::board(Ohms::from_milli(pair_mohm), vec![stage.clone()]);
    board.alpha_per_k = 0.004;
    let setup = flat::with_board(resistive(supply, 0.0, 0.0), board);
    let mut start = PressStart::relaxed(&setup, 0.5, flat::ROOM);
    start.switch_temperature = Celsius(t);
    arrangements::trip_needed(&setup, Protector::Board, &stage, &start, 1.0).0
}

fn of_curve(points: [f64; 4], supply: f64) -> f64 {
    let stage = flat::stage("over_current", Volts(0.15), Seconds(0.01));
    let mut board = flat::board(Ohms(1.0), vec![stage.clone()]);
    let ohms = points.iter().rev().map(|m| m * 1e-3).collect();
    board.on_resistance = Polyline::new(vec![2.5, 3.1, 3.8, 4.5], ohms).expect("four points");
    let setup = flat::with_board(resistive(supply, 0.0, 0.0), board);
    let start = PressStart::relaxed(&setup, 0.5, flat::ROOM);
    arrangements::trip_needed(&setup, Protector::Board, &stage, &start, 1.0).0
}

/// Protectors: data sheets' thresholds over data sheets' resistances, by Ohm's law.
fn of_protectors() -> Vec<Printed> {
    const TYPICAL: [f64; 4] = [17.0, 18.0, 19.0, 22.0];
    let one = |pair: f64| -> Board {
        let mut board = flat::board(Ohms(pair), vec![]);
        board.alpha_per_k = 0.004;
        board.thermal_k_per_w = 83.0;
        board
    };
    let settles = |i: f64| hazard::settled_switch(&one(0.05), Amps(i), Volts(3.7), flat::ROOM, 1.0);
    let (mut low, mut high) = (1.0, 20.0);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if settles(middle).is_some() { low = middle } else { high = middle }
    }
    let heat = |amps: f64| {
        let mut setup = flat::with_board(resistive(3.7, 0.0, 3.7 / amps - 0.05), one(0.05));
        setup.board.as_mut().expect("a board").alpha_per_k = 0.0;
        let start = PressStart::relaxed(&setup, 0.5, flat::ROOM);
        arrangements::short_circuit(&setup, &start, &[]).pair.0
    };
    let source =
        "protector 150 ± 30 mV, two dies of 25 mΩ (data sheets of a two-level protector and a dual FET)";
    let corners = "the same, dies of 20 mΩ at 4.5 V to 37 mΩ at 2.5 V (dual-FET data sheets)";
    let low_ohm = "a source-to-source pair of 12.5 / 18 / 23 mΩ at 3.8 V (its data sheet)";
    vec![
        Printed(source, trips(0.150, 50.0, 3.7, 25.0), 3.000, DIGITS),
        Printed(source, trips(0.120, 50.0, 3.7, 25.0), 2.40, DIGITS),
        Printed(source, trips(0.180, 50.0, 3.7, 25.0), 3.60, DIGITS),
        Printed(corners, trips(0.120, 74.0, 2.5, 25.0), 1.622, DIGITS),
        Printed(corners, trips(0.180, 40.0, 4.5, 25.0), 4.500, DIGITS),
        Printed(low_ohm, trips(0.150, 18.0, 3.8, 25.0), 8.333, DIGITS),
        Printed(low_ohm, trips(0.120, 23.0, 3.8, 25.0), 5.217, DIGITS),
        Printed(low_ohm, trips(0.180, 12.5, 3.8, 25.0), 14.400, DIGITS),
        Printed(
            "trip at 2.5 V over that at 4.5 V",
            of_curve(TYPICAL, 2.5) / of_curve(TYPICAL, 4.5),
            0.773,
            DIGITS,
        ),
        Printed("trip at 3.8 V, that pair", of_curve(TYPICAL, 3.8), 8.333, DIGITS),
        Printed("trip of a pair at 100 °C, 0.4 %/K", trips(0.150, 50.0, 3.7, 100.0), 2.308, DIGITS),
        Printed("junction that trips itself, 83 K/W", settles(2.6502).expect("it settles").0, 58.00, DIGITS),
        Printed("current without a steady state", low, 7.762, DIGITS),
        Printed("heat in a 50 mΩ board at 3 A", heat(3.0), 0.45, DIGITS),
        Printed("heat in a 50 mΩ board at 10 A", heat(10.0), 5.0, DIGITS),
    ]
}

/// External short circuits: test conditions of IEC 62133-2 and plain wires, by Ohm's law.
fn of_shorts() -> Vec<Printed> {
    let short = |r0: f64, outside: f64, capacity: f64| {
        let mut setup = resistive(4.2, r0, outside);
        setup.cell.heat_capacity_j_per_k = capacity;
        let start = PressStart::relaxed(&setup, 1.0, flat::ROOM);
        arrangements::short_circuit(&setup, &start, &[lead(0.75)])
    };
    let test = "80 ± 20 mΩ short test of IEC 62133, 50 mΩ cell at 4.2 V";
    let strong = "the same, 20 mΩ cell";
    let wire = "bare wire of 10 mΩ on a 50 mΩ cell";
    // Twice 0.1 m of 0.75 mm², 26.0 Ω/km.
    let bypass = short(0.05, wiring::lead(0.1, 0.75, wiring::Conductor::Flexible, wiring::REFERENCE).0, 1.0);
    vec![
        Printed(test, short(0.05, 0.06, 1.0).current.0, 38.18, DIGITS),
        Printed(test, short(0.05, 0.08, 1.0).current.0, 32.31, DIGITS),
        Printed(test, short(0.05, 0.10, 1.0).current.0, 28.00, DIGITS),
        Printed(strong, short(0.02, 0.06, 1.0).current.0, 52.50, DIGITS),
        Printed(strong, short(0.02, 0.08, 1.0).current.0, 42.00, DIGITS),
        Printed(strong, short(0.02, 0.10, 1.0).current.0, 35.00, DIGITS),
        Printed(wire, short(0.05, 0.01, 1.0).current.0, 70.0, DIGITS),
        Printed(wire, short(0.05, 0.01, 1.0).cell.0, 245.0, DIGITS),
        Printed(wire, short(0.05, 0.01, 1.0).after.0, 49.0, DIGITS),
        Printed("K/s of 55 J/K at 32.31 A", short(0.05, 0.08, 55.0).cell_k_per_s, 0.949, DIGITS),
        Printed("bypass, shorted at the leads", bypass.current.0, 76.1, DIGITS),
        Printed("bypass, PVC lead's limit", bypass.leads[0].limit.0, 1.28, 4e-3),
    ]
}

/// IEC 60364-4-43, 434.5.2, with k as IEC 60364-5-54 prints it: an integer, so the square is good to 1 %.
fn of_leads() -> Vec<Printed> {
    let law = "k²S² of IEC 60364-4-43, k = 115 (PVC)";
    let silicone = "the same, k = 132 (silicone, 180 to 350 °C)";
    let at = |area: f64, initial: f64, last: f64, current: f64| {
        let lead = LeadRating { initial: Celsius(initial), last: Celsius(last), ..lead(area) };
        arrangements::lead_in_short(&lead, Amps(current)).limit.0
    };
    vec![
        Printed(law, at(0.22, 70.0, 160.0, 1.0), 640.0, 0.01),
        Printed(law, at(0.5, 70.0, 160.0, 1.0), 3306.0, 0.01),
        Printed(law, at(0.75, 70.0, 160.0, 1.0), 7439.0, 0.01),
        Printed(law, at(1.5, 70.0, 160.0, 1.0), 29756.0, 0.01),
        Printed(silicone, at(0.75, 180.0, 350.0, 1.0), 9801.0, 0.01),
        Printed(silicone, at(1.5, 180.0, 350.0, 1.0), 39204.0, 0.01),
        Printed("50 A in 0.22 mm², s", at(0.22, 70.0, 160.0, 50.0), 0.256, 0.01),
        Printed("50 A in 0.75 mm², s", at(0.75, 70.0, 160.0, 50.0), 2.976, 0.01),
    ]
}

/// The current that must open a fuse of IEC 60127-2, and PTC times of two makers; the gates are in the tests of the
/// time–current diagram.
fn of_fuses() -> Vec<Printed> {
    let exactly = 1e-9;
    let mut rows = Vec::new();
    for (rating, must) in [(2.0, 4.2), (3.15, 6.615), (5.0, 10.5)] {
        let fuse = quick(rating);
        rows.push(Printed(
            "first current that must open",
            arrangements::fuse_band(&fuse, flat::ROOM).high,
            must,
            exactly,
        ));
    }
    for (seconds, maker) in [(19.8, "3 A PTC at 15 A, one maker"), (10.8, "3 A PTC at 15 A, another")] {
        let ptc = FuseKind::Ptc { trip: Amps(6.0), time: Seconds(seconds), at: Amps(15.0) };
        let fuse = Fuse { kind: ptc, ..quick(3.0) };
        let latest = arrangements::fuse_time(&fuse, Amps(15.0), Celsius(23.0)).latest;
        rows.push(Printed(maker, latest.expect("it trips").0, seconds, exactly));
    }
    rows
}

/// Linear chargers: energy and current balances with round figures of common practice.
fn of_charging() -> Vec<Printed> {
    let mut rows = Vec::new();
    for (battery, watts) in [(2.9, 2.10), (3.7, 1.30), (4.2, 0.80)] {
        let mut d = sound();
        d.charger().trickle_below = Volts(battery);
        d.charger().current = Band::exact(1.0);
        d.charger().power_limit = Some(Watts(0.1));
        let power = number(&d, |k| match k {
            Kind::ChargerHot { power, .. } => Some(power.0),
            _ => None,
        });
        rows.push(Printed("5 V in, 1 A, W", power, watts, DIGITS));
    }
    for (it, rate) in [(0.30, 3.33), (0.50, 2.00)] {
        let mut d = sound();
        d.ratings.cell.it = Amps(it);
        d.charger().current = Band::exact(1.0);
        let got = number(&d, |k| match k {
            Kind::ChargeAboveIt { rate } => Some(*rate),
            _ => None,
        });
        rows.push(Printed("1 A charger over It", got, rate, 2e-3));
    }
    let mut d = sound();
    d.draw(3.0);
    d.nominal.board = Some(board_at(0.2));
    d.charger().current = Band::exact(1.0);
    let cell = number(&d, |k| match k {
        Kind::PressWhileCharging { cell } => Some(cell.0),
        _ => None,
    });
    rows.push(Printed("1 A charger and a load of 3 A, A into the cell", cell, -2.0, DIGITS));
    rows
}

/// A number of the first finding that has it.
#[track_caller]
fn number(d: &Design, of: impl Fn(&Kind) -> Option<f64>) -> f64 {
    let found = d.look();
    found.findings.iter().find_map(|f| of(&f.kind)).unwrap_or_else(|| panic!("not found: {found:?}"))
}

/// Heat, stored charge, transport and drain: standards' limits and balances.
fn of_the_rest() -> Vec<Printed> {
    let body = (0.0, 55.0);
    let rise = |i: f64| arrangements::towards(0.0, 0.0, i * i * 0.05, body, 60.0);
    // h = 10 W/(m²·K) on 78 cm².
    let lump = |t: f64| arrangements::towards(0.0, 0.0, 0.45, (0.078, 55.0), t);
    let stored = |v: f64| hazard::stored_limit(Volts(v)).expect("above what can be touched").0;
    let tiers = "IEC 60335-1, 8.1.4";
    let mut drained = sound();
    drained.nominal.usage.standby = Amps(3e-6);
    let charged = charge::run(&drained.nominal);
    let given = Given {
        corners: Corners { low: &drained.nominal, typical: &drained.nominal, high: &drained.nominal },
        charge: &charged,
        ratings: &drained.ratings,
    };
    let standby = arrangements::arranged(&given, Arrangement::ThroughBoard).standby.expect("it drains").0;
    let mut three = sound();
    three.draw(3.0);
    three.nominal.board = Some(board_at(0.2));
    three.ratings.cell.continuous = Some(Amps(2.8));
    three.ratings.cell.pulse = None;
    let ratio = number(&three, |k| match k {
        Kind::CellOverRating { draw, continuous, .. } => continuous.map(|c| draw.0 / c.0),
        _ => None,
    });
    let mut thin = sound();
    thin.draw(3.0);
    thin.nominal.board = Some(board_at(0.2));
    thin.ratings.leads[0].continuous = Celsius(0.0);
    let density = number(&thin, |k| match k {
        Kind::LeadHot { density, .. } => Some(*density),
        _ => None,
    });
    let mut low = sound();
    low.ratings.cell.voltage_min = Volts(3.0);
    let below = number(&low, |k| match k {
        Kind::DetectionBelowWindow { threshold, limit } => Some(limit.0 - threshold.0),
        _ => None,
    });
    let runs = |soc: f64| {
        let mut setup = resistive(3.7, 1e-6, 0.0);
        setup.cell.capacity = AmpHours(2.8);
        setup.load.unlit = Ohms(3.7 / 3.0);
        let start = PressStart::relaxed(&setup, soc, flat::ROOM);
        arrangements::held(&setup, &start).to_empty.expect("it runs out").0 / 60.0
    };
    let mut inrush = sound();
    inrush.nominal.cell.ocv = Monotone::new(vec![0.0, 1.0], vec![4.2, 4.2]).expect("two points");
    inrush.ratings.button.current = Some(Amps(10.0));
    let peak = number(&inrush, |k| match k {
        Kind::ContactSurge { peak, .. } => Some(peak.0),
        _ => None,
    });
    vec![
        Printed("3 A, 50 mΩ, 55 J/K, 60 s", rise(3.0), 0.4909, DIGITS),
        Printed("the same at 10 A", rise(10.0), 5.455, DIGITS),
        Printed("the same at 30 A", rise(30.0), 49.09, DIGITS),
        Printed("lump of 0.45 W, settled", lump(1e6), 5.769, DIGITS),
        Printed("lump of 0.45 W, 600 s", lump(600.0), 3.306, DIGITS),
        Printed(tiers, stored(5e3), 9.0e-9, DIGITS),
        Printed(tiers, stored(10e3), 4.5e-9, DIGITS),
        Printed(tiers, stored(15e3), 3.0e-9, DIGITS),
        Printed(tiers, stored(20e3), 1.75e-9, DIGITS),
        Printed(tiers, 0.5 * stored(15e3) * 15e3 * 15e3, 0.3375, DIGITS),
        Printed(tiers, stored(450.0) * 450.0, 45.0e-6, DIGITS),
        Printed(
            "2.8 Ah in Wh, IATA/ICAO packing instruction 965",
            hazard::transport_wh(AmpHours(2.8)),
            10.36,
            DIGITS,
        ),
        Printed("2.8 Ah at 3 µA, years", standby / (365.25 * 86_400.0), 106.5, 0.01),
        Printed("3.0 A from a cell rated 2.8 A", ratio, 1.071, DIGITS),
        Printed("3 A in 0.75 mm², A/mm²", density, 4.0, DIGITS),
        Printed("detection at 2.4 V, used to 3.0 V", below, 0.6, DIGITS),
        Printed("2.8 Ah at 3 A, min", runs(1.0), 56.0, DIGITS),
        Printed("80 % of it", runs(0.8), 44.8, DIGITS),
        Printed("4.2 V into an empty capacitor through 0.1 Ω", peak, 42.0, DIGITS),
    ]
}

#[test]
fn published_figures_of_hazards() {
    let tables = [of_protectors(), of_shorts(), of_leads(), of_fuses(), of_charging(), of_the_rest()];
    let mut count = 0;
    let mut off = Vec::new();
    for Printed(source, got, printed, part) in tables.iter().flatten() {
        count += 1;
        let agrees = (got / printed - 1.0).abs() <= part * (1.0 + 1e-9);
        if !agrees {
            off.push(format!("{source}: {got}, printed {printed}"));
        }
    }
    println!("{count} published figures");
    assert!(off.is_empty(), "{}", off.join("\n"));
    assert!(count >= 40, "{count} figures");
}

/// Statements that are a yes or a no.
#[test]
fn published_yes_or_no() {
    // Termination at 0.1 A: 0.05 A of load ends, 0.15 A and 0.6 A never do. Source: a charger maker's note on load
    // sharing. The same with the trickle of 0.1 A: 0.15 A keeps discharging the cell.
    for (load, never) in [(0.05, false), (0.15, true), (0.6, true)] {
        let mut d = sound();
        d.charger().load_while_charging = Amps(load);
        let found = d.look();
        assert_eq!(level(&found, is!(Kind::TerminationNeverReached { .. })).is_some(), never, "{load} A");
        assert_eq!(level(&found, is!(Kind::TrickleNeverRecovers { .. })).is_some(), never, "{load} A");
    }
    // A 1 A charger on 1.0 and 2.8 Ah is not above 1 It; 1300 mA on 1350 mAh is 0.963 It (a polymer cell's data sheet).
    for (it, current) in [(1.0, 1.0), (2.8, 1.0), (1.35, 1.3)] {
        let mut d = sound();
        d.ratings.cell.it = Amps(it);
        d.charger().current = Band::exact(current);
        assert_eq!(level(&d.look(), is!(Kind::ChargeAboveIt { .. })), NONE, "{current} A on {it} Ah");
    }
    // A 3 A load is inside the band of a 150 ± 30 mV, 50 mΩ board: some hold, some trip.
    let mut d = sound();
    d.draw(2.99);
    d.early = Some(board_at(0.12));
    d.late = Some(board_at(0.18));
    assert_eq!(level(&d.look(), is!(Kind::NuisanceTrip { certain: false, .. })), LOOK);
    // A PTC of 3 A, 10.8 s at 15 A (its data sheet), is behind a protector of 10 ms.
    let mut d = sound();
    let kind = FuseKind::Ptc { trip: Amps(6.0), time: Seconds(10.8), at: Amps(15.0) };
    d.ratings.fuse = Some(Fuse { kind, ..quick(3.0) });
    d.nominal.path.after = Ohms(3.7 / 15.0 - 0.1);
    assert_eq!(level(&d.look(), is!(Kind::FuseBackupOnly { .. })), NOTE);
    // π·4.2 V peak on the primary can be touched (13.19 V against 42.4 V, IEC 62368-1 and 60335-1).
    let primary = strikeline_core::driver::winding_peak(Volts(4.2));
    assert_eq!(hazard::stored_tier(primary), None);
}

/// Any design, sensible or not, with the ratings of the sound one: the findings are complete, sorted and the same again.
#[test]
fn law_any_design_has_its_hazards() {
    let mut draw = Draw::new(23);
    let (mut tripped, mut stopped) = (0, 0);
    for k in 0..60 {
        let mut d = sound();
        d.nominal = draw.setup(4);
        d.weak_ohm = draw.log(1e-3, 0.1);
        d.ratings.keeping.held_hours = 1.0;
        let found = d.look();
        assert_eq!(found, d.look(), "design {k}");
        assert!(found.findings.is_sorted_by_key(|f| f.level), "design {k}");
        let bypassed = d.nominal.arrangement != Arrangement::ThroughBoard;
        assert_eq!(level(&found, is!(Kind::ArrangementLoses { .. })).is_some(), bypassed, "design {k}");
        let in_path = [d.nominal.board_in_path(), d.nominal.second_protector.as_ref()];
        let low = in_path.iter().flatten().any(|b| b.over_discharge.is_some());
        let bare = level(&found, is!(Kind::OverDischargeUnprotected { .. }));
        assert_eq!(bare, if low { NONE } else { STOP }, "design {k}");
        let staged = in_path.iter().flatten().any(|b| !b.stages.is_empty());
        assert_eq!(level(&found, is!(Kind::ShortUnprotected { .. })).is_some(), !staged, "design {k}");
        // A charge whose first press a stage opens has that trip among its findings, and for certain.
        let first = &charge::run(&d.nominal).presses[0].summary;
        if let PressEnd::Opened(opened @ Limit::Stage(..)) = first.end {
            tripped += 1;
            let told = found.findings.iter().any(
                |f| matches!(f.kind, Kind::NuisanceTrip { limit, soc, certain: true, .. } if limit == opened && soc == 1.0),
            );
            assert!(told, "design {k}: {opened:?} is not told: {:?}", found.findings);
        }
        // A lower rating takes no finding away.
        let mut tighter = d.clone();
        tighter.ratings.cell.continuous = Some(Amps(0.5));
        tighter.ratings.button.current = Some(Amps(0.5));
        tighter.ratings.leads = vec![lead(0.05)];
        let tight = tighter.look();
        assert!(tight.findings.len() >= found.findings.len(), "design {k}");
        assert!(tight.has_stop() || !found.has_stop(), "design {k}");
        stopped += u32::from(found.has_stop());
    }
    println!("{tripped} trip at once, {stopped} have a stop");
    assert!(tripped > 8 && stopped > 15, "{tripped} trip, {stopped} stop");
}

/// Where nothing warms or sags, the check on a short circuit and the simulated fault agree on what opens.
#[test]
fn law_a_short_opens_what_the_check_says() {
    let mut draw = Draw::new(24);
    let (mut opens, mut never) = (0, 0);
    for k in 0..300 {
        let mut setup = draw.setup(1);
        setup.cell.branches.clear();
        setup.cell.capacity = AmpHours(1e6);
        setup.cell.r0_activation = 0.0;
        setup.cell.entropy = Polyline::constant(0.0);
        for board in [&mut setup.board, &mut setup.second_protector].into_iter().flatten() {
            board.alpha_per_k = 0.0;
        }
        let start = PressStart::relaxed(&setup, 1.0, setup.usage.ambient);
        let says = arrangements::opens_on_short(&setup, &start);
        let fault = time_current::fault(&setup, 1.0, Ohms(0.0), Seconds(1.0));
        let by = fault.opened.map(|limit| match limit {
            Limit::Stage(p, index) => By::Stage(p, index),
            Limit::OverDischarge(p) => By::OverDischarge(p),
        });
        assert_eq!(says.map(|(by, _)| by), by, "design {k}");
        match says {
            Some((_, delay)) => {
                opens += 1;
                assert!((fault.time.0 - delay.0).abs() < 1e-4 + 1e-3 * delay.0, "design {k}: {}", fault.time);
            }
            None => never += 1,
        }
    }
    println!("{opens} open, {never} never");
    assert!(opens > 30 && never > 30, "{opens} open, {never} never");
}

/// A held button empties the cell as a long press does, by equations of its own.
#[test]
fn law_a_held_button_is_a_long_press() {
    let mut draw = Draw::new(25);
    let mut met = 0;
    for k in 0..200 {
        let mut setup = draw.setup(1);
        setup.arrangement = Arrangement::NoBoard;
        setup.second_protector = None;
        setup.load.surge = Amps(0.0);
        setup.load.hold = Volts(8.0);
        setup.load.strike = Volts(9.0);
        setup.load.unlit = Ohms(draw.log(1.0, 30.0));
        let start = PressStart::relaxed(&setup, 0.5, setup.usage.ambient);
        let held = arrangements::held(&setup, &start);
        let empty = held.to_empty.expect("nothing opens").0;
        let levels = [(held.to_3_0, 3.0), (held.to_2_5, 2.5), (held.to_2_0, 2.0)];
        let reached: Vec<(f64, f64)> = levels
            .into_iter()
            .filter_map(|(t, volts)| Some((t?.0, volts)))
            .filter(|(t, _)| *t > 0.0 && *t < empty)
            .collect();
        setup.usage.press = Seconds(1.5 * empty);
        let options = PressOptions {
            samples: reached.iter().map(|(t, _)| Seconds(*t)).collect(),
            ..PressOptions::default()
        };
        let report = press::run(&setup, &start, &options);
        assert_eq!(report.summary.end, PressEnd::CellEmpty, "design {k}");
        let ended = report.summary.end_time.0;
        assert!((ended / empty - 1.0).abs() < 2e-3, "design {k}: empty after {empty} s, pressed {ended} s");
        for (sample, (t, volts)) in report.trace.iter().zip(&reached) {
            met += 1;
            assert!(
                (sample.cell.0 - volts).abs() < 5e-3,
                "design {k}: {} at {t} s, not {volts} V",
                sample.cell
            );
        }
    }
    assert!(met > 50, "{met} levels");
}
