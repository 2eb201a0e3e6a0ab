# SPDX-License-Identifier: GPL-3.0-or-later
# Computes every reference value from the committed data; values.R writes them, live.R compares with them.
# Base R and stats do nearly all; MASS (rlm), sandwich (HC) and robustbase (medcouple) are used where they are there.
folder <- "tests/reference"
read_data <- function(name) read.csv(file.path(folder, "data", paste0(name, ".csv")), comment.char = "#",
                                     stringsAsFactors = FALSE)
has <- function(package) requireNamespace(package, quietly = TRUE)
rows <- NULL
skipped <- character()
note <- function(file, case, quantity, value, standard_error = NA)
  rows <<- rbind(rows, data.frame(file, case, quantity, value = as.numeric(value),
                                  standard_error = as.numeric(standard_error)))
estimate <- function(file, case, label, b, se, df, level = 0.95, p = TRUE) {
  half <- qt(0.5 + level / 2, df) * se
  note(file, case, paste(label, "estimate"), b, se)
  note(file, case, paste(label, "standard_error"), se, se)
  note(file, case, paste(label, "df"), df)
  note(file, case, paste(label, "low"), b - half, se)
  note(file, case, paste(label, "high"), b + half, se)
  if (p) note(file, case, paste(label, "p"), 2 * pt(-abs(b / se), df))
}

# Linear models: anorexia (three arms), BtheB at 2 and 8 months with adjustment, polyps on log10, the twelve.
models <- function() {
  a <- read_data("anorexia")
  a$cbt <- +(a$Treat == "CBT"); a$ft <- +(a$Treat == "FT")
  b <- read_data("btheb")
  b$arm <- +(b$treatment == "BtheB"); b$took <- +(b$drug == "Yes"); b$short <- +(b$length == "short")
  p <- read_data("polyps")
  p$arm <- +(p$treatment == "active"); p$before <- log10(p$baseline); p$after <- log10(p$number3m)
  t <- read_data("twelve")
  s <- read_data("stackloss")
  list(anorexia = list(Postwt ~ cbt + ft + Prewt, a, c("cbt", "ft"), 0.95),
       btheb2 = list(month2 ~ arm + before + took + short, subset(b, !is.na(month2)), "arm", 0.95),
       btheb8 = list(month8 ~ arm + before + took + short, subset(b, !is.na(month8)), "arm", 0.90),
       polyps = list(after ~ arm + before, p, "arm", 0.95),
       twelve = list(after ~ arm + before, t, "arm", 0.95),
       stackloss = list(stack.loss ~ Air.Flow + Water.Temp + Acid.Conc., s, character(), 0.95))
}

linear_values <- function() {
  for (case in names(models())) {
    m <- models()[[case]]; arms <- m[[3]]; level <- m[[4]]
    fit <- lm(m[[1]], m[[2]]); df <- fit$df.residual
    terms <- names(coef(fit))
    for (j in seq_along(terms)) {
      label <- paste0("b", j - 1)
      estimate("linear", case, label, coef(fit)[j], sqrt(vcov(fit)[j, j]), df, level)
    }
    note("linear", case, "sigma", summary(fit)$sigma)
    h <- hatvalues(fit)
    note("linear", case, "largest leverage", max(h))
    for (arm in c("none", arms)) if (length(arms)) {
      d <- m[[2]]; d[arms] <- 0
      if (arm != "none") d[arm] <- 1
      x <- colMeans(model.matrix(m[[1]], d))
      estimate("linear", case, paste("mean", arm), sum(x * coef(fit)), sqrt(drop(t(x) %*% vcov(fit) %*% x)), df, level,
               FALSE)
    }
    if (has("sandwich")) {
      for (kind in c("HC0", "HC1", "HC2", "HC3")) for (j in seq_along(terms))
        note("linear", case, paste0("b", j - 1, " ", kind), sqrt(sandwich::vcovHC(fit, kind)[j, j]))
      for (j in seq_along(terms))
        estimate("linear", case, paste0("b", j - 1, " HC3"), coef(fit)[j], sqrt(sandwich::vcovHC(fit, "HC3")[j, j]), df,
                 level)
    } else skipped <<- c(skipped, paste("HC of", case, "(sandwich is not installed)"))
    if (has("MASS")) {
      robust <- MASS::rlm(m[[1]], m[[2]], acc = 1e-14, maxit = 1000)
      table <- summary(robust)$coefficients
      for (j in seq_along(terms)) estimate("robust", case, paste0("b", j - 1), table[j, 1], table[j, 2], df, level)
      note("robust", case, "scale", robust$s)
    } else skipped <<- c(skipped, paste("Huber of", case, "(MASS is not installed)"))
  }
}

