//! What a liquid thicker than water makes of a pump's water curves.
//!
//! Flow and head fall a little, efficiency much, NPSH required rises. One number decides, B, made of viscosity and of the
//! water curve's best efficiency point at the pump's speed; at B up to 1 nothing changes.
//!
//! # Source
//! ANSI/HI 9.6.7-2010, Effects of Liquid Viscosity on Rotodynamic Pump Performance; ISO/TR 17766:2005, Centrifugal pumps
//! handling viscous liquids. Equations of B, flow, head and efficiency from memory, confirmed in an open explanation of the
//! method; that of NPSH from memory (its metric and US constants agree with each other). Neither document is quoted.

use crate::part::curve::CurvePoint;

/// Kinematic viscosity (m2/s) above which a liquid given by its properties counts as viscous where a file does not say: 4.3 cSt.
///
/// # Source
/// Lowest viscosity of the correction charts that came before the present method (40 SSU), from memory. Below it the
/// efficiency of pumps of ordinary size changes by some per cent at most.
pub const VISCOUS_FROM: f64 = 4.3e-6;

/// Highest kinematic viscosity (m2/s) of the method: 3000 cSt. ISO/TR 17766 goes to 4000 cSt; the lower is taken.
pub const HIGHEST_VISCOSITY: f64 = 3000e-6;

/// Highest B of the method. Past it the factors are carried on by the same equations, and nothing is certain.
pub const HIGHEST_B: f64 = 40.0;

/// Highest specific speed (rpm, m3/s, m) of the method.
pub const HIGHEST_SPECIFIC_SPEED: f64 = 60.0;

/// B past which the factors are held. Without it a liquid that hardly flows makes factors of zero, and figures that are
/// not finite (test `factors_stay_usable_for_any_liquid`).
const HELD_B: f64 = 100.0;

/// Share of best-efficiency flow below which the head factor is rounded off: its equation has an infinite slope at no
/// flow (test battery of laws, `viscous_pumps`).
const ROUNDED_BELOW: f64 = 0.02;

/// How the liquid comes to the impeller.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Inlet {
    /// Along the shaft: an end-suction pump.
    #[default]
    End,
    /// From the side, with a bend before the impeller.
    Side,
}

/// What the correction needs to know of a water curve, all at the model's speed and full impeller.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ViscousBasis {
    /// Flow at best efficiency, m3/s.
    pub flow: f64,
    /// Head of one stage there, m.
    pub stage_head: f64,
    /// Speed, revolutions per second.
    pub speed: f64,
    /// NPSH required there, m.
    pub npsh_required: Option<f64>,
    /// How the liquid comes to the impeller.
    pub inlet: Inlet,
}

impl ViscousBasis {
    /// Factors for a liquid of kinematic viscosity `nu` (m2/s) at `speed` over the model's, where flow at best efficiency is
    /// `flow` times, head `head` times the model's.
    ///
    /// B = 16.5 nu^0.5 H^0.0625 / (Q^0.375 N^0.25), nu in cSt, H (m) of a stage and Q (m3/h) at best efficiency, N in rpm;
    ///
    /// C_Q = C_H at best efficiency = 2.71^(-0.165 (log10 B)^3.15);  C_eta = B^(-0.0547 B^0.69);  all 1 at B up to 1;
    ///
    /// C_NPSH = 1 + A (1/C_H - 1) 274000 NPSH / (Q^0.667 N^1.33), A = 0.1 for an end inlet, 0.5 for a side inlet.
    pub fn correction(&self, nu: f64, speed: f64, flow: f64, head: f64) -> Correction {
        let npsh_ratio = head;
        let head = head * self.stage_head;
        let flow = 3600.0 * flow * self.flow;
        let rpm = 60.0 * speed * self.speed;
        // B = 16.5 nu^0.5 H^0.0625 / (Q^0.375 N^0.25)
        let b = 16.5 * (1e6 * nu).sqrt() * head.powf(0.0625) / (flow.powf(0.375) * rpm.powf(0.25));
        if b <= 1.0 {
            return Correction {
                b,
                ..Correction::NONE
            };
        }
        let held = b.min(HELD_B);
        // C_Q = 2.71^(-0.165 (log10 B)^3.15)
        let c = 2.71_f64.powf(-0.165 * held.log10().powf(3.15));
        // C_NPSH = 1 + A (1/C_H - 1) 274000 NPSH / (Q^0.667 N^1.33)
        let a = match self.inlet {
            Inlet::End => 0.1,
            Inlet::Side => 0.5,
        };
        let rise = |npsh: f64| {
            a * (1.0 / c - 1.0) * 274_000.0 * npsh_ratio * npsh
                / (flow.powf(0.667) * rpm.powf(1.33))
        };
        Correction {
            b,
            flow: c,
            // C_eta = B^(-0.0547 B^0.69)
            efficiency: held.powf(-0.0547 * held.powf(0.69)),
            npsh: 1.0 + self.npsh_required.map_or(0.0, rise),
        }
    }

