//! The liquid that is pumped, and the air pressure on it: density, viscosity, vapour pressure, barometer.
//!
//! Water comes from the equations of IAPWS; any other liquid is given by its figures. Properties are those of one
//! temperature and do not change along the system.

use std::error::Error;
use std::fmt;

/// Standard acceleration of free fall, m/s2.
///
/// # Source
/// 3rd General Conference on Weights and Measures (1901).
pub const STANDARD_GRAVITY: f64 = 9.80665;

/// Standard atmosphere, Pa.
///
/// # Source
/// 10th General Conference on Weights and Measures (1954).
pub const STANDARD_ATMOSPHERE: f64 = 101_325.0;

/// Celsius zero, K.
const ICE_POINT: f64 = 273.15;
/// Temperatures at which water is taken as liquid, K.
const WATER_RANGE: (f64, f64) = (ICE_POINT, ICE_POINT + 100.0);
/// Pressures at which the density equation may be used, Pa.
const PRESSURE_RANGE: (f64, f64) = (1e5, 3e5);
/// Elevations for which the standard atmosphere is used here, m.
const ELEVATION_RANGE: (f64, f64) = (-2000.0, 11_000.0);

/// A liquid at one temperature.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fluid {
    /// Density, kg/m3.
    pub density: f64,
    /// Kinematic viscosity, m2/s.
    pub kinematic_viscosity: f64,
    /// Absolute vapour pressure, Pa; none where it was not given, and then no NPSH available can be found.
    pub vapour_pressure: Option<f64>,
}

impl Default for Fluid {
    /// Water at 20 C.
    fn default() -> Self {
        water_inside_range(ICE_POINT + 20.0)
    }
}

impl Fluid {
    /// Water at `temperature` (K) and 1 atm: density and viscosity of the liquid, vapour pressure at saturation.
    ///
    /// Measured at every 5 C from 0.01 C to 100 C: density is off IAPWS-95 at 1 atm by 5e-8 of itself at most, viscosity off IAPWS
    /// R12-08 by 2.9e-5 and vapour pressure off IAPWS-95 by 7.1e-5.
    ///
    /// # Errors
    /// [`OutOfRange::Temperature`] outside 0 C to 100 C. A millionth of a kelvin past an end is forgiven, so that 32 F and
    /// 212 F pass whatever the rounding of their conversion.
    ///
    /// # Source
    /// [`water_density`], [`water_viscosity`], [`water_vapour_pressure`].
    ///
    /// ```
    /// use dutybank::fluid::Fluid;
    /// let water = Fluid::water(273.15 + 18.0).unwrap();
    /// assert!((water.density - 998.6).abs() < 0.01);
    /// ```
    pub fn water(temperature: f64) -> Result<Fluid, OutOfRange> {
        in_water_range(temperature).map(water_inside_range)
    }

    /// Dynamic viscosity, Pa s: mu = rho nu.
    pub fn dynamic_viscosity(&self) -> f64 {
        self.density * self.kinematic_viscosity
    }
}

fn water_inside_range(temperature: f64) -> Fluid {
    let density = density_equation(temperature, STANDARD_ATMOSPHERE);
    Fluid {
        density,
        kinematic_viscosity: viscosity_equation(temperature) / density,
        vapour_pressure: Some(saturation_equation(temperature)),
    }
}

/// Density (kg/m3) of liquid water at `temperature` (K) and absolute `pressure` (Pa).
///
/// With alpha = 10 K/(593 K - T), beta = 10 K/(T - 232 K), R = 461.51805 J/(kg K), p0 = 0.1 MPa:
///
/// v0 = (R 10 K/p0) (a5 + sum a_i alpha^n_i + sum b_i beta^m_i), i = 6..10 and 5..10,
///
/// (dv/dp)0 = (R 10 K/p0^2) (sum a_i alpha^n_i + sum b_i beta^m_i), i = 11..15 and 11..17,
///
/// rho = 1/(v0 + (dv/dp)0 (p - p0)).
///
/// # Errors
/// [`OutOfRange`] outside 0 C to 100 C or 0.1 MPa to 0.3 MPa.
///
/// # Source
/// IAPWS SR6-08(2011), Revised Supplementary Release on Properties of Liquid Water at 0.1 MPa: specific volume, its
/// pressure derivative, and the linear step to other pressures up to 0.3 MPa. Between 0.1 MPa and 1 atm that step is 6e-7 of
/// the density.
pub fn water_density(temperature: f64, pressure: f64) -> Result<f64, OutOfRange> {
    let temperature = in_water_range(temperature)?;
    if !(PRESSURE_RANGE.0..=PRESSURE_RANGE.1).contains(&pressure) {
        return Err(OutOfRange::Pressure(pressure));
    }
    Ok(density_equation(temperature, pressure))
}

