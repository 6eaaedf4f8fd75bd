//! Values from outside the project, each with where it was published: the
//! answers agree with the printed digits, and with the full value to 15 digits.
//!
//! Classes: a, the printed value or its inputs were read in public text; b,
//! recalled from memory with the source named, edition unsure; c, derived by a
//! closed form, by enumeration or by a dynamic program.

use tieback::note;

/// A published system and what is asked of it.
struct Case {
    id: &'static str,
    class: char,
    source: &'static str,
    note: &'static str,
    asks: &'static [Ask],
}

/// A question, the value as printed (empty where none is), the full value as
/// recomputed in 60 digits, and half a unit in the last printed digit.
struct Ask(&'static str, &'static str, &'static str, f64);

/// Fifteen digits are asked for: half a unit in the last is at most 5e-15, and
/// reading two decimals as doubles adds a rounding each.
const FULL: f64 = 6e-15;

#[test]
fn published_values_are_met() {
    let mut wrong = Vec::new();
    for case in CASES {
        let text = format!("```tieback\ndigits 15\n{}\n```\n", case.note);
        assert!(matches!(case.class, 'a'..='c') && !case.source.is_empty(), "{}", case.id);
        for Ask(question, printed, full, half_unit) in case.asks {
            let filled = note::ask("published.md", &text, &note::NoShelf, &[], question);
            let answer = &filled.asked[0].new;
            let number = answer.split(' ').next().and_then(|n| n.parse::<f64>().ok());
            let Some(value) = number.filter(|_| !filled.asked[0].error && !answer.contains(" - ")) else {
                wrong.push(format!("{} {question}: {answer}", case.id));
                continue;
            };
            let want: f64 = full.parse().unwrap();
            if ((value - want) / want).abs() > FULL {
                wrong.push(format!("{} {question}: {answer}, and in full {full}", case.id));
            }
            if !printed.is_empty() && (value - printed.parse::<f64>().unwrap()).abs() > *half_unit {
                wrong.push(format!("{} {question}: {answer}, printed {printed}", case.id));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[rustfmt::skip]
const CASES: &[Case] = &[
    Case {
        id: "O01",
        class: 'a',
        source: "Uninterruptible Power Supplies and Standby Power Systems (textbook), ch. 3 \"The Statistics of Redundancy\", p. 98, page text found",
        note: "set = 0.99\n\
            supply = any of 2 set",
        asks: &[
            Ask("R(supply)", "0.9999", "0.99990000000000000000", 5.0e-5),
        ],
    },
    Case {
        id: "O02",
        class: 'a',
        source: "worked question-and-answer page on series/parallel reliability (answer 545519), page text found",
        note: "a1, a2 = 0.9\n\
            b = 0.95\n\
            c1, c2, c3, c4 = 0.95\n\
            line = (a1 // a2) -> b -> ((c1 -> c2) // (c3 -> c4))",
        asks: &[
            Ask("R(line)", "0.93156", "0.93155937187500000000", 5.0e-6),
        ],
    },
    Case {
        id: "O03",
        class: 'c',
        source: "closed form 1-(1-q)^n in exact rationals",
        note: "item = fails 1e-12\n\
            row = all of 1000 item",
        asks: &[
            Ask("F(row)", "", "9.9999999950050000017e-10", 0.0),
        ],
    },
    Case {
        id: "O04",
        class: 'c',
        source: "closed form",
        note: "i1 = fails 0.01\n\
            i2 = fails 0.02\n\
            i3 = fails 0.03\n\
            i4 = fails 0.04\n\
            i5 = fails 0.05\n\
            i6 = fails 0.06\n\
            row = i1 // i2 // i3 // i4 // i5 // i6",
        asks: &[
            Ask("F(row)", "", "7.2000000000000000000e-10", 0.0),
        ],
    },
    Case {
        id: "O05",
        class: 'a',
        source: "MIL-HDBK-338B k-out-of-n configuration text (air traffic control displays), found quoted in full on a public web page",
        note: "display = 0.9\n\
            wall = 3 of 4 display",
        asks: &[
            Ask("R(wall)", "0.9477", "0.94770000000000000000", 5.0e-5),
        ],
    },
    Case {
        id: "O06",
        class: 'b',
        source: "standard 3p^2-2p^3 (any textbook)",
        note: "low = 0.9\n\
            high = 0.95\n\
            first = 2 of 3 low\n\
            second = 2 of 3 high",
        asks: &[
            Ask("R(first)", "0.972", "0.97200000000000000000", 0.0005),
            Ask("R(second)", "0.99275", "0.99275000000000000000", 5.0e-6),
        ],
    },
    Case {
        id: "O07",
        class: 'a',
        source: "public worked-answer page on a three-component system, found",
        note: "a = 0.9\n\
            b = 0.8\n\
            c = 0.95\n\
            vote = 2 of (a, b, c)",
        asks: &[
            Ask("R(vote)", "0.967", "0.96700000000000000000", 0.0005),
        ],
    },
    Case {
        id: "O08",
        class: 'c',
        source: "dynamic program in exact rationals",
        note: "a = 0.95\n\
            b = 0.9\n\
            c = 0.85\n\
            d = 0.8\n\
            e = 0.75\n\
            vote = 3 of (a, b, c, d, e)",
        asks: &[
            Ask("R(vote)", "", "0.97678750000000000000", 0.0),
        ],
    },
    Case {
        id: "O09",
        class: 'c',
        source: "binomial tail in exact rationals",
        note: "item = fails 1e-5\n\
            vote = 4 of 6 item",
        asks: &[
            Ask("F(vote)", "", "1.9999550003599990000e-14", 0.0),
        ],
    },
    Case {
        id: "O12",
        class: 'a',
        source: "public notes page on availability in sequence and in parallel, found",
        note: "a, b = 0.99",
        asks: &[
            Ask("R(a -> b)", "0.9801", "0.98010000000000000000", 5.0e-5),
            Ask("R(a // b)", "0.9999", "0.99990000000000000000", 5.0e-5),
        ],
    },
    Case {
        id: "O21",
        class: 'b',
        source: "widely published (2p^2+2p^3-5p^4+2p^5), for instance in the terminal-pair literature",
        note: "i1, i2, i3, i4, i5 = 0.9\n\
            bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)",
        asks: &[
            Ask("R(bridge)", "0.97848", "0.97848000000000000000", 5.0e-6),
        ],
    },
    Case {
        id: "O21",
        class: 'b',
        source: "widely published (2p^2+2p^3-5p^4+2p^5), for instance in the terminal-pair literature",
        note: "i1, i2, i3, i4, i5 = 0.9\n\
            bridge = fails when (i1 and i2) or (i4 and i5) or (i1 and i3 and i5) or (i2 and i3 and i4)",
        asks: &[
            Ask("R(bridge)", "0.97848", "0.97848000000000000000", 5.0e-6),
        ],
    },
    Case {
        id: "O22",
        class: 'c',
        source: "polynomial; 0.5 is the self-dual fixed point",
        note: "i1, i2, i3, i4, i5 = 0.99\n\
            bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)",
        asks: &[
            Ask("R(bridge)", "", "0.99979804980000000000", 0.0),
        ],
    },
    Case {
        id: "O22",
        class: 'c',
        source: "polynomial; 0.5 is the self-dual fixed point",
        note: "i1, i2, i3, i4, i5 = 0.5\n\
            bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)",
        asks: &[
            Ask("R(bridge)", "0.5", "0.50000000000000000000", 0.05),
        ],
    },
    Case {
        id: "O23",
        class: 'c',
        source: "pivotal decomposition on item 3",
        note: "i1 = 0.95\n\
            i2 = 0.9\n\
            i3 = 0.7\n\
            i4 = 0.85\n\
            i5 = 0.8\n\
            bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)",
        asks: &[
            Ask("R(bridge)", "", "0.95943500000000000000", 0.0),
        ],
    },
    Case {
        id: "O24",
        class: 'c',
        source: "exact rational 2q^2+2q^3-5q^4+2q^5",
        note: "i1, i2, i3, i4, i5 = fails 1e-6\n\
            bridge = fails when (i1 and i2) or (i4 and i5) or (i1 and i3 and i5) or (i2 and i3 and i4)",
        asks: &[
            Ask("F(bridge)", "", "2.0000019999950000020e-12", 0.0),
        ],
    },
    Case {
        id: "O25",
        class: 'c',
        source: "frontier dynamic program in exact rationals, equal to brute force over 2^12",
        note: "e0001, e0010, e0102, e0111, e0212, e1011, e1020, e1112, e1121, e1222, e2021, e2122 = 0.9\n\
            grid = (e0001 -> e0102 -> e0212 -> e1222) //\n\
            \x20 (e0001 -> e0102 -> e0212 -> e1112 -> e1121 -> e2122) //\n\
            \x20 (e0001 -> e0102 -> e0212 -> e1112 -> e1011 -> e1020 -> e2021 -> e2122) //\n\
            \x20 (e0001 -> e0111 -> e1112 -> e1222) //\n\
            \x20 (e0001 -> e0111 -> e1121 -> e2122) //\n\
            \x20 (e0001 -> e0111 -> e1011 -> e1020 -> e2021 -> e2122) //\n\
            \x20 (e0010 -> e1011 -> e1112 -> e1222) //\n\
            \x20 (e0010 -> e1011 -> e1121 -> e2122) //\n\
            \x20 (e0010 -> e1011 -> e0111 -> e0102 -> e0212 -> e1222) //\n\
            \x20 (e0010 -> e1020 -> e2021 -> e2122) //\n\
            \x20 (e0010 -> e1020 -> e2021 -> e1121 -> e1112 -> e1222) //\n\
            \x20 (e0010 -> e1020 -> e2021 -> e1121 -> e0111 -> e0102 -> e0212 -> e1222)",
        asks: &[
            Ask("R(grid)", "", "0.97250217140700000000", 0.0),
        ],
    },
    Case {
        id: "O28",
        class: 'b',
        source: "polynomial 16p^3-33p^4+24p^5-6p^6 (textbook, recalled) and enumeration",
        note: "e01, e02, e03, e12, e13, e23 = 0.9\n\
            net = fails when (e01 and e02 and e03) or\n\
            \x20 (e01 and e12 and e13) or\n\
            \x20 (e02 and e03 and e12 and e13) or\n\
            \x20 (e02 and e12 and e23) or\n\
            \x20 (e01 and e03 and e12 and e23) or\n\
            \x20 (e01 and e02 and e13 and e23) or\n\
            \x20 (e03 and e13 and e23)",
        asks: &[
            Ask("R(net)", "", "0.99581400000000000000", 0.0),
        ],
    },
    Case {
        id: "O30",
        class: 'b',
        source: "count of connected labelled graphs (OEIS A001187; Gilbert 1959 recursion), recalled",
        note: "e01, e02, e03, e04, e05, e12, e13, e14, e15, e23, e24, e25, e34, e35, e45 = 0.5\n\
            net = fails when (e01 and e02 and e03 and e04 and e05) or\n\
            \x20 (e01 and e12 and e13 and e14 and e15) or\n\
            \x20 (e02 and e03 and e04 and e05 and e12 and e13 and e14 and e15) or\n\
            \x20 (e02 and e12 and e23 and e24 and e25) or\n\
            \x20 (e01 and e03 and e04 and e05 and e12 and e23 and e24 and e25) or\n\
            \x20 (e01 and e02 and e13 and e14 and e15 and e23 and e24 and e25) or\n\
            \x20 (e03 and e04 and e05 and e13 and e14 and e15 and e23 and e24 and e25) or\n\
            \x20 (e03 and e13 and e23 and e34 and e35) or\n\
            \x20 (e01 and e02 and e04 and e05 and e13 and e23 and e34 and e35) or\n\
            \x20 (e01 and e03 and e12 and e14 and e15 and e23 and e34 and e35) or\n\
            \x20 (e02 and e04 and e05 and e12 and e14 and e15 and e23 and e34 and e35) or\n\
            \x20 (e02 and e03 and e12 and e13 and e24 and e25 and e34 and e35) or\n\
            \x20 (e01 and e04 and e05 and e12 and e13 and e24 and e25 and e34 and e35) or\n\
            \x20 (e01 and e02 and e03 and e14 and e15 and e24 and e25 and e34 and e35) or\n\
            \x20 (e04 and e05 and e14 and e15 and e24 and e25 and e34 and e35) or\n\
            \x20 (e04 and e14 and e24 and e34 and e45) or\n\
            \x20 (e01 and e02 and e03 and e05 and e14 and e24 and e34 and e45) or\n\
            \x20 (e01 and e04 and e12 and e13 and e15 and e24 and e34 and e45) or\n\
            \x20 (e02 and e03 and e05 and e12 and e13 and e15 and e24 and e34 and e45) or\n\
            \x20 (e02 and e04 and e12 and e14 and e23 and e25 and e34 and e45) or\n\
            \x20 (e01 and e03 and e05 and e12 and e14 and e23 and e25 and e34 and e45) or\n\
            \x20 (e01 and e02 and e04 and e13 and e15 and e23 and e25 and e34 and e45) or\n\
            \x20 (e03 and e05 and e13 and e15 and e23 and e25 and e34 and e45) or\n\
            \x20 (e03 and e04 and e13 and e14 and e23 and e24 and e35 and e45) or\n\
            \x20 (e01 and e02 and e05 and e13 and e14 and e23 and e24 and e35 and e45) or\n\
            \x20 (e01 and e03 and e04 and e12 and e15 and e23 and e24 and e35 and e45) or\n\
            \x20 (e02 and e05 and e12 and e15 and e23 and e24 and e35 and e45) or\n\
            \x20 (e02 and e03 and e04 and e12 and e13 and e14 and e25 and e35 and e45) or\n\
            \x20 (e01 and e05 and e12 and e13 and e14 and e25 and e35 and e45) or\n\
            \x20 (e01 and e02 and e03 and e04 and e15 and e25 and e35 and e45) or\n\
            \x20 (e05 and e15 and e25 and e35 and e45)",
        asks: &[
            Ask("R(net)", "", "0.81494140625000000000", 0.0),
        ],
    },
    Case {
        id: "O31",
        class: 'a',
        source: "GATE IT 2007 question 51, worked answer found",
        note: "mission 1 h\n\
            unit = mtbf (6 h + 4 h + 8 h + 5 h + 6 h) / 5",
        asks: &[
            Ask("R(unit)", "0.84", "0.84163084006728345997", 0.005),
            Ask("unit.mtbf", "", "5.8000000000000000000", 0.0),
        ],
    },
    Case {
        id: "O32",
        class: 'a',
        source: "exercise text found on a public page; sum derived",
        note: "a = rate 8e-6 /h\n\
            b = rate 6e-6 /h\n\
            c = rate 9e-6 /h\n\
            d = rate 2e-5 /h",
        asks: &[
            Ask("a.rate + b.rate + c.rate + d.rate", "", "4.3000000000000000000e-5", 0.0),
            Ask("1 / (a.rate + b.rate + c.rate + d.rate)", "", "23255.813953488372093", 0.0),
        ],
    },
    Case {
        id: "O33",
        class: 'c',
        source: "simple sum of rates (parts-count method)",
        note: "mission 8760 h\n\
            c0 = rate 0.0017 /Mh\n\
            c1 = rate 0.0036 /Mh\n\
            c2 = rate 0.021 /Mh\n\
            c3 = rate 0.082 /Mh\n\
            c4 = rate 0.45 /Mh\n\
            c5 = rate 0.0105 /Mh\n\
            board = (all of 25 c0) -> (all of 12 c1) -> (all of 6 c2) -> (all of 4 c3) -> (all of 1 c4) -> (all of 2 c5)",
        asks: &[
            Ask("(25 * c0.rate + 12 * c1.rate + 6 * c2.rate + 4 * c3.rate + 1 * c4.rate + 2 * c5.rate) in /Mh", "", "1.0107000000000000000", 0.0),
            Ask("1 / (25 * c0.rate + 12 * c1.rate + 6 * c2.rate + 4 * c3.rate + 1 * c4.rate + 2 * c5.rate)", "", "989413.27792618976947", 0.0),
            Ask("R(board)", "", "0.99118534686884428638", 0.0),
        ],
    },
    Case {
        id: "O46",
        class: 'c',
        source: "beta-factor definition (NUREG/CR-4780); numbers derived",
        note: "q = 0.01\n\
            beta = 0.1\n\
            one, two = fails (q * (1 - beta))\n\
            both = fails (q * beta)\n\
            pair = (one // two) -> both",
        asks: &[
            Ask("F(pair)", "", "1.0809190000000000000e-3", 0.0),
            Ask("F(both) + F(one) * F(two)", "", "1.0810000000000000000e-3", 0.0),
        ],
    },
    Case {
        id: "O47",
        class: 'c',
        source: "NUREG/CR-5485 formula recalled; numbers derived",
        note: "a1 = 0.95\n\
            a2 = 0.04\n\
            a3 = 0.01\n\
            q = 1e-3\n\
            all3 = a1 + 2 * a2 + 3 * a3\n\
            q1 = 1 / 1 * a1 / all3 * q\n\
            q2 = 2 / 2 * a2 / all3 * q\n\
            q3 = 3 / 1 * a3 / all3 * q",
        asks: &[
            Ask("all3", "", "1.0600000000000000000", 0.0),
            Ask("q1", "", "8.9622641509433962264e-4", 0.0),
            Ask("q2", "", "3.7735849056603773585e-5", 0.0),
            Ask("q3", "", "2.8301886792452830189e-5", 0.0),
            Ask("q1 + 2 * q2 + q3", "", "1.0000000000000000000e-3", 0.0),
        ],
    },
    Case {
        id: "O48",
        class: 'c',
        source: "NUREG/CR-4780 formula recalled; numbers derived",
        note: "beta = 0.1\n\
            triple = 0.5\n\
            q = 1e-3\n\
            q1 = (1 - beta) * q\n\
            q2 = beta * (1 - triple) * q / 2\n\
            q3 = beta * triple * q",
        asks: &[
            Ask("q1", "", "9.0000000000000000000e-4", 0.0),
            Ask("q2", "", "2.5000000000000000000e-5", 0.0),
            Ask("q3", "", "5.0000000000000000000e-5", 0.0),
            Ask("3 * q1^2 + 3 * q2 + q3", "", "1.2743000000000000000e-4", 0.0),
        ],
    },
    Case {
        id: "O54",
        class: 'b',
        source: "Rausand & Hoyland, System Reliability Theory, component importance chapter, example recalled",
        note: "one = 0.98\n\
            two = 0.96\n\
            row = one -> two\n\
            pair = one // two",
        asks: &[
            Ask("Birnbaum(row, one)", "0.96", "0.96000000000000000000", 0.005),
            Ask("Birnbaum(row, two)", "0.98", "0.98000000000000000000", 0.005),
            Ask("Birnbaum(pair, one)", "0.04", "0.040000000000000000000", 0.005),
            Ask("Birnbaum(pair, two)", "0.02", "0.020000000000000000000", 0.005),
        ],
    },
    Case {
        id: "O55",
        class: 'c',
        source: "exact enumeration; definitions as in Rausand & Hoyland",
        note: "A = fails 0.001\n\
            B = fails 0.02\n\
            C = fails 0.05\n\
            top = fails when A or (B and C)",
        asks: &[
            Ask("F(top)", "", "1.9990000000000000000e-3", 0.0),
            Ask("Birnbaum(top, A)", "", "0.99900000000000000000", 0.0),
            Ask("criticality(top, A)", "", "0.49974987493746873437", 0.0),
            Ask("RAW(top, A)", "", "500.25012506253126563", 0.0),
            Ask("RRW(top, A)", "", "1.9990000000000000000", 0.0),
            Ask("FV(top, A)", "", "0.50025012506253126563", 0.0),
            Ask("Birnbaum(top, B)", "", "0.049950000000000000000", 0.0),
            Ask("criticality(top, B)", "", "0.49974987493746873437", 0.0),
            Ask("RAW(top, B)", "", "25.487743871935967984", 0.0),
            Ask("RRW(top, B)", "", "1.9990000000000000000", 0.0),
            Ask("FV(top, B)", "", "0.50025012506253126563", 0.0),
        ],
    },
    Case {
        id: "O56",
        class: 'b',
        source: "enumeration; 3/8 and 1/8 are the well known structural importances (recalled)",
        note: "i1, i2, i3, i4, i5 = 0.9\n\
            bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)",
        asks: &[
            Ask("Birnbaum(bridge, i1)", "", "0.10620000000000000000", 0.0),
            Ask("Birnbaum(bridge, i3)", "", "0.016200000000000000000", 0.0),
        ],
    },
    Case {
        id: "O56",
        class: 'b',
        source: "enumeration; 3/8 and 1/8 are the well known structural importances (recalled)",
        note: "i1, i2, i3, i4, i5 = 0.5\n\
            bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)",
        asks: &[
            Ask("Birnbaum(bridge, i5)", "0.375", "0.37500000000000000000", 0.0005),
            Ask("Birnbaum(bridge, i3)", "0.125", "0.12500000000000000000", 0.0005),
        ],
    },
    Case {
        id: "O57",
        class: 'b',
        source: "NUREG-0492 Fault Tree Handbook, pressure tank evaluation chapter, data recalled",
        note: "T = fails 5e-6\n\
            K2 = fails 3e-5\n\
            S = fails 1e-4\n\
            K1 = fails 3e-5\n\
            relay = fails 1e-4\n\
            S1 = fails 3e-5\n\
            tank = fails when T or K2 or (S and (S1 or K1 or relay))",
        asks: &[
            Ask("F(T)", "5E-6", "5.0000000000000000000e-6", 5.0e-7),
            Ask("F(K2)", "3E-5", "3.0000000000000000000e-5", 5.0e-6),
            Ask("F(S // S1)", "3E-9", "3.0000000000000000000e-9", 5.0e-10),
            Ask("F(S // K1)", "3E-9", "3.0000000000000000000e-9", 5.0e-10),
            Ask("F(S // relay)", "1E-8", "1.0000000000000000000e-8", 5.0e-9),
            Ask("100 * F(T) / (F(T) + F(K2) + F(S) * (F(S1) + F(K1) + F(relay)))", "14", "14.279186657527987206", 0.5),
            Ask("100 * F(K2) / (F(T) + F(K2) + F(S) * (F(S1) + F(K1) + F(relay)))", "86", "85.675119945167923235", 0.5),
            Ask("F(T) + F(K2) + F(S) * (F(S1) + F(K1) + F(relay))", "", "3.5016000000000000000e-5", 0.0),
            Ask("count(cuts(tank))", "", "5", 0.0),
        ],
    },
    Case {
        id: "O58",
        class: 'c',
        source: "cut sets {1,2},{4,5},{1,3,5},{2,3,4}; path sets {1,4},{2,5},{1,3,5},{2,3,4}",
        note: "i1, i2, i3, i4, i5 = 0.9\n\
            bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)\n\
            lamp = 0.9\n\
            hall = 5 of 8 lamp",
        asks: &[
            Ask("count(cuts(bridge))", "4", "4", 0.5),
            Ask("count(paths(bridge))", "4", "4", 0.5),
            Ask("count(cuts(hall))", "70", "70", 0.5),
            Ask("F(bridge)", "", "0.021520000000000000000", 0.0),
            Ask("2 * F(i1)^2 + 2 * F(i1)^3", "", "0.022000000000000000000", 0.0),
            Ask("1 - (1 - F(i1)^2)^2 * (1 - F(i1)^3)^2", "", "0.021859219900000000000", 0.0),
        ],
    },
    Case {
        id: "O59",
        class: 'b',
        source: "self-avoiding corner paths (OEIS A007764: 2, 12, 184, 8512), recalled; cuts counted as connected bipartitions",
        note: "e0001, e0010, e0102, e0111, e0212, e1011, e1020, e1112, e1121, e1222, e2021, e2122 = 0.9\n\
            grid = (e0001 -> e0102 -> e0212 -> e1222) //\n\
            \x20 (e0001 -> e0102 -> e0212 -> e1112 -> e1121 -> e2122) //\n\
            \x20 (e0001 -> e0102 -> e0212 -> e1112 -> e1011 -> e1020 -> e2021 -> e2122) //\n\
            \x20 (e0001 -> e0111 -> e1112 -> e1222) //\n\
            \x20 (e0001 -> e0111 -> e1121 -> e2122) //\n\
            \x20 (e0001 -> e0111 -> e1011 -> e1020 -> e2021 -> e2122) //\n\
            \x20 (e0010 -> e1011 -> e1112 -> e1222) //\n\
            \x20 (e0010 -> e1011 -> e1121 -> e2122) //\n\
            \x20 (e0010 -> e1011 -> e0111 -> e0102 -> e0212 -> e1222) //\n\
            \x20 (e0010 -> e1020 -> e2021 -> e2122) //\n\
            \x20 (e0010 -> e1020 -> e2021 -> e1121 -> e1112 -> e1222) //\n\
            \x20 (e0010 -> e1020 -> e2021 -> e1121 -> e0111 -> e0102 -> e0212 -> e1222)",
        asks: &[
            Ask("count(paths(grid))", "12", "12", 0.5),
            Ask("count(cuts(grid))", "", "30", 0.0),
        ],
    },
    Case {
        id: "O70",
        class: 'c',
        source: "closed form sum C(n-j+1,j) q^j p^(n-j) and enumeration (Kuo & Zuo treat this family)",
        note: "i1, i2, i3, i4, i5 = 0.9\n\
            row = fails when (i1 and i2) or (i2 and i3) or (i3 and i4) or (i4 and i5)",
        asks: &[
            Ask("R(row)", "", "0.96309000000000000000", 0.0),
        ],
    },
    Case {
        id: "O21, as routes",
        class: 'b',
        source: "widely published (2p^2+2p^3-5p^4+2p^5), for instance in the terminal-pair literature",
        note: "i1, i2, i3, i4, i5 = 0.9\n\
            bridge = routes(in -> i1 -> i4 -> out, in -> i2 -> i5 -> out, i1 <-> i3 <-> i2, i4 <-> i3 <-> i5)",
        asks: &[
            Ask("R(bridge)", "0.97848", "0.97848000000000000000", 5.0e-6),
            Ask("count(cuts(bridge))", "4", "4", 0.5),
        ],
    },
    Case {
        id: "O23, as routes",
        class: 'c',
        source: "pivotal decomposition on item 3",
        note: "i1 = 0.95\n\
            i2 = 0.90\n\
            i3 = 0.70\n\
            i4 = 0.85\n\
            i5 = 0.80\n\
            bridge = routes(in -> i1 -> i4 -> out, in -> i2 -> i5 -> out, i1 <-> i3 <-> i2, i4 <-> i3 <-> i5)",
        asks: &[
            Ask("R(bridge)", "", "0.95943500000000000000", 0.0),
        ],
    },
    Case {
        id: "O24, as routes",
        class: 'c',
        source: "exact rational 2q^2+2q^3-5q^4+2q^5",
        note: "i1, i2, i3, i4, i5 = fails 1e-6\n\
            bridge = routes(in -> i1 -> i4 -> out, in -> i2 -> i5 -> out, i1 <-> i3 <-> i2, i4 <-> i3 <-> i5)",
        asks: &[
            Ask("F(bridge)", "", "2.0000019999950000020e-12", 0.0),
        ],
    },
    Case {
        id: "O25",
        class: 'c',
        source: "frontier dynamic program in exact rationals, equal to brute force over 2^12",
        note: "j0, j1, j2, j3, j4, j5, j6, j7, j8 = perfect\n\
            e0_1, e1_2, e0_3, e1_4, e3_4, e2_5, e4_5, e3_6, e4_7, e6_7, e5_8, e7_8 = 0.9\n\
            net = routes(in -> j0, j0 <-> e0_1 <-> j1, j1 <-> e1_2 <-> j2, j0 <-> e0_3 <-> j3, j1 <-> e1_4 <-> j4, j3 <-> e3_4 <-> j4, j2 <-> e2_5 <-> j5, j4 <-> e4_5 <-> j5, j3 <-> e3_6 <-> j6, j4 <-> e4_7 <-> j7, j6 <-> e6_7 <-> j7, j5 <-> e5_8 <-> j8, j7 <-> e7_8 <-> j8, j8 -> out)",
        asks: &[
            Ask("R(net)", "", "0.97250217140700000000", 0.0),
        ],
    },
    Case {
        id: "O26",
        class: 'b',
        source: "benchmark of the terminal-pair literature (dodecahedron, 20 nodes and 30 edges), value recalled",
        note: "j0, j1, j2, j3, j4, j5, j6, j7, j8, j9, j10, j11, j12, j13, j14, j15, j16, j17, j18, j19 = perfect\n\
            e0_1, e0_10, e0_19, e1_2, e1_8, e2_3, e2_6, e3_4, e3_19, e4_5, e4_17, e5_6, e5_15, e6_7, e7_8, e7_14, e8_9, e9_10, e9_13, e10_11, e11_12, e11_18, e12_13, e12_16, e13_14, e14_15, e15_16, e16_17, e17_18, e18_19 = 0.9\n\
            net = routes(in -> j0, j0 <-> e0_1 <-> j1, j0 <-> e0_10 <-> j10, j0 <-> e0_19 <-> j19, j1 <-> e1_2 <-> j2, j1 <-> e1_8 <-> j8, j2 <-> e2_3 <-> j3, j2 <-> e2_6 <-> j6, j3 <-> e3_4 <-> j4, j3 <-> e3_19 <-> j19, j4 <-> e4_5 <-> j5, j4 <-> e4_17 <-> j17, j5 <-> e5_6 <-> j6, j5 <-> e5_15 <-> j15, j6 <-> e6_7 <-> j7, j7 <-> e7_8 <-> j8, j7 <-> e7_14 <-> j14, j8 <-> e8_9 <-> j9, j9 <-> e9_10 <-> j10, j9 <-> e9_13 <-> j13, j10 <-> e10_11 <-> j11, j11 <-> e11_12 <-> j12, j11 <-> e11_18 <-> j18, j12 <-> e12_13 <-> j13, j12 <-> e12_16 <-> j16, j13 <-> e13_14 <-> j14, j14 <-> e14_15 <-> j15, j15 <-> e15_16 <-> j16, j16 <-> e16_17 <-> j17, j17 <-> e17_18 <-> j18, j18 <-> e18_19 <-> j19, j15 -> out)",
        asks: &[
            Ask("R(net)", "0.997120", "0.99712039874660671948", 5.0e-7),
        ],
    },
    Case {
        id: "O27",
        class: 'c',
        source: "frontier dynamic program in exact rationals",
        note: "j0, j1, j2, j3, j4, j5, j6, j7, j8, j9, j10, j11, j12, j13, j14, j15, j16, j17, j18, j19 = perfect\n\
            e0_1, e2_3, e4_5, e6_7, e8_9, e10_11, e12_13, e14_15, e16_17, e18_19, e0_2, e1_3, e2_4, e3_5, e4_6, e5_7, e6_8, e7_9, e8_10, e9_11, e10_12, e11_13, e12_14, e13_15, e14_16, e15_17, e16_18, e17_19 = 0.95\n\
            net = routes(in -> j0, j0 <-> e0_1 <-> j1, j2 <-> e2_3 <-> j3, j4 <-> e4_5 <-> j5, j6 <-> e6_7 <-> j7, j8 <-> e8_9 <-> j9, j10 <-> e10_11 <-> j11, j12 <-> e12_13 <-> j13, j14 <-> e14_15 <-> j15, j16 <-> e16_17 <-> j17, j18 <-> e18_19 <-> j19, j0 <-> e0_2 <-> j2, j1 <-> e1_3 <-> j3, j2 <-> e2_4 <-> j4, j3 <-> e3_5 <-> j5, j4 <-> e4_6 <-> j6, j5 <-> e5_7 <-> j7, j6 <-> e6_8 <-> j8, j7 <-> e7_9 <-> j9, j8 <-> e8_10 <-> j10, j9 <-> e9_11 <-> j11, j10 <-> e10_12 <-> j12, j11 <-> e11_13 <-> j13, j12 <-> e12_14 <-> j14, j13 <-> e13_15 <-> j15, j14 <-> e14_16 <-> j16, j15 <-> e15_17 <-> j17, j16 <-> e16_18 <-> j18, j17 <-> e17_19 <-> j19, j18 -> out)",
        asks: &[
            Ask("R(net)", "", "0.97103182598655023272", 0.0),
        ],
    },
    Case {
        id: "O28",
        class: 'b',
        source: "polynomial 16p^3-33p^4+24p^5-6p^6 (textbook, recalled) and enumeration",
        note: "j0, j1, j2, j3 = perfect\n\
            e0_1, e0_2, e1_2, e0_3, e1_3, e2_3 = 0.9\n\
            net = routes(in -> j0, j0 <-> e0_1 <-> j1, j0 <-> e0_2 <-> j2, j1 <-> e1_2 <-> j2, j0 <-> e0_3 <-> j3, j1 <-> e1_3 <-> j3, j2 <-> e2_3 <-> j3) with ends all of (j1, j2, j3)",
        asks: &[
            Ask("R(net)", "", "0.99581400000000000000", 0.0),
        ],
    },
    Case {
        id: "O29",
        class: 'b',
        source: "Godsil and Royle, Algebraic Graph Theory p. 355, polynomial recalled, confirmed by dynamic program; paths are spanning trees",
        note: "j0, j1, j2, j3, j4, j5, j6, j7, j8, j9 = perfect\n\
            e0_1, e1_2, e2_3, e3_4, e4_0, e5_7, e6_8, e7_9, e8_5, e9_6, e0_5, e1_6, e2_7, e3_8, e4_9 = 0.9\n\
            net = routes(in -> j0, j0 <-> e0_1 <-> j1, j1 <-> e1_2 <-> j2, j2 <-> e2_3 <-> j3, j3 <-> e3_4 <-> j4, j4 <-> e4_0 <-> j0, j5 <-> e5_7 <-> j7, j6 <-> e6_8 <-> j8, j7 <-> e7_9 <-> j9, j8 <-> e8_5 <-> j5, j9 <-> e9_6 <-> j6, j0 <-> e0_5 <-> j5, j1 <-> e1_6 <-> j6, j2 <-> e2_7 <-> j7, j3 <-> e3_8 <-> j8, j4 <-> e4_9 <-> j9) with ends all of (j1, j2, j3, j4, j5, j6, j7, j8, j9)",
        asks: &[
            Ask("R(net)", "", "0.98856691464369600000", 0.0),
            Ask("count(paths(net))", "2000", "2000", 0.5),
        ],
    },
    Case {
        id: "O30",
        class: 'b',
        source: "count of connected labelled graphs (Gilbert 1959 recursion), recalled: 26704 of 2^15; paths are spanning trees, 6^4 by Cayley",
        note: "j0, j1, j2, j3, j4, j5 = perfect\n\
            e0_1, e0_2, e1_2, e0_3, e1_3, e2_3, e0_4, e1_4, e2_4, e3_4, e0_5, e1_5, e2_5, e3_5, e4_5 = 0.5\n\
            net = routes(in -> j0, j0 <-> e0_1 <-> j1, j0 <-> e0_2 <-> j2, j1 <-> e1_2 <-> j2, j0 <-> e0_3 <-> j3, j1 <-> e1_3 <-> j3, j2 <-> e2_3 <-> j3, j0 <-> e0_4 <-> j4, j1 <-> e1_4 <-> j4, j2 <-> e2_4 <-> j4, j3 <-> e3_4 <-> j4, j0 <-> e0_5 <-> j5, j1 <-> e1_5 <-> j5, j2 <-> e2_5 <-> j5, j3 <-> e3_5 <-> j5, j4 <-> e4_5 <-> j5) with ends all of (j1, j2, j3, j4, j5)",
        asks: &[
            Ask("R(net)", "", "0.81494140625000000000", 0.0),
            Ask("count(paths(net))", "1296", "1296", 0.5),
        ],
    },
];
