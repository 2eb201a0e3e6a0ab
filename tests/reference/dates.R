# SPDX-License-Identifier: GPL-3.0-or-later
# Writes tests/reference/values/dates.csv: days since 1970-01-01 of texts in several orders, as base R's as.Date reads them (its
# calendar is the proleptic Gregorian one), and of spreadsheets' serial numbers by the origins R's help page of as.Date gives (1899-12-30,
# good from serial 61 on, and 1904-01-01). Run from the repository's top folder: Rscript tests/reference/dates.R
# The committed file was made with R 4.2.2 (Debian 12), in the C locale so that months have their English names.
invisible(Sys.setlocale("LC_TIME", "C"))
set.seed(20261201)
days <- sort(unique(c(as.Date(c("0001-01-01", "1582-10-15", "1600-02-29", "1700-02-28", "1700-03-01", "1899-12-31", "1900-02-28",
  "1900-03-01", "1904-01-01", "1969-12-31", "1970-01-01", "1972-02-29", "1999-12-31", "2000-02-29", "2000-03-01", "2024-02-29",
  "2026-12-31", "2038-01-19", "2100-02-28", "2100-03-01", "2400-02-29", "9999-12-31")),
  as.Date(sample(-40000:40000, 120), origin = "1970-01-01"))))
padded <- function(day) sprintf("%04d-%s", as.integer(format(day, "%Y")), format(day, "%m-%d"))
rows <- data.frame(order = "Y/M/D", text = vapply(days, function(d) padded(as.Date(d, origin = "1970-01-01")), ""), day = as.integer(days))
usual <- days[days >= as.Date("1000-01-01")]
for (shape in list(c("D/M/Y", "%d/%m/%Y"), c("M/D/Y", "%m/%d/%Y"), c("D-MON-Y", "%d-%b-%Y"), c("D-MON-Y", "%d %B %Y")))
  rows <- rbind(rows, data.frame(order = shape[1], text = format(usual, shape[2]), day = as.integer(usual)))
# strptime's %y: 69 to 99 are of the 1900s
short <- usual[usual >= as.Date("1969-01-01") & usual <= as.Date("2068-12-31")]
rows <- rbind(rows, data.frame(order = "D/M/YY", text = format(short, "%d/%m/%y"), day = as.integer(as.Date(format(short, "%d/%m/%y"), "%d/%m/%y"))))
serials <- c(61, 366, 1000, 25569, 36526, 40000, 45292, 54789, 100000)
rows <- rbind(rows,
  data.frame(order = "serial-1900", text = format(serials, scientific = FALSE, trim = TRUE), day = as.integer(as.Date(serials, origin = "1899-12-30"))),
  data.frame(order = "serial-1904", text = format(serials, scientific = FALSE, trim = TRUE), day = as.integer(as.Date(serials, origin = "1904-01-01"))))
path <- "tests/reference/values/dates.csv"
writeLines("# made by tests/reference/dates.R", path)
suppressWarnings(write.table(rows, path, append = TRUE, sep = ",", quote = FALSE, row.names = FALSE))