fn density_equation(t: f64, pressure: f64) -> f64 {
    const R: f64 = 461.518_05;
    const T_R: f64 = 10.0;
    const P_0: f64 = 1e5;
    const A_5: f64 = 1.93763157e-2;
    // (coefficient, exponent), a6..a10 and b5..b10
    const VOLUME_A: [(f64, i32); 5] = [
        (6.74458446e3, 4),
        (-2.22521604e5, 5),
        (1.00231247e8, 7),
        (-1.63552118e9, 8),
        (8.32299658e9, 9),
    ];
    const VOLUME_B: [(f64, i32); 6] = [
        (5.78545292e-3, 1),
        (-1.53195665e-2, 2),
        (3.11337859e-2, 3),
        (-4.23546241e-2, 4),
        (3.38713507e-2, 5),
        (-1.19946761e-2, 6),
    ];
    // a11..a15 and b11..b17
    const SLOPE_A: [(f64, i32); 5] = [
        (-7.5245878e-6, 1),
        (-1.3767418e-2, 3),
        (1.0627293e1, 5),
        (-2.0457795e2, 6),
        (1.2037414e3, 7),
    ];
    const SLOPE_B: [(f64, i32); 7] = [
        (-3.1091470e-6, 1),
        (2.8964919e-5, 3),
        (-1.3112763e-4, 4),
        (3.0410453e-4, 5),
        (-3.9034594e-4, 6),
        (2.3403117e-4, 7),
        (-4.8510101e-5, 9),
    ];
    let powers = |terms: &[(f64, i32)], x: f64| -> f64 {
        terms.iter().map(|(factor, n)| factor * x.powi(*n)).sum()
    };
    let alpha = T_R / (593.0 - t);
    let beta = T_R / (t - 232.0);
    // v0 = (R Tr/p0) (a5 + sum a alpha^n + sum b beta^m)
    let volume = R * T_R / P_0 * (A_5 + powers(&VOLUME_A, alpha) + powers(&VOLUME_B, beta));
    // (dv/dp)0 = (R Tr/p0^2) (sum a alpha^n + sum b beta^m)
    let slope = R * T_R / (P_0 * P_0) * (powers(&SLOPE_A, alpha) + powers(&SLOPE_B, beta));
    // rho = 1/(v0 + (dv/dp)0 (p - p0))
    1.0 / (volume + slope * (pressure - P_0))
}

/// Dynamic viscosity (Pa s) of liquid water at `temperature` (K) and 0.1 MPa; its change with pressure up to 1 atm is far below
/// the uncertainty of the equation, about 1 % (from memory).
///
/// mu = 1e-6 Pa s (280.68 t^-1.9 + 511.45 t^-7.7 + 61.131 t^-19.6 + 0.45903 t^-40), t = T/300 K
///
/// # Errors
/// [`OutOfRange::Temperature`] outside 0 C to 100 C.
///
/// # Source
/// IAPWS SR6-08(2011), Revised Supplementary Release on Properties of Liquid Water at 0.1 MPa, viscosity equation.
pub fn water_viscosity(temperature: f64) -> Result<f64, OutOfRange> {
    in_water_range(temperature).map(viscosity_equation)
}

fn viscosity_equation(temperature: f64) -> f64 {
    let t = temperature / 300.0;
    // mu = 1e-6 (280.68 t^-1.9 + 511.45 t^-7.7 + 61.131 t^-19.6 + 0.45903 t^-40)
    1e-6 * (280.68 * t.powf(-1.9)
        + 511.45 * t.powf(-7.7)
        + 61.131 * t.powf(-19.6)
        + 0.45903 * t.powi(-40))
}

/// Absolute vapour pressure (Pa) of water at saturation at `temperature` (K).
///
/// ln(p/pc) = (Tc/T) (a1 th + a2 th^1.5 + a3 th^3 + a4 th^3.5 + a5 th^4 + a6 th^7.5), th = 1 - T/Tc,
/// Tc = 647.096 K, pc = 22.064 MPa
///
/// Valid from the triple point; the hundredth of a kelvin from there down to 0 C is an extrapolation.
///
/// # Errors
/// [`OutOfRange::Temperature`] outside 0 C to 100 C.
///
/// # Source
/// W. Wagner & A. Pruss, "International Equations for the Saturation Properties of Ordinary Water Substance", J. Phys. Chem.
/// Ref. Data 22 (1993) 783, eq. 1; IAPWS SR1-86(1992).
pub fn water_vapour_pressure(temperature: f64) -> Result<f64, OutOfRange> {
    in_water_range(temperature).map(saturation_equation)
}

fn saturation_equation(t: f64) -> f64 {
    const T_C: f64 = 647.096;
    const P_C: f64 = 22.064e6;
    let th = 1.0 - t / T_C;
    // ln(p/pc) = (Tc/T) (a1 th + a2 th^1.5 + a3 th^3 + a4 th^3.5 + a5 th^4 + a6 th^7.5)
    let sum = -7.85951783 * th + 1.84408259 * th.powf(1.5) - 11.7866497 * th.powi(3)
        + 22.6807411 * th.powf(3.5)
        - 15.9618719 * th.powi(4)
        + 1.80122502 * th.powf(7.5);
    P_C * (T_C / t * sum).exp()
}

