mod support;

fn main() {}
