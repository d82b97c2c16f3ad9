//! The parser's events turned into a tree.

use std::cell::{Cell, RefCell};
use std::fmt;

use serde::de::{DeserializeSeed, Deserializer, EnumAccess, Error, MapAccess, SeqAccess, Visitor};

use super::{Key, Node, Value};

/// Most parts of a tree: a few aliases can blow a short text up to any size.
const MOST_NODES: usize = 2_000_000;

/// What we ourselves refuse while the parser runs.
#[derive(Debug)]
pub(super) enum Problem {
    TooManyNodes,
    Tag,
}

/// One reading of a text: numbers its parts, and fails at one of them where its place is wanted.
#[derive(Debug, Default)]
pub(super) struct Reading {
    count: Cell<usize>,
    /// The part to fail at.
    stop_at: Option<usize>,
    pub(super) problem: RefCell<Option<Problem>>,
}

impl Reading {
    /// A reading that fails at the part with this number.
    pub(super) fn stopping_at(id: usize) -> Self {
        Self {
            stop_at: Some(id),
            ..Self::default()
        }
    }

    pub(super) fn read(&self, text: &str) -> Result<Node, serde_yaml::Error> {
        NodeSeed(self).deserialize(serde_yaml::Deserializer::from_str(text))
    }

    /// Takes the next number. Only called where the parser can say the place of an error.
    fn next_id<E: Error>(&self) -> Result<usize, E> {
        let id = self.count.get();
        self.count.set(id + 1);
        if self.stop_at == Some(id) {
            return Err(E::custom("found"));
        }
        if id >= MOST_NODES {
            return Err(self.refuse(Problem::TooManyNodes));
        }
        Ok(id)
    }

    fn refuse<E: Error>(&self, problem: Problem) -> E {
        self.problem.replace(Some(problem));
        E::custom("refused")
    }

    fn node<E: Error>(&self, value: Value) -> Result<Node, E> {
        Ok(Node {
            id: self.next_id()?,
            value,
        })
    }
}

#[derive(Clone, Copy)]
struct NodeSeed<'r>(&'r Reading);

impl<'de> DeserializeSeed<'de> for NodeSeed<'_> {
    type Value = Node;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Node, D::Error> {
        deserializer.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for NodeSeed<'_> {
    type Value = Node;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a value")
    }

    fn visit_unit<E: Error>(self) -> Result<Node, E> {
        self.0.node(Value::Null)
    }

    fn visit_none<E: Error>(self) -> Result<Node, E> {
        self.visit_unit()
    }

    fn visit_bool<E: Error>(self, value: bool) -> Result<Node, E> {
        self.0.node(Value::Bool(value))
    }

    fn visit_i64<E: Error>(self, value: i64) -> Result<Node, E> {
        self.visit_i128(value.into())
    }

    fn visit_u64<E: Error>(self, value: u64) -> Result<Node, E> {
        self.visit_i128(value.into())
    }

    fn visit_i128<E: Error>(self, value: i128) -> Result<Node, E> {
        self.0.node(Value::Integer(value))
    }

    fn visit_u128<E: Error>(self, value: u128) -> Result<Node, E> {
        self.visit_f64(value as f64)
    }

    fn visit_f64<E: Error>(self, value: f64) -> Result<Node, E> {
        self.0.node(Value::Float(value))
    }

    fn visit_str<E: Error>(self, value: &str) -> Result<Node, E> {
        self.0.node(Value::Text(value.to_owned()))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<Node, A::Error> {
        let id = self.0.next_id()?;
        let mut list = Vec::new();
        while let Some(item) = items.next_element_seed(self)? {
            list.push(item);
        }
        Ok(Node {
            id,
            value: Value::List(list),
        })
    }

    fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<Node, A::Error> {
        let id = self.0.next_id()?;
        let mut map = Vec::new();
        while let Some(key) = entries.next_key_seed(KeySeed(self.0))? {
            map.push((key, entries.next_value_seed(self)?));
        }
        Ok(Node {
            id,
            value: Value::Map(map),
        })
    }

    fn visit_enum<A: EnumAccess<'de>>(self, _: A) -> Result<Node, A::Error> {
        Err(self.0.refuse(Problem::Tag))
    }
}

struct KeySeed<'r>(&'r Reading);

impl<'de> DeserializeSeed<'de> for KeySeed<'_> {
    type Value = Key;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Key, D::Error> {
        deserializer.deserialize_str(self)
    }
}

impl Visitor<'_> for KeySeed<'_> {
    type Value = Key;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a plain word as the key")
    }

    fn visit_str<E: Error>(self, text: &str) -> Result<Key, E> {
        let id = self.0.next_id()?;
        Ok(Key {
            id,
            text: text.to_owned(),
        })
    }
}
