//! Text with a unit, such as "35 um", to SI and back: the only place that knows prefixes.
//!
//! [`parse`] reads what users write in job files and on the command line; [`show`] and [`brief`] write values for
//! people. Which range a value may have is the caller's business; here a value need only be finite. Decimal units are
//! read by shifting the decimal exponent of the text, so "35 um" is the double nearest to 35e-6.

/// A kind of quantity, and with it the units that its text may carry.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Unit {
    /// m.
    Length,
    /// m^2.
    Area,
    /// Hz.
    Frequency,
    /// s.
    Time,
    /// 1, written in per cent.
    Ratio,
    /// S/m.
    Conductivity,
    /// V/m.
    FieldStrength,
    /// C.
    Charge,
    /// V.
    Voltage,
    /// rad, shown in degrees.
    Angle,
    /// N/m.
    Stiffness,
    /// N.
    Force,
    /// F.
    Capacitance,
}

/// Why a text is not a quantity.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum UnitError {
    /// The text does not begin with a number.
    #[error("`{text}` does not begin with a number, expected {}", unit.expected())]
    NoNumber {
        /// What was written.
        text: String,
        /// What it should have been.
        unit: Unit,
    },
    /// The number stands alone.
    #[error("`{text}` has no unit, expected {}", unit.expected())]
    NoUnit {
        /// What was written.
        text: String,
        /// What it should have been.
        unit: Unit,
    },
    /// What follows the number is no unit of this quantity.
    #[error("`{found}` is not a unit of {}, expected {}", unit.spec().what, unit.expected())]
    UnknownUnit {
        /// What follows the number.
        found: String,
        /// What it should have been.
        unit: Unit,
    },
    /// The value is beyond what a double can hold.
    #[error("`{text}` is too large a number, expected {}", unit.expected())]
    NotFinite {
        /// What was written.
        text: String,
        /// What it should have been.
        unit: Unit,
    },
}

/// The value of `text` in the SI unit of `unit`; finite. Blanks between number and unit are optional, and both
/// micro signs are read as `u`.
///
/// # Errors
/// - [`UnitError::NoNumber`] when the text does not begin with a decimal number.
/// - [`UnitError::NoUnit`] when nothing follows the number.
/// - [`UnitError::UnknownUnit`] when what follows is no unit of this quantity.
/// - [`UnitError::NotFinite`] when the value overflows.
pub fn parse(text: &str, unit: Unit) -> Result<f64, UnitError> {
    let trimmed = text.trim();
    let Some((mantissa, exponent, rest)) = split_number(trimmed) else {
        return Err(UnitError::NoNumber { text: text.to_owned(), unit });
    };
    let symbol = rest.trim().replace(['\u{b5}', '\u{3bc}'], "u").replace('\u{b0}', "deg");
    if symbol.is_empty() {
        return Err(UnitError::NoUnit { text: text.to_owned(), unit });
    }
    let Some(scale) = unit.scale_of(&symbol) else {
        return Err(UnitError::UnknownUnit { found: rest.trim().to_owned(), unit });
    };
    let shifted = |power: i32| format!("{mantissa}e{}", exponent + i64::from(power)).parse::<f64>().ok();
    let value = match scale {
        Scale::Power(power) => shifted(power),
        Scale::Times(factor, power) => shifted(power).map(|number| number * factor),
    };
    value.filter(|v| v.is_finite()).ok_or(UnitError::NotFinite { text: text.to_owned(), unit })
}

/// `value` with an engineering prefix and exactly `digits` significant digits: `12.34 pF`, `35 um`, `5.0 %`.
///
/// - `value`: in the SI unit of `unit`.
/// - `digits`: at least 1; 0 is taken as 1.
#[must_use]
pub fn show(value: f64, unit: Unit, digits: usize) -> String {
    let (number, symbol) = number_and_symbol(value, unit, digits);
    format!("{number} {symbol}")
}

/// `value` with an engineering prefix, to six significant digits without trailing zeros: for nominal values that the
/// user gave, `35 um`, `1.55 mm`.
#[must_use]
pub fn brief(value: f64, unit: Unit) -> String {
    let (number, symbol) = number_and_symbol(value, unit, 6);
    let (digits, power) = number.split_at(number.find('e').unwrap_or(number.len()));
    if digits.contains('.') {
        format!("{}{power} {symbol}", digits.trim_end_matches('0').trim_end_matches('.'))
    } else {
        format!("{number} {symbol}")
    }
}

