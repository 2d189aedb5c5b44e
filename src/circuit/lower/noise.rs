//! Annotations: which channels a statement carries.

use super::evaluate::Division;
use super::scope::Entity;
use super::value::Value;
use super::{Lowered, Lowering};
use crate::circuit::ast::{Annotation, AnnotationKind, Argument, Channel, NodeKind};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::{AnnotatedNoise, ChannelArgument, ChannelCall, ChannelValue, Role};

impl<'a> Lowering<'a> {
    /// The noise on a statement that acts on qubits.
    pub(super) fn noise(
        &mut self,
        annotations: &[Annotation<'a>],
    ) -> Lowered<Option<Box<AnnotatedNoise>>> {
        if annotations.is_empty() {
            return Ok(None);
        }
        let mut noise = AnnotatedNoise::default();
        for annotation in annotations {
            match &annotation.kind {
                AnnotationKind::NoiseBefore(channel) => {
                    noise.before.push(self.channel(channel)?);
                }
                AnnotationKind::NoiseAfter(channel) => noise.after.push(self.channel(channel)?),
                AnnotationKind::Check | AnnotationKind::Logical => {
                    return Err(role_elsewhere(annotation.span).into());
                }
            }
        }
        Ok(Some(Box::new(noise)))
    }

    /// The role of a declared register, and the annotations that are left.
    pub(super) fn role(
        &mut self,
        annotations: &[Annotation<'a>],
    ) -> Lowered<(Role, Vec<Annotation<'a>>)> {
        let mut role = None;
        let mut rest = Vec::new();
        for annotation in annotations {
            let named = match annotation.kind {
                AnnotationKind::Check => Role::Check,
                AnnotationKind::Logical => Role::Logical,
                _ => {
                    rest.push(annotation.clone());
                    continue;
                }
            };
            if role.is_some_and(|role| role != named) {
                return Err(Diagnostic::error(
                    annotation.span,
                    "a register is either `@check` or `@logical`",
                )
                .into());
            }
            role = Some(named);
        }
        Ok((role.unwrap_or(Role::Record), rest))
    }

    /// Refuses annotations on a statement that takes none.
    pub(super) fn refuse_annotations(
        &self,
        annotations: &[Annotation<'a>],
        what: &str,
        help: &str,
    ) -> Lowered<()> {
        let Some(annotation) = annotations.first() else {
            return Ok(());
        };
        Err(match annotation.kind {
            AnnotationKind::Check | AnnotationKind::Logical => role_elsewhere(annotation.span),
            _ => Diagnostic::error(annotation.span, format!("a noise annotation on {what}"))
                .with_help(help),
        }
        .into())
    }

    /// A channel with its arguments evaluated.
    pub fn channel(&mut self, channel: &Channel<'a>) -> Lowered<ChannelCall> {
        let mut arguments = Vec::with_capacity(channel.arguments.len());
        for argument in &channel.arguments {
            arguments.push(ChannelArgument {
                name: argument.name.map(|name| name.text.to_owned()),
                value: self.channel_value(argument)?,
                span: argument.name.map_or(argument.value.span, |name| Span {
                    start: name.span.start,
                    end: argument.value.span.end,
                }),
            });
        }
        Ok(ChannelCall {
            name: channel.name.text.to_owned(),
            arguments,
            span: channel.span,
        })
    }

    fn channel_value(&mut self, argument: &Argument<'a>) -> Lowered<ChannelValue> {
        let expression = &argument.value;
        // A name on its own that is no constant stands for itself, as `x` in
        // `over-rotation(x, 0.1)` does.
        if let [node] = expression.nodes.as_slice()
            && let NodeKind::Name(name) = node.kind
            && !matches!(
                self.find(name, expression.span)?,
                Some(Entity::Constant(_) | Entity::Unknown)
            )
        {
            return Ok(ChannelValue::Word(name.to_owned()));
        }
        match self.evaluate(expression, Division::Exact)? {
            Value::Duration(seconds) => Ok(ChannelValue::Duration(seconds)),
            value @ (Value::Integer(_) | Value::Float(_)) => {
                Ok(ChannelValue::Number(value.number().unwrap_or_default()))
            }
            other => Err(Diagnostic::error(
                expression.span,
                format!(
                    "an argument of a channel is a constant number, a duration or a word, found {}",
                    other.kind()
                ),
            )
            .into()),
        }
    }
}

fn role_elsewhere(place: Span) -> Diagnostic {
    Diagnostic::error(
        place,
        "`@check` and `@logical` belong to the declaration of a bit register",
    )
    .with_help("put it on the line before `bit[n] name;` or `output bit[n] name;`")
}
