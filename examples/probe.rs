#[path = "../benches/networks.rs"]
mod networks;
use networks::*;
use stillgate::control::Control;
use stillgate::statics::StateSet;
use std::time::Instant;
fn rss() -> u64 {
    std::fs::read_to_string("/proc/self/status").unwrap().lines().find(|l| l.starts_with("VmHWM")).unwrap().split_whitespace().nth(1).unwrap().parse().unwrap()
}
fn main() {
    let a: Vec<String> = std::env::args().collect();
    let n = |i: usize| a[i].parse::<usize>().unwrap();
    if a[1] == "fb" {
        let w = if a[2] == "s" { Wiring::Scattered } else { Wiring::Within(n(2)) };
        let mut v: Vec<usize> = (0..30).map(|seed| random(w, 24, n(3), n(4), seed).feedback().len()).collect();
        v.sort();
        println!("{v:?}");
        return;
    }
    let c = match a[1].as_str() {
        "div" => dividers(n(2)),
        "array" => array(n(2)),
        "rand" => { let w = if a[2] == "s" { Wiring::Scattered } else { Wiring::Within(n(2)) }; random(w, 24, n(3), n(4), n(5) as u64) }
        _ => panic!(),
    };
    let t = Instant::now();
    let set = match StateSet::of(&c, &Control::default()) { Ok(s) => s, Err(e) => { println!("{a:?} fb {} {e} {:?} {} kB", c.feedback().len(), t.elapsed(), rss()); return } };
    let built = t.elapsed();
    let count = set.count();
    println!("{:?} fb {} built {:?} count bits {} {:?} {} kB", &a[1..], c.feedback().len(), built, count.bits(), t.elapsed(), rss());
    let t = Instant::now();
    let nets: Vec<_> = c.nets().filter(|net| net.0 % 7 == 0).collect();
    match set.project(&nets) { Ok(p) => println!("  projection count bits {} {:?} {} kB", p.count().bits(), t.elapsed(), rss()), Err(e) => println!("  projection {e} {:?} {}", t.elapsed(), rss()) }
    let t = Instant::now();
    let r = set.rows(4096); println!("  rows {} {} {:?}", r.rows.len(), r.truncated, t.elapsed());
    let t = Instant::now();
    let v = set.vector_counts(); println!("  vectors {} {:?}", v.is_ok(), t.elapsed());
    let t = Instant::now();
    let k: usize = set.by_inputs(1024, 64).map(|v| v.states.len()).sum(); println!("  by_inputs {} {:?}", k, t.elapsed());
    let t = Instant::now();
    let s = set.state_variables(1 << 16); println!("  state_variables {:?} {:?}", s.map(|s| (s.nets.len(), s.exact)), t.elapsed());
}
