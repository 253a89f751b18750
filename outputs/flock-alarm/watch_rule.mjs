// A rule of thumb for one watcher, as JavaScript. A calculation, made by thumbwright: read
// the caution and the cost below before you use it.
//
// Case: Flock alarm on a stubble field
// Case flock-alarm, digest adbf2c693957; thumbwright 0.1.0.
// For any of the group, all being alike: here Agent 1 (a1), watching Agent 2 (a2), Agent 3
//   (a3), Agent 4 (a4), Agent 5 (a5), Agent 6 (a6), Agent 7 (a7), Agent 8 (a8).
// plus: hawk near
// minus: no hawk
// Worked out for steps 1 to 20. At later steps the rows that are open at the end still hold,
//   but nothing was worked out or priced there.
//
// CAUTION
// Animals can suffer from a wrong answer: animal welfare law and veterinary advice come before
//   it.
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
// Not every figure is exact. What happens where everybody uses the rule was sampled, 4,000
//   public histories of too many to enumerate; those figures carry standard errors and are not
//   exact. Others take the agent for exact; by a rule it shows them what their model calls
//   impossible up to 1.22 times per outing, which they read as the same call at the latest
//   earlier moment at which the model allowed it, or as no news.
//
//                                 wrong, plus true  wrong, minus true  mean steps
// decide(), by value()                      0.0331             0.0633        5.52
// the full calculation                      0.0837             0.0620        4.80
// undecided neighbours ignored              0.0932             0.1499        4.26
// everybody ignored                         0.0814             0.1361       11.35
//
// FUNCTIONS
// value(step, plus_shown, minus_shown): what the situation is worth, in nats: what it adds to
//   the log-odds for plus. A number.
// decide(tally, step, plus_shown, minus_shown): what to show. "plus", "minus" or "undecided".
//   States, first answers and thresholds are handed over by name or by code. Throws a
//   RangeError at anything else.
//
// ARGUMENTS
// tally: the own evidence in nats, the prior left out: the sum over all own observations of
//   the natural logarithm of how much likelier each is if plus is true (here 1.349926716949 *
//   own count - 0.2513144282809 * step)
// step: own observations so far, this one included (steps of second); from 1
// plus_shown: how many of the seen agents show plus; from 0
// minus_shown: how many of the seen agents show minus; from 0
//
// CHECK
// node watch_rule.mjs runs the situations at the end of the file; exit status 1: mismatch.

const _STATES = ["undecided", "plus", "minus"];
const _UNDECIDED = 0, _PLUS = 1, _MINUS = 2;

const _PRIOR = -0.847297860387; // nats
const _MINUS_AT = -2.9063530612; // the agent answers minus at this belief (nats) or below
const _PLUS_AT = 0.536093102676; // and plus at this belief or above
const _TIE = 1e-09; // so close to a threshold counts as having reached it

/** What the situation is worth, in nats; throws a RangeError where that is not known. */
export function value(step, plus_shown, minus_shown) {
  _whole("step", step, 1);
  _whole("plus_shown", plus_shown, 0);
  _whole("minus_shown", minus_shown, 0);

  if (step >= 3 && plus_shown <= 0 && minus_shown <= 2) return -0.6813447529;
  if (step >= 2 && step <= 2 && plus_shown <= 0) return -0.3911367569;
  if (step >= 3 && plus_shown <= 0 && minus_shown >= 3) return -2.21906361;
  if (step <= 1) return 0.0;
  if (step >= 3 && plus_shown >= 1 && plus_shown <= 3 && minus_shown <= 3) return 0.3489952864;
  if (step >= 2 && step <= 2 && plus_shown >= 1 && plus_shown <= 3) return 1.513237877;
  if (step >= 3 && plus_shown >= 1 && plus_shown <= 3 && minus_shown >= 4) return -1.347774071;
  if (step >= 2 && plus_shown >= 4) return 2.037373055;
  throw new RangeError("no row of the rule holds in this situation");
}

/** "plus", "minus" or "undecided"; throws a RangeError where the rule does not say. */
export function decide(tally, step, plus_shown, minus_shown) {
  const _belief = _PRIOR + _number("tally", tally) + value(step, plus_shown, minus_shown);
  return _answer(_number("belief", _belief), _MINUS_AT + _TIE, _PLUS_AT - _TIE);
}

function _answer(number, minusAt, plusAt) {
  return number >= plusAt ? "plus" : number <= minusAt ? "minus" : "undecided";
}

function _whole(name, given, least) {
  if (Number.isSafeInteger(given) && given >= least) return;
  const start = least === -Infinity ? "" : ` from ${least}`;
  throw new RangeError(`${name} must be a whole number${start}, not ${String(given)}`);
}

function _number(name, given) {
  if (typeof given === "number" && given === given) return given;
  throw new RangeError(`${name} must be a number, not ${String(given)}`);
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
    [3, 0, 0, -0.6813447529],
    [20, 0, 2, -0.6813447529],
    [2, 0, 0, -0.3911367569],
    [2, 0, 3, -0.3911367569],
    [3, 0, 3, -2.21906361],
    [20, 0, 6, -2.21906361],
    [1, 0, 0, 0.0],
    [1, 3, 3, 0.0],
    [3, 1, 0, 0.3489952864],
    [20, 3, 3, 0.3489952864],
    [2, 1, 0, 1.513237877],
    [2, 3, 3, 1.513237877],
    [3, 1, 4, -1.347774071],
    [20, 3, 7, -1.347774071],
    [2, 4, 0, 2.037373055],
    [20, 7, 3, 2.037373055],
  ];
  const decisions = [ // tally, arguments in their order, answer
    [-1.37770944791, 3, 0, 0, "undecided"],
    [-1.37771144791, 3, 0, 0, "minus"],
    [2.06473471596, 20, 0, 2, "undecided"],
    [2.06473671596, 20, 0, 2, "plus"],
    [-1.66791744391, 2, 0, 0, "undecided"],
    [-1.66791944391, 2, 0, 0, "minus"],
    [1.77452671996, 2, 0, 3, "undecided"],
    [1.77452871996, 2, 0, 3, "plus"],
    [0.160009409187, 3, 0, 3, "undecided"],
    [0.160007409187, 3, 0, 3, "minus"],
    [3.60245357306, 20, 0, 6, "undecided"],
    [3.60245557306, 20, 0, 6, "plus"],
    [-2.05905420081, 1, 0, 0, "undecided"],
    [-2.05905620081, 1, 0, 0, "minus"],
    [1.38338996306, 1, 3, 3, "undecided"],
    [1.38339196306, 1, 3, 3, "plus"],
    [-2.40804948721, 3, 1, 0, "undecided"],
    [-2.40805148721, 3, 1, 0, "minus"],
    [1.03439467666, 20, 3, 3, "undecided"],
    [1.03439667666, 20, 3, 3, "plus"],
    [-3.57229207781, 2, 1, 0, "undecided"],
    [-3.57229407781, 2, 1, 0, "minus"],
    [-0.129847913937, 2, 3, 3, "undecided"],
    [-0.129845913937, 2, 3, 3, "plus"],
    [-0.711280129813, 3, 1, 4, "undecided"],
    [-0.711282129813, 3, 1, 4, "minus"],
    [2.73116403406, 20, 3, 7, "undecided"],
    [2.73116603406, 20, 3, 7, "plus"],
    [-4.09642725581, 2, 4, 0, "undecided"],
    [-4.09642925581, 2, 4, 0, "minus"],
    [-0.653983091937, 20, 7, 3, "undecided"],
    [-0.653981091937, 20, 7, 3, "plus"],
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
