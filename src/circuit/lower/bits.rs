//! Formulas over measured bits, simplified as they are built.
//!
//! Parities and conjunctions are kept flat, and a negation inside a parity
//! moves to its front, so that the depth of a formula is bounded by the nesting
//! of the source text, and a check that is a parity stays recognisable as one.

use crate::circuit::BitExpression;
use crate::circuit::limits::MAX_ORDERED_WIDTH;

use BitExpression::{And, Constant, Not, Or, Xor};

/// ¬a
pub fn not(a: BitExpression) -> BitExpression {
    match a {
        Constant(value) => Constant(!value),
        Not(inner) => *inner,
        other => Not(Box::new(other)),
    }
}

/// a ⊕ b
pub fn xor(a: BitExpression, b: BitExpression) -> BitExpression {
    let (a, negate_a) = without_not(a);
    let (b, negate_b) = without_not(b);
    let negate = negate_a != negate_b;
    let sum = match (a, b) {
        (Constant(value), other) | (other, Constant(value)) => {
            return if value != negate { not(other) } else { other };
        }
        (Xor(mut left), Xor(right)) => {
            left.extend(right);
            Xor(left)
        }
        (Xor(mut left), right) => {
            left.push(right);
            Xor(left)
        }
        (left, Xor(mut right)) => {
            right.insert(0, left);
            Xor(right)
        }
        (left, right) => Xor(vec![left, right]),
    };
    if negate { not(sum) } else { sum }
}

fn without_not(a: BitExpression) -> (BitExpression, bool) {
    match a {
        Not(inner) => (*inner, true),
        other => (other, false),
    }
}

/// a ∧ b
pub fn and(a: BitExpression, b: BitExpression) -> BitExpression {
    match (a, b) {
        (Constant(false), _) | (_, Constant(false)) => Constant(false),
        (Constant(true), other) | (other, Constant(true)) => other,
        (And(mut left), And(right)) => {
            left.extend(right);
            And(left)
        }
        (And(mut left), right) => {
            left.push(right);
            And(left)
        }
        (left, And(mut right)) => {
            right.insert(0, left);
            And(right)
        }
        (left, right) => And(vec![left, right]),
    }
}

/// a ∨ b
pub fn or(a: BitExpression, b: BitExpression) -> BitExpression {
    match (a, b) {
        (Constant(true), _) | (_, Constant(true)) => Constant(true),
        (Constant(false), other) | (other, Constant(false)) => other,
        (Or(mut left), Or(right)) => {
            left.extend(right);
            Or(left)
        }
        (Or(mut left), right) => {
            left.push(right);
            Or(left)
        }
        (left, Or(mut right)) => {
            right.insert(0, left);
            Or(right)
        }
        (left, right) => Or(vec![left, right]),
    }
}

/// Whether two registers of the same width agree.
pub fn equal(a: Vec<BitExpression>, b: Vec<BitExpression>) -> BitExpression {
    a.into_iter()
        .zip(b)
        .fold(Constant(true), |all, (x, y)| and(all, not(xor(x, y))))
}

/// Whether a register, bit 0 least significant, is less than a number that it
/// can hold: from the least significant bit on, `less` of the bits so far is
/// ¬bit ∨ less where the number has a 1, and ¬bit ∧ less where it has a 0.
pub fn less(register: Vec<BitExpression>, number: u128) -> Result<BitExpression, String> {
    if register.len() > MAX_ORDERED_WIDTH {
        return Err(format!(
            "a register of {} bits cannot be ordered against a number, only one of up to \
             {MAX_ORDERED_WIDTH}",
            register.len()
        ));
    }
    let steps = register.into_iter().enumerate();
    Ok(steps.fold(Constant(false), |less, (position, bit)| {
        if number >> position & 1 == 1 {
            or(not(bit), less)
        } else {
            and(not(bit), less)
        }
    }))
}

