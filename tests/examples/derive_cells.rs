//! Derives the shipped cells from the measured runs and prints what they hold, per Ah.
//!
//! `cargo run --release -p strikeline-tests --example derive_cells`

use strikeline_tests::derive::{self, Derived, PLACES};

fn main() {
    show("polymer pouch, LCO", &derive::lco_pouch());
    show("pouch, NMC", &derive::nmc_pouch());
    show("cylinder, LFP", &derive::lfp_cylinder());
}

fn show(name: &str, cell: &Derived) {
    let list = |values: &[f64], digits: usize| {
        values.iter().map(|v| format!("{v:.digits$}")).collect::<Vec<_>>().join(", ")
    };
    println!("{name}: {:.4} Ah", cell.capacity_ah);
    println!("  soc          {}", list(&PLACES, 2));
    println!("  ocv_v        {}", list(&cell.ocv_v, 4));
    println!("  branch_shape {}", list(&cell.branch_shape, 3));
    println!("  r0·Q         {:.5} Ω·Ah", cell.r0_ohm * cell.capacity_ah);
    println!("  branches·Q   {} Ω·Ah", list(&cell.branches_ohm.map(|r| r * cell.capacity_ah), 5));
    println!("  steady/60 s  {:.3}", cell.steady_over_minute);
    if let Some((heat, cooling)) = cell.thermal {
        println!(
            "  thermal/Q    {:.2} J/K/Ah, {:.4} W/K/Ah",
            heat / cell.capacity_ah,
            cooling / cell.capacity_ah
        );
    }
}
