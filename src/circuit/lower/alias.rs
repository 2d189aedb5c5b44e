//! `let a = q[0:3] ++ r;`

use std::collections::HashSet;
use std::rc::Rc;

use super::scope::{Entity, Kind, Places};
use super::{Lowered, Lowering};
use crate::circuit::ast::{Name, Operand};
use crate::circuit::diagnostic::Diagnostic;

impl<'a> Lowering<'a> {
    pub(super) fn alias(&mut self, name: Name<'a>, parts: &[Operand<'a>]) -> Lowered<()> {
        let mut kind = None;
        let mut items = Vec::new();
        let mut single = parts.len() == 1;
        for part in parts {
            let found = match self.lookup(part.name)? {
                Entity::Register { kind, .. } => kind,
                entity => {
                    return Err(Diagnostic::error(
                        part.span,
                        format!(
                            "an alias is made of qubits or bits, but `{}` is {}",
                            part.name.text,
                            entity.kind()
                        ),
                    )
                    .into());
                }
            };
            if *kind.get_or_insert(found) != found {
                return Err(Diagnostic::error(
                    part.span,
                    "an alias is made of qubits or of bits, not of both",
                )
                .into());
            }
            let selected = self.select(part, found)?;
            single &= selected.single;
            items.extend(selected.items);
            // Nothing may come twice, so this bounds the length too.
            if items.len() > crate::circuit::limits::MAX_BITS {
                return Err(twice(part).into());
            }
        }
        let distinct: HashSet<u32> = items.iter().copied().collect();
        if distinct.len() < items.len() {
            return Err(twice(parts.last().unwrap_or(&parts[0])).into());
        }
        let bytes = (items.len() * size_of::<u32>()) as u64;
        self.budget.step(items.len() as u64, name.span)?;
        self.budget.hold(bytes, name.span)?;
        if let Some(scope) = self.scopes.last_mut() {
            scope.bytes += bytes;
        }
        let entity = Entity::Register {
            kind: kind.unwrap_or(Kind::Qubits),
            places: Places::List(Rc::from(items)),
            single,
        };
        self.declare(name, entity)
    }
}

fn twice(part: &Operand<'_>) -> Diagnostic {
    Diagnostic::error(part.span, "an alias in which a qubit or bit comes twice")
}
