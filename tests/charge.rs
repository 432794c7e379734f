//! Self-consistent bands against independent numbers and closed forms.

mod common;

use wellwright::charge::{self, Solution};
use wellwright::models::Band;
use wellwright::structure::{self, Structure};
use wellwright::subbands::Accuracy;

fn read(text: &str) -> Structure {
    let (structure, problems) = structure::read(text);
    structure.unwrap_or_else(|| panic!("{problems:#?}"))
}

fn solved(text: &str) -> Solution {
    let structure = read(text);
    let stack = structure.stack().unwrap();
    charge::solve(&stack, &structure.charge, &Band::of(&structure), Accuracy::default()).unwrap()
}

/// The reference of a symmetric modulation-doped well, 150 Å and 250 meV deep, with ε = 12.9 throughout, at T = 0: donors
/// as two sheets 175 Å outside the well's faces, walls 200 Å outside. Energies in meV from the potential in the well's
/// middle. Independent code on finite elements, its mesh halved: moved by less than 1e-4 meV.
#[test]
fn symmetric_wells_have_the_reference_levels() {
    let of = |sheet: f64, mass: f64| {
        format!(
            "temperature: 0 K
bands: {{conduction: {{states: 3}}}}
materials:
  Well: {{conduction_edge: 0 eV, electron_mass: 0.067, permittivity_static: 12.9}}
  Barrier: {{conduction_edge: 0.25 eV, electron_mass: {mass}, permittivity_static: 12.9}}
layers:
  - {{material: Barrier, width: 25 Å}}
  - {{sheet_donors: {sheet:e} cm^-2}}
  - {{material: Barrier, width: 175 Å}}
  - {{material: Well, width: 150 Å}}
  - {{material: Barrier, width: 175 Å}}
  - {{sheet_donors: {sheet:e} cm^-2}}
  - {{material: Barrier, width: 25 Å}}
",
            sheet = 0.5 * sheet
        )
    };
    let cases = [
        (1e10, 0.067, [17.1477, 67.8144, 148.2983], None),
        (1e10, 0.0919, [16.2457, 64.8016, 143.8011], None),
        (2e11, 0.067, [15.7319, 64.7856, 144.7534], Some(7.146)),
        (2e11, 0.0919, [14.8069, 61.7683, 140.3889], Some(7.146)),
        (5e11, 0.067, [13.5083, 60.0900, 139.2542], Some(17.865)),
        (5e11, 0.0919, [12.5502, 57.0798, 135.1372], None),
        (1e12, 0.067, [9.8473, 52.5186, 130.2295], Some(35.730)),
        (1e12, 0.0919, [8.8440, 49.5589, 126.7054], None),
    ];
    for (sheet, mass, levels, fermi) in cases {
        let solution = solved(&of(sheet, mass));
        let equilibrium = solution.equilibrium.unwrap();
        println!("{sheet:e} {mass}: {} iterations {:e}", equilibrium.iterations, equilibrium.residual_ev);
        let potential = solution.stack.potential.as_ref().unwrap();
        let middle = potential.electron_ev(2, 0.5);
        let conduction = solution.bands.conduction();
        for (k, level) in levels.iter().enumerate() {
            let found = 1e3 * (conduction.energy_ev(k) - middle);
            println!("  {found:.4} {level}");
            assert!((found - level).abs() < 0.02, "{sheet:e} {mass}: {found} for {level}");
        }
        if let Some(fermi) = fermi {
            let found = 1e3 * (equilibrium.fermi_ev - conduction.energy_ev(0));
            println!("  {found:.4} {fermi}");
        }
        println!("  edge {:.4}", 1e3 * (potential.electron_ev(2, 0.0) - middle));
    }
}
