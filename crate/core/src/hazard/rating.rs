//! Parts against their ratings: cell, switches, leads, contacts.

use super::check::{Look, charges};
use super::{
    CELL_OVERLOAD_STOP, CELL_STOP, CONTACT_STOP, CONTACT_SURGE_LOOK, ContactPart, DAMAGE_BELOW, Hazards,
    Kind, Level, NotJudged, SWITCH_LOOK, SWITCH_STOP, TOUCH_LOOK, TOUCH_STOP, settled_lead, settled_switch,
};
use crate::arrangements;
use crate::ratings::Contact;
use crate::report::{ChargeReport, Limit, PressEnd, Protector};
use crate::units::{Amps, Celsius, Seconds, Volts};

impl Look<'_, '_> {
    pub(super) fn cell_use(&self, found: &mut Hazards) {
        let cell = &self.ratings().cell;
        let usage = &self.nominal.usage;
        let draw = self.draw / self.parallel();
        let cycle = usage.press.0 + usage.rest.0;
        let effective = draw * (usage.press.0 / cycle).sqrt();
        let lasts = Seconds(usage.press.0.max(3600.0 * self.ratings().keeping.held_hours));
        if cell.continuous.is_none() {
            found.cannot(NotJudged::CellContinuous);
        }
        if cell.pulse.is_none() {
            found.cannot(NotJudged::CellPulse);
        }
        let over = |limit: Option<Amps>, factor: f64, i: Amps| limit.is_some_and(|l| i.0 > factor * l.0);
        // A press no longer than a pulse may take the pulse current, if the mean allows it and no button sticks.
        let pulsed = cell.pulse.is_some() && usage.press <= cell.pulse_time;
        let gravely = over(cell.continuous, CELL_OVERLOAD_STOP, if pulsed { effective } else { draw });
        let at_all = over(cell.continuous, 1.0, if pulsed && !self.held() { effective } else { draw });
        let level = if over(cell.pulse, 1.0, draw) || gravely {
            Some(Level::Stop)
        } else {
            at_all.then_some(Level::Look)
        };
        let (continuous, pulse) = (cell.continuous, cell.pulse);
        found.check(
            level.map(|level| (level, Kind::CellOverRating { draw, effective, continuous, pulse, lasts })),
        );
        // A press that a stage opens may end in its inrush, which the cell stands.
        let lowest = charges(self.c)
            .flat_map(|r| &r.presses)
            .filter(|p| !matches!(p.summary.end, PressEnd::Opened(Limit::Stage(..))))
            .fold(f64::INFINITY, |m, p| m.min(p.summary.cell_end.0));
        found.check((lowest < cell.voltage_min.0).then(|| {
            let level = if lowest < DAMAGE_BELOW.0 { Level::Stop } else { Level::Look };
            (level, Kind::CellBelowWindow { lowest: Volts(lowest), limit: cell.voltage_min })
        }));
        let ambient = (self.ratings().keeping.cold, usage.ambient);
        let window = cell.discharge_window;
        let outside = |t: Celsius| t < window.0 || t > window.1;
        found.check(
            (outside(ambient.0) || outside(ambient.1))
                .then_some((Level::Look, Kind::DischargeTemperature { ambient, window })),
        );
    }

    pub(super) fn cell_heat(&self, found: &mut Hazards) {
        let setup = self.nominal;
        let ambient = setup.usage.ambient;
        let hottest = charges(self.c).fold(ambient.0, |m: f64, r| m.max(r.cell_temperature_max.0));
        let charge = Celsius(ambient.0 + (hottest - ambient.0) * self.closed());
        let held = self.held().then(|| self.held_cell());
        let reached = held.map_or(charge.0, |t| t.0.max(charge.0));
        let limit = self.ratings().cell.discharge_window.1;
        found.check((reached > limit.0).then(|| {
            let level = if reached > CELL_STOP.0 { Level::Stop } else { Level::Look };
            (level, Kind::CellHot { charge, held, limit })
        }));
        found.check((reached > TOUCH_LOOK.0).then(|| {
            let level = if reached > TOUCH_STOP.0 { Level::Stop } else { Level::Look };
            (level, Kind::Touch { surface: Celsius(reached) })
        }));
    }

