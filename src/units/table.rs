//! Every unit the program reads and writes, with its factor to SI as its definition gives it.
//!
//! # Sources
//! - International yard and pound agreement (1959): 1 yd = 0.9144 m, so 1 ft = 0.3048 m and 1 in = 0.0254 m;
//!   1 lb = 0.45359237 kg.
//! - US liquid gallon: 231 cubic inches. Imperial gallon: 4.54609 L (UK Weights and Measures Act 1985).
//! - Standard acceleration of free fall, 9.80665 m/s2 (3rd CGPM, 1901), makes the pound-force and the kilogram-force.
//! - Standard atmosphere 101325 Pa (10th CGPM, 1954); bar, litre, hectare, stokes and poise: BIPM, The International
//!   System of Units (SI Brochure), 9th ed.
//! - Horsepower: 550 ft lbf/s; metric horsepower (PS): 75 kgf m/s. Conventional water column: 1000 kg/m3 under standard
//!   gravity; conventional mercury column: 13595.1 kg/m3 (NIST SP 811, 2008, appendix B; from memory).

use super::Kind;
use std::fmt;

const FOOT: f64 = 0.3048;
const INCH: f64 = FOOT / 12.0;
const YARD: f64 = 3.0 * FOOT;
const POUND: f64 = 0.45359237;
const STANDARD_GRAVITY: f64 = 9.80665;
const POUND_FORCE: f64 = POUND * STANDARD_GRAVITY;
const FOOT2: f64 = FOOT * FOOT;
const FOOT3: f64 = FOOT * FOOT * FOOT;
const LITRE: f64 = 1e-3;
const US_GALLON: f64 = 231.0 * INCH * INCH * INCH;
const IMPERIAL_GALLON: f64 = 4.54609 * LITRE;
const MINUTE: f64 = 60.0;
const HOUR: f64 = 3600.0;
const DAY: f64 = 86400.0;
const FAHRENHEIT_DEGREE: f64 = 5.0 / 9.0;
const WATER_COLUMN: f64 = 1000.0 * STANDARD_GRAVITY;
const MERCURY_COLUMN: f64 = 13595.1 * STANDARD_GRAVITY;

/// One unit: SI value = number x `factor` + `offset`.
#[derive(Debug, PartialEq)]
pub struct Unit {
    /// The spelling that results carry.
    pub symbol: &'static str,
    /// Other spellings that are read, after [`Unit::parse`] has simplified the text.
    pub also: &'static [&'static str],
    /// What it measures. A bore is listed as a length.
    pub kind: Kind,
    /// SI value of one unit.
    pub factor: f64,
    /// SI value at zero; not 0 for C and F alone.
    pub offset: f64,
    /// Digits after the point that suit this unit in a table.
    pub decimals: usize,
    /// The unit in words, so that US and imperial gallons are never taken for each other.
    pub name: &'static str,
    /// Upper and lower case tell this unit from another of the same letters (mPa, MPa).
    exact_case: bool,
}

impl Unit {
    /// The unit that `text` spells.
    ///
    /// `m³/h`, `m^3/h`, `m3/hr` and `m3 / h` are all read as `m3/h`, and `°C` as `C`. An exact spelling wins; then one that
    /// differs in case alone, provided that case carries no meaning there: `KW` is kW, but `mW` is not MW.
    pub fn parse(text: &str) -> Option<&'static Unit> {
        let text = simplified(text);
        let fits = |same: fn(&str, &str) -> bool, unit: &&Unit| {
            unit.spellings().any(|spelling| same(spelling, &text))
        };
        UNITS
            .iter()
            .find(|unit| fits(|a, b| a == b, unit))
            .or_else(|| {
                UNITS
                    .iter()
                    .find(|unit| !unit.exact_case && fits(str::eq_ignore_ascii_case, unit))
            })
    }

    /// The symbol and every other spelling.
    pub fn spellings(&self) -> impl Iterator<Item = &'static str> {
        std::iter::once(self.symbol).chain(self.also.iter().copied())
    }

    /// SI value of `number` in this unit.
    pub fn to_si(&self, number: f64) -> f64 {
        // si = n f + o
        number * self.factor + self.offset
    }

    /// Number in this unit of the SI value `value`.
    pub fn from_si(&self, value: f64) -> f64 {
        // n = (si - o) / f
        (value - self.offset) / self.factor
    }

    const fn exact_case(mut self) -> Unit {
        self.exact_case = true;
        self
    }

    const fn offset(mut self, offset: f64) -> Unit {
        self.offset = offset;
        self
    }
}

