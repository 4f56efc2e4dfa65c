//! Conductors: what leads, joints, fuse and switch take from the voltage, and what a lead survives.
//!
//! A device has two conductors between any two parts, so a lead of a length counts twice. Everything
//! is in series; what matters besides its resistance is on which side of the board's supply point it
//! lies. The resistances of the cable classes are the largest the standard allows, so a lead computed
//! here loses at least as much as a real one of that class. Heating of the lead by its own current is
//! left out: the caller gives its temperature.

use crate::math::{ln, powf};
use crate::setup::Path;
use crate::units::{Amps, Celsius, Ohms, Seconds};

/// Temperature at which conductors are specified.
pub const REFERENCE: Celsius = Celsius(20.0);

/// Resistivity of annealed copper at 20 °C, in Ω·mm²/m.
///
/// Source: IEC 60028:1925, 1/58.
pub const COPPER_20: f64 = 1.0 / 58.0;

/// Temperature coefficient of copper at 20 °C, per K.
///
/// Source: IEC 60028:1925. The correction table printed with IEC 60228, 250/(230 + t), uses 0.004 per K; the
/// two differ by at most 0.44 % from 5 to 100 °C.
pub const COPPER_ALPHA_20: f64 = 3.93e-3;

/// How a conductor is made.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Conductor {
    /// Pure copper of the nominal section: the least it can be.
    Ideal,
    /// Solid (class 1) or stranded for fixed wiring (class 2), plain; the limits are the same.
    Solid,
    /// The same, metal-coated.
    SolidTinned,
    /// Flexible (class 5) or extra flexible (class 6), plain; the limits are the same.
    Flexible,
    /// The same, strands tinned.
    FlexibleTinned,
}

/// (section in mm², largest resistance at 20 °C in Ω/km).
type Listed = [(f64, f64)];

/// Plain solid and stranded conductors. Source: IEC 60228:2004, tables 1 and 2.
const SOLID: &Listed = &[
    (0.5, 36.0),
    (0.75, 24.5),
    (1.0, 18.1),
    (1.5, 12.1),
    (2.5, 7.41),
    (4.0, 4.61),
    (6.0, 3.08),
    (10.0, 1.83),
    (16.0, 1.15),
];

/// Metal-coated solid and stranded conductors. Source: IEC 60228:2004, tables 1 and 2.
const SOLID_TINNED: &Listed = &[
    (0.5, 36.7),
    (0.75, 24.8),
    (1.0, 18.2),
    (1.5, 12.2),
    (2.5, 7.56),
    (4.0, 4.70),
    (6.0, 3.11),
    (10.0, 1.84),
    (16.0, 1.16),
];

/// Plain flexible conductors.
///
/// Source: IEC 60228:2004, tables 3 and 4; below 0.5 mm², which that standard does not list, a cable maker's
/// extract of DIN VDE 0295, class 5 and 6 column.
const FLEXIBLE: &Listed = &[
    (0.05, 380.0),
    (0.08, 237.0),
    (0.11, 170.0),
    (0.12, 150.0),
    (0.14, 134.0),
    (0.22, 96.0),
    (0.25, 76.0),
    (0.34, 53.0),
    (0.5, 39.0),
    (0.75, 26.0),
    (1.0, 19.5),
    (1.5, 13.3),
    (2.5, 7.98),
    (4.0, 4.95),
    (6.0, 3.30),
    (10.0, 1.91),
    (16.0, 1.21),
];

/// Tinned flexible conductors. Source: as for the plain ones.
const FLEXIBLE_TINNED: &Listed = &[
    (0.05, 392.0),
    (0.08, 244.0),
    (0.11, 175.0),
    (0.12, 155.0),
    (0.14, 138.0),
    (0.22, 99.0),
    (0.25, 79.0),
    (0.34, 56.0),
    (0.5, 40.1),
    (0.75, 26.7),
    (1.0, 20.0),
    (1.5, 13.7),
    (2.5, 8.21),
    (4.0, 5.09),
    (6.0, 3.39),
    (10.0, 1.95),
    (16.0, 1.24),
];

