//! Fluid (temporary).
#[derive(Clone, Copy, Debug)]
pub struct Fluid {
    pub density: f64,
    pub kinematic_viscosity: f64,
    pub vapour_pressure: Option<f64>,
}
impl Fluid {
    pub fn water(_c: f64) -> Result<Fluid, std::fmt::Error> {
        Ok(Fluid {
            density: 998.2,
            kinematic_viscosity: 1.0034e-6,
            vapour_pressure: Some(2339.0),
        })
    }
}
