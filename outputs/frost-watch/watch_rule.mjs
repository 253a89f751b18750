// A rule of thumb for one watcher, as JavaScript. A calculation, made by thumbwright: read
// the caution and the cost below before you use it.
//
// Case: Frost watch in two orchards
// Case frost-watch, digest 56c9f779be1f; thumbwright 0.1.0.
// For Mill field (mill), watching Upper field (upper).
// plus: frost tonight
// minus: no frost tonight
// Worked out for steps 1 to 40. At later steps the rows that are open at the end still hold,
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
// decide()                                  0.2168             0.1686        7.27
// answering by value()                      0.2168             0.1686        7.27
// the full calculation                      0.2168             0.1686        7.27
// undecided neighbours ignored              0.2603             0.1581        6.66
// everybody ignored                         0.2281             0.2281        8.13
//
// FUNCTIONS
// value(step, upper): what the situation is worth, in nats: what it adds to the log-odds for
//   plus. A number.
// decide(tally, step, upper): what to show. "plus", "minus" or "undecided". States, first
//   answers and thresholds are handed over by name or by code. Throws a RangeError at anything
//   else.
//
// ARGUMENTS
// tally: the own count: a whole number, the sum over all own observations of what each moves
//   it (mild sign -1, frost sign +1)
// step: own observations so far, this one included (steps of 10 minutes); from 1
// upper: what Upper field shows now (undecided: lamp dark; plus: lamp lit; minus: lamp
//   blinking)
//
// CHECK
// node watch_rule.mjs runs the situations at the end of the file; exit status 1: mismatch.

const _STATES = ["undecided", "plus", "minus"];
const _UNDECIDED = 0, _PLUS = 1, _MINUS = 2;

/** What the situation is worth, in nats; throws a RangeError where that is not known. */
export function value(step, upper) {
  _whole("step", step, 1);
  upper = _code("upper", upper, _STATES);

  if (step >= 3 && upper === _MINUS) return -0.8109302162;
  if (step <= 2) return 0.0;
  if (step >= 5 && step <= 6 && upper === _UNDECIDED) return 0.3610133455;
  if (step >= 7 && upper === _UNDECIDED) return 0.3974664539;
  if (step >= 3 && step <= 4 && (upper === _UNDECIDED || upper === _PLUS)) return 0.2719337155;
  if (step >= 5 && upper === _PLUS) return 1.621860432;
  throw new RangeError("no row of the rule holds in this situation");
}

/** "plus", "minus" or "undecided"; throws a RangeError where the rule does not say. */
export function decide(tally, step, upper) {
  _whole("tally", tally, -Infinity);
  _whole("step", step, 1);
  upper = _code("upper", upper, _STATES);

  if (step <= 2 && upper === _UNDECIDED) return _answer(tally, -3, 3);
  if (step >= 3 && upper === _UNDECIDED) return _answer(tally, -4, 3);
  if (upper === _PLUS) return _answer(tally, -7, -1);
  if (upper === _MINUS) return _answer(tally, -1, 5);
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
    [3, "minus", -0.8109302162],
    [40, "minus", -0.8109302162],
    [1, "undecided", 0.0],
    [2, "minus", 0.0],
    [5, "undecided", 0.3610133455],
    [6, "undecided", 0.3610133455],
    [7, "undecided", 0.3974664539],
    [40, "undecided", 0.3974664539],
    [3, "undecided", 0.2719337155],
    [4, "plus", 0.2719337155],
    [5, "plus", 1.621860432],
    [40, "plus", 1.621860432],
  ];
  const decisions = [ // tally, arguments in their order, answer
    [-2, 1, "undecided", "undecided"],
    [-3, 1, "undecided", "minus"],
    [2, 2, "undecided", "undecided"],
    [3, 2, "undecided", "plus"],
    [-3, 3, "undecided", "undecided"],
    [-4, 3, "undecided", "minus"],
    [2, 40, "undecided", "undecided"],
    [3, 40, "undecided", "plus"],
    [-6, 1, "plus", "undecided"],
    [-7, 1, "plus", "minus"],
    [-2, 40, "plus", "undecided"],
    [-1, 40, "plus", "plus"],
    [0, 1, "minus", "undecided"],
    [-1, 1, "minus", "minus"],
    [4, 40, "minus", "undecided"],
    [5, 40, "minus", "plus"],
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
