# SPDX-License-Identifier: GPL-3.0-or-later
# Recomputes the reference values with the R of this machine and compares them with the committed ones. TAP on standard
# output, exit status 1 where a value differs. Run from the repository's top folder: Rscript tests/reference/live.R
# Base R is enough; what needs MASS, sandwich or robustbase is skipped by name where they are not installed. The
# simulated permutation values are left to values.R, as they take R's own random numbers.
source("tests/reference/compute.R")
values <- compute(with_simulation = FALSE)
iterated <- c("robust", "table") # rlm iterates, and so does what lies under fisher.test
number <- 0
failed <- 0
report <- function(passed, name) {
  number <<- number + 1
  if (!passed) failed <<- failed + 1
  cat(if (passed) "ok" else "not ok", number, "-", name, "\n")
}
cat("TAP version 13\n")
for (file in c("linear", "robust", "two-sample", "describe", "table", "distribution")) {
  committed <- read.csv(file.path(folder, "values", paste0(file, ".csv")), comment.char = "#", stringsAsFactors = FALSE)
  now <- values[values$file == file, ]
  tolerance <- if (file %in% iterated) 1e-8 else 1e-10
  for (case in unique(committed$case)) {
    part <- committed[committed$case == case, ]
    found <- match(paste(case, part$quantity), paste(now$case, now$quantity))
    if (all(is.na(found))) {
      report(TRUE, paste0("live/", file, " ", case, " # SKIP a package is not installed"))
      next
    }
    same <- now$value[found]
    scale <- pmax(abs(part$value), part$standard_error, na.rm = TRUE)
    excused <- is.na(same) & length(skipped) > 0
    gap <- ifelse(excused | same == part$value, 0, abs(same - part$value) / scale)
    passed <- all(is.finite(gap)) && max(gap) <= tolerance
    if (!passed) for (i in which(!is.finite(gap) | gap > tolerance))
      cat("#", case, part$quantity[i], "now", format(same[i], digits = 17),
          "committed", format(part$value[i], digits = 17), "\n")
    report(passed, paste0("live/", file, " ", case))
  }
}
for (text in unique(skipped)) cat("# skipped:", text, "\n")
cat(sprintf("1..%d\n", number))
quit(status = if (failed > 0) 1 else 0)
