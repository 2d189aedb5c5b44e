//! Values of expressions, and the arithmetic of constants.
//!
//! Integers are exact or an error; numbers that leave the finite range are an
//! error too, so nothing downstream meets an infinity. Two integers divide as
//! integers, as the types of OpenQASM 3 say, unless the caller asks for
//! numbers.

use crate::circuit::BitExpression;
use crate::circuit::ast::{Binary, Function, Unary};

use super::bits;

/// The value of an expression.
#[derive(Debug, Clone, PartialEq)]
pub enum Value {
    /// A whole number.
    Integer(i128),
    /// A number.
    Float(f64),
    /// True or false.
    Boolean(bool),
    /// A time in seconds.
    Duration(f64),
    /// Measured bits, bit 0 first, or one yes-or-no formula over them.
    Bits(Vec<BitExpression>),
}

/// Why there is no value.
pub type Refused<T> = Result<T, String>;

impl Value {
    /// The kind of value in words.
    pub fn kind(&self) -> String {
        match self {
            Value::Integer(_) => "an integer".into(),
            Value::Float(_) => "a number with a fraction".into(),
            Value::Boolean(_) => "true or false".into(),
            Value::Duration(_) => "a duration".into(),
            Value::Bits(bits) if bits.len() == 1 => "a measured bit".into(),
            Value::Bits(bits) => format!("a register of {} bits", bits.len()),
        }
    }

    /// The value as a whole number; numbers without a fraction count.
    pub fn integer(&self) -> Option<i128> {
        match *self {
            Value::Integer(value) => Some(value),
            Value::Float(value) if value.fract() == 0.0 && value.abs() < 1e15 => {
                Some(value as i128)
            }
            _ => None,
        }
    }

    /// The value as a number.
    pub fn number(&self) -> Option<f64> {
        match *self {
            Value::Integer(value) => Some(value as f64),
            Value::Float(value) => Some(value),
            Value::Boolean(value) => Some(f64::from(u8::from(value))),
            _ => None,
        }
    }

    /// The value as one yes-or-no formula.
    pub fn condition(self) -> Refused<BitExpression> {
        match self {
            Value::Boolean(value) => Ok(BitExpression::Constant(value)),
            Value::Integer(value) => Ok(BitExpression::Constant(value != 0)),
            Value::Bits(mut bits) if bits.len() == 1 => Ok(bits.remove(0)),
            Value::Bits(bits) => Err(format!(
                "a register of {} bits is neither true nor false; compare it, for example with 0",
                bits.len()
            )),
            other => Err(format!("{} is neither true nor false", other.kind())),
        }
    }
}

/// The result of an operator with one operand.
pub fn unary(operator: Unary, value: Value) -> Refused<Value> {
    match (operator, value) {
        (Unary::Negate, Value::Integer(value)) => {
            value.checked_neg().map(Value::Integer).ok_or_else(overflow)
        }
        (Unary::Negate, Value::Float(value)) => Ok(Value::Float(-value)),
        (Unary::Negate, Value::Duration(value)) => Ok(Value::Duration(-value)),
        (Unary::BitNot, Value::Integer(value)) => Ok(Value::Integer(!value)),
        (Unary::BitNot | Unary::LogicalNot, Value::Boolean(value)) => Ok(Value::Boolean(!value)),
        (Unary::LogicalNot, Value::Integer(value)) => Ok(Value::Boolean(value == 0)),
        (Unary::LogicalNot, Value::Bits(bits)) if bits.len() > 1 => Err(format!(
            "`!` takes one bit, found a register of {} bits; use `~` to flip every bit, or \
             compare with 0",
            bits.len()
        )),
        (Unary::BitNot | Unary::LogicalNot, Value::Bits(bits)) => {
            Ok(Value::Bits(bits.into_iter().map(bits::not).collect()))
        }
        (operator, value) => {
            let text = match operator {
                Unary::Negate => "-",
                Unary::LogicalNot => "!",
                Unary::BitNot => "~",
            };
            Err(format!("`{text}` does not apply to {}", value.kind()))
        }
    }
}

