//! Reading a result file, in blocks, with bounded memory.

use std::fs;
use std::io::{self, Read};
use std::ops::Range;
use std::path::{Path, PathBuf};

use hdf5::types::VarLenUnicode;
use hdf5::{Dataset, File, Group, H5Type, IndexType, IterationOrder};
use ndarray::{Array1, Array2, s};

use super::layout::{self, LocationRecord, SiteRecord, plain};
use super::{AuditBlock, FORMAT, FORMAT_VERSION, Header};
use super::{Part, ReductionHeader, RegisterHeader, StoreError, block};
use crate::sampler::{Family, FaultEvent, NormAudit, Rows};

/// Most bits a register may have; far more than a circuit can declare.
const MOST_BITS: usize = 1 << 24;

/// A result file opened for reading.
#[derive(Debug)]
pub struct ShotFile {
    path: PathBuf,
    header: Header,
    program_version: String,
    shots: Registers,
    companion: Option<Registers>,
    audit: Group,
    clipped: u64,
    faults: Option<Group>,
    // Closed last.
    file: File,
}

/// The data sets of one family.
#[derive(Debug)]
struct Registers {
    datasets: Vec<Dataset>,
    shots: usize,
}

impl ShotFile {
    /// Opens a result and reads all but the shots.
    ///
    /// Refuses what is not HDF5, not a shot record, of a newer format, or
    /// inconsistent in itself, each with its own error.
    pub fn open(path: &Path) -> Result<Self, StoreError> {
        let file = open_hdf5(path)?;
        let source = Source { path, file: &file };
        source.check_format()?;
        let (registers, datasets) = source.registers(layout::SHOTS)?;
        let shots = source.family(datasets, &registers, "shots")?;
        let companion = match source.optional::<u64>("companion_shots")? {
            None => None,
            Some(_) => {
                let (found, datasets) = source.registers(layout::COMPANION)?;
                if found != registers {
                    return Err(
                        source.damaged("the companion registers differ from those of the shots")
                    );
                }
                Some(source.family(datasets, &registers, "companion_shots")?)
            }
        };
        let audit = source.group(layout::AUDIT)?;
        let clipped = source.attribute::<u64>(&audit, "clipped")?;
        let faults = match file.link_exists(layout::FAULTS) {
            true => Some(source.group(layout::FAULTS)?),
            false => None,
        };
        Ok(ShotFile {
            path: path.to_owned(),
            header: source.header(registers, faults.as_ref())?,
            program_version: source.text("program_version")?,
            shots,
            companion,
            audit,
            clipped,
            faults,
            file,
        })
    }

    /// What the file says about the run.
    pub fn header(&self) -> &Header {
        &self.header
    }

    /// Version of the program that wrote the file.
    pub fn program_version(&self) -> &str {
        &self.program_version
    }

    /// Where the file is.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Number of rows; `None` where the run drew no companion shots.
    pub fn rows(&self, family: Family) -> Option<usize> {
        self.family(family).map(|registers| registers.shots)
    }

    /// Shots whose acceptance ratio was above the cap.
    pub fn clipped(&self) -> u64 {
        self.clipped
    }

