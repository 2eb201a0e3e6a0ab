# SPDX-License-Identifier: GPL-3.0-or-later
# Writes tests/reference/values/*.csv. Run from the repository's top folder: Rscript tests/reference/values.R
# Needs MASS, sandwich and robustbase. The committed files were made with R 4.2.2, MASS 7.3-58.2, sandwich 3.0-2,
# robustbase 0.95-0 (Debian 12).
source("tests/reference/compute.R")
stopifnot(has("MASS"), has("sandwich"), has("robustbase"))
values <- compute()
for (file in unique(values$file)) {
  part <- values[values$file == file, -1]
  part$value <- format(part$value, digits = 17, trim = TRUE)
  part$value <- vapply(values$value[values$file == file], function(v) format(v, digits = 17), "")
  part$standard_error <- vapply(values$standard_error[values$file == file],
                                function(v) if (is.na(v)) "" else format(v, digits = 17), "")
  path <- file.path("tests/reference/values", paste0(file, ".csv"))
  writeLines("# made by tests/reference/values.R; the standard error scales the gap allowed, where there is one", path)
  suppressWarnings(write.table(part, path, append = TRUE, sep = ",", quote = FALSE, row.names = FALSE))
}
