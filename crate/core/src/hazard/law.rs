//! The laws behind the checks: what settles, what equalises, what may be stored.

use super::{
    CAPACITANCE_LIMIT, CHARGE_LIMIT, CHARGE_TIER, ENERGY_LIMIT, ENERGY_TIER, LEAD_COOLING, StoredTier,
    TOUCHABLE, TRANSPORT_VOLTAGE,
};
use crate::board::Board;
use crate::ratings::LeadRating;
use crate::units::{AmpHours, Amps, Celsius, Farads, Ohms, Volts};
use crate::wiring::{COPPER_ALPHA_20, REFERENCE};

/// The draw of a resistance in copper that settles: temperature of a body whose heat grows with it.
///
/// - `cooling_w_per_k`: above 0; `heat_w` at the temperature `t0`, growing by the fraction `alpha` per K from there.
///
/// `T = [T_a + ΔT·(1 − α·T_0)]/(1 − α·ΔT)` with `ΔT = P_0/G`; `None` where `α·ΔT ≥ 1`: it never settles.
pub fn settled(
    ambient: Celsius,
    heat_w: f64,
    t0: Celsius,
    alpha: f64,
    cooling_w_per_k: f64,
) -> Option<Celsius> {
    let rise = heat_w / cooling_w_per_k;
    let left = 1.0 - alpha * rise;
    (left > 0.0).then(|| Celsius((ambient.0 + rise * (1.0 - alpha * t0.0)) / left))
}

/// Temperature at which a group of switch pairs settles at a steady current; `None`: it never does.
///
/// - `supply`: of the protector, which sets the on-resistance.
/// - `closed`: factor on the thermal resistance, 1 in the open.
pub fn settled_switch(
    board: &Board,
    current: Amps,
    supply: Volts,
    ambient: Celsius,
    closed: f64,
) -> Option<Celsius> {
    if board.thermal_k_per_w <= 0.0 {
        return Some(ambient);
    }
    let r25 = board.on_resistance.at(supply.0) / f64::from(board.pairs);
    let heat = current.0 * current.0 * r25;
    settled(ambient, heat, Celsius(25.0), board.alpha_per_k, 1.0 / (board.thermal_k_per_w * closed))
}

/// Temperature at which a lead settles at a steady current; `None`: it never does.
///
/// - `closed`: factor on its rise, 1 in the open.
///
/// The surface is that of a bare round conductor; insulation adds to it. Heat transfer [`LEAD_COOLING`].
pub fn settled_lead(lead: &LeadRating, current: Amps, ambient: Celsius, closed: f64) -> Option<Celsius> {
    let heat_per_m = current.0 * current.0 * lead.ohm_per_m_20;
    let around_m = 2e-3 * (core::f64::consts::PI * lead.area_mm2).sqrt();
    settled(ambient, heat_per_m, REFERENCE, COPPER_ALPHA_20, LEAD_COOLING * around_m / closed)
}

/// First current between one cell and the others of a parallel group.
///
/// - `difference`: of their open-circuit voltages.
/// - `one`: `R₀` of one cell; `count`: all cells, 2 or more.
///
/// `I = ΔU/[R·n/(n − 1)]`
pub fn equalising_current(difference: Volts, one: Ohms, count: u32) -> Amps {
    let n = f64::from(count);
    difference / (one * (n / (n - 1.0)))
}

/// Energy for the transport rules, in Wh.
pub fn transport_wh(capacity: AmpHours) -> f64 {
    TRANSPORT_VOLTAGE.0 * capacity.0
}

/// Which limit on stored charge applies to a peak voltage; `None` below [`TOUCHABLE`].
pub fn stored_tier(voltage: Volts) -> Option<StoredTier> {
    if voltage <= TOUCHABLE {
        None
    } else if voltage <= CHARGE_TIER {
        Some(StoredTier::Capacitance)
    } else if voltage <= ENERGY_TIER {
        Some(StoredTier::Charge)
    } else {
        Some(StoredTier::Energy)
    }
}

/// The largest capacitance within the limit at a peak voltage; `None` below [`TOUCHABLE`].
pub fn stored_limit(voltage: Volts) -> Option<Farads> {
    Some(match stored_tier(voltage)? {
        StoredTier::Capacitance => CAPACITANCE_LIMIT,
        StoredTier::Charge => Farads(CHARGE_LIMIT.0 / voltage.0),
        StoredTier::Energy => Farads(2.0 * ENERGY_LIMIT.0 / (voltage.0 * voltage.0)),
    })
}