/// Largest resistance of one conductor at 20 °C, in Ω per km.
///
/// - `area_mm2`: nominal section, in mm², above 0. A listed section gives the listed figure. Between two
///   listed sections the logarithm of the resistance is a straight line over the logarithm of the section;
///   outside the list the excess over pure copper is that of the nearest listed section. Both are our
///   choice; so a thicker conductor never has the higher resistance.
pub fn per_km_20(area_mm2: f64, conductor: Conductor) -> f64 {
    let ideal = |area: f64| 1000.0 * COPPER_20 / area;
    let table = match conductor {
        Conductor::Ideal => return ideal(area_mm2),
        Conductor::Solid => SOLID,
        Conductor::SolidTinned => SOLID_TINNED,
        Conductor::Flexible => FLEXIBLE,
        Conductor::FlexibleTinned => FLEXIBLE_TINNED,
    };
    // First listed section at or above the one asked for.
    let above = table.partition_point(|(area, _)| *area < area_mm2 * (1.0 - 1e-9));
    match (above.checked_sub(1).map(|k| table[k]), table.get(above)) {
        (_, Some(&(area, listed))) if area <= area_mm2 * (1.0 + 1e-9) => listed,
        (Some((a, ra)), Some(&(b, rb))) => ra * powf(rb / ra, ln(area_mm2 / a) / ln(b / a)),
        (None, Some(&(area, listed))) | (Some((area, listed)), None) => {
            ideal(area_mm2) * listed / ideal(area)
        }
        (None, None) => ideal(area_mm2),
    }
}

/// Factor of a copper resistance against 20 °C.
///
/// - `t`: conductor temperature; the linear law is used from −40 to 120 °C (our choice).
///
/// `R(T)/R₂₀ = 1 + α₂₀ (T − 20)`
pub fn copper_factor(t: Celsius) -> f64 {
    1.0 + COPPER_ALPHA_20 * (t.0 - REFERENCE.0)
}

/// Resistance of a lead, there and back.
///
/// - `length_m`: one way, in m, 0 or more.
/// - `area_mm2`: nominal section of one conductor, in mm², above 0.
/// - `t`: conductor temperature.
pub fn lead(length_m: f64, area_mm2: f64, conductor: Conductor, t: Celsius) -> Ohms {
    Ohms(2.0 * length_m * per_km_20(area_mm2, conductor) * 1e-3 * copper_factor(t))
}

/// One run of two conductors, there and back.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Lead {
    /// One way, in m, 0 or more.
    pub length_m: f64,
    /// Nominal section of one conductor, in mm², above 0.
    pub area_mm2: f64,
    /// How it is made.
    pub conductor: Conductor,
    /// Conductor temperature.
    pub temperature: Celsius,
}

impl Lead {
    /// Resistance of both conductors.
    pub fn resistance(&self) -> Ohms {
        lead(self.length_m, self.area_mm2, self.conductor, self.temperature)
    }
}

/// Everything in series between cell and load, the board itself apart.
///
/// The board takes its supply behind the cell leads, so it sees what is lost there as a lower cell voltage;
/// what comes after it, it does not see.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Series {
    /// From the cell to the board.
    pub cell_leads: Lead,
    /// Fuse or PTC on the cell's side, cold; 0 where there is none.
    pub fuse: Ohms,
    /// Joints and connectors between cell and board, all of them.
    pub cell_joints: Ohms,
    /// From the board to the load.
    pub load_leads: Lead,
    /// Joints and connectors between board and load, all of them.
    pub load_joints: Ohms,
    /// The switch or button, closed.
    pub switch: Ohms,
}

impl Series {
    /// What lies ahead of the board, and what after it.
    pub fn path(&self) -> Path {
        Path {
            ahead: self.cell_leads.resistance() + self.fuse + self.cell_joints,
            after: self.load_leads.resistance() + self.load_joints + self.switch,
        }
    }
}

