"""ISO 2859-1 single sampling, normal inspection, from the structure of its Table 2-A."""

LETTERS = "ABCDEFGHJKLMNPQR"
SIZES = dict(zip(LETTERS, (2, 3, 5, 8, 13, 20, 32, 50, 80, 125, 200, 315, 500, 800, 1250, 2000), strict=True))
AQLS = (0.010, 0.015, 0.025, 0.040, 0.065, 0.10, 0.15, 0.25, 0.40, 0.65, 1.0, 1.5, 2.5, 4.0, 6.5, 10)
# Upper end of the lot size range and its code letters (ISO 2859-1:1999 Table 1).
LEVELS = ("S-1", "S-2", "S-3", "S-4", "I", "II", "III")
ROWS = (
    (8, "AAAAAAB"), (15, "AAAAABC"), (25, "AABBBCD"), (50, "ABBCCDE"), (90, "BBCCCEF"), (150, "BBCDDFG"),
    (280, "BCDEEGH"), (500, "BCDEFHJ"), (1200, "CCEFGJK"), (3200, "CDEGHKL"), (10000, "CDFGJLM"),
)
# Acceptance number by the sum of letter and AQL index; 15 points up, 16 down, as does all below 14.
ACCEPTANCE = {14: 0, 17: 1, 18: 2, 19: 3, 20: 5, 21: 7, 22: 10, 23: 14, 24: 21}


def single(quantity, level, aql):
    """(n, Ac, Re) for a lot; n is the lot itself where the plan's sample is not smaller."""
    letter = next(row for end, row in ROWS if quantity <= end)[LEVELS.index(level)]
    i, j = LETTERS.index(letter), AQLS.index(aql)
    while i + j not in ACCEPTANCE:
        i += -1 if i + j in (15, 25) else 1
    ac = ACCEPTANCE[i + j]
    return min(SIZES[LETTERS[i]], quantity), ac, ac + 1
