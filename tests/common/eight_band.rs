//! The levels of eight coupled bands that an independent program computed (`tests/reference/README.md`).

use serde::Deserialize;

#[derive(Deserialize)]
pub struct Reference {
    pub stacks: Vec<Stack>,
}

#[derive(Deserialize)]
pub struct Stack {
    pub name: String,
    pub structure: String,
    pub solved: Vec<Solved>,
}

#[derive(Deserialize)]
pub struct Solved {
    pub k_per_nm: [f64; 2],
    pub conduction_ev: Vec<f64>,
    pub valence_ev: Vec<f64>,
}

pub fn reference() -> Reference {
    serde_json::from_str(include_str!("../reference/eight_band.json")).unwrap()
}
