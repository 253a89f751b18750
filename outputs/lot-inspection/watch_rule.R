# A rule of thumb for one watcher, as R. A calculation, made by thumbwright: read
# the caution and the cost below before you use it.
#
# Case: Lot inspection by two inspectors
# Case lot-inspection, digest 97f28eaf3a9e; thumbwright 0.1.0.
# For Second inspector (second), watching First inspector (first).
# plus: bad lot
# minus: good lot
# Worked out for steps 1 to 120. At later steps the rows that are open at the end still hold,
#   but nothing was worked out or priced there.
#
# CAUTION
# Property or money can be lost by a wrong answer: contracts, agreed standards and insurance
#   terms prevail over it.
# An alarm, an order or sure evidence overrides it at once.
# This is a calculation under the assumptions stated with it, not a guarantee.
# It defers to local rules, codes of practice, contracts and the judgement of licensed or
#   trained people; where they differ from it, follow them.
# Where an assumption is clearly untrue, put it aside and fall back on usual practice.
#
# COST
# Share of outings that end in a wrong answer, given that plus or that minus is true, and the
#   mean number of steps used, where this agent alone uses the rule and the others are exact.
#   It holds for this very rule: price it again after any change.
#
#                                 wrong, plus true  wrong, minus true  mean steps
# decide()                                  0.1012             0.0167       17.10
# answering by value()                      0.1009             0.0167       17.11
# the full calculation                      0.1012             0.0167       17.09
# undecided neighbours ignored              0.0517             0.0206       21.38
# everybody ignored                         0.0994             0.0220       26.27
#
# FUNCTIONS
# value(step, first): what the situation is worth, in nats: what it adds to the log-odds for
#   plus. Arguments are vectors of one length, or single values.
# decide(tally, step, first): what to show. "plus", "minus" or "undecided" for each. States,
#   first answers and thresholds are handed over by name or by code. Stops at anything else.
#
# ARGUMENTS
# tally: the own count: a whole number, the sum over all own observations of what each moves
#   it (0 +0, 1 +1)
# step: own observations so far, this one included (steps of one item); from 1
# first: what First inspector shows now (undecided: no tag yet; plus: lot tagged rejected;
#   minus: lot tagged accepted)
#
# CHECK
# Rscript watch_rule.R runs the situations at the end of the file; exit status 1: mismatch.

.states <- c("undecided", "plus", "minus")
.UNDECIDED <- 0
.PLUS <- 1
.MINUS <- 2

# What each situation is worth, in nats; stops where that is not known.
value <- function(step, first) {
  .size <- .length_of(list(step, first))
  step <- .whole("step", step, 1)
  first <- .code("first", first, .states)
  .row <- .first_row(list(
    (step >= 11) & (first == .MINUS),
    (step <= 4) & ((first == .UNDECIDED) | (first == .MINUS)),
    (step >= 5) & (step <= 6) & ((first == .UNDECIDED) | (first == .MINUS)),
    (step >= 7) & (step <= 8) & ((first == .UNDECIDED) | (first == .MINUS)),
    (step >= 9) & (step <= 10) & ((first == .UNDECIDED) | (first == .MINUS)),
    (step >= 11) & (step <= 11) & (first == .UNDECIDED),
    (step >= 12) & (step <= 12) & (first == .UNDECIDED),
    (step >= 13) & (step <= 13) & (first == .UNDECIDED),
    (step >= 14) & (step <= 14) & (first == .UNDECIDED),
    (step >= 15) & (step <= 15) & (first == .UNDECIDED),
    (step >= 16) & (step <= 16) & (first == .UNDECIDED),
    (step >= 17) & (step <= 17) & (first == .UNDECIDED),
    (step >= 18) & (step <= 19) & (first == .UNDECIDED),
    (step >= 20) & (step <= 24) & (first == .UNDECIDED),
    (step >= 25) & (step <= 28) & (first == .UNDECIDED),
    (step >= 29) & (step <= 32) & (first == .UNDECIDED),
    (step >= 33) & (step <= 35) & (first == .UNDECIDED),
    (step >= 36) & (step <= 39) & (first == .UNDECIDED),
    (step >= 40) & (step <= 43) & (first == .UNDECIDED),
    (step >= 44) & (step <= 49) & (first == .UNDECIDED),
    (step >= 50) & (step <= 59) & (first == .UNDECIDED),
    (step >= 60) & (first == .UNDECIDED),
    (step <= 10) & (first == .PLUS),
    (step >= 11) & (first == .PLUS)
  ), .size)
  .worth <- c(
    -2.286722153,
    -0.009379590603,
    -0.06831709796,
    -0.1395988488,
    -0.227380078,
    -0.3021154283,
    -0.3552647973,
    -0.4108346484,
    -0.4685934826,
    -0.5283408472,
    -0.5899020423,
    -0.6531239076,
    -0.7500982637,
    -0.8635289895,
    0.4121382511,
    0.234287806,
    0.0387761926,
    -0.1773909195,
    -0.4501289473,
    -0.7430166317,
    0.2711233102,
    -0.3076534977,
    4.18961588,
    3.559104757
  )[.row]
  .worth
}