impl fmt::Display for Unit {
    /// Symbol and words: `gpm (US gallons per minute)`.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} ({})", self.symbol, self.name)
    }
}

const fn unit(
    symbol: &'static str,
    also: &'static [&'static str],
    kind: Kind,
    factor: f64,
    decimals: usize,
    name: &'static str,
) -> Unit {
    Unit {
        symbol,
        also,
        kind,
        factor,
        offset: 0.0,
        decimals,
        name,
        exact_case: false,
    }
}

/// The unit whose symbol is `symbol`. For constants only: a symbol that the table lacks does not compile there.
pub(super) const fn named(symbol: &str) -> &'static Unit {
    let wanted = symbol.as_bytes();
    let mut row = 0;
    while row < UNITS.len() {
        let found = UNITS[row].symbol.as_bytes();
        let mut same = 0;
        while same < wanted.len() && same < found.len() && wanted[same] == found[same] {
            same += 1;
        }
        if same == wanted.len() && same == found.len() {
            return &UNITS[row];
        }
        row += 1;
    }
    panic!("the table has no such unit")
}

/// The table. Spellings are unique in it.
#[rustfmt::skip]
pub static UNITS: [Unit; 80] = [
    unit("m", &["metre", "metres", "meter", "meters"], Kind::Length, 1.0, 2, "metres"),
    unit("mm", &[], Kind::Length, 1e-3, 1, "millimetres").exact_case(),
    unit("cm", &[], Kind::Length, 1e-2, 1, "centimetres"),
    unit("km", &[], Kind::Length, 1e3, 3, "kilometres"),
    unit("ft", &["foot", "feet"], Kind::Length, FOOT, 1, "feet"),
    unit("in", &["in.", "inch", "inches"], Kind::Length, INCH, 2, "inches"),
    unit("yd", &["yard", "yards"], Kind::Length, YARD, 1, "yards"),

    unit("m3/h", &["cmh"], Kind::Flow, 1.0 / HOUR, 1, "cubic metres per hour"),
    unit("m3/s", &[], Kind::Flow, 1.0, 5, "cubic metres per second"),
    unit("m3/min", &[], Kind::Flow, 1.0 / MINUTE, 3, "cubic metres per minute"),
    unit("m3/d", &[], Kind::Flow, 1.0 / DAY, 0, "cubic metres per day"),
    unit("L/s", &["lps"], Kind::Flow, LITRE, 2, "litres per second"),
    unit("L/min", &["lpm"], Kind::Flow, LITRE / MINUTE, 1, "litres per minute"),
    unit("L/h", &[], Kind::Flow, LITRE / HOUR, 0, "litres per hour"),
    unit("ML/d", &["Ml/d", "MLD"], Kind::Flow, 1e6 * LITRE / DAY, 3, "megalitres per day").exact_case(),
    unit("gpm", &["US gpm", "usgpm", "gal/min", "US gal/min"], Kind::Flow, US_GALLON / MINUTE, 1, "US gallons per minute"),
    unit("igpm", &["imp gpm", "imperial gpm", "igal/min", "imp gal/min"], Kind::Flow, IMPERIAL_GALLON / MINUTE, 1, "imperial gallons per minute"),
    unit("mgd", &["MGD", "US mgd"], Kind::Flow, 1e6 * US_GALLON / DAY, 3, "US million gallons per day").exact_case(),
    unit("ft3/s", &["cfs"], Kind::Flow, FOOT3, 3, "cubic feet per second"),
    unit("ft3/min", &["cfm"], Kind::Flow, FOOT3 / MINUTE, 1, "cubic feet per minute"),

    unit("Pa", &[], Kind::Pressure, 1.0, 0, "pascals"),
    unit("hPa", &[], Kind::Pressure, 100.0, 1, "hectopascals"),
    unit("kPa", &[], Kind::Pressure, 1e3, 1, "kilopascals"),
    unit("MPa", &[], Kind::Pressure, 1e6, 4, "megapascals").exact_case(),
    unit("bar", &[], Kind::Pressure, 1e5, 2, "bar"),
    unit("mbar", &[], Kind::Pressure, 100.0, 1, "millibar").exact_case(),
    unit("psi", &["lbf/in2"], Kind::Pressure, POUND_FORCE / (INCH * INCH), 1, "pounds-force per square inch"),
    unit("atm", &[], Kind::Pressure, 101325.0, 3, "standard atmospheres"),
    unit("kgf/cm2", &["kg/cm2"], Kind::Pressure, STANDARD_GRAVITY / 1e-4, 2, "kilograms-force per square centimetre"),
    unit("mH2O", &["mWC"], Kind::Pressure, WATER_COLUMN, 2, "metres of water, conventional").exact_case(),
    unit("ftH2O", &[], Kind::Pressure, WATER_COLUMN * FOOT, 1, "feet of water, conventional"),
    unit("mmHg", &[], Kind::Pressure, MERCURY_COLUMN * 1e-3, 1, "millimetres of mercury, conventional").exact_case(),
    unit("inHg", &[], Kind::Pressure, MERCURY_COLUMN * INCH, 2, "inches of mercury, conventional"),

    unit("W", &[], Kind::Power, 1.0, 0, "watts"),
    unit("kW", &[], Kind::Power, 1e3, 1, "kilowatts"),
    unit("MW", &[], Kind::Power, 1e6, 4, "megawatts").exact_case(),
    unit("hp", &["bhp"], Kind::Power, 550.0 * FOOT * POUND_FORCE, 1, "horsepower of 550 ft lbf/s"),
    unit("PS", &[], Kind::Power, 75.0 * STANDARD_GRAVITY, 1, "metric horsepower of 75 kgf m/s").exact_case(),

    unit("m3", &[], Kind::Volume, 1.0, 1, "cubic metres"),
    unit("L", &["litre", "litres", "liter", "liters"], Kind::Volume, LITRE, 0, "litres"),
    unit("ML", &["Ml"], Kind::Volume, 1e6 * LITRE, 3, "megalitres").exact_case(),
    unit("gal", &["US gal", "usgal"], Kind::Volume, US_GALLON, 0, "US gallons"),
    unit("igal", &["imp gal", "imperial gal"], Kind::Volume, IMPERIAL_GALLON, 0, "imperial gallons"),
    unit("ft3", &[], Kind::Volume, FOOT3, 1, "cubic feet"),

    unit("m2", &[], Kind::Area, 1.0, 2, "square metres"),
    unit("cm2", &[], Kind::Area, 1e-4, 1, "square centimetres"),
    unit("mm2", &[], Kind::Area, 1e-6, 0, "square millimetres").exact_case(),
    unit("ha", &[], Kind::Area, 1e4, 3, "hectares"),
    unit("ft2", &[], Kind::Area, FOOT2, 1, "square feet"),
    unit("in2", &[], Kind::Area, INCH * INCH, 2, "square inches"),
    unit("acre", &["acres"], Kind::Area, 4840.0 * YARD * YARD, 3, "acres of 4840 square yards"),

    unit("kg/m3", &[], Kind::Density, 1.0, 1, "kilograms per cubic metre"),
    unit("g/cm3", &["kg/L"], Kind::Density, 1e3, 4, "grams per cubic centimetre"),
    unit("lb/ft3", &[], Kind::Density, POUND / FOOT3, 2, "pounds per cubic foot"),

    unit("m2/s", &[], Kind::Viscosity, 1.0, 9, "square metres per second"),
    unit("mm2/s", &[], Kind::Viscosity, 1e-6, 3, "square millimetres per second").exact_case(),
    unit("cSt", &[], Kind::Viscosity, 1e-6, 3, "centistokes"),
    unit("St", &[], Kind::Viscosity, 1e-4, 5, "stokes"),
    unit("ft2/s", &[], Kind::Viscosity, FOOT2, 8, "square feet per second"),

    unit("Pa.s", &["Pa s"], Kind::DynamicViscosity, 1.0, 6, "pascal seconds"),
    unit("mPa.s", &["mPa s"], Kind::DynamicViscosity, 1e-3, 3, "millipascal seconds").exact_case(),
    unit("cP", &[], Kind::DynamicViscosity, 1e-3, 3, "centipoise"),

    unit("C", &["degC"], Kind::Temperature, 1.0, 1, "degrees Celsius").offset(273.15),
    unit("F", &["degF"], Kind::Temperature, FAHRENHEIT_DEGREE, 1, "degrees Fahrenheit").offset(459.67 * FAHRENHEIT_DEGREE),
    unit("K", &[], Kind::Temperature, 1.0, 2, "kelvins"),

    unit("%", &["percent"], Kind::Percent, 1e-2, 1, "per cent"),
    unit("rpm", &["1/min", "r/min"], Kind::Speed, 1.0, 0, "revolutions per minute"),

    unit("s", &["sec"], Kind::Time, 1.0, 1, "seconds"),
    unit("min", &[], Kind::Time, MINUTE, 1, "minutes"),
    unit("h", &["hr", "hour", "hours"], Kind::Time, HOUR, 2, "hours"),
    unit("d", &["day", "days"], Kind::Time, DAY, 2, "days"),

    unit("m/s", &[], Kind::Velocity, 1.0, 2, "metres per second"),
    unit("ft/s", &["fps"], Kind::Velocity, FOOT, 2, "feet per second"),

    unit("kWh", &[], Kind::Energy, 1e3 * HOUR, 1, "kilowatt hours"),
    unit("MWh", &[], Kind::Energy, 1e6 * HOUR, 4, "megawatt hours").exact_case(),
    unit("J", &[], Kind::Energy, 1.0, 0, "joules"),
    unit("kJ", &[], Kind::Energy, 1e3, 1, "kilojoules"),
    unit("MJ", &[], Kind::Energy, 1e6, 2, "megajoules").exact_case(),

    unit("m/s2", &[], Kind::Acceleration, 1.0, 5, "metres per second squared"),
    unit("ft/s2", &[], Kind::Acceleration, FOOT, 3, "feet per second squared"),
];