# Trimmed means: Yuen's formula on base R's own trimmed mean.
yuen <- function(x, y, trim = 0.2) {
  part <- function(v) {
    n <- length(v); cut <- floor(trim * n); s <- sort(v); h <- n - 2 * cut
    w <- var(pmin(pmax(v, s[cut + 1]), s[n - cut]))
    c(mean(v, trim = trim), (n - 1) * w / (h * (h - 1)), h - 1)
  }
  a <- part(x); b <- part(y)
  list(b = a[1] - b[1], se = sqrt(a[2] + b[2]), df = (a[2] + b[2])^2 / (a[2]^2 / a[3] + b[2]^2 / b[3]))
}

# The rank-sum interval by all differences. The normal case has the convention the program names.
rank_shift <- function(x, y, level) {
  d <- sort(outer(x, y, "-")); n <- length(d); both <- c(x, y)
  exact <- !anyDuplicated(both) && length(x) < 50 && length(y) < 50
  test <- suppressWarnings(wilcox.test(x, y, exact = exact, correct = TRUE))
  if (exact) {
    c <- max(1, qwilcox((1 - level) / 2, length(x), length(y)))
    achieved <- 1 - 2 * pwilcox(c - 1, length(x), length(y))
  } else {
    t <- table(match(both, both)); m <- length(both)
    v <- n / 12 * (m + 1 - sum(t^3 - t) / (m * (m - 1)))
    c <- max(1, floor(n / 2 - qnorm(0.5 + level / 2) * sqrt(v)))
    achieved <- 1 - 2 * pnorm((c - 0.5 - n / 2) / sqrt(v))
  }
  list(median = median(d), low = d[c], high = d[n + 1 - c], p = test$p.value, w = test$statistic, achieved = achieved)
}

two_sample_values <- function() {
  s <- read_data("samples")
  pairs <- lapply(split(s, s$set), function(d) list(x = d$value[d$sample == "x"], y = d$value[d$sample == "y"]))
  z <- read_data("sleep"); pairs$sleep <- list(x = z$extra[z$group == 1], y = z$extra[z$group == 2])
  a <- read_data("anorexia"); change <- a$Postwt - a$Prewt
  pairs$anorexia <- list(x = change[a$Treat == "FT"], y = change[a$Treat == "Cont"])
  b <- subset(read_data("btheb"), !is.na(month2))
  change <- b$month2 - b$before
  pairs$btheb <- list(x = change[b$treatment == "BtheB"], y = change[b$treatment == "TAU"])
  for (case in names(pairs)) {
    x <- pairs[[case]]$x; y <- pairs[[case]]$y
    for (level in c(0.95, 0.99)) {
      w <- t.test(x, y, conf.level = level)
      estimate("two-sample", case, paste("welch", level), mean(x) - mean(y), w$stderr, w$parameter, level)
      u <- yuen(x, y)
      estimate("two-sample", case, paste("trimmed", level), u$b, u$se, u$df, level)
      r <- rank_shift(x, y, level); scale <- w$stderr
      note("two-sample", case, paste("rank", level, "estimate"), r$median, scale)
      note("two-sample", case, paste("rank", level, "low"), r$low, scale)
      note("two-sample", case, paste("rank", level, "high"), r$high, scale)
      note("two-sample", case, paste("rank", level, "p"), r$p)
      note("two-sample", case, paste("rank", level, "achieved"), r$achieved)
      note("two-sample", case, paste("rank", level, "statistic"), r$w)
    }
  }
}

describe_values <- function() {
  d <- read_data("numbers")
  for (case in unique(d$set)) {
    x <- d$value[d$set == case]; n <- length(x); q <- quantile(x, c(0.25, 0.5, 0.75), type = 7); iqr <- q[[3]] - q[[1]]
    put <- function(quantity, value) note("describe", case, quantity, value, sd(x))
    put("mean", mean(x)); put("sd", sd(x)); put("minimum", min(x)); put("maximum", max(x))
    put("lower_quartile", q[[1]]); put("median", q[[2]]); put("upper_quartile", q[[3]])
    note("describe", case, "skewness", mean((x - mean(x))^3) / mean((x - mean(x))^2)^1.5, 1)
    put("whisker low", min(x[x >= q[[1]] - 1.5 * iqr])); put("whisker high", max(x[x <= q[[3]] + 1.5 * iqr]))
    put("inner low", q[[1]] - 1.5 * iqr); put("inner high", q[[3]] + 1.5 * iqr)
    put("outer low", q[[1]] - 3 * iqr); put("outer high", q[[3]] + 3 * iqr)
    put("tenth", quantile(x, 0.1, type = 7)); put("deviation", mad(x))
    s <- shapiro.test(x); note("describe", case, "w", s$statistic); note("describe", case, "p", s$p.value)
    if (has("robustbase")) {
      m <- robustbase::mc(x, doReflect = TRUE, doScale = FALSE)
      k <- if (m >= 0) exp(c(-4, 3) * m) else exp(c(-3, 4) * m)
      note("describe", case, "medcouple", m, 1)
      put("adjusted low", q[[1]] - 1.5 * k[1] * iqr); put("adjusted high", q[[3]] + 1.5 * k[2] * iqr)
    } else skipped <<- c(skipped, paste("medcouple of", case, "(robustbase is not installed)"))
  }
}

