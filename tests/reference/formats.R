# SPDX-License-Identifier: GPL-3.0-or-later
# Made tests/reference/data/formats.*: one small table as other programs write it. Needs haven and openxlsx (in Debian
# r-cran-haven and r-cran-openxlsx). Run from the repository's top folder: Rscript tests/reference/formats.R
# The table is invented. What each format cannot say is said in test_formats.c.
suppressPackageStartupMessages({
  library(haven)
  library(openxlsx)
})
folder <- "tests/reference/data/formats"
file_of <- function(ending) paste0(folder, ".", ending)
day <- as.Date(c("2026-03-14", "1959-12-31", NA, "2024-02-29", "1900-03-01"))
seen <- as.POSIXct(c("2026-03-14 09:30:00", "2026-03-15 00:00:00", NA, "2026-12-31 23:59:59", "2000-02-29 12:00:00"), tz = "UTC")
table <- data.frame(
  PID = c("1001", "1002", "1003", "1004", "1005"),
  ARM = c(1, 2, 2, 1, 2),
  SBP = c(148.5, 0.1 + 0.2, NA, -1e-9, 123456.789),
  COUNT = c(0, 1e15, 12, NA, -7),
  DAY = day,
  SEEN = seen,
  NOTE = c("Zo\u00eb, 2nd", "<0.3", "", "line one \"quoted\"", "24.0"),
  stringsAsFactors = FALSE
)
labelled_table <- table
labelled_table$ARM <- labelled(table$ARM, c("Walking group" = 1, "Printed advice" = 2), label = "Randomised group")
attr(labelled_table$SBP, "label") <- "Systolic pressure"

write_xpt(labelled_table, file_of("xpt"), version = 5, name = "TRIAL")
tagged <- labelled_table
tagged$SBP[3] <- tagged_na("b")
write_dta(tagged, file_of("dta"), version = 14)
user_missing <- labelled_table
user_missing$SBP <- labelled_spss(c(148.5, 0.1 + 0.2, 999, -1e-9, 123456.789), c("Not done" = 999), na_values = 999,
  na_range = c(-99, -90), label = "Systolic pressure")
write_sav(user_missing, file_of("sav"), compress = "byte")

book <- createWorkbook()
addWorksheet(book, "Notes")
writeData(book, "Notes", data.frame(note = "not this one"))
addWorksheet(book, "Export")
writeData(book, "Export", table)
addStyle(book, "Export", createStyle(numFmt = "yyyy-mm-dd"), rows = 2:6, cols = 5)
addStyle(book, "Export", createStyle(numFmt = "dd/mm/yyyy hh:mm:ss"), rows = 2:6, cols = 6)
saveWorkbook(book, file_of("xlsx"), overwrite = TRUE)

# What the cells must be: ISO 8601 by R itself; numbers by R's shortest text of 17 digits at most.
number <- function(x) ifelse(is.na(x), "", vapply(x, function(one) {
  for (digits in 15:17) {
    text <- formatC(one, digits = digits, format = "g", flag = "", width = 1)
    if (!is.na(one) && as.numeric(text) == one) return(text)
  }
  text
}, ""))
moment <- sub(" 00:00:00$", "", format(seen, "%Y-%m-%d %H:%M:%S"))
wanted <- data.frame(
  PID = table$PID, ARM = number(table$ARM), SBP = number(table$SBP), COUNT = number(table$COUNT),
  DAY = ifelse(is.na(day), "", format(day)), SEEN = ifelse(is.na(seen), "", sub(" ", "T", moment)), NOTE = table$NOTE
)
write.csv(wanted, file_of("csv"), row.names = FALSE, quote = TRUE, fileEncoding = "UTF-8")
