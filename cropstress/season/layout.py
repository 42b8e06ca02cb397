"""Where a season's numbers stand in the arrays of the kernel."""

from __future__ import annotations

from cropstress.day import block
from cropstress.season.measures import SERIES

# Sums for the season, per stage and per ten days: the first eight are a day's answers in the same order.
SERIES_COUNT = len(SERIES)
GAS_SERIES = 8
HOT = 8
MISSING = 9

# Rows of the totals of a season, after the series.
HOT_IF_COOLER = 10
HOT_IF_WARMER = 11
FLOWERING_HOT = 12
FLOWERING_HOT_IF_COOLER = 13
FLOWERING_HOT_IF_WARMER = 14
WARM_NIGHTS = 15
FLOWERING_WARM_NIGHTS = 16
HOT_LEAF_DAYS = 17
HOT_HOURS = 18
DEGREE_DAYS = 19
LONGEST_SPELL = 20
LONGEST_SPELL_START = 21  # days are numbers on the time axis of the run; -1 for none
FIRST_HOT = 22
LAST_HOT = 23
HOTTEST_DAY = 24
HOTTEST_TEMPERATURE = 25
DRY_AIR_DAYS = 26
DEFICIT_SUM = 27
COUNTED_DAYS = 28
SOWING = 29
FLOWERING = 30
MATURITY = 31
SEASON_DAYS = 32
GROWING_DEGREE_DAYS = 33
MENDED = 34
SPELL = 35
SPELL_START = 36
LAST_STAGE = 37  # that of the last day of the season, counted or missing
TOTALS = 38

# Rows of the state that is carried from day to day.
SEASON = 0  # number of the season under way, -1 for none
NEXT_SEASON = 1
DAYS = 2  # since sowing
THERMAL = 3  # K d since sowing
SUNSET_BEFORE = 4  # temperature of the last evening [degC], NaN after a gap
MID_STARTED = 5  # 1 once mid-season has begun
WALK = 6

RECENT_DAYS = 30  # for the growth temperature; Kattge & Knorr 2007: the preceding month

REMEMBERED_DAYS = 64  # bits of a word
# Rows of the bits that remember them, for windows that open before flowering is known.
HOT_BITS = 0
COOLER_BITS = 1
WARMER_BITS = 2
WARM_NIGHT_BITS = 3
BITS = 4

# Rows of the daily output, after a day's answers.
DAILY_STAGE = block.DAY_ANSWERS
DAILY_LEAF_AREA = block.DAY_ANSWERS + 1
DAILY_HOT_HOURS = block.DAY_ANSWERS + 2
DAILY_GROWTH_TEMPERATURE = block.DAY_ANSWERS + 3
DAILY = block.DAY_ANSWERS + 4
