# SPDX-License-Identifier: GPL-3.0-or-later
# Exports the open data of R and its packages that the reference tests use, as small CSV files with source and licence
# in their first lines. Run from the repository's top folder: Rscript tests/reference/data.R
# Needs the packages MASS and HSAUR3; the files are committed, so the tests themselves need no R.
folder <- "tests/reference/data"
export <- function(name, frame, ...) {
  path <- file.path(folder, paste0(name, ".csv"))
  writeLines(paste("#", c(...)), path)
  suppressWarnings(write.table(frame, path, append = TRUE, sep = ",", quote = FALSE, row.names = FALSE, na = ""))
}
export("anorexia", MASS::anorexia,
       "Weights (lb) of young women before and after treatment, three arms; Hand et al. 1994,",
       "A Handbook of Small Data Sets, set 285; from R's package MASS. Licence of the package: GPL-2 or GPL-3.")
btheb <- HSAUR3::BtheB
names(btheb) <- c("drug", "length", "treatment", "before", "month2", "month3", "month5", "month8")
btheb$length <- ifelse(btheb$length == "<6m", "short", "long")
export("btheb", btheb, "Depression scores in a randomised trial of a computer-delivered therapy;",
       "Proudfoot et al. 2003, Psychological Medicine 33:217; from R's package HSAUR3 (BtheB).",
       "Licence of the package: GPL-2.")
export("polyps", HSAUR3::polyps3, "Numbers of colonic polyps at baseline and 3 months in a randomised trial;",
       "Giardiello et al. 1993, N Engl J Med 328:1313; from R's package HSAUR3 (polyps3).",
       "Licence of the package: GPL-2.")
export("sleep", datasets::sleep, "Extra hours of sleep under two drugs; Cushny & Peebles 1905, used by Student 1908,",
       "Biometrika 6:1; from R's package datasets. Licence: GPL-2 or GPL-3 (part of R).")
export("stackloss", datasets::stackloss, "Stack loss of a plant; Brownlee 1960; from R's package datasets.",
       "Licence: GPL-2 or GPL-3 (part of R).")
number_sets <- list(trees = datasets::trees$Volume, rivers = datasets::rivers, precip = datasets::precip,
                    ozone = na.omit(datasets::airquality$Ozone), faithful = datasets::faithful$eruptions,
                    depth = datasets::quakes$depth, islands = datasets::islands,
                    weights = c(148, 154, 158, 160, 161, 162, 166, 170, 182, 195, 236),
                    sums = c(1, 2, 3, 4, 7, 11, 18, 29, 47, 76), three = c(1, 2, 4), four = c(1, 2, 4, 9),
                    five = c(3, 1, 4, 1.5, 9), six = c(2.5, 7, 1, 8, 2, 8.5), ties = c(1, 2, 2, 2, 2, 3, 3, 9, 9))
export("numbers", data.frame(set = rep(names(number_sets), lengths(number_sets)), value = unlist(number_sets)),
       "trees (Volume), rivers, precip, ozone (airquality), faithful (eruptions), depth (quakes), islands:",
       "R's package datasets;",
       "weights: Shapiro & Wilk 1965, Biometrika 52:591; sums, three, four, five, six, ties: made up here.",
       "Licence: GPL-2 or GPL-3 (part of R).")
samples <- list(
  permeability = list(c(0.80, 0.83, 1.89, 1.04, 1.45, 1.38, 1.91, 1.64, 0.73, 1.46), c(1.15, 0.88, 0.90, 0.74, 1.21)),
  depression = list(c(1.83, 0.50, 1.62, 2.48, 1.68, 1.88, 1.55, 3.06, 1.30),
                    c(0.878, 0.647, 0.598, 2.05, 1.06, 1.29, 1.06, 3.14, 1.29)),
  outlier = list(c(12, 15, 17, 18, 20, 21, 22, 25, 31, 80), c(10, 11, 13, 14, 16, 16, 19, 20, 24, 30)),
  small = list(c(1, 2, 3), c(1.1, 2.9, 4.2)),
  eleven = list(c(2.7, 2.7, 1.1, 3, 1.9, 3, 3.8, 3.8, 0.3, 1.9, 1.9),
                c(6.5, 5.4, 8.1, 3.5, 0.5, 3.8, 6.8, 4.9, 9.5, 6.2, 4.1)),
  fours = list(c(4.1, 6.3, 7.7, 9.2), c(1.2, 3.4, 5.1, 6.0)),
  rivers_ozone = list(datasets::rivers[datasets::rivers > 250], na.omit(datasets::airquality$Ozone) * 5),
  eruptions = local({ # no ties, both just below 50
    unlike <- unique(datasets::faithful$eruptions)
    list(unlike[1:49], unlike[50:96] + 0.0005)
  }))
