//! Growing data sets: the registers of a family of shots, and plain lists of
//! numbers.
//!
//! Rows are collected until a whole chunk is there and then handed to HDF5 at
//! once, with the chunk cache off: every chunk is compressed exactly once and
//! a failing write fails where it is made.

use hdf5::plist::group_create::{AttrCreationOrder, LinkCreationOrder};
use hdf5::types::VarLenUnicode;
use hdf5::{Dataset, File, Group, H5Type};
use ndarray::{ArrayView1, ArrayView2, s};

use super::{RegisterHeader, block, layout};
use crate::sampler::Rows;

/// A group that lists its members in the order they were made.
pub(super) fn new_group(file: &File, name: &str) -> hdf5::Result<Group> {
    file.create_group_builder()
        .with_gcpl(|plist| {
            plist
                .obj_track_times(false)
                .link_creation_order(LinkCreationOrder::Indexed)
                .attr_creation_order(AttrCreationOrder::Indexed)
        })
        .create(name)
}

/// The registers of shots or companion shots.
#[derive(Debug)]
pub(super) struct Table {
    registers: Vec<Register>,
    words: usize,
    chunk: usize,
    pending: Vec<u64>,
    pending_shots: usize,
    pub written: usize,
    scratch: Vec<bool>,
}

#[derive(Debug)]
struct Register {
    dataset: Dataset,
    first: usize,
    width: usize,
}

impl Table {
    pub fn create(
        file: &File,
        name: &str,
        registers: &[RegisterHeader],
        roles: &[VarLenUnicode],
    ) -> hdf5::Result<Self> {
        let group = new_group(file, name)?;
        let bits = registers.iter().map(|register| register.width).sum();
        let chunk = layout::chunk_shots(bits);
        let mut made = Vec::with_capacity(registers.len());
        let mut first = 0;
        for (register, role) in registers.iter().zip(roles) {
            let dataset = register_dataset(&group, register, chunk)?;
            dataset
                .new_attr::<VarLenUnicode>()
                .create("role")?
                .write_scalar(role)?;
            made.push(Register {
                dataset,
                first,
                width: register.width,
            });
            first += register.width;
        }
        Ok(Table {
            registers: made,
            words: bits.div_ceil(64),
            chunk,
            pending: Vec::new(),
            pending_shots: 0,
            written: 0,
            scratch: Vec::new(),
        })
    }

    pub fn append(&mut self, block: &Rows) -> hdf5::Result<()> {
        if block.words != self.words || block.bits.len() != block.shots * block.words {
            return Err(format!(
                "a block of {} shots with {} words each has {} words; expected {} words a shot",
                block.shots,
                block.words,
                block.bits.len(),
                self.words
            )
            .into());
        }
        let mut done = 0;
        while done < block.shots {
            let count = (self.chunk - self.pending_shots).min(block.shots - done);
            let range = done * self.words..(done + count) * self.words;
            self.pending.extend_from_slice(&block.bits[range]);
            self.pending_shots += count;
            done += count;
            if self.pending_shots == self.chunk {
                self.flush()?;
            }
        }
        Ok(())
    }

    pub fn flush(&mut self) -> hdf5::Result<()> {
        let (from, to) = (self.written, self.written + self.pending_shots);
        if from == to {
            return Ok(());
        }
        for register in &self.registers {
            register.dataset.resize((to, register.width))?;
            let step = layout::chunk_columns(register.width).max(1);
            for column in (0..register.width).step_by(step) {
                let end = (column + step).min(register.width);
                let first = register.first + column;
                block::unpack(
                    &self.pending,
                    self.words,
                    first,
                    end - column,
                    &mut self.scratch,
                );
                let rows = ArrayView2::from_shape((to - from, end - column), &self.scratch)?;
                register
                    .dataset
                    .write_slice(rows, s![from..to, column..end])?;
            }
        }
        self.pending.clear();
        self.pending_shots = 0;
        self.written = to;
        Ok(())
    }
}

/// An empty data set that grows by rows.
fn register_dataset(
    group: &Group,
    register: &RegisterHeader,
    chunk: usize,
) -> hdf5::Result<Dataset> {
    let builder = group.new_dataset::<bool>().obj_track_times(false);
    if register.width == 0 {
        // A chunk needs at least one column, and must not be wider than its data
        // set unless that may grow.
        return builder
            .chunk((chunk, 1))
            .shape((0.., 0..))
            .create(register.name.as_str());
    }
    builder
        .chunk((chunk, layout::chunk_columns(register.width)))
        .chunk_cache(1, 0, 1.0)
        .deflate(layout::DEFLATE_LEVEL)
        .shape((0.., register.width))
        .create(register.name.as_str())
}

/// A growing list of numbers.
#[derive(Debug)]
pub(super) struct Column<T> {
    dataset: Dataset,
    pending: Vec<T>,
    written: usize,
}

impl<T: H5Type + Copy> Column<T> {
    pub fn create(group: &Group, name: &str) -> hdf5::Result<Self> {
        let dataset = group
            .new_dataset::<T>()
            .obj_track_times(false)
            .chunk(layout::CHUNK_NUMBERS)
            .chunk_cache(1, 0, 1.0)
            .shuffle()
            .deflate(layout::DEFLATE_LEVEL)
            .shape(0..)
            .create(name)?;
        Ok(Column {
            dataset,
            pending: Vec::new(),
            written: 0,
        })
    }

    pub fn append(&mut self, values: &[T]) -> hdf5::Result<()> {
        let mut rest = values;
        while !rest.is_empty() {
            let room = layout::CHUNK_NUMBERS - self.pending.len();
            let (now, later) = rest.split_at(room.min(rest.len()));
            self.pending.extend_from_slice(now);
            rest = later;
            if self.pending.len() == layout::CHUNK_NUMBERS {
                self.flush()?;
            }
        }
        Ok(())
    }

    pub fn flush(&mut self) -> hdf5::Result<()> {
        if self.pending.is_empty() {
            return Ok(());
        }
        let to = self.written + self.pending.len();
        self.dataset.resize(to)?;
        self.dataset
            .write_slice(ArrayView1::from(&self.pending), s![self.written..to])?;
        self.written = to;
        self.pending.clear();
        Ok(())
    }
}
