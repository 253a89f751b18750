// A rule of thumb for one watcher, as C99. A calculation, made by thumbwright: read
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
//   plus. NAN where an argument is none that it may be, or no row holds.
// decide(tally, step, first): what to show. WATCH_PLUS, WATCH_MINUS or WATCH_UNDECIDED;
//   WATCH_REFUSED where an argument is none that it may be, or no row holds. States, first
//   answers and thresholds are handed over as the constants below. Compile this file with the
//   rest and declare the functions as here; with several rules, name them apart
//   (-Dvalue=frost_value -Ddecide=frost_decide).
//
// ARGUMENTS
// tally: the own count: a whole number, the sum over all own observations of what each moves
//   it (0 +0, 1 +1)
// step: own observations so far, this one included (steps of one item); from 1
// first: what First inspector shows now (undecided: no tag yet; plus: lot tagged rejected;
//   minus: lot tagged accepted)
//
// CHECK
// cc -std=c99 -DSELF_CHECK watch_rule.c && ./a.out runs the situations at the end of the file;
//   exit status 1: mismatch.

#include <math.h>

enum { WATCH_REFUSED = -1, WATCH_UNDECIDED = 0, WATCH_PLUS = 1, WATCH_MINUS = 2 };

double value(long step, int first);
int decide(long tally, long step, int first);

// What the situation is worth, in nats; NAN where that is not known.
double value(long step, int first)
{
    if (step < 1) return NAN;
    if (first < 0 || first > 2) return NAN;

    if (step >= 11 && first == WATCH_MINUS) return -2.286722153;
    if (step <= 4 && (first == WATCH_UNDECIDED || first == WATCH_MINUS)) return -0.009379590603;
    if (step >= 5 && step <= 6 && (first == WATCH_UNDECIDED || first == WATCH_MINUS)) return -0.06831709796;
    if (step >= 7 && step <= 8 && (first == WATCH_UNDECIDED || first == WATCH_MINUS)) return -0.1395988488;
    if (step >= 9 && step <= 10 && (first == WATCH_UNDECIDED || first == WATCH_MINUS)) return -0.227380078;
    if (step >= 11 && step <= 11 && first == WATCH_UNDECIDED) return -0.3021154283;
    if (step >= 12 && step <= 12 && first == WATCH_UNDECIDED) return -0.3552647973;
    if (step >= 13 && step <= 13 && first == WATCH_UNDECIDED) return -0.4108346484;
    if (step >= 14 && step <= 14 && first == WATCH_UNDECIDED) return -0.4685934826;
    if (step >= 15 && step <= 15 && first == WATCH_UNDECIDED) return -0.5283408472;
    if (step >= 16 && step <= 16 && first == WATCH_UNDECIDED) return -0.5899020423;
    if (step >= 17 && step <= 17 && first == WATCH_UNDECIDED) return -0.6531239076;
    if (step >= 18 && step <= 19 && first == WATCH_UNDECIDED) return -0.7500982637;
    if (step >= 20 && step <= 24 && first == WATCH_UNDECIDED) return -0.8635289895;
    if (step >= 25 && step <= 28 && first == WATCH_UNDECIDED) return 0.4121382511;
    if (step >= 29 && step <= 32 && first == WATCH_UNDECIDED) return 0.234287806;
    if (step >= 33 && step <= 35 && first == WATCH_UNDECIDED) return 0.0387761926;
    if (step >= 36 && step <= 39 && first == WATCH_UNDECIDED) return -0.1773909195;
    if (step >= 40 && step <= 43 && first == WATCH_UNDECIDED) return -0.4501289473;
    if (step >= 44 && step <= 49 && first == WATCH_UNDECIDED) return -0.7430166317;
    if (step >= 50 && step <= 59 && first == WATCH_UNDECIDED) return 0.2711233102;
    if (step >= 60 && first == WATCH_UNDECIDED) return -0.3076534977;
    if (step <= 10 && first == WATCH_PLUS) return 4.18961588;
    if (step >= 11 && first == WATCH_PLUS) return 3.559104757;
    return NAN;
}

