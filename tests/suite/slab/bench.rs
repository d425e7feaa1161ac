//! Boards put together in a few words, and surfaces weighed: vector area, volume, solid angle.
#![expect(clippy::panic, reason = "helpers of tests are tests as well")]

use chargeskin::Faces;
use chargeskin::artwork::{Artwork, Copper, Hole, Lining, Pattern};
use chargeskin::diag::Origin;
use chargeskin::faces::{BodyId, Face, FaceKind};
use chargeskin::geom::Vec3;
use chargeskin::geom::region::{Bounds, Contour, Fill, Point, Region};
use chargeskin::job::{
    Accuracy, ArtworkPlan, FloatingNet, Job, Layer, LayerKind, Material, Named, NetRules, RegionChoice,
    Stackup, WideFace,
};
use chargeskin::net::{NameSource, NetId};
use chargeskin::slab::{SlabErrors, SlabModel, SlabOptions};
use std::collections::BTreeMap;

/// Grid steps per micrometre.
pub(super) const UM: i64 = 1000;

pub(super) fn named(name: &str) -> Named {
    Named { name: name.to_owned(), origin: Origin::default() }
}

/// Rectangle between two corners given in um.
pub(super) fn rect(x0: i64, y0: i64, x1: i64, y1: i64) -> Region {
    Bounds { lo: Point::new(x0 * UM, y0 * UM), hi: Point::new(x1 * UM, y1 * UM) }.region()
}

/// Regular polygon with n corners, um.
pub(super) fn disc(x: i64, y: i64, r: i64, n: u32) -> Region {
    let at = |k: u32| {
        let a = f64::from(k) / f64::from(n) * std::f64::consts::TAU;
        let r = (r * UM) as f64;
        Point::new(x * UM + (r * a.cos()).round() as i64, y * UM + (r * a.sin()).round() as i64)
    };
    polygon((0..n).map(at).collect())
}

pub(super) fn polygon(points: Contour) -> Region {
    Region::from_contours(&[points], Fill::NonZero)
}

fn material(name: &str, er: f64) -> Material {
    Material {
        name: name.to_owned(),
        er,
        er_source: "test".to_owned(),
        loss_tangent: None,
        conductivity: None,
        strength: None,
    }
}

pub(super) fn open(name: &str, er: f64) -> Layer {
    Layer::new(name, LayerKind::Open { material: material(name, er) })
}

pub(super) fn dielectric(name: &str, er: f64, um: f64) -> Layer {
    let thickness = um * 1e-6;
    Layer::new(
        name,
        LayerKind::Dielectric {
            material: material(name, er),
            thickness,
            prepreg: false,
            fill: None,
            pattern: None,
        },
    )
}

pub(super) fn coating(name: &str, er: f64, laminate: f64, copper: f64, beside: f64) -> Layer {
    Layer::new(
        name,
        LayerKind::Coating {
            material: material(name, er),
            depth_on_laminate: laminate * 1e-6,
            depth_on_copper: copper * 1e-6,
            depth_beside_copper: beside * 1e-6,
        },
    )
}

pub(super) fn conductor(name: &str, um: f64) -> Layer {
    etched_conductor(name, um, 90.0, 0.0)
}

pub(super) fn etched_conductor(name: &str, um: f64, slope: f64, bias: f64) -> Layer {
    Layer::new(
        name,
        LayerKind::Conductor {
            thickness: um * 1e-6,
            fill: None,
            side_slope: slope.to_radians(),
            wide_face: WideFace::OnCore,
            etch_bias: bias * 1e-6,
        },
    )
}

/// 35 um copper on both sides of 200 um of er 4.
pub(super) fn two_layer() -> Board {
    Board::new(vec![
        open("above", 1.0),
        conductor("top", 35.0),
        dielectric("core", 4.0, 200.0),
        conductor("bottom", 35.0),
        open("below", 1.0),
    ])
}

/// Artwork, stackup and job under construction.
pub(super) struct Board {
    pub(super) artwork: Artwork,
    pub(super) stackup: Stackup,
    pub(super) job: Job,
    pub(super) options: SlabOptions,
}

impl Board {
    pub(super) fn new(layers: Vec<Layer>) -> Self {
        Board {
            artwork: Artwork::default(),
            stackup: Stackup { layers, unused: Vec::new() },
            job: Job {
                title: String::new(),
                stackup: named("stackup"),
                frequency: None,
                artwork: ArtworkPlan::default(),
                shapes: Vec::new(),
                region: RegionChoice::Whole,
                nets: NetRules::default(),
                materials: BTreeMap::new(),
                accuracy: Accuracy::default(),
                unused: Vec::new(),
            },
            options: SlabOptions::default(),
        }
    }

