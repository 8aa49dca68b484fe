//! The demo: its table and true values are what the stated program makes.

#[path = "../examples/pools/mod.rs"]
mod pools;
#[path = "../examples/pools/truth.rs"]
mod truth;

/// Seed of the checked-in table.
const SEED: u64 = 1;

fn checked_in(file: &str) -> String {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("demo-data/swimming-pools")
        .join(file);
    std::fs::read_to_string(path).unwrap()
}

#[test]
fn making_the_table_again_gives_the_same_bytes() {
    assert_eq!(pools::csv(&pools::simulate(SEED)), checked_in("pools.csv"));
    assert_eq!(truth::json_text(SEED), checked_in("truth.json"));
}

#[test]
fn another_seed_gives_another_table() {
    assert_ne!(pools::csv(&pools::simulate(SEED + 1)), checked_in("pools.csv"));
}

#[test]
fn half_of_the_pools_have_the_textured_floor() {
    for seed in 0..20 {
        let textured = pools::simulate(seed)
            .iter()
            .filter(|pool| pool.floor == "textured")
            .count();
        assert_eq!(textured, pools::POOLS / 2, "seed {seed}");
    }
}
