// A rule of thumb for one watcher, as C99. A calculation, made by thumbwright: read
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
//   the log-odds for plus. NAN where an argument is none that it may be, or no row holds.
// decide(tally, step, plus_shown, minus_shown): what to show. WATCH_PLUS, WATCH_MINUS or
//   WATCH_UNDECIDED; WATCH_REFUSED where an argument is none that it may be, or no row holds.
//   States, first answers and thresholds are handed over as the constants below. Compile this
//   file with the rest and declare the functions as here; with several rules, name them apart
//   (-Dvalue=frost_value -Ddecide=frost_decide).
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
// cc -std=c99 -DSELF_CHECK watch_rule.c && ./a.out runs the situations at the end of the file;
//   exit status 1: mismatch.

#include <math.h>

enum { WATCH_REFUSED = -1, WATCH_UNDECIDED = 0, WATCH_PLUS = 1, WATCH_MINUS = 2 };

double value(long step, long plus_shown, long minus_shown);
int decide(double tally, long step, long plus_shown, long minus_shown);

// What the situation is worth, in nats; NAN where that is not known.
double value(long step, long plus_shown, long minus_shown)
{
    if (step < 1) return NAN;
    if (plus_shown < 0) return NAN;
    if (minus_shown < 0) return NAN;

    if (step >= 3 && plus_shown <= 0 && minus_shown <= 2) return -0.6813447529;
    if (step >= 2 && step <= 2 && plus_shown <= 0) return -0.3911367569;
    if (step >= 3 && plus_shown <= 0 && minus_shown >= 3) return -2.21906361;
    if (step <= 1) return 0.0;
    if (step >= 3 && plus_shown >= 1 && plus_shown <= 3 && minus_shown <= 3) return 0.3489952864;
    if (step >= 2 && step <= 2 && plus_shown >= 1 && plus_shown <= 3) return 1.513237877;
    if (step >= 3 && plus_shown >= 1 && plus_shown <= 3 && minus_shown >= 4) return -1.347774071;
    if (step >= 2 && plus_shown >= 4) return 2.037373055;
    return NAN;
}

// What to show; WATCH_REFUSED where the rule does not say.
int decide(double tally, long step, long plus_shown, long minus_shown)
{
    const double prior = -0.847297860387; // nats
    const double minus_at = -2.9063530612; // minus at this belief (nats) or below
    const double plus_at = 0.536093102676; // and plus at this belief or above
    const double tie = 1e-09; // so close to a threshold counts as having reached it
    const double belief = prior + tally + value(step, plus_shown, minus_shown);
    if (isnan(belief)) return WATCH_REFUSED;
    return belief >= plus_at - tie    ? WATCH_PLUS
           : belief <= minus_at + tie ? WATCH_MINUS
                                      : WATCH_UNDECIDED;
}

#ifdef SELF_CHECK
#include <stdio.h>

static int wrong = 0;

static void check_value(int number, double said, double expected)
{
    if (said >= expected && said <= expected) return;
    printf("worth %d is %.17g, not %.17g\n", number, said, expected);
    wrong += 1;
}

static void check_decide(int number, int said, int expected)
{
    if (said == expected) return;
    printf("decision %d is %d, not %d\n", number, said, expected);
    wrong += 1;
}

