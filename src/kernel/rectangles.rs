//! Closed forms of the double integrals over two rectangles whose sides are parallel or at right angles.
//!
//! The integrand depends on the differences x, y, z of the places alone, so each of the four integrations is a difference
//! of an antiderivative between two ends, and what is left is one function at sixteen corners with alternating signs
//! (`Ruehli1973`; derived in `docs/formulation.md`, "Panel integrals"). All sixteen are worked out side by side.

use crate::geom::Vec3;
use crate::kernel::Flat;
use crate::kernel::lanes::{asinh_ratio, atan2};
use pulp::{Simd, WithSimd};

/// Largest (distance + both radii)^4 / (both areas) for which the closed forms are used: they lose this factor of digits,
/// ε 1e5 = 2e-11.
const MAX_LOSS: f64 = 1e5;

/// Axes are parallel when the cosines with the other two are at most this.
const ALIGNED: f64 = 1e-12;

const CORNERS: usize = 16;
type Lane = [f64; CORNERS];

/// Mean of 1/r over both rectangles, 1/m; `None` where they are not aligned rectangles, or too far apart for their size.
#[must_use]
pub fn inverse_distance(one: &Flat, two: &Flat) -> Option<f64> {
    let pair = Pair::new(one, two)?;
    let sum = match pair.corners {
        Corners::Parallel(at) => pulp::Arch::new().dispatch(At(&at, ParallelInverse)),
        Corners::Perpendicular(at) => pulp::Arch::new().dispatch(At(&at, PerpendicularInverse)),
    };
    Some(sum / pair.areas)
}

/// Mean of n . r / r³ over both rectangles, n the normal of the test rectangle and r from the source to it, 1/m²; `None`
/// as for [`inverse_distance`].
#[must_use]
pub fn flux(test: &Flat, source: &Flat) -> Option<f64> {
    let pair = Pair::new(test, source)?;
    let sum = match pair.corners {
        Corners::Parallel(at) => pulp::Arch::new().dispatch(At(&at, ParallelFlux)),
        Corners::Perpendicular(at) => pulp::Arch::new().dispatch(At(&at, PerpendicularFlux)),
    };
    Some(sum / pair.areas)
}

/// Differences of places, m, one way or the other of taking each end of each side; and the sign of each.
struct Places {
    place: [Lane; 3],
    sign: Lane,
}

enum Corners {
    /// z along both normals.
    Parallel(Places),
    /// z along the normal of the first, x along that of the second, y along both planes.
    Perpendicular(Places),
}

struct Pair {
    corners: Corners,
    /// Product of the areas, m^4.
    areas: f64,
}

impl Pair {
    fn new(one: &Flat, two: &Flat) -> Option<Pair> {
        if !(one.is_rectangle && two.is_rectangle) {
            return None;
        }
        let offset = one.centroid - two.centroid;
        let reach = offset.norm() + one.radius + two.radius;
        let areas = one.area * two.area;
        if reach.powi(4) > MAX_LOSS * areas {
            return None;
        }
        let axes = [one.u, one.v, one.normal];
        let extent = half_extents(&axes, two)?;
        let [x, y, z] = axes.map(|axis| offset.dot(&axis));
        let [a, b, _] = one.half_widths;
        // The normal of the second is the axis along which it has no extent.
        let corners = if extent[2] == 0.0 {
            Corners::Parallel(Places::new([x, y, z], [&[a, extent[0]], &[b, extent[1]], &[]]))
        } else if extent[0] == 0.0 {
            Corners::Perpendicular(Places::new([x, y, z], [&[a], &[b, extent[1]], &[extent[2]]]))
        } else {
            Corners::Perpendicular(Places::new([y, x, z], [&[b], &[a, extent[0]], &[extent[2]]]))
        };
        Some(Pair { corners, areas })
    }
}

/// Half-extents of `flat` along three axes, m, when its own axes are these in another order.
fn half_extents(axes: &[Vec3; 3], flat: &Flat) -> Option<[f64; 3]> {
    let own = [flat.u, flat.v, flat.normal];
    let mut extent = [0.0; 3];
    for (own, half) in own.iter().zip(flat.half_widths) {
        let cosines = axes.map(|axis| axis.dot(own).abs());
        let k = (0..3).find(|k| (0..3).all(|other| other == *k || cosines[other] <= ALIGNED))?;
        extent[k] += half;
    }
    Some(extent)
}

impl Places {
    /// Centre differences `at` with every choice of sign of the half-extents `halves` along each axis: four in all.
    fn new(at: [f64; 3], halves: [&[f64]; 3]) -> Self {
        let mut out = Places { place: at.map(|x| [x; CORNERS]), sign: [1.0; CORNERS] };
        let along =
            halves.iter().enumerate().flat_map(|(axis, halves)| halves.iter().map(move |h| (axis, *h)));
        for (bit, (axis, half)) in along.enumerate() {
            for corner in 0..CORNERS {
                let side = if corner >> bit & 1 == 0 { -1.0 } else { 1.0 };
                out.place[axis][corner] += side * half;
                out.sign[corner] *= side;
            }
        }
        out
    }
}

