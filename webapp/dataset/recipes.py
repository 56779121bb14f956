"""Three lines each that open a dataset: README.txt and the page show them, tests run them in the unzipped folder."""

PANDAS = (
    'readings = pandas.read_csv("readings.csv", keep_default_na=False, na_values=[""])',
    'readings["taken_at"] = pandas.to_datetime(readings["taken_at"], utc=True)',
    'good = readings[~readings["quality"].isin(["bad", "missing"])]',
)
R = (
    'readings <- read.csv("readings.csv", na.strings = "", fileEncoding = "UTF-8")',
    'readings$taken_at <- as.POSIXct(sub(":(..)$", "\\\\1", readings$taken_at), format = "%Y-%m-%dT%H:%M:%OS%z")',
    'good <- subset(readings, !quality %in% c("bad", "missing"))',
)
SPREADSHEET = (
    "Open station_summary.csv by way of importing text: UTF-8, comma between the columns, decimal point.",
    "Each number is rounded for people; readings.csv beside it has every layer, from what was typed to what to use.",
    "Filter by quality. An apostrophe at the start of a text was put there so that no formula runs.",
)
BY_TOOL = (("Python, after import pandas", PANDAS), ("R", R), ("A spreadsheet", SPREADSHEET))
