// A rule of thumb for one watcher, as JavaScript. A calculation, made by thumbwright: read
// the caution and the cost below before you use it.
//
// Case: Lot inspection by two inspectors
// Case lot-inspection, digest 97f28eaf3a9e; thumbwright 0.1.0.
// For Second inspector (second), watching First inspector (first).
// plus: bad lot
// minus: good lot
// Worked out for steps 1 to 120. At later steps the rows that are open at the end still hold,
//   but nothing was worked out or priced there.
//
// CAUTION
// Property or money can be lost by a wrong answer: contracts, agreed standards and insurance
//   terms prevail over it.
// An alarm, an order or sure evidence overrides it at once.
// This is a calculation under the assumptions stated with it, not a guarantee.
// It defers to local rules, codes of practice, contracts and the judgement of licensed or
//   trained people; where they differ from it, follow them.
// Where an assumption is clearly untrue, put it aside and fall back on usual practice.
//
// COST
// Share of outings that end in a wrong answer, given that plus or that minus is true, and the
//   mean number of steps used, where this agent alone uses the rule and the others are exact.
//   It holds for this very rule: price it again after any change.
//
//                                 wrong, plus true  wrong, minus true  mean steps
// decide()                                  0.1012             0.0167       17.10
// answering by value()                      0.1009             0.0167       17.11
// the full calculation                      0.1012             0.0167       17.09
// undecided neighbours ignored              0.0517             0.0206       21.38
// everybody ignored                         0.0994             0.0220       26.27
//
// FUNCTIONS
// value(step, first): what the situation is worth, in nats: what it adds to the log-odds for
//   plus. A number.
// decide(tally, step, first): what to show. "plus", "minus" or "undecided". States, first
//   answers and thresholds are handed over by name or by code. Throws a RangeError at anything
//   else.
//
// ARGUMENTS
// tally: the own count: a whole number, the sum over all own observations of what each moves
//   it (0 +0, 1 +1)
// step: own observations so far, this one included (steps of one item); from 1
// first: what First inspector shows now (undecided: no tag yet; plus: lot tagged rejected;
//   minus: lot tagged accepted)
//
// CHECK
// node watch_rule.mjs runs the situations at the end of the file; exit status 1: mismatch.

const _STATES = ["undecided", "plus", "minus"];
const _UNDECIDED = 0, _PLUS = 1, _MINUS = 2;

/** What the situation is worth, in nats; throws a RangeError where that is not known. */
export function value(step, first) {
  _whole("step", step, 1);
  first = _code("first", first, _STATES);

  if (step >= 11 && first === _MINUS) return -2.286722153;
  if (step <= 4 && (first === _UNDECIDED || first === _MINUS)) return -0.009379590603;
  if (step >= 5 && step <= 6 && (first === _UNDECIDED || first === _MINUS)) return -0.06831709796;
  if (step >= 7 && step <= 8 && (first === _UNDECIDED || first === _MINUS)) return -0.1395988488;
  if (step >= 9 && step <= 10 && (first === _UNDECIDED || first === _MINUS)) return -0.227380078;
  if (step >= 11 && step <= 11 && first === _UNDECIDED) return -0.3021154283;
  if (step >= 12 && step <= 12 && first === _UNDECIDED) return -0.3552647973;
  if (step >= 13 && step <= 13 && first === _UNDECIDED) return -0.4108346484;
  if (step >= 14 && step <= 14 && first === _UNDECIDED) return -0.4685934826;
  if (step >= 15 && step <= 15 && first === _UNDECIDED) return -0.5283408472;
  if (step >= 16 && step <= 16 && first === _UNDECIDED) return -0.5899020423;
  if (step >= 17 && step <= 17 && first === _UNDECIDED) return -0.6531239076;
  if (step >= 18 && step <= 19 && first === _UNDECIDED) return -0.7500982637;
  if (step >= 20 && step <= 24 && first === _UNDECIDED) return -0.8635289895;
  if (step >= 25 && step <= 28 && first === _UNDECIDED) return 0.4121382511;
  if (step >= 29 && step <= 32 && first === _UNDECIDED) return 0.234287806;
  if (step >= 33 && step <= 35 && first === _UNDECIDED) return 0.0387761926;
  if (step >= 36 && step <= 39 && first === _UNDECIDED) return -0.1773909195;
  if (step >= 40 && step <= 43 && first === _UNDECIDED) return -0.4501289473;
  if (step >= 44 && step <= 49 && first === _UNDECIDED) return -0.7430166317;
  if (step >= 50 && step <= 59 && first === _UNDECIDED) return 0.2711233102;
  if (step >= 60 && first === _UNDECIDED) return -0.3076534977;
  if (step <= 10 && first === _PLUS) return 4.18961588;
  if (step >= 11 && first === _PLUS) return 3.559104757;
  throw new RangeError("no row of the rule holds in this situation");
}

