//! Two independent ways to one number: closed forms against quadrature and against one another.

use crate::solids::{body, cuboid, empty, graded, icosphere, metal};
use chargeskin::geom::{PanelShape, Vec3};
use chargeskin::kernel::batch::{self, Batch};
use chargeskin::kernel::image::Mirrors;
use chargeskin::kernel::outer::{self, Effort};
use chargeskin::kernel::{COULOMB, Flat, flux, galerkin, pair, potential, rectangles};
use std::f64::consts::PI;

/// A flat panel with these corners, counter-clockwise.
fn flat(corners: &[[f64; 3]]) -> Flat {
    let at: Vec<Vec3> = corners.iter().map(|c| Vec3::new(c[0], c[1], c[2])).collect();
    let normal = (at[1] - at[0]).cross(&(at[2] - at[0])).normalize();
    Flat::new(&PanelShape::new(&at, normal).unwrap())
}

/// The rectangle from `lo` to `hi` at height `z`, facing up.
fn plate_at(lo: [f64; 2], hi: [f64; 2], z: f64) -> Flat {
    flat(&[[lo[0], lo[1], z], [hi[0], lo[1], z], [hi[0], hi[1], z], [lo[0], hi[1], z]])
}

/// Integral of 1/r over the rectangle 0 to `a`, 0 to `b` at height 0, in closed form along x (asinh) and by
/// tanh-sinh quadrature along y: an independent way.
fn inverse_distance_by_quadrature(a: f64, b: f64, at: [f64; 3]) -> f64 {
    let line = |y: f64| {
        let d = (y - at[1]).hypot(at[2]);
        ((a - at[0]) / d).asinh() - (-at[0] / d).asinh()
    };
    let piece = |from: f64, to: f64| {
        let step = 1.0 / 64.0;
        (-256..=256)
            .map(|k| f64::from(k) * step)
            .map(|t| {
                let u = 0.5 * PI * t.sinh();
                let weight = 0.5 * PI * t.cosh() / u.cosh().powi(2);
                // The distance from the nearer end keeps its digits there.
                let near = 1.0 / (1.0 + (2.0 * u.abs()).exp());
                let y = if u < 0.0 { from + (to - from) * near } else { to - (to - from) * near };
                if weight > 1e-300 && y > from && y < to {
                    0.5 * (to - from) * step * weight * line(y)
                } else {
                    0.0
                }
            })
            .sum::<f64>()
    };
    let split = at[1].clamp(0.0, b);
    piece(0.0, split) + piece(split, b)
}

/// What: the potential of a rectangle, on its plane, on an edge's line, near, far and for a sliver of aspect 1e6.
/// Derived: one direction by hand, the other by quadrature.
/// Tolerance: 1e-12 plus ε times distance over width (the loss the closed form states), each with a factor 50 for the sums.
/// Should fail with (not yet tried): `line2` left out of the second bracket of `log_ratio`; the sign of the solid angle's term turned.
#[test]
fn the_potential_of_a_rectangle_is_that_of_quadrature() {
    for (a, b) in [(1.0, 1.0), (1.0, 0.1), (1.0, 1e-3), (1.0, 1e-6)] {
        let panel = plate_at([0.0, 0.0], [a, b], 0.0);
        let places = [
            [0.3 * a, 0.4 * b, 0.0],
            [0.3 * a, 0.4 * b, 0.2 * b],
            [0.3 * a, 1.5 * b, 0.0],
            [-0.5 * a, 0.4 * b, 0.3 * b],
            [0.5 * a, 2.0 * b, 0.1],
            [3.0 * a, 2.0, 1.0],
            [0.9 * a, -0.1 * b, 1e-3 * b],
            [0.2 * a, 0.5 * b, -2.0],
        ];
        for at in places {
            let expected = inverse_distance_by_quadrature(a, b, at);
            let found = potential::inverse_distance_at(&panel, Vec3::new(at[0], at[1], at[2]));
            let far = (at[0].abs() + at[1].abs() + at[2].abs()) / b;
            let tolerance = 50.0 * (2e-14 + f64::EPSILON * far);
            assert!(
                (found / expected - 1.0).abs() < tolerance,
                "{a} x {b} at {at:?}: {found} for {expected}"
            );
        }
    }
}

