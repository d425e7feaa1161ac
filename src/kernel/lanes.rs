//! Logarithm and arctangent without branches, so that loops over lanes become vector instructions.
//!
//! The library's own functions branch and are called one value at a time. These are plain arithmetic: a reduction that is
//! exact or rounds once, then the Taylor series of atanh and atan on an interval so short that the first term left out is
//! below rounding.

use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, FRAC_PI_8, PI};

/// Bits of sqrt(1/2), the lower end of the reduced mantissa.
const SQRT_HALF: u64 = 0x3FE6_A09E_667F_3BCD;
/// Bits of 1.
const ONE: u64 = 0x3FF0_0000_0000_0000;
/// Bits of the fraction.
const FRACTION: u64 = 0x000F_FFFF_FFFF_FFFF;
/// 2^52, whose last bit counts ones: a whole number in the fraction's bits reads as itself above it.
const WHOLE: f64 = 4_503_599_627_370_496.0;
/// ln 2 to its first 32 bits, so that its product with an exponent is exact, and the rest.
const LN_2: [f64; 2] = [0.693_147_180_369_123_8, 1.908_214_929_270_587_7e-10];
/// tan(π/16), tan(π/8) and tan(3π/16).
const TAN: [f64; 3] = [0.198_912_367_379_658, 0.414_213_562_373_095_03, 0.668_178_637_919_298_9];

/// ln(1 + x) for a pure ratio x ≥ 0.
///
/// ```text
/// 1 + x = 2^e m,  m in [sqrt(1/2), sqrt(2));   ln m = 2 atanh(s),  s = (m - 1)/(m + 1),  |s| < 0.172
/// ```
/// Relative error of a few ε; checked against the standard library's.
#[inline(always)]
#[must_use]
pub fn ln_1p(x: f64) -> f64 {
    let u = 1.0 + x;
    let lost = x - (u - 1.0);
    let shifted = u.to_bits().wrapping_add(ONE - SQRT_HALF);
    let exponent = f64::from_bits(WHOLE.to_bits() | (shifted >> 52)) - (WHOLE + 1023.0);
    let f = f64::from_bits((shifted & FRACTION) + SQRT_HALF) - 1.0;
    let s = f / (2.0 + f);
    let q = s * s;
    // 1/(2k + 1) to k = 10: the next term is below 0.0295^11/23 = 7e-19.
    let low = 1.0 / 3.0 + q * (1.0 / 5.0 + q * (1.0 / 7.0 + q * (1.0 / 9.0 + q * (1.0 / 11.0))));
    let high = 1.0 / 13.0 + q * (1.0 / 15.0 + q * (1.0 / 17.0 + q * (1.0 / 19.0 + q * (1.0 / 21.0))));
    let q2 = q * q;
    let series = q * (low + q2 * q2 * q * high);
    exponent * LN_2[0] + (2.0 * s + (2.0 * s * series + (exponent * LN_2[1] + lost / u)))
}

/// Angle of the direction (x, y), -π to π; 0 where both vanish.
///
/// ```text
/// atan(a) = c + atan((a - tan c)/(1 + a tan c)),  c the nearest of 0, π/8, π/4: the argument is at most tan(π/16)
/// ```
/// Absolute error of about ε, relative error of a few ε near 0; checked against the standard library's.
#[inline(always)]
#[must_use]
pub fn atan2(y: f64, x: f64) -> f64 {
    let (along, across) = (x.abs(), y.abs());
    let steep = across > along;
    let big = if steep { across } else { along };
    let small = if steep { along } else { across };
    let tangent = if small > TAN[0] * big { TAN[1] } else { 0.0 };
    let tangent = if small > TAN[2] * big { 1.0 } else { tangent };
    let centre = if small > TAN[0] * big { FRAC_PI_8 } else { 0.0 };
    let centre = if small > TAN[2] * big { FRAC_PI_4 } else { centre };
    let below = big + tangent * small;
    let below = if below > 0.0 { below } else { 1.0 };
    let t = (small - tangent * big) / below;
    let q = t * t;
    // (-1)^k/(2k + 1) to k = 10: the next term is below 0.0396^11/23 = 2e-17.
    let low = -1.0 / 3.0 + q * (1.0 / 5.0 + q * (-1.0 / 7.0 + q * (1.0 / 9.0 + q * (-1.0 / 11.0))));
    let high = 1.0 / 13.0 + q * (-1.0 / 15.0 + q * (1.0 / 17.0 + q * (-1.0 / 19.0 + q * (1.0 / 21.0))));
    let q2 = q * q;
    let angle = centre + (t + t * q * (low + q2 * q2 * q * high));
    let angle = if steep { FRAC_PI_2 - angle } else { angle };
    let angle = if x < 0.0 { PI - angle } else { angle };
    angle.copysign(y)
}

/// asinh(u / d), where r = sqrt(u² + d²); 0 where d vanishes, for use with a factor that vanishes there.
///
/// ```text
/// asinh(u/d) = ln(1 + u/d (1 + u/(r + d))),  u ≥ 0; odd
/// ```
#[inline(always)]
#[must_use]
pub fn asinh_ratio(u: f64, d: f64, r: f64) -> f64 {
    let on_axis = d <= 0.0;
    let size = u.abs();
    let below = if on_axis { 1.0 } else { d };
    let value = ln_1p(size * (1.0 + size / (r + below)) / below).copysign(u);
    if on_axis { 0.0 } else { value }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// What: ln(1 + x) from 1e-300 to 1e300 against the standard library's.
    /// Tolerance: 4 ε relative: the quotient s, its product and two sums round, and the library errs by one unit itself.
    /// Seen to fail with: `lost` left out; `high` left out.
    #[test]
    fn the_logarithm_is_that_of_the_library() {
        for k in -30_000..30_000 {
            let x = 10f64.powf(f64::from(k) / 100.0);
            let error = (ln_1p(x) / x.ln_1p() - 1.0).abs();
            assert!(error < 4.0 * f64::EPSILON, "ln(1 + {x:e}): {error:e}");
        }
        assert!(ln_1p(0.0) == 0.0);
    }

    /// What: the angle of directions all around, also very near the axes, against the standard library's.
    /// Tolerance: 4 ε relative, as above. Should fail with (not yet tried): `TAN[2]` of the wrong interval; `steep` turned.
    #[test]
    fn the_angle_is_that_of_the_library() {
        for k in 0..100_000 {
            let direction = f64::from(k) * 1e-4 * PI - PI;
            for (y, x) in [
                direction.sin_cos(),
                (1e-9 * direction, 1.0),
                (1e-9 * direction, -1.0),
                (2.0, direction * 1e-12),
            ] {
                let (found, expected) = (atan2(y, x), y.atan2(x));
                assert!(
                    (found - expected).abs() <= 4.0 * f64::EPSILON * expected.abs(),
                    "{y:e}, {x:e}: {found} for {expected}"
                );
            }
        }
        assert!(atan2(0.0, 0.0) == 0.0);
    }
}
