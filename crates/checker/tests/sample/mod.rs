//! Sample values that several tests share.
#![allow(dead_code, reason = "each test uses a part")]

use keepout_checker::Limits;
use keepout_checker::certificate::Certificate;
use keepout_checker::number::{Dyadic, Interval, Rational};
use keepout_checker::statement::Statement;

/// A rational from `p` or `p/q`.
pub(crate) fn rational(text: &str) -> Rational {
    text.parse().unwrap()
}

/// The dyadic number m 2^e.
pub(crate) fn dyadic(m: i64, e: i64) -> Dyadic {
    Dyadic::new(m.into(), e)
}

/// The exact value.
pub(crate) fn exact(value: &Dyadic) -> Rational {
    let power = Rational::from_integer(num_bigint::BigInt::from(1) << value.exponent().unsigned_abs());
    let mantissa = Rational::from_integer(value.mantissa().clone());
    if value.exponent() >= 0 { mantissa * power } else { mantissa / power }
}

/// The value of a polynomial at a rational point.
pub(crate) fn value(p: &keepout_checker::polynomial::Polynomial, at: &Rational) -> Rational {
    p.coefficients().iter().rev().fold(rational("0"), |sum, c| sum * at + c)
}

/// Whether a rational number is a member.
pub(crate) fn contains(interval: &Interval, value: &Rational) -> bool {
    exact(interval.lo()) <= *value && *value <= exact(interval.hi())
}

/// Pseudo-random numbers with a fixed seed (Knuth's linear congruential generator MMIX).
pub(crate) struct Source(pub(crate) u64);

impl Source {
    /// A number in -range ..= range.
    pub(crate) fn signed(&mut self, range: i64) -> i64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        let span = u64::try_from(2 * range + 1).unwrap();
        i64::try_from((self.0 >> 33) % span).unwrap() - range
    }

    /// A dyadic number with a mantissa up to `range` and an exponent in -4 ..= 4.
    pub(crate) fn dyadic(&mut self, range: i64) -> Dyadic {
        let mantissa = self.signed(range);
        dyadic(mantissa, self.signed(4))
    }

    /// A small rational number.
    pub(crate) fn rational(&mut self) -> Rational {
        let numerator = self.signed(50);
        Rational::new(numerator.into(), (self.signed(12).abs() + 1).into())
    }
}

/// A statement with one of each thing.
pub(crate) const FULL_STATEMENT: &str = r#"{
  "format": "keepout-statement/1",
  "title": "Inlet damper",
  "states": [{"name": "angle", "unit": "rad", "start": "0"}, {"name": "speed", "start": "-1/3"}],
  "drives": [
    {"name": "torque", "unit": "N m", "signal": [
      {"times": "1/2", "power": "0", "rate": "0"},
      {"times": "-1", "power": "2", "rate": "-2"},
      {"times": "1/50", "power": "0", "rate": "0", "sin": "12"},
      {"times": "3", "power": "1", "rate": "-1/2", "cos": "1"}
    ]}
  ],
  "outputs": [
    {"name": "load", "value": [
      {"times": "3/2", "of": ["angle"]}, {"times": "-1", "of": [{"name": "speed", "power": "2"}, "torque"]}
    ]}
  ],
  "phases": [{"rates": [
    {"of": "angle", "terms": [{"times": "1", "of": "speed"}], "offset": "0"},
    {"of": "speed", "terms": [{"times": "-75/2", "of": "angle"}, {"times": "25", "of": "torque"}], "offset": "-7"}
  ]}],
  "zone": {
    "name": "end stop", "ref": "ACT-021",
    "inside": {"any": [
      {"polynomial": [{"times": "1", "of": ["angle"]}, {"times": "-9/10", "of": []}], "is": ">= 0"},
      {"all": [
        {"polynomial": [{"times": "1", "of": ["load"]}], "is": "> 0"},
        {"any": [
          {"polynomial": [{"times": "1", "of": ["t"]}, {"times": "-1/3", "of": []}], "is": "< 0"},
          {"polynomial": [{"times": "1", "of": ["speed"]}], "is": "!= 0"}
        ]}
      ]}
    ]},
    "from": "0", "until": "60"
  },
  "claim": {"never": {"margin": "0"}}
}"#;

/// x' = -x from 1 never satisfies x > 1: touched at the start, then the constant -1 leads.
pub(crate) const DECAY: &str = r#"{
  "format": "keepout-certificate/1",
  "statement": {
    "format": "keepout-statement/1", "title": "decay",
    "states": [{"name": "x", "start": "1"}], "drives": [], "outputs": [],
    "phases": [{"rates": [{"of": "x", "terms": [{"times": "-1", "of": "x"}], "offset": "0"}]}],
    "zone": {
      "name": "above the start",
      "inside": {"polynomial": [{"times": "1", "of": ["x"]}, {"times": "-1", "of": []}], "is": "> 0"},
      "from": "0"
    },
    "claim": {"never": {"margin": "0"}}
  },
  "bits": "64",
  "families": [
    {"polynomial": ["0", "1"], "centres": [{"re": "0", "im": "0"}]},
    {"polynomial": ["1", "1"], "centres": [{"re": "-1", "im": "0"}]}
  ],
  "traces": [[{"family": "0", "multiplicity": "1"}, {"family": "1", "multiplicity": "1"}]],
  "auxiliaries": [], "identities": [], "sums": [],
  "evidence": {"never": {
    "cells": [{"to": "1/2", "order": "8", "signs": [], "start": [{"sign": "0:-", "power": "1"}]}],
    "cone": {
      "far": {"from": "1/2", "base": [], "angles": [], "leads": [{"function": "0", "roots": ["0"]}]},
      "nodes": [{"signs": ["0:-"]}]
    }
  }}
}"#;