tables <- list(tea = rbind(c(3, 1), c(1, 3)), seven = rbind(c(7, 8), c(12, 3)), none = rbind(c(0, 0), c(20, 25)),
               twins = rbind(c(2, 15), c(10, 3)), big = rbind(c(230, 180), c(1270, 1320)),
               lopsided = rbind(c(0, 9), c(400, 391)),
               three = rbind(c(3, 5, 11), c(40, 38, 31)), four = rbind(c(1, 4, 2, 9), c(24, 20, 23, 15)),
               wide = rbind(c(14, 22, 9, 30), c(136, 128, 141, 120)), gap = rbind(c(3, 0, 7), c(17, 0, 13)),
               five = rbind(c(1, 0, 3, 5, 2), c(11, 9, 14, 6, 8)), even = rbind(c(5, 5, 5), c(5, 5, 5)))
multinomial_distance <- function(a, b) {
  keep <- a + b > 0; p <- (a / sum(a))[keep][-1]; q <- (b / sum(b))[keep][-1]
  s <- (diag(p, length(p)) - outer(p, p) + diag(q, length(q)) - outer(q, q)) / 2
  sqrt(drop(t(p - q) %*% solve(s) %*% (p - q)))
}
table_values <- function() {
  for (case in names(tables)) note("table", case, "p", fisher.test(tables[[case]], workspace = 2e7)$p.value)
  for (case in c("tea", "three", "four", "five"))
    note("table", case, "distance", multinomial_distance(tables[[case]][1, ], tables[[case]][2, ]))
}

distribution_values <- function() {
  for (df in c(1, 2.5, 12, 30.5, 99, 1234, 1e5)) {
    for (t in c(1e-3, 0.5, 1.96, 4, 9, 30))
      note("distribution", paste("t", df), paste("two_sided", t), 2 * pt(-t, df))
    for (p in c(0.6, 0.95, 0.975, 0.9995)) note("distribution", paste("t", df), paste("quantile", p), qt(p, df))
  }
  for (p in c(0.5, 0.9, 0.975, 0.999999)) note("distribution", "normal", paste("quantile", p), qnorm(p), 1)
  for (z in c(0, 1, 1.96, 5, 20)) note("distribution", "normal", paste("upper", z), pnorm(-z))
  for (df in c(1, 3, 14, 150)) for (x in c(0.1, 3, 35, 300))
    note("distribution", paste("chi_square", df), paste("upper", x), pchisq(x, df, lower.tail = FALSE))
  for (d in list(c(1, 7), c(2, 230), c(3, 1e4))) for (f in c(0.2, 1, 4, 25))
    note("distribution", paste("f", d[1], d[2]), paste("upper", f), pf(f, d[1], d[2], lower.tail = FALSE))
  for (b in list(c(0, 999), c(12, 9999), c(1, 29), c(29, 29))) {
    i <- binom.test(b[1], b[2])$conf.int
    note("distribution", paste("binomial", b[1], b[2]), "low", i[1])
    note("distribution", paste("binomial", b[1], b[2]), "high", i[2])
  }
}

# Permutation: all 70 allocations of four against four; and a Freedman-Lane run of R's own random numbers on the twelve
# and on the adjusted BtheB model, whose value is known to its Monte Carlo error only.
permutation_values <- function() {
  s <- subset(read_data("samples"), set == "fours"); y <- s$value; arm <- +(s$sample == "x")
  size <- function(a) abs(summary(lm(y ~ a))$coefficients[2, 3])
  all <- apply(combn(8, 4), 2, function(i) size(+(1:8 %in% i)))
  note("permutation", "fours", "exact p", mean(all >= size(arm) * (1 - 1e-9)))
  for (case in c("twelve", "btheb2")) {
    m <- models()[[case]]; x <- model.matrix(m[[1]], m[[2]]); y <- model.response(model.frame(m[[1]], m[[2]]))
    reduced <- lm.fit(x[, -2], y); t_of <- function(v) {
      f <- lm.fit(x, v); s2 <- sum(f$residuals^2) / f$df.residual
      abs(f$coefficients[2]) / sqrt(s2 * chol2inv(f$qr$qr[seq_len(ncol(x)), ])[2, 2])
    }
    observed <- t_of(y); set.seed(1); n <- 20000
    b <- sum(replicate(n, t_of(reduced$fitted.values + sample(reduced$residuals)) >= observed))
    note("permutation", case, "simulated p", b / n, sqrt(b / n * (1 - b / n) / n))
    note("permutation", case, "t", observed)
  }
}

compute <- function(with_simulation = TRUE) {
  rows <<- NULL; skipped <<- character()
  linear_values(); two_sample_values(); describe_values(); table_values(); distribution_values()
  if (with_simulation) permutation_values()
  rows
}
