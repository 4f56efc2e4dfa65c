//! Cells to start from: curves derived from open measurements, scaled by capacity.
//!
//! Every number of the three measured cells is what the derivation in the tests package prints; a test
//! holds the two together. A cell of another size has the same voltages, and resistances that fall with
//! its capacity: the same build, more of it. That is a start, not a measurement. Boards to start from are
//! in a file of their own.

mod boards;

use strikeline_core::cell::{Branch, Cell, CellLimits};
use strikeline_core::math::{Monotone, Polyline};
use strikeline_core::units::{AmpHours, Amps, Celsius, Ohms, Seconds, Volts};

pub use boards::{BoardClass, FOUR_NUMBERS, PAIR_BY_METER, apply, board_classes};

/// A kind of cell.
#[derive(Debug)]
pub struct Chemistry {
    /// How files and links name it.
    pub key: &'static str,
    /// How the page names it.
    pub label: &'static str,
    /// Where the numbers come from, and under which licence.
    pub source: &'static str,
    /// Open-circuit voltage at [`SOC`], in V.
    pub ocv_v: [f64; 28],
    /// (state of charge, dU/dT in V/K).
    pub entropy: &'static [(f64, f64)],
    /// `R₀` times capacity at half charge and 25 °C, in Ω·Ah.
    pub r0_ohm_ah: f64,
    /// Branch resistances times capacity, in Ω·Ah; their time constants are [`TAUS`].
    pub branches_ohm_ah: [f64; 3],
    /// (state of charge, factor on `R₀`).
    pub r0_shape: &'static [(f64, f64)],
    /// Factor on the branches at [`SOC`].
    pub branch_shape: [f64; 28],
    /// Activation energy of `R₀`, in J/mol.
    pub r0_activation: f64,
    /// Activation energy of the branches, in J/mol.
    pub branch_activation: f64,
    /// Heat capacity per capacity, in J/K per Ah.
    pub heat_j_per_k_ah: f64,
    /// Cooling of a cell of 1 Ah in the open, in W/K; it grows with the surface, as capacity to 2/3.
    pub cooling_w_per_k: f64,
    /// (lower, upper) voltage.
    pub window_v: (f64, f64),
}

/// State-of-charge places of the curves.
pub const SOC: [f64; 28] = [
    0.00, 0.01, 0.02, 0.03, 0.05, 0.07, 0.10, 0.13, 0.16, 0.20, 0.25, 0.30, 0.35, 0.40, 0.45, 0.50, 0.55,
    0.60, 0.65, 0.70, 0.75, 0.80, 0.85, 0.90, 0.95, 0.98, 0.99, 1.00,
];

/// Time constants of the branches, in s. Our choice: a second, half a minute, minutes.
pub const TAUS: [f64; 3] = [1.5, 30.0, 250.0];

/// `R(s)/R(0.5)` of a polymer cell, at a few places.
///
/// Source: M. Chen, G. A. Rincón-Mora, IEEE Trans. Energy Conversion 21 (2006): 0.1562·e^(−24.37 s) + 0.07446 Ω.
const PUBLISHED_SHAPE: &[(f64, f64)] =
    &[(0.0, 3.098), (0.02, 2.288), (0.05, 1.620), (0.1, 1.183), (0.2, 1.016), (0.5, 1.0), (1.0, 1.0)];