    /// n_s = N Q^0.5 / H^0.75 of a stage, rpm, m3/s, m.
    pub fn specific_speed(&self) -> f64 {
        60.0 * self.speed * self.flow.sqrt() / self.stage_head.powf(0.75)
    }
}

/// Factors on a pump's water curves at one speed in one liquid.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Correction {
    /// The number that decides.
    pub b: f64,
    /// On flow, and on head at best efficiency.
    pub flow: f64,
    /// On efficiency.
    pub efficiency: f64,
    /// On NPSH required.
    pub npsh: f64,
}

impl Correction {
    /// For water: no change.
    pub const NONE: Self = Self {
        b: 0.0,
        flow: 1.0,
        efficiency: 1.0,
        npsh: 1.0,
    };

    /// Factor on head at a share `x` (not negative) of best-efficiency flow, and its slope by `x`.
    ///
    /// C_H = 1 - (1 - C_Q) x^0.75, below x0 = 2 % with (x/x0) (1.25 - 0.25 x/x0) x0^0.75 in place of the power.
    pub fn head_at(&self, x: f64) -> CurvePoint {
        let lost = 1.0 - self.flow;
        let root = |x: f64| (x * x.sqrt()).sqrt();
        let (power, slope) = if x < ROUNDED_BELOW {
            let (t, at) = (x / ROUNDED_BELOW, root(ROUNDED_BELOW));
            (
                at * t * (1.25 - 0.25 * t),
                at * (1.25 - 0.5 * t) / ROUNDED_BELOW,
            )
        } else {
            let power = root(x);
            (power, 0.75 * power / x)
        };
        CurvePoint {
            value: 1.0 - lost * power,
            slope: -lost * slope,
        }
    }