/// What is left of a double integral: a function of the differences of places.
trait Antiderivative {
    /// Its value, but for what the differences remove; x, y and z in m.
    fn at(x: f64, y: f64, z: f64) -> f64;
}

/// A function to be summed over the corners.
struct At<'a, F>(&'a Places, F);

impl<F: Antiderivative> WithSimd for At<'_, F> {
    type Output = f64;

    #[inline(always)]
    fn with_simd<S: Simd>(self, _: S) -> f64 {
        let Places { place: [x, y, z], sign } = self.0;
        let mut value = [0.0; CORNERS];
        for (l, value) in value.iter_mut().enumerate() {
            *value = sign[l] * F::at(x[l], y[l], z[l]);
        }
        value.iter().sum()
    }
}

/// sqrt(x² + y² + z²) and the three distances from the axes: of (y, z), (x, z) and (x, y).
#[inline(always)]
fn distances(x: f64, y: f64, z: f64) -> (f64, [f64; 3]) {
    let (x2, y2, z2) = (x * x, y * y, z * z);
    ((x2 + y2 + z2).sqrt(), [(y2 + z2).sqrt(), (x2 + z2).sqrt(), (x2 + y2).sqrt()])
}

/// atan(a / b), odd in both.
#[inline(always)]
fn atan_ratio(a: f64, b: f64) -> f64 {
    let angle = atan2(a, b.abs());
    if b < 0.0 { -angle } else { angle }
}

/// F with ∂x² ∂y² F = 1/r, but for what the differences remove:
/// `x/2 (y² - z²) asinh(x/√(y² + z²)) + y/2 (x² - z²) asinh(y/√(x² + z²)) - r/6 (x² + y² - 2 z²) - x y z atan(x y / (z r))`
struct ParallelInverse;

impl Antiderivative for ParallelInverse {
    #[inline(always)]
    fn at(x: f64, y: f64, z: f64) -> f64 {
        let (r, [from_x, from_y, _]) = distances(x, y, z);
        let (x2, y2, z2) = (x * x, y * y, z * z);
        0.5 * (x * (y2 - z2) * asinh_ratio(x, from_x, r) + y * (x2 - z2) * asinh_ratio(y, from_y, r))
            - r * (x2 + y2 - 2.0 * z2) / 6.0
            - x * y * z * atan_ratio(x * y, z * r)
    }
}

/// -∂F/∂z, of which ∂x² ∂y² is z/r³, but for what the differences remove:
/// `x y atan(x y / (z r)) + x z asinh(x/√(y² + z²)) + y z asinh(y/√(x² + z²)) - z r`
struct ParallelFlux;

impl Antiderivative for ParallelFlux {
    #[inline(always)]
    fn at(x: f64, y: f64, z: f64) -> f64 {
        let (r, [from_x, from_y, _]) = distances(x, y, z);
        x * y * atan_ratio(x * y, z * r)
            + z * (x * asinh_ratio(x, from_x, r) + y * asinh_ratio(y, from_y, r) - r)
    }
}

/// N with ∂x ∂y² ∂z N = 1/r, but for what the differences remove:
/// ```text
/// z (y²/2 - z²/6) asinh(x/√(y² + z²)) + x (y²/2 - x²/6) asinh(z/√(x² + y²)) + x y z asinh(y/√(x² + z²)) - x z r/3
///   - y³/6 atan(x z/(y r)) - y z²/2 atan(x y/(z r)) - y x²/2 atan(y z/(x r))
/// ```
struct PerpendicularInverse;

impl Antiderivative for PerpendicularInverse {
    #[inline(always)]
    fn at(x: f64, y: f64, z: f64) -> f64 {
        let (r, [from_x, from_y, from_z]) = distances(x, y, z);
        let (x2, y2, z2) = (x * x, y * y, z * z);
        z * (0.5 * y2 - z2 / 6.0) * asinh_ratio(x, from_x, r)
            + x * (0.5 * y2 - x2 / 6.0) * asinh_ratio(z, from_z, r)
            + x * y * z * asinh_ratio(y, from_y, r)
            - x * z * r / 3.0
            - y * y2 / 6.0 * atan_ratio(x * z, y * r)
            - 0.5 * y * (z2 * atan_ratio(x * y, z * r) + x2 * atan_ratio(y * z, x * r))
    }
}

/// -∂F/∂x, of which ∂x ∂y² is -1/r and so ∂x ∂y² ∂z is z/r³, but for what the differences remove:
/// `(z² - y²)/2 asinh(x/√(y² + z²)) - x y asinh(y/√(x² + z²)) + y z atan(x y / (z r)) + x r/2`
struct PerpendicularFlux;

impl Antiderivative for PerpendicularFlux {
    #[inline(always)]
    fn at(x: f64, y: f64, z: f64) -> f64 {
        let (r, [from_x, from_y, _]) = distances(x, y, z);
        0.5 * (z * z - y * y) * asinh_ratio(x, from_x, r) - x * y * asinh_ratio(y, from_y, r)
            + y * z * atan_ratio(x * y, z * r)
            + 0.5 * x * r
    }
}
