use wellwright::structure::document::*;
fn show(n:&Node,t:&str,d:usize){ println!("{}{:?} {:?} al={} src={:?}", "  ".repeat(d), match &n.value{Value::Scalar(s)=>format!("S {s:?}"),Value::Null=>"null".into(),Value::List(_)=>"list".into(),Value::Map(_)=>"map".into()}, n.span, n.shared, t.get(n.span.clone()));
 match &n.value {Value::List(l)=>l.iter().for_each(|x|show(x,t,d+1)),Value::Map(m)=>m.iter().for_each(|(k,v)|{show(k,t,d+1);show(v,t,d+1)}),_=>{}}}
fn main(){
 let deep="[".repeat(100000); let deepm=(0..3000).map(|i|format!("{}a:\n"," ".repeat(i))).collect::<String>();
 let mut bomb=String::from("a0: &a0 [x,x,x,x,x,x,x,x,x,x]\n"); for i in 1..12 {bomb+=&format!("a{i}: &a{i} [{}]\n", vec![format!("*a{}",i-1);10].join(","));}
 let bin=(0..3000u32).map(|i|char::from_u32(1+i%200).unwrap()).collect::<String>();
 for t in ["a: 0.26\nb: no\r\nc: 1e3 # c\nd: 'q x' \ne: \"µm \\u00e9\"\nf: ~\ng:\nh: [1, 2.50 ,x]\ni: {k: 5.2 nm, l: 1.0}\n",
  "a: &x 5 nm\nb: *x\nc: &m {w: 3 nm, q: 2}\nd: {<<: *m, w: 4}\ne:\n  <<: *m\n  z: 1\n",
  "layers:\n  - material: GaAs\n    width: 5 nm\n  - {a: b}\n", "µ: 3\nb: µm x\nc: .inf\nd: .nan\ne: 1e999\nf: 999999999999999999999999999999999999999999999\ng: 0x1F\n h: 3",
  "a: 1\na: 2\n", "a:\n\tb: 3\n", "title: Well: 8.6\n", "a: [1, 2\nb: 3\n", "a: {b: 1\n", "a: 'x\n", "a: *nope\n", "a: 1\n---\nb: 2\n", "", "# only\n", "- 1\n- 2\n", "just text", "a: !!binary aGk=\n", "a: !foo {x: 1}\n", "a: !!int abc\n","a: |\n  text\n  more\nb: >\n  folded\n", "? [a, b]\n: 3\n", "a: @x\n", "a: `x`\n", "a: %x\n", "  a: 1\nb: 2\n", "a: 1\n b: 2\n", "a: 5 nm, b: 3", "a: \"x\\qy\"\n", "&a [*a]", "a: &a [*a]", "<<: 3", "a: 1_000\nb: 0o17\nc: +5\nd: 007\n", &deep,&deepm,&bomb,&bin, "\u{feff}a: 3\nb: 4", "a: b\u{0}c", "a: 5 nm  \n  more\n", "key: -\n  - a\n", "-a: 3\n-b", "a: - b", "}", "a: 1\n]\n", "a b\nc: d\n", "a: 1\nb\nc: 2\n", "a:1\nb: 2\n", "layers:\n - {material: GaAs, width: 3 nm\n - {material: GaAs}\n", "layers:\n - {material: GaAs width: 3 nm}\n","%YAML 1.1\n---\na: 1","a: 1\n...\nb: 2"] {
  let short: String=t.chars().take(80).collect(); println!("=== {short:?}"); let s=std::time::Instant::now();
  match parse(t){Ok(n)=>if t.len()<1000 {show(&n,t,1)} else {println!("ok")},Err(e)=>for d in e {println!("{}", d.message); println!("{}",{let mut d=d; d.render("f",&short,false)})}}
  let e=s.elapsed(); if e.as_millis()>20 {println!("SLOW {e:?}")}
 }}