    /// Share of best-efficiency flow at which the factor on head comes to zero: 1 = (1 - C_Q) x^0.75.
    pub(super) fn no_head_from(&self) -> f64 {
        (1.0 - self.flow).powf(-4.0 / 3.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn basis(flow_m3h: f64, head: f64, rpm: f64) -> ViscousBasis {
        ViscousBasis {
            flow: flow_m3h / 3600.0,
            stage_head: head,
            speed: rpm / 60.0,
            npsh_required: None,
            inlet: Inlet::End,
        }
    }

    /// B, C_Q and C_eta worked out from the equations outside this program, to ten figures.
    #[test]
    fn the_equations_are_worked_out_rightly() {
        for (nu, head, flow, rpm, b, c_q, c_eta) in [
            (
                10.0,
                50.0,
                100.0,
                1450.0,
                1.920116453,
                0.9969083214,
                0.9455635338,
            ),
            (
                50.0,
                30.0,
                50.0,
                2900.0,
                4.534984152,
                0.9572292781,
                0.7908029009,
            ),
            (
                300.0,
                60.0,
                200.0,
                1480.0,
                8.160698773,
                0.8843071541,
                0.6133421952,
            ),
            (
                1000.0,
                40.0,
                150.0,
                1480.0,
                16.18128632,
                0.7414863193,
                0.3536073245,
            ),
        ] {
            let found = basis(flow, head, rpm).correction(nu * 1e-6, 1.0, 1.0, 1.0);
            for (found, expected) in [(found.b, b), (found.flow, c_q), (found.efficiency, c_eta)] {
                assert!(
                    (found / expected - 1.0).abs() < 1e-8,
                    "{nu}: {found} {expected}"
                );
            }
        }
    }

    /// Water in ordinary pumps: B below 1 (invented sizes).
    #[test]
    fn nothing_changes_at_b_up_to_one() {
        let found = basis(50.0, 30.0, 1450.0).correction(1e-6, 1.0, 1.0, 1.0);
        assert!(found.b < 1.0);
        assert_eq!(
            found,
            Correction {
                b: found.b,
                ..Correction::NONE
            }
        );
    }

    /// B at another speed s: H^0.0625 / (Q^0.375 N^0.25) goes with s^(0.125 - 0.375 - 0.25) = s^-0.5.
    #[test]
    fn slower_is_thicker() {
        let pump = basis(110.0, 77.0, 2950.0);
        let full = pump.correction(120e-6, 1.0, 1.0, 1.0);
        let slow = pump.correction(120e-6, 0.64, 0.64, 0.64 * 0.64);
        assert!((slow.b / full.b - 1.0 / 0.8).abs() < 1e-12);
        assert!(slow.flow < full.flow && slow.efficiency < full.efficiency);
        // a trimmed impeller turns as fast as a full one: s^(0.125 - 0.375)
        let trimmed = pump.correction(120e-6, 1.0, 0.81, 0.81 * 0.81);
        assert!((trimmed.b / full.b - 0.81_f64.powf(-0.25)).abs() < 1e-12);
    }

    /// The US form of the rise of NPSH has 225000 in place of 274000, with ft and gpm (from memory): the same figure.
    #[test]
    fn both_forms_of_the_rise_of_npsh_agree() {
        let pump = ViscousBasis {
            npsh_required: Some(4.15),
            inlet: Inlet::Side,
            ..basis(110.0, 77.0, 2950.0)
        };
        let found = pump.correction(120e-6, 1.0, 1.0, 1.0);
        let (gpm, ft) = (110.0 / 0.227_124_7, 4.15 / 0.3048);
        let us = 0.5 * (1.0 / found.flow - 1.0) * 225_000.0 * ft
            / (f64::powf(gpm, 0.667) * 2950_f64.powf(1.33));
        assert!(found.npsh > 1.03 && ((found.npsh - 1.0) / us - 1.0).abs() < 0.005);
        let end = ViscousBasis {
            inlet: Inlet::End,
            ..pump
        };
        let less = end.correction(120e-6, 1.0, 1.0, 1.0).npsh - 1.0;
        assert!((5.0 * less / (found.npsh - 1.0) - 1.0).abs() < 1e-12);
    }

    #[test]
    fn factors_stay_usable_for_any_liquid() {
        for nu in [1e-3, 1.0, 1e6, 1e100] {
            let found = basis(1.0, 5.0, 100.0).correction(nu, 0.1, 0.1, 0.01);
            assert!(found.flow > 0.01 && found.efficiency > 1e-3 && found.npsh.is_finite());
        }
    }

    /// N = 1480 rpm, Q = 200 m3/h, H = 32 m: 1480 (200/3600)^0.5 / 32^0.75 = 25.93.
    #[test]
    fn specific_speed_is_that_of_the_trade() {
        assert!((basis(200.0, 32.0, 1480.0).specific_speed() - 25.93).abs() < 0.01);
    }
}
