//! Designs drawn at random, the same ones in every run.

use strikeline_core::board::{Board, OverDischarge, Release, SensePoint, Stage, Threshold};
use strikeline_core::cell::{Branch, Cell, CellLimits};
use strikeline_core::load::{LitDraw, Load};
use strikeline_core::math::{self, Monotone, Polyline};
use strikeline_core::setup::{Arrangement, Path, Setup, Use};
use strikeline_core::units::{AmpHours, Amps, Celsius, Farads, Ohms, Seconds, Volts, Watts};

/// A small generator of uniform numbers (SplitMix64), seeded.
#[derive(Debug, Clone)]
pub struct Draw(u64);

impl Draw {
    /// The same seed gives the same numbers.
    pub fn new(seed: u64) -> Self {
        Self(seed)
    }

    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Evenly between 0 and 1.
    pub fn unit(&mut self) -> f64 {
        (self.next() >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Evenly between `low` and `high`.
    pub fn even(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.unit()
    }

    /// Evenly in the logarithm, both ends above 0.
    pub fn log(&mut self, low: f64, high: f64) -> f64 {
        low * math::powf(high / low, self.unit())
    }

    /// True with the given probability.
    pub fn chance(&mut self, probability: f64) -> bool {
        self.unit() < probability
    }

    /// A whole number from 0 to below `n`.
    pub fn below(&mut self, n: usize) -> usize {
        (self.unit() * n as f64) as usize
    }
}

/// Designs: anything that the checks at the entrance let through, and far from sensible at times.
impl Draw {
    /// A whole design, used for at most `presses` presses.
    pub fn setup(&mut self, presses: u32) -> Setup {
        let load = self.load();
        let arrangement = match self.below(8) {
            0 => Arrangement::LoadAtCell,
            1 => Arrangement::SwitchBridged,
            2 => Arrangement::NoBoard,
            _ => Arrangement::ThroughBoard,
        };
        Setup {
            cell: self.cell(),
            second_protector: self.chance(0.25).then(|| self.board()),
            path: Path { ahead: Ohms(self.log(1e-3, 0.1)), after: Ohms(self.log(1e-3, 0.3)) },
            board: (arrangement != Arrangement::NoBoard).then(|| self.board()),
            arrangement,
            load,
            usage: Use {
                press: Seconds(self.log(0.02, 5.0)),
                rest: Seconds(if self.chance(0.2) { 0.0 } else { self.log(0.1, 3000.0) }),
                ambient: Celsius(self.even(-20.0, 45.0)),
                standby: Amps(if self.chance(0.3) { 0.0 } else { self.log(1e-6, 1e-3) }),
                max_presses: presses,
            },
        }
    }

    /// A cell, up to three in parallel; a small one empties within a few presses.
    pub fn cell(&mut self) -> Cell {
        let points = 3 + self.below(8);
        let mut soc: Vec<f64> = (0..points).map(|k| k as f64 / (points - 1) as f64).collect();
        for s in soc.iter_mut().skip(1).take(points - 2) {
            *s += self.even(-0.3, 0.3) / points as f64;
        }
        let bottom = self.even(2.0, 3.3);
        let rises: Vec<f64> = (1..points).map(|_| self.log(0.02, 1.0)).collect();
        let rise = self.even(0.7, 1.4) / rises.iter().sum::<f64>();
        let mut ocv = vec![bottom];
        for r in rises {
            ocv.push(ocv[ocv.len() - 1] + r * rise);
        }
        let entropy = if self.chance(0.5) {
            Polyline::constant(0.0)
        } else {
            let values = (0..3).map(|_| self.even(-0.5e-3, 0.3e-3)).collect();
            Polyline::new(vec![0.0, 0.4, 1.0], values).expect("rises")
        };
        let branches = (0..self.below(4))
            .map(|_| Branch {
                resistance: Ohms(self.log(1e-3, 0.1)),
                time_constant: Seconds(self.log(0.1, 1000.0)),
            })
            .collect();
        Cell {
            parallel: 1 + self.below(3) as u32,
            capacity: AmpHours(self.log(0.01, 5.0)),
            health: self.even(0.5, 1.0),
            growth: self.even(1.0, 2.5),
            ocv: Monotone::new(soc, ocv).expect("rises"),
            entropy,
            r0: Ohms(self.log(5e-3, 0.2)),
            r0_shape: self.shape(),
            r0_activation: self.even(0.0, 60e3),
            branches,
            branch_shape: self.shape(),
            branch_activation: self.even(0.0, 60e3),
            heat_capacity_j_per_k: self.log(5.0, 200.0),
            cooling_w_per_k: if self.chance(0.1) { 0.0 } else { self.log(0.01, 0.5) },
            limits: CellLimits::default(),
        }
    }

    fn shape(&mut self) -> Polyline {
        let (empty, full) = (self.even(1.0, 5.0), self.even(0.8, 1.2));
        Polyline::new(vec![0.0, 0.2, 0.5, 1.0], vec![empty, self.even(1.0, 1.3), 1.0, full]).expect("rises")
    }

    /// A board with up to three stages.
    pub fn board(&mut self) -> Board {
        let low = self.log(5e-3, 0.12);
        let on = [low, low * self.even(0.7, 1.0)];
        let last = on[1] * self.even(0.7, 1.0);
        let stages = (0..self.below(4))
            .map(|k| Stage {
                name: format!("stage_{k}"),
                threshold: if self.chance(0.7) {
                    Threshold::Sense(Volts(self.log(0.03, 1.5)))
                } else {
                    Threshold::Current(Amps(self.log(1.0, 60.0)))
                },
                delay: Seconds(if self.chance(0.1) { 0.0 } else { self.log(5e-6, 0.1) }),
            })
            .collect();
        Board {
            on_resistance: Polyline::new(vec![2.5, 3.3, 4.5], vec![on[0], on[1], last]).expect("rises"),
            alpha_per_k: self.even(0.0, 0.007),
            pairs: 1 + self.below(4) as u32,
            thermal_k_per_w: self.log(10.0, 150.0),
            thermal_time: Seconds(self.log(0.05, 60.0)),
            shunt: Ohms(if self.chance(0.5) { 0.0 } else { self.log(1e-3, 0.05) }),
            sense: if self.chance(0.7) { SensePoint::Pair } else { SensePoint::Shunt },
            stages,
            over_discharge: self.chance(0.7).then(|| OverDischarge {
                threshold: Volts(self.even(2.0, 3.0)),
                delay: Seconds(self.log(1e-3, 0.3)),
            }),
            release: Release::LoadRemoved,
        }
    }

    /// A load; its input capacitor's resistance keeps the voltage unique.
    pub fn load(&mut self) -> Load {
        let start = self.even(0.5, 2.5);
        let hold = start + self.log(0.05, 1.0);
        let strike = hold + self.log(0.05, 0.6);
        let current = self.log(0.2, 8.0);
        let (lit, falling) = match self.below(4) {
            0 => (LitDraw::Current(Amps(current)), 0.0),
            1 => (LitDraw::Power(Watts(current * strike)), current * strike / (hold * hold)),
            2 => (LitDraw::Resistance(Ohms(strike / current)), 0.0),
            _ => {
                let amps = [current, current * self.even(0.4, 1.3), current * self.even(0.4, 1.6)];
                let step = 0.5;
                let table = Polyline::new(vec![hold, hold + step, hold + 2.0 * step], amps.to_vec());
                let falls = ((amps[0] - amps[1]) / step).max((amps[1] - amps[2]) / step).max(0.0);
                (LitDraw::Table(table.expect("rises")), falls)
            }
        };
        let esr = if self.chance(0.5) { 0.0 } else { self.log(1e-3, 0.2) };
        Load {
            lit,
            unlit: Ohms(self.log(1.0, 1000.0)),
            stall: self.chance(0.5).then(|| Ohms(self.log(0.3, 1000.0))),
            start: Volts(start),
            strike: Volts(strike),
            strike_time: Seconds(self.log(5e-3, 0.2)),
            hold: Volts(hold),
            surge: Amps(if self.chance(0.5) { 0.0 } else { self.log(0.1, 15.0) }),
            surge_time: Seconds(self.log(1e-4, 0.1)),
            capacitance: Farads(self.log(1e-6, 1e-2)),
            esr: Ohms(if falling > 0.0 { esr.min(0.8 / falling) } else { esr }),
            peak_factor: if self.chance(0.5) { 1.0 } else { self.even(1.0, 1.6) },
        }
    }
}
