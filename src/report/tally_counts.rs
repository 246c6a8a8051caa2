//! Copies of chosen alleles, looked up in the rows of a tally.
#![cfg_attr(not(test), deny(clippy::indexing_slicing))]

use std::collections::{HashMap, HashSet};
use std::fs::File;
use std::path::Path;

use parquet::file::reader::{FileReader, RowGroupReader, SerializedFileReader};
use parquet::file::statistics::Statistics;
use parquet::record::{Field, Row};
use parquet::schema::types::Type;

use super::tally::faulty;
use crate::error::{Error, Result, guarded};

/// Copies and gene copies typed by contig, position, allele and stratum.
#[derive(Debug, Clone, Default)]
pub struct TalliedCounts {
    counts: HashMap<(String, u64, String, String), (u32, u32)>,
}

impl TalliedCounts {
    /// Looks up every allele at the places wanted, in the strata named. Several tallies may be taken
    /// one after the other.
    ///
    /// # Errors
    /// [`Error::Io`] where the file cannot be opened, [`Error::Calls`] where it is no tally, is damaged,
    /// or lacks a stratum.
    pub fn take(
        &mut self,
        path: &Path,
        strata: &[&str],
        wanted: &HashSet<(&str, u64)>,
    ) -> Result<()> {
        let file = File::open(path).map_err(|e| Error::io(path, "open", e))?;
        guarded("its rows cannot be read", || {
            self.rows(file, strata, wanted)
        })
        .map_err(|problem| {
            let cure = "give what 'genewane tally' wrote from the calls of this report";
            faulty(path, &problem, cure)
        })
    }

    /// The counts of one allele in one stratum.
    pub fn of(
        &self,
        contig: &str,
        position: u64,
        allele: &str,
        stratum: &str,
    ) -> Option<(u32, u32)> {
        let key = (
            contig.to_owned(),
            position,
            allele.to_owned(),
            stratum.to_owned(),
        );
        self.counts.get(&key).copied()
    }

    fn rows(
        &mut self,
        file: File,
        strata: &[&str],
        wanted: &HashSet<(&str, u64)>,
    ) -> std::result::Result<(), String> {
        let told = |e: parquet::errors::ParquetError| format!("it cannot be read: {e}");
        let reader = SerializedFileReader::new(file).map_err(told)?;
        let metadata = reader.metadata().file_metadata();
        let columns = columns(metadata.schema(), strata)?;
        for i in 0..reader.num_row_groups() {
            let group = reader.get_row_group(i).map_err(told)?;
            if !may_hold(group.as_ref(), wanted) {
                continue;
            }
            for row in group.get_row_iter(Some(columns.clone())).map_err(told)? {
                self.row(&row.map_err(told)?, wanted);
            }
        }
        Ok(())
    }

    fn row(&mut self, row: &Row, wanted: &HashSet<(&str, u64)>) -> Option<()> {
        let cells: HashMap<&str, &Field> = row
            .get_column_iter()
            .map(|(name, field)| (name.as_str(), field))
            .collect();
        let (Field::Str(contig), Field::Long(position), Field::Str(alleles)) = (
            cells.get("contig")?,
            cells.get("position")?,
            cells.get("alleles")?,
        ) else {
            return None;
        };
        let position = u64::try_from(*position).ok()?;
        if !wanted.contains(&(contig.as_str(), position)) {
            return None;
        }
        for (name, field) in &cells {
            let (Some(stratum), Field::ListInternal(copies)) =
                (name.strip_prefix("copies:"), field)
            else {
                continue;
            };
            let copies: Vec<u32> = copies
                .elements()
                .iter()
                .map(|field| match field {
                    Field::Int(n) => u32::try_from(*n).unwrap_or(0),
                    _ => 0,
                })
                .collect();
            // Copies that do not add up are no copies: the place then counts as not looked up.
            let sum = copies.iter().try_fold(0u32, |sum, &n| sum.checked_add(n));
            let Some(all) = sum else { continue };
            for (allele, &n) in alleles.split(',').zip(&copies) {
                let key = (
                    contig.clone(),
                    position,
                    allele.to_owned(),
                    stratum.to_owned(),
                );
                self.counts.insert(key, (n, all));
            }
        }
        Some(())
    }
}

/// The columns that are read, as a schema of their own.
fn columns(schema: &Type, strata: &[&str]) -> std::result::Result<Type, String> {
    let mut names: Vec<String> = ["contig", "position", "alleles"].map(str::to_owned).into();
    names.extend(strata.iter().map(|stratum| format!("copies:{stratum}")));
    let fields = schema.get_fields();
    let mut chosen = Vec::new();
    for name in &names {
        let field = fields.iter().find(|field| field.name() == name);
        let field = field.ok_or_else(|| format!("it has no column '{name}'"))?;
        chosen.push(field.clone());
    }
    Type::group_type_builder(schema.name())
        .with_fields(chosen)
        .build()
        .map_err(|e| e.to_string())
}

/// Whether a group of rows can hold a place, by the least and the greatest position in it.
fn may_hold(group: &dyn RowGroupReader, wanted: &HashSet<(&str, u64)>) -> bool {
    let mut columns = group.metadata().columns().iter();
    let position = columns.find(|c| c.column_path().string() == "position");
    let Some(Statistics::Int64(of)) = position.and_then(|c| c.statistics()) else {
        return true;
    };
    let (Some(&low), Some(&high)) = (of.min_opt(), of.max_opt()) else {
        return true;
    };
    let inside = |at: u64| i64::try_from(at).is_ok_and(|at| (low..=high).contains(&at));
    wanted.iter().any(|&(_, at)| inside(at))
}