/// The result of an operator with two operands, neither of which is a register.
/// With `divide_exactly`, integers divide as numbers.
pub fn binary(operator: Binary, left: Value, right: Value, divide_exactly: bool) -> Refused<Value> {
    use Value::{Boolean, Duration, Integer};
    match (left, right) {
        (Integer(a), Integer(b)) if operator == Binary::Divide && divide_exactly => {
            numbers(operator, a as f64, b as f64)
        }
        (Integer(a), Integer(b)) => integers(operator, a, b),
        (Boolean(a), Boolean(b)) => booleans(operator, a, b),
        (Duration(a), Duration(b)) => durations(operator, a, b),
        (Duration(a), other) if other.number().is_some() => {
            let b = other.number().unwrap_or_default();
            match operator {
                Binary::Multiply => finite(a * b).map(Duration),
                Binary::Divide => finite(a / b).map(Duration),
                _ => Err(mismatch(operator, &Duration(a), &other)),
            }
        }
        (other, Duration(b)) if operator == Binary::Multiply && other.number().is_some() => {
            finite(other.number().unwrap_or_default() * b).map(Duration)
        }
        (left, right) => {
            if matches!(operator, Binary::LogicalAnd | Binary::LogicalOr) {
                let (Ok(BitExpression::Constant(a)), Ok(BitExpression::Constant(b))) =
                    (left.clone().condition(), right.clone().condition())
                else {
                    return Err(mismatch(operator, &left, &right));
                };
                return booleans(operator, a, b);
            }
            let bitwise = matches!(operator, Binary::And | Binary::Or | Binary::Xor);
            match (left.number(), right.number()) {
                (Some(a), Some(b)) if !bitwise => numbers(operator, a, b),
                _ => Err(mismatch(operator, &left, &right)),
            }
        }
    }
}

fn mismatch(operator: Binary, left: &Value, right: &Value) -> String {
    format!(
        "`{}` does not apply to {} and {}",
        operator.text(),
        left.kind(),
        right.kind()
    )
}

fn overflow() -> String {
    "this integer has more than 127 bits".into()
}

fn finite(value: f64) -> Refused<f64> {
    if value.is_finite() {
        return Ok(value);
    }
    Err("this value is not a finite number".into())
}

fn compare<T: PartialOrd>(operator: Binary, a: T, b: T) -> Option<bool> {
    Some(match operator {
        Binary::Equal => a == b,
        Binary::NotEqual => a != b,
        Binary::Less => a < b,
        Binary::LessOrEqual => a <= b,
        Binary::Greater => a > b,
        Binary::GreaterOrEqual => a >= b,
        _ => return None,
    })
}

fn integers(operator: Binary, a: i128, b: i128) -> Refused<Value> {
    if let Some(result) = compare(operator, a, b) {
        return Ok(Value::Boolean(result));
    }
    let shift = || u32::try_from(b).map_err(|_| "a shift by a negative number".to_owned());
    let result = match operator {
        Binary::LogicalAnd => return Ok(Value::Boolean(a != 0 && b != 0)),
        Binary::LogicalOr => return Ok(Value::Boolean(a != 0 || b != 0)),
        Binary::Or => Some(a | b),
        Binary::Xor => Some(a ^ b),
        Binary::And => Some(a & b),
        Binary::Add => a.checked_add(b),
        Binary::Subtract => a.checked_sub(b),
        Binary::Multiply => a.checked_mul(b),
        Binary::Divide | Binary::Remainder if b == 0 => return Err("division by zero".into()),
        Binary::Divide => a.checked_div(b),
        Binary::Remainder => a.checked_rem(b),
        Binary::ShiftLeft => {
            let shifted = a.checked_shl(shift()?).unwrap_or_default();
            (a == 0 || shifted >> shift()?.min(127) == a && shift()? < 127).then_some(shifted)
        }
        Binary::ShiftRight => Some(a >> shift()?.min(127)),
        Binary::Power if b < 0 => return numbers(operator, a as f64, b as f64),
        Binary::Power if a == -1 => Some(if b % 2 == 0 { 1 } else { -1 }),
        Binary::Power if matches!(a, 0 | 1) && b > 0 => Some(a),
        Binary::Power => u32::try_from(b).ok().and_then(|b| a.checked_pow(b)),
        _ => None,
    };
    result.map(Value::Integer).ok_or_else(overflow)
}