/// The unit that suits a table whose largest entry is `largest`: its size in the SI unit of `unit`, and its symbol.
#[must_use]
pub fn scale(largest: f64, unit: Unit) -> (f64, &'static str) {
    let (_, symbol) = number_and_symbol(largest, unit, 6);
    let power = unit.spec().shown.iter().find(|(_, shown)| *shown == symbol).map_or(0, |(power, _)| *power);
    (10f64.powi(power), symbol)
}

/// What a symbol multiplies by.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Scale {
    /// A power of ten.
    Power(i32),
    /// A factor times a power of ten.
    Times(f64, i32),
}

/// How one quantity is written.
struct Spec {
    /// With its article, for messages.
    what: &'static str,
    /// A correct text.
    example: &'static str,
    /// Symbol of the SI unit.
    base: &'static str,
    /// Prefixes that may stand before it.
    prefixes: &'static str,
    /// Further symbols.
    extra: &'static [(&'static str, Scale)],
    /// Symbols for output with their power of ten, largest first.
    shown: &'static [(i32, &'static str)],
}

impl Unit {
    /// The quantity with its article, for messages: "a length".
    #[must_use]
    pub fn what(self) -> &'static str {
        self.spec().what
    }

    /// A correct text: "0.2 mm".
    #[must_use]
    pub fn example(self) -> &'static str {
        self.spec().example
    }

    /// Every symbol that a text may carry.
    #[must_use]
    pub fn symbols(self) -> Vec<String> {
        let spec = self.spec();
        let mut symbols: Vec<String> =
            spec.prefixes.chars().map(|prefix| format!("{prefix}{}", spec.base)).collect();
        if !spec.base.is_empty() {
            symbols.push(spec.base.to_owned());
        }
        symbols.extend(spec.extra.iter().map(|(symbol, _)| (*symbol).to_owned()));
        symbols
    }

    /// For messages: what is wanted, an example, and the symbols.
    fn expected(self) -> String {
        let spec = self.spec();
        format!("{} such as \"{}\" (units: {})", spec.what, spec.example, self.symbols().join(", "))
    }

    fn scale_of(self, symbol: &str) -> Option<Scale> {
        let spec = self.spec();
        if let Some((_, scale)) = spec.extra.iter().find(|(known, _)| *known == symbol) {
            return Some(*scale);
        }
        let prefix = symbol.strip_suffix(spec.base).filter(|_| !spec.base.is_empty())?;
        let mut chars = prefix.chars();
        match (chars.next(), chars.next()) {
            (None, _) => Some(Scale::Power(0)),
            (Some(c), None) if spec.prefixes.contains(c) => prefix_power(c).map(Scale::Power),
            _ => None,
        }
    }

    /// The international inch is 25.4 mm exactly (international agreement of 1959; from memory).
    #[rustfmt::skip]
    fn spec(self) -> Spec {
        use Scale::{Power, Times};
        match self {
            Unit::Length => Spec { what: "a length", example: "0.2 mm", base: "m", prefixes: "numc",
                extra: &[("mil", Times(254.0, -7)), ("in", Times(254.0, -4))],
                shown: &[(0, "m"), (-3, "mm"), (-6, "um"), (-9, "nm")] },
            Unit::Area => Spec { what: "an area", example: "2 mm2", base: "", prefixes: "",
                extra: &[("um2", Power(-12)), ("mm2", Power(-6)), ("cm2", Power(-4)), ("m2", Power(0))],
                shown: &[(0, "m2"), (-6, "mm2"), (-12, "um2")] },
            Unit::Frequency => Spec { what: "a frequency", example: "1 MHz", base: "Hz", prefixes: "kMGT", extra: &[],
                shown: &[(12, "THz"), (9, "GHz"), (6, "MHz"), (3, "kHz"), (0, "Hz")] },
            Unit::Time => Spec { what: "a time", example: "1 ns", base: "s", prefixes: "pnum", extra: &[],
                shown: &[(0, "s"), (-3, "ms"), (-6, "us"), (-9, "ns"), (-12, "ps"), (-15, "fs")] },
            Unit::Ratio => Spec { what: "a ratio", example: "5 %", base: "", prefixes: "", extra: &[("%", Power(-2))],
                shown: &[(-2, "%")] },
            Unit::Conductivity => Spec { what: "a conductivity", example: "1 uS/m", base: "S/m", prefixes: "fpnumkM",
                extra: &[("S/cm", Power(2))],
                shown: &[(6, "MS/m"), (3, "kS/m"), (0, "S/m"), (-3, "mS/m"), (-6, "uS/m"), (-9, "nS/m"),
                    (-12, "pS/m"), (-15, "fS/m")] },
            Unit::FieldStrength => Spec { what: "a field strength", example: "20 MV/m", base: "V/m", prefixes: "mkMG",
                extra: &[("V/mm", Power(3)), ("kV/mm", Power(6)), ("kV/cm", Power(5)), ("V/um", Power(6))],
                shown: &[(9, "GV/m"), (6, "MV/m"), (3, "kV/m"), (0, "V/m"), (-3, "mV/m")] },
            Unit::Charge => Spec { what: "a charge", example: "1 pC", base: "C", prefixes: "fpnum", extra: &[],
                shown: &[(0, "C"), (-3, "mC"), (-6, "uC"), (-9, "nC"), (-12, "pC"), (-15, "fC"), (-18, "aC")] },
            Unit::Voltage => Spec { what: "a voltage", example: "3.3 V", base: "V", prefixes: "numkM", extra: &[],
                shown: &[(6, "MV"), (3, "kV"), (0, "V"), (-3, "mV"), (-6, "uV"), (-9, "nV")] },
            Unit::Angle => Spec { what: "an angle", example: "70 deg", base: "rad", prefixes: "m",
                extra: &[("deg", Times(std::f64::consts::PI / 180.0, 0))],
                shown: &[(0, "deg")] },
            Unit::Stiffness => Spec { what: "a stiffness", example: "2 N/m", base: "N/m", prefixes: "numkM", extra: &[],
                shown: &[(6, "MN/m"), (3, "kN/m"), (0, "N/m"), (-3, "mN/m"), (-6, "uN/m")] },
            Unit::Force => Spec { what: "a force", example: "5 uN", base: "N", prefixes: "pnumk", extra: &[],
                shown: &[(3, "kN"), (0, "N"), (-3, "mN"), (-6, "uN"), (-9, "nN"), (-12, "pN"), (-15, "fN")] },
            Unit::Capacitance => Spec { what: "a capacitance", example: "10 pF", base: "F", prefixes: "afpnum",
                extra: &[],
                shown: &[(0, "F"), (-3, "mF"), (-6, "uF"), (-9, "nF"), (-12, "pF"), (-15, "fF"), (-18, "aF")] },
        }
    }
}

