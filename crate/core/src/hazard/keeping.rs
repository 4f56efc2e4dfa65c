//! What is always so, and what the shelf does: standby, wrong cells, the output, transport.

use super::check::Look;
use super::{
    CAPACITANCE_LIMIT, CHARGE_LIMIT, ENERGY_LIMIT, EQUALISING_STOP, Hazards, Kind, Level, NotJudged,
    StoredTier, TOUCHABLE, TRANSPORT_BATTERY_WH, TRANSPORT_CELL_WH, equalising_current, stored_tier,
    transport_wh,
};
use crate::units::{Coulombs, Joules};

impl Look<'_, '_> {
    pub(super) fn standby(&self, found: &mut Hazards) {
        let storage_days = self.ratings().keeping.storage_days;
        let days = self.arranged.standby.map(|t| t.0 / 86_400.0);
        found.check(
            days.filter(|d| *d < storage_days)
                .map(|days| (Level::Look, Kind::StandbyDrain { days, storage_days })),
        );
    }

    pub(super) fn wrong_cells(&self, found: &mut Hazards) {
        let setup = self.nominal;
        let cell = &setup.cell;
        let ambient = setup.usage.ambient;
        let full = cell.open_circuit(1.0, ambient);
        // Warm cells that are full have about the least resistance.
        let one = cell.r0_at(1.0, ambient) * self.parallel();
        if cell.parallel < 2 {
            // Through the path, whose switch conducts the other way by its own diodes.
            let current = self.arranged.short_full.current;
            found.check(Some((Level::Note, Kind::ReversedCell { current })));
            return;
        }
        let reversed = equalising_current(full * 2.0, one, cell.parallel);
        found.check(Some((Level::Look, Kind::ReversedCell { current: reversed })));
        let difference = self.ratings().keeping.parallel_mismatch;
        let current = equalising_current(difference, one, cell.parallel);
        let limit = self.ratings().cell.charge.unwrap_or(self.ratings().cell.it);
        let level = if current.0 > EQUALISING_STOP * limit.0 {
            Level::Stop
        } else if current > limit {
            Level::Look
        } else {
            Level::Note
        };
        found.check(
            (difference.0 > 0.0).then_some((level, Kind::ParallelMismatch { difference, current, limit })),
        );
    }

    pub(super) fn output(&self, found: &mut Hazards) {
        let output = &self.ratings().output;
        let harmless = output.voltage.is_some_and(|v| v <= TOUCHABLE);
        let level = if harmless { Level::Note } else { Level::Look };
        found.check(Some((level, Kind::HighVoltage { voltage: output.voltage })));
        let Some(voltage) = output.voltage else {
            found.cannot(NotJudged::OutputVoltage);
            return;
        };
        let Some(capacitance) = output.capacitance else {
            if !harmless {
                found.cannot(NotJudged::OutputCapacitance);
            }
            return;
        };
        let charge = Coulombs(capacitance.0 * voltage.0);
        let energy = Joules(0.5 * capacitance.0 * voltage.0 * voltage.0);
        let over = stored_tier(voltage).filter(|tier| match tier {
            StoredTier::Capacitance => capacitance > CAPACITANCE_LIMIT,
            StoredTier::Charge => charge > CHARGE_LIMIT,
            StoredTier::Energy => energy > ENERGY_LIMIT,
        });
        found.check(
            over.map(|tier| (Level::Stop, Kind::StoredEnergy { tier, voltage, capacitance, charge, energy })),
        );
    }

    pub(super) fn keeping(&self, found: &mut Hazards) {
        let cell_wh = transport_wh(self.nominal.cell.capacity);
        let total_wh = cell_wh * self.parallel();
        let large = cell_wh > TRANSPORT_CELL_WH || total_wh > TRANSPORT_BATTERY_WH;
        let level = if large { Level::Look } else { Level::Note };
        found.check(Some((level, Kind::Transport { cell_wh, total_wh })));
        found.check(Some((Level::Note, Kind::SwellingAndDisposal)));
        found.check(self.ratings().load_estimated.then_some((Level::Note, Kind::LoadEstimated)));
    }
}