/// What: the solid angle of triangles against the formula of `VanOosterom1983`, places all around.
/// Tolerance: 64 ε, rounding of either; places nearer an edge's line than 0.01 are left out since the oracle loses digits.
/// Should fail with (not yet tried): the cancellation-free branch of `share` with `lo - hi` for its length.
#[test]
fn the_solid_angle_of_a_triangle_is_that_of_the_literature() {
    let corners = [Vec3::zeros(), Vec3::new(1.0, 0.1, 0.0), Vec3::new(0.3, 0.8, 0.0)];
    let panel = flat(&corners.map(|c| [c.x, c.y, c.z]));
    for i in 0..7 {
        for j in 0..7 {
            for z in [-2.0, -0.3, -0.02, 0.05, 0.7, 5.0] {
                let at = Vec3::new(0.31 * f64::from(i) - 0.6, 0.29 * f64::from(j) - 0.5, z);
                let [a, b, c] = corners.map(|p| p - at);
                let (x, y, w) = (a.norm(), b.norm(), c.norm());
                let below = x * y * w + a.dot(&b) * w + b.dot(&c) * x + c.dot(&a) * y;
                // Counter-clockwise corners seen from the tip of the normal look clockwise from below: the sign turns.
                let expected = -2.0 * a.dot(&b.cross(&c)).atan2(below);
                let found = flux::solid_angle_at(&panel, at);
                assert!((found - expected).abs() < 64.0 * f64::EPSILON, "at {at}: {found} for {expected}");
            }
        }
    }
}

/// What: the solid angles of a closed mesh sum to -4 π inside (every normal points away) and to 0 outside.
/// Derived: Gauss's law. Tolerance: ε per panel, times 16.
/// Should fail with (not yet tried): `turned` left out of `angle_of_view` (a place under a panel, very near it, comes out 2 π wrong).
#[test]
fn a_closed_mesh_fills_the_sphere_of_directions() {
    let mut mesh = empty(&["box"], vec![body(1.0, false)]);
    let kind = metal(&mesh, 0, 0);
    cuboid(&mut mesh, Vec3::zeros(), Vec3::new(1.0, 2.0, 3.0), &graded(6, 3.0), kind);
    let mut closed: Vec<Vec<Flat>> = vec![mesh.panels.iter().map(|panel| Flat::new(&panel.shape)).collect()];
    closed.push(
        icosphere(3, 2.0)
            .iter()
            .map(|t| {
                let outward = (t[1] - t[0]).cross(&(t[2] - t[0])).dot(&t[0]) > 0.0;
                let t = if outward { *t } else { [t[0], t[2], t[1]] };
                flat(&t.map(|p| [p.x, p.y, p.z]))
            })
            .collect(),
    );
    for panels in &closed {
        let tolerance = 16.0 * f64::EPSILON * panels.len() as f64;
        for (at, inside) in [
            (Vec3::new(0.5, 0.4, 0.3), true),
            (Vec3::new(0.45, 0.7, 1e-12), true),
            (Vec3::new(0.47, 0.31, 0.999), true),
            (Vec3::new(5.0, 0.1, 0.2), false),
            (Vec3::new(0.2, 0.3, -2.5), false),
        ] {
            let sum: f64 = panels.iter().map(|panel| flux::solid_angle_at(panel, at)).sum();
            let expected = if inside { -4.0 * PI } else { 0.0 };
            assert!((sum - expected).abs() < tolerance, "at {at}: {sum} for {expected}");
        }
    }
}