/// Powers of the SI prefixes in use (SI brochure, 9th edition, table 7).
fn prefix_power(prefix: char) -> Option<i32> {
    Some(match prefix {
        'a' => -18,
        'f' => -15,
        'p' => -12,
        'n' => -9,
        'u' => -6,
        'm' => -3,
        'c' => -2,
        'k' => 3,
        'M' => 6,
        'G' => 9,
        'T' => 12,
        _ => return None,
    })
}

/// Splits `text` after its leading decimal number: mantissa, decimal exponent, rest.
fn split_number(text: &str) -> Option<(&str, i64, &str)> {
    let bytes = text.as_bytes();
    let digits_from = |at: usize| bytes[at..].iter().take_while(|b| b.is_ascii_digit()).count();
    let mut end = usize::from(matches!(bytes.first(), Some(b'+' | b'-')));
    let whole = digits_from(end);
    end += whole;
    let mut fraction = 0;
    if bytes.get(end) == Some(&b'.') {
        fraction = digits_from(end + 1);
        end += 1 + fraction;
    }
    if whole + fraction == 0 {
        return None;
    }
    let mantissa = &text[..end];
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let sign = usize::from(matches!(bytes.get(end + 1), Some(b'+' | b'-')));
        let start = end + 1;
        let n_digits = digits_from((start + sign).min(bytes.len()));
        if n_digits > 0 {
            let rest = start + sign + n_digits;
            let negative = bytes.get(start) == Some(&b'-');
            // An exponent that no integer holds is far beyond any double: the value is zero or infinite.
            let saturated = if negative { -1_000_000 } else { 1_000_000 };
            let exponent = text[start..rest].parse::<i64>().unwrap_or(saturated).clamp(-1_000_000, 1_000_000);
            return Some((mantissa, exponent, &text[rest..]));
        }
    }
    Some((mantissa, 0, &text[end..]))
}

