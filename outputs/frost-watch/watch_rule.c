// A rule of thumb for one watcher, as C99. A calculation, made by thumbwright: read
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
//   plus. NAN where an argument is none that it may be, or no row holds.
// decide(tally, step, upper): what to show. WATCH_PLUS, WATCH_MINUS or WATCH_UNDECIDED;
//   WATCH_REFUSED where an argument is none that it may be, or no row holds. States, first
//   answers and thresholds are handed over as the constants below. Compile this file with the
//   rest and declare the functions as here; with several rules, name them apart
//   (-Dvalue=frost_value -Ddecide=frost_decide).
//
// ARGUMENTS
// tally: the own count: a whole number, the sum over all own observations of what each moves
//   it (mild sign -1, frost sign +1)
// step: own observations so far, this one included (steps of 10 minutes); from 1
// upper: what Upper field shows now (undecided: lamp dark; plus: lamp lit; minus: lamp
//   blinking)
//
// CHECK
// cc -std=c99 -DSELF_CHECK watch_rule.c && ./a.out runs the situations at the end of the file;
//   exit status 1: mismatch.

#include <math.h>

enum { WATCH_REFUSED = -1, WATCH_UNDECIDED = 0, WATCH_PLUS = 1, WATCH_MINUS = 2 };

double value(long step, int upper);
int decide(long tally, long step, int upper);

// What the situation is worth, in nats; NAN where that is not known.
double value(long step, int upper)
{
    if (step < 1) return NAN;
    if (upper < 0 || upper > 2) return NAN;

    if (step >= 3 && upper == WATCH_MINUS) return -0.8109302162;
    if (step <= 2) return 0.0;
    if (step >= 5 && step <= 6 && upper == WATCH_UNDECIDED) return 0.3610133455;
    if (step >= 7 && upper == WATCH_UNDECIDED) return 0.3974664539;
    if (step >= 3 && step <= 4 && (upper == WATCH_UNDECIDED || upper == WATCH_PLUS)) return 0.2719337155;
    if (step >= 5 && upper == WATCH_PLUS) return 1.621860432;
    return NAN;
}

// What to show; WATCH_REFUSED where the rule does not say.
int decide(long tally, long step, int upper)
{
    (void)tally;
    if (step < 1) return WATCH_REFUSED;
    if (upper < 0 || upper > 2) return WATCH_REFUSED;

    if (step <= 2 && upper == WATCH_UNDECIDED) return tally >= 3 ? WATCH_PLUS : tally <= -3 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 3 && upper == WATCH_UNDECIDED) return tally >= 3 ? WATCH_PLUS : tally <= -4 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (upper == WATCH_PLUS) return tally >= -1 ? WATCH_PLUS : tally <= -7 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (upper == WATCH_MINUS) return tally >= 5 ? WATCH_PLUS : tally <= -1 ? WATCH_MINUS : WATCH_UNDECIDED;
    return WATCH_REFUSED;
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
    check_value(1, value(3, WATCH_MINUS), -0.8109302162);
    check_value(2, value(40, WATCH_MINUS), -0.8109302162);
    check_value(3, value(1, WATCH_UNDECIDED), 0.0);
    check_value(4, value(2, WATCH_MINUS), 0.0);
    check_value(5, value(5, WATCH_UNDECIDED), 0.3610133455);
    check_value(6, value(6, WATCH_UNDECIDED), 0.3610133455);
    check_value(7, value(7, WATCH_UNDECIDED), 0.3974664539);
    check_value(8, value(40, WATCH_UNDECIDED), 0.3974664539);
    check_value(9, value(3, WATCH_UNDECIDED), 0.2719337155);
    check_value(10, value(4, WATCH_PLUS), 0.2719337155);
    check_value(11, value(5, WATCH_PLUS), 1.621860432);
    check_value(12, value(40, WATCH_PLUS), 1.621860432);
    check_decide(1, decide(-2, 1, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(2, decide(-3, 1, WATCH_UNDECIDED), WATCH_MINUS);
    check_decide(3, decide(2, 2, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(4, decide(3, 2, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(5, decide(-3, 3, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(6, decide(-4, 3, WATCH_UNDECIDED), WATCH_MINUS);
    check_decide(7, decide(2, 40, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(8, decide(3, 40, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(9, decide(-6, 1, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(10, decide(-7, 1, WATCH_PLUS), WATCH_MINUS);
    check_decide(11, decide(-2, 40, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(12, decide(-1, 40, WATCH_PLUS), WATCH_PLUS);
    check_decide(13, decide(0, 1, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(14, decide(-1, 1, WATCH_MINUS), WATCH_MINUS);
    check_decide(15, decide(4, 40, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(16, decide(5, 40, WATCH_MINUS), WATCH_PLUS);
    check_decide(0, decide(0, 0, WATCH_UNDECIDED), WATCH_REFUSED);
    if (wrong) printf("%d wrong\n", wrong);
    else printf("all as it should be\n");
    return wrong ? 1 : 0;
}
#endif