/** "plus", "minus" or "undecided"; throws a RangeError where the rule does not say. */
export function decide(tally, step, first) {
  _whole("tally", tally, -Infinity);
  _whole("step", step, 1);
  first = _code("first", first, _STATES);

  if (step <= 14 && first === _UNDECIDED) return _answer(tally, -Infinity, 2);
  if (step >= 15 && step <= 16 && first === _UNDECIDED) return _answer(tally, -Infinity, 3);
  if (step >= 17 && step <= 40 && first === _UNDECIDED) return _answer(tally, 0, 3);
  if (step >= 41 && step <= 42 && first === _UNDECIDED) return _answer(tally, 0, 4);
  if (step >= 43 && step <= 65 && first === _UNDECIDED) return _answer(tally, 1, 4);
  if (step >= 66 && step <= 68 && first === _UNDECIDED) return _answer(tally, 1, 5);
  if (step >= 69 && first === _UNDECIDED) return _answer(tally, 2, 5);
  if (step <= 10 && first === _PLUS) return _answer(tally, -Infinity, 0);
  if (step >= 11 && step <= 32 && first === _PLUS) return _answer(tally, -Infinity, 1);
  if (step >= 33 && step <= 57 && first === _PLUS) return _answer(tally, -Infinity, 2);
  if (step >= 58 && step <= 61 && first === _PLUS) return _answer(tally, -Infinity, 3);
  if (step >= 62 && step <= 86 && first === _PLUS) return _answer(tally, 0, 3);
  if (step >= 87 && step <= 112 && first === _PLUS) return _answer(tally, 1, 4);
  if (step >= 113 && first === _PLUS) return _answer(tally, 2, 4);
  if (step <= 46 && first === _MINUS) return _answer(tally, 1, 4);
  if (step >= 47 && step <= 49 && first === _MINUS) return _answer(tally, 1, 5);
  if (step >= 50 && step <= 71 && first === _MINUS) return _answer(tally, 2, 5);
  if (step >= 72 && step <= 75 && first === _MINUS) return _answer(tally, 2, 6);
  if (step >= 76 && step <= 96 && first === _MINUS) return _answer(tally, 3, 6);
  if (step >= 97 && step <= 100 && first === _MINUS) return _answer(tally, 3, 7);
  if (step >= 101 && first === _MINUS) return _answer(tally, 4, 7);
  throw new RangeError("no row of the rule holds in this situation");
}

function _answer(number, minusAt, plusAt) {
  return number >= plusAt ? "plus" : number <= minusAt ? "minus" : "undecided";
}

function _whole(name, given, least) {
  if (Number.isSafeInteger(given) && given >= least) return;
  const start = least === -Infinity ? "" : ` from ${least}`;
  throw new RangeError(`${name} must be a whole number${start}, not ${String(given)}`);
}

function _code(name, given, names) {
  const code = typeof given === "string" ? names.indexOf(given) : given;
  if (Number.isInteger(code) && code >= 0 && code < names.length) return code;
  throw new RangeError(`${name} must be one of ${names.join(", ")}, not ${String(given)}`);
}

function _said(part, given) {
  try {
    return part(...given);
  } catch (refusal) {
    if (refusal instanceof RangeError) return `refused: ${refusal.message}`;
    throw refusal;
  }
}