# "plus", "minus" or "undecided" in each situation; stops where the rule does not say.
decide <- function(tally, step, first) {
  .size <- .length_of(list(tally, step, first))
  step <- .whole("step", step, 1)
  first <- .code("first", first, .states)
  .row <- .first_row(list(
    (step <= 14) & (first == .UNDECIDED),
    (step >= 15) & (step <= 16) & (first == .UNDECIDED),
    (step >= 17) & (step <= 40) & (first == .UNDECIDED),
    (step >= 41) & (step <= 42) & (first == .UNDECIDED),
    (step >= 43) & (step <= 65) & (first == .UNDECIDED),
    (step >= 66) & (step <= 68) & (first == .UNDECIDED),
    (step >= 69) & (first == .UNDECIDED),
    (step <= 10) & (first == .PLUS),
    (step >= 11) & (step <= 32) & (first == .PLUS),
    (step >= 33) & (step <= 57) & (first == .PLUS),
    (step >= 58) & (step <= 61) & (first == .PLUS),
    (step >= 62) & (step <= 86) & (first == .PLUS),
    (step >= 87) & (step <= 112) & (first == .PLUS),
    (step >= 113) & (first == .PLUS),
    (step <= 46) & (first == .MINUS),
    (step >= 47) & (step <= 49) & (first == .MINUS),
    (step >= 50) & (step <= 71) & (first == .MINUS),
    (step >= 72) & (step <= 75) & (first == .MINUS),
    (step >= 76) & (step <= 96) & (first == .MINUS),
    (step >= 97) & (step <= 100) & (first == .MINUS),
    (step >= 101) & (first == .MINUS)
  ), .size)
  tally <- .whole("tally", tally)
  .minus_at_or_below <- c(
    -Inf,
    -Inf,
    0,
    0,
    1,
    1,
    2,
    -Inf,
    -Inf,
    -Inf,
    -Inf,
    0,
    1,
    2,
    1,
    1,
    2,
    2,
    3,
    3,
    4
  )[.row]
  .plus_at_or_above <- c(
    2,
    3,
    3,
    4,
    4,
    5,
    5,
    0,
    1,
    2,
    3,
    3,
    4,
    4,
    4,
    5,
    5,
    6,
    6,
    7,
    7
  )[.row]
  .answer(tally, .minus_at_or_below, .plus_at_or_above, .size)
}

.answer <- function(number, low, high, size) {
  rep_len(ifelse(number >= high, "plus", ifelse(number <= low, "minus", "undecided")), size)
}

# The number of situations: all arguments have it for their length, or length 1.
.length_of <- function(given) {
  lengths <- vapply(given, length, 1)
  size <- if (any(lengths == 0)) 0 else max(lengths)
  if (!all(lengths == size | lengths == 1)) stop("arguments differ in length")
  size
}

