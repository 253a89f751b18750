# A rule of thumb for one watcher, as R. A calculation, made by thumbwright: read
# the caution and the cost below before you use it.
#
# Case: Flock alarm on a stubble field
# Case flock-alarm, digest adbf2c693957; thumbwright 0.1.0.
# For any of the group, all being alike: here Agent 1 (a1), watching Agent 2 (a2), Agent 3
#   (a3), Agent 4 (a4), Agent 5 (a5), Agent 6 (a6), Agent 7 (a7), Agent 8 (a8).
# plus: hawk near
# minus: no hawk
# Worked out for steps 1 to 20. At later steps the rows that are open at the end still hold,
#   but nothing was worked out or priced there.
#
# CAUTION
# Animals can suffer from a wrong answer: animal welfare law and veterinary advice come before
#   it.
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
# Not every figure is exact. What happens where everybody uses the rule was sampled, 4,000
#   public histories of too many to enumerate; those figures carry standard errors and are not
#   exact. Others take the agent for exact; by a rule it shows them what their model calls
#   impossible up to 1.22 times per outing, which they read as the same call at the latest
#   earlier moment at which the model allowed it, or as no news.
#
#                                 wrong, plus true  wrong, minus true  mean steps
# decide(), by value()                      0.0331             0.0633        5.52
# the full calculation                      0.0837             0.0620        4.80
# undecided neighbours ignored              0.0932             0.1499        4.26
# everybody ignored                         0.0814             0.1361       11.35
#
# FUNCTIONS
# value(step, plus_shown, minus_shown): what the situation is worth, in nats: what it adds to
#   the log-odds for plus. Arguments are vectors of one length, or single values.
# decide(tally, step, plus_shown, minus_shown): what to show. "plus", "minus" or "undecided"
#   for each. States, first answers and thresholds are handed over by name or by code. Stops
#   at anything else.
#
# ARGUMENTS
# tally: the own evidence in nats, the prior left out: the sum over all own observations of
#   the natural logarithm of how much likelier each is if plus is true (here 1.349926716949 *
#   own count - 0.2513144282809 * step)
# step: own observations so far, this one included (steps of second); from 1
# plus_shown: how many of the seen agents show plus; from 0
# minus_shown: how many of the seen agents show minus; from 0
#
# CHECK
# Rscript watch_rule.R runs the situations at the end of the file; exit status 1: mismatch.

.states <- c("undecided", "plus", "minus")
.UNDECIDED <- 0
.PLUS <- 1
.MINUS <- 2

.prior <- -0.847297860387 # nats
.minus_at <- -2.9063530612 # the agent answers minus at this belief (nats) or below
.plus_at <- 0.536093102676 # and plus at this belief or above
.tie <- 1e-09 # so close to a threshold counts as having reached it

# What each situation is worth, in nats; stops where that is not known.
value <- function(step, plus_shown, minus_shown) {
  .size <- .length_of(list(step, plus_shown, minus_shown))
  step <- .whole("step", step, 1)
  plus_shown <- .whole("plus_shown", plus_shown, 0)
  minus_shown <- .whole("minus_shown", minus_shown, 0)
  .row <- .first_row(list(
    (step >= 3) & (plus_shown <= 0) & (minus_shown <= 2),
    (step >= 2) & (step <= 2) & (plus_shown <= 0),
    (step >= 3) & (plus_shown <= 0) & (minus_shown >= 3),
    (step <= 1),
    (step >= 3) & (plus_shown >= 1) & (plus_shown <= 3) & (minus_shown <= 3),
    (step >= 2) & (step <= 2) & (plus_shown >= 1) & (plus_shown <= 3),
    (step >= 3) & (plus_shown >= 1) & (plus_shown <= 3) & (minus_shown >= 4),
    (step >= 2) & (plus_shown >= 4)
  ), .size)
  .worth <- c(
    -0.6813447529,
    -0.3911367569,
    -2.21906361,
    0.0,
    0.3489952864,
    1.513237877,
    -1.347774071,
    2.037373055
  )[.row]
  .worth
}

# "plus", "minus" or "undecided" in each situation; stops where the rule does not say.
decide <- function(tally, step, plus_shown, minus_shown) {
  .size <- .length_of(list(tally, step, plus_shown, minus_shown))
  tally <- .number("tally", tally)
  .belief <- .prior + tally + value(step, plus_shown, minus_shown)
  .answer(.number("belief", .belief), .minus_at + .tie, .plus_at - .tie, .size)
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

.number <- function(name, given) {
  if (!is.numeric(given) || anyNA(given)) stop(name, " must be numbers")
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
    list(3, 0, 0, -0.6813447529),
    list(20, 0, 2, -0.6813447529),
    list(2, 0, 0, -0.3911367569),
    list(2, 0, 3, -0.3911367569),
    list(3, 0, 3, -2.21906361),
    list(20, 0, 6, -2.21906361),
    list(1, 0, 0, 0.0),
    list(1, 3, 3, 0.0),
    list(3, 1, 0, 0.3489952864),
    list(20, 3, 3, 0.3489952864),
    list(2, 1, 0, 1.513237877),
    list(2, 3, 3, 1.513237877),
    list(3, 1, 4, -1.347774071),
    list(20, 3, 7, -1.347774071),
    list(2, 4, 0, 2.037373055),
    list(20, 7, 3, 2.037373055)
  )
  decisions <- list( # tally, arguments in their order, answer
    list(-1.37770944791, 3, 0, 0, "undecided"),
    list(-1.37771144791, 3, 0, 0, "minus"),
    list(2.06473471596, 20, 0, 2, "undecided"),
    list(2.06473671596, 20, 0, 2, "plus"),
    list(-1.66791744391, 2, 0, 0, "undecided"),
    list(-1.66791944391, 2, 0, 0, "minus"),
    list(1.77452671996, 2, 0, 3, "undecided"),
    list(1.77452871996, 2, 0, 3, "plus"),
    list(0.160009409187, 3, 0, 3, "undecided"),
    list(0.160007409187, 3, 0, 3, "minus"),
    list(3.60245357306, 20, 0, 6, "undecided"),
    list(3.60245557306, 20, 0, 6, "plus"),
    list(-2.05905420081, 1, 0, 0, "undecided"),
    list(-2.05905620081, 1, 0, 0, "minus"),
    list(1.38338996306, 1, 3, 3, "undecided"),
    list(1.38339196306, 1, 3, 3, "plus"),
    list(-2.40804948721, 3, 1, 0, "undecided"),
    list(-2.40805148721, 3, 1, 0, "minus"),
    list(1.03439467666, 20, 3, 3, "undecided"),
    list(1.03439667666, 20, 3, 3, "plus"),
    list(-3.57229207781, 2, 1, 0, "undecided"),
    list(-3.57229407781, 2, 1, 0, "minus"),
    list(-0.129847913937, 2, 3, 3, "undecided"),
    list(-0.129845913937, 2, 3, 3, "plus"),
    list(-0.711280129813, 3, 1, 4, "undecided"),
    list(-0.711282129813, 3, 1, 4, "minus"),
    list(2.73116403406, 20, 3, 7, "undecided"),
    list(2.73116603406, 20, 3, 7, "plus"),
    list(-4.09642725581, 2, 4, 0, "undecided"),
    list(-4.09642925581, 2, 4, 0, "minus"),
    list(-0.653983091937, 20, 7, 3, "undecided"),
    list(-0.653981091937, 20, 7, 3, "plus")
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
