//! Infinite planes at 0 V: every panel has mirror images of opposite charge.
//!
//! One plane needs one image. Two planes a distance H apart need the series of shifts by 2 H n; it is summed to
//! |n| = [`SHIFTS`], and the rest is integrated (`docs/formulation.md`, "Panel integrals", "Two planes").

use crate::geom::{PanelShape, Vec3};
use crate::kernel::{COULOMB, Flat, pair};

/// Images on each side that are summed one by one. The rest, by the Euler-Maclaurin formula with its first correction,
/// errs by about (1/2) (1 / (2 n + 1))^6 / H: 1e-7 / H, below the error of the regimes.
pub const SHIFTS: i32 = 6;

/// A panel with its images.
#[derive(Debug, Clone)]
pub struct Source {
    direct: Flat,
    mirrored: Option<Flat>,
}

/// What the planes do to a source.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Mirrors {
    /// No plane.
    None,
    /// One plane at this height, m.
    One(f64),
    /// Two planes: height of the lower one and their distance, m.
    Two(f64, f64),
}

impl Mirrors {
    /// Planes below and above everything that is charged, heights in m.
    #[must_use]
    pub fn new(below: Option<f64>, above: Option<f64>) -> Self {
        match (below, above) {
            (None, None) => Mirrors::None,
            (Some(z), None) | (None, Some(z)) => Mirrors::One(z),
            (Some(lo), Some(hi)) => Mirrors::Two(lo, hi - lo),
        }
    }

    /// `shape` with its mirror image.
    #[must_use]
    pub fn source(&self, shape: &PanelShape) -> Source {
        let mirrored = match *self {
            Mirrors::None => None,
            Mirrors::One(z) | Mirrors::Two(z, _) => Some(Flat::new(&shape.mirrored(z))),
        };
        Source { direct: Flat::new(shape), mirrored }
    }

    /// Mean potential over `test` due to unit density on `source` and its images: V per C/m².
    #[must_use]
    #[inline]
    pub fn potential(&self, test: &Flat, source: &Source) -> f64 {
        self.sum(source, |flat, shift| pair::potential(test, flat, shift))
            + self.two().map_or(0.0, |(lo, gap)| Tail::new(test, &source.direct, lo, gap).potential())
    }

    /// Mean normal field over `test` due to unit density on `source` and its images: V/m per C/m².
    #[must_use]
    #[inline]
    pub fn flux(&self, test: &Flat, source: &Source) -> f64 {
        self.sum(source, |flat, shift| pair::flux(test, flat, shift))
            + self.two().map_or(0.0, |(lo, gap)| Tail::new(test, &source.direct, lo, gap).flux(test.normal))
    }

    fn two(&self) -> Option<(f64, f64)> {
        match *self {
            Mirrors::Two(lo, gap) => Some((lo, gap)),
            _ => None,
        }
    }

    #[inline]
    fn sum(&self, source: &Source, entry: impl Fn(&Flat, Vec3) -> f64) -> f64 {
        let none = Vec3::zeros();
        let direct = entry(&source.direct, none);
        let Some(mirrored) = &source.mirrored else { return direct };
        let mut sum = direct - entry(mirrored, none);
        if let Mirrors::Two(_, gap) = *self {
            for n in 1..=SHIFTS {
                for side in [-2.0, 2.0] {
                    let shift = Vec3::new(0.0, 0.0, side * f64::from(n) * gap);
                    sum += entry(&source.direct, shift) - entry(mirrored, shift);
                }
            }
        }
        sum
    }
}

impl Source {
    /// The panel itself.
    #[must_use]
    pub fn direct(&self) -> &Flat {
        &self.direct
    }
}

/// The images beyond [`SHIFTS`] of a source between two planes:
///
/// ```text
/// Σ_{|n|>N} 1/|a - 2Hn| - 1/|b - 2Hn|  =  -(2 z z'/H) W,   a = z - z', b = z + z', Z = 2H (N + 1/2), D = ρ² + Z²
/// W = Z D^(-3/2) + (H² - z² - z'²)/6 (9 Z D^(-5/2) - 15 Z³ D^(-7/2))
/// ```
struct Tail {
    lateral: [f64; 2],
    z: f64,
    z_source: f64,
    gap: f64,
    reach: f64,
    d2: f64,
    charge: f64,
}

impl Tail {
    fn new(test: &Flat, source: &Flat, lo: f64, gap: f64) -> Self {
        let r = test.centroid - source.centroid;
        let reach = gap * (2.0 * f64::from(SHIFTS) + 1.0);
        Tail {
            lateral: [r.x, r.y],
            z: test.centroid.z - lo,
            z_source: source.centroid.z - lo,
            gap,
            reach,
            d2: r.x * r.x + r.y * r.y + reach * reach,
            charge: COULOMB * source.area,
        }
    }

    /// (H² - z² - z'²)/6.
    fn correction(&self) -> f64 {
        (self.gap * self.gap - self.z * self.z - self.z_source * self.z_source) / 6.0
    }

    /// D^(-3/2) and the bracket of the correction.
    fn terms(&self) -> (f64, f64) {
        let d3 = 1.0 / (self.d2 * self.d2.sqrt());
        (d3, self.reach * d3 / self.d2 * (9.0 - 15.0 * self.reach * self.reach / self.d2))
    }

    fn potential(&self) -> f64 {
        let (d3, bracket) = self.terms();
        let w = self.reach * d3 + self.correction() * bracket;
        -self.charge * 2.0 * self.z * self.z_source / self.gap * w
    }

    fn flux(&self, normal: Vec3) -> f64 {
        let (d3, bracket) = self.terms();
        let c = self.correction();
        let w = self.reach * d3 + c * bracket;
        let ratio = self.reach * self.reach / self.d2;
        // (1/ρ) dW/dρ and dW/dz.
        let across = self.reach * d3 / self.d2 * (-3.0 + c / self.d2 * (-45.0 + 105.0 * ratio));
        let up = -self.z / 3.0 * bracket;
        let factor = self.charge * 2.0 * self.z_source / self.gap;
        let lateral = normal.x * self.lateral[0] + normal.y * self.lateral[1];
        factor * (normal.z * (w + self.z * up) + self.z * across * lateral)
    }
}