/// x' = y, y' = -x from (1, 0) never satisfies x >= 2: constant and rotation lead together.
pub(crate) const ROTATION: &str = r#"{
  "format": "keepout-certificate/1",
  "statement": {
    "format": "keepout-statement/1", "title": "rotation",
    "states": [{"name": "x", "start": "1"}, {"name": "y", "start": "0"}], "drives": [], "outputs": [],
    "phases": [{"rates": [
      {"of": "x", "terms": [{"times": "1", "of": "y"}], "offset": "0"},
      {"of": "y", "terms": [{"times": "-1", "of": "x"}], "offset": "0"}
    ]}],
    "zone": {
      "name": "beyond two",
      "inside": {"polynomial": [{"times": "1", "of": ["x"]}, {"times": "-2", "of": []}], "is": ">= 0"},
      "from": "0"
    },
    "claim": {"never": {"margin": "0"}}
  },
  "bits": "64",
  "families": [
    {"polynomial": ["0", "1"], "centres": [{"re": "0", "im": "0"}]},
    {"polynomial": ["1", "0", "1"], "centres": [{"re": "0", "im": "1"}]}
  ],
  "traces": [[{"family": "0", "multiplicity": "1"}, {"family": "1", "multiplicity": "1"}]],
  "auxiliaries": [], "identities": [], "sums": [],
  "evidence": {"never": {
    "cells": [{"to": "1/2", "order": "8", "signs": ["0:-"]}],
    "cone": {
      "far": {
        "from": "1/2", "base": ["1"], "angles": [{"root": "1", "turns": ["1"]}],
        "leads": [{"function": "0", "roots": ["0", "1"], "line": "0"}]
      },
      "nodes": [
        {"split": "0"}, {"split": "0"}, {"signs": ["0:-"]}, {"signs": ["0:-"]},
        {"split": "0"}, {"signs": ["0:-"]}, {"signs": ["0:-"]}
      ]
    }
  }}
}"#;

/// x' = -x from 1 satisfies x >= 1 at t = 0.
pub(crate) const START: &str = r#"{
  "format": "keepout-certificate/1",
  "statement": {
    "format": "keepout-statement/1", "title": "start",
    "states": [{"name": "x", "start": "1"}], "drives": [], "outputs": [],
    "phases": [{"rates": [{"of": "x", "terms": [{"times": "-1", "of": "x"}], "offset": "0"}]}],
    "zone": {
      "name": "at the start",
      "inside": {"polynomial": [{"times": "1", "of": ["x"]}, {"times": "-1", "of": []}], "is": ">= 0"},
      "from": "0"
    },
    "claim": {"enters": {"from": "0", "to": "0", "first": true}}
  },
  "bits": "64",
  "families": [
    {"polynomial": ["0", "1"], "centres": [{"re": "0", "im": "0"}]},
    {"polynomial": ["1", "1"], "centres": [{"re": "-1", "im": "0"}]}
  ],
  "traces": [[{"family": "0", "multiplicity": "1"}, {"family": "1", "multiplicity": "1"}]],
  "auxiliaries": [], "identities": [], "sums": [],
  "evidence": {"enters": {"before": [], "from": "0", "cell": {"to": "0", "order": "1", "signs": ["0:0"]}}}
}"#;

/// x = (t - 1)^2 is never negative on [0, 2]: it is the square of the function t - 1, times 1.
pub(crate) const SQUARE: &str = r#"{
  "format": "keepout-certificate/1",
  "statement": {
    "format": "keepout-statement/1", "title": "square",
    "states": [{"name": "x", "start": "1"}, {"name": "v", "start": "-2"}], "drives": [], "outputs": [],
    "phases": [{"rates": [
      {"of": "x", "terms": [{"times": "1", "of": "v"}], "offset": "0"},
      {"of": "v", "terms": [], "offset": "2"}
    ]}],
    "zone": {
      "name": "negative", "inside": {"polynomial": [{"times": "1", "of": ["x"]}], "is": "< 0"},
      "from": "0", "until": "2"
    },
    "claim": {"never": {"margin": "0"}}
  },
  "bits": "64",
  "families": [{"polynomial": ["0", "1"], "centres": [{"re": "0", "im": "0"}]}],
  "traces": [[{"family": "0", "multiplicity": "3"}]],
  "auxiliaries": [
    {"factors": [{"family": "0", "multiplicity": "2"}], "derivatives": ["-1", "1"]},
    {"factors": [{"family": "0", "multiplicity": "1"}], "derivatives": ["1"]}
  ],
  "identities": [{"target": "0", "summands": [["1^2", "2^1"]]}],
  "sums": [],
  "evidence": {"never": {"cells": [{"to": "2", "order": "4", "signs": ["2:+"], "pivot": "1"}]}}
}"#;

/// The statement in a text.
pub(crate) fn statement(text: &str) -> Statement {
    Statement::from_json(text, &Limits::default()).unwrap()
}

/// The certificate in a text.
pub(crate) fn certificate(text: &str) -> Certificate {
    Certificate::from_json(text, &Limits::default()).unwrap()
}

/// The text with one part changed; the part is there once.
pub(crate) fn changed(text: &str, from: &str, to: &str) -> String {
    assert_eq!(text.matches(from).count(), 1, "{from:?} is not there once");
    text.replace(from, to)
}
