//! Gate definitions, modifiers and calls: what they unroll to, and that the
//! unitary matrix is the one their definition gives.

use super::super::gate::matrices::{
    Matrix, adjoint, controlled, elementary_matrix, identity, product, same_up_to_phase,
};
use super::super::{Action, Elementary};
use super::{check, circuit};

#[test]
fn a_definition_is_unrolled_between_the_edges_of_its_call() {
    check(
        "gate pair(a, b) x0, x1 { rz(a / 2) x0; barrier x0, x1; cx x0, x1; u1(-b) x1; }
         gate both(t) a, b { pair(t, 2 * t) b, a; }
         qubit[3] q;
         both(0.5) q[0], q[2];",
        "start both 0 2
         start pair 2 0
         rz(0.25) 2
         cx 2 0
         u1(-1) 0
         end pair 2 0
         end both 0 2",
    );
}

#[test]
fn a_definition_may_replace_a_gate_that_no_included_file_has() {
    check(
        "include \"stdgates.inc\";
         gate rzz(a) x, y { cx x, y; rz(a) y; cx x, y; }
         gate ccz a, b, c { h c; ccx a, b, c; h c; }
         qubit[3] q;
         rzz(0.5) q[0], q[1];",
        "start rzz 0 1
         cx 0 1
         rz(0.5) 1
         cx 0 1
         end rzz 0 1",
    );
}

#[test]
fn loops_and_delays_in_a_body() {
    check(
        "const int n = 2;
         gate g(a) x, y { for int i in [1:n] { rz(a * i) x; cx x, y; } delay[10ns] y; }
         qubit[2] q;
         g(0.5) q[1], q[0];
         inv @ g(0.5) q[1], q[0];",
        "start g 1 0
         rz(0.5) 1
         cx 1 0
         rz(1) 1
         cx 1 0
         delay 1e-8 0
         end g 1 0
         start g 1 0
         delay 1e-8 0
         cx 1 0
         rz(-1) 1
         cx 1 0
         rz(-0.5) 1
         end g 1 0",
    );
}

#[test]
fn inverse_and_power_of_library_gates() {
    check(
        "qubit[2] q;
         inv @ t q[0]; inv @ inv @ s q[0]; inv @ rx(0.5) q[0]; inv @ U(1, 2, 3) q[0];
         inv @ cu(1, 2, 3, 4) q[0], q[1]; inv @ iswap q[0], q[1]; inv @ sx q[0];
         pow(3) @ t q[0]; pow(-2) @ s q[0]; pow(0) @ h q[0];
         inv @ pow(-2) @ sdg q[0]; pow(2) @ pow(2) @ x q[1]; pow(2.0) @ y q[1];",
        "tdg 0
         s 0
         rx(-0.5) 0
         U(-1, -3, -2) 0
         cu(-1, -3, -2, -4) 0 1
         iswap~ 0 1
         sxdg 0
         t 0
         t 0
         t 0
         sdg 0
         sdg 0
         sdg 0
         sdg 0
         x 1
         x 1
         x 1
         x 1
         y 1
         y 1",
    );
}

#[test]
fn controls_lead_to_library_gates() {
    let half_pi = std::f64::consts::FRAC_PI_2;
    check(
        "qubit[3] q;
         ctrl @ x q[0], q[1]; ctrl(2) @ x q[0], q[1], q[2];",
        "cx 0 1
         ccx 0 1 2",
    );
    check(
        "qubit[3] q;
         ctrl@z q[0], q[1];
         ctrl @ ctrl @ z q[0], q[1], q[2];
         ctrl @ p(0.5) q[2], q[0];
         ctrl @ rz(0.5) q[2], q[0];
         ctrl @ swap q[0], q[1], q[2];
         ctrl @ U(1, 2, 3) q[0], q[1];
         ctrl @ gphase(0.5) q[1];
         ctrl(2) @ gphase(0.5) q[1], q[2];
         ctrl @ s q[0], q[1];
         ctrl @ inv @ s q[0], q[1];
         inv @ ctrl @ s q[0], q[1];
         ctrl @ pow(2) @ x q[0], q[1];
         ctrl @ cx q[0], q[1], q[2];
         gphase(1.0);",
        &format!(
            "cz 0 1
             ccz 0 1 2
             cp(0.5) 2 0
             crz(0.5) 2 0
             cswap 0 1 2
             cu(1, 2, 3, 0.5) 0 1
             p(0.5) 1
             cp(0.5) 1 2
             cp({half_pi}) 0 1
             cp(-{half_pi}) 0 1
             cp(-{half_pi}) 0 1
             cx 0 1
             cx 0 1
             ccx 0 1 2"
        ),
    );
}

#[test]
fn negative_controls_stay_one_call() {
    check(
        "qubit[3] q;
         negctrl @ x q[0], q[1];
         negctrl @ ctrl @ x q[2], q[0], q[1];
         ctrl @ negctrl @ x q[2], q[0], q[1];
         negctrl(2) @ z q[0], q[1], q[2];",
        "cx!1 0 1
         ccx!1 2 0 1
         ccx!10 2 0 1
         ccz!11 0 1 2",
    );
}