/// What: the closed double integrals of panels in one plane and in parallel planes against outer Gauss rules.
/// Tolerance: 1e-8, that of the reference rule on touching triangles (measured 2e-9), 1e-11 for rectangles (1e-12).
/// Should fail with (not yet tried): `h` for `-h` in `twice_apart`; the sign of the normals' product turned.
#[test]
fn closed_double_integrals_are_those_of_quadrature() {
    let one = plate_at([0.0, 0.0], [1.0, 1.0], 0.0);
    for h in [0.0, 1e-3, 0.1, 1.0] {
        for (dx, dy) in [(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (1.2, 0.3)] {
            let two = plate_at([dx, dy], [dx + 1.0, dy + 0.5], h);
            let by_rule = outer::mean(&two, &one, &Effort::REFERENCE, |points| {
                points.sum(|at| potential::inverse_distance(&one, at))
            });
            let closed = galerkin::inverse_distance(&one, &two).unwrap();
            assert!((closed / by_rule - 1.0).abs() < 1e-10, "h {h}, at {dx}, {dy}: {closed} for {by_rule}");
        }
    }
    let corner = flat(&[[0.0, 0.0, 0.0], [1.0, 0.0, 0.0], [0.3, 0.9, 0.0]]);
    let beside = flat(&[[0.0, 0.0, 0.0], [0.4, -0.8, 0.0], [1.0, 0.0, 0.0]]);
    for (a, b) in [(&corner, &corner), (&corner, &beside), (&corner, &one)] {
        let by_rule = outer::mean(a, b, &Effort::POTENTIAL, |points| {
            points.sum(|at| potential::inverse_distance(b, at))
        }) / b.area;
        let closed = galerkin::inverse_distance(a, b).unwrap();
        assert!((closed / by_rule - 1.0).abs() < 1e-5, "{closed} for {by_rule}");
    }
}

/// Numbers between 0 and 1 from a fixed seed.
struct Numbers(u64);

impl Numbers {
    fn next(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    fn direction(&mut self) -> Vec3 {
        Vec3::new(self.next() - 0.5, self.next() - 0.5, self.next() - 0.5).normalize()
    }

    /// A square, a strip of aspect 10 or 100, a triangle or a trapezoid of size `size`, turned at random.
    fn panel(&mut self, kind: usize, size: f64) -> Flat {
        let shape: &[[f64; 2]] = match kind {
            0 => &[[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]],
            1 => &[[0.0, 0.0], [1.0, 0.0], [1.0, 0.1], [0.0, 0.1]],
            2 => &[[0.0, 0.0], [1.0, 0.0], [0.4, 0.8]],
            4 => &[[0.0, 0.0], [0.01, 0.0], [0.01, 1.0], [0.0, 1.0]],
            _ => &[[0.0, 0.0], [1.0, 0.0], [0.7, 0.6], [0.2, 0.6]],
        };
        let (u, other) = (self.direction(), self.direction());
        let v = u.cross(&other).normalize();
        let at: Vec<[f64; 3]> = shape.iter().map(|p| ((u * p[0] + v * p[1]) * size).into()).collect();
        flat(&at)
    }
}

/// What: both entries of random pairs, at all distances, against the reference rule.
/// Tolerance: that stated by `kernel::regime` (1e-5 of the potential; 2e-5 of A / d² for the flux).
/// Seen to fail with: largest q of 0.09, 0.27, 0.47, 0.68, 0.88 for two to six points (4.8e-6 of the potential).
#[test]
fn regimes_meet_their_limits() {
    let mut numbers = Numbers(88_172_645_463_325_252);
    let (mut potentials, mut fluxes) = (Vec::new(), Vec::new());
    for trial in 0..600 {
        let test = numbers.panel(trial % 5, 1.0);
        let source = numbers.panel(trial / 5 % 5, [1.0, 0.3, 3.0][trial % 3]);
        let distance =
            (test.radius + source.radius) * 1.02 * 1.13f64.powi(i32::try_from(trial % 37).unwrap());
        let source = source.displaced(test.centroid - source.centroid + numbers.direction() * distance);
        let x2 = (test.radius.powi(2) + source.radius.powi(2)) / distance.powi(2);
        let unit = COULOMB * source.area;
        let by_rule = outer::mean(&test, &source, &Effort::REFERENCE, |points| {
            points.sum(|at| potential::inverse_distance(&source, at))
        });
        let found = pair::potential(&test, &source, Vec3::zeros());
        potentials.push(((found / (COULOMB * by_rule) - 1.0).abs(), x2));
        let by_rule = -outer::mean(&source, &test, &Effort::REFERENCE, |points| {
            points.sum(|at| flux::solid_angle(&test, at))
        }) / test.area;
        let found = pair::flux(&test, &source, Vec3::zeros()) / unit;
        fluxes.push(((found - by_rule).abs() * distance * distance, x2));
    }
    for (name, mut errors, limit) in [("potential", potentials, 1e-5), ("flux", fluxes, 2e-5)] {
        errors.sort_by(|a, b| b.0.total_cmp(&a.0));
        let worst: Vec<String> =
            errors[..6].iter().map(|(e, x2)| format!("{e:.1e} at x² = {x2:.4}")).collect();
        println!("{name}: {}", worst.join(", "));
        assert!(errors[0].0 < limit, "{name}: {}", worst.join(", "));
    }
}

/// What: sixteen points at once are sixteen points one by one, near the panel, on it, on its edges and far away.
/// Tolerance: 1e-12 of the perimeter, and of a full turn: rounding of some thirty operations per edge, none of which cancels.
/// Should fail with (not yet tried): `hi - lo` for `lo + hi` in `View::see`; `turned` left out of `View::angle`.
#[test]
fn batches_are_the_closed_forms_point_by_point() {
    let mut numbers = Numbers(7_046_029_254_386_353_131);
    for trial in 0..400 {
        let panel = numbers.panel(trial % 5, 1.0);
        let reach = [1.0, 1e-3, 30.0][trial % 3];
        let mut points = Batch::default();
        let mut full = false;
        while !full {
            let corner = panel.corners[trial % panel.n_corners];
            let height = if numbers.next() < 0.2 { 0.0 } else { numbers.next() - 0.5 };
            let at = match trial % 4 {
                0 => [corner[0], corner[1], 0.0],
                1 => [corner[0] * numbers.next(), corner[1] * numbers.next(), reach * height],
                _ => [
                    corner[0] + reach * (numbers.next() - 0.5),
                    corner[1] + reach * (numbers.next() - 0.5),
                    reach * height,
                ],
            };
            full = points.push(at, numbers.next());
        }
        let perimeter: f64 = panel.lengths.iter().sum();
        let (found, expected) = (
            batch::inverse_distance(&panel, &points),
            points.sum(|at| potential::inverse_distance(&panel, at)),
        );
        assert!(
            (found - expected).abs() < 16e-12 * perimeter,
            "potential, trial {trial}: {found} for {expected}"
        );
        let (found, expected) =
            (batch::solid_angle(&panel, &points), points.sum(|at| flux::solid_angle(&panel, at)));
        assert!((found - expected).abs() < 16e-12 * 4.0 * PI, "angle, trial {trial}: {found} for {expected}");
    }
}

/// What: the closed forms of aligned rectangles, parallel and at right angles, apart and touching along an edge, at a
/// corner and in one plane, against the reference rule; and that they apply.
/// Tolerance: 1e-8 of the potential, and of A / d² (greatest distance) for the flux: that of the reference rule on touching
/// pairs (measured 2e-9).
/// Should fail with (not yet tried): `z2 / 3.0` for `z2 / 6.0` in `PerpendicularInverse`; the sign of `x r/2` in `PerpendicularFlux`.
#[test]
fn aligned_rectangles_are_those_of_the_reference_rule() {
    let mut numbers = Numbers(1_442_695_040_888_963_407);
    let floor = plate_at([-1.0, -0.5], [1.0, 0.5], 0.0);
    for trial in 0..60 {
        let (a, b) = (0.2 + numbers.next(), 0.05 + numbers.next());
        let (x, y, z) = match trial % 3 {
            // Touching along an edge of the floor, at a corner, or apart.
            0 => (1.0, -0.3, 0.0),
            1 => (1.0, 0.5, 0.0),
            _ => (2.0 * numbers.next() - 1.0, numbers.next(), 0.1 + numbers.next()),
        };
        let other = match trial / 3 % 3 {
            0 => plate_at([x, y], [x + a, y + b], z),
            1 => flat(&[[x, y, z], [x, y + a, z], [x, y + a, z + b], [x, y, z + b]]),
            _ => flat(&[[x, y, z], [x, y, z + b], [x + a, y, z + b], [x + a, y, z]]),
        };
        let by_rule = outer::mean(&floor, &other, &Effort::REFERENCE, |points| {
            points.sum(|at| potential::inverse_distance(&other, at))
        }) / other.area;
        let found = rectangles::inverse_distance(&floor, &other).unwrap();
        assert!((found / by_rule - 1.0).abs() < 1e-8, "potential, trial {trial}: {found} for {by_rule}");
        let reach = (floor.centroid - other.centroid).norm() + floor.radius + other.radius;
        for (test, source) in [(&floor, &other), (&other, &floor)] {
            let by_rule = -outer::mean(source, test, &Effort::REFERENCE, |points| {
                points.sum(|at| flux::solid_angle(test, at))
            }) / test.area;
            let found = rectangles::flux(test, source).unwrap();
            assert!(
                (found - by_rule).abs() < 1e-8 / (reach * reach),
                "flux, trial {trial}: {found} for {by_rule}"
            );
        }
    }
}

/// What: touching and very near pairs at right angles, also of unlike size, against the reference rule; and charge behind
/// a panel gives a positive flux.
/// Tolerance: that stated by `kernel::regime`: 1e-5 of the potential, 2e-5 of the flux.
/// Should fail with (not yet tried): the sign of `near_flux` turned; two halvings in place of six.
#[test]
fn touching_pairs_are_those_of_the_reference_rule() {
    let floor = plate_at([0.0, 0.0], [1.0, 1.0], 0.0);
    let wall = |y0: f64, y1: f64, z0: f64, z1: f64| {
        flat(&[[0.0, y0, z0], [0.0, y1, z0], [0.0, y1, z1], [0.0, y0, z1]])
    };
    for other in [
        wall(0.0, 1.0, 0.0, 1.0),
        wall(0.0, 1.0, -0.01, 0.0),
        wall(0.3, 1.3, 1e-3, 1.0),
        wall(0.4, 0.41, 0.0, 0.01),
    ] {
        let by_rule = outer::mean(&floor, &other, &Effort::REFERENCE, |points| {
            points.sum(|at| potential::inverse_distance(&other, at))
        });
        let found = pair::potential(&floor, &other, Vec3::zeros()) / COULOMB;
        assert!((found / by_rule - 1.0).abs() < 1e-5, "potential {found} for {by_rule}");
        for (test, source) in [(&floor, &other), (&other, &floor)] {
            let by_rule = -outer::mean(source, test, &Effort::REFERENCE, |points| {
                points.sum(|at| flux::solid_angle(test, at))
            }) / test.area;
            let found = pair::flux(test, source, Vec3::zeros()) / (COULOMB * source.area);
            assert!((found / by_rule - 1.0).abs() < 2e-5, "flux {found} for {by_rule}");
        }
    }
    let behind = plate_at([0.2, 0.2], [0.4, 0.4], -0.5);
    assert!(
        pair::flux(&floor, &behind, Vec3::zeros()) > 0.0,
        "the field of charge behind goes along the normal"
    );
}

/// What: the images between two planes, summed to the end by the tail formula, against two thousand images one by one.
/// Tolerance: 1e-6 of the greatest entry at one plane distance (the error that `kernel::image` states is 1e-7 / H; 1/8000² is
/// left by the sum itself, whose pairs fall as 1/n³).
/// Should fail with (not yet tried): the tail left out; its sign turned; the correction left out.
#[test]
fn two_planes_are_their_images() {
    let (test, gap) = (plate_at([0.0, 0.0], [0.2, 0.2], 0.3), 1.0);
    for (x, y, z) in [(0.05, 0.03, 0.8), (1.0, 0.5, 0.3), (4.0, 1.0, 0.6), (30.0, 10.0, 0.5)] {
        let corners = [[x, y, z], [x + 0.1, y, z], [x + 0.1, y + 0.1, z], [x, y + 0.1, z]]
            .map(|c| Vec3::new(c[0], c[1], c[2]));
        let shape = PanelShape::new(&corners, Vec3::z()).unwrap();
        let mirrors = Mirrors::new(Some(0.0), Some(gap));
        let (direct, image) = (Flat::new(&shape), Flat::new(&shape.mirrored(0.0)));
        let entry = |f: &dyn Fn(&Flat, Vec3) -> f64| -> f64 {
            (-1000..=1000)
                .map(|n| Vec3::new(0.0, 0.0, 2.0 * gap * f64::from(n)))
                .map(|s| f(&direct, s) - f(&image, s))
                .sum()
        };
        let scale = COULOMB * direct.area / gap;
        let found = mirrors.potential(&test, &mirrors.source(&shape));
        let by_sum = entry(&|flat, shift| pair::potential(&test, flat, shift));
        assert!(
            (found - by_sum).abs() < 1e-6 * scale,
            "potential at {x}: {found:e} for {by_sum:e}, scale {scale:e}"
        );
        let found = mirrors.flux(&test, &mirrors.source(&shape));
        let by_sum = entry(&|flat, shift| pair::flux(&test, flat, shift));
        assert!(
            (found - by_sum).abs() < 1e-6 * scale / gap,
            "flux at {x}: {found:e} for {by_sum:e}, scale {scale:e}"
        );
    }
}