    fn net(&mut self, name: &str) -> NetId {
        let source = if name.starts_with('#') { NameSource::Numbered } else { NameSource::Given };
        self.artwork.nets.intern(name, source, Origin::default())
    }

    pub(super) fn copper(mut self, layer: &str, net: &str, region: Region) -> Self {
        let net = self.net(net);
        let layer = self.stackup.find(layer).unwrap();
        match self.artwork.copper.iter_mut().find(|c| c.layer == layer && c.net == net) {
            Some(copper) => copper.region = copper.region.union(&region),
            None => self.artwork.copper.push(Copper { layer, net, region, origin: Origin::default() }),
        }
        self.artwork.copper.sort_by_key(|c| (c.layer, c.net));
        self
    }

    fn hole(mut self, from: &str, to: &str, region: Region, lining: Lining) -> Self {
        let (from, to) = (self.stackup.find(from).unwrap(), self.stackup.find(to).unwrap());
        let at = region.contours().next().unwrap()[0];
        self.artwork.holes.push(Hole {
            region,
            at,
            diameter: 0.0,
            from,
            to,
            lining,
            origin: Origin::default(),
        });
        self
    }

    pub(super) fn barrel(mut self, from: &str, to: &str, net: &str, region: Region) -> Self {
        let net = self.net(net);
        self.hole(from, to, region, Lining::Plated(net))
    }

    pub(super) fn bare(self, from: &str, to: &str, region: Region) -> Self {
        self.hole(from, to, region, Lining::Bare)
    }

    pub(super) fn pattern(mut self, layer: &str, region: Region) -> Self {
        let layer = self.stackup.find(layer).unwrap();
        self.artwork.patterns.push(Pattern { layer, region });
        self
    }

    pub(super) fn opening(mut self, layer: &str, region: Region) -> Self {
        let layer = self.stackup.find(layer).unwrap();
        self.artwork.openings.push(Pattern { layer, region });
        self
    }

    pub(super) fn profile(mut self, region: Region) -> Self {
        self.artwork.profile = Some(region);
        self
    }

    pub(super) fn rows(mut self, names: &[&str]) -> Self {
        self.job.nets.rows = Some(names.iter().map(|n| named(n)).collect());
        self
    }

    pub(super) fn ground(mut self, names: &[&str]) -> Self {
        self.job.nets.ground = names.iter().map(|n| named(n)).collect();
        self
    }

    pub(super) fn float(mut self, name: &str, charge: f64) -> Self {
        self.job.nets.floating.push(FloatingNet { net: named(name), charge });
        self
    }

    pub(super) fn join(mut self, names: &[&str]) -> Self {
        self.job.nets.join.push(names.iter().map(|n| named(n)).collect());
        self
    }

    pub(super) fn planes(mut self, names: &[&str]) -> Self {
        self.job.nets.ground_planes = names.iter().map(|n| named(n)).collect();
        self
    }

    pub(super) fn region(mut self, region: RegionChoice) -> Self {
        self.job.region = region;
        self
    }

    pub(super) fn slabs(&self) -> Result<chargeskin::diag::Warned<SlabModel>, SlabErrors> {
        chargeskin::slab::build(&self.artwork, &self.stackup, &self.job, &self.options)
    }

    /// Model and faces of a board that must be good, without warnings.
    #[track_caller]
    pub(super) fn build(&self) -> (SlabModel, Faces) {
        let (model, faces, warnings) = self.build_warned();
        assert_eq!(warnings, Vec::<String>::new());
        (model, faces)
    }

    #[track_caller]
    pub(super) fn build_warned(&self) -> (SlabModel, Faces, Vec<String>) {
        let warned = self.slabs().unwrap_or_else(|e| panic!("{e:?}"));
        let faces = chargeskin::faces::derive(&warned.value).unwrap_or_else(|e| panic!("{e}"));
        let warnings = warned.warnings.into_iter().map(|w| w.text).collect();
        (warned.value, faces.value, warnings)
    }
}

/// Vector area of a face by its corners.
fn vector_area(face: &Face) -> Vec3 {
    face.rings.iter().fold(Vec3::zeros(), |sum, ring| {
        let p = &ring.points;
        (1..p.len() - 1).fold(sum, |sum, k| sum + 0.5 * (p[k] - p[0]).cross(&(p[k + 1] - p[0])))
    })
}

pub(super) fn area(face: &Face) -> f64 {
    vector_area(face).dot(&face.normal)
}

