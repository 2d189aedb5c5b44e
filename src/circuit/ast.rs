//! The syntax tree: a file as written, names not looked up.
//!
//! Expressions are stored in postfix order, so that however long they are,
//! neither evaluating nor dropping them recurses. Names borrow from the text.

use super::diagnostic::Span;

/// A name and its place.
#[derive(Debug, Clone, Copy)]
pub struct Name<'a> {
    /// The name.
    pub text: &'a str,
    /// Where it is.
    pub span: Span,
}

/// An expression in postfix order.
#[derive(Debug, Clone)]
pub struct Expression<'a> {
    /// Operands before their operator.
    pub nodes: Vec<Node<'a>>,
    /// The whole expression.
    pub span: Span,
}

/// One operand or operator.
#[derive(Debug, Clone)]
pub struct Node<'a> {
    /// What it is.
    pub kind: NodeKind<'a>,
    /// Where it is.
    pub span: Span,
}

/// What a node is.
#[derive(Debug, Clone)]
pub enum NodeKind<'a> {
    /// A whole number.
    Integer(i128),
    /// A number.
    Float(f64),
    /// `true` or `false`.
    Boolean(bool),
    /// A time in seconds.
    Duration(f64),
    /// `"0101"`, most significant bit first, checked to hold 0, 1 and `_` only.
    BitString(&'a str),
    /// A name on its own.
    Name(&'a str),
    /// A name with indices.
    Element(Box<Operand<'a>>),
    /// Takes one operand.
    Unary(Unary),
    /// Takes two operands.
    Binary(Binary),
    /// Takes as many operands as said.
    Function(Function, u32),
    /// A conversion, with the width in brackets if there is one.
    Cast(Scalar, Option<Box<Expression<'a>>>),
}

/// Operators with one operand.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Unary {
    /// `-`
    Negate,
    /// `!`
    LogicalNot,
    /// `~`
    BitNot,
}

/// Operators with two operands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Binary {
    /// `||`
    LogicalOr,
    /// `&&`
    LogicalAnd,
    /// `|`
    Or,
    /// `^`
    Xor,
    /// `&`
    And,
    /// `==`
    Equal,
    /// `!=`
    NotEqual,
    /// `<`
    Less,
    /// `<=`
    LessOrEqual,
    /// `>`
    Greater,
    /// `>=`
    GreaterOrEqual,
    /// `<<`
    ShiftLeft,
    /// `>>`
    ShiftRight,
    /// `+`
    Add,
    /// `-`
    Subtract,
    /// `*`
    Multiply,
    /// `/`
    Divide,
    /// `%`
    Remainder,
    /// `**`
    Power,
}

impl Binary {
    /// The operator as written.
    pub fn text(self) -> &'static str {
        match self {
            Binary::LogicalOr => "||",
            Binary::LogicalAnd => "&&",
            Binary::Or => "|",
            Binary::Xor => "^",
            Binary::And => "&",
            Binary::Equal => "==",
            Binary::NotEqual => "!=",
            Binary::Less => "<",
            Binary::LessOrEqual => "<=",
            Binary::Greater => ">",
            Binary::GreaterOrEqual => ">=",
            Binary::ShiftLeft => "<<",
            Binary::ShiftRight => ">>",
            Binary::Add => "+",
            Binary::Subtract => "-",
            Binary::Multiply => "*",
            Binary::Divide => "/",
            Binary::Remainder => "%",
            Binary::Power => "**",
        }
    }
}

/// Built-in functions of constants.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Function {
    Arccos,
    Arcsin,
    Arctan,
    Ceiling,
    Cos,
    Exp,
    Floor,
    Log,
    Mod,
    Popcount,
    Pow,
    Sin,
    Sqrt,
    Tan,
}

impl Function {
    /// The function called `name`; `ln` is the OpenQASM 2 name of `log`.
    pub fn from_name(name: &str) -> Option<Function> {
        Some(match name {
            "arccos" => Function::Arccos,
            "arcsin" => Function::Arcsin,
            "arctan" => Function::Arctan,
            "ceiling" => Function::Ceiling,
            "cos" => Function::Cos,
            "exp" => Function::Exp,
            "floor" => Function::Floor,
            "log" | "ln" => Function::Log,
            "mod" => Function::Mod,
            "popcount" => Function::Popcount,
            "pow" => Function::Pow,
            "sin" => Function::Sin,
            "sqrt" => Function::Sqrt,
            "tan" => Function::Tan,
            _ => return None,
        })
    }

    /// Number of operands.
    pub fn operands(self) -> u32 {
        match self {
            Function::Mod | Function::Pow => 2,
            _ => 1,
        }
    }
}

