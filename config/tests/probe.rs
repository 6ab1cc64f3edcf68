mod common;
#[test]
fn probe() {
    match common::read_at_halden(common::HALDEN) {
        Ok((c, w)) => println!("{:#?}\n{}", c, common::shown(&w)),
        Err(f) => println!("{}", common::shown(&f)),
    }
}
