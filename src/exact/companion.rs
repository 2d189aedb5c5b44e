//! The companion of a program as operations: its schedule, every site that
//! matters replaced by its components at random.

use num_complex::Complex64;

use crate::circuit::PauliProduct;
use crate::magic::{CczSite, Instruction, Kind, PreparedSite, RotationSite, SiteKind};
use crate::program::Program;

use super::ideal::ccz;
use super::operation::{Action, Operation};
use super::{ExactError, Law};

/// The law of the `recorded` bits, in this order, of the companion circuit of a
/// program.
///
/// The weights sum to 1 unless the program damps its register: there the
/// companion has s·ρ + (1 − s)·P0·ρ·P0 + K1·ρ·K1†, s = √(1 − γ), in the place of
/// the damping, and their sum tr P̃ enters the mixing law,
/// P_out = [(k − 1)·P + ξ·P̃]/(k − 1 + ξ·tr P̃).
///
/// # Errors
///
/// If the circuit is too large, or if its companion differs from path to path,
/// see [`ExactError`].
pub fn companion(program: &Program, recorded: &[u32]) -> Result<Law, ExactError> {
    let damped = program.damped_instructions();
    if program.branches() && program.has_damping() {
        return Err(ExactError::BranchingDamping);
    }
    let schedule = program.schedule();
    let kept: Vec<bool> = program.all_sites().map(|(_, kept)| kept).collect();
    let later = program.first_branch().unwrap_or(usize::MAX);
    let mut operations = Vec::with_capacity(schedule.instructions.len());
    for (index, instruction) in schedule.instructions.iter().enumerate() {
        let Instruction {
            kind, condition, ..
        } = instruction;
        let action = match kind {
            Kind::Clifford(gate) => Action::Clifford(gate.clone()),
            Kind::Gate { site, axes } => {
                let kept = kept[*site as usize];
                match &schedule.sites[*site as usize].kind {
                    SiteKind::Rotation(rotation) => rotated(rotation, kept, &axes[0]),
                    SiteKind::Ccz(_) if kept && index >= later => {
                        return Err(ExactError::BranchingCcz);
                    }
                    SiteKind::Ccz(_) => {
                        let axes: [PauliProduct; 3] = std::array::from_fn(|i| axes[i].clone());
                        if kept { components(axes) } else { ccz(axes) }
                    }
                    SiteKind::Prepared(_) => unreachable!("a prepared site is no gate"),
                }
            }
            Kind::Prepare { site, qubit } => match &schedule.sites[*site as usize].kind {
                SiteKind::Prepared(prepared) => prepare(prepared, kept[*site as usize], *qubit),
                _ => unreachable!("only a prepared site is prepared"),
            },
            Kind::Measure { qubit, bit, flip } => Action::Measure {
                qubit: *qubit,
                bit: *bit,
                flip: *flip,
            },
            Kind::Reset { qubit } => Action::Reset { qubit: *qubit },
            Kind::Assign { bit, value } => Action::Assign {
                bit: *bit,
                value: value.clone(),
            },
            Kind::Pauli(channel) => Action::Pauli(channel.clone()),
            Kind::Damping { qubit, gamma } if damped.contains(&index) => {
                Action::companion_damping(*qubit, *gamma)
            }
            Kind::Damping { qubit, gamma } => Action::damping(*qubit, *gamma),
        };
        operations.push(Operation {
            action,
            condition: *condition,
        });
    }
    Law::of(&operations, recorded)
}

/// Σ over members of p·Σ_b |c_b|/Σ|c|·(diag(1, i^b)), or the members as they
/// are where the site does not matter.
fn rotated(site: &RotationSite, kept: bool, axis: &PauliProduct) -> Action {
    let coherence = site
        .members
        .iter()
        .map(|member| {
            let mean = if kept {
                let sum: f64 = member.weights.iter().map(|weight| weight.norm()).sum();
                (0..)
                    .zip(member.weights)
                    .map(|(b, weight)| Complex64::I.powi(b) * (weight.norm() / sum))
                    .sum()
            } else {
                Complex64::from_polar(1.0, member.angle)
            };
            mean * member.probability
        })
        .sum();
    Action::Turn {
        axis: axis.clone(),
        coherence,
    }
}

/// (1/8)·Σ_b D_b·ρ·D_b.
fn components(axes: [PauliProduct; 3]) -> Action {
    let sign = |b: u8, value: usize| {
        if CczSite::component(b).is_negative_at(value as u8) {
            -1.0
        } else {
            1.0
        }
    };
    let mean = |s: usize, t: usize| {
        let count = f64::from(CczSite::COMPONENTS);
        (0..CczSite::COMPONENTS)
            .map(|b| sign(b, s) * sign(b, t))
            .sum::<f64>()
            / count
    };
    Action::BetweenValues {
        axes: Box::new(axes),
        table: Box::new(std::array::from_fn(|s| std::array::from_fn(|t| mean(s, t)))),
    }
}

fn prepare(site: &PreparedSite, kept: bool, qubit: u32) -> Action {
    let mut states = Vec::new();
    for member in &site.members {
        if !kept {
            states.push((member.probability, member.state));
            continue;
        }
        let sum: f64 = member.components.iter().map(|(_, c)| c.norm()).sum();
        for (component, weight) in &member.components {
            let chance = member.probability * weight.norm() / sum;
            states.push((chance, component.amplitudes()));
        }
    }
    Action::prepare(qubit, &states)
}