/// The scalar types of constants, inputs, loop variables and casts.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Scalar {
    /// `int`
    Int,
    /// `uint`
    Uint,
    /// `float`
    Float,
    /// `angle`
    Angle,
    /// `bool`
    Bool,
    /// `bit`
    Bit,
}

impl Scalar {
    /// The type called `name`.
    pub fn from_name(name: &str) -> Option<Scalar> {
        Some(match name {
            "int" => Scalar::Int,
            "uint" => Scalar::Uint,
            "float" => Scalar::Float,
            "angle" => Scalar::Angle,
            "bool" => Scalar::Bool,
            "bit" => Scalar::Bit,
            _ => return None,
        })
    }

    /// The name of the type.
    pub fn name(self) -> &'static str {
        match self {
            Scalar::Int => "int",
            Scalar::Uint => "uint",
            Scalar::Float => "float",
            Scalar::Angle => "angle",
            Scalar::Bool => "bool",
            Scalar::Bit => "bit",
        }
    }
}

/// A type with its width in brackets, if there is one.
#[derive(Debug, Clone)]
pub struct Type<'a> {
    /// The type.
    pub scalar: Scalar,
    /// The width.
    pub width: Option<Expression<'a>>,
    /// Where it is written.
    pub span: Span,
}

/// A name with any number of indices.
#[derive(Debug, Clone)]
pub struct Operand<'a> {
    /// The name.
    pub name: Name<'a>,
    /// What stands in brackets behind it.
    pub indices: Vec<Index<'a>>,
    /// The whole operand.
    pub span: Span,
}

/// What stands in one pair of brackets.
#[derive(Debug, Clone)]
pub struct Index<'a> {
    /// One element, a range or a set.
    pub kind: IndexKind<'a>,
    /// The brackets.
    pub span: Span,
}

/// One element, a range or a set.
#[derive(Debug, Clone)]
pub enum IndexKind<'a> {
    /// `[i]`
    Element(Expression<'a>),
    /// `[start:end]` or `[start:step:end]`, ends included
    Range(Box<Range<'a>>),
    /// `[{a, b}]`
    Set(Vec<Expression<'a>>),
}

/// A range, ends included.
#[derive(Debug, Clone)]
pub struct Range<'a> {
    /// First value.
    pub start: Option<Expression<'a>>,
    /// Step; 1 if left out.
    pub step: Option<Expression<'a>>,
    /// Last value.
    pub end: Option<Expression<'a>>,
}

/// What comes before a gate and an `@`.
#[derive(Debug, Clone)]
pub struct Modifier<'a> {
    /// Which modifier.
    pub kind: ModifierKind<'a>,
    /// Where it is.
    pub span: Span,
}

/// The modifiers.
#[derive(Debug, Clone)]
pub enum ModifierKind<'a> {
    /// `inv @`
    Inverse,
    /// `pow(n) @`
    Power(Expression<'a>),
    /// `ctrl @`, `ctrl(n) @`, and the same with `negctrl`.
    Control {
        /// Whether it is `negctrl`.
        negated: bool,
        /// How many controls; 1 if left out.
        count: Option<Expression<'a>>,
    },
}

/// A statement with its annotations.
#[derive(Debug, Clone)]
pub struct Statement<'a> {
    /// What it says.
    pub kind: StatementKind<'a>,
    /// The annotations in front of it.
    pub annotations: Vec<Annotation<'a>>,
    /// From its first to its last character.
    pub span: Span,
}