function _selfCheck() {
  const worths = [ // arguments in their order, nats
    [11, "minus", -2.286722153],
    [120, "minus", -2.286722153],
    [1, "undecided", -0.009379590603],
    [4, "minus", -0.009379590603],
    [5, "undecided", -0.06831709796],
    [6, "minus", -0.06831709796],
    [7, "undecided", -0.1395988488],
    [8, "minus", -0.1395988488],
    [9, "undecided", -0.227380078],
    [10, "minus", -0.227380078],
    [11, "undecided", -0.3021154283],
    [12, "undecided", -0.3552647973],
    [13, "undecided", -0.4108346484],
    [14, "undecided", -0.4685934826],
    [15, "undecided", -0.5283408472],
    [16, "undecided", -0.5899020423],
    [17, "undecided", -0.6531239076],
    [18, "undecided", -0.7500982637],
    [19, "undecided", -0.7500982637],
    [20, "undecided", -0.8635289895],
    [24, "undecided", -0.8635289895],
    [25, "undecided", 0.4121382511],
    [28, "undecided", 0.4121382511],
    [29, "undecided", 0.234287806],
    [32, "undecided", 0.234287806],
    [33, "undecided", 0.0387761926],
    [35, "undecided", 0.0387761926],
    [36, "undecided", -0.1773909195],
    [39, "undecided", -0.1773909195],
    [40, "undecided", -0.4501289473],
    [43, "undecided", -0.4501289473],
    [44, "undecided", -0.7430166317],
    [49, "undecided", -0.7430166317],
    [50, "undecided", 0.2711233102],
    [59, "undecided", 0.2711233102],
    [60, "undecided", -0.3076534977],
    [120, "undecided", -0.3076534977],
    [1, "plus", 4.18961588],
    [10, "plus", 4.18961588],
    [11, "plus", 3.559104757],
    [120, "plus", 3.559104757],
  ];
  const decisions = [ // tally, arguments in their order, answer
    [0, 1, "undecided", "undecided"],
    [1, 14, "undecided", "undecided"],
    [2, 14, "undecided", "plus"],
    [0, 15, "undecided", "undecided"],
    [2, 16, "undecided", "undecided"],
    [3, 16, "undecided", "plus"],
    [1, 17, "undecided", "undecided"],
    [0, 17, "undecided", "minus"],
    [2, 40, "undecided", "undecided"],
    [3, 40, "undecided", "plus"],
    [1, 41, "undecided", "undecided"],
    [0, 41, "undecided", "minus"],
    [3, 42, "undecided", "undecided"],
    [4, 42, "undecided", "plus"],
    [2, 43, "undecided", "undecided"],
    [1, 43, "undecided", "minus"],
    [3, 65, "undecided", "undecided"],
    [4, 65, "undecided", "plus"],
    [2, 66, "undecided", "undecided"],
    [1, 66, "undecided", "minus"],
    [4, 68, "undecided", "undecided"],
    [5, 68, "undecided", "plus"],
    [3, 69, "undecided", "undecided"],
    [2, 69, "undecided", "minus"],
    [4, 120, "undecided", "undecided"],
    [5, 120, "undecided", "plus"],
    [0, 1, "plus", "plus"],
    [-1, 10, "plus", "undecided"],
    [0, 10, "plus", "plus"],
    [0, 11, "plus", "undecided"],
    [0, 32, "plus", "undecided"],
    [1, 32, "plus", "plus"],
    [0, 33, "plus", "undecided"],
    [1, 57, "plus", "undecided"],
    [2, 57, "plus", "plus"],
    [0, 58, "plus", "undecided"],
    [2, 61, "plus", "undecided"],
    [3, 61, "plus", "plus"],
    [1, 62, "plus", "undecided"],
    [0, 62, "plus", "minus"],
    [2, 86, "plus", "undecided"],
    [3, 86, "plus", "plus"],
    [2, 87, "plus", "undecided"],
    [1, 87, "plus", "minus"],
    [3, 112, "plus", "undecided"],
    [4, 112, "plus", "plus"],
    [3, 113, "plus", "undecided"],
    [2, 113, "plus", "minus"],
    [3, 120, "plus", "undecided"],
    [4, 120, "plus", "plus"],
    [2, 1, "minus", "undecided"],
    [1, 1, "minus", "minus"],
    [3, 46, "minus", "undecided"],
    [4, 46, "minus", "plus"],
    [2, 47, "minus", "undecided"],
    [1, 47, "minus", "minus"],
    [4, 49, "minus", "undecided"],
    [5, 49, "minus", "plus"],
    [3, 50, "minus", "undecided"],
    [2, 50, "minus", "minus"],
    [4, 71, "minus", "undecided"],
    [5, 71, "minus", "plus"],
    [3, 72, "minus", "undecided"],
    [2, 72, "minus", "minus"],
    [5, 75, "minus", "undecided"],
    [6, 75, "minus", "plus"],
    [4, 76, "minus", "undecided"],
    [3, 76, "minus", "minus"],
    [5, 96, "minus", "undecided"],
    [6, 96, "minus", "plus"],
    [4, 97, "minus", "undecided"],
    [3, 97, "minus", "minus"],
    [6, 100, "minus", "undecided"],
    [7, 100, "minus", "plus"],
    [5, 101, "minus", "undecided"],
    [4, 101, "minus", "minus"],
    [6, 120, "minus", "undecided"],
    [7, 120, "minus", "plus"],
  ];
  let wrong = 0;
  for (const [part, samples] of [[value, worths], [decide, decisions]]) {
    for (const sample of samples) {
      const given = sample.slice(0, -1), expected = sample.at(-1), said = _said(part, given);
      if (said === expected) continue;
      console.log(`${part.name}(${given.join(", ")}) is ${said}, not ${expected}`);
      wrong += 1;
    }
  }
  if (!String(_said(decide, [0, 0, ...decisions[0].slice(2, -1)])).startsWith("refused")) {
    console.log("decide() takes 0 for a step");
    wrong += 1;
  }
  console.log(wrong ? `${wrong} wrong` : "all as it should be");
  return wrong;
}

// Run alone by node, and not as a part of something else.
if (typeof process !== "undefined" && process.versions?.node && process.argv[1]) {
  Promise.all([import("node:fs"), import("node:url")]).then(([files, urls]) => {
    const run = urls.pathToFileURL(files.realpathSync(process.argv[1])).href;
    if (run === import.meta.url && _selfCheck()) process.exitCode = 1;
  });
}
