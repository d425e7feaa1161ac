//! A small extraction with one of everything, for the tests of the reports. Its numbers are made up.

use crate::diag::{Origin, Warning};
use crate::extract::{Bars, DefaultedNets, Dielectric, Extraction, MeshCount, SolverReport};
use crate::faces::{FaceGroup, GroupId, GroupKind};
use crate::job::Accuracy;
use crate::net::{ModelNet, NameSource, NetId, Role};
use crate::results::{Check, CheckKind, CheckOutcome, GroupCharge, Results};
use faer::{Mat, mat};

fn net(name: &str, role: Role, cut: bool) -> ModelNet {
    ModelNet { name: name.to_owned(), source: NameSource::Given, role, cut, origin: Origin::default() }
}

fn results() -> Results {
    Results {
        rows: vec![NetId(0), NetId(1)],
        maxwell: mat![[3e-12, -1.0004e-12], [-1.0006e-12, 2.5e-12]],
        net_charge: mat![[3e-12, -1.0004e-12], [-1.0006e-12, 2.5e-12], [-1.5e-12, -1.1e-12], [0.0, 0.0]],
        net_potential: mat![[1.0, 0.0], [0.0, 1.0], [0.0, 0.0], [0.2, 0.3]],
        idle_charge: vec![0.0, 0.0, -2e-12, 2e-12],
        groups: vec![
            GroupCharge {
                group: GroupId(0),
                area: 2e-6,
                free: vec![3e-12, -1e-12],
                bound: vec![-2e-12, 0.7e-12],
                tail: None,
            },
            GroupCharge {
                group: GroupId(1),
                area: 4e-5,
                free: vec![0.0, 0.0],
                bound: vec![-0.5e-12, 0.0],
                tail: Some(vec![-0.01e-12, 0.0]),
            },
        ],
        checks: vec![
            Check {
                kind: CheckKind::Reciprocity,
                outcome: CheckOutcome::Made { value: 2e-4, threshold: 1e-2 },
            },
            Check {
                kind: CheckKind::Neutrality,
                outcome: CheckOutcome::NotApplicable("the model has no finite body".to_owned()),
            },
        ],
    }
}

/// Two rows, a ground net, a floating piece, one open interface.
pub(crate) fn extraction() -> Extraction {
    let interface = GroupKind::Interface { from: "core".to_owned(), to: "above".to_owned() };
    Extraction {
        title: "Two tracks".to_owned(),
        nets: vec![
            net("A", Role::Row, false),
            net("B", Role::Row, true),
            net("GND", Role::Ground, true),
            net("SHIELD", Role::Float { charge: 2e-12 }, false),
        ],
        reference: vec!["GND".to_owned(), "bottom".to_owned(), "infinity".to_owned()],
        results: results(),
        bars: Bars {
            maxwell: mat![[2e-14, 5e-15], [5e-15, 1.3e-14]],
            net_charge: Mat::from_fn(4, 2, |_, _| 1e-14),
            to_reference: vec![2e-14, 2e-14],
            group_free: vec![vec![2e-14, 2e-14], vec![0.0, 0.0]],
            group_bound: vec![vec![2e-14, 2e-14], vec![3e-14, 3e-14]],
        },
        groups: vec![
            FaceGroup { kind: GroupKind::Conductor { net: NetId(0), layer: "top".to_owned() }, open: false },
            FaceGroup { kind: interface, open: true },
        ],
        dielectrics: vec![Dielectric { name: "core".to_owned(), er: 4.4, source: "stackup".to_owned() }],
        mesh: MeshCount { panels: 900, conductor_panels: 600, interface_panels: 300, levels: 3 },
        solver: SolverReport {
            method: "dense LU".to_owned(),
            relative_residual: 3e-15,
            seconds: vec![("assemble".to_owned(), 0.25), ("solve".to_owned(), 1.0)],
            peak_memory: Some(123_000_000),
        },
        target_met: true,
        accuracy: Accuracy::default(),
        quasi_static_limit: 1.234e9,
        frequency: Some(1e6),
        defaulted: DefaultedNets { grounded: 0, floating: 1 },
        warnings: vec![Warning::new("a made-up warning", Origin::default())],
    }
}
