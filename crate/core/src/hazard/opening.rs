//! What opens and what does not: short circuit, over-discharge, the arrangement, nuisance trips, the fuse.

use super::FUSE_HEAT_LOOK;
use super::check::{Look, lead_limit};
use super::{Case, Finding, Hazards, Kind, LETS_THROUGH_LOOK, Layers, Level, NotJudged};
use crate::arrangements::{self, By, Given, ShortCircuit};
use crate::press::{PressStart, Simulator};
use crate::ratings::{Band, Fuse, FuseKind};
use crate::report::{ChargeReport, Limit, PressEnd, Protector};
use crate::setup::{Arrangement, Setup};
use crate::time_current;
use crate::units::{Amps, Seconds, Volts, Watts};

impl Look<'_, '_> {
    pub(super) fn short(&self, found: &mut Hazards) {
        let shorts = self.weak_shorts();
        let electronic = self.arranged.over_current.iter().any(|l| l.by != By::Fuse);
        let weakest = shorts.iter().map(|(.., s)| s).min_by(|a, b| a.current.0.total_cmp(&b.current.0));
        if !electronic {
            let Some(weakest) = weakest else { return };
            let full = &self.arranged.short_full;
            let clears = self.fuse_clears(weakest.current);
            let within = |short: &ShortCircuit| {
                self.fuse_clears(short.current)
                    .is_some_and(|t| lead_limit(short).is_none_or(|limit| t.0 < limit.0))
            };
            let level = if within(full) && within(weakest) { Level::Look } else { Level::Stop };
            found.check(Some((
                level,
                Kind::ShortUnprotected {
                    arrangement: self.nominal.arrangement,
                    full: full.clone(),
                    weakest: weakest.current,
                    lead_limit: lead_limit(full),
                    fuse_clears: clears,
                    quick_fuse: quick_fuse(self.draw, weakest, full),
                },
            )));
            return;
        }
        // Of the surroundings and charges in which no stage opens, the gravest; of equals, the first.
        let mut worst: Option<(Level, Kind)> = None;
        for (case, setup, start, short) in &shorts {
            let opens = arrangements::opens_on_short(setup, start);
            if self.a_stage_opens(setup, start) {
                continue;
            }
            let fuse_clears = self
                .fuse_clears(short.current)
                .filter(|t| lead_limit(short).is_none_or(|limit| t.0 < limit.0));
            let level = if opens.is_some() || fuse_clears.is_some() { Level::Look } else { Level::Stop };
            let kind = Kind::NeverTripsOnShort {
                case: *case,
                soc: start.soc,
                prospective: short.current,
                trip: self.lowest_trip(setup, start),
                instead: opens.map(|(by, _)| by),
                fuse_clears,
            };
            if worst.as_ref().is_none_or(|(before, _)| level < *before) {
                worst = Some((level, kind));
            }
        }
        found.check(worst);
    }

    /// A short circuit ahead of the board, where only a second protector or a fuse at the cell can open.
    pub(super) fn short_ahead(&self, found: &mut Hazards) {
        let setup = self.nominal;
        let alone =
            setup.board.is_some() && setup.second_protector.is_none() && self.ratings().fuse.is_none();
        found.check(alone.then(|| {
            let t = setup.usage.ambient;
            let current = setup.cell.open_circuit(1.0, t) / setup.cell.r0_at(1.0, t);
            let leads = self.ratings().leads.iter().filter(|lead| lead.cell_side);
            let limit = leads
                .map(|lead| arrangements::lead_in_short(lead, current).limit)
                .min_by(|a, b| a.0.total_cmp(&b.0));
            (Level::Note, Kind::ShortAheadOfBoard { current, lead_limit: limit })
        }));
    }

    pub(super) fn what_is_lost(&self, found: &mut Hazards, given: &Given<'_>) {
        let a = &self.arranged;
        let arrangement = a.arrangement;
        found.check((arrangement != Arrangement::ThroughBoard).then(|| {
            let through = arrangements::arranged(given, Arrangement::ThroughBoard);
            let left = Layers::from(a);
            let bare = left.short_circuit == 0 || left.over_discharge == 0;
            let level = if bare { Level::Stop } else { Level::Look };
            (level, Kind::ArrangementLoses { arrangement, left, through_board: Layers::from(&through) })
        }));
        found.check(a.over_discharge.is_empty().then(|| {
            let kind = Kind::OverDischargeUnprotected { arrangement, held: a.held, standby: a.standby };
            (Level::Stop, kind)
        }));
        let window = self.ratings().cell.voltage_min;
        let lowest = a.over_discharge.iter().filter_map(|l| l.threshold).map(|t| t.low).reduce(f64::max);
        found.check(
            lowest
                .filter(|v| *v < window.0)
                .map(|v| (Level::Note, Kind::DetectionBelowWindow { threshold: Volts(v), limit: window })),
        );
    }

