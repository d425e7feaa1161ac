//! Joins and roles: which nets of the artwork are one net of the model, and what each does.

use crate::artwork::Artwork;
use crate::job::{Job, Named, Others};
use crate::net::{ModelNet, NameSource, NetId, NetTable, Role};
use crate::slab::error::SlabError;

/// What the job's lists say about each net of the artwork.
#[derive(Debug, Clone)]
pub(crate) struct NetPlan {
    /// By net of the artwork: the net that stands for its join.
    pub(crate) stands_for: Vec<NetId>,
    /// By representative: name in the model.
    names: Vec<String>,
    /// By representative: the list that it is in, and its place there.
    listed: Vec<Option<Listed>>,
    /// Whether the job lists the rows.
    rows_listed: bool,
    /// What named nets outside every list do.
    others: Others,
}

#[derive(Debug, Clone, Copy, PartialEq)]
struct Listed {
    key: &'static str,
    order: usize,
    charge: f64,
    named: crate::diag::Origin,
}

/// How much of a net lies in the region.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(crate) struct Presence {
    /// Whether any of it is in the window.
    pub(crate) inside: bool,
    /// Whether any of it is outside.
    pub(crate) outside: bool,
}

/// Reads the lists of `job`; problems go to `errors`.
pub(crate) fn plan(artwork: &Artwork, job: &Job, errors: &mut Vec<SlabError>) -> NetPlan {
    let table = &artwork.nets;
    let mut stands_for: Vec<NetId> = table.iter().map(|(id, _)| id).collect();
    for group in &job.nets.join {
        let members: Vec<NetId> = group.iter().filter_map(|n| find(table, n, "join", errors)).collect();
        let Some(first) = members.first().map(|net| stands_for[net.idx()]) else { continue };
        for member in members {
            let old = stands_for[member.idx()];
            stands_for.iter_mut().filter(|net| **net == old).for_each(|net| *net = first);
        }
    }
    let mut names: Vec<String> = table.iter().map(|(_, net)| net.name.clone()).collect();
    for (id, _) in table.iter().filter(|(id, _)| stands_for[id.idx()] == *id) {
        let members = table.iter().filter(|(other, _)| stands_for[other.idx()] == id);
        names[id.idx()] = members.map(|(_, net)| net.name.as_str()).collect::<Vec<_>>().join("+");
    }
    let mut plan = NetPlan {
        stands_for,
        names,
        listed: vec![None; table.len()],
        rows_listed: job.nets.rows.is_some(),
        others: job.nets.others,
    };
    let rows = job.nets.rows.iter().flatten().map(|named| ("rows", named, 0.0));
    let ground = job.nets.ground.iter().map(|named| ("ground", named, 0.0));
    let float = job.nets.floating.iter().map(|float| ("float", &float.net, float.charge));
    for (order, (key, named, charge)) in rows.chain(ground).chain(float).enumerate() {
        let Some(net) = find(table, named, key, errors) else { continue };
        let entry = &mut plan.listed[plan.stands_for[net.idx()].idx()];
        match entry {
            Some(old) if old.key != key => errors.push(SlabError::TwoRoles {
                name: named.name.clone(),
                first: old.key,
                second: key,
                origin: named.origin,
            }),
            Some(_) => {}
            None => *entry = Some(Listed { key, order, charge, named: named.origin }),
        }
    }
    plan
}

/// The net of the artwork that `named` means.
pub(crate) fn find(
    table: &NetTable,
    named: &Named,
    key: &'static str,
    errors: &mut Vec<SlabError>,
) -> Option<NetId> {
    let found = table.find(&named.name);
    if found.is_none() {
        let mut near: Vec<(f64, &str)> = table
            .iter()
            .map(|(_, net)| {
                (strsim::jaro_winkler(&net.name.to_lowercase(), &named.name.to_lowercase()), &*net.name)
            })
            .collect();
        near.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(b.1)));
        let nearest = near.iter().take(3).map(|(_, name)| (*name).to_owned()).collect();
        errors.push(SlabError::UnknownNet { key, name: named.name.clone(), nearest, origin: named.origin });
    }
    found
}

impl NetPlan {
    /// The role of the net that stands for `net`, whatever the region holds.
    pub(crate) fn role(&self, net: NetId, table: &NetTable) -> Role {
        let head = self.stands_for[net.idx()];
        let named =
            table.iter().any(|(id, n)| self.stands_for[id.idx()] == head && n.source == NameSource::Given);
        match self.listed[head.idx()] {
            Some(Listed { key: "rows", .. }) => Role::Row,
            Some(Listed { key: "float", charge, .. }) => Role::Float { charge },
            Some(_) => Role::Ground,
            None if !named => Role::Float { charge: 0.0 },
            None if !self.rows_listed => Role::Row,
            None => match self.others {
                Others::Ground => Role::Ground,
                Others::Float => Role::Float { charge: 0.0 },
                Others::Rows => Role::Row,
            },
        }
    }

    /// The nets of the model, rows first in the order listed, then the rest in the artwork's order; and for each net
    /// of the artwork, which of them it is. `presence` is by representative.
    pub(crate) fn settle(
        &self,
        table: &NetTable,
        presence: &[Presence],
        errors: &mut Vec<SlabError>,
    ) -> (Vec<ModelNet>, Vec<Option<NetId>>) {
        let mut heads: Vec<NetId> = table
            .iter()
            .map(|(id, _)| id)
            .filter(|id| self.stands_for[id.idx()] == *id && presence[id.idx()].inside)
            .collect();
        for (id, _) in table.iter() {
            let Some(listed) = self.listed[id.idx()] else { continue };
            if listed.key == "rows" && self.stands_for[id.idx()] == id && !presence[id.idx()].inside {
                let name = self.names[id.idx()].clone();
                errors.push(SlabError::RowOutside { name, origin: listed.named });
            }
        }
        let rank = |id: &NetId| {
            let is_row = self.role(*id, table) == Role::Row;
            let order = self.listed[id.idx()].map_or(usize::MAX, |listed| listed.order);
            (!is_row, if is_row { order } else { 0 }, *id)
        };
        heads.sort_by_key(rank);
        let mut model_id = vec![None; table.len()];
        let mut nets = Vec::with_capacity(heads.len());
        for head in heads {
            let id = NetId(u32::try_from(nets.len()).unwrap_or(u32::MAX));
            let members = || table.iter().filter(|(other, _)| self.stands_for[other.idx()] == head);
            members().for_each(|(other, _)| model_id[other.idx()] = Some(id));
            let given = members().any(|(_, net)| net.source == NameSource::Given);
            let role = self.role(head, table);
            nets.push(ModelNet {
                name: self.names[head.idx()].clone(),
                source: if given { NameSource::Given } else { NameSource::Numbered },
                role,
                cut: role != Role::Ground && presence[head.idx()].outside,
                origin: table.get(head).origin,
            });
        }
        if errors.is_empty() && !nets.iter().any(|net| net.role == Role::Row) {
            let named = nets.iter().filter(|net| net.source == NameSource::Given).count();
            errors.push(SlabError::NoRows { named });
        }
        (nets, model_id)
    }
}