/// The kinds of cell that ship; the first is the default.
pub static CHEMISTRIES: [Chemistry; 4] = [
    Chemistry {
        key: "lco_pouch",
        label: "Polymer pouch (LCO)",
        source: "Derived from measured 0.1 It and 0.5 It runs of a 2.28 Ah pouch: Ai et al., J. Electrochem. Soc. 167 \
                 (2020) 013512, data BSD-3-Clause. Activation energies: published range, see the fields.",
        ocv_v: [
            3.0622, 3.2831, 3.3910, 3.4703, 3.5827, 3.6443, 3.6661, 3.6851, 3.7034, 3.7220, 3.7377, 3.7583,
            3.7728, 3.7811, 3.7920, 3.8060, 3.8234, 3.8461, 3.8840, 3.9235, 3.9583, 3.9944, 4.0351, 4.0802,
            4.1286, 4.1598, 4.1711, 4.1815,
        ],
        // Ai et al. 2020, entropic fits.
        entropy: &[
            (0.0, -0.449e-3),
            (0.1, -0.534e-3),
            (0.2, -0.479e-3),
            (0.5, -0.248e-3),
            (0.8, -0.153e-3),
            (0.9, -0.097e-3),
            (1.0, -0.046e-3),
        ],
        r0_ohm_ah: 0.03006,
        branches_ohm_ah: [0.05581, 0.02497, 0.05657],
        r0_shape: &[(0.5, 1.0)],
        branch_shape: [
            4.585, 3.854, 3.123, 2.842, 2.543, 2.234, 1.726, 1.494, 1.391, 1.277, 1.168, 1.212, 1.218, 1.138,
            1.072, 1.000, 0.929, 0.881, 1.005, 1.105, 1.081, 1.025, 0.951, 0.951, 0.951, 0.951, 0.951, 0.951,
        ],
        // Electrolyte conductivity (Nyman 2008) for R0; the branches inside the published 20 to 40 kJ/mol.
        r0_activation: 17_100.0,
        branch_activation: 30_000.0,
        heat_j_per_k_ah: 57.06,
        cooling_w_per_k: 0.1320,
        window_v: (3.0, 4.2),
    },
    Chemistry {
        key: "nmc_pouch",
        label: "Pouch (NMC)",
        source: "Open-circuit voltage from a C/20 run, resistance from the first minute of a 1C run of a 12.5 Ah NMC111 \
                 pouch: About:Energy 2022, BSD-3-Clause. Shape near empty and activation energies: published fits.",
        ocv_v: [
            2.7214, 3.0355, 3.1696, 3.2576, 3.3759, 3.4493, 3.4813, 3.4962, 3.5117, 3.5429, 3.5754, 3.6003,
            3.6208, 3.6388, 3.6572, 3.6781, 3.7037, 3.7373, 3.7826, 3.8381, 3.8969, 3.9532, 4.0093, 4.0667,
            4.1266, 4.1655, 4.1793, 4.1937,
        ],
        // Open parameter set of the same cell, 2022.
        entropy: &[(0.1, -0.476e-3), (0.2, -0.225e-3), (0.5, -0.087e-3), (0.8, -0.062e-3), (1.0, -0.045e-3)],
        r0_ohm_ah: 0.07161,
        branches_ohm_ah: [0.00411, 0.02363, 0.04754],
        r0_shape: PUBLISHED_SHAPE,
        branch_shape: [
            3.098, 2.644, 2.288, 2.010, 1.620, 1.381, 1.183, 1.088, 1.042, 1.016, 1.005, 1.001, 1.000, 1.000,
            1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000,
        ],
        r0_activation: 17_100.0,
        branch_activation: 35_000.0,
        // The same parameter set: 215.85 J/K and, at 10 W/(m²K) over 379 cm², 0.379 W/K for 12.5 Ah.
        heat_j_per_k_ah: 17.3,
        cooling_w_per_k: 0.070,
        window_v: (2.7, 4.2),
    },
    Chemistry {
        key: "nmc_cylinder",
        label: "Cylinder (NMC or NCA)",
        source: "Open-circuit voltage: Chen et al., J. Electrochem. Soc. 167 (2020) 080534 (NMC811 against \
                 graphite-silicon). Resistance: a guess, 0.09 Ω·Ah after ten seconds, as large energy cells have it; \
                 measure yours.",
        ocv_v: [
            2.5000, 2.7114, 2.8625, 2.9712, 3.1094, 3.1933, 3.2959, 3.3924, 3.4480, 3.4852, 3.5286, 3.5814,
            3.6290, 3.6670, 3.7054, 3.7509, 3.7983, 3.8406, 3.8896, 3.9479, 3.9943, 4.0421, 4.0809, 4.0967,
            4.1235, 4.1645, 4.1817, 4.2000,
        ],
        entropy: &[(0.1, -0.476e-3), (0.2, -0.225e-3), (0.5, -0.087e-3), (0.8, -0.062e-3), (1.0, -0.045e-3)],
        r0_ohm_ah: 0.07,
        branches_ohm_ah: [0.015, 0.025, 0.045],
        r0_shape: PUBLISHED_SHAPE,
        branch_shape: [
            3.098, 2.644, 2.288, 2.010, 1.620, 1.381, 1.183, 1.088, 1.042, 1.016, 1.005, 1.001, 1.000, 1.000,
            1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000,
        ],
        r0_activation: 17_100.0,
        branch_activation: 35_000.0,
        heat_j_per_k_ah: 14.0,
        cooling_w_per_k: 0.025,
        window_v: (2.5, 4.2),
    },
    Chemistry {
        key: "lfp_cylinder",
        label: "Cylinder (LFP)",
        source: "Open-circuit voltage from a C/20 run, resistance from the first minute of a 1C run of a 2 Ah 18650: \
                 About:Energy 2022, BSD-3-Clause. Shape near empty and activation energies: published fits.",
        ocv_v: [
            2.0199, 2.8248, 2.9552, 3.0377, 3.1439, 3.1775, 3.1840, 3.1897, 3.2117, 3.2344, 3.2516, 3.2643,
            3.2707, 3.2741, 3.2762, 3.2781, 3.2803, 3.2891, 3.3072, 3.3130, 3.3157, 3.3175, 3.3190, 3.3203,
            3.3207, 3.3196, 3.3264, 3.4772,
        ],
        entropy: &[
            (0.1, -0.489e-3),
            (0.2, -0.196e-3),
            (0.5, -0.039e-3),
            (0.8, 0.038e-3),
            (0.9, 0.067e-3),
            (1.0, 0.102e-3),
        ],
        r0_ohm_ah: 0.04616,
        branches_ohm_ah: [0.04419, 0.00000, 0.04463],
        r0_shape: PUBLISHED_SHAPE,
        branch_shape: [
            3.098, 2.644, 2.288, 2.010, 1.620, 1.381, 1.183, 1.088, 1.042, 1.016, 1.005, 1.001, 1.000, 1.000,
            1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000, 1.000,
        ],
        r0_activation: 17_100.0,
        branch_activation: 35_000.0,
        // 45 g at 999 J/(kg·K); 42 cm² at 10 W/(m²K).
        heat_j_per_k_ah: 22.5,
        cooling_w_per_k: 0.026,
        window_v: (2.0, 3.65),
    },
];