    /// The rows in order, all registers packed as they were written.
    pub fn blocks(&self, family: Family) -> Blocks<'_> {
        Blocks {
            file: self,
            family,
            next: 0,
        }
    }

    /// Diagnostics of the shots `range`, cut to those that are there.
    pub fn audit(&self, range: Range<usize>) -> Result<AuditBlock, StoreError> {
        Ok(AuditBlock {
            attempts: self.column(&self.audit, "attempts", &range)?,
            peak_active: self.column(&self.audit, "peak_active", &range)?,
            terms_left: self.column(&self.audit, "terms_left", &range)?,
        })
    }

    /// The norm audit; `None` where none was made.
    pub fn norm_audit(&self) -> Result<Option<NormAudit>, StoreError> {
        let Ok(group) = self.audit.group(layout::NORM) else {
            return Ok(None);
        };
        let source = Source {
            path: &self.path,
            file: &self.file,
        };
        let all = 0..MOST_TABLE_ROWS;
        let audit = NormAudit {
            shots: self.column(&group, "shot", &all)?,
            estimates: self.column(&group, "estimate", &all)?,
            log_extent: source.attribute(&group, "log_extent")?,
            terms: source.attribute(&group, "terms")?,
            probes: source.attribute(&group, "probes")?,
        };
        if audit.shots.len() != audit.estimates.len() {
            return Err(self.damaged("the lists of the norm audit differ in length"));
        }
        Ok(Some(audit))
    }

    /// Number of faults recorded; `None` if they were not.
    pub fn fault_count(&self) -> Result<Option<usize>, StoreError> {
        let Some(group) = &self.faults else {
            return Ok(None);
        };
        let dataset = group.dataset("shot").map_err(|error| self.failed(&error))?;
        Ok(Some(dataset.size()))
    }

    /// The faults `range`, cut to those that are there; empty if none were
    /// recorded.
    pub fn faults(&self, range: Range<usize>) -> Result<Vec<FaultEvent>, StoreError> {
        let Some(group) = &self.faults else {
            return Ok(Vec::new());
        };
        let shots: Vec<u64> = self.column(group, "shot", &range)?;
        let locations: Vec<u32> = self.column(group, "location", &range)?;
        let paulis: Vec<u64> = self.column(group, "pauli", &range)?;
        if shots.len() != locations.len() || shots.len() != paulis.len() {
            return Err(self.damaged("the lists of faults differ in length"));
        }
        let events = shots.into_iter().zip(locations).zip(paulis);
        Ok(events
            .map(|((shot, location), pauli)| FaultEvent {
                shot,
                location,
                pauli,
            })
            .collect())
    }

    fn family(&self, family: Family) -> Option<&Registers> {
        match family {
            Family::Shots => Some(&self.shots),
            Family::Companion => self.companion.as_ref(),
            // Audited draws leave no bits.
            Family::Audit => None,
        }
    }

    fn column<T: H5Type + Clone>(
        &self,
        group: &Group,
        name: &str,
        range: &Range<usize>,
    ) -> Result<Vec<T>, StoreError> {
        let read = || -> hdf5::Result<Vec<T>> {
            let dataset = group.dataset(name)?;
            let end = range.end.min(dataset.size());
            let start = range.start.min(end);
            let values: Array1<T> = dataset.read_slice_1d(s![start..end])?;
            Ok(values.to_vec())
        };
        read().map_err(|error| self.failed(&error))
    }

    fn failed(&self, error: &hdf5::Error) -> StoreError {
        StoreError::hdf5("read", &self.path, error)
    }

    fn damaged(&self, what: &str) -> StoreError {
        StoreError::Damaged {
            path: self.path.clone(),
            what: what.to_owned(),
        }
    }
}

/// Iterator over the rows of one family, see [`ShotFile::blocks`].
#[derive(Debug)]
pub struct Blocks<'a> {
    file: &'a ShotFile,
    family: Family,
    next: usize,
}

impl Blocks<'_> {
    fn read(&self, registers: &Registers, rows: Range<usize>) -> Result<Rows, StoreError> {
        let header = &self.file.header;
        let mut block = Rows::zeros(rows.len(), header.bits());
        let mut first = 0;
        for (register, dataset) in header.registers.iter().zip(&registers.datasets) {
            let step = layout::chunk_columns(register.width).max(1);
            for column in (0..register.width).step_by(step) {
                let end = (column + step).min(register.width);
                // Read as numbers: a damaged file may hold other bytes than 0 and 1.
                let values: Array2<u8> = dataset
                    .read_slice_2d(s![rows.clone(), column..end])
                    .map_err(|error| self.file.failed(&error))?;
                let values = values.as_standard_layout();
                let bytes = values.as_slice().unwrap_or(&[]);
                if bytes.iter().any(|&byte| byte > 1) {
                    let what = format!("{} holds values other than FALSE and TRUE", dataset.name());
                    return Err(self.file.damaged(&what));
                }
                block::pack(bytes, end - column, first + column, &mut block);
            }
            first += register.width;
        }
        Ok(block)
    }
}

impl Iterator for Blocks<'_> {
    type Item = Result<Rows, StoreError>;

    fn next(&mut self) -> Option<Self::Item> {
        let registers = self.file.family(self.family)?;
        let step = layout::chunk_shots(self.file.header.bits());
        let rows = self.next..registers.shots.min(self.next.saturating_add(step));
        if rows.is_empty() {
            return None;
        }
        self.next = rows.end;
        let block = self.read(registers, rows);
        if block.is_err() {
            self.next = usize::MAX;
        }
        Some(block)
    }
}

/// Opens the file for reading only, telling apart why it cannot be.
fn open_hdf5(path: &Path) -> Result<File, StoreError> {
    let found = match fs::metadata(path) {
        Ok(found) => found,
        Err(error) if error.kind() == io::ErrorKind::NotFound => {
            return Err(StoreError::Missing {
                path: path.to_owned(),
            });
        }
        Err(error) => return Err(StoreError::io("read", path, error)),
    };
    if !found.is_file() {
        return Err(StoreError::NotHdf5 {
            path: path.to_owned(),
        });
    }
    File::open(path).map_err(|error| match starts_like_hdf5(path) {
        Ok(true) => StoreError::hdf5("open", path, &error),
        Ok(false) => StoreError::NotHdf5 {
            path: path.to_owned(),
        },
        Err(error) => StoreError::io("read", path, error),
    })
}

