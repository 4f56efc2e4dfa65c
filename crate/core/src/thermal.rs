//! Heat to still air, and what a hand stands.
//!
//! A surface lets heat go by natural convection and by radiation. Both coefficients are small and of about equal
//! size, and both grow with the surface's own temperature. Wind, neighbours that are warm too, and what lies
//! against the surface are left out.

use crate::math::{Polyline, ln, powf};
use crate::units::{Celsius, Seconds};

/// Properties of air at 1 atm: (K, kinematic viscosity in 10⁻⁶ m²/s, thermal diffusivity in 10⁻⁶ m²/s,
/// conductivity in 10⁻³ W/(m·K)).
///
/// Source: the air table of heat-transfer textbooks, from memory.
const AIR: [(f64, f64, f64, f64); 4] = [
    (250.0, 11.44, 15.9, 22.3),
    (300.0, 15.89, 22.5, 26.3),
    (350.0, 20.92, 29.9, 30.0),
    (400.0, 26.41, 38.3, 33.8),
];

/// Acceleration of free fall, in m/s².
const GRAVITY: f64 = 9.81;

/// Stefan–Boltzmann constant, in W/(m²·K⁴). Source: CODATA 2018.
const STEFAN_BOLTZMANN: f64 = 5.670_374_419e-8;

/// Natural convection on an upright surface.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Convection {
    /// Rayleigh number.
    pub rayleigh: f64,
    /// Heat transfer, in W/(m²·K).
    pub w_per_m2_k: f64,
}

/// Natural convection on an upright plate in still air.
///
/// - `height_m`: above 0; laminar, so for Rayleigh numbers up to 10⁹: at 20 K up to some 0.8 m.
/// - `surface`, `ambient`: their mean from −23 to 127 °C, and held at those ends outside.
///
/// `Nu = 0.68 + 0.670·Ra^¼/[1 + (0.492/Pr)^(9/16)]^(4/9)`, air at the mean temperature
///
/// Source: S. W. Churchill, H. H. S. Chu, Int. J. Heat Mass Transfer 18 (1975) 1323, laminar form; the
/// coefficients are from memory.
pub fn convection(height_m: f64, surface: Celsius, ambient: Celsius) -> Convection {
    let film = 0.5 * (surface.kelvin() + ambient.kelvin());
    let of = |pick: fn(&(f64, f64, f64, f64)) -> f64| {
        let curve = Polyline::new(AIR.iter().map(|a| a.0).collect(), AIR.iter().map(pick).collect());
        curve.expect("the table above rises").at(film)
    };
    let (viscosity, diffusivity, conductivity) = (of(|a| a.1) * 1e-6, of(|a| a.2) * 1e-6, of(|a| a.3) * 1e-3);
    // Ra = g·β·ΔT·L³/(ν·α), β = 1/T for a gas
    let difference = (surface - ambient).0.abs();
    let rayleigh = GRAVITY / film * difference * height_m * height_m * height_m / (viscosity * diffusivity);
    let prandtl = viscosity / diffusivity;
    let shape = powf(1.0 + powf(0.492 / prandtl, 9.0 / 16.0), 4.0 / 9.0);
    let nusselt = 0.68 + 0.670 * rayleigh.sqrt().sqrt() / shape;
    Convection { rayleigh, w_per_m2_k: nusselt * conductivity / height_m }
}

/// Radiation of a surface to surroundings at ambient temperature, in W/(m²·K).
///
/// - `emissivity`: 0 to 1; 0.9 for plastic film, paint and most insulation, far less for bright metal.
///
/// `h = ε·σ·(T_s² + T_a²)·(T_s + T_a)` (Stefan and Boltzmann)
pub fn radiation(emissivity: f64, surface: Celsius, ambient: Celsius) -> f64 {
    let (s, a) = (surface.kelvin(), ambient.kelvin());
    emissivity * STEFAN_BOLTZMANN * (s * s + a * a) * (s + a)
}

/// Convection and radiation together, in W/(m²·K); arguments as for [`convection`] and [`radiation`].
pub fn still_air(height_m: f64, emissivity: f64, surface: Celsius, ambient: Celsius) -> f64 {
    convection(height_m, surface, ambient).w_per_m2_k + radiation(emissivity, surface, ambient)
}

/// Temperatures of bare metal below which no burn is expected, by time of contact.
///
/// Source: ISO 13732-1; half a second by 4.2.1.2 as quoted, the others from memory.
pub const BARE_METAL: [(Seconds, Celsius); 5] = [
    (Seconds(0.5), Celsius(65.0)),
    (Seconds(10.0), Celsius(55.0)),
    (Seconds(60.0), Celsius(51.0)),
    (Seconds(600.0), Celsius(48.0)),
    (Seconds(28_800.0), Celsius(43.0)),
];

/// Temperature of bare metal below which no burn is expected after a contact of this length.
///
/// - `contact`: above 0; below 0.5 s and above 8 h the answer is that of the end.
///
/// Straight lines over the logarithm of the time between the points of [`BARE_METAL`]: our choice.
pub fn burn_threshold(contact: Seconds) -> Celsius {
    let (x, y) = BARE_METAL.iter().map(|(s, t)| (ln(s.0), t.0)).unzip();
    Celsius(Polyline::new(x, y).expect("the table above rises").at(ln(contact.0)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn law_a_hotter_or_blacker_surface_lets_more_go() {
        let ambient = Celsius(20.0);
        let mut before = 0.0;
        for k in 1..40 {
            let surface = Celsius(20.0 + 2.0 * f64::from(k));
            let now = still_air(0.05, 0.9, surface, ambient);
            assert!(now > before && now > still_air(0.05, 0.1, surface, ambient), "{surface}");
            before = now;
        }
    }

    #[test]
    fn law_a_longer_contact_needs_less() {
        let mut before = f64::INFINITY;
        for k in 0..60 {
            let now = burn_threshold(Seconds(0.5 * powf(1.2, f64::from(k)))).0;
            assert!(now < before, "{now} after {before}");
            before = now;
        }
        for (contact, t) in BARE_METAL {
            assert!((burn_threshold(contact) - t).0.abs() < 1e-12);
        }
    }
}