    /// Presses from places of the charge, with early protectors; with late ones where those open.
    pub(super) fn nuisance(&self, found: &mut Hazards) {
        for (case, ambient) in self.cases() {
            let charge = match case {
                Case::Ambient => Some(self.c.charge),
                Case::Cold => self.c.cold_charge,
            };
            let same = case == Case::Cold && ambient == self.nominal.usage.ambient;
            let Some(charge) = charge else {
                if !same {
                    found.cannot(NotJudged::ColdCharge);
                }
                continue;
            };
            let corners = &self.c.corners;
            let early = [self.nominal, self.c.weak].map(|s| self.with_boards_of(corners.low, s, ambient));
            let late = self.with_boards_of(corners.high, self.nominal, ambient);
            let mut trips: Vec<(Limit, Kind)> = Vec::new();
            let mut cut_short = false;
            for start in probes(charge, &early[0]) {
                for setup in &early {
                    let (end, current) = pressed(setup, &start);
                    cut_short |= end == PressEnd::EventLimit;
                    let PressEnd::Opened(limit @ Limit::Stage(..)) = end else { continue };
                    let certain = matches!(pressed(&late, &start).0, PressEnd::Opened(Limit::Stage(..)));
                    let draw = current * setup.load.peak_factor;
                    let trip = self.trip_band(&early[0], &late, limit, &start);
                    let known = trips.iter_mut().find(|(l, _)| *l == limit);
                    match known {
                        // The highest state of charge comes first; later ones can only make it certain.
                        Some((_, Kind::NuisanceTrip { certain: before, .. })) => *before |= certain,
                        Some(_) => {}
                        None => trips.push((
                            limit,
                            Kind::NuisanceTrip { limit, case, soc: start.soc, draw, trip, certain },
                        )),
                    }
                }
            }
            if cut_short {
                found.cannot(NotJudged::LongPress(case));
            }
            found.check(None);
            found.findings.extend(trips.into_iter().map(|(_, kind)| Finding { level: Level::Look, kind }));
        }
    }

    fn trip_band(&self, early: &Setup, late: &Setup, limit: Limit, start: &PressStart) -> Band {
        let Limit::Stage(protector, index) = limit else { return Band::exact(0.0) };
        let of = |setup: &Setup| {
            let board = match protector {
                Protector::Board => setup.board.as_ref(),
                Protector::Second => setup.second_protector.as_ref(),
            };
            board.and_then(|b| b.stages.get(index)).map_or(f64::INFINITY, |stage| {
                arrangements::trip_needed(setup, protector, stage, start, 1.0).0
            })
        };
        Band { low: of(early), typical: of(self.nominal), high: of(late) }
    }

    pub(super) fn lets_through(&self, found: &mut Hazards) {
        let Some(continuous) = self.ratings().cell.continuous else { return };
        let continuous = continuous * self.parallel();
        let lasting = self
            .arranged
            .over_current
            .iter()
            .filter(|l| l.by != By::Fuse)
            .filter_map(|l| l.full)
            .map(|band| band.high)
            .filter(|i| i.is_finite())
            .reduce(f64::min);
        found.check(lasting.filter(|i| *i > continuous.0).map(|i| {
            let level = if i > LETS_THROUGH_LOOK * continuous.0 { Level::Look } else { Level::Note };
            (level, Kind::LetsThrough { lasting: Amps(i), continuous })
        }));
    }

