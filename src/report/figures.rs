//! Numbers for people and for files: how many digits, and which of them can be believed.
//!
//! Text shows digits down to the bar, as 12.34(5): the figure in brackets is the half-width of the bar in units of the
//! last digit, rounded up. Files keep three digits more than the bar has, so that nothing is lost by reading them; both
//! stop nine digits below the scale of the problem, since what lies below may change with the number of threads.

/// Digits below the scale of a problem that are still the same whatever the number of threads: the dense solver's
/// rounding was measured below 1e-12, and three digits are kept as a margin.
const STABLE_DIGITS: i32 = 9;

/// `value` with its bar, as 12.34(5). The bar is rounded up, to one digit, or to two when the first is 1.
pub(crate) fn with_bar(value: f64, bar: f64) -> String {
    if !value.is_finite() {
        return "not finite".to_owned();
    }
    let Some(bar_place) = place(bar) else {
        let note = if bar.is_nan() || bar.is_infinite() { "(?)" } else { "" };
        return format!("{}{note}", significant(value, 6));
    };
    let first_digit = bar / 10f64.powi(bar_place);
    let two_digits = if first_digit < 2.0 { 1 } else { 0 };
    let last = (bar_place - two_digits).max(place(value).map_or(i32::MIN, |p| p - STABLE_DIGITS));
    // A bar that is a round number must not be lifted by the rounding of the division.
    let units = (bar / 10f64.powi(last) - 1e-6).ceil().max(1.0);
    if last <= 0 {
        let decimals = usize::try_from(-last).unwrap_or(0);
        format!("{}({units:.0})", unsigned_zero(format!("{value:.decimals$}")))
    } else {
        let step = 10f64.powi(last);
        format!("{}({:.0})", unsigned_zero(format!("{:.0}", (value / step).round() * step)), units * step)
    }
}

/// `value` rounded to `digits` significant digits, without trailing zeros.
pub(crate) fn significant(value: f64, digits: usize) -> String {
    let rounded = format!("{value:.*e}", digits.saturating_sub(1)).parse().unwrap_or(value);
    let plain = 1e-4 <= f64::abs(rounded) && f64::abs(rounded) < 1e7;
    if plain || f64::abs(rounded) <= 0.0 { format!("{rounded}") } else { format!("{rounded:e}") }
}

/// `value` for a file: three digits beyond `bar`, and none that lies nine digits or more below `scale`.
pub(crate) fn stable(value: f64, bar: f64, scale: f64) -> f64 {
    let (Some(own), Some(top)) = (place(value), place(scale)) else {
        return if value.is_nan() { value } else { 0.0 };
    };
    let last = place(bar).map_or(i32::MIN, |p| p - 3).max(top - STABLE_DIGITS);
    match usize::try_from(own - last) {
        Ok(decimals) => format!("{value:.decimals$e}").parse().unwrap_or(value),
        Err(_) => 0.0,
    }
}

/// A bar for a file: two digits, rounded up.
pub(crate) fn stable_bar(bar: f64) -> f64 {
    let Some(bar_place) = place(bar) else { return bar };
    let units = (bar / 10f64.powi(bar_place - 1) - 1e-6).ceil();
    format!("{units:.0}e{}", bar_place - 1).parse().unwrap_or(bar)
}

/// The power of ten just above `value`, at least 1e-12: for defects whose digits are rounding.
pub(crate) fn decade_above(value: f64) -> f64 {
    let exponent = place(value).map_or(-12, |p| (p + 1).max(-12));
    format!("1e{exponent}").parse().unwrap_or(value)
}

/// Position of the first digit: 0 for 1 to 9.99, -1 for 0.1 to 0.999. `None` for zero and what is not finite.
fn place(value: f64) -> Option<i32> {
    let size = value.abs();
    if !(size.is_finite() && 0.0 < size) {
        return None;
    }
    // The formatter knows the exact exponent; a logarithm would be off by one just below a power of ten.
    format!("{size:e}").rsplit('e').next().and_then(|exponent| exponent.parse().ok())
}

/// A zero that was rounded from below keeps no sign.
fn unsigned_zero(text: String) -> String {
    let is_zero = text.bytes().all(|b| matches!(b, b'-' | b'0' | b'.'));
    if is_zero { text.trim_start_matches('-').to_owned() } else { text }
}

/// An amount of memory: "123 MB", "1.2 GB".
pub(crate) fn memory(bytes: u64) -> String {
    #[expect(clippy::cast_precision_loss, reason = "two or three digits are printed")]
    let bytes = bytes as f64;
    if bytes < 1e9 { format!("{:.0} MB", (bytes / 1e6).ceil()) } else { format!("{:.1} GB", bytes / 1e9) }
}

/// A share as per cent, two digits.
pub(crate) fn percent(ratio: f64) -> String {
    format!("{} %", significant(ratio * 100.0, 2))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_bar_stands_in_units_of_the_last_digit() {
        for (value, bar, text) in [
            (12.3456, 0.05, "12.35(5)"),
            (12.3456, 0.0501, "12.35(6)"),
            (12.3456, 0.012, "12.346(12)"),
            (-0.4567, 0.003, "-0.457(3)"),
            (1234.0, 50.0, "1230(50)"),
            (0.0001, 0.003, "0.000(3)"),
            (-0.0001, 0.003, "0.000(3)"),
            (1.0, 0.0995, "1.00(10)"),
            (1.5, 0.0, "1.5"),
            (1.5, f64::NAN, "1.5(?)"),
            (3.0, 1e-30, "3.000000000(1)"),
        ] {
            assert_eq!(with_bar(value, bar), text, "{value} and {bar}");
        }
    }

    #[test]
    fn files_keep_three_digits_beyond_the_bar_and_no_noise() {
        let close = |a: f64, b: f64| assert!((a - b).abs() <= 1e-15 * b.abs(), "{a} is not {b}");
        close(stable(1.234_567_890_123e-12, 1e-14, 1e-12), 1.234_57e-12);
        close(stable(1.234_567_890_123e-12, 0.0, 1e-12), 1.234_567_89e-12);
        close(stable(4.2e-26, 0.0, 1e-12), 0.0);
        close(stable_bar(1.234e-15), 1.3e-15);
        close(stable_bar(2e-15), 2e-15);
        close(decade_above(3.2e-15), 1e-12);
        close(decade_above(3.2e-5), 1e-4);
    }
}