#[test]
fn controls_go_to_every_gate_of_a_body() {
    check(
        "gate g(a) x, y { h x; cx x, y; gphase(a); barrier x; inv @ s y; }
         qubit[3] q;
         ctrl @ g(0.5) q[2], q[0], q[1];
         inv @ negctrl @ g(0.5) q[2], q[0], q[1];",
        &format!(
            "start g 2 0 1
             ch 2 0
             ccx 2 0 1
             p(0.5) 2
             cp(-{0}) 2 1
             end g 2 0 1
             start g 2 0 1
             cp!1({0}) 2 1
             p!1(-0.5) 2
             ccx!1 2 0 1
             ch!1 2 0
             end g 2 0 1",
            std::f64::consts::FRAC_PI_2
        ),
    );
}

#[test]
fn calls_are_broadcast_before_they_are_unrolled() {
    check(
        "gate g a, b { cz a, b; }
         qubit[2] q; qubit r;
         pow(2) @ g q, r;",
        "start g 0 2
         cz 0 2
         end g 0 2
         start g 0 2
         cz 0 2
         end g 0 2
         start g 1 2
         cz 1 2
         end g 1 2
         start g 1 2
         cz 1 2
         end g 1 2",
    );
}

/// The unitary matrix of a text without measurements, qubit 0 the most
/// significant bit.
fn unitary(source: &str) -> Matrix {
    let circuit = circuit(source);
    let qubits = circuit.qubits.len();
    let mut matrix = identity(1 << qubits);
    for operation in &circuit.operations {
        let Action::Gate {
            gate,
            parameters,
            qubits: places,
        } = &operation.action
        else {
            continue;
        };
        for elementary in gate.expand(parameters) {
            let placed = placed(&elementary, places);
            matrix = product(&elementary_matrix(&placed, qubits), &matrix);
        }
    }
    matrix
}

fn placed(elementary: &Elementary<u8>, places: &[u32]) -> Elementary<u8> {
    use super::super::Clifford as C;
    let at = |position: &u8| places[usize::from(*position)] as u8;
    let product = |axis: &super::super::PauliProduct<u8>| {
        axis.iter()
            .map(|(position, letter)| (at(position), *letter))
            .collect()
    };
    match elementary {
        Elementary::Rotation { axis, angle } => Elementary::Rotation {
            axis: product(axis),
            angle: *angle,
        },
        Elementary::Ccz(three) => Elementary::Ccz(three.map(|position| at(&position))),
        Elementary::Clifford(gate) => Elementary::Clifford(match gate {
            C::X(a) => C::X(at(a)),
            C::Y(a) => C::Y(at(a)),
            C::Z(a) => C::Z(at(a)),
            C::H(a) => C::H(at(a)),
            C::S(a) => C::S(at(a)),
            C::Sdg(a) => C::Sdg(at(a)),
            C::Cx(a, b) => C::Cx(at(a), at(b)),
            C::Cz(a, b) => C::Cz(at(a), at(b)),
            C::Swap(a, b) => C::Swap(at(a), at(b)),
            C::QuarterTurn(axis) => C::QuarterTurn(product(axis)),
        }),
    }
}

const BODY: &str = "gate g(a, b) x, y {
    u3(a, b, 0.3) x; cx x, y; u2(b, a) y; sx x; gphase(a * b); inv @ U(b, a, -a) y; cx y, x;
    for int i in [1:2] { ry(a * i) x; t y; }
} ";

#[test]
fn modified_gates_have_the_matrix_their_definition_gives() {
    let plain = unitary(&format!("{BODY} qubit[2] q; g(0.7, -1.9) q[0], q[1];"));
    let inverse = unitary(&format!(
        "{BODY} qubit[2] q; inv @ g(0.7, -1.9) q[0], q[1];"
    ));
    assert!(same_up_to_phase(&inverse, &adjoint(&plain)));
    let cubed = unitary(&format!(
        "{BODY} qubit[2] q; pow(3) @ g(0.7, -1.9) q[0], q[1];"
    ));
    assert!(same_up_to_phase(
        &cubed,
        &product(&plain, &product(&plain, &plain))
    ));
    let undone = unitary(&format!(
        "{BODY} qubit[2] q; g(0.7, -1.9) q[0], q[1]; pow(-1) @ g(0.7, -1.9) q[0], q[1];"
    ));
    assert!(same_up_to_phase(&undone, &identity(4)));
}

#[test]
fn a_controlled_definition_keeps_the_phase_of_its_body() {
    // The phase of a body shows when it is controlled. Written out with the
    // definitions of the standard library, the two bodies below are the same
    // gate; only `x` carries no phase of its own.
    let controlled_x = controlled(&[true], &unitary("qubit q; x q;"));
    for body in [
        "U(pi, 0, pi) a; gphase(-pi / 2);",
        "h a; z a; h a;",
        "sx a; sx a;",
        "rx(pi) a; gphase(pi / 2);",
        "u3(pi, 0, pi) a; gphase(pi / 2);",
        "h a; s a; inv @ sdg a; h a;",
    ] {
        let text = format!("gate g a {{ {body} }} qubit[2] q; ctrl @ g q[0], q[1];");
        assert!(same_up_to_phase(&unitary(&text), &controlled_x), "{body}");
        let text = format!("gate g a {{ {body} }} qubit[2] q; negctrl @ g q[0], q[1]; g q[1];");
        assert!(same_up_to_phase(&unitary(&text), &controlled_x), "{body}");
    }
}