long <- do.call(rbind, lapply(names(samples), function(name) data.frame(
  set = name, sample = rep(c("x", "y"), lengths(samples[[name]])), value = unlist(samples[[name]]))))
export("samples", long,
       "permeability, depression: Hollander & Wolfe 1973, Nonparametric Statistical Methods",
       "(as in R's help on rank tests);",
       "rivers_ozone, eruptions: cut from R's package datasets; the others made up or common worked numbers.",
       "Licence: GPL-2 or GPL-3 (part of R).")
before <- c(8.1, 7.9, 9.2, 8.4, 7.6, 8.8, 9.0, 7.8, 8.3, 8.6, 9.5, 7.7)
after <- c(7.5, 7.1, 8.2, 7.7, 7.0, 7.9, 8.8, 7.9, 8.1, 8.4, 9.6, 7.5)
export("twelve", data.frame(arm = rep(c(1, 0), each = 6), before, after),
       "Made up here: twelve participants in two arms.")
# What several sites could have measured: the sets are cut to the length of the shortest and stand side by side.
heights <- na.omit(MASS::survey$Height)
measured <- seq_len(189)
export("sites", data.frame(glucose = MASS::Pima.tr$glu[measured], height = heights[measured], weight = MASS::birthwt$lwt,
                           bmi = MASS::Pima.tr$bmi[measured]),
       "glucose (mg/dL) and bmi: Pima.tr, Smith et al. 1988; height (cm): survey, Venables & Ripley 1999;",
       "weight (lb): birthwt, Hosmer & Lemeshow 1989; all from R's package MASS. Licence of the package: GPL-2 or GPL-3.")
# Data sets whose columns nobody named for us: what the guesses on the form are checked with.
export("respiratory", subset(HSAUR3::respiratory, as.integer(subject) <= 60),
       "Respiratory status by month in a randomised trial in two centres (the first 60 patients);",
       "Davis 1991, Semi-parametric analysis of repeated measurements; from R's package HSAUR3.",
       "Licence of the package: GPL-2.")
export("toenail", subset(HSAUR3::toenail, as.integer(patientID) <= 60),
       "Toenail infection by visit in a randomised trial (the first 60 patients); De Backer et al. 1998,",
       "J Am Acad Dermatol 38:S57; from R's package HSAUR3. Licence of the package: GPL-2.")
export("seizures", HSAUR3::epilepsy, "Seizures in four periods of two weeks in a randomised trial, one row per period;",
       "Thall & Vail 1990, Biometrics 46:657; from R's package HSAUR3 (epilepsy). Licence of the package: GPL-2.")
export("seizures-wide", robustbase::epilepsy, "The same trial, one row per patient: from R's package robustbase (epilepsy).",
       "Licence of the package: GPL-2 or later.")
export("bacteria", MASS::bacteria, "Presence of a bacterium by week in a randomised trial; Menzies School of Health",
       "Research 1999-2000; from R's package MASS. Licence of the package: GPL-2 or GPL-3.")
export("chicks", datasets::ChickWeight, "Weights (g) of chicks by day on four diets; Crowder & Hand 1990,",
       "Analysis of Repeated Measures, example 5.3; from R's package datasets (ChickWeight). Licence: GPL-2 or GPL-3 (part of R).")
export("plasma", HSAUR3::plasma, "Erythrocyte sedimentation and plasma proteins; Collett & Jemain 1985,",
       "Sains Malaysiana 4:493; from R's package HSAUR3. Licence of the package: GPL-2.")
export("trees-ozone", MASS::Sitka, "Log-size of spruce trees by day, in ozone-enriched air and in controls; Diggle et al. 1994,",
       "Analysis of Longitudinal Data; from R's package MASS (Sitka). Licence of the package: GPL-2 or GPL-3.")
export("schizophrenia", HSAUR3::schizophrenia2, "Thought disorder by month after admission; Davis 2002,",
       "Statistical Methods for the Analysis of Repeated Measurements; from R's package HSAUR3 (schizophrenia2).",
       "Licence of the package: GPL-2.")
export("calcium", boot::calcium, "Calcium uptake of cells by time; Rawlings 1988, Applied Regression Analysis;",
       "from R's package boot. Licence of the package: unlimited.")
