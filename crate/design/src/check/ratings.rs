//! Ratings: what a press does not need, but the checks on it do.
//!
//! What is left empty is not judged, except where a field says what is taken instead.

use strikeline_core::cell::CellLimits;
use strikeline_core::ratings::{
    Band, CellRatings, Charger, Contact, Fuse, FuseKind, Keeping, LeadRating, Output, OverCharge,
};
use strikeline_core::units::{Amps, Celsius, Farads, Ohms, Seconds, Volts, Watts};
use strikeline_core::wiring::{Lead, per_km_20};

use super::Reader;
use crate::quantity::Toleranced;
use crate::shipped::Chemistry;

/// As the core has it.
fn band(t: Toleranced) -> Band {
    Band { low: t.min, typical: t.typical, high: t.max }
}

impl Reader<'_> {
    /// A pair of fields of which the first must be below the second.
    fn window(&mut self, low: &'static str, high: &'static str) -> Option<(Celsius, Celsius)> {
        let (cold, hot) = (self.value(low), self.value(high));
        let (cold, hot) = (cold?, hot?);
        if cold >= hot {
            self.fault(low, format!("{cold} °C is not below {hot} °C; accepted is less"));
            return None;
        }
        Some((Celsius(cold), Celsius(hot)))
    }

    /// What one cell stands.
    ///
    /// - `capacity_ah`: of one cell.
    pub(super) fn cell_ratings(&mut self, kind: &Chemistry, capacity_ah: Option<f64>) -> Option<CellRatings> {
        let keys = ["cell.continuous", "cell.pulse", "cell.pulse_time", "cell.charge"];
        let [continuous, pulse, pulse_time, charge] = keys.map(|key| self.value(key));
        let voltages = (self.value("cell.voltage_min"), self.value("cell.voltage_max"));
        let discharge = self.window("cell.discharge_cold", "cell.discharge_hot");
        let charging = self.window("cell.charge_cold", "cell.charge_hot");
        if let (Some(continuous), Some(pulse)) = (continuous, pulse)
            && pulse < continuous
        {
            let message =
                format!("{pulse} A is below the continuous current, {continuous} A; accepted is more");
            self.fault("cell.pulse", message);
        }
        let (least, most) = (voltages.0.unwrap_or(kind.window_v.0), voltages.1.unwrap_or(kind.window_v.1));
        if least >= most {
            // At the field that was filled in.
            let (key, other) = match voltages {
                (Some(_), _) => ("cell.voltage_min", "less"),
                (None, _) => ("cell.voltage_max", "more"),
            };
            self.fault(key, format!("it goes from {least} V to {most} V; accepted is {other}"));
        }
        Some(CellRatings {
            it: Amps(capacity_ah?),
            continuous: continuous.map(Amps),
            pulse: pulse.map(Amps),
            pulse_time: Seconds(pulse_time?),
            charge: charge.map(Amps),
            voltage_max: Volts(most),
            voltage_min: Volts(least),
            discharge_window: discharge?,
            charge_window: charging?,
        })
    }

    /// Over-charge protection.
    ///
    /// - `over_discharge`: of the same protector.
    pub(super) fn over_charge(
        &mut self,
        at: &'static str,
        charge_sense: &'static str,
        over_discharge: Option<Volts>,
    ) -> Option<OverCharge> {
        let (threshold, sense) = (self.toleranced(at), self.toleranced(charge_sense));
        if let (Some(threshold), Some(low)) = (threshold, over_discharge)
            && threshold.typical <= low.0
        {
            let got = threshold.typical;
            self.fault(
                at,
                format!("{got} V is not above the over-discharge voltage, {} V; accepted is more", low.0),
            );
        }
        Some(OverCharge { threshold: band(threshold?), charge_sense: sense.map(band) })
    }

    /// The fuse and its resistance; no fuse is 0 Ω.
    pub(super) fn fuse(&mut self) -> Option<(Option<Fuse>, Toleranced)> {
        let kind = self.choice("leads.fuse").to_string();
        if kind == "none" {
            return Some((None, Toleranced { typical: 0.0, min: 0.0, max: 0.0 }));
        }
        let rating = self.value("leads.fuse_rating");
        let cold = self.toleranced("leads.fuse_cold");
        let breaking = if kind == "ptc" { None } else { self.value("leads.fuse_breaking").map(Amps) };
        let kind = match kind.as_str() {
            "quick" => Some(FuseKind::Quick),
            "lag" => Some(FuseKind::TimeLag),
            "i2t" => {
                let melting = self.toleranced("leads.fuse_i2t");
                if melting.is_none() && self.design.get("leads.fuse_i2t").trim().is_empty() {
                    self.fault(
                        "leads.fuse_i2t",
                        "nothing is entered; accepted is an I²t, e.g. 30 A²s".into(),
                    );
                }
                melting.map(|t| FuseKind::MeltingI2t(band(t)))
            }
            _ => self.ptc(rating),
        };
        let (rating, kind, cold) = (rating?, kind?, cold?);
        let resistance = Some(Ohms(cold.typical));
        Some((Some(Fuse { rating: Amps(rating), kind, breaking, resistance }), cold))
    }

    fn ptc(&mut self, rating: Option<f64>) -> Option<FuseKind> {
        let keys = ["leads.ptc_trip", "leads.ptc_time", "leads.ptc_at"];
        let [trip, time, at] = keys.map(|key| self.value(key));
        let rating = rating?;
        // Data sheets of radial and chip types: trip over hold 1.75 to 2, times given at five times the hold current.
        let (trip, at) = (trip.unwrap_or(2.0 * rating), at.unwrap_or(5.0 * rating));
        if trip <= rating {
            let message = format!("{trip} A is not above the rated current, {rating} A; accepted is more");
            self.fault("leads.ptc_trip", message);
        }
        if at < trip {
            self.fault(
                "leads.ptc_at",
                format!("{at} A is below the trip current, {trip} A; accepted is more"),
            );
        }
        Some(FuseKind::Ptc { trip: Amps(trip), time: Seconds(time?), at: Amps(at) })
    }

    /// What the insulation stands for good and after a short; `None` where it is not known.
    ///
    /// Source: IEC 60364-4-43, table 43A (PVC 70 and 160 °C, cross-linked PE or rubber 90 and 250 °C); IEC 60364-5-54
    /// as reprinted (silicone 180 and 350 °C).
    pub(super) fn insulation(&mut self) -> Option<(Celsius, Celsius)> {
        match self.choice("leads.insulation") {
            "pvc" => Some((Celsius(70.0), Celsius(160.0))),
            "xlpe" => Some((Celsius(90.0), Celsius(250.0))),
            "silicone" => Some((Celsius(180.0), Celsius(350.0))),
            _ => None,
        }
    }

    pub(super) fn contact(&mut self, current: &'static str, voltage: &'static str) -> Contact {
        Contact { current: self.value(current).map(Amps), voltage: self.value(voltage).map(Volts) }
    }

    pub(super) fn output(&mut self) -> Output {
        Output {
            voltage: self.value("load.output").map(Volts),
            capacitance: self.value("load.output_capacitance").map(Farads),
        }
    }

    /// - `ambient`: which the coldest use is not above.
    pub(super) fn keeping(&mut self, ambient: Option<Celsius>) -> Option<Keeping> {
        let keys = ["use.storage", "use.held", "cell.mismatch"];
        let [storage_s, held_s, mismatch] = keys.map(|key| self.value(key));
        let presses = self.count("use.per_day");
        let cold = self.value("use.cold");
        let closed_case = self.choice("use.case") == "closed";
        let ambient = ambient?;
        Some(Keeping {
            presses_per_day: f64::from(presses?),
            storage_days: storage_s? / 86_400.0,
            held_hours: held_s? / 3600.0,
            cold: cold.map_or(ambient, |cold| Celsius(cold.min(ambient.0))),
            closed_case,
            parallel_mismatch: Volts(mismatch?),
        })
    }

    /// The charger; the outer `None` is a fault, the inner one no charger.
    pub(super) fn charger(&mut self) -> Option<Option<Charger>> {
        if self.choice("charger.fitted") != "yes" {
            return Some(None);
        }
        let (current, float) = (self.toleranced("charger.current"), self.toleranced("charger.float"));
        let keys = ["charger.termination", "charger.trickle_below", "charger.trickle", "charger.supply"];
        let [termination, trickle_below, trickle, input] = keys.map(|key| self.value(key));
        let load = self.value("charger.load");
        let power = self.value("charger.power");
        let ambient = self.window("charger.cold", "charger.hot");
        let (current, float) = (current?, float?);
        // Common practice: both are a tenth of the charge current.
        let tenth = 0.1 * current.typical;
        let (termination, trickle) = (termination.unwrap_or(tenth), trickle.unwrap_or(tenth));
        for (key, got) in [("charger.termination", termination), ("charger.trickle", trickle)] {
            if got >= current.min {
                let least = current.min;
                let message = format!(
                    "{got} A is not below the charge current, {least} A at its least; accepted is less"
                );
                self.fault(key, message);
            }
        }
        if let Some(below) = trickle_below
            && below >= float.min
        {
            let least = float.min;
            let message = format!(
                "{below} V is not below the charge voltage, {least} V at its least; accepted is less"
            );
            self.fault("charger.trickle_below", message);
        }
        if let Some(input) = input
            && input <= float.max
        {
            let most = float.max;
            let message =
                format!("{input} V is not above the charge voltage, {most} V at its most; accepted is more");
            self.fault("charger.supply", message);
        }
        Some(Some(Charger {
            current: band(current),
            float: band(float),
            termination: Amps(termination),
            trickle_below: Volts(trickle_below?),
            trickle: Amps(trickle),
            input: Volts(input?),
            load_while_charging: Amps(load?),
            ambient: ambient?,
            power_limit: power.map(Watts),
        }))
    }
}

/// The leads as far as heating goes; none where the insulation is not known.
///
/// - `insulation`: temperature for good and after a short.
pub(super) fn leads(
    insulation: Option<(Celsius, Celsius)>,
    cell_side: &Lead,
    load_side: &Lead,
) -> Vec<LeadRating> {
    let Some((continuous, last)) = insulation else { return Vec::new() };
    let of = |lead: &Lead, cell_side| LeadRating {
        cell_side,
        area_mm2: lead.area_mm2,
        length_m: lead.length_m,
        ohm_per_m_20: per_km_20(lead.area_mm2, lead.conductor) * 1e-3,
        initial: continuous,
        last,
        continuous,
    };
    [of(cell_side, true), of(load_side, false)].into_iter().filter(|l| l.length_m > 0.0).collect()
}

/// The same in the cell's own list.
pub(super) fn limits(ratings: &CellRatings) -> CellLimits {
    CellLimits {
        upper: Some(ratings.voltage_max),
        lower: Some(ratings.voltage_min),
        continuous: ratings.continuous,
        pulse: ratings.pulse,
        charge: ratings.charge,
        discharge_cold: Some(ratings.discharge_window.0),
        discharge_hot: Some(ratings.discharge_window.1),
    }
}