/// Solid angle of a face from `at`, positive where the normal points away from it.
fn solid_angle(face: &Face, at: Vec3) -> f64 {
    let mut sum = 0.0;
    for ring in &face.rings {
        let p: Vec<Vec3> = ring.points.iter().map(|q| (q - at).normalize()).collect();
        for k in 1..p.len() - 1 {
            let (a, b, c) = (p[0], p[k], p[k + 1]);
            // Formula of van Oosterom and Strackee: tan(angle / 2) of a triangle of unit vectors.
            let numerator = a.dot(&b.cross(&c));
            sum += 2.0 * numerator.atan2(1.0 + a.dot(&b) + b.dot(&c) + c.dot(&a));
        }
    }
    sum
}

/// What a set of oriented faces encloses.
#[derive(Debug, Clone, Copy)]
pub(super) struct Enclosed {
    pub(super) vector: Vec3,
    pub(super) area: f64,
    pub(super) volume: f64,
}

fn weigh<'a>(faces: impl Iterator<Item = (&'a Face, f64)>) -> Enclosed {
    let mut sum = Enclosed { vector: Vec3::zeros(), area: 0.0, volume: 0.0 };
    for (face, sign) in faces {
        let vector = vector_area(face);
        assert!(vector.norm() > 0.0 && area(face) > 0.0, "a face turned the wrong way: {face:?}");
        sum.vector += sign * vector;
        sum.area += area(face);
        // Divergence theorem: on a flat face r . n is constant.
        sum.volume += sign * face.rings[0].points[0].dot(&vector) / 3.0;
    }
    sum
}

pub(super) fn net_id(faces: &Faces, net: &str) -> NetId {
    let k = faces.nets.iter().position(|n| n.name == net).unwrap_or_else(|| panic!("no net {net}"));
    NetId(k as u32)
}

/// The solid faces of a net.
pub(super) fn conductor_faces<'a>(faces: &'a Faces, net: &str) -> impl Iterator<Item = &'a Face> {
    let id = net_id(faces, net);
    faces.faces.iter().filter(move |f| matches!(f.kind, FaceKind::Conductor { net, .. } if net == id))
}

pub(super) fn metal(faces: &Faces, net: &str) -> Enclosed {
    weigh(conductor_faces(faces, net).map(|f| (f, 1.0)))
}

pub(super) fn solid_angle_of_net(faces: &Faces, net: &str, at_um: [f64; 3]) -> f64 {
    let at = Vec3::from(at_um) * 1e-6;
    conductor_faces(faces, net).map(|f| solid_angle(f, at)).sum()
}

/// Sign with which a face bounds `body`, outwards positive.
fn bounds_body(face: &Face, id: BodyId) -> f64 {
    let one = |yes: bool| if yes { 1.0 } else { 0.0 };
    match face.kind {
        FaceKind::Conductor { body, .. } => -one(body == id),
        FaceKind::Interface { from, to } => one(from == id) - one(to == id),
        FaceKind::Sheet { below, above, .. } => one(below == id) - one(above == id),
    }
}

pub(super) fn body(faces: &Faces, id: BodyId) -> Enclosed {
    weigh(faces.faces.iter().map(|f| (f, bounds_body(f, id))).filter(|(_, sign)| sign.abs() > 0.0))
}

pub(super) fn body_named(faces: &Faces, name: &str) -> BodyId {
    let k = faces.bodies.iter().position(|b| b.name.split('+').any(|part| part == name));
    BodyId(k.unwrap_or_else(|| panic!("no body {name}: {:?}", faces.bodies)) as u32)
}

/// Checks that a surface is closed: the vector area is zero to the rounding of `n` sums of the area.
#[track_caller]
pub(super) fn assert_closed(what: &str, sum: &Enclosed, n: usize) {
    let bound = 8.0 * f64::EPSILON * (n as f64) * sum.area;
    assert!(sum.vector.norm() <= bound, "{what}: vector area {:?} of area {}", sum.vector, sum.area);
}

/// Checks that every conductor and every finite body of `faces` is closed.
#[track_caller]
pub(super) fn assert_all_closed(faces: &Faces) {
    let n = faces.faces.len();
    for net in &faces.nets {
        assert_closed(&net.name, &metal(faces, &net.name), n);
    }
    for (k, finite) in faces.bodies.iter().enumerate() {
        if finite.finite {
            assert_closed(&finite.name, &body(faces, BodyId(k as u32)), n);
        }
    }
}

#[track_caller]
pub(super) fn assert_close(found: f64, expected: f64, relative: f64) {
    assert!((found - expected).abs() <= relative * expected.abs(), "found {found}, expected {expected}");
}
