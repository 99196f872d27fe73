//! Every form of statement and expression, with the tree that it gives.

use super::{law, one, shown};

#[test]
fn declarations() {
    assert_eq!(one("model heliostat \"Azimuth drive\""), "model heliostat \"Azimuth drive\"");
    assert_eq!(one("model heliostat"), "model heliostat");
    assert_eq!(one("use \"parts/actuators.loop\""), "use parts/actuators.loop");
    assert_eq!(one("unit  turn = 360 [deg]"), "unit turn = 360 [deg]");
    assert_eq!(one("unit s = 3 [ms]"), "unit s = 3 [ms]");
    assert_eq!(one("input  r [rad]  \"commanded\""), "input r [rad] \"commanded\"");
    assert_eq!(one("output y"), "output y");
    assert_eq!(one("signal w{k} [rad/s]"), "signal w{k} [rad/s]");
    assert_eq!(one("sum e = r - y_m \"error\""), "sum e = (r - y_m) \"error\"");
}

#[test]
fn params() {
    assert_eq!(one("param J  = 1.8 [kg*m^2]"), "param J = 1.8 [kg*m^2]");
    assert_eq!(one("param Kv = 3.2 [N*m] within 5%"), "param Kv = 3.2 [N*m] within 5%");
    assert_eq!(one("param R within 3.0 .. 3.4 [kohm] \"text\""), "param R within 3.0..3.4 [kohm] \"text\"");
    assert_eq!(one("param R = 3 within a..b [ohm]"), "param R = 3 within a..b [ohm]");
    assert_eq!(one("param R = 3 within 1 [ohm] .. 2 [kohm]"), "param R = 3 within 1 [ohm]..2 [kohm]");
    assert_eq!(one("param Ti [s]"), "param Ti [s]");
    assert_eq!(one("param K{i} [1/s] = 2*a"), "param K{i} [1/s] = (2 * a)");
    assert_eq!(one("param within = 2 within 2*w%"), "param within = 2 within (2 * w)%");
}

#[test]
fn blocks() {
    assert_eq!(one("block C : e -> u = K*(1 + 1/(Ti*s))"), "block C : e -> u = (K * (1 + (1 / (Ti * s))))");
    assert_eq!(
        one("block G : u1, u2 -> y1, y2 = [[1/(s+1), 2], [0, 3/(s+2)]]"),
        "block G : u1, u2 -> y1, y2 = [[(1 / (s + 1)), 2], [0, (3 / (s + 2))]]"
    );
    assert_eq!(one("block C : e -> u = 1/z every 1 [ms] \"text\""), "block C : e -> u = (1 / z) every 1 [ms] \"text\"");
    assert_eq!(one("block C : e -> u = [[1/z]] every Ts"), "block C : e -> u = [[(1 / z)]] every Ts");
    assert_eq!(one("block d : u -> v = exp(-0.004*s)"), "block d : u -> v = exp(((-0.004) * s))");
    assert_eq!(
        one("block rotor : tau -> w \"text\" {\n  v' = (tau - b*v)/J # comment\n\n  w  = v + v'\n}"),
        "block rotor : tau -> w { v' = ((tau - (b * v)) / J); w = (v + v') } \"text\""
    );
    assert_eq!(
        one("block R{k} : a{k} -> b{k} { x{k}' = a{k}; b{k} = x{k}' ; }"),
        "block R{k} : a{k} -> b{k} { x{k}' = a{k}; b{k} = x{k}' }"
    );
    assert_eq!(
        one("block az : r, d -> y = servo(T = 0.1 [s], K = 2*K)"),
        "block az : r, d -> y = servo(T=0.1 [s], K=(2 * K))"
    );
}

#[test]
fn defines() {
    assert_eq!(one("define lag(T) = 1/(T*s + 1)"), "define lag(T) = (1 / ((T * s) + 1))");
    assert_eq!(one("define unity() = 1 \"text\""), "define unity() = 1 \"text\"");
    assert_eq!(
        one("define servo(K [N*m/rad] = 3, T [s]) : ref [rad], load -> pos [rad] {\n  sum e = ref - pos\n  \
             repeat k in 1..2 { block P{k} : v -> w{k} = lag(T)/s }\n  param J = 1\n}"),
        "define servo(K [N*m/rad] = 3, T [s]) : ref [rad], load -> pos [rad] { sum e = (ref - pos); \
         repeat k in 1..2 { block P{k} : v -> w{k} = (lag(T) / s) }; param J = 1 }"
    );
}