fn numbers(operator: Binary, a: f64, b: f64) -> Refused<Value> {
    if let Some(result) = compare(operator, a, b) {
        return Ok(Value::Boolean(result));
    }
    let result = match operator {
        Binary::Add => a + b,
        Binary::Subtract => a - b,
        Binary::Multiply => a * b,
        Binary::Divide | Binary::Remainder if b == 0.0 => return Err("division by zero".into()),
        Binary::Divide => a / b,
        Binary::Remainder => a % b,
        Binary::Power => a.powf(b),
        _ => return Err(mismatch(operator, &Value::Float(a), &Value::Float(b))),
    };
    finite(result).map(Value::Float)
}

fn durations(operator: Binary, a: f64, b: f64) -> Refused<Value> {
    if let Some(result) = compare(operator, a, b) {
        return Ok(Value::Boolean(result));
    }
    match operator {
        Binary::Add => finite(a + b).map(Value::Duration),
        Binary::Subtract => finite(a - b).map(Value::Duration),
        Binary::Divide if b != 0.0 => finite(a / b).map(Value::Float),
        _ => Err(mismatch(operator, &Value::Duration(a), &Value::Duration(b))),
    }
}

fn booleans(operator: Binary, a: bool, b: bool) -> Refused<Value> {
    Ok(Value::Boolean(match operator {
        Binary::And | Binary::LogicalAnd => a && b,
        Binary::Or | Binary::LogicalOr => a || b,
        Binary::Xor | Binary::NotEqual => a != b,
        Binary::Equal => a == b,
        _ => {
            return Err(mismatch(operator, &Value::Boolean(a), &Value::Boolean(b)));
        }
    }))
}

/// The result of a function; `operands` holds as many as it takes.
pub fn function(function: Function, operands: &[Value]) -> Refused<Value> {
    if let (Function::Mod, [Value::Integer(a), Value::Integer(b)]) = (function, operands) {
        return integers(Binary::Remainder, *a, *b);
    }
    if let (Function::Pow, [left, right]) = (function, operands) {
        return binary(Binary::Power, left.clone(), right.clone(), true);
    }
    if function == Function::Popcount {
        return match operands {
            [Value::Integer(value)] if *value >= 0 => {
                Ok(Value::Integer(i128::from(value.count_ones())))
            }
            [Value::Bits(bits)] => bits
                .iter()
                .map(|bit| match bit {
                    BitExpression::Constant(value) => Ok(i128::from(*value)),
                    _ => Err("`popcount` of measured bits is not supported".into()),
                })
                .sum::<Refused<i128>>()
                .map(Value::Integer),
            _ => Err("`popcount` takes a bit string or an integer that is not negative".into()),
        };
    }
    let numbers: Option<Vec<f64>> = operands.iter().map(Value::number).collect();
    let Some(numbers) = numbers else {
        let wrong = operands.iter().find(|operand| operand.number().is_none());
        let kind = wrong.map_or_else(String::new, Value::kind);
        return Err(format!("the function takes numbers, found {kind}"));
    };
    let x = numbers[0];
    let result = match function {
        Function::Arccos => x.acos(),
        Function::Arcsin => x.asin(),
        Function::Arctan => x.atan(),
        Function::Ceiling => x.ceil(),
        Function::Cos => x.cos(),
        Function::Exp => x.exp(),
        Function::Floor => x.floor(),
        Function::Log => x.ln(),
        Function::Mod => x % numbers[1],
        Function::Sin => x.sin(),
        Function::Sqrt => x.sqrt(),
        Function::Tan => x.tan(),
        Function::Pow | Function::Popcount => unreachable!("handled above"),
    };
    finite(result).map(Value::Float)
}
