//! The charger against the cell, a load that is on meanwhile, and a charger that fails.

use super::check::Look;
use super::{CHARGE_HOT_STOP, Hazards, Kind, Level, NotJudged, OVER_CHARGE_ABOVE, TRICKLE_RATE};
use crate::ratings::{Band, Charger};
use crate::units::{Amps, Volts};

impl Look<'_, '_> {
    pub(super) fn over_charge(&self, found: &mut Hazards) {
        let Some(charger) = &self.ratings().charger else {
            found.cannot(NotJudged::Charger);
            return;
        };
        let limit = self.ratings().cell.voltage_max;
        let layers = &self.arranged.over_charge;
        found.check(layers.is_empty().then(|| {
            let kind = Kind::NoOverChargeLayer {
                arrangement: self.arranged.arrangement,
                float: Volts(charger.float.high),
                input: charger.input,
            };
            (Level::Stop, kind)
        }));
        let float = charger.float;
        found.check((float.high > limit.0).then(|| {
            let level = if float.typical > limit.0 { Level::Stop } else { Level::Look };
            (level, Kind::FloatAboveCell { float, limit })
        }));
        // One layer that is in time suffices.
        let threshold = layers.iter().filter_map(|l| l.threshold).map(|t| t.high).reduce(f64::min);
        found.check(
            threshold
                .filter(|v| *v > limit.0 + OVER_CHARGE_ABOVE.0 + 1e-9)
                .map(|v| (Level::Stop, Kind::OverChargeTooHigh { threshold: Volts(v), limit })),
        );
    }

    pub(super) fn charging(&self, found: &mut Hazards) {
        let Some(charger) = &self.ratings().charger else { return };
        let cell = &self.ratings().cell;
        let n = self.parallel();
        let each = Band {
            low: charger.current.low / n,
            typical: charger.current.typical / n,
            high: charger.current.high / n,
        };
        match cell.charge {
            Some(limit) => found.check((each.high > limit.0).then(|| {
                let level = if each.typical > limit.0 { Level::Stop } else { Level::Look };
                (level, Kind::ChargeAboveLimit { current: each, limit })
            })),
            None => found.cannot(NotJudged::CellCharge),
        }
        let rate = each.typical / cell.it.0;
        found.check((rate > 1.0).then(|| {
            let allowed = cell.charge.is_some_and(|limit| each.high <= limit.0);
            (if allowed { Level::Note } else { Level::Stop }, Kind::ChargeAboveIt { rate })
        }));
        let (ambient, window) = (charger.ambient, cell.charge_window);
        found.check((ambient.0 < window.0 || ambient.1 > window.1).then(|| {
            let grave = ambient.0 < window.0 || ambient.1 > CHARGE_HOT_STOP;
            let level = if grave { Level::Stop } else { Level::Look };
            (level, Kind::ChargeTemperature { ambient, window })
        }));
        let trickle = charger.trickle.0 / n / cell.it.0;
        found.check(
            (trickle > TRICKLE_RATE * (1.0 + 1e-9))
                .then_some((Level::Look, Kind::TrickleAboveLimit { rate: trickle })),
        );
        self.charging_while_loaded(found, charger);
        // The cell is lowest, and the full current flows, where the trickle ends.
        let power = Amps(charger.current.high) * (charger.input - charger.trickle_below);
        match charger.power_limit {
            Some(limit) => {
                let limit = limit / self.closed();
                found.check((power > limit).then_some((Level::Look, Kind::ChargerHot { power, limit })));
            }
            None => found.cannot(NotJudged::ChargerPower),
        }
    }

    fn charging_while_loaded(&self, found: &mut Hazards, charger: &Charger) {
        let load = charger.load_while_charging;
        found.check((load >= charger.termination).then_some((
            Level::Look,
            Kind::TerminationNeverReached { load, termination: charger.termination },
        )));
        found.check((load >= charger.trickle).then(|| {
            let bare = self.arranged.over_discharge.is_empty();
            let level = if bare { Level::Stop } else { Level::Look };
            (level, Kind::TrickleNeverRecovers { load, trickle: charger.trickle })
        }));
        let cell = Amps(charger.current.low) - self.draw;
        found.check((cell.0 < 0.0).then_some((Level::Note, Kind::PressWhileCharging { cell })));
    }
}
