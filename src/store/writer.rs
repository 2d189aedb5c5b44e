//! Writing a result file, in blocks, with bounded memory.
//!
//! After an error of the library its handles are forgotten instead of closed:
//! closing a file after a failed write can crash inside HDF5 (seen with a full
//! disk, versions 1.14 and 2.x).

use std::mem;
use std::path::{Path, PathBuf};

use hdf5::types::VarLenUnicode;
use hdf5::{File, Group, H5Type};
use ndarray::ArrayView1;
use sha2::{Digest, Sha256};

use super::StoreError;
use super::layout::{self, LocationRecord, SiteRecord, text};
use super::tables::{Column, Table, new_group};
use super::temporary::Temporary;
use super::{AuditBlock, FORMAT, FORMAT_VERSION, Header, ReductionHeader};
use crate::sampler::{FaultEvent, NormAudit, Rows};

/// What a [`Writer`] shall do besides writing shots.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct WriterOptions {
    /// Replace an existing file.
    pub force: bool,
    /// Make room for companion shots.
    pub companion: bool,
    /// Make room for faults, and store the table of locations.
    pub faults: bool,
}

/// What is known when all shots are there.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Finished {
    /// Shots whose acceptance ratio was above the cap; stored as attribute
    /// `clipped` of `/audit`.
    pub clipped: u64,
    /// Where entangled qubits are damped and companion shots were drawn: the
    /// trace t of the companion and the mixing weight ξ·t/(k − 1 + ξ·t) that
    /// follows. Stored as `companion_trace`, and as `mixing_weight` in the place
    /// of the one of the header.
    pub damped: Option<Damped>,
}

/// What damping of entangled qubits does to the mixing law.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Damped {
    /// Trace of the companion.
    pub companion_trace: f64,
    /// λ with that trace.
    pub mixing_weight: f64,
}

/// A result file being written. Dropped before [`Writer::finish`] it leaves
/// nothing behind.
#[derive(Debug)]
pub struct Writer {
    path: PathBuf,
    // None after an error.
    open: Option<Open>,
}

#[derive(Debug)]
struct Open {
    // Dropped in this order: first the handles, then the file they point to.
    shots: Table,
    companion: Option<Table>,
    audit: Audit,
    faults: Option<Faults>,
    file: File,
    temporary: Temporary,
}

impl Writer {
    /// Starts a file that will be called `path`.
    ///
    /// Fails at once if the file exists and `options.force` is not set, if its
    /// directory is missing or cannot be written, and if `header` holds what the
    /// format cannot.
    pub fn create(
        path: &Path,
        header: &Header,
        options: WriterOptions,
    ) -> Result<Self, StoreError> {
        header.check()?;
        let prepared = Prepared::new(header, options)?;
        let temporary = Temporary::create(path, options.force)?;
        let failed = |error| StoreError::hdf5("create", path, &error);
        let file = File::with_options()
            .with_fcpl(|plist| plist.obj_track_times(false))
            .create(temporary.path())
            .map_err(failed)?;
        match lay_out(&file, header, &prepared, options) {
            Ok((shots, companion, audit, faults)) => Ok(Writer {
                path: path.to_owned(),
                open: Some(Open {
                    shots,
                    companion,
                    audit,
                    faults,
                    file,
                    temporary,
                }),
            }),
            Err(error) => {
                mem::forget(file);
                Err(failed(error))
            }
        }
    }

    /// Appends shots; the block must have as many words a row as the header has
    /// bits.
    pub fn append_shots(&mut self, block: &Rows) -> Result<(), StoreError> {
        self.write(|open| open.shots.append(block))
    }

    /// Appends companion shots, if the file was made with room for them.
    pub fn append_companion(&mut self, block: &Rows) -> Result<(), StoreError> {
        self.write(|open| match &mut open.companion {
            Some(table) => table.append(block),
            None => Err("the file was made without companion shots".into()),
        })
    }

    /// Appends diagnostics of shots.
    pub fn append_audit(&mut self, block: &AuditBlock) -> Result<(), StoreError> {
        self.write(|open| {
            open.audit.attempts.append(&block.attempts)?;
            open.audit.peak_active.append(&block.peak_active)?;
            open.audit.terms_left.append(&block.terms_left)
        })
    }

    /// Writes the norm audit as the group `norm` of `/audit`; at most once.
    pub fn write_norms(&mut self, audit: &NormAudit) -> Result<(), StoreError> {
        self.write(|open| {
            let name = format!("{}/{}", layout::AUDIT, layout::NORM);
            let group = new_group(&open.file, &name)?;
            let mut shots = Column::create(&group, "shot")?;
            shots.append(&audit.shots)?;
            shots.flush()?;
            let mut estimates = Column::create(&group, "estimate")?;
            estimates.append(&audit.estimates)?;
            estimates.flush()?;
            number(&group, "expected", audit.expected())?;
            number(&group, "log_extent", audit.log_extent)?;
            number(&group, "terms", audit.terms)?;
            number(&group, "probes", audit.probes)
        })
    }