#[test]
fn repeats_and_cases() {
    assert_eq!(
        one("repeat k in 1..8 {\n  block S{k} : x{k-1} -> x{k} = lag(0.1*k)\n}"),
        "repeat k in 1..8 { block S{k} : x{(k - 1)} -> x{k} = lag((0.1 * k)) }"
    );
    assert_eq!(
        one("repeat j in max(1, i-1)..min(5, i+1){ sum T{i}_{j} = x{j}y }"),
        "repeat j in max(1, (i - 1))..min(5, (i + 1)) { sum T{i}_{j} = x{j}y }"
    );
    assert_eq!(one("repeat k in 1..3{ sum a{k} = 1 }"), "repeat k in 1..3 { sum a{k} = 1 }");
    assert_eq!(one("repeat k in 1..2 {\n}"), "repeat k in 1..2 {  }");
    assert_eq!(one("case cold { J = 2.2 [kg*m^2]; az.K = 2.6 }"), "case cold { J = 2.2 [kg*m^2]; az.K = 2.6 }");
    assert_eq!(
        one("case hot  \"sun-soaked\" {\n  J = 1.7 [kg*m^2]\n  row{1}.K = 2*row2.K\n}"),
        "case hot \"sun-soaked\" { J = 1.7 [kg*m^2]; row{1}.K = (2 * row2.K) }"
    );
}

#[test]
fn requests() {
    assert_eq!(one("find y / r"), "find y / r");
    assert_eq!(one("find y/r, first.e / r, T{k}/az.u"), "find y / r, first.e / r, T{k} / az.u");
    assert_eq!(one("find all"), "find ALL");
    assert_eq!(one("find all, y / r keep all"), "find ALL, y / r keep ALL");
    assert_eq!(one("find loop at u"), "find LOOP u");
    assert_eq!(one("find loop at u1, az.u2 with v open"), "find LOOP u1, az.u2 with v open");
    assert_eq!(one("find loop at (u1, u2)"), "find LOOP u1, u2");
    assert_eq!(one("find zeros y1, y2 / u1, u2"), "find ZEROS y1, y2 / u1, u2");
    assert_eq!(one("find zeros (y1, y2) / (u1, u2) in hot"), "find ZEROS y1, y2 / u1, u2 in hot");
    assert_eq!(
        one("find y / r with v, w open keep Kp, az.Ti in cold, hot"),
        "find y / r with v, w open keep Kp, az.Ti in cold, hot"
    );
    assert_eq!(one("find y / r in all keep Kp with v open"), "find y / r with v open keep Kp in ALL");
}

#[test]
fn words_are_names_elsewhere() {
    assert_eq!(one("find all / loop, loop / zeros, zeros / at"), "find all / loop, loop / zeros, zeros / at");
    assert_eq!(one("find loop at loop with open open in in"), "find LOOP loop with open open in in");
    assert_eq!(one("find zeros zeros / zeros"), "find ZEROS zeros / zeros");
    assert_eq!(one("find all.e / all{k}, loop.e / r"), "find all.e / all{k}, loop.e / r");
    assert_eq!(
        one("sum unit = in + open - every*within/product"),
        "sum unit = ((in + open) - ((every * within) / product))"
    );
    assert_eq!(one("block every : at -> to = over every every"), "block every : at -> to = over every every");
    assert_eq!(one("require at at at over 1..2 < 3"), "require at at at over 1..2 < 3");
    assert_eq!(one("require stable for/to to 5 for for"), "require stable for/to to 5 for for");
    assert_eq!(one("repeat in in in..in {\nsum x{in} = in\n}"), "repeat in in in..in { sum x{in} = in }");
    assert_eq!(one("case open { unit = 3 }"), "case open { unit = 3 }");
    assert_eq!(
        one("block summary : inputs -> blocks { blocks = usefulness }"),
        "block summary : inputs -> blocks { blocks = usefulness }"
    );
}

#[test]
fn requirements() {
    for text in [
        "require stable",
        "require stable in ALL",
        "require phase_margin at u >= 45 [deg]",
        "require gain_margin at az.u > 6 [dB] with v, w open in cold",
        "require overshoot y/r <= 16.4 [%]",
        "require magnitude y/r over 20..100 [rad/s] <= 0.05",
        "require settling_time y/r to 5 [%] <= 10 [s]",
        "require final_value e/r for ramp <= 0.11",
        "require damping_ratio < 0.4",
        "require some_new_figure at u >= (2 * K)",
    ] {
        assert_eq!(one(&text.replace("ALL", "all")), text);
    }
    assert_eq!(one("require magnitude y/r over a .. 2*b [Hz] <= 1"), "require magnitude y/r over a..(2 * b) [Hz] <= 1");
}

