# Analysis of variance of many crossed studies with R's own aov, as a peer to time against.
#
#   Rscript analysis.R aov READINGS PARTS APPRAISERS TRIALS COUNT
#
# READINGS holds little-endian doubles: characteristic by characteristic, part by part, appraiser by appraiser. Each line
# of standard input is a number of passes over the first COUNT characteristics; the answer is their CPU seconds.
args <- commandArgs(trailingOnly = TRUE)
size <- as.integer(args[3:6])
each <- prod(size[1:3])
values <- readBin(args[2], "double", n = each * size[4], size = 8, endian = "little")
part <- factor(rep(seq_len(size[1]), each = size[2] * size[3]))
appraiser <- factor(rep(rep(seq_len(size[2]), each = size[3]), times = size[1]))
studies <- lapply(seq_len(size[4]), function(i) {
  data.frame(part, appraiser, value = values[(i - 1) * each + seq_len(each)])
})
one <- function(d) summary(aov(value ~ part * appraiser, data = d))[[1]][["Mean Sq"]]
asked <- file("stdin", "r")
while (length(line <- readLines(asked, n = 1)) > 0) {
  start <- proc.time()
  for (i in seq_len(as.integer(line))) lapply(studies, one)
  spent <- proc.time() - start
  cat(spent[["user.self"]] + spent[["sys.self"]], "\n", sep = "")
}