int main(void)
{
    check_value(1, value(3, 0, 0), -0.6813447529);
    check_value(2, value(20, 0, 2), -0.6813447529);
    check_value(3, value(2, 0, 0), -0.3911367569);
    check_value(4, value(2, 0, 3), -0.3911367569);
    check_value(5, value(3, 0, 3), -2.21906361);
    check_value(6, value(20, 0, 6), -2.21906361);
    check_value(7, value(1, 0, 0), 0.0);
    check_value(8, value(1, 3, 3), 0.0);
    check_value(9, value(3, 1, 0), 0.3489952864);
    check_value(10, value(20, 3, 3), 0.3489952864);
    check_value(11, value(2, 1, 0), 1.513237877);
    check_value(12, value(2, 3, 3), 1.513237877);
    check_value(13, value(3, 1, 4), -1.347774071);
    check_value(14, value(20, 3, 7), -1.347774071);
    check_value(15, value(2, 4, 0), 2.037373055);
    check_value(16, value(20, 7, 3), 2.037373055);
    check_decide(1, decide(-1.37770944791, 3, 0, 0), WATCH_UNDECIDED);
    check_decide(2, decide(-1.37771144791, 3, 0, 0), WATCH_MINUS);
    check_decide(3, decide(2.06473471596, 20, 0, 2), WATCH_UNDECIDED);
    check_decide(4, decide(2.06473671596, 20, 0, 2), WATCH_PLUS);
    check_decide(5, decide(-1.66791744391, 2, 0, 0), WATCH_UNDECIDED);
    check_decide(6, decide(-1.66791944391, 2, 0, 0), WATCH_MINUS);
    check_decide(7, decide(1.77452671996, 2, 0, 3), WATCH_UNDECIDED);
    check_decide(8, decide(1.77452871996, 2, 0, 3), WATCH_PLUS);
    check_decide(9, decide(0.160009409187, 3, 0, 3), WATCH_UNDECIDED);
    check_decide(10, decide(0.160007409187, 3, 0, 3), WATCH_MINUS);
    check_decide(11, decide(3.60245357306, 20, 0, 6), WATCH_UNDECIDED);
    check_decide(12, decide(3.60245557306, 20, 0, 6), WATCH_PLUS);
    check_decide(13, decide(-2.05905420081, 1, 0, 0), WATCH_UNDECIDED);
    check_decide(14, decide(-2.05905620081, 1, 0, 0), WATCH_MINUS);
    check_decide(15, decide(1.38338996306, 1, 3, 3), WATCH_UNDECIDED);
    check_decide(16, decide(1.38339196306, 1, 3, 3), WATCH_PLUS);
    check_decide(17, decide(-2.40804948721, 3, 1, 0), WATCH_UNDECIDED);
    check_decide(18, decide(-2.40805148721, 3, 1, 0), WATCH_MINUS);
    check_decide(19, decide(1.03439467666, 20, 3, 3), WATCH_UNDECIDED);
    check_decide(20, decide(1.03439667666, 20, 3, 3), WATCH_PLUS);
    check_decide(21, decide(-3.57229207781, 2, 1, 0), WATCH_UNDECIDED);
    check_decide(22, decide(-3.57229407781, 2, 1, 0), WATCH_MINUS);
    check_decide(23, decide(-0.129847913937, 2, 3, 3), WATCH_UNDECIDED);
    check_decide(24, decide(-0.129845913937, 2, 3, 3), WATCH_PLUS);
    check_decide(25, decide(-0.711280129813, 3, 1, 4), WATCH_UNDECIDED);
    check_decide(26, decide(-0.711282129813, 3, 1, 4), WATCH_MINUS);
    check_decide(27, decide(2.73116403406, 20, 3, 7), WATCH_UNDECIDED);
    check_decide(28, decide(2.73116603406, 20, 3, 7), WATCH_PLUS);
    check_decide(29, decide(-4.09642725581, 2, 4, 0), WATCH_UNDECIDED);
    check_decide(30, decide(-4.09642925581, 2, 4, 0), WATCH_MINUS);
    check_decide(31, decide(-0.653983091937, 20, 7, 3), WATCH_UNDECIDED);
    check_decide(32, decide(-0.653981091937, 20, 7, 3), WATCH_PLUS);
    check_decide(0, decide(0, 0, 0, 0), WATCH_REFUSED);
    if (wrong) printf("%d wrong\n", wrong);
    else printf("all as it should be\n");
    return wrong ? 1 : 0;
}
#endif
