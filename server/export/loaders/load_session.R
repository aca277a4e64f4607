# Reads a folder of Lapwing tables: load_session(folder)$laps$start_s[1]. Base R alone.
# (R itself reads CR LF inside a text as LF.)
load_session <- function(folder) {
  dictionary <- read.csv(file.path(folder, "dictionary.csv"), colClasses = "character")
  classes <- c("number" = "numeric", "integer" = "numeric", "yes/no" = "numeric", "text" = "character")
  tables <- list()
  for (name in unique(dictionary$table)) {
    columns <- dictionary[dictionary$table == name, ]
    table <- read.csv(file.path(folder, paste0(name, ".csv")), encoding = "UTF-8",
                      na.strings = "", check.names = FALSE,
                      colClasses = setNames(classes[columns$type], columns$column))
    for (column in columns$column[columns$type == "yes/no"])
      table[[column]] <- table[[column]] == 1
    for (column in columns$column[columns$type == "text"])
      table[[column]][is.na(table[[column]])] <- ""
    tables[[name]] <- table
  }
  tables
}
