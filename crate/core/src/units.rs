//! Quantities, so that a wrong unit does not compile.
//!
//! SI inside; a prefix exists only in a constructor. Only the products that the model uses exist.

use core::fmt;
use core::ops::{Add, Div, Mul, Neg, Sub};

macro_rules! quantity {
    ($(#[$doc:meta])* $name:ident, $unit:literal) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Default)]
        pub struct $name(pub f64);

        impl Add for $name {
            type Output = Self;
            fn add(self, other: Self) -> Self {
                Self(self.0 + other.0)
            }
        }
        impl Sub for $name {
            type Output = Self;
            fn sub(self, other: Self) -> Self {
                Self(self.0 - other.0)
            }
        }
        impl Neg for $name {
            type Output = Self;
            fn neg(self) -> Self {
                Self(-self.0)
            }
        }
        impl Mul<f64> for $name {
            type Output = Self;
            fn mul(self, factor: f64) -> Self {
                Self(self.0 * factor)
            }
        }
        impl Div<f64> for $name {
            type Output = Self;
            fn div(self, divisor: f64) -> Self {
                Self(self.0 / divisor)
            }
        }
        impl Div for $name {
            type Output = f64;
            fn div(self, other: Self) -> f64 {
                self.0 / other.0
            }
        }
        impl fmt::Display for $name {
            fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                self.0.fmt(f)?;
                f.write_str(concat!(" ", $unit))
            }
        }
    };
}

quantity!(
    /// Voltage, in V.
    Volts, "V"
);
quantity!(
    /// Current, in A; discharge is positive.
    Amps, "A"
);
quantity!(
    /// Resistance, in Ω.
    Ohms, "Ω"
);
quantity!(
    /// Capacitance, in F.
    Farads, "F"
);
quantity!(
    /// Inductance, in H.
    Henries, "H"
);
quantity!(
    /// Frequency, in Hz.
    Hertz, "Hz"
);
quantity!(
    /// Time, in s.
    Seconds, "s"
);
quantity!(
    /// Temperature, in °C.
    Celsius, "°C"
);
quantity!(
    /// Power, in W.
    Watts, "W"
);
quantity!(
    /// Energy, in J.
    Joules, "J"
);
quantity!(
    /// Charge, in C.
    Coulombs, "C"
);
quantity!(
    /// Charge as capacity, in Ah.
    AmpHours, "Ah"
);

impl Volts {
    /// From mV, the unit sense thresholds are printed in.
    pub fn from_milli(millivolts: f64) -> Self {
        Self(millivolts * 1e-3)
    }
}

impl Ohms {
    /// From mΩ, the unit data sheets print.
    pub fn from_milli(milliohms: f64) -> Self {
        Self(milliohms * 1e-3)
    }
}

impl Farads {
    /// From µF, the unit capacitors are marked in.
    pub fn from_micro(microfarads: f64) -> Self {
        Self(microfarads * 1e-6)
    }
}

impl Seconds {
    /// From ms.
    pub fn from_milli(milliseconds: f64) -> Self {
        Self(milliseconds * 1e-3)
    }

    /// From µs.
    pub fn from_micro(microseconds: f64) -> Self {
        Self(microseconds * 1e-6)
    }
}

impl Celsius {
    /// The same temperature in K.
    pub fn kelvin(self) -> f64 {
        self.0 + 273.15
    }
}

impl Mul<Ohms> for Amps {
    type Output = Volts;
    fn mul(self, r: Ohms) -> Volts {
        Volts(self.0 * r.0)
    }
}

impl Mul<Volts> for Amps {
    type Output = Watts;
    fn mul(self, u: Volts) -> Watts {
        Watts(self.0 * u.0)
    }
}

impl Div<Ohms> for Volts {
    type Output = Amps;
    fn div(self, r: Ohms) -> Amps {
        Amps(self.0 / r.0)
    }
}

impl Div<Amps> for Volts {
    type Output = Ohms;
    fn div(self, i: Amps) -> Ohms {
        Ohms(self.0 / i.0)
    }
}