/// Symbols of the units that fit `kind`, in the order of the table: what a message offers.
pub fn spellings(kind: Kind) -> impl Iterator<Item = &'static str> {
    UNITS
        .iter()
        .filter(move |unit| unit.kind == kind.dimension())
        .map(|unit| unit.symbol)
}

/// The spelling nearest to `text` among the units that fit `kind` (any kind if `None`), or nothing when none is near.
///
/// Near means the same letters in another case, else one or two edits in a spelling more than twice as long as that. An edit is
/// one letter put in, left out, changed, or two neighbours swapped.
pub fn nearest(text: &str, kind: Option<Kind>) -> Option<&'static str> {
    // The comparison costs the product of both lengths.
    const LONGEST: usize = 32;
    if text.len() > LONGEST {
        return None;
    }
    let text = simplified(text).to_ascii_lowercase();
    UNITS
        .iter()
        .filter(|unit| kind.is_none_or(|kind| unit.kind == kind.dimension()))
        .flat_map(Unit::spellings)
        .map(|spelling| {
            let edits = strsim::damerau_levenshtein(&spelling.to_ascii_lowercase(), &text);
            (edits, spelling)
        })
        // A short unit is only a few edits away from anything.
        .filter(|(edits, spelling)| {
            *edits == 0 || (*edits <= 2 && 2 * *edits < spelling.chars().count())
        })
        .min_by_key(|(edits, _)| *edits)
        .map(|(_, spelling)| spelling)
}