# The first row whose condition holds, in each situation.
.first_row <- function(conditions, size) {
  row <- rep_len(NA_integer_, size)
  for (number in rev(seq_along(conditions))) {
    row[rep_len(conditions[[number]], size)] <- number
  }
  if (anyNA(row)) stop("no row of the rule holds in some situation")
  row
}

.whole <- function(name, given, least = -Inf) {
  if (!is.numeric(given) || !all(is.finite(given) & given == floor(given) & given >= least)) {
    stop(name, " must be whole numbers", if (is.finite(least)) paste(" from", least))
  }
  given
}

# The codes of names; codes may be handed over as they are.
.code <- function(name, given, known) {
  if (is.factor(given)) given <- as.character(given)
  code <- if (is.character(given)) match(given, known) - 1 else given
  if (!is.numeric(code) || !all(code %in% (seq_along(known) - 1))) {
    stop(name, " must be each one of ", paste(known, collapse = ", "))
  }
  code
}

.said <- function(part, given) {
  tryCatch(do.call(part, given), error = function(e) paste("refused:", conditionMessage(e)))
}

.self_check <- function() {
  worths <- list( # arguments in their order, nats
    list(11, "minus", -2.286722153),
    list(120, "minus", -2.286722153),
    list(1, "undecided", -0.009379590603),
    list(4, "minus", -0.009379590603),
    list(5, "undecided", -0.06831709796),
    list(6, "minus", -0.06831709796),
    list(7, "undecided", -0.1395988488),
    list(8, "minus", -0.1395988488),
    list(9, "undecided", -0.227380078),
    list(10, "minus", -0.227380078),
    list(11, "undecided", -0.3021154283),
    list(12, "undecided", -0.3552647973),
    list(13, "undecided", -0.4108346484),
    list(14, "undecided", -0.4685934826),
    list(15, "undecided", -0.5283408472),
    list(16, "undecided", -0.5899020423),
    list(17, "undecided", -0.6531239076),
    list(18, "undecided", -0.7500982637),
    list(19, "undecided", -0.7500982637),
    list(20, "undecided", -0.8635289895),
    list(24, "undecided", -0.8635289895),
    list(25, "undecided", 0.4121382511),
    list(28, "undecided", 0.4121382511),
    list(29, "undecided", 0.234287806),
    list(32, "undecided", 0.234287806),
    list(33, "undecided", 0.0387761926),
    list(35, "undecided", 0.0387761926),
    list(36, "undecided", -0.1773909195),
    list(39, "undecided", -0.1773909195),
    list(40, "undecided", -0.4501289473),
    list(43, "undecided", -0.4501289473),
    list(44, "undecided", -0.7430166317),
    list(49, "undecided", -0.7430166317),
    list(50, "undecided", 0.2711233102),
    list(59, "undecided", 0.2711233102),
    list(60, "undecided", -0.3076534977),
    list(120, "undecided", -0.3076534977),
    list(1, "plus", 4.18961588),
    list(10, "plus", 4.18961588),
    list(11, "plus", 3.559104757),
    list(120, "plus", 3.559104757)
  )
  decisions <- list( # tally, arguments in their order, answer
    list(0, 1, "undecided", "undecided"),
    list(1, 14, "undecided", "undecided"),
    list(2, 14, "undecided", "plus"),
    list(0, 15, "undecided", "undecided"),
    list(2, 16, "undecided", "undecided"),
    list(3, 16, "undecided", "plus"),
    list(1, 17, "undecided", "undecided"),
    list(0, 17, "undecided", "minus"),
    list(2, 40, "undecided", "undecided"),
    list(3, 40, "undecided", "plus"),
    list(1, 41, "undecided", "undecided"),
    list(0, 41, "undecided", "minus"),
    list(3, 42, "undecided", "undecided"),
    list(4, 42, "undecided", "plus"),
    list(2, 43, "undecided", "undecided"),
    list(1, 43, "undecided", "minus"),
    list(3, 65, "undecided", "undecided"),
    list(4, 65, "undecided", "plus"),
    list(2, 66, "undecided", "undecided"),
    list(1, 66, "undecided", "minus"),
    list(4, 68, "undecided", "undecided"),
    list(5, 68, "undecided", "plus"),
    list(3, 69, "undecided", "undecided"),
    list(2, 69, "undecided", "minus"),
    list(4, 120, "undecided", "undecided"),
    list(5, 120, "undecided", "plus"),
    list(0, 1, "plus", "plus"),
    list(-1, 10, "plus", "undecided"),
    list(0, 10, "plus", "plus"),
    list(0, 11, "plus", "undecided"),
    list(0, 32, "plus", "undecided"),
    list(1, 32, "plus", "plus"),
    list(0, 33, "plus", "undecided"),
    list(1, 57, "plus", "undecided"),
    list(2, 57, "plus", "plus"),
    list(0, 58, "plus", "undecided"),
    list(2, 61, "plus", "undecided"),
    list(3, 61, "plus", "plus"),
    list(1, 62, "plus", "undecided"),
    list(0, 62, "plus", "minus"),
    list(2, 86, "plus", "undecided"),
    list(3, 86, "plus", "plus"),
    list(2, 87, "plus", "undecided"),
    list(1, 87, "plus", "minus"),
    list(3, 112, "plus", "undecided"),
    list(4, 112, "plus", "plus"),
    list(3, 113, "plus", "undecided"),
    list(2, 113, "plus", "minus"),
    list(3, 120, "plus", "undecided"),
    list(4, 120, "plus", "plus"),
    list(2, 1, "minus", "undecided"),
    list(1, 1, "minus", "minus"),
    list(3, 46, "minus", "undecided"),
    list(4, 46, "minus", "plus"),
    list(2, 47, "minus", "undecided"),
    list(1, 47, "minus", "minus"),
    list(4, 49, "minus", "undecided"),
    list(5, 49, "minus", "plus"),
    list(3, 50, "minus", "undecided"),
    list(2, 50, "minus", "minus"),
    list(4, 71, "minus", "undecided"),
    list(5, 71, "minus", "plus"),
    list(3, 72, "minus", "undecided"),
    list(2, 72, "minus", "minus"),
    list(5, 75, "minus", "undecided"),
    list(6, 75, "minus", "plus"),
    list(4, 76, "minus", "undecided"),
    list(3, 76, "minus", "minus"),
    list(5, 96, "minus", "undecided"),
    list(6, 96, "minus", "plus"),
    list(4, 97, "minus", "undecided"),
    list(3, 97, "minus", "minus"),
    list(6, 100, "minus", "undecided"),
    list(7, 100, "minus", "plus"),
    list(5, 101, "minus", "undecided"),
    list(4, 101, "minus", "minus"),
    list(6, 120, "minus", "undecided"),
    list(7, 120, "minus", "plus")
  )
  wrong <- 0
  for (part in list(list(value, worths), list(decide, decisions))) {
    for (sample in part[[2]]) {
      given <- sample[-length(sample)]
      expected <- sample[[length(sample)]]
      said <- .said(part[[1]], given)
      if (!identical(said, expected)) {
        cat("(", paste(format(given), collapse = ", "), ") gives ", sep = "")
        cat(format(said), ", not ", format(expected), "\n", sep = "")
        wrong <- wrong + 1
      }
    }
    # All at once, as vectors.
    columns <- lapply(seq_along(part[[2]][[1]]), function(k) unlist(lapply(part[[2]], `[[`, k)))
    if (!identical(.said(part[[1]], columns[-length(columns)]), columns[[length(columns)]])) {
      cat("wrong for all situations at once\n")
      wrong <- wrong + 1
    }
  }
  if (!startsWith(.said(decide, c(list(0, 0), given[-(1:2)])), "refused")) {
    cat("decide() takes 0 for a step\n")
    wrong <- wrong + 1
  }
  cat(if (wrong) paste(wrong, "wrong\n") else "all as it should be\n")
  wrong
}

if (!interactive() && sys.nframe() == 0L) quit(status = if (.self_check()) 1 else 0)