/// The kind of cell with this key.
pub fn chemistry(key: &str) -> Option<&'static Chemistry> {
    CHEMISTRIES.iter().find(|c| c.key == key)
}

impl Chemistry {
    /// One cell of this kind and of a given capacity.
    pub fn cell(&self, capacity: AmpHours) -> Cell {
        let ah = capacity.0;
        let line = |points: &[(f64, f64)]| {
            let (x, y) = points.iter().copied().unzip();
            Polyline::new(x, y).expect("shipped points rise")
        };
        let branches = TAUS
            .iter()
            .zip(self.branches_ohm_ah)
            .filter(|(_, r)| *r > 0.0)
            .map(|(tau, r)| Branch { resistance: Ohms(r / ah), time_constant: Seconds(*tau) })
            .collect();
        Cell {
            parallel: 1,
            capacity,
            health: 1.0,
            growth: 1.0,
            ocv: Monotone::new(SOC.to_vec(), self.ocv_v.to_vec()).expect("shipped places rise"),
            entropy: line(self.entropy),
            r0: Ohms(self.r0_ohm_ah / ah),
            r0_shape: line(self.r0_shape),
            r0_activation: self.r0_activation,
            branches,
            branch_shape: Polyline::new(SOC.to_vec(), self.branch_shape.to_vec())
                .expect("shipped places rise"),
            branch_activation: self.branch_activation,
            heat_capacity_j_per_k: self.heat_j_per_k_ah * ah,
            cooling_w_per_k: self.cooling_w_per_k * strikeline_core::math::powf(ah, 2.0 / 3.0),
            limits: CellLimits {
                upper: Some(Volts(self.window_v.1)),
                lower: Some(Volts(self.window_v.0)),
                continuous: None::<Amps>,
                pulse: None,
                charge: None,
                discharge_cold: Some(Celsius(-20.0)),
                discharge_hot: Some(Celsius(60.0)),
            },
        }
    }
}
