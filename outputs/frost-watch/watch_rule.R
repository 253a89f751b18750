# A rule of thumb for one watcher, as R. A calculation, made by thumbwright: read
# the caution and the cost below before you use it.
#
# Case: Frost watch in two orchards
# Case frost-watch, digest 56c9f779be1f; thumbwright 0.1.0.
# For Mill field (mill), watching Upper field (upper).
# plus: frost tonight
# minus: no frost tonight
# Worked out for steps 1 to 40. At later steps the rows that are open at the end still hold,
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
# decide()                                  0.2168             0.1686        7.27
# answering by value()                      0.2168             0.1686        7.27
# the full calculation                      0.2168             0.1686        7.27
# undecided neighbours ignored              0.2603             0.1581        6.66
# everybody ignored                         0.2281             0.2281        8.13
#
# FUNCTIONS
# value(step, upper): what the situation is worth, in nats: what it adds to the log-odds for
#   plus. Arguments are vectors of one length, or single values.
# decide(tally, step, upper): what to show. "plus", "minus" or "undecided" for each. States,
#   first answers and thresholds are handed over by name or by code. Stops at anything else.
#
# ARGUMENTS
# tally: the own count: a whole number, the sum over all own observations of what each moves
#   it (mild sign -1, frost sign +1)
# step: own observations so far, this one included (steps of 10 minutes); from 1
# upper: what Upper field shows now (undecided: lamp dark; plus: lamp lit; minus: lamp
#   blinking)
#
# CHECK
# Rscript watch_rule.R runs the situations at the end of the file; exit status 1: mismatch.

.states <- c("undecided", "plus", "minus")
.UNDECIDED <- 0
.PLUS <- 1
.MINUS <- 2

# What each situation is worth, in nats; stops where that is not known.
value <- function(step, upper) {
  .size <- .length_of(list(step, upper))
  step <- .whole("step", step, 1)
  upper <- .code("upper", upper, .states)
  .row <- .first_row(list(
    (step >= 3) & (upper == .MINUS),
    (step <= 2),
    (step >= 5) & (step <= 6) & (upper == .UNDECIDED),
    (step >= 7) & (upper == .UNDECIDED),
    (step >= 3) & (step <= 4) & ((upper == .UNDECIDED) | (upper == .PLUS)),
    (step >= 5) & (upper == .PLUS)
  ), .size)
  .worth <- c(
    -0.8109302162,
    0.0,
    0.3610133455,
    0.3974664539,
    0.2719337155,
    1.621860432
  )[.row]
  .worth
}

# "plus", "minus" or "undecided" in each situation; stops where the rule does not say.
decide <- function(tally, step, upper) {
  .size <- .length_of(list(tally, step, upper))
  step <- .whole("step", step, 1)
  upper <- .code("upper", upper, .states)
  .row <- .first_row(list(
    (step <= 2) & (upper == .UNDECIDED),
    (step >= 3) & (upper == .UNDECIDED),
    (upper == .PLUS),
    (upper == .MINUS)
  ), .size)
  tally <- .whole("tally", tally)
  .minus_at_or_below <- c(
    -3,
    -4,
    -7,
    -1
  )[.row]
  .plus_at_or_above <- c(
    3,
    3,
    -1,
    5
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
    list(3, "minus", -0.8109302162),
    list(40, "minus", -0.8109302162),
    list(1, "undecided", 0.0),
    list(2, "minus", 0.0),
    list(5, "undecided", 0.3610133455),
    list(6, "undecided", 0.3610133455),
    list(7, "undecided", 0.3974664539),
    list(40, "undecided", 0.3974664539),
    list(3, "undecided", 0.2719337155),
    list(4, "plus", 0.2719337155),
    list(5, "plus", 1.621860432),
    list(40, "plus", 1.621860432)
  )
  decisions <- list( # tally, arguments in their order, answer
    list(-2, 1, "undecided", "undecided"),
    list(-3, 1, "undecided", "minus"),
    list(2, 2, "undecided", "undecided"),
    list(3, 2, "undecided", "plus"),
    list(-3, 3, "undecided", "undecided"),
    list(-4, 3, "undecided", "minus"),
    list(2, 40, "undecided", "undecided"),
    list(3, 40, "undecided", "plus"),
    list(-6, 1, "plus", "undecided"),
    list(-7, 1, "plus", "minus"),
    list(-2, 40, "plus", "undecided"),
    list(-1, 40, "plus", "plus"),
    list(0, 1, "minus", "undecided"),
    list(-1, 1, "minus", "minus"),
    list(4, 40, "minus", "undecided"),
    list(5, 40, "minus", "plus")
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