/// Bits of a number, bit 0 first, if `width` bits can hold it.
pub fn of_number(number: i128, width: usize) -> Option<Vec<BitExpression>> {
    let number = u128::try_from(number).ok()?;
    let fits = width >= 128 || number >> width == 0;
    let bit = |position: usize| position < 128 && number >> position & 1 == 1;
    fits.then(|| (0..width).map(|position| Constant(bit(position))).collect())
}

/// Number of nodes of a formula.
pub fn size(a: &BitExpression) -> u64 {
    match a {
        Constant(_) | BitExpression::Bit(_) => 1,
        Not(inner) => 1 + size(inner),
        Xor(parts) | And(parts) | Or(parts) => 1 + parts.iter().map(size).sum::<u64>(),
    }
}

/// Calls `visit` with every bit that the formula reads.
pub fn reads(a: &BitExpression, visit: &mut impl FnMut(u32)) {
    match a {
        Constant(_) => {}
        BitExpression::Bit(bit) => visit(*bit),
        Not(inner) => reads(inner, visit),
        Xor(parts) | And(parts) | Or(parts) => parts.iter().for_each(|part| reads(part, visit)),
    }
}

/// Changes every bit that the formula reads.
pub fn renumber(a: &mut BitExpression, change: &impl Fn(u32) -> u32) {
    match a {
        Constant(_) => {}
        BitExpression::Bit(bit) => *bit = change(*bit),
        Not(inner) => renumber(inner, change),
        Xor(parts) | And(parts) | Or(parts) => {
            parts.iter_mut().for_each(|part| renumber(part, change));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn register(width: u32) -> Vec<BitExpression> {
        (0..width).map(BitExpression::Bit).collect()
    }

    #[test]
    fn order_is_that_of_numbers() {
        for number in 0..16u128 {
            let formula = less(register(4), number).unwrap();
            for value in 0..16u128 {
                let found = formula.evaluate(&|bit| value >> bit & 1 == 1);
                assert_eq!(found, value < number, "{value} < {number}");
            }
        }
        assert!(less(register(65), 0).is_err());
    }

    #[test]
    fn parities_stay_flat() {
        let bit = BitExpression::Bit;
        let sum = xor(not(xor(bit(0), bit(1))), xor(bit(2), not(not(bit(3)))));
        assert_eq!(sum, not(Xor(vec![bit(0), bit(1), bit(2), bit(3)])));
        assert_eq!(xor(Constant(true), bit(0)), not(bit(0)));
        assert_eq!(xor(not(bit(0)), Constant(true)), bit(0));
        assert_eq!(xor(Constant(true), Constant(true)), Constant(false));
    }

    #[test]
    fn simplified_formulas_keep_their_value() {
        let leaves = || {
            let bit = BitExpression::Bit;
            [
                Constant(false),
                Constant(true),
                bit(0),
                not(bit(1)),
                xor(bit(0), bit(1)),
            ]
        };
        for a in leaves() {
            for b in leaves() {
                for value in 0..4u32 {
                    let read = |bit: u32| value >> bit & 1 == 1;
                    let (x, y) = (a.evaluate(&read), b.evaluate(&read));
                    assert_eq!(xor(a.clone(), b.clone()).evaluate(&read), x ^ y);
                    assert_eq!(and(a.clone(), b.clone()).evaluate(&read), x & y);
                    assert_eq!(or(a.clone(), b.clone()).evaluate(&read), x | y);
                    assert_eq!(not(a.clone()).evaluate(&read), !x);
                }
            }
        }
    }

    #[test]
    fn numbers_have_to_fit() {
        assert_eq!(of_number(2, 2), Some(vec![Constant(false), Constant(true)]));
        assert_eq!(of_number(4, 2), None);
        assert_eq!(of_number(-1, 8), None);
        assert_eq!(of_number(1, 200).map(|bits| bits.len()), Some(200));
    }
}