/// The text with the ways of writing powers, degrees, products and time made one: `m³ / hr` becomes `m3/h`.
fn simplified(text: &str) -> String {
    let mut plain = String::with_capacity(text.len());
    for letter in text.trim().chars() {
        match letter {
            '³' => plain.push('3'),
            '²' => plain.push('2'),
            '·' | '*' | '⋅' => plain.push('.'),
            '^' | '°' | 'º' => {}
            other => plain.push(other),
        }
    }
    let factors = plain.split('/').map(|part| part.trim().replace(" . ", "."));
    factors
        .enumerate()
        .map(|(place, part)| {
            let below_the_line = place > 0;
            match part.as_str() {
                "hr" | "hour" if below_the_line => "h".to_string(),
                "sec" if below_the_line => "s".to_string(),
                "day" if below_the_line => "d".to_string(),
                _ => part,
            }
        })
        .collect::<Vec<_>>()
        .join("/")
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::collections::HashMap;

    fn close(a: f64, b: f64) -> bool {
        (a - b).abs() <= 4.0 * f64::EPSILON * b.abs()
    }

    #[test]
    fn every_spelling_is_read_as_its_own_unit_and_no_other() {
        let mut seen = HashMap::new();
        for unit in &UNITS {
            for spelling in unit.spellings() {
                assert_eq!(Unit::parse(spelling), Some(unit), "{spelling}");
                let before = seen.insert(simplified(spelling), unit.symbol);
                assert_eq!(before, None, "{spelling} twice");
            }
        }
    }

    #[test]
    fn letters_alike_but_for_case_belong_to_one_unit_or_are_told_apart() {
        for a in UNITS.iter().filter(|unit| !unit.exact_case) {
            for b in UNITS.iter().filter(|unit| !unit.exact_case) {
                for (x, y) in a
                    .spellings()
                    .flat_map(|x| b.spellings().map(move |y| (x, y)))
                {
                    assert!(
                        !x.eq_ignore_ascii_case(y) || a == b,
                        "{x} of {a} and {y} of {b}"
                    );
                }
            }
        }
    }

    #[test]
    fn every_unit_goes_there_and_back() {
        for unit in &UNITS {
            for number in [-273.0, 0.0, 1.0, 0.37, 1234.5] {
                let back = unit.from_si(unit.to_si(number));
                assert!(
                    (back - number).abs() <= 1e-12 * number.abs().max(1000.0),
                    "{unit}"
                );
            }
        }
    }

    #[test]
    fn factors_match_published_conversions() {
        // NIST SP 811 (2008), appendix B.8; from memory. Its entries in bold are exact, others carry seven digits.
        for (symbol, exact) in [
            ("gal", 3.785411784e-3),
            ("igal", 4.54609e-3),
            ("ft3", 0.028316846592),
            ("acre", 4046.8564224),
            ("PS", 735.49875),
            ("mH2O", 9806.65),
            ("kgf/cm2", 98066.5),
            ("hp", 745.699_871_582_270_2),
        ] {
            assert!(close(named(symbol).factor, exact), "{symbol}");
        }
        for (symbol, rounded) in [
            ("psi", 6.894757e3),
            ("gpm", 6.309020e-5),
            ("igpm", 7.576817e-5),
            ("ft3/s", 2.831685e-2),
            ("lb/ft3", 1.601846e1),
            ("ftH2O", 2.989067e3),
            ("mmHg", 1.333224e2),
            ("ft2/s", 9.290304e-2),
            ("mgd", 4.381264e-2),
        ] {
            let off = named(symbol).factor / rounded - 1.0;
            assert!(off.abs() < 1e-6, "{symbol} {off}");
        }
        // 32 F = 0 C = 273.15 K and -40 F = -40 C, by the definition of the Fahrenheit scale.
        assert!(close(named("F").to_si(32.0), 273.15));
        assert!(close(named("F").to_si(-40.0), named("C").to_si(-40.0)));
        // 1 mgd is 694.44 gpm: 10^6 / 1440, by definition.
        assert!(close(
            named("gpm").from_si(named("mgd").to_si(1.0)),
            1e6 / 1440.0
        ));
    }

    #[test]
    fn other_ways_of_writing_are_read() {
        for (text, symbol) in [
            ("m³/h", "m3/h"),
            ("m^3/h", "m3/h"),
            ("m3/hr", "m3/h"),
            ("m3 / h", "m3/h"),
            ("M3/H", "m3/h"),
            ("l/s", "L/s"),
            ("°C", "C"),
            ("mPa·s", "mPa.s"),
            ("US gpm", "gpm"),
            ("GPM", "gpm"),
            ("MGD", "mgd"),
            ("KW", "kW"),
            ("cp", "cP"),
            ("Hp", "hp"),
        ] {
            assert_eq!(
                Unit::parse(text).map(|unit| unit.symbol),
                Some(symbol),
                "{text}"
            );
        }
    }

    #[test]
    fn case_is_kept_where_it_means_something() {
        for text in [
            "mPa", "mW", "ml", "Mbar", "Mm", "MM", "mJ", "MPa.s", "ps", "Mgd", "furlongs", "",
            "m 3",
        ] {
            assert_eq!(Unit::parse(text), None, "{text}");
        }
    }

    #[test]
    fn nearest_offers_what_was_meant() {
        assert_eq!(nearest("m3/j", Some(Kind::Flow)), Some("m3/h"));
        assert_eq!(nearest("mPa", Some(Kind::Pressure)), Some("MPa"));
        assert_eq!(nearest("barg", Some(Kind::Pressure)), Some("bar"));
        assert_eq!(nearest("MM", Some(Kind::Bore)), Some("mm"));
        assert_eq!(nearest("furlongs", None), None);
        assert_eq!(nearest("x", None), None);
        assert_eq!(nearest("Hz", None), None);
        assert_eq!(nearest("gal/hr", None), None);
    }

    #[test]
    fn gallons_are_kept_apart_in_words() {
        assert_eq!(named("gpm").to_string(), "gpm (US gallons per minute)");
        assert_eq!(
            named("igpm").to_string(),
            "igpm (imperial gallons per minute)"
        );
    }
}
