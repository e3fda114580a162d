//! A first screen for surge: how fast a pressure wave runs in a pipe, and how high it can be. It bounds and clears nothing.

/// Bulk modulus of water, Pa, taken for every liquid here.
///
/// # Source
/// E. B. Wylie and V. L. Streeter, Fluid Transients in Systems (1993), water at about 20 C; from memory.
pub const BULK_MODULUS: f64 = 2.19e9;

/// Young's modulus of a pipe material, Pa; none where it varies too much to be taken from its name.
///
/// Plastics are stiffer in a short blow than under a lasting load, and softer when warm.
///
/// # Source
/// E. B. Wylie and V. L. Streeter, Fluid Transients in Systems (1993), table of moduli; from memory. Plastics: common practice, no
/// source.
pub fn stiffness(material: &str) -> Option<f64> {
    let gigapascals = match material {
        "commercial_steel" | "galvanized_steel" | "riveted_steel" | "steel_cement_lined"
        | "steel_epoxy_lined" => 207.0,
        "stainless_steel" => 193.0,
        "ductile_iron" | "ductile_iron_cement_lined" => 166.0,
        "cast_iron" | "asphalted_cast_iron" => 100.0,
        "copper" => 117.0,
        "fibre_cement" => 24.0,
        "pvc" => 2.8,
        "hdpe" => 0.9,
        "pe" => 0.8,
        _ => return None,
    };
    Some(gigapascals * 1e9)
}

/// Wave speed in a pipe of a rigid wall, m/s: the upper end for any wall.
///
/// a = sqrt(K / rho)
pub fn rigid_wave_speed(density: f64) -> f64 {
    (BULK_MODULUS / density).sqrt()
}

/// Wave speed in a pipe with a thin elastic wall that is free to stretch lengthwise, m/s.
///
/// a = sqrt(K / rho) / sqrt(1 + K D / (E e)), with bore D (m), wall e (m), Young's modulus E (Pa).
///
/// # Source
/// E. B. Wylie and V. L. Streeter, Fluid Transients in Systems (1993), wave speed for a pipe with expansion joints throughout.
pub fn wave_speed(density: f64, bore: f64, wall: f64, stiffness: f64) -> f64 {
    rigid_wave_speed(density) / (1.0 + BULK_MODULUS * bore / (stiffness * wall)).sqrt()
}

/// Largest rise of head when a flow of velocity `v` (m/s) stops within the time that the wave needs there and back, m.
///
/// dh = a v / g
///
/// # Source
/// N. Joukowsky (1898), as in E. B. Wylie and V. L. Streeter, Fluid Transients in Systems (1993).
pub fn joukowsky(wave_speed: f64, v: f64, gravity: f64) -> f64 {
    wave_speed * v / gravity
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_wall_slows_the_wave_and_a_stiff_one_does_not() {
        // 2.19e9 x 0.25 / (166e9 x 0.0068) = 0.485, by hand
        let iron = wave_speed(998.2, 0.25, 0.0068, 166e9);
        assert!((iron - rigid_wave_speed(998.2) / 1.485f64.sqrt()).abs() < 0.1);
        assert!(
            (wave_speed(998.2, 0.25, 0.0068, 1e20) / rigid_wave_speed(998.2) - 1.0).abs() < 1e-6
        );
        // hot-rolled figures of the demo systems (invented): 1100 m/s and 1.65 m/s give 185 m
        assert!((joukowsky(1100.0, 1.65, 9.80665) - 185.0).abs() < 0.5);
    }
}
