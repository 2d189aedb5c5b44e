"""A circuit that can be written as OpenQASM 3 and, apart from that, simulated.

Every call of the builder adds one statement: its text and its meaning. Where a
text says more than one statement (a loop, a broadcast, a gate definition),
`verbatim(text)` takes the text as it stands and the statements made inside give
the meaning. So the meaning never passes through a parser.
"""

import contextlib
from dataclasses import dataclass, field

import gate_matrices
from noise_channels import seconds

GROUPS = {"one-qubit": 1, "two-qubit": 2, "three-qubit": 3}


class Expression:
    """A Boolean formula over recorded bits: text and value."""

    def __init__(self, text, value):
        self.text = text
        self.value = value

    def __xor__(self, other):
        return Expression(f"({self.text} ^ {other.text})",
                          lambda bits: self.value(bits) ^ other.value(bits))

    def __and__(self, other):
        return Expression(f"({self.text} & {other.text})",
                          lambda bits: self.value(bits) & other.value(bits))

    def __or__(self, other):
        return Expression(f"({self.text} | {other.text})",
                          lambda bits: self.value(bits) | other.value(bits))

    def __invert__(self):
        return Expression(f"!{self.text}", lambda bits: 1 - self.value(bits))


class Bit(Expression):
    """One classical bit; `index` is its place in the word of all bits."""

    def __init__(self, text, index):
        super().__init__(text, lambda bits: bits >> index & 1)
        self.index = index


class Register:
    """A bit register."""

    def __init__(self, name, first, width, role, output, scalar):
        self.name, self.first, self.width = name, first, width
        self.role, self.output = role, output
        self.bits = [Bit(name if scalar else f"{name}[{i}]", first + i)
                     for i in range(width)]

    def __getitem__(self, index):
        return self.bits[index]

    def __iter__(self):
        return iter(self.bits)

    def number(self, bits):
        """The register as an integer, bit 0 least significant."""
        return bits >> self.first & ((1 << self.width) - 1)

    def compare(self, operator, integer):
        """Comparison with an integer."""
        compare = {"==": int.__eq__, "!=": int.__ne__, "<": int.__lt__,
                   "<=": int.__le__, ">": int.__gt__, ">=": int.__ge__}[operator]
        return Expression(f"{self.name} {operator} {integer}",
                          lambda bits: int(compare(self.number(bits), integer)))


@dataclass
class Statement:
    """What happens. `kind` is a library gate's unitary, or measure, reset, …"""

    kind: str
    qubits: list = field(default_factory=list)
    name: str = ""
    matrix: object = None
    parameters: tuple = ()
    bit: object = None
    value: object = None
    duration: float = None
    condition: object = None
    body: list = field(default_factory=list)
    otherwise: list = field(default_factory=list)
    before: tuple = ()
    after: tuple = ()


@dataclass
class Rule:
    """A rule of the noise file."""

    on: list
    channel: object
    place: str = "after"
    qubits: list = None

    def matches(self, statement):
        """Whether the rule applies to the statement."""
        if self.qubits is not None and not set(statement.qubits) <= set(self.qubits):
            return False
        for word in self.on:
            if word in GROUPS:
                library = statement.kind == "gate" and statement.name in gate_matrices.LIBRARY
                if library and len(statement.qubits) == GROUPS[word]:
                    return True
            elif word == (statement.name or statement.kind):
                return True
        return False

    def text(self):
        """The rule in TOML."""
        quoted = ", ".join(f'"{word}"' for word in self.on)
        lines = ["[[rule]]", f"on = [{quoted}]", f'channel = "{self.channel.text()}"']
        if self.place != "after":
            lines.append(f'place = "{self.place}"')
        if self.qubits is not None:
            lines.append(f"qubits = {list(self.qubits)}")
        return "\n".join(lines) + "\n"


def number_text(parameter):
    """A parameter is a number, or a pair (text, value)."""
    return parameter[0] if isinstance(parameter, tuple) else repr(float(parameter))


def number_value(parameter):
    """Value of such a parameter."""
    return parameter[1] if isinstance(parameter, tuple) else float(parameter)