/// Absolute air pressure (Pa) of the standard atmosphere at `elevation` (m above sea level).
///
/// H = r z/(r + z), T = T0 - b H, p = p0 (T/T0)^(g/(R b)), with r = 6356766 m, T0 = 288.15 K, b = 0.0065 K/m,
/// g = 9.80665 m/s2, R = 287.05287 J/(kg K), p0 = 101325 Pa
///
/// The weather moves the true barometer by some 3 % either way (common practice, no source).
///
/// # Errors
/// [`OutOfRange::Elevation`] outside -2000 m to 11000 m.
///
/// # Source
/// ISO 2533:1975, Standard Atmosphere, layer up to 11 km geopotential.
///
/// ```
/// let barometer = dutybank::fluid::standard_barometer(0.0).unwrap();
/// assert_eq!(barometer, 101_325.0);
/// ```
pub fn standard_barometer(elevation: f64) -> Result<f64, OutOfRange> {
    const EARTH_RADIUS: f64 = 6_356_766.0;
    const T_0: f64 = 288.15;
    const LAPSE: f64 = 0.0065;
    const R_AIR: f64 = 287.052_87;
    if !(ELEVATION_RANGE.0..=ELEVATION_RANGE.1).contains(&elevation) {
        return Err(OutOfRange::Elevation(elevation));
    }
    // H = r z/(r + z)
    let geopotential = EARTH_RADIUS * elevation / (EARTH_RADIUS + elevation);
    // T = T0 - b H
    let temperature = T_0 - LAPSE * geopotential;
    // p = p0 (T/T0)^(g/(R b))
    Ok(STANDARD_ATMOSPHERE * (temperature / T_0).powf(STANDARD_GRAVITY / (R_AIR * LAPSE)))
}

/// The temperature moved onto the range if it is within a millionth of a kelvin of it.
fn in_water_range(temperature: f64) -> Result<f64, OutOfRange> {
    let nearest = temperature.clamp(WATER_RANGE.0, WATER_RANGE.1);
    // Written so that a NaN fails too.
    if (temperature - nearest).abs() <= 1e-6 {
        Ok(nearest)
    } else {
        Err(OutOfRange::Temperature(temperature))
    }
}

/// A condition for which no value is known here; it carries the offending figure in SI.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum OutOfRange {
    /// Temperature of water, K.
    Temperature(f64),
    /// Absolute pressure of water, Pa.
    Pressure(f64),
    /// Elevation above sea level, m.
    Elevation(f64),
}

impl fmt::Display for OutOfRange {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            OutOfRange::Temperature(t) => {
                let celsius = t - ICE_POINT;
                write!(
                    f,
                    "water is known here from 0 C to 100 C, not at {celsius:.2} C"
                )
            }
            OutOfRange::Pressure(p) => {
                write!(
                    f,
                    "water is known here from 1 bar to 3 bar absolute, not at {} bar",
                    p / 1e5
                )
            }
            OutOfRange::Elevation(z) => {
                write!(
                    f,
                    "the standard atmosphere is known here from -2000 m to 11000 m, not at {z} m"
                )
            }
        }
    }
}

impl Error for OutOfRange {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn default_is_water_at_20_c() {
        let water = Fluid::default();
        assert_eq!(Fluid::water(293.15), Ok(water));
        // 998.2 kg/m3 and 1.004e-6 m2/s: the rounded figures of handbooks for water at 20 C (common practice, no source).
        assert!((water.density - 998.2).abs() < 0.05);
        assert!((water.kinematic_viscosity - 1.004e-6).abs() < 1e-9);
        assert!((water.dynamic_viscosity() - water_viscosity(293.15).unwrap()).abs() < 1e-18);
    }

    #[test]
    fn conditions_outside_the_equations_are_refused() {
        for t in [273.149, 373.151, -1.0, f64::NAN, f64::INFINITY] {
            assert!(
                matches!(Fluid::water(t), Err(OutOfRange::Temperature(_))),
                "{t}"
            );
        }
        assert!(water_density(300.0, 0.9e5).is_err());
        assert!(water_density(300.0, f64::NAN).is_err());
        assert!(water_vapour_pressure(400.0).is_err());
        for z in [-2000.1, 11_000.1, f64::NAN, f64::NEG_INFINITY] {
            assert!(standard_barometer(z).is_err(), "{z}");
        }
        assert_eq!(
            Fluid::water(273.15 + 150.0).unwrap_err().to_string(),
            "water is known here from 0 C to 100 C, not at 150.00 C"
        );
    }

    #[test]
    fn ends_of_the_fahrenheit_range_pass() {
        let us = crate::units::UnitSet::us();
        for f in [32.0, 212.0] {
            assert!(Fluid::water(us.to_si(crate::units::Kind::Temperature, f)).is_ok());
        }
    }

    #[test]
    fn a_little_pressure_makes_water_a_little_denser() {
        // Isothermal compressibility of water near 20 C: 4.6e-10 per Pa (from memory).
        let low = water_density(293.15, 1e5).unwrap();
        let high = water_density(293.15, 3e5).unwrap();
        let compressibility = (high / low - 1.0) / 2e5;
        assert!(
            (compressibility - 4.6e-10).abs() < 0.05e-10,
            "{compressibility}"
        );
    }
}