/// The digits of `value` to `digits` significant ones, and the symbol they belong to.
fn number_and_symbol(value: f64, unit: Unit, digits: usize) -> (String, &'static str) {
    let spec = unit.spec();
    let base = spec.shown.iter().find(|(power, _)| *power == 0).or(spec.shown.last()).map_or("", |s| s.1);
    let value = if unit == Unit::Angle { value.to_degrees() } else { value };
    if value.abs() < f64::MIN_POSITIVE || !value.is_finite() {
        let number = if value.is_finite() { "0".to_owned() } else { value.to_string() };
        return (number, base);
    }
    // The rounding of the formatter decides the exponent, so that 999.96 um to four digits becomes 1.000 mm.
    let scientific = format!("{:.*e}", digits.max(1) - 1, value);
    let Some((mantissa, exponent)) = scientific.split_once('e') else {
        return (scientific, base);
    };
    let exponent: i32 = exponent.parse().unwrap_or(0);
    let (power, symbol) = spec
        .shown
        .iter()
        .find(|(power, _)| *power <= exponent)
        .or(spec.shown.last())
        .copied()
        .unwrap_or((0, base));
    (place_point(mantissa, exponent - power), symbol)
}

/// `mantissa` ("-1.234") times ten to the `shift`, in plain digits where that stays short.
fn place_point(mantissa: &str, shift: i32) -> String {
    let sign = if mantissa.starts_with('-') { "-" } else { "" };
    let digits: String = mantissa.chars().filter(char::is_ascii_digit).collect();
    match usize::try_from(shift) {
        Ok(shift) if shift > 5 => format!("{mantissa}e{shift}"),
        Ok(shift) if shift + 1 >= digits.len() => format!("{sign}{digits:0<width$}", width = shift + 1),
        Ok(shift) => format!("{sign}{}.{}", &digits[..=shift], &digits[shift + 1..]),
        Err(_) if shift < -4 => format!("{mantissa}e{shift}"),
        Err(_) => format!("{sign}0.{}{digits}", "0".repeat(shift.unsigned_abs() as usize - 1)),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// What: the double read is the nearest one to the decimal value. Derived: exponent shift, no rounding but the
    /// parser's; the inch and degree factors are compared within one rounding. Seen to fail with: number * 1e-6.
    #[test]
    fn reads_exactly() {
        let cases = [
            ("35 um", Unit::Length, 35e-6),
            ("35um", Unit::Length, 35e-6),
            (" 0.1 \u{b5}m ", Unit::Length, 0.1e-6),
            ("0.3\u{3bc}m", Unit::Length, 0.3e-6),
            ("0.2 mm", Unit::Length, 0.2e-3),
            ("-5e0 um", Unit::Length, -5e-6),
            (".5 cm", Unit::Length, 0.5e-2),
            ("1e3 nm", Unit::Length, 1e-6),
            ("2. m", Unit::Length, 2.0),
            ("1 MHz", Unit::Frequency, 1e6),
            ("2.4 GHz", Unit::Frequency, 2.4e9),
            ("5 %", Unit::Ratio, 0.05),
            ("0 S/m", Unit::Conductivity, 0.0),
            ("20 MV/m", Unit::FieldStrength, 20e6),
            ("20 kV/mm", Unit::FieldStrength, 20e6),
            ("-3 pC", Unit::Charge, -3e-12),
            ("3.3 V", Unit::Voltage, 3.3),
            ("1.5 rad", Unit::Angle, 1.5),
            ("2 kN/m", Unit::Stiffness, 2e3),
            ("4 mm2", Unit::Area, 4e-6),
            ("10 pF", Unit::Capacitance, 10e-12),
        ];
        for (text, unit, value) in cases {
            let value: f64 = value;
            assert_eq!(parse(text, unit).map(f64::to_bits), Ok(value.to_bits()), "{text}");
        }
        let near = |text, unit, value: f64| {
            let read = parse(text, unit).unwrap();
            assert!((read - value).abs() <= 2.0 * f64::EPSILON * value.abs(), "{text}: {read}");
        };
        near("10 mil", Unit::Length, 254e-6);
        near("0.1 in", Unit::Length, 2.54e-3);
        near("90 deg", Unit::Angle, std::f64::consts::FRAC_PI_2);
        near("90\u{b0}", Unit::Angle, std::f64::consts::FRAC_PI_2);
    }

    #[test]
    fn refuses_with_what_was_expected() {
        let error = |text, unit| parse(text, unit).unwrap_err().to_string();
        assert_eq!(
            error("35", Unit::Length),
            "`35` has no unit, expected a length such as \"0.2 mm\" (units: nm, um, mm, cm, m, mil, in)"
        );
        assert_eq!(
            error("35 MHz", Unit::Length),
            "`MHz` is not a unit of a length, expected a length such as \"0.2 mm\" (units: nm, um, mm, cm, m, mil, in)"
        );
        for text in ["", "mm", "NaN mm", "inf mm", "- mm", ".", "e5 mm", "--1 mm"] {
            assert!(matches!(parse(text, Unit::Length), Err(UnitError::NoNumber { .. })), "{text}");
        }
        for text in ["1 Mm", "1 MM", "0,2 mm", "1 mm mm", "1 2 mm", "1e mm", "1 \u{b5}"] {
            assert!(matches!(parse(text, Unit::Length), Err(UnitError::UnknownUnit { .. })), "{text}");
        }
        for text in ["1e400 mm", "1e99999999999999999999 mm"] {
            assert!(matches!(parse(text, Unit::Length), Err(UnitError::NotFinite { .. })), "{text}");
        }
        assert_eq!(parse("1e-99999999999999999999 mm", Unit::Length), Ok(0.0));
    }

    #[test]
    fn shows_with_prefix_and_digits() {
        let cases = [
            (12.34e-12, Unit::Capacitance, 4, "12.34 pF"),
            (35e-6, Unit::Length, 2, "35 um"),
            (36e-6, Unit::Length, 1, "40 um"),
            (999.96e-6, Unit::Length, 4, "1.000 mm"),
            (-999.4e-6, Unit::Length, 3, "-999 um"),
            (0.05, Unit::Ratio, 2, "5.0 %"),
            (0.00012, Unit::Ratio, 2, "0.012 %"),
            (1.2e-22, Unit::Capacitance, 2, "0.00012 aF"),
            (1.2e-25, Unit::Capacitance, 2, "1.2e-7 aF"),
            (2.5e4, Unit::Length, 3, "25000 m"),
            (2.5e9, Unit::Length, 2, "2.5e9 m"),
            (0.0, Unit::Charge, 3, "0 C"),
            (std::f64::consts::FRAC_PI_2, Unit::Angle, 3, "90.0 deg"),
            (3.5e-6, Unit::Area, 2, "3.5 mm2"),
            (f64::NAN, Unit::Voltage, 3, "NaN V"),
        ];
        for (value, unit, digits, text) in cases {
            assert_eq!(show(value, unit, digits), text);
        }
        assert_eq!(brief(35e-6, Unit::Length), "35 um");
        assert_eq!(brief(1.55e-3, Unit::Length), "1.55 mm");
        assert_eq!(brief(200e-6, Unit::Length), "200 um");
        assert_eq!(brief(1e6, Unit::Frequency), "1 MHz");
        assert_eq!(brief(1.5e300, Unit::Length), "1.5e300 m");
        assert_eq!(brief(0.01, Unit::Ratio), "1 %");
        assert_eq!(scale(-12.34e-12, Unit::Capacitance), (1e-12, "pF"));
        assert_eq!(scale(0.0, Unit::Charge), (1.0, "C"));
    }

    /// What: what `show` prints with 17 digits reads back as the same double. Identity: parse after print.
    #[test]
    fn reads_back_what_it_shows() {
        for (unit, value) in [
            (Unit::Length, 0.1 + 0.2),
            (Unit::Length, 1.0 / 3.0 * 1e-6),
            (Unit::Capacitance, std::f64::consts::E * 1e-13),
            (Unit::Conductivity, 5.96e7),
            (Unit::Ratio, 0.123_456_789),
        ] {
            assert_eq!(parse(&show(value, unit, 17), unit).map(f64::to_bits), Ok(value.to_bits()));
        }
    }
}
