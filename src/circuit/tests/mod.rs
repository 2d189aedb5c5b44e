//! Tests of the front end as a whole: text in, flat operations or messages out.
//!
//! What a program means is taken from the OpenQASM 3 specification
//! (arXiv:2104.14722), for OpenQASM 2 from arXiv:1707.03429.

mod accepted;
mod annotated;
mod budgets;
mod classical;
mod gates;
mod random;
mod refused;

use super::{
    Action, BitExpression, ChannelCall, ChannelValue, Circuit, Diagnostic, Edge, Operation,
    ParseOptions, parse,
};

/// Parses with the usual options.
fn read(source: &str) -> Result<Circuit, Vec<Diagnostic>> {
    parse("test.qasm", source, &ParseOptions::default())
}

/// The circuit of a text that must be right.
fn circuit(source: &str) -> Circuit {
    match read(source) {
        Ok(circuit) => circuit,
        Err(errors) => panic!("{source}\n{}", listed(source, &errors).join("\n")),
    }
}

/// The operations of a text that must be right, one line each.
fn flat(source: &str) -> Vec<String> {
    circuit(source).operations.iter().map(line).collect()
}

/// Checks the operations of a text, given one a line.
#[track_caller]
fn check(source: &str, expected: &str) {
    let found = flat(source);
    let expected: Vec<&str> = expected
        .lines()
        .map(str::trim)
        .filter(|line| !line.is_empty())
        .collect();
    assert_eq!(found, expected, "{source}");
}

/// Errors as `line:column message (help)`.
fn listed(source: &str, errors: &[Diagnostic]) -> Vec<String> {
    errors
        .iter()
        .map(|error| match error.span {
            Some(span) => {
                let (line, column) = span.line_and_column(source);
                format!("{line}:{column} {error}")
            }
            None => error.to_string(),
        })
        .collect()
}

/// An operation on one line: `[if b] action {noise}`.
fn line(operation: &Operation) -> String {
    let condition = operation
        .condition
        .map_or_else(String::new, |bit| format!("[b{bit}] "));
    let noise = operation.noise.as_ref().map_or_else(String::new, |noise| {
        let before = noise
            .before
            .iter()
            .map(|call| format!("before {}", channel(call)));
        let after = noise
            .after
            .iter()
            .map(|call| format!("after {}", channel(call)));
        format!(
            " {{{}}}",
            before.chain(after).collect::<Vec<_>>().join("; ")
        )
    });
    format!("{condition}{}{noise}", action(&operation.action))
}

fn numbers(items: &[u32]) -> String {
    let items: Vec<String> = items.iter().map(u32::to_string).collect();
    items.join(" ")
}

fn action(action: &Action) -> String {
    match action {
        Action::Gate {
            gate,
            parameters,
            qubits,
        } => {
            let angles: Vec<String> = parameters.iter().map(f64::to_string).collect();
            let angles = if angles.is_empty() {
                String::new()
            } else {
                format!("({})", angles.join(", "))
            };
            let negated = match gate {
                super::Gate::Negated { mask, .. } => format!("!{mask:b}"),
                super::Gate::IswapInverse => "~".to_owned(),
                _ => String::new(),
            };
            format!("{}{negated}{angles} {}", gate.name(), numbers(qubits))
        }
        Action::Call { name, qubits, edge } => {
            let edge = match edge {
                Edge::Start => "start",
                Edge::End => "end",
            };
            format!("{edge} {name} {}", numbers(qubits))
        }
        Action::Measure { qubit, bit } => match bit {
            Some(bit) => format!("measure {qubit} -> b{bit}"),
            None => format!("measure {qubit}"),
        },
        Action::Reset { qubit } => format!("reset {qubit}"),
        Action::Delay { qubit, seconds } => format!("delay {seconds:e} {qubit}"),
        Action::Barrier { qubits } => format!("barrier {}", numbers(qubits)),
        Action::Assign { bit, value } => format!("b{bit} = {}", formula(value)),
    }
}

fn formula(value: &BitExpression) -> String {
    let joined = |parts: &[BitExpression], symbol: &str| {
        let parts: Vec<String> = parts.iter().map(formula).collect();
        format!("({})", parts.join(symbol))
    };
    match value {
        BitExpression::Constant(value) => u8::from(*value).to_string(),
        BitExpression::Bit(bit) => format!("b{bit}"),
        BitExpression::Not(inner) => format!("!{}", formula(inner)),
        BitExpression::Xor(parts) => joined(parts, "^"),
        BitExpression::And(parts) => joined(parts, "&"),
        BitExpression::Or(parts) => joined(parts, "|"),
    }
}

fn channel(call: &ChannelCall) -> String {
    let arguments = call.arguments.iter().map(|argument| {
        let name = argument
            .name
            .as_ref()
            .map_or_else(String::new, |name| format!("{name}="));
        let value = match &argument.value {
            ChannelValue::Number(value) => value.to_string(),
            ChannelValue::Duration(value) => format!("{value:e}s"),
            ChannelValue::Word(word) => word.clone(),
        };
        format!("{name}{value}")
    });
    format!(
        "{}({})",
        call.name,
        arguments.collect::<Vec<_>>().join(", ")
    )
}
