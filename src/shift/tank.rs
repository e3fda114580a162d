//! Tanks: how level follows from volume, and the pressure of the gas above it.

use super::plan::Varying;
use crate::network::NodeId;

/// The shape of a tank.
#[derive(Clone, Debug, PartialEq)]
pub enum Shape {
    /// The same area (m2) at every level.
    Upright {
        /// Area, m2.
        area: f64,
    },
    /// A cylinder lying on its side.
    Cylinder {
        /// Inside diameter, m.
        diameter: f64,
        /// Inside length, m.
        length: f64,
    },
    /// Volumes (m3) at levels (m above the floor), both rising from 0, straight between.
    Table {
        /// Levels, m.
        levels: Vec<f64>,
        /// Volumes, m3.
        volumes: Vec<f64>,
    },
}

/// Why a shape is none.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ShapeError {
    /// A length or an area is not above zero.
    NoExtent,
    /// The table has fewer than two points or columns of unequal length.
    TableTooShort,
    /// The table does not begin with level 0 and volume 0.
    TableStart,
    /// Levels or volumes do not rise throughout.
    TableNotRising,
}

impl std::fmt::Display for ShapeError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            Self::NoExtent => "an area, diameter or length has to be above zero",
            Self::TableTooShort => {
                "a table needs two points or more, and as many volumes as levels"
            }
            Self::TableStart => "a table begins with level 0 and volume 0",
            Self::TableNotRising => "levels and volumes have to rise from point to point",
        })
    }
}

impl std::error::Error for ShapeError {}

impl Shape {
    /// Whether the figures make a shape.
    ///
    /// # Errors
    /// See [`ShapeError`].
    pub fn check(&self) -> Result<(), ShapeError> {
        let extent = |x: f64| {
            (x > 0.0 && x.is_finite())
                .then_some(())
                .ok_or(ShapeError::NoExtent)
        };
        match self {
            Self::Upright { area } => extent(*area),
            Self::Cylinder { diameter, length } => extent(*diameter).and(extent(*length)),
            Self::Table { levels, volumes } => {
                if levels.len() < 2 || levels.len() != volumes.len() {
                    return Err(ShapeError::TableTooShort);
                }
                if levels[0] != 0.0 || volumes[0] != 0.0 {
                    return Err(ShapeError::TableStart);
                }
                let rises = |column: &[f64]| {
                    column
                        .windows(2)
                        .all(|pair| pair[1] > pair[0] && pair[1].is_finite())
                };
                (rises(levels) && rises(volumes))
                    .then_some(())
                    .ok_or(ShapeError::TableNotRising)
            }
        }
    }

    /// The highest level that the shape allows, m.
    pub fn top(&self) -> f64 {
        match self {
            Self::Upright { .. } => f64::INFINITY,
            Self::Cylinder { diameter, .. } => *diameter,
            Self::Table { levels, .. } => levels[levels.len() - 1],
        }
    }

    /// Volume (m3) up to a level (m above the floor).
    pub fn volume(&self, level: f64) -> f64 {
        match self {
            Self::Upright { area } => area * level,
            Self::Cylinder { diameter, length } => {
                // V = L r2 (phi - sin phi)/2,  cos(phi/2) = 1 - h/r
                let r = 0.5 * diameter;
                let phi = 2.0 * (1.0 - level / r).clamp(-1.0, 1.0).acos();
                0.5 * length * r * r * (phi - phi.sin())
            }
            Self::Table { levels, volumes } => straight(levels, volumes, level),
        }
    }

    /// Level (m above the floor) at a volume (m3). Outside what the tank holds it goes on smoothly enough for a step to look
    /// past its end.
    pub fn level(&self, volume: f64) -> f64 {
        match self {
            Self::Upright { area } => volume / area,
            Self::Cylinder { diameter, length } => {
                let r = 0.5 * diameter;
                let full = std::f64::consts::TAU;
                let wanted = (2.0 * volume / (length * r * r)).clamp(0.0, full);
                r * (1.0 - (0.5 * segment_angle(wanted)).cos())
            }
            Self::Table { levels, volumes } => straight(volumes, levels, volume),
        }
    }
}

/// phi with phi - sin phi = `wanted` (0 to 2 pi), by Newton kept inside a bracket.
fn segment_angle(wanted: f64) -> f64 {
    let full = std::f64::consts::TAU;
    if wanted <= 0.0 {
        return 0.0;
    }
    if wanted > 0.5 * full {
        return full - segment_angle(full - wanted);
    }
    // phi - sin phi = phi3/6 - ..: a start that is right where the plain Newton step would run away
    let mut phi = (6.0 * wanted).cbrt().min(0.5 * full);
    let (mut low, mut high) = (0.0, 0.5 * full);
    for _ in 0..60 {
        let off = phi - phi.sin() - wanted;
        if off > 0.0 {
            high = phi;
        } else {
            low = phi;
        }
        let next = phi - off / (1.0 - phi.cos());
        let next = if next > low && next < high {
            next
        } else {
            0.5 * (low + high)
        };
        if (next - phi).abs() <= 1e-16 * full || !next.is_finite() {
            break;
        }
        phi = next;
    }
    phi
}