// What to show; WATCH_REFUSED where the rule does not say.
int decide(long tally, long step, int first)
{
    (void)tally;
    if (step < 1) return WATCH_REFUSED;
    if (first < 0 || first > 2) return WATCH_REFUSED;

    if (step <= 14 && first == WATCH_UNDECIDED) return tally >= 2 ? WATCH_PLUS : WATCH_UNDECIDED;
    if (step >= 15 && step <= 16 && first == WATCH_UNDECIDED) return tally >= 3 ? WATCH_PLUS : WATCH_UNDECIDED;
    if (step >= 17 && step <= 40 && first == WATCH_UNDECIDED) return tally >= 3 ? WATCH_PLUS : tally <= 0 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 41 && step <= 42 && first == WATCH_UNDECIDED) return tally >= 4 ? WATCH_PLUS : tally <= 0 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 43 && step <= 65 && first == WATCH_UNDECIDED) return tally >= 4 ? WATCH_PLUS : tally <= 1 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 66 && step <= 68 && first == WATCH_UNDECIDED) return tally >= 5 ? WATCH_PLUS : tally <= 1 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 69 && first == WATCH_UNDECIDED) return tally >= 5 ? WATCH_PLUS : tally <= 2 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step <= 10 && first == WATCH_PLUS) return tally >= 0 ? WATCH_PLUS : WATCH_UNDECIDED;
    if (step >= 11 && step <= 32 && first == WATCH_PLUS) return tally >= 1 ? WATCH_PLUS : WATCH_UNDECIDED;
    if (step >= 33 && step <= 57 && first == WATCH_PLUS) return tally >= 2 ? WATCH_PLUS : WATCH_UNDECIDED;
    if (step >= 58 && step <= 61 && first == WATCH_PLUS) return tally >= 3 ? WATCH_PLUS : WATCH_UNDECIDED;
    if (step >= 62 && step <= 86 && first == WATCH_PLUS) return tally >= 3 ? WATCH_PLUS : tally <= 0 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 87 && step <= 112 && first == WATCH_PLUS) return tally >= 4 ? WATCH_PLUS : tally <= 1 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 113 && first == WATCH_PLUS) return tally >= 4 ? WATCH_PLUS : tally <= 2 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step <= 46 && first == WATCH_MINUS) return tally >= 4 ? WATCH_PLUS : tally <= 1 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 47 && step <= 49 && first == WATCH_MINUS) return tally >= 5 ? WATCH_PLUS : tally <= 1 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 50 && step <= 71 && first == WATCH_MINUS) return tally >= 5 ? WATCH_PLUS : tally <= 2 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 72 && step <= 75 && first == WATCH_MINUS) return tally >= 6 ? WATCH_PLUS : tally <= 2 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 76 && step <= 96 && first == WATCH_MINUS) return tally >= 6 ? WATCH_PLUS : tally <= 3 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 97 && step <= 100 && first == WATCH_MINUS) return tally >= 7 ? WATCH_PLUS : tally <= 3 ? WATCH_MINUS : WATCH_UNDECIDED;
    if (step >= 101 && first == WATCH_MINUS) return tally >= 7 ? WATCH_PLUS : tally <= 4 ? WATCH_MINUS : WATCH_UNDECIDED;
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
    check_value(1, value(11, WATCH_MINUS), -2.286722153);
    check_value(2, value(120, WATCH_MINUS), -2.286722153);
    check_value(3, value(1, WATCH_UNDECIDED), -0.009379590603);
    check_value(4, value(4, WATCH_MINUS), -0.009379590603);
    check_value(5, value(5, WATCH_UNDECIDED), -0.06831709796);
    check_value(6, value(6, WATCH_MINUS), -0.06831709796);
    check_value(7, value(7, WATCH_UNDECIDED), -0.1395988488);
    check_value(8, value(8, WATCH_MINUS), -0.1395988488);
    check_value(9, value(9, WATCH_UNDECIDED), -0.227380078);
    check_value(10, value(10, WATCH_MINUS), -0.227380078);
    check_value(11, value(11, WATCH_UNDECIDED), -0.3021154283);
    check_value(12, value(12, WATCH_UNDECIDED), -0.3552647973);
    check_value(13, value(13, WATCH_UNDECIDED), -0.4108346484);
    check_value(14, value(14, WATCH_UNDECIDED), -0.4685934826);
    check_value(15, value(15, WATCH_UNDECIDED), -0.5283408472);
    check_value(16, value(16, WATCH_UNDECIDED), -0.5899020423);
    check_value(17, value(17, WATCH_UNDECIDED), -0.6531239076);
    check_value(18, value(18, WATCH_UNDECIDED), -0.7500982637);
    check_value(19, value(19, WATCH_UNDECIDED), -0.7500982637);
    check_value(20, value(20, WATCH_UNDECIDED), -0.8635289895);
    check_value(21, value(24, WATCH_UNDECIDED), -0.8635289895);
    check_value(22, value(25, WATCH_UNDECIDED), 0.4121382511);
    check_value(23, value(28, WATCH_UNDECIDED), 0.4121382511);
    check_value(24, value(29, WATCH_UNDECIDED), 0.234287806);
    check_value(25, value(32, WATCH_UNDECIDED), 0.234287806);
    check_value(26, value(33, WATCH_UNDECIDED), 0.0387761926);
    check_value(27, value(35, WATCH_UNDECIDED), 0.0387761926);
    check_value(28, value(36, WATCH_UNDECIDED), -0.1773909195);
    check_value(29, value(39, WATCH_UNDECIDED), -0.1773909195);
    check_value(30, value(40, WATCH_UNDECIDED), -0.4501289473);
    check_value(31, value(43, WATCH_UNDECIDED), -0.4501289473);
    check_value(32, value(44, WATCH_UNDECIDED), -0.7430166317);
    check_value(33, value(49, WATCH_UNDECIDED), -0.7430166317);
    check_value(34, value(50, WATCH_UNDECIDED), 0.2711233102);
    check_value(35, value(59, WATCH_UNDECIDED), 0.2711233102);
    check_value(36, value(60, WATCH_UNDECIDED), -0.3076534977);
    check_value(37, value(120, WATCH_UNDECIDED), -0.3076534977);
    check_value(38, value(1, WATCH_PLUS), 4.18961588);
    check_value(39, value(10, WATCH_PLUS), 4.18961588);
    check_value(40, value(11, WATCH_PLUS), 3.559104757);
    check_value(41, value(120, WATCH_PLUS), 3.559104757);
    check_decide(1, decide(0, 1, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(2, decide(1, 14, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(3, decide(2, 14, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(4, decide(0, 15, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(5, decide(2, 16, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(6, decide(3, 16, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(7, decide(1, 17, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(8, decide(0, 17, WATCH_UNDECIDED), WATCH_MINUS);
    check_decide(9, decide(2, 40, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(10, decide(3, 40, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(11, decide(1, 41, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(12, decide(0, 41, WATCH_UNDECIDED), WATCH_MINUS);
    check_decide(13, decide(3, 42, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(14, decide(4, 42, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(15, decide(2, 43, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(16, decide(1, 43, WATCH_UNDECIDED), WATCH_MINUS);
    check_decide(17, decide(3, 65, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(18, decide(4, 65, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(19, decide(2, 66, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(20, decide(1, 66, WATCH_UNDECIDED), WATCH_MINUS);
    check_decide(21, decide(4, 68, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(22, decide(5, 68, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(23, decide(3, 69, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(24, decide(2, 69, WATCH_UNDECIDED), WATCH_MINUS);
    check_decide(25, decide(4, 120, WATCH_UNDECIDED), WATCH_UNDECIDED);
    check_decide(26, decide(5, 120, WATCH_UNDECIDED), WATCH_PLUS);
    check_decide(27, decide(0, 1, WATCH_PLUS), WATCH_PLUS);
    check_decide(28, decide(-1, 10, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(29, decide(0, 10, WATCH_PLUS), WATCH_PLUS);
    check_decide(30, decide(0, 11, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(31, decide(0, 32, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(32, decide(1, 32, WATCH_PLUS), WATCH_PLUS);
    check_decide(33, decide(0, 33, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(34, decide(1, 57, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(35, decide(2, 57, WATCH_PLUS), WATCH_PLUS);
    check_decide(36, decide(0, 58, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(37, decide(2, 61, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(38, decide(3, 61, WATCH_PLUS), WATCH_PLUS);
    check_decide(39, decide(1, 62, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(40, decide(0, 62, WATCH_PLUS), WATCH_MINUS);
    check_decide(41, decide(2, 86, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(42, decide(3, 86, WATCH_PLUS), WATCH_PLUS);
    check_decide(43, decide(2, 87, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(44, decide(1, 87, WATCH_PLUS), WATCH_MINUS);
    check_decide(45, decide(3, 112, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(46, decide(4, 112, WATCH_PLUS), WATCH_PLUS);
    check_decide(47, decide(3, 113, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(48, decide(2, 113, WATCH_PLUS), WATCH_MINUS);
    check_decide(49, decide(3, 120, WATCH_PLUS), WATCH_UNDECIDED);
    check_decide(50, decide(4, 120, WATCH_PLUS), WATCH_PLUS);
    check_decide(51, decide(2, 1, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(52, decide(1, 1, WATCH_MINUS), WATCH_MINUS);
    check_decide(53, decide(3, 46, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(54, decide(4, 46, WATCH_MINUS), WATCH_PLUS);
    check_decide(55, decide(2, 47, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(56, decide(1, 47, WATCH_MINUS), WATCH_MINUS);
    check_decide(57, decide(4, 49, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(58, decide(5, 49, WATCH_MINUS), WATCH_PLUS);
    check_decide(59, decide(3, 50, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(60, decide(2, 50, WATCH_MINUS), WATCH_MINUS);
    check_decide(61, decide(4, 71, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(62, decide(5, 71, WATCH_MINUS), WATCH_PLUS);
    check_decide(63, decide(3, 72, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(64, decide(2, 72, WATCH_MINUS), WATCH_MINUS);
    check_decide(65, decide(5, 75, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(66, decide(6, 75, WATCH_MINUS), WATCH_PLUS);
    check_decide(67, decide(4, 76, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(68, decide(3, 76, WATCH_MINUS), WATCH_MINUS);
    check_decide(69, decide(5, 96, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(70, decide(6, 96, WATCH_MINUS), WATCH_PLUS);
    check_decide(71, decide(4, 97, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(72, decide(3, 97, WATCH_MINUS), WATCH_MINUS);
    check_decide(73, decide(6, 100, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(74, decide(7, 100, WATCH_MINUS), WATCH_PLUS);
    check_decide(75, decide(5, 101, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(76, decide(4, 101, WATCH_MINUS), WATCH_MINUS);
    check_decide(77, decide(6, 120, WATCH_MINUS), WATCH_UNDECIDED);
    check_decide(78, decide(7, 120, WATCH_MINUS), WATCH_PLUS);
    check_decide(0, decide(0, 0, WATCH_UNDECIDED), WATCH_REFUSED);
    if (wrong) printf("%d wrong\n", wrong);
    else printf("all as it should be\n");
    return wrong ? 1 : 0;
}
#endif