    /// Appends faults, if the file was made with room for them.
    pub fn append_faults(&mut self, events: &[FaultEvent]) -> Result<(), StoreError> {
        self.write(|open| {
            let Some(faults) = &mut open.faults else {
                return Err("the file was made without faults".into());
            };
            for event in events {
                faults.shot.append(&[event.shot])?;
                faults.location.append(&[event.location])?;
                faults.pauli.append(&[event.pauli])?;
            }
            Ok(())
        })
    }

    /// Writes what is left, makes the file permanent and gives it its name.
    pub fn finish(mut self, finished: Finished) -> Result<(), StoreError> {
        self.write(|open| open.complete(finished))?;
        let Some(open) = self.open.take() else {
            return Err(StoreError::GivenUp { path: self.path });
        };
        let Open {
            shots,
            companion,
            audit,
            faults,
            file,
            temporary,
        } = open;
        drop((shots, companion, audit, faults));
        let closed = file.close();
        closed.map_err(|error| StoreError::hdf5("close", &self.path, &error))?;
        temporary.publish()
    }

    /// Runs `work`; after an error forgets the handles, removes the temporary
    /// and refuses everything from then on.
    fn write(
        &mut self,
        work: impl FnOnce(&mut Open) -> hdf5::Result<()>,
    ) -> Result<(), StoreError> {
        let path = || self.path.clone();
        let Some(mut open) = self.open.take() else {
            return Err(StoreError::GivenUp { path: path() });
        };
        match work(&mut open) {
            Ok(()) => {
                self.open = Some(open);
                Ok(())
            }
            Err(error) => {
                let error = StoreError::hdf5("write", &self.path, &error);
                let Open {
                    shots,
                    companion,
                    audit,
                    faults,
                    file,
                    temporary,
                } = open;
                mem::forget((shots, companion, audit, faults, file));
                drop(temporary);
                Err(error)
            }
        }
    }
}

impl Open {
    fn complete(&mut self, finished: Finished) -> hdf5::Result<()> {
        self.shots.flush()?;
        number(&self.file, "shots", self.shots.written as u64)?;
        if let Some(companion) = &mut self.companion {
            companion.flush()?;
            number(&self.file, "companion_shots", companion.written as u64)?;
        }
        self.audit.attempts.flush()?;
        self.audit.peak_active.flush()?;
        self.audit.terms_left.flush()?;
        number(&self.audit.group, "clipped", finished.clipped)?;
        if let Some(damped) = finished.damped {
            number(&self.file, "companion_trace", damped.companion_trace)?;
            let weight = self.file.attr("mixing_weight")?;
            weight.write_scalar(&damped.mixing_weight)?;
        }
        if let Some(faults) = &mut self.faults {
            faults.shot.flush()?;
            faults.location.flush()?;
            faults.pauli.flush()?;
        }
        self.file.flush()
    }
}