/// The statements.
#[derive(Debug, Clone)]
pub enum StatementKind<'a> {
    /// Says nothing that matters: the header or a pragma.
    Nothing,
    /// `include "…";`
    Include(Name<'a>),
    /// `qubit[n] q;` or `qreg q[n];`
    Qubits {
        /// The register.
        name: Name<'a>,
        /// Its size; a single qubit if left out.
        size: Option<Expression<'a>>,
    },
    /// `bit[n] c;`, `creg c[n];`, `output bit[n] c;`
    Bits(Box<BitDeclaration<'a>>),
    /// `const int n = 3;`
    Constant {
        /// The type.
        kind: Type<'a>,
        /// The constant.
        name: Name<'a>,
        /// Its value.
        value: Expression<'a>,
    },
    /// `input float x;`
    Input {
        /// The type.
        kind: Type<'a>,
        /// The input.
        name: Name<'a>,
    },
    /// `let a = q[0:3] ++ r;`
    Alias {
        /// The alias.
        name: Name<'a>,
        /// The parts, in order.
        parts: Vec<Operand<'a>>,
    },
    /// `gate g(x) a { … }`
    Gate(Box<GateDefinition<'a>>),
    /// `ctrl @ g(0.1) a, b;`
    Call(Box<Call<'a>>),
    /// `measure q;`, `measure q -> c;`, `c = measure q;`
    Measure {
        /// The qubits.
        source: Operand<'a>,
        /// Where the outcomes go.
        target: Option<Operand<'a>>,
    },
    /// `c = a ^ b;` and the compound forms.
    Assign {
        /// The bits written.
        target: Operand<'a>,
        /// The operator before the `=`, if any.
        operator: Option<Binary>,
        /// The new value.
        value: Box<Assigned<'a>>,
    },
    /// `reset q;`
    Reset(Operand<'a>),
    /// `barrier;`, `barrier a, b;`
    Barrier(Vec<Operand<'a>>),
    /// `delay[100ns] a, b;`
    Delay {
        /// The time.
        duration: Expression<'a>,
        /// The qubits; all if none is named.
        operands: Vec<Operand<'a>>,
    },
    /// `if (…) … else …`
    If(Box<If<'a>>),
    /// `for int i in … …`
    For(Box<For<'a>>),
}

/// What a bit is given.
#[derive(Debug, Clone)]
pub enum Assigned<'a> {
    /// An expression.
    Expression(Expression<'a>),
    /// A measurement.
    Measure(Operand<'a>),
}

/// A declaration of bits.
#[derive(Debug, Clone)]
pub struct BitDeclaration<'a> {
    /// The register.
    pub name: Name<'a>,
    /// Its width; a single bit if left out.
    pub size: Option<Expression<'a>>,
    /// Whether it is declared `output`.
    pub output: bool,
    /// Its first value, if given.
    pub value: Option<Assigned<'a>>,
}

/// A gate definition.
#[derive(Debug, Clone)]
pub struct GateDefinition<'a> {
    /// The gate.
    pub name: Name<'a>,
    /// Its angles.
    pub parameters: Vec<Name<'a>>,
    /// Its qubits.
    pub qubits: Vec<Name<'a>>,
    /// What it does.
    pub body: Vec<Statement<'a>>,
}

/// A gate call.
#[derive(Debug, Clone)]
pub struct Call<'a> {
    /// Modifiers from left to right.
    pub modifiers: Vec<Modifier<'a>>,
    /// The gate.
    pub gate: Name<'a>,
    /// The angles.
    pub parameters: Vec<Expression<'a>>,
    /// The qubits.
    pub operands: Vec<Operand<'a>>,
}

/// A conditional.
#[derive(Debug, Clone)]
pub struct If<'a> {
    /// The condition.
    pub condition: Expression<'a>,
    /// What happens if it holds.
    pub then: Vec<Statement<'a>>,
    /// What happens if it does not.
    pub otherwise: Vec<Statement<'a>>,
}

/// A loop.
#[derive(Debug, Clone)]
pub struct For<'a> {
    /// The type of the variable.
    pub kind: Type<'a>,
    /// The variable.
    pub variable: Name<'a>,
    /// The values it takes.
    pub values: Values<'a>,
    /// What is repeated.
    pub body: Vec<Statement<'a>>,
}

/// The values of a loop variable.
#[derive(Debug, Clone)]
pub enum Values<'a> {
    /// `[a:b]`, `[a:s:b]`
    Range(Range<'a>, Span),
    /// `{a, b}`
    Set(Vec<Expression<'a>>),
}

/// An annotation that means something here.
#[derive(Debug, Clone)]
pub struct Annotation<'a> {
    /// What it says.
    pub kind: AnnotationKind<'a>,
    /// The annotation, from the `@`.
    pub span: Span,
}

/// The annotations.
#[derive(Debug, Clone)]
pub enum AnnotationKind<'a> {
    /// `@check`
    Check,
    /// `@logical`
    Logical,
    /// `@noise.before …`
    NoiseBefore(Channel<'a>),
    /// `@noise …`
    NoiseAfter(Channel<'a>),
}

/// A channel as written.
#[derive(Debug, Clone)]
pub struct Channel<'a> {
    /// Its name, hyphens included.
    pub name: Name<'a>,
    /// Its arguments.
    pub arguments: Vec<Argument<'a>>,
    /// Name and arguments.
    pub span: Span,
}

/// An argument of a channel.
#[derive(Debug, Clone)]
pub struct Argument<'a> {
    /// `NAME=` in front of the value.
    pub name: Option<Name<'a>>,
    /// The value; a lone name that is no constant stands for itself.
    pub value: Expression<'a>,
}
