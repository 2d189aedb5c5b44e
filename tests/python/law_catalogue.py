"""All circuits of the mixing law: name, function, numbers of terms, read-outs."""

from collections.abc import Callable
from dataclasses import dataclass

import law_cases as cases
import law_cases_adaptive as adaptive
import law_cases_damping as damping
import law_cases_rotations as rotations

BOTH = ("probe", "walk")
WALK = ("walk",)


@dataclass(frozen=True)
class Case:
    """A circuit and how it is drawn."""

    build: Callable
    terms: tuple
    readouts: tuple = BOTH


CASES = {
    "one t": Case(cases.one_t, (2, 5)),
    "one rotation": Case(cases.one_rotation, (2, 4)),
    "negative rotation": Case(cases.negative_rotation, (3,)),
    "dephased t": Case(cases.dephased_t, (2, 4)),
    "face states": Case(cases.face_states, (3,)),
    "noisy face states": Case(cases.noisy_face_states, (2,)),
    "generic states": Case(cases.generic_states, (2, 4)),
    "one ccz": Case(cases.one_ccz, (2, 6)),
    "two ccz": Case(cases.two_ccz, (4,)),
    "ccz among t": Case(cases.ccz_among_t, (4,)),
    "ghz of t": Case(cases.ghz_of_t, (3,)),
    "toffoli and swap": Case(cases.toffoli_and_swap, (3,)),
    "entangled t": Case(cases.entangled_t, (2, 5)),
    "depolarized t": Case(cases.depolarized_t, (2,)),
    "pauli axes": Case(cases.pauli_axes, (3, 8)),
    "noise in between": Case(cases.noise_in_between, (2,)),
    "noise that reaches a site": Case(cases.noise_that_reaches_a_site, (2,)),
    "state after a measurement": Case(cases.state_after_a_measurement, (10,)),
    "injection": Case(cases.injection, (3,)),
    "three angles": Case(rotations.three_angles, (2, 5)),
    "small angles": Case(rotations.small_angles, (2,)),
    "dephased rotations": Case(rotations.dephased_rotations, (2, 5)),
    "depolarized rotation": Case(rotations.depolarized_rotation, (2,)),
    "over-rotated": Case(rotations.over_rotated, (3,)),
    "flips before rotations": Case(rotations.flips_before_rotations, (3,)),
    "t after measurement": Case(adaptive.t_after_measurement, (2, 4), WALK),
    "rotation in a branch": Case(adaptive.rotation_in_a_branch, (2,), WALK),
    "ccz after feedback": Case(adaptive.ccz_after_feedback, (3,), WALK),
    "reset and again": Case(adaptive.reset_and_again, (2,), WALK),
    "teleported t": Case(adaptive.teleported_t, (2,), WALK),
    "damped pair": Case(damping.damped_pair, (2, 5), WALK),
    "damped strongly": Case(damping.damped_strongly, (2,), WALK),
    "damped clifford": Case(damping.damped_clifford, (2,), WALK),
    "damped often": Case(damping.damped_often, (2,), WALK),
    "damped in a gate": Case(damping.damped_in_a_gate, (3,), WALK),
    "relaxed pair": Case(damping.relaxed_pair, (2,), WALK),
    "damped after measurement": Case(damping.damped_after_measurement, (2,), WALK),
    "damped in a branch": Case(damping.damped_in_a_branch, (2,), WALK),
    "damped face state": Case(damping.damped_face_state, (2,), WALK),
}