/// Straight between points, the end pieces going on.
fn straight(x: &[f64], y: &[f64], at: f64) -> f64 {
    let i = x.partition_point(|x| *x <= at).clamp(1, x.len() - 1);
    y[i - 1] + (at - x[i - 1]) * (y[i] - y[i - 1]) / (x[i] - x[i - 1])
}

/// The gas above the surface.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Gas {
    /// Its gauge pressure does not change, Pa; 0 for an open tank.
    Steady(f64),
    /// Enclosed: p V^n stays what it is at the start (p absolute, V the vessel's volume less the liquid's).
    Cushion {
        /// Volume of the whole vessel, m3.
        vessel: f64,
        /// Gauge pressure at the start level, Pa.
        pressure: f64,
        /// Exponent n: 1 where the gas keeps its temperature, 1.4 for air where it exchanges no heat, 1.2 between them (from memory).
        exponent: f64,
    },
}

impl Gas {
    /// Gauge pressure (Pa) over `volume` of liquid, having started over `start`.
    pub fn pressure(&self, volume: f64, start: f64, barometer: f64) -> f64 {
        match *self {
            Self::Steady(pressure) => pressure,
            Self::Cushion {
                vessel,
                pressure,
                exponent,
            } => {
                // A step may look past the vessel's top, where the law has no value.
                let left = (vessel - volume).max(1e-6 * vessel);
                // p V^n = const, p absolute
                (pressure + barometer) * ((vessel - start) / left).powf(exponent) - barometer
            }
        }
    }
}

/// A tank of the network with what happens to it.
#[derive(Clone, Debug, PartialEq)]
pub struct Tank {
    /// Its node.
    pub node: NodeId,
    /// Its shape.
    pub shape: Shape,
    /// Level at which it spills, m above its floor.
    pub brim: f64,
    /// Level at the start, m.
    pub level: f64,
    /// The gas above the surface.
    pub gas: Gas,
    /// Level whose passing upwards is an alarm, m.
    pub alarm: Option<f64>,
    /// What flows in from outside the network.
    pub inflows: Vec<Varying>,
    /// What is drawn from it by others than the network.
    pub draws: Vec<Varying>,
}

impl Tank {
    /// An open tank with nothing but its shape.
    pub fn open(node: NodeId, shape: Shape, brim: f64, level: f64) -> Self {
        Self {
            node,
            shape,
            brim,
            level,
            gas: Gas::Steady(0.0),
            alarm: None,
            inflows: Vec::new(),
            draws: Vec::new(),
        }
    }

    /// Volume at the brim, m3.
    pub fn capacity(&self) -> f64 {
        self.shape.volume(self.brim)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn levels_and_volumes_invert_each_other() {
        let shapes = [
            Shape::Upright { area: 28.0 },
            Shape::Cylinder {
                diameter: 2.4,
                length: 6.0,
            },
            Shape::Table {
                levels: vec![0.0, 0.5, 2.0],
                volumes: vec![0.0, 3.0, 40.0],
            },
        ];
        for shape in shapes {
            assert!(shape.check().is_ok());
            for i in 0..=200 {
                let level = 2.0 * f64::from(i) / 200.0;
                let back = shape.level(shape.volume(level));
                assert!((back - level).abs() < 1e-9, "{shape:?} {level} {back}");
            }
        }
    }

    #[test]
    fn a_lying_cylinder_is_half_full_at_half_its_height() {
        let shape = Shape::Cylinder {
            diameter: 2.0,
            length: 5.0,
        };
        let half = 0.5 * std::f64::consts::PI * 5.0;
        assert!((shape.volume(1.0) - half).abs() < 1e-12);
        assert!((shape.level(half) - 1.0).abs() < 1e-12);
        assert_eq!(shape.level(-1.0), 0.0);
        assert!((shape.level(100.0) - 2.0).abs() < 1e-12);
    }

    #[test]
    fn a_cushion_halved_at_constant_temperature_doubles_its_absolute_pressure() {
        let gas = Gas::Cushion {
            vessel: 10.0,
            pressure: 2e5,
            exponent: 1.0,
        };
        let pressure = gas.pressure(8.0, 6.0, 1e5);
        assert!((pressure - 5e5).abs() < 1e-6);
    }

    #[test]
    fn wrong_tables_are_refused() {
        let table = |levels: Vec<f64>, volumes: Vec<f64>| Shape::Table { levels, volumes }.check();
        assert_eq!(table(vec![0.0], vec![0.0]), Err(ShapeError::TableTooShort));
        assert_eq!(
            table(vec![0.1, 1.0], vec![0.0, 1.0]),
            Err(ShapeError::TableStart)
        );
        assert_eq!(
            table(vec![0.0, 1.0, 2.0], vec![0.0, 1.0, 1.0]),
            Err(ShapeError::TableNotRising)
        );
        assert_eq!(
            Shape::Upright { area: 0.0 }.check(),
            Err(ShapeError::NoExtent)
        );
    }
}