#[test]
fn operators_bind_as_the_language_says() {
    assert_eq!(law("a + b*c - d/e"), "((a + (b * c)) - (d / e))");
    assert_eq!(law("a - b - c"), "((a - b) - c)");
    assert_eq!(law("a/b/c*d"), "(((a / b) / c) * d)");
    assert_eq!(law("2^3^2"), "(2 ^ (3 ^ 2))");
    assert_eq!(law("-s^2"), "(-(s ^ 2))");
    assert_eq!(law("z^-1"), "(z ^ (-1))");
    assert_eq!(law("2^-3^2*z"), "((2 ^ (-(3 ^ 2))) * z)");
    assert_eq!(law("2/-s"), "(2 / (-s))");
    assert_eq!(law("a*-b*c - -d"), "(((a * (-b)) * c) - (-d))");
    assert_eq!(law("- -a"), "(-(-a))");
    assert_eq!(law("-a*b"), "((-a) * b)");
    assert_eq!(law("(T*s)^k"), "((T * s) ^ k)");
    assert_eq!(law("((a + (b)))*c"), "((a + b) * c)");
}

#[test]
fn units_bind_tightest() {
    assert_eq!(law("1/50 [s]"), "(1 / 50 [s])");
    assert_eq!(law("(1/50) [s]"), "(1 / 50) [s]");
    assert_eq!(law("-3 [V] + f(x) [m]"), "((-3 [V]) + f(x) [m])");
    assert_eq!(law("2 [m] ^2"), "(2 [m] ^ 2)");
}

#[test]
fn calls_and_written_out_sums() {
    assert_eq!(law("par(R2 + cap(C1), cap(C = C2))"), "par((R2 + cap(C1)), cap(C=C2))");
    assert_eq!(law("f( ) + g (x)"), "(f() + g(x))");
    assert_eq!(law("sum(k in 1..8, q{k})"), "SUM(k in 1..8, q{k})");
    assert_eq!(law("sum( k in 1..max(2,n-1) , a*b{k} )*2"), "(SUM(k in 1..max(2, (n - 1)), (a * b{k})) * 2)");
    assert_eq!(law("product(k in n..2*n, 1/(T{k}*s + 1))"), "PRODUCT(k in n..(2 * n), (1 / ((T{k} * s) + 1)))");
    assert_eq!(law("product(a, b)"), "product(a, b)");
    assert_eq!(law("sum(i in 1..2, sum(j in i+1..3, T{i}_{j}))"), "SUM(i in 1..2, SUM(j in (i + 1)..3, T{i}_{j}))");
}

#[test]
fn spans_cover_what_they_say() {
    let text = "param a = (b + c)*2 [s]\n";
    let parsed = super::parse(text, 100);
    let last = parsed.tree.exprs.last().map(|e| e.span);
    assert_eq!(last, Some(crate::source::Span::new(110, 123)));
    assert_eq!(parsed.tree.statements[0].span, crate::source::Span::new(100, 123));
    let text = "block R : a -> b {\n  x' = a \n  b = x\n}\n";
    let parsed = super::parse(text, 0);
    assert_eq!(parsed.tree.statements[0].span, crate::source::Span::new(0, 38));
    let super::super::ast::StatementKind::Block(block) = &parsed.tree.statements[0].kind else { panic!("no block") };
    let super::super::ast::BlockBody::Equations(equations) = &block.body else { panic!("no equations") };
    let spans: Vec<&str> = equations.iter().map(|e| &text[e.span.start as usize..e.span.end as usize]).collect();
    assert_eq!(spans, ["x' = a", "b = x"]);
}

#[test]
fn requests_have_their_own_spans() {
    let text = "find y / r , loop at (u, v) \n".replace(", loop at (u, v)", "with w open");
    let parsed = super::parse(&text, 0);
    let super::super::ast::StatementKind::Find(find) = &parsed.tree.statements[0].kind else { panic!("no find") };
    let span = find.requests[0].span;
    assert_eq!(&text[span.start as usize..span.end as usize], "y / r");
    let text = "find loop at ( u, v ) keep K";
    let parsed = super::parse(text, 0);
    let super::super::ast::StatementKind::Find(find) = &parsed.tree.statements[0].kind else { panic!("no find") };
    let span = find.requests[0].span;
    assert_eq!(&text[span.start as usize..span.end as usize], "loop at ( u, v )");
}

#[test]
fn statements_keep_their_order() {
    assert_eq!(shown("input r\n\n# nothing\noutput y\nsum y = r"), ["input r", "output y", "sum y = r"]);
}