class Circuit:
    """Builder of a circuit."""

    def __init__(self, header=True):
        self.lines = ["OPENQASM 3.0;", 'include "stdgates.inc";'] if header else []
        self.statements = []
        self.qubit_names = []
        self.registers = []
        self.rules = []
        self.bit_count = 0
        self._block = self.statements
        self._indent = ""
        self._silent = 0

    # Declarations.

    def line(self, text):
        """One line of text without meaning, such as a comment or a constant."""
        if not self._silent:
            self.lines.append(self._indent + text)

    def qubits(self, name, count=None):
        """A qubit register; returns the indices."""
        first = len(self.qubit_names)
        if count is None:
            self.line(f"qubit {name};")
            self.qubit_names.append(name)
            return [first]
        self.line(f"qubit[{count}] {name};")
        self.qubit_names += [f"{name}[{i}]" for i in range(count)]
        return list(range(first, first + count))

    def bits(self, name, count=None, role=None, output=False):
        """A bit register."""
        if role:
            self.line(f"@{role}")
        width = "" if count is None else f"[{count}]"
        self.line(f"{'output ' if output else ''}bit{width} {name};")
        register = Register(name, self.bit_count, count or 1, role or "record", output,
                            count is None)
        self.bit_count += register.width
        self.registers.append(register)
        return register

    def rule(self, on, channel, place="after", qubits=None):
        """A rule of the noise file."""
        self.rules.append(Rule(on, channel, place, qubits))

    # Statements.

    def _add(self, text, statement):
        for channel in statement.before:
            self.line(f"@noise.before {channel.text()}")
        for channel in statement.after:
            self.line(f"@noise {channel.text()}")
        self.line(text)
        self._block.append(statement)

    def _names(self, qubits):
        return ", ".join(self.qubit_names[q] for q in qubits)

    def gate(self, name, *qubits, parameters=(), noise=(), before=(),
             modifiers="", called=None, matrix=None):
        """A gate call. With modifiers, `matrix` is the whole and `called` the
        library name it matches under."""
        values = tuple(number_value(p) for p in parameters)
        if matrix is None:
            matrix = gate_matrices.matrix(name, values)
        listed = f"({', '.join(map(number_text, parameters))})" if parameters else ""
        text = f"{modifiers + ' ' if modifiers else ''}{name}{listed} {self._names(qubits)};"
        self._add(text, Statement("gate", list(qubits), called or name, matrix, values,
                                  before=tuple(before), after=tuple(noise)))

    def measure(self, qubit, bit=None, noise=(), before=()):
        """A measurement, discarded without a bit."""
        target = f"{bit.text} = " if bit is not None else ""
        self._add(f"{target}measure {self.qubit_names[qubit]};",
                  Statement("measure", [qubit], bit=bit, before=tuple(before),
                            after=tuple(noise)))

    def measure_all(self, qubits, register, noise=(), before=()):
        """One measurement each."""
        for qubit, bit in zip(qubits, register, strict=True):
            self.measure(qubit, bit, noise, before)

    def reset(self, qubit, noise=(), before=()):
        """Reset to |0⟩."""
        self._add(f"reset {self.qubit_names[qubit]};",
                  Statement("reset", [qubit], before=tuple(before), after=tuple(noise)))

    def delay(self, duration, qubit, noise=(), before=()):
        """Waiting, such as "100ns"."""
        self._add(f"delay[{duration}] {self.qubit_names[qubit]};",
                  Statement("delay", [qubit], duration=seconds(duration),
                            before=tuple(before), after=tuple(noise)))

    def assign(self, bit, expression, operator="="):
        """bit = expression, or bit ^= expression."""
        value = expression.value
        if operator == "^=":
            old, new = bit.value, value
            value = lambda bits: old(bits) ^ new(bits)
        self._add(f"{bit.text} {operator} {expression.text};",
                  Statement("assign", bit=bit, value=value))

    @contextlib.contextmanager
    def when(self, condition):
        """if (condition) { … }"""
        statement = Statement("if", condition=condition.value)
        self._block.append(statement)
        with self._inside(statement.body, f"if ({condition.text}) {{"):
            yield

    @contextlib.contextmanager
    def otherwise(self):
        """else { … } right after a `when`."""
        statement = self._block[-1]
        if not self._silent:
            self.lines.pop()
        with self._inside(statement.otherwise, "} else {"):
            yield

    @contextlib.contextmanager
    def _inside(self, block, opening):
        self.line(opening)
        outer, self._block = self._block, block
        indent, self._indent = self._indent, self._indent + "  "
        try:
            yield
        finally:
            self._block, self._indent = outer, indent
        self.line("}")

    @contextlib.contextmanager
    def verbatim(self, text):
        """The text as it stands; the statements made inside are its meaning."""
        for part in text.strip("\n").split("\n"):
            self.line(part)
        self._silent += 1
        try:
            yield
        finally:
            self._silent -= 1

    @contextlib.contextmanager
    def call(self, name, *qubits, parameters=(), noise=(), before=()):
        """A call of a gate defined in the text; the calls made inside are its body."""
        listed = f"({', '.join(map(number_text, parameters))})" if parameters else ""
        statement = Statement("call", list(qubits), name, before=tuple(before),
                              after=tuple(noise))
        self._add(f"{name}{listed} {self._names(qubits)};", statement)
        outer, self._block = self._block, statement.body
        self._silent += 1
        try:
            yield
        finally:
            self._silent -= 1
            self._block = outer

    # What comes out.

    def text(self):
        """The circuit file."""
        return "\n".join(self.lines) + "\n"

    def noise_text(self):
        """The noise file, or nothing if there are no rules."""
        return "\n".join(rule.text() for rule in self.rules)

    def recorded(self):
        """The registers that are recorded: those declared output, or else all."""
        outputs = [r for r in self.registers if r.output]
        return outputs or self.registers
