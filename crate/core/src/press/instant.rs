//! What happens at one instant: limits are passed, the load takes another state, an arc drops.

use super::{
    Amps, BRANCH, CAP, CELL_T, Celsius, Crossing, Deadline, Event, EventKind, Held, LOAD, Limit, Mode,
    Moment, NotFull, Ohms, Point, Protector, SUMS, SWITCH_T, Sample, Seconds, Simulator, Tally, Trigger,
    Volts, Watch, Y, Z,
};

impl Simulator<'_> {
    /// The next thing that happens by the clock alone; at one instant opening, lighting, release.
    pub(super) fn next_deadline(&self, press: f64) -> (f64, Deadline) {
        let (mut stop, mut what) = (press, Deadline::Release);
        if let Some(since) = self.strike_since {
            let due = since + self.setup.load.strike_time.0;
            if due <= stop {
                (stop, what) = (due, Deadline::Lighting);
            }
        }
        // Backwards, so that of two the one listed first is named.
        for (k, watch) in self.watches.iter().enumerate().rev() {
            if let Some(since) = watch.since {
                let due = since + watch.delay;
                if due <= stop {
                    (stop, what) = (due, Deadline::Opening(k));
                }
            }
        }
        (stop, what)
    }

    /// By how much a limit is exceeded, in its own unit; not exceeded at 0.
    pub(super) fn excess(&self, watch: &Watch, point: &Held) -> f64 {
        let peak = match self.mode {
            Mode::Unlit | Mode::Lit => (self.setup.load.peak_factor - 1.0) * point.draw,
            Mode::Stalled | Mode::Pinned => 0.0,
        };
        let seen = point.path.current + peak;
        let c = &self.circuit;
        let (pair, switch, supply) = match watch.limit {
            Limit::Stage(Protector::Board, _) | Limit::OverDischarge(Protector::Board) => {
                (point.path.pair, &c.board, point.path.board)
            }
            Limit::Stage(Protector::Second, _) | Limit::OverDischarge(Protector::Second) => {
                (point.path.second, &c.second, point.path.cell)
            }
        };
        match watch.threshold {
            Trigger::PairSense(v) => seen * pair - v,
            Trigger::ShuntSense(v) => seen * switch.as_ref().map_or(0.0, |s| s.shunt) - v,
            Trigger::Current(i) => seen - i,
            Trigger::Supply(v) => v - supply,
        }
    }

    /// After a jump: limits that are exceeded now and were not, or the other way round.
    pub(super) fn review_limits(&mut self, now: &mut Moment<'_, '_>) {
        for k in 0..self.watches.len() {
            let excess = self.excess(&self.watches[k], &now.point.at);
            let over = self.watches[k].since.is_some();
            // A limit just crossed stands at 0 to rounding: that is not a jump.
            if over && excess < -1e-9 {
                self.set_limit(k, None, now);
            } else if !over && excess > 0.0 {
                self.set_limit(k, Some(now.t), now);
            }
        }
    }

    pub(super) fn set_limit(&mut self, k: usize, since: Option<f64>, now: &mut Moment<'_, '_>) {
        self.watches[k].since = since;
        let limit = self.watches[k].limit;
        let kind = if since.is_some() { EventKind::Over(limit) } else { EventKind::Under(limit) };
        self.log(now, kind);
    }

    pub(super) fn light(&mut self, now: &mut Moment<'_, '_>) {
        self.strike_since = None;
        now.tally.first_lit.get_or_insert(now.t);
        self.enter(Mode::Lit, EventKind::Lit, now);
        self.settle(now);
    }

    /// Applies what a step ran into.
    pub(super) fn cross(&mut self, crossing: Crossing, now: &mut Moment<'_, '_>) {
        match crossing {
            Crossing::Limit(k) => {
                let since = if self.watches[k].since.is_some() { None } else { Some(now.t) };
                self.set_limit(k, since, now);
                return;
            }
            Crossing::Start => {
                if now.tally.start.is_none() {
                    now.tally.start = Some(now.t);
                    self.surge_from = Some(now.t);
                    self.log(now, EventKind::StartReached);
                }
                self.leave_start(true, now);
            }
            Crossing::BelowStart => {
                if self.strike_since.take().is_some() {
                    self.log(now, EventKind::StrikeLost);
                }
                self.leave_start(false, now);
            }
            Crossing::PinEndsAbove => {
                self.enter(Mode::Unlit, EventKind::Runs, now);
            }
            Crossing::PinEndsBelow => {
                self.enter(Mode::Stalled, EventKind::Stalls, now);
            }
            Crossing::Strike => {
                self.strike_since = Some(now.t);
                now.tally.struck = true;
                self.log(now, EventKind::StrikeReached);
                return;
            }
            Crossing::StrikeLost => {
                self.strike_since = None;
                self.log(now, EventKind::StrikeLost);
                return;
            }
            Crossing::BelowHold => self.drop_arc(now),
            Crossing::Empty => return,
        }
        self.settle(now);
    }

    /// At the start voltage: runs, is held there, or stalls.
    ///
    /// - `rising`: V comes from below (the stall draw holds until now), else from above.
    pub(super) fn leave_start(&mut self, rising: bool, now: &mut Moment<'_, '_>) {
        let start = self.setup.load.start.0;
        let stall = start / self.circuit.stall_ohm;
        let run = start / self.setup.load.unlit.0 + self.surge(now.t, Mode::Unlit);
        // With a series resistance the capacitor takes up the difference, so V arrives with the
        // draw it had; without, the load is given what the path gives.
        let given = if self.setup.load.esr.0 == 0.0 {
            now.point.at.path.current
        } else if rising {
            stall
        } else {
            run
        };
        let (mode, kind) = if rising && given >= run {
            (Mode::Unlit, EventKind::Runs)
        } else if !rising && given <= stall {
            (Mode::Stalled, EventKind::Stalls)
        } else {
            (Mode::Pinned, EventKind::PinnedAtStart)
        };
        self.enter(mode, kind, now);
    }

    pub(super) fn drop_arc(&mut self, now: &mut Moment<'_, '_>) {
        now.tally.drops += 1;
        if now.tally.dropped.is_none() {
            let surge = self.surge(now.t, Mode::Lit);
            now.tally.dropped = Some(if self.has_operating_point(&now.y, surge) {
                NotFull::SagBelowHold
            } else {
                NotFull::NoOperatingPoint
            });
        }
        self.enter(Mode::Unlit, EventKind::Drop, now);
        now.tally.lost |= self.until_drop;
    }

    /// Whether path and lit load meet at any voltage.
    pub(super) fn has_operating_point(&self, y: &Y, surge: f64) -> bool {
        const PLACES: u32 = 400;
        let cell = self.circuit.cell_now(y[Z], y[CELL_T]);
        let e = cell.ocv - (y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2]);
        let factors = self.factors(y);
        (1..=PLACES).any(|k| {
            let v = e * f64::from(k) / f64::from(PLACES);
            self.circuit.path(e, cell.r0, factors, v).current >= self.circuit.lit_draw(v).0 + surge
        })
    }

    /// The load takes another state; the capacitor becomes a state of its own.
    pub(super) fn enter(&mut self, mode: Mode, kind: EventKind, now: &mut Moment<'_, '_>) {
        self.free(now);
        self.mode = mode;
        if mode != Mode::Unlit {
            self.strike_since = None;
        }
        now.point = self.point(&now.y, now.t);
        now.stale = false;
        self.guess = now.point.at.v;
        now.tally.peak = now.tally.peak.max(now.point.at.path.current);
        self.log(now, kind);
    }

    /// With a series resistance the voltage jumps when the draw jumps: what follows at once.
    pub(super) fn settle(&mut self, now: &mut Moment<'_, '_>) {
        // A mode leads to another at most until the load stalls, is held or runs.
        for _ in 0..8 {
            let load = &self.setup.load;
            // A crossing lands on its threshold to a nanovolt; a jump is more than that.
            let jump = 1e-6;
            match self.mode {
                Mode::Lit if now.point.at.v < load.hold.0 => self.drop_arc(now),
                Mode::Unlit if now.point.at.v < load.start.0 - jump => {
                    if self.strike_since.take().is_some() {
                        self.log(now, EventKind::StrikeLost);
                    }
                    // It jumped past the start voltage: is there a place at it, or is it below?
                    let given = self.given_at_start(&now.y);
                    let stall = load.start.0 / self.circuit.stall_ohm;
                    let (mode, kind) = if given <= stall {
                        (Mode::Stalled, EventKind::Stalls)
                    } else {
                        (Mode::Pinned, EventKind::PinnedAtStart)
                    };
                    self.enter(mode, kind, now);
                }
                Mode::Unlit if now.point.at.v >= load.strike.0 && self.strike_since.is_none() => {
                    self.cross(Crossing::Strike, now);
                }
                Mode::Unlit if now.point.at.v < load.strike.0 - jump && self.strike_since.is_some() => {
                    self.cross(Crossing::StrikeLost, now);
                }
                Mode::Stalled | Mode::Pinned | Mode::Unlit | Mode::Lit => break,
            }
        }
        self.review_limits(now);
    }

    /// What the load would be given if its terminals were held at the start voltage.
    pub(super) fn given_at_start(&self, y: &Y) -> f64 {
        let load = &self.setup.load;
        let cell = self.circuit.cell_now(y[Z], y[CELL_T]);
        let e = cell.ocv - (y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2]);
        let path = self.circuit.path(e, cell.r0, self.factors(y), load.start.0);
        let charging = if load.esr.0 == 0.0 { 0.0 } else { (load.start.0 - y[CAP]) / load.esr.0 };
        path.current - charging
    }

    pub(super) fn log(&self, now: &mut Moment<'_, '_>, kind: EventKind) {
        now.tally.events += 1;
        if let Some(r) = now.recorder.as_deref_mut() {
            r.events.push(Event {
                time: Seconds(now.t),
                kind,
                mode: self.mode,
                load: Volts(now.point.at.v),
                current: Amps(now.point.at.path.current),
                board: Volts(now.point.at.path.board),
                cell: Volts(now.point.at.path.cell),
                soc: now.y[Z],
            });
        }
    }

    pub(super) fn sample(&self, t: f64, y: &Y, point: &Point) -> Sample {
        let sense = self
            .watches
            .iter()
            .filter(|w| matches!(w.limit, Limit::Stage(Protector::Board, _)))
            .map(|w| {
                let threshold = match w.threshold {
                    Trigger::PairSense(x)
                    | Trigger::ShuntSense(x)
                    | Trigger::Current(x)
                    | Trigger::Supply(x) => x,
                };
                self.excess(w, &point.at) + threshold
            })
            .collect();
        Sample {
            time: Seconds(t),
            mode: self.mode,
            load: Volts(point.at.v),
            board: Volts(point.at.path.board),
            cell: Volts(point.at.path.cell),
            current: Amps(point.at.path.current),
            load_current: Amps(point.at.draw),
            capacitor: Volts(self.capacitor(y, point)),
            soc: y[Z],
            branches: (0..self.circuit.branch_count).map(|k| Volts(y[BRANCH + k])).collect(),
            cell_temperature: Celsius(y[CELL_T]),
            switch_temperature: Celsius(y[SWITCH_T]),
            pair: Ohms(point.at.path.pair),
            sense,
        }
    }

    /// Books the sums of a stretch of length `h`; `v`: the load's voltage at both its ends.
    pub(super) fn book(&self, tally: &mut Tally, sums: &[f64; SUMS], v: (f64, f64), h: f64) {
        for (sum, part) in tally.sums.iter_mut().zip(sums) {
            *sum += part;
        }
        match self.mode {
            Mode::Lit => {
                tally.load_lit += sums[LOAD];
                tally.lit += h;
                let low = v.0.min(v.1);
                tally.lowest_lit = Some(tally.lowest_lit.map_or(low, |so_far: f64| so_far.min(low)));
            }
            Mode::Unlit | Mode::Pinned => tally.load_unlit += sums[LOAD],
            Mode::Stalled => tally.load_stalled += sums[LOAD],
        }
    }
}
