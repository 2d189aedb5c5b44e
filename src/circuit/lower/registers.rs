//! The result of an operator when at least one side is a register of bits.

use crate::circuit::BitExpression;
use crate::circuit::ast::Binary;

use super::bits;
use super::value::{Refused, Value};

/// A result, and a doubt about it if there is one.
pub struct Judged {
    /// The result.
    pub value: Value,
    /// What is odd about the operation.
    pub doubt: Option<String>,
}

/// The result of an operator when at least one side is [`Value::Bits`].
pub fn binary(operator: Binary, left: Value, right: Value) -> Refused<Judged> {
    let plain = |value| Judged { value, doubt: None };
    match operator {
        Binary::LogicalAnd => {
            let formula = bits::and(left.condition()?, right.condition()?);
            Ok(plain(Value::Bits(vec![formula])))
        }
        Binary::LogicalOr => {
            let formula = bits::or(left.condition()?, right.condition()?);
            Ok(plain(Value::Bits(vec![formula])))
        }
        Binary::And => bitwise(left, right, operator, bits::and).map(plain),
        Binary::Or => bitwise(left, right, operator, bits::or).map(plain),
        Binary::Xor => bitwise(left, right, operator, bits::xor).map(plain),
        Binary::ShiftLeft | Binary::ShiftRight => shift(operator, left, right).map(plain),
        Binary::Equal
        | Binary::NotEqual
        | Binary::Less
        | Binary::LessOrEqual
        | Binary::Greater
        | Binary::GreaterOrEqual => comparison(operator, left, right),
        _ => Err(format!(
            "`{}` does not apply to {} and {}: measured bits take `^`, `&`, `|`, `~` and \
             comparisons",
            operator.text(),
            left.kind(),
            right.kind()
        )),
    }
}

fn bitwise(
    left: Value,
    right: Value,
    operator: Binary,
    combine: fn(BitExpression, BitExpression) -> BitExpression,
) -> Refused<Value> {
    let (left, right) = same_width(left, right, operator)?;
    let pairs = left.into_iter().zip(right);
    Ok(Value::Bits(pairs.map(|(a, b)| combine(a, b)).collect()))
}

/// Both sides as bits; a number takes the width of the other side.
fn same_width(
    left: Value,
    right: Value,
    operator: Binary,
) -> Refused<(Vec<BitExpression>, Vec<BitExpression>)> {
    let width = match (&left, &right) {
        (Value::Bits(a), Value::Bits(b)) if a.len() != b.len() => {
            return Err(format!(
                "`{}` needs registers of the same width, found {} and {} bits",
                operator.text(),
                a.len(),
                b.len()
            ));
        }
        (Value::Bits(bits), _) | (_, Value::Bits(bits)) => bits.len(),
        _ => return Err("expected measured bits".into()),
    };
    Ok((as_bits(left, width)?, as_bits(right, width)?))
}

/// A value as `width` bits.
pub fn as_bits(value: Value, width: usize) -> Refused<Vec<BitExpression>> {
    let too_wide = |number: i128| {
        format!(
            "{number} does not fit into {width} bit{}",
            if width == 1 { "" } else { "s" }
        )
    };
    match value {
        Value::Bits(bits) if bits.len() == width => Ok(bits),
        Value::Bits(bits) => Err(format!(
            "expected {width} bit{}, found {}",
            if width == 1 { "" } else { "s" },
            bits.len()
        )),
        Value::Boolean(value) if width == 1 => Ok(vec![BitExpression::Constant(value)]),
        Value::Integer(number) => bits::of_number(number, width).ok_or_else(|| too_wide(number)),
        other => Err(format!(
            "expected {width} bit{}, found {}",
            if width == 1 { "" } else { "s" },
            other.kind()
        )),
    }
}

fn shift(operator: Binary, left: Value, right: Value) -> Refused<Value> {
    let (Value::Bits(bits), Value::Integer(distance)) = (left, right) else {
        return Err(format!(
            "`{}` of measured bits takes a constant integer on its right",
            operator.text()
        ));
    };
    let distance = usize::try_from(distance).map_err(|_| "a shift by a negative number")?;
    let distance = distance.min(bits.len());
    let zeros = std::iter::repeat_n(BitExpression::Constant(false), distance);
    let kept = bits.len() - distance;
    Ok(Value::Bits(if operator == Binary::ShiftLeft {
        zeros.chain(bits.into_iter().take(kept)).collect()
    } else {
        bits.into_iter().skip(distance).chain(zeros).collect()
    }))
}

fn comparison(operator: Binary, left: Value, right: Value) -> Refused<Judged> {
    if let (Value::Integer(number), Value::Bits(_)) = (&left, &right) {
        let number = *number;
        return with_number(mirrored(operator), right, number);
    }
    if let (Value::Bits(_), Value::Integer(number)) = (&left, &right) {
        let number = *number;
        return with_number(operator, left, number);
    }
    if !matches!(operator, Binary::Equal | Binary::NotEqual) {
        return Err(format!(
            "`{}` compares a register with a constant integer, found {} and {}",
            operator.text(),
            left.kind(),
            right.kind()
        ));
    }
    let (left, right) = same_width(left, right, operator)?;
    let same = bits::equal(left, right);
    let formula = if operator == Binary::Equal {
        same
    } else {
        bits::not(same)
    };
    Ok(Judged {
        value: Value::Bits(vec![formula]),
        doubt: None,
    })
}

/// The operator with its sides exchanged.
fn mirrored(operator: Binary) -> Binary {
    match operator {
        Binary::Less => Binary::Greater,
        Binary::LessOrEqual => Binary::GreaterOrEqual,
        Binary::Greater => Binary::Less,
        Binary::GreaterOrEqual => Binary::LessOrEqual,
        other => other,
    }
}

fn with_number(operator: Binary, register: Value, number: i128) -> Refused<Judged> {
    let Value::Bits(register) = register else {
        return Err("expected measured bits".into());
    };
    let width = register.len();
    let Some(number_bits) = bits::of_number(number, width) else {
        // The register is never there; every bit of it is below or above.
        let above = number > 0;
        let always = match operator {
            Binary::NotEqual => true,
            Binary::Less | Binary::LessOrEqual => above,
            Binary::Greater | Binary::GreaterOrEqual => !above,
            _ => false,
        };
        return Ok(Judged {
            value: Value::Bits(vec![BitExpression::Constant(always)]),
            doubt: Some(format!(
                "a register of {width} bit{} is never {number}, so this is always {always}",
                if width == 1 { "" } else { "s" }
            )),
        });
    };
    let number = number as u128;
    let formula = match operator {
        Binary::Equal => bits::equal(register, number_bits),
        Binary::NotEqual => bits::not(bits::equal(register, number_bits)),
        Binary::Less => bits::less(register, number)?,
        Binary::GreaterOrEqual => bits::not(bits::less(register, number)?),
        // A register that is all ones cannot be exceeded.
        Binary::LessOrEqual | Binary::Greater => {
            let all_ones = width < 128 && (number + 1) >> width != 0;
            let not_above = if all_ones {
                BitExpression::Constant(true)
            } else {
                bits::less(register, number + 1)?
            };
            if operator == Binary::LessOrEqual {
                not_above
            } else {
                bits::not(not_above)
            }
        }
        _ => return Err("expected a comparison".into()),
    };
    Ok(Judged {
        value: Value::Bits(vec![formula]),
        doubt: None,
    })
}