    /// The cell at the steady draw for as long as the button is held or the charge lasts.
    fn held_cell(&self) -> Celsius {
        let cell = &self.nominal.cell;
        let ambient = self.nominal.usage.ambient;
        let i = self.draw.0;
        let slow = (0..cell.branches.len()).fold(0.0, |sum, k| sum + cell.branch_at(k, 0.5, ambient).0);
        let heat = i * i * (cell.r0_at(0.5, ambient).0 + slow);
        let lasts = (3600.0 * self.ratings().keeping.held_hours).min(cell.charge_as() / i.max(1e-9));
        let cooling = cell.cooling_w_per_k / self.closed();
        let body = (cooling, cell.heat_capacity_j_per_k);
        Celsius(arrangements::towards(ambient.0, ambient.0, heat, body, lasts))
    }

    pub(super) fn switches(&self, found: &mut Hazards) {
        let setup = self.nominal;
        let ambient = setup.usage.ambient;
        let reached = |of: fn(&ChargeReport) -> Celsius| {
            let hottest = charges(self.c).fold(ambient.0, |m: f64, r| m.max(of(r).0));
            Celsius(ambient.0 + (hottest - ambient.0) * self.closed())
        };
        let parts = [
            (Protector::Board, setup.board_in_path(), reached(|r| r.switch_temperature_max)),
            (Protector::Second, setup.second_protector.as_ref(), reached(|r| r.second_temperature_max)),
        ];
        for (protector, board, charge) in parts {
            let Some(board) = board else { continue };
            if board.thermal_k_per_w <= 0.0 {
                found.cannot(NotJudged::SwitchHeat(protector));
                continue;
            }
            // The lowest supply has the highest on-resistance.
            let supply = charges(self.c)
                .flat_map(|r| &r.presses)
                .fold(f64::INFINITY, |m, p| m.min(p.summary.board_end.0));
            let settled = settled_switch(board, self.draw, Volts(supply), ambient, self.closed());
            let runs_away = self.held() && settled.is_none();
            let held = settled.filter(|_| self.held());
            let hottest = held.map_or(charge.0, |t| t.0.max(charge.0));
            let level = if runs_away || hottest > SWITCH_STOP.0 {
                Some(Level::Stop)
            } else {
                (hottest > SWITCH_LOOK.0).then_some(Level::Look)
            };
            found.check(level.map(|level| (level, Kind::SwitchHot { protector, charge, held, runs_away })));
        }
    }

    pub(super) fn leads(&self, found: &mut Hazards) {
        if self.ratings().leads.is_empty() {
            found.cannot(NotJudged::Leads);
        }
        for lead in &self.ratings().leads {
            let settled = settled_lead(lead, self.draw, self.nominal.usage.ambient, self.closed());
            let above = |limit: Celsius| settled.is_none_or(|t| t > limit);
            found.check(above(lead.continuous).then(|| {
                let level = if above(lead.last) { Level::Stop } else { Level::Look };
                let density = self.draw.0 / lead.area_mm2;
                (level, Kind::LeadHot { cell_side: lead.cell_side, settled, limit: lead.continuous, density })
            }));
        }
    }

    pub(super) fn contacts(&self, found: &mut Hazards) {
        self.contact(found, ContactPart::Button, &self.ratings().button);
        self.contact(found, ContactPart::Connector, &self.ratings().connector);
    }

    fn contact(&self, found: &mut Hazards, part: ContactPart, contact: &Contact) {
        let (draw, peak) = (self.draw, self.peak);
        match contact.current {
            Some(rating) => {
                found.check((draw > rating).then(|| {
                    let grave = draw.0 > CONTACT_STOP * rating.0;
                    let level = if grave { Level::Stop } else { Level::Look };
                    (level, Kind::ContactCurrent { part, draw, rating })
                }));
                found.check((peak > rating).then(|| {
                    let big = peak.0 > CONTACT_SURGE_LOOK * rating.0;
                    let level = if big { Level::Look } else { Level::Note };
                    (level, Kind::ContactSurge { part, peak, rating })
                }));
            }
            None => found.cannot(NotJudged::ContactCurrent(part)),
        }
        match contact.voltage {
            Some(rating) => {
                let voltage = self.nominal.cell.open_circuit(1.0, self.nominal.usage.ambient);
                found.check(
                    (voltage > rating)
                        .then_some((Level::Look, Kind::ContactVoltage { part, voltage, rating })),
                );
            }
            None => found.cannot(NotJudged::ContactVoltage(part)),
        }
    }
}
