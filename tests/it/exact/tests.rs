use crate::exact::{Drawn, draw};

#[test]
fn timing() {
    let start = std::time::Instant::now();
    let mut singular = 0;
    for seed in 0..300 {
        let d: Drawn = draw(seed);
        singular += d.singular;
        if seed < 12 {
            println!("---- {seed} f={} singular={}\n{}", d.frequency_hz, d.singular, d.text);
        }
    }
    println!("{singular} singular, {:?}", start.elapsed());
}
