//! Writes the stiffness and mass matrices of a tower as it stands, for an
//! independent eigenvalue solver:
//!
//! ```text
//! cargo run --release --example write_matrices -- TOWER.toml DIRECTORY
//! ```
//!
//! `K.mtx` (unfactored or factored section properties, whichever the period
//! checks use) and `M.mtx` are real symmetric in Matrix Market coordinate form
//! (Boisvert, Pozo and Remington 1996, NISTIR 5935): lower triangle, counted
//! from 1, SI units, every digit that a double holds.

use std::error::Error;
use std::fmt::Write as _;
use std::path::Path;

use corewright::analysis::analyst::Analyst;
use corewright::blocktri::BlockTridiagonal;
use corewright::model::read::read_tower;

fn main() -> Result<(), Box<dyn Error>> {
    let mut typed = std::env::args().skip(1);
    let (Some(file), Some(directory)) = (typed.next(), typed.next()) else {
        return Err("a tower file and a directory are wanted".into());
    };
    let tower = read_tower(file.as_ref())?.tower;
    let mut analyst = Analyst::new(&tower);
    let values = analyst.sizes().values(&tower);
    let response = analyst.analyse(&values)?;

    let mut mass = Vec::new();
    for (level, matrix) in response.masses.matrices().iter().enumerate() {
        let freedoms = &analyst.floor_numbers()[3 * level..3 * level + 3];
        for row in 0..3 {
            for col in 0..=row {
                mass.push((freedoms[row], freedoms[col], matrix[row][col]));
            }
        }
    }
    let directory = Path::new(&directory);
    std::fs::create_dir_all(directory)?;
    let count = analyst.freedom_count();
    let stiffness = lower_triangle(analyst.period_matrix());
    std::fs::write(directory.join("K.mtx"), matrix_market(count, stiffness))?;
    std::fs::write(directory.join("M.mtx"), matrix_market(count, mass))?;
    println!("{count} freedoms written to {}", directory.display());
    Ok(())
}

fn lower_triangle(matrix: &BlockTridiagonal) -> Vec<(usize, usize, f64)> {
    let mut entries = Vec::new();
    for block in 0..matrix.block_count() {
        let (size, start) = (matrix.size(block), matrix.offset(block));
        let diagonal = matrix.diagonal(block);
        for col in 0..size {
            for row in col..size {
                entries.push((start + row, start + col, diagonal.col(col)[row]));
            }
        }
        if block + 1 < matrix.block_count() {
            let coupling = matrix.coupling(block);
            let next = matrix.offset(block + 1);
            for col in 0..matrix.size(block + 1) {
                for row in 0..size {
                    entries.push((next + col, start + row, coupling.col(col)[row]));
                }
            }
        }
    }
    entries
}

fn matrix_market(count: usize, entries: Vec<(usize, usize, f64)>) -> String {
    let entries: Vec<_> = entries
        .into_iter()
        .filter(|(_, _, value)| *value != 0.0)
        .collect();
    let mut text = String::from("%%MatrixMarket matrix coordinate real symmetric\n");
    let _ = writeln!(text, "{count} {count} {}", entries.len());
    for (row, col, value) in entries {
        let (row, col) = (row.max(col) + 1, row.min(col) + 1);
        let _ = writeln!(text, "{row} {col} {value:e}");
    }
    text
}
