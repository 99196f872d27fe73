//! Names and what they stand for, scope by scope.

use super::bind::Bound;
use crate::netlist::{BlockId, InstanceId, ParamId, SignalId};
use crate::source::Span;
use rustc_hash::FxHashMap;
use std::borrow::Cow;
use std::sync::Arc;
use unicode_normalization::{IsNormalized, UnicodeNormalization, is_nfc_quick};

/// A name's number: equal numbers, equal names in NFC.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub(super) struct Sym(pub u32);

/// Numbers for names.
#[derive(Debug, Default)]
pub(super) struct Symbols {
    numbers: FxHashMap<Arc<str>, Sym>,
    names: Vec<Arc<str>>,
}

/// A name in NFC; names of plain letters are so already.
pub(super) fn normal(name: &str) -> Cow<'_, str> {
    if name.is_ascii() || is_nfc_quick(name.chars()) == IsNormalized::Yes {
        Cow::Borrowed(name)
    } else {
        Cow::Owned(name.nfc().collect())
    }
}

impl Symbols {
    /// The number of a name, a new one at its first appearance.
    pub(super) fn intern(&mut self, name: &str) -> Sym {
        let name = normal(name);
        if let Some(&sym) = self.numbers.get(name.as_ref()) {
            return sym;
        }
        let sym = Sym(self.numbers.len() as u32);
        let name: Arc<str> = name.into();
        self.names.push(name.clone());
        self.numbers.insert(name, sym);
        sym
    }

    /// The name with this number.
    pub(super) fn name(&self, sym: Sym) -> &str {
        &self.names[sym.0 as usize]
    }
}

/// A scope's number: 0 is the file, each instance of a composite has one.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) struct ScopeId(pub u32);

/// What a name stands for in its scope.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Entity {
    /// A signal, or a port that is another name for one.
    Signal(SignalId),
    /// A block with a law.
    Block(BlockId),
    /// An instance of a composite.
    Instance(InstanceId, ScopeId),
    /// A param.
    Param(ParamId),
    /// An argument of a composite that has s in it; its place in the writer's list.
    Law(u32),
}

/// One scope.
#[derive(Debug)]
pub(super) struct Scope {
    /// What its names begin with: empty, or `az.`
    pub prefix: String,
    /// The instance that it is the inside of.
    pub instance: Option<InstanceId>,
    /// How many instances it stands in.
    pub depth: usize,
    /// Its own names in their order, for suggestions.
    pub names: Vec<(Sym, Span)>,
}

/// All scopes with their names.
#[derive(Debug, Default)]
pub(super) struct Scopes {
    /// By number.
    pub list: Vec<Scope>,
    entities: FxHashMap<(ScopeId, Sym), Entity>,
    blocks: FxHashMap<BlockId, ScopeId>,
}

impl Scopes {
    /// Opens a scope.
    pub(super) fn open(&mut self, prefix: String, instance: Option<InstanceId>, depth: usize) -> ScopeId {
        self.list.push(Scope { prefix, instance, depth, names: Vec::new() });
        ScopeId(self.list.len() as u32 - 1)
    }

    /// What a name stands for.
    pub(super) fn get(&self, scope: ScopeId, name: Sym) -> Option<Entity> {
        self.entities.get(&(scope, name)).copied()
    }

    /// Gives a name its meaning; the caller has seen that it has none yet.
    pub(super) fn put(&mut self, scope: ScopeId, name: Sym, entity: Entity, place: Span) {
        self.entities.insert((scope, name), entity);
        self.list[scope.0 as usize].names.push((name, place));
    }

    /// The scope of a block's states and helper lines, opened at the first call.
    pub(super) fn inside(
        &mut self,
        block: BlockId,
        prefix: String,
        instance: Option<InstanceId>,
        depth: usize,
    ) -> ScopeId {
        if let Some(&scope) = self.blocks.get(&block) {
            return scope;
        }
        let scope = self.open(prefix, instance, depth);
        self.blocks.insert(block, scope);
        scope
    }

    /// The scope of a block's states, if it has any.
    pub(super) fn inside_of(&self, block: BlockId) -> Option<ScopeId> {
        self.blocks.get(&block).copied()
    }
}

/// The index values around a statement: a list from the innermost outwards.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct EnvId(pub u32);

impl EnvId {
    /// No index.
    pub(super) const EMPTY: Self = Self(u32::MAX);
}

/// One index with its value.
#[derive(Clone, Copy, Debug)]
struct Index {
    outer: EnvId,
    name: Sym,
    value: i64,
}

/// All index values.
#[derive(Debug, Default)]
pub(super) struct Indices {
    list: Vec<Index>,
}

impl Indices {
    /// The values of `outer` and one more.
    pub(super) fn with(&mut self, outer: EnvId, name: Sym, value: i64) -> EnvId {
        self.list.push(Index { outer, name, value });
        EnvId(self.list.len() as u32 - 1)
    }

    /// The value of an index, the innermost of that name.
    pub(super) fn get(&self, mut env: EnvId, name: Sym) -> Option<i64> {
        while env != EnvId::EMPTY {
            let index = self.list[env.0 as usize];
            if index.name == name {
                return Some(index.value);
            }
            env = index.outer;
        }
        None
    }

    /// How many are kept; [`Self::forget`] takes those made since away.
    pub(super) fn mark(&self) -> usize {
        self.list.len()
    }

    /// Takes away what was made since a mark.
    pub(super) fn forget(&mut self, mark: usize) {
        self.list.truncate(mark);
    }
}

/// The arguments of a defined law while its body is bound.
#[derive(Debug, Default)]
pub(super) struct Frame {
    /// Name and value of each.
    pub arguments: Vec<(Sym, Bound)>,
    /// How many calls it stands in.
    pub depth: usize,
}
