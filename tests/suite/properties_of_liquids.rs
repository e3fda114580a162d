//! Functions of one variable against published tables in `tests/published/tables`; each file says where it comes from.

use dutybank::fluid::{
    Fluid, standard_barometer, water_density, water_vapour_pressure, water_viscosity,
};

/// The rows of a table without its heading, as numbers.
fn table(name: &str) -> Vec<Vec<f64>> {
    let path = format!(
        "{}/tests/published/tables/{name}",
        env!("CARGO_MANIFEST_DIR")
    );
    let mut reader = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .from_path(path)
        .unwrap();
    let rows: Vec<Vec<f64>> = reader.deserialize().map(Result::unwrap).collect();
    assert!(rows.len() > 10, "{name} lost its rows");
    rows
}

/// Fails unless `found` is within `share` of `expected`, relative.
fn near(found: f64, expected: f64, share: f64, what: &str, at: f64) {
    let off = found / expected - 1.0;
    assert!(
        off.abs() <= share,
        "{what} at {at}: {found}, not {expected} ({off:.1e} off)"
    );
}

#[test]
fn water_is_that_of_its_equations() {
    for row in table("water.csv") {
        let (celsius, t) = (row[0], row[0] + 273.15);
        near(
            water_density(t, 1e5).unwrap(),
            row[1],
            1e-6,
            "density",
            celsius,
        );
        near(
            water_viscosity(t).unwrap(),
            row[2],
            1e-6,
            "viscosity",
            celsius,
        );
        near(
            water_vapour_pressure(t).unwrap(),
            row[3],
            1e-6,
            "vapour pressure",
            celsius,
        );
    }
}

/// How far the short equations are from the full formulation; the figures stand in the docs of `Fluid::water`.
#[test]
fn water_is_near_the_full_formulation() {
    for row in table("water.csv") {
        let celsius = row[0];
        let water = Fluid::water(celsius + 273.15).unwrap();
        near(water.density, row[4], 5e-8, "density at 1 atm", celsius);
        near(
            water.dynamic_viscosity(),
            row[5],
            2.9e-5,
            "viscosity",
            celsius,
        );
        near(
            water.vapour_pressure.unwrap(),
            row[6],
            7.1e-5,
            "vapour pressure",
            celsius,
        );
    }
}

#[test]
fn barometer_is_that_of_the_standard_atmosphere() {
    for row in table("atmosphere.csv") {
        near(
            standard_barometer(row[0]).unwrap(),
            row[1],
            1e-6,
            "pressure",
            row[0],
        );
    }
}