/// Everything that can be refused without the library, made ready before a file
/// is there.
struct Prepared {
    texts: Vec<(&'static str, VarLenUnicode)>,
    settings: Vec<VarLenUnicode>,
    roles: Vec<VarLenUnicode>,
    sites: Vec<SiteRecord>,
    locations: Vec<LocationRecord>,
}

impl Prepared {
    fn new(header: &Header, options: WriterOptions) -> Result<Self, StoreError> {
        let sha256: String = Sha256::digest(header.circuit.as_bytes())
            .iter()
            .map(|byte| format!("{byte:02x}"))
            .collect();
        let texts = [
            ("format", Some(FORMAT)),
            ("program_version", Some(env!("CARGO_PKG_VERSION"))),
            ("circuit_name", Some(header.circuit_name.as_str())),
            ("circuit", Some(header.circuit.as_str())),
            ("circuit_sha256", Some(sha256.as_str())),
            ("noise_name", header.noise_name.as_deref()),
            ("noise", header.noise.as_deref()),
            ("title", header.title.as_deref()),
            ("readout", Some(header.readout.as_str())),
            ("correction", options.companion.then_some(super::CORRECTION)),
        ];
        let texts = texts
            .into_iter()
            .filter_map(|(name, value)| value.map(|value| Ok((name, text(value)?))))
            .collect::<Result<_, StoreError>>()?;
        let settings = header
            .settings
            .iter()
            .map(|(name, value)| text(&format!("{name}={value}")))
            .collect::<Result<_, _>>()?;
        let roles = header
            .registers
            .iter()
            .map(|register| text(&register.role))
            .collect::<Result<_, _>>()?;
        let locations = if options.faults {
            &header.locations[..]
        } else {
            &[]
        };
        Ok(Prepared {
            texts,
            settings,
            roles,
            sites: collect(&header.sites, SiteRecord::new)?,
            locations: collect(locations, LocationRecord::new)?,
        })
    }
}

fn collect<R, T>(
    rows: &[R],
    record: impl Fn(&R) -> Result<T, StoreError>,
) -> Result<Vec<T>, StoreError> {
    rows.iter().map(record).collect()
}

/// Makes all groups, tables and data sets, and writes what is known at once.
fn lay_out(
    file: &File,
    header: &Header,
    prepared: &Prepared,
    options: WriterOptions,
) -> hdf5::Result<(Table, Option<Table>, Audit, Option<Faults>)> {
    write_attributes(file, header, prepared)?;
    let sites = file.new_dataset::<SiteRecord>().packed(true);
    write_table(sites, layout::SITES, &prepared.sites)?;
    let table = |name| Table::create(file, name, &header.registers, &prepared.roles);
    let shots = table(layout::SHOTS)?;
    let companion = match options.companion {
        true => Some(table(layout::COMPANION)?),
        false => None,
    };
    let group = new_group(file, layout::AUDIT)?;
    let audit = Audit {
        attempts: Column::create(&group, "attempts")?,
        peak_active: Column::create(&group, "peak_active")?,
        terms_left: Column::create(&group, "terms_left")?,
        group,
    };
    if !options.faults {
        return Ok((shots, companion, audit, None));
    }
    let group = new_group(file, layout::FAULTS)?;
    let locations = group.new_dataset::<LocationRecord>().packed(true);
    write_table(locations, layout::LOCATIONS, &prepared.locations)?;
    let faults = Faults {
        shot: Column::create(&group, "shot")?,
        location: Column::create(&group, "location")?,
        pauli: Column::create(&group, "pauli")?,
    };
    Ok((shots, companion, audit, Some(faults)))
}

fn write_attributes(file: &File, header: &Header, prepared: &Prepared) -> hdf5::Result<()> {
    for (name, value) in &prepared.texts {
        file.new_attr::<VarLenUnicode>()
            .create(*name)?
            .write_scalar(value)?;
    }
    number(file, "format_version", FORMAT_VERSION)?;
    number(file, "seed", header.seed)?;
    number(file, "shots_total", header.shots_total)?;
    number(file, "log_extent", header.log_extent)?;
    number(file, "extent", header.log_extent.exp())?;
    number(file, "mixing_weight", header.mixing_weight)?;
    if let Some(reduction) = &header.reduction {
        let ReductionHeader {
            log_extent_as_written,
            log_extent_after_noise,
            sites_as_written,
            sites_merged,
            sites_deterministic,
            sites_unobservable,
        } = *reduction;
        number(file, "log_extent_as_written", log_extent_as_written)?;
        number(file, "log_extent_after_noise", log_extent_after_noise)?;
        number(file, "sites_as_written", sites_as_written)?;
        number(file, "sites_merged", sites_merged)?;
        number(file, "sites_deterministic", sites_deterministic)?;
        number(file, "sites_unobservable", sites_unobservable)?;
    }
    if let Some(qubits) = header.qubits {
        number(file, "qubits", qubits)?;
    }
    if let Some(delta) = header.delta {
        number(file, "delta", delta)?;
    }
    if let Some(terms) = header.terms {
        number(file, "terms", terms)?;
    }
    let part = [header.part.index, header.part.count];
    file.new_attr::<u64>()
        .shape(2)
        .create("part")?
        .write(ArrayView1::from(&part))?;
    if !prepared.settings.is_empty() {
        file.new_attr::<VarLenUnicode>()
            .shape(prepared.settings.len())
            .create("settings")?
            .write(ArrayView1::from(&prepared.settings))?;
    }
    Ok(())
}

/// One number as an attribute.
fn number<T: H5Type>(place: &Group, name: &str, value: T) -> hdf5::Result<()> {
    place.new_attr::<T>().create(name)?.write_scalar(&value)
}

fn write_table<T: H5Type>(
    builder: hdf5::DatasetBuilderEmpty,
    name: &str,
    rows: &[T],
) -> hdf5::Result<()> {
    let dataset = builder
        .obj_track_times(false)
        .shape(rows.len())
        .create(name)?;
    if !rows.is_empty() {
        dataset.write(ArrayView1::from(rows))?;
    }
    Ok(())
}

#[derive(Debug)]
struct Audit {
    attempts: Column<u32>,
    peak_active: Column<u16>,
    terms_left: Column<u32>,
    group: Group,
}

#[derive(Debug)]
struct Faults {
    shot: Column<u64>,
    location: Column<u32>,
    pauli: Column<u64>,
}