/// Diameter of a solid wire by its gauge, in mm.
///
/// - `gauge`: AWG number, 0 to 40.
///
/// Source: ASTM B258: d = 0.127 mm · 92^((36 − n)/39).
pub fn awg_diameter_mm(gauge: f64) -> f64 {
    0.127 * powf(92.0, (36.0 - gauge) / 39.0)
}

/// Section of a wire by its gauge, in mm²; for a stranded one the copper in it.
///
/// - `gauge`: AWG number, 0 to 40.
pub fn awg_area_mm2(gauge: f64) -> f64 {
    let d = awg_diameter_mm(gauge);
    core::f64::consts::FRAC_PI_4 * d * d
}

/// Resistance of a solid wire by its gauge at 20 °C, in Ω per km.
///
/// - `gauge`: AWG number, 0 to 40.
///
/// Source: ASTM B258 diameter, IEC 60028 copper. Some supplier tables head the same figures 25 °C.
pub fn awg_per_km_20(gauge: f64) -> f64 {
    per_km_20(awg_area_mm2(gauge), Conductor::Ideal)
}

/// The factor k of a copper conductor that is heated adiabatically, in A·√s/mm².
///
/// - `initial`: temperature when the fault begins.
/// - `last`: temperature that the insulation survives, not below `initial`.
///
/// `k = 226·√ln[(234.5 + θ_f)/(234.5 + θ_i)]`
///
/// Source: IEC 60364-5-54, annex A. The standard prints k as an integer: 115 for PVC from 70 to 160 °C.
pub fn adiabatic_k(initial: Celsius, last: Celsius) -> f64 {
    const BETA: f64 = 234.5; // °C
    226.0 * ln((BETA + last.0) / (BETA + initial.0)).sqrt()
}

/// The `I²t` that brings a conductor from its initial to its last temperature, in A²·s.
///
/// - `k`: in A·√s/mm², as [`adiabatic_k`] gives it.
/// - `area_mm2`: section of one conductor, in mm².
///
/// `I²t = k²S²`
///
/// Source: IEC 60364-4-43, 434.5.2.
pub fn let_through_a2s(k: f64, area_mm2: f64) -> f64 {
    k * k * area_mm2 * area_mm2
}

/// How long a conductor stands a current before it reaches its last temperature, without cooling.
///
/// - `k`, `area_mm2`: as for [`let_through_a2s`].
/// - `current`: other than 0. The law holds up to 5 s; a longer answer is on the safe side.
///
/// `t = k²S²/I²`
///
/// Source: IEC 60364-4-43, 434.5.2.
pub fn time_to_limit(k: f64, area_mm2: f64, current: Amps) -> Seconds {
    Seconds(let_through_a2s(k, area_mm2) / (current.0 * current.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn law_a_thicker_conductor_never_has_the_higher_resistance() {
        use Conductor::{Flexible, FlexibleTinned, Ideal, Solid, SolidTinned};
        for conductor in [Ideal, Solid, SolidTinned, Flexible, FlexibleTinned] {
            let mut before = f64::INFINITY;
            for k in 1..=4000 {
                let area = 0.005 * f64::from(k);
                let now = per_km_20(area, conductor);
                assert!(now < before, "{conductor:?}: {now} Ω/km at {area} mm² after {before}");
                assert!(
                    now >= per_km_20(area, Ideal) * (1.0 - 1e-12),
                    "{conductor:?} below pure copper at {area}"
                );
                before = now;
            }
        }
    }

    #[test]
    fn exact_path_is_split_at_the_boards_supply() {
        let of = |length_m| Lead {
            length_m,
            area_mm2: 0.75,
            conductor: Conductor::Flexible,
            temperature: REFERENCE,
        };
        let path = Series {
            cell_leads: of(0.1),
            fuse: Ohms::from_milli(20.0),
            cell_joints: Ohms::from_milli(1.0),
            load_leads: of(0.2),
            load_joints: Ohms::from_milli(2.0),
            switch: Ohms::from_milli(30.0),
        }
        .path();
        assert!((path.ahead.0 - 26.2e-3).abs() < 1e-12, "{} ahead", path.ahead);
        assert!((path.after.0 - 42.4e-3).abs() < 1e-12, "{} after", path.after);
    }
}