    pub(super) fn fuse(&self, found: &mut Hazards) {
        let Some(fuse) = &self.ratings().fuse else { return };
        let shorts = self.weak_shorts();
        let electronic = self.arranged.over_current.iter().any(|l| l.by != By::Fuse)
            && shorts.iter().all(|(_, setup, start, _)| self.a_stage_opens(setup, start));
        let prospective = self.arranged.short_full.current;
        match fuse.breaking {
            Some(breaking) => found.check((prospective > breaking).then(|| {
                let level = if electronic { Level::Look } else { Level::Stop };
                (level, Kind::FuseBreaking { prospective, breaking })
            })),
            None => found.cannot(NotJudged::FuseBreaking),
        }
        let weakest = shorts.iter().map(|(.., s)| s).min_by(|a, b| a.current.0.total_cmp(&b.current.0));
        if let Some(short) = weakest {
            let (latest, limit) = (self.fuse_clears(short.current), lead_limit(short));
            let slow = latest.is_none_or(|t| limit.is_some_and(|l| t.0 >= l.0));
            found.check(slow.then_some((
                Level::Look,
                Kind::FuseTooSlow { prospective: short.current, latest, lead_limit: limit },
            )));
        }
        self.fuse_on_load(found, fuse);
        let delay = self.arranged.short_circuit.iter().filter(|l| l.by != By::Fuse).filter_map(|l| l.delay);
        let protector = delay.map(|d| d.high).reduce(f64::min);
        let ambient = self.nominal.usage.ambient;
        let earliest = arrangements::fuse_time(fuse, prospective, ambient).earliest;
        found.check(
            protector
                .zip(earliest)
                .filter(|(p, f)| *p < f.0)
                .map(|(p, fuse)| (Level::Note, Kind::FuseBackupOnly { protector: Seconds(p), fuse })),
        );
        match fuse.resistance {
            Some(r) => {
                let power = Watts(self.draw.0 * self.draw.0 * r.0);
                found.check((power > FUSE_HEAT_LOOK).then_some((Level::Look, Kind::FuseHeat { power })));
            }
            None => found.cannot(NotJudged::FuseHeat),
        }
    }

    fn fuse_on_load(&self, found: &mut Hazards, fuse: &Fuse) {
        let ambient = self.nominal.usage.ambient;
        let earliest = arrangements::fuse_time(fuse, self.draw, ambient).earliest;
        // What it carries for good: a fuse's rated current, a PTC's hold current at this temperature.
        let rating = match fuse.kind {
            FuseKind::Ptc { .. } => Amps(arrangements::fuse_band(fuse, ambient).low),
            _ => fuse.rating,
        };
        // No fuse opens at a current that it carries for good.
        found.check(
            (self.draw > rating)
                .then_some((Level::Look, Kind::FuseOpensOnLoad { draw: self.draw, rating, earliest })),
        );
    }
}

/// Rated currents of a quick fuse that carries a draw and clears a short circuit within the leads' limit, at the
/// weakest and at the full current.
///
/// A rating of at least the draw carries it; the larger the rating, the later it clears.
fn quick_fuse(draw: Amps, weakest: &ShortCircuit, full: &ShortCircuit) -> Option<(Amps, Amps)> {
    let clears = |rating: f64| {
        [weakest, full].into_iter().all(|short| {
            let fuse = Fuse { rating: Amps(rating), kind: FuseKind::Quick, breaking: None, resistance: None };
            let latest = time_current::fuse_times(&fuse, short.current).1;
            latest.is_some_and(|t| lead_limit(short).is_none_or(|limit| t.0 < limit.0))
        })
    };
    if !clears(draw.0) {
        return None;
    }
    let (mut low, mut high) = (draw.0, weakest.current.0);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if clears(middle) {
            low = middle;
        } else {
            high = middle;
        }
    }
    Some((draw, Amps(low)))
}

/// Where presses of the charge are looked at: the first, three between, the last full one and the last. Relaxed, at
/// the temperatures the press before left behind: the warmest a press can begin.
fn probes(charge: &ChargeReport, setup: &Setup) -> Vec<PressStart> {
    let n = charge.presses.len();
    let last_full = charge.presses.iter().rposition(|p| p.summary.not_full.is_none()).unwrap_or(0);
    let mut at = vec![0, n / 4, n / 2, 3 * n / 4, last_full, n.saturating_sub(1)];
    at.sort_unstable();
    at.dedup();
    at.into_iter()
        .filter_map(|k| {
            let press = &charge.presses.get(k)?.summary;
            let mut start = PressStart::relaxed(setup, press.soc_start, setup.usage.ambient);
            if let Some(before) = k.checked_sub(1).map(|b| &charge.presses[b].summary) {
                start.cell_temperature = before.cell_temperature_end;
                start.switch_temperature = before.switch_temperature_end;
                start.second_temperature = before.second_temperature_end;
            }
            Some(start)
        })
        .collect()
}

/// Bounds on such a press: an arc that flickers has thousands of events; some 260 steps are usual.
const PROBE_EVENTS: u32 = 500;
const PROBE_STEPS: u64 = 3000;

/// How such a press ends, and the current just before.
fn pressed(setup: &Setup, start: &PressStart) -> (PressEnd, Amps) {
    let summary = Simulator::new(setup, PROBE_EVENTS).press(&mut start.state(), None, PROBE_STEPS);
    (summary.end, summary.current_end)
}
