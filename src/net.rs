//! Nets: conductors held at one potential, their names and their parts in an extraction.

use crate::diag::Origin;

/// Index of a net in its table. Each handover type carries the table that its ids point into.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct NetId(pub u32);

impl NetId {
    /// The id as a table index.
    #[must_use]
    pub fn idx(self) -> usize {
        self.0 as usize
    }
}

/// How a net got its name.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum NameSource {
    /// Written in the artwork, the netlist or the job.
    Given,
    /// An island of copper without a name, numbered by us.
    Numbered,
}

/// A net as the artwork names it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Net {
    /// Unique in its table.
    pub name: String,
    /// Whether the name was given or made.
    pub source: NameSource,
    /// Where the name, or else the copper, was first met.
    pub origin: Origin,
}

/// Every net of the artwork; `NetId(k)` is entry `k`.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct NetTable {
    nets: Vec<Net>,
}

impl NetTable {
    /// The id of the net called `name`, added with `source` and `origin` when it is new.
    pub fn intern(&mut self, name: &str, source: NameSource, origin: Origin) -> NetId {
        if let Some(found) = self.find(name) {
            return found;
        }
        self.nets.push(Net { name: name.to_owned(), source, origin });
        NetId(u32::try_from(self.nets.len() - 1).unwrap_or(u32::MAX))
    }

    /// The id of the net called `name`.
    #[must_use]
    pub fn find(&self, name: &str) -> Option<NetId> {
        self.nets.iter().position(|net| net.name == name).and_then(|k| u32::try_from(k).ok()).map(NetId)
    }

    /// The net `id`.
    ///
    /// # Panics
    /// When `id` came from another table.
    #[must_use]
    #[track_caller]
    pub fn get(&self, id: NetId) -> &Net {
        &self.nets[id.idx()]
    }

    /// Every net with its id, in id order.
    pub fn iter(&self) -> impl Iterator<Item = (NetId, &Net)> {
        (0u32..).map(NetId).zip(&self.nets)
    }

    /// How many nets there are.
    #[must_use]
    pub fn len(&self) -> usize {
        self.nets.len()
    }

    /// Whether there is none.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.nets.is_empty()
    }
}

/// What a net does in the extraction.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Role {
    /// Has a row of its own in the Maxwell matrix.
    Row,
    /// Held at 0 V; its charge is listed among the neighbours.
    Ground,
    /// Takes the potential at which its net free charge is `charge`, in C.
    Float {
        /// Net free charge, C.
        charge: f64,
    },
}

/// A net of the model: joins are done, the role is settled.
#[derive(Debug, Clone, PartialEq)]
pub struct ModelNet {
    /// Unique in the model.
    pub name: String,
    /// Whether the name was given or made.
    pub source: NameSource,
    /// Its part in the extraction.
    pub role: Role,
    /// Whether the border of the region cuts its copper.
    pub cut: bool,
    /// Where it was first met.
    pub origin: Origin,
}