/// Whether the file starts with the format signature.
fn starts_like_hdf5(path: &Path) -> io::Result<bool> {
    let mut start = Vec::new();
    fs::File::open(path)?.take(8).read_to_end(&mut start)?;
    Ok(start == b"\x89HDF\r\n\x1a\n")
}

/// The open file while its description is being read.
struct Source<'a> {
    path: &'a Path,
    file: &'a File,
}

impl Source<'_> {
    fn check_format(&self) -> Result<(), StoreError> {
        let not_a_record = |found: String| StoreError::NotShotRecord {
            path: self.path.to_owned(),
            found,
        };
        let format = self
            .file
            .attr("format")
            .and_then(|attribute| attribute.read_scalar::<VarLenUnicode>())
            .map_err(|_| not_a_record("it has no text attribute `format`".into()))?;
        if plain(&format) != FORMAT {
            return Err(not_a_record(format!("its format is {:?}", plain(&format))));
        }
        let version = self.attribute::<u64>(self.file, "format_version")?;
        if version > FORMAT_VERSION {
            return Err(StoreError::NewerFormat {
                path: self.path.to_owned(),
                found: version,
                known: FORMAT_VERSION,
            });
        }
        Ok(())
    }

    fn header(
        &self,
        registers: Vec<RegisterHeader>,
        faults: Option<&Group>,
    ) -> Result<Header, StoreError> {
        let locations = match faults {
            Some(group) => self.table::<LocationRecord>(group, layout::LOCATIONS)?,
            None => Vec::new(),
        };
        let sites = self.table::<SiteRecord>(self.file, layout::SITES)?;
        Ok(Header {
            circuit_name: self.text("circuit_name")?,
            circuit: self.text("circuit")?,
            noise_name: self.optional_text("noise_name")?,
            noise: self.optional_text("noise")?,
            title: self.optional_text("title")?,
            qubits: self.optional("qubits")?,
            seed: self.attribute(self.file, "seed")?,
            delta: self.optional("delta")?,
            readout: self.text("readout")?,
            log_extent: self.attribute(self.file, "log_extent")?,
            reduction: self.reduction()?,
            terms: self.optional("terms")?,
            mixing_weight: self.attribute(self.file, "mixing_weight")?,
            shots_total: self.attribute(self.file, "shots_total")?,
            part: self.part()?,
            settings: self.settings()?,
            registers,
            sites: sites.iter().map(SiteRecord::row).collect(),
            locations: locations.iter().map(LocationRecord::row).collect(),
        })
    }

    fn reduction(&self) -> Result<Option<ReductionHeader>, StoreError> {
        let Some(sites_as_written) = self.optional("sites_as_written")? else {
            return Ok(None);
        };
        Ok(Some(ReductionHeader {
            log_extent_as_written: self.attribute(self.file, "log_extent_as_written")?,
            log_extent_after_noise: self.attribute(self.file, "log_extent_after_noise")?,
            sites_as_written,
            sites_merged: self.attribute(self.file, "sites_merged")?,
            sites_deterministic: self.attribute(self.file, "sites_deterministic")?,
            sites_unobservable: self.attribute(self.file, "sites_unobservable")?,
        }))
    }

    fn part(&self) -> Result<Part, StoreError> {
        match self.list::<u64>("part")?[..] {
            [index, count] => Ok(Part { index, count }),
            _ => Err(self.damaged("the attribute `part` does not hold two numbers")),
        }
    }

    fn settings(&self) -> Result<Vec<(String, String)>, StoreError> {
        if self.file.attr("settings").is_err() {
            return Ok(Vec::new());
        }
        let lines = self.list::<VarLenUnicode>("settings")?;
        let pairs = lines.iter().map(|line| {
            let line = plain(line);
            let (name, value) = line.split_once('=').unwrap_or((&line, ""));
            (name.to_owned(), value.to_owned())
        });
        Ok(pairs.collect())
    }

    /// The registers of a group in the order they were made, with their data
    /// sets.
    fn registers(&self, name: &str) -> Result<(Vec<RegisterHeader>, Vec<Dataset>), StoreError> {
        let group = self.group(name)?;
        let mut names = Vec::new();
        let visited = group.iter_visit(
            IndexType::CreationOrder,
            IterationOrder::Increasing,
            |name, _| {
                names.push(name.to_owned());
                Ok(())
            },
        );
        if visited.is_err() {
            // A copy may have lost the order.
            names = group.member_names().map_err(|error| self.failed(&error))?;
        }
        let mut registers = Vec::with_capacity(names.len());
        let mut datasets = Vec::with_capacity(names.len());
        for register in names {
            let wrong = |what: &str| self.damaged(&format!("/{name}/{register} {what}"));
            let dataset = group
                .dataset(&register)
                .map_err(|_| wrong("is not a data set"))?;
            let [_, width] = dataset.shape()[..] else {
                return Err(wrong("does not have two dimensions"));
            };
            if width > MOST_BITS {
                return Err(wrong("is wider than any register can be"));
            }
            let is_bool = dataset.dtype().is_ok_and(|found| found.is::<bool>());
            if !is_bool {
                return Err(wrong("does not hold the enumeration FALSE, TRUE"));
            }
            let role = dataset
                .attr("role")
                .and_then(|attribute| attribute.read_scalar::<VarLenUnicode>())
                .map_err(|_| wrong("has no text attribute `role`"))?;
            registers.push(RegisterHeader {
                name: register,
                role: plain(&role),
                width,
            });
            datasets.push(dataset);
        }
        Ok((registers, datasets))
    }

    /// The data sets with their number of rows, which must be that of the root
    /// attribute `count` for all.
    fn family(
        &self,
        datasets: Vec<Dataset>,
        registers: &[RegisterHeader],
        count: &str,
    ) -> Result<Registers, StoreError> {
        let shots = self.attribute::<u64>(self.file, count)?;
        for (dataset, register) in datasets.iter().zip(registers) {
            let rows = dataset.shape().first().map_or(0, |&rows| rows as u64);
            if rows != shots {
                return Err(self.damaged(&format!(
                    "register {} has {rows} rows; the attribute `{count}` says {shots}",
                    register.name
                )));
            }
        }
        let shots = usize::try_from(shots)
            .map_err(|_| self.damaged(&format!("the attribute `{count}` is {shots}")))?;
        Ok(Registers { datasets, shots })
    }

    fn group(&self, name: &str) -> Result<Group, StoreError> {
        self.file
            .group(name)
            .map_err(|_| self.damaged(&format!("the group /{name} is missing")))
    }

    fn table<T: H5Type>(&self, place: &Group, name: &str) -> Result<Vec<T>, StoreError> {
        let read = || -> hdf5::Result<Vec<T>> {
            let dataset = place.dataset(name)?;
            if dataset.size() > MOST_TABLE_ROWS {
                return Err(format!("{} rows", dataset.size()).into());
            }
            dataset.read_raw()
        };
        read().map_err(|error| self.damaged(&format!("the table {name} cannot be read: {error}")))
    }

    fn text(&self, name: &str) -> Result<String, StoreError> {
        let missing = || self.damaged(&format!("the text attribute `{name}` is missing"));
        self.optional_text(name)?.ok_or_else(missing)
    }

    fn optional_text(&self, name: &str) -> Result<Option<String>, StoreError> {
        Ok(self
            .optional::<VarLenUnicode>(name)?
            .map(|text| plain(&text)))
    }

    fn attribute<T: H5Type>(&self, place: &Group, name: &str) -> Result<T, StoreError> {
        place
            .attr(name)
            .and_then(|attribute| attribute.read_scalar())
            .map_err(|error| self.damaged(&format!("attribute `{name}`: {error}")))
    }

    fn optional<T: H5Type>(&self, name: &str) -> Result<Option<T>, StoreError> {
        let names = self
            .file
            .attr_names()
            .map_err(|error| self.failed(&error))?;
        match names.iter().any(|found| found == name) {
            true => self.attribute(self.file, name).map(Some),
            false => Ok(None),
        }
    }

    fn list<T: H5Type>(&self, name: &str) -> Result<Vec<T>, StoreError> {
        self.file
            .attr(name)
            .and_then(|attribute| attribute.read_raw())
            .map_err(|error| self.damaged(&format!("attribute `{name}`: {error}")))
    }

    fn failed(&self, error: &hdf5::Error) -> StoreError {
        StoreError::hdf5("read", self.path, error)
    }

    fn damaged(&self, what: &str) -> StoreError {
        StoreError::Damaged {
            path: self.path.to_owned(),
            what: what.to_owned(),
        }
    }
}

/// A table with more rows than any circuit can have is not one of ours.
const MOST_TABLE_ROWS: usize = 1 << 26;
