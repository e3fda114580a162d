//! Reads a quantity from text, and answers a text that is none with what to write instead.
//!
//! Which kind is wanted is not asked here; a YAML number that stands without quotes never comes this way.

use super::{Quantity, Unit, nearest};
use std::error::Error;
use std::fmt;

/// Why a text is not a quantity.
#[derive(Clone, Debug, PartialEq)]
pub enum QuantityError {
    /// The text is empty or does not begin with a number.
    NoNumber {
        /// The text.
        text: String,
    },
    /// The number is infinite, not a number, or beyond 1e300 in size.
    NotFinite,
    /// Commas part the thousands.
    ThousandsComma {
        /// The text.
        text: String,
        /// The number without commas.
        suggestion: String,
    },
    /// A comma stands where the decimal point belongs.
    DecimalComma {
        /// The text.
        text: String,
        /// The number with a point.
        suggestion: String,
    },
    /// A space parts the digits.
    SpaceInNumber {
        /// The text.
        text: String,
        /// The text with the digits joined.
        suggestion: String,
    },
    /// What follows the number is no unit of the table.
    UnknownUnit {
        /// The unit as written.
        unit: String,
        /// The nearest spelling of any kind, if one is near.
        nearest: Option<&'static str>,
    },
}

impl fmt::Display for QuantityError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            QuantityError::NoNumber { text } => {
                write!(
                    f,
                    "`{text}` is no quantity: a number comes first, then its unit"
                )
            }
            QuantityError::NotFinite => write!(f, "the number is not finite, or too large"),
            QuantityError::ThousandsComma { text, suggestion } => {
                write!(
                    f,
                    "`{text}` has a comma in its number: write `{suggestion}`, without commas"
                )
            }
            QuantityError::DecimalComma { text, suggestion } => {
                write!(
                    f,
                    "`{text}` has a decimal comma: write `{suggestion}`, with a point"
                )
            }
            QuantityError::SpaceInNumber { text, suggestion } => {
                write!(
                    f,
                    "`{text}` has a space in its number: write `{suggestion}`"
                )
            }
            QuantityError::UnknownUnit { unit, nearest } => {
                write!(f, "`{unit}` is no unit known here")?;
                match nearest {
                    Some(nearest) => write!(f, "; did you mean `{nearest}`?"),
                    None => Ok(()),
                }
            }
        }
    }
}

impl Error for QuantityError {}

/// Reads `"<number> <unit>"`, with or without the space, or a bare number.
///
/// The number is decimal, with a point and an exponent if wanted (`1e-3`). Any text is safe to pass.
///
/// # Errors
/// [`QuantityError`], whose variants carry the offending text and what to write in its place.
///
/// ```
/// use dutybank::units::{Kind, UnitSet, parse_quantity};
/// let bore = parse_quantity("150mm").unwrap();
/// assert_eq!(bore.to_si(Kind::Bore, &UnitSet::us()).unwrap(), 0.15);
/// assert!(bore.to_si(Kind::Flow, &UnitSet::us()).is_err());
/// ```
pub fn parse_quantity(text: &str) -> Result<Quantity, QuantityError> {
    let text = text.trim();
    let length = number_length(text);
    let no_number = || QuantityError::NoNumber {
        text: text.to_string(),
    };
    if length == 0 {
        return Err(no_number());
    }
    let (digits, rest) = text.split_at(length);
    if rest.starts_with(',') {
        return Err(comma(text));
    }
    // The typographic minus sign comes with numbers pasted from documents.
    let number: f64 = digits.replace('−', "-").parse().map_err(|_| no_number())?;
    let spelling = rest.trim();
    if rest.starts_with('.') || rest.starts_with(|c: char| c.is_ascii_digit()) {
        return Err(no_number());
    }
    // `1/min` is a unit that begins with a digit; `000 m` is the rest of a number.
    let unit = Unit::parse(spelling);
    if unit.is_none() && spelling.starts_with(|c: char| c.is_ascii_digit()) {
        return Err(QuantityError::SpaceInNumber {
            text: text.to_string(),
            suggestion: format!("{digits}{spelling}"),
        });
    }
    if unit.is_none() && !spelling.is_empty() {
        return Err(QuantityError::UnknownUnit {
            unit: spelling.to_string(),
            nearest: nearest(spelling, None),
        });
    }
    Quantity::checked(number, unit)
}

/// Length in bytes of the number that `text` begins with; 0 if it does not begin with one.
fn number_length(text: &str) -> usize {
    let run = |from: &str| from.bytes().take_while(u8::is_ascii_digit).count();
    let sign = match text.chars().next() {
        Some(sign @ ('+' | '-' | '−')) => sign.len_utf8(),
        _ => 0,
    };
    let whole = run(&text[sign..]);
    let mut end = sign + whole;
    let mut digits = whole;
    if let Some(after_point) = text[end..].strip_prefix('.') {
        let decimals = run(after_point);
        digits += decimals;
        end += 1 + decimals;
    }
    if digits == 0 {
        return 0;
    }
    if let Some(exponent) = text[end..].strip_prefix(['e', 'E']) {
        let sign = usize::from(exponent.starts_with(['+', '-']));
        let power = run(&exponent[sign..]);
        // Without digits the letter belongs to the unit.
        if power > 0 {
            end += 1 + sign + power;
        }
    }
    end
}

/// The error for a number with a comma: thousands if every comma is followed by three digits, else a decimal comma.
fn comma(text: &str) -> QuantityError {
    let length = text
        .find(|c: char| !(c.is_ascii_digit() || matches!(c, ',' | '.' | '+' | '-' | '−')))
        .unwrap_or(text.len());
    let number = &text[..length];
    let point_before_comma = match (number.find('.'), number.rfind(',')) {
        (Some(point), Some(comma)) => point < comma,
        _ => false,
    };
    let whole = number.split('.').next().unwrap_or(number);
    let in_threes = whole.split(',').skip(1).all(|group| group.len() == 3);
    let text = text.to_string();
    if in_threes && !point_before_comma {
        let suggestion = number.replace(',', "");
        QuantityError::ThousandsComma { text, suggestion }
    } else {
        let suggestion = number.replace('.', "").replace(',', ".");
        QuantityError::DecimalComma { text, suggestion }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> Quantity {
        parse_quantity(text).unwrap_or_else(|error| panic!("{text}: {error}"))
    }

    fn refused(text: &str) -> QuantityError {
        match parse_quantity(text) {
            Ok(quantity) => panic!("{text} was read as {quantity:?}"),
            Err(error) => error,
        }
    }

    fn shown(quantity: Quantity) -> (f64, &'static str) {
        (
            quantity.number(),
            quantity.unit().map_or("", |unit| unit.symbol),
        )
    }

    #[test]
    fn numbers_and_units_are_parted() {
        for (text, number, symbol) in [
            ("60 m", 60.0, "m"),
            ("150mm", 150.0, "mm"),
            ("1600 US gpm", 1600.0, "gpm"),
            ("85%", 85.0, "%"),
            ("1480 1/min", 1480.0, "rpm"),
            ("  -1.5e-3 m ", -1.5e-3, "m"),
            ("−2 m", -2.0, "m"),
            ("+.5 bar", 0.5, "bar"),
            ("5. h", 5.0, "h"),
            ("12", 12.0, ""),
            ("1E3", 1000.0, ""),
        ] {
            assert_eq!(shown(read(text)), (number, symbol), "{text}");
        }
    }

    #[test]
    fn texts_that_are_no_quantity_are_refused() {
        for text in [
            "", " ", "m", "nan", "inf m", "-", ".", ".nan", "e5", "1.2.3 m", "+-1 m", "−", "½ in",
        ] {
            assert!(
                matches!(refused(text), QuantityError::NoNumber { .. }),
                "{text}"
            );
        }
        assert_eq!(refused("1e999 m"), QuantityError::NotFinite);
        assert_eq!(refused("1e301"), QuantityError::NotFinite);
        assert_eq!(Quantity::bare(f64::NAN), Err(QuantityError::NotFinite));
        assert_eq!(
            Quantity::bare(f64::NEG_INFINITY),
            Err(QuantityError::NotFinite)
        );
    }

    #[test]
    fn commas_and_spaces_are_answered_with_what_to_write() {
        for (text, instead) in [
            ("1,000 m", "without commas"),
            ("1,234,567.8 m3", "without commas"),
            ("2,5 m", "with a point"),
            ("1.234,5 m", "with a point"),
            ("1 000 m", "a space in its number"),
        ] {
            let message = refused(text).to_string();
            assert!(message.contains(instead), "{message}");
        }
        assert!(refused("1,000 m").to_string().contains("`1000`"));
        assert!(
            refused("1,234,567.8 m3")
                .to_string()
                .contains("`1234567.8`")
        );
        assert!(refused("2,5 m").to_string().contains("`2.5`"));
        assert!(refused("1.234,5 m").to_string().contains("`1234.5`"));
        assert!(refused("1 000 m").to_string().contains("`1000 m`"));
    }

    #[test]
    fn unknown_units_are_named_with_the_nearest() {
        assert_eq!(
            refused("12 furlongs").to_string(),
            "`furlongs` is no unit known here"
        );
        assert_eq!(
            refused("12 m3/j").to_string(),
            "`m3/j` is no unit known here; did you mean `m3/h`?"
        );
        assert_eq!(
            refused("4 mPa").to_string(),
            "`mPa` is no unit known here; did you mean `MPa`?"
        );
    }

    proptest::proptest! {
        #[test]
        fn no_text_breaks_the_reader(text in "\\PC{0,20}") {
            // Any outcome will do, as long as it is one.
            if let Ok(quantity) = parse_quantity(&text) {
                proptest::prop_assert!(quantity.number().is_finite());
            }
        }

        #[test]
        fn what_looks_like_a_number_never_breaks_it(text in "[-+−0-9.,eE m]{0,12}") {
            if let Ok(quantity) = parse_quantity(&text) {
                proptest::prop_assert!(quantity.number().is_finite());
            }
        }
    }
}
