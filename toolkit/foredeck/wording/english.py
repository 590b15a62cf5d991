"""The English texts of pages, by key.

Facts stand in braces. A key that ends in "|1" is the singular, "|n" the plural.
Finding first, number second; past tense for what happened, "expect" for what has not.
"""

from __future__ import annotations

MONTHS = ("January", "February", "March", "April", "May", "June", "July", "August", "September", "October",
          "November", "December")

_NAMES = {
    "of year": "of {year}",
    "week": "week {week}",
    "quarter 1": "the first quarter", "quarter 2": "the second quarter",
    "quarter 3": "the third quarter", "quarter 4": "the fourth quarter",
    "level 50": "one in two", "level 80": "eight in ten", "level 90": "nine in ten", "level 95": "19 in 20",
    "level other": "{level} in 100",
    "range 50": "one-in-two range", "range 80": "eight-in-ten range", "range 90": "nine-in-ten range",
    "range 95": "19-in-20 range", "range other": "{level}-in-100 range",
    "outside 50": "One {noun} in two", "outside 80": "One {noun} in five", "outside 90": "One {noun} in ten",
    "outside 95": "One {noun} in 20", "outside other": "About {rest} {plural} in 100",
    "same as last": "same as the last value",
    "same as yearly": "same as the year before", "same as other": "same as last year",
    "fault|1": "one fault", "fault|n": "{words} faults", "query|1": "one query", "query|n": "{words} queries",
}

_HEAD = {
    "headline plain": "Expect about {value} {unit} in {when}",
    "headline intermittent": "Expect {value} {unit} in {when} on average; demand comes in {busy} of 100 {plural}",
    "headline more": ", about {size} more than last round said",
    "headline less": ", about {size} less than last round said",
    "headline same": ", much as last round said",
    "headline more year": ", about {size} more than a year before",
    "headline less year": ", about {size} less than a year before",
    "headline same year": ", much the same as a year before",
    "headline surprise above": "{last} came in {miss} above what was said",
    "headline surprise below": "{last} came in {miss} below what was said",
    "headline adjusted": "an adjustment of {size} is included",
    "headline because": ": {why}", "headline and": ", and ",
    "headline not forecast": "No forecast for {name}",
    "ask how many": "How many in {when}?",
    "ask how sure": "How sure is that?",
    "ask last year": "Against last year?",
    "ask last year and": "Against last year and {name}?",
    "ask why": "Why has it changed?",
    "ask trust": "Can I trust it?",
    "how many lead": "Most likely.",
    "how many lead intermittent": "On average.",
    "how many inner": "Half of {plural} like this land between {lower} and {upper}.",
    "how many other": "Of {plural} like this, {level} land between {lower} and {upper}.",
    "how many no inner": "As likely to be too high as too low.",
    "how many intermittent": "Single {plural} are often 0 and sometimes much more; this is what they average.",
    "how sure lead": "{level}.",
    "how sure": "{outside} falls outside. If running short costs more, plan near {high}; if having too much costs "
                "more, near {low}.",
    "how sure many": "{outside} fall outside. If running short costs more, plan near {high}; if having too much "
                     "costs more, near {low}.",
    "how sure intermittent": "At most {outside} comes out higher. If running short costs much, plan near {high}: the "
                             "average says little of a single order.",
    "how sure intermittent many": "At most {outside} come out higher. If running short costs much, plan near {high}: "
                                  "the average says little of a single order.",
    "how sure none": "No range",
    "how sure none text": "Too little history to say how far forecasts of this series miss.",
    "year more": "{share} more", "year less": "{share} less", "year same": "The same",
    "year up": "{size} more", "year down": "{size} less",
    "year lead": "{size} {unit}",
    "year text more": "more than {past}, which was {value}.",
    "year text less": "less than {past}, which was {value}.",
    "year text same": "No different from {past}, which was {value}.",
    "year inside": "Inside the range, so within ordinary variation.",
    "year outside": "{past} lies outside the range: more than ordinary variation.",
    "year none": "Not known",
    "year none text": "There is no actual for {past}.",
    "comparison more": "{name} of {value}: the forecast is {share} above it.",
    "comparison less": "{name} of {value}: the forecast is {share} below it.",
    "comparison same": "{name} of {value}: the forecast agrees.",
    "comparison value": "{name}: {value}.",
    "why none": "First round",
    "why none text": "Nothing was said before, so there is nothing to compare with.",
    "why alone": "No round",
    "why alone text": "This study was made outside a round, so there is no earlier figure to compare with.",
    "why not said": "Not said before",
    "why not said text": "Round {round} did not look as far as {when}.",
    "why more": "{size} more", "why less": "{size} less", "why same": "Unchanged",
    "why small": "than last round",
    "why last above": "{last} came to {actual}, {miss} above what was said.",
    "why last below": "{last} came to {actual}, {miss} below what was said.",
    "why last as said": "{last} came to {actual}, as was said.",
    "why split": "New actuals and estimates make {baseline} of the change, adjustments {adjustment}.",
    "why only adjustments": "All of the change comes from adjustments.",
    "why included": " An adjustment of {size} is included.",
    "why no adjustment": "All of the change comes from new actuals and estimates; no adjustment has changed.",
    "trust big": "{inside} of {n}", "trust small": "in range",
    "trust lead": "{inside} of the last {n} held;",
    "trust expected": "about {expected} should.",
    "trust note": "Each was made again with only what was known then.",
    "trust miss": "Typical miss {miss} {unit}.",
    "trust miss better": "Typical miss {miss} {unit}, {share} smaller than “{benchmark}”.",
    "trust miss worse": "Typical miss {miss} {unit}, {share} larger than “{benchmark}”.",
    "trust miss far": "Typical miss {miss} {unit}, against {other} for “{benchmark}”.",
    "trust miss same": "Typical miss {miss} {unit}, the same as “{benchmark}”.",
    "trust unranged": "Not yet known", "trust unranged text": "No range could be tried on this series yet.",
    "trust none": "Not tried",
    "trust none text": "The history is too short to forecast it again from past {plural}: treat the range with care.",
}

_SECTIONS = {
    "outlook title": "Outlook", "outlook sub": "The next {count} {plural} beside what is known",
    "outlook one": "One {noun} is forecast: {when}, at about {value} {unit}.",
    "outlook peak": "The highest {noun} is {high}, at about {top} {unit}; the lowest {low}, at about {bottom}.",
    "outlook peak year": " A year before, {high} was {value}.",
    "outlook rises": "Expect a rise, from about {first} {unit} in {start} to about {last} in {end}.",
    "outlook falls": "Expect a fall, from about {first} {unit} in {start} to about {last} in {end}.",
    "outlook level": "Expect about {value} {unit} a {noun} all the way to {end}.",
    "outlook landing": "The year to {end} should come to about {value} {unit}, of which {sofar} are actual.",
    "outlook landing range": "The range is {lower} to {upper} ({level}).",
    "outlook landing year": "The year before came to {value}.",
    "outlook table": "The next {count} {plural}, {unit}.",
    "outlook table note": "Rounded to what the ranges support. Left of the line: known; right: expected.",
    "outlook totals note": "Lines for several {plural} are not the sum of the ranges above them: good and bad "
        "{plural} partly "
                           "cancel, so several together are surer than each one.",
    "outlook no totals": "Ranges of single {plural} do not add up to the range of several.",
    "trust title": "How far to trust it",
    "trust sub": "Tried from {origins} past {plural}, each time with only what was known then",
    "trust say against": "One {noun} ahead the forecast typically misses by {miss} {unit}, against {other} for "
        "“{benchmark}”.",
    "trust better all": "It stays ahead at every distance tried.",
    "trust better some": "It is ahead at {better} of {all} distances tried.",
    "trust worse all": "“{benchmark}” has been the better guide at every distance tried: ask what the forecast adds.",
    "trust range": "{inside} of {n} actuals fell inside the {range}, where about {expected} should.",
    "trust range few": "That is {fewer} fewer than there should be: the range may be too narrow here.",
    "trust untried": "There is not enough history to try the procedure on this series. The range is borrowed "
        "from the "
                     "portfolio; treat it with care.",
    "trust too few": "Only {n} forecasts could be tried, too few to draw.",
    "changed title": "What changed", "changed sub": "From last round’s figures to these",
    "changed say": "For {when} round {round} said {before}; this round says {now}.",
    "changed most": "The largest change is in {when}: {size}.",
    "changed none": "No {noun} of the forecast has moved by more than the rounding of the figures.",
    "changed first": "This is the first round that holds the series; there is no earlier figure to compare with.",
    "changed alone": "This study was made outside a round; there is no earlier figure to compare with.",
    "changed no overlap": "Round {round} said nothing about the {plural} shown here.",
    "last title": "How last time turned out",
    "last sub": "Forecasts one {noun} ahead, against what happened",
    "last said": "{when}: we said {said}, it came to {actual},",
    "last would": "{when}: the procedure would have said {said}, it came to {actual},",
    "last inside": "inside the range.", "last near top": "inside the range but near its top.",
    "last near bottom": "inside the range but near its bottom.",
    "last above": "above the range.", "last below": "below the range.", "last no range": "and no range was given.",
    "last missing": "There is no actual for {when} yet.",
    "last untold": "Nothing was said of {when} before it closed.",
    "last count": "Of the last {n} {plural} {out} fell outside; about {expected} should.",
    "last count few": "Of the last {n} {plural} {out} fell outside; on average fewer than one should.",
    "last lean none": "Misses fall on both sides: {above} {plural} came in above what would have been said and "
        "{below} below.",
    "last lean above": "{above} of {n} {plural} came in above what would have been said: the forecast may lean low.",
    "last lean below": "{below} of {n} {plural} came in below what would have been said: the forecast may lean high.",
    "people title": "Adjustments", "people sub": "What people changed, and why",
    "people none": "Nobody has changed this forecast: it is the baseline.",
    "people say": "{total} {unit} over {count}, by {who}.",
    "people several": "several people",
    "findings title": "Findings and repairs", "findings sub": "What was found in the history",
    "findings none": "Nothing was found in the data of this series, and nothing was repaired.",
    "findings say": "{what} found in the data.",
    "findings was": "was", "findings were": "were",
    "findings repaired|1": "One value was repaired for fitting; the raw value is kept and is what forecasts are "
        "measured against.",
    "findings repaired|n": "{words} values were repaired for fitting; the raw values are kept and are what "
        "forecasts are "
                           "measured against.",
    "findings unrepaired": "Nothing was repaired.",
    "findings queries": "A query needs a person: please say whether the value is right.",
    "pattern title": "Pattern and method", "pattern sub": "What the history holds, and how the forecast uses it",
    "pattern unknown": "The pattern cannot be told yet.",
    "strength strong": "Strong", "strength some": "Moderate", "strength weak": "Weak",
    "strength none": "No more than noise",
    "strength unknown": "Cannot tell",
    "strength of": "({value} of 1)",
    "method lead": "The method in plain words.", "method why": "How the methods were weighted.",
    "numbers title": "Numbers", "numbers sub": "All actuals on record",
    "numbers sub cut": "Actuals of the last {count} years",
    "numbers repaired": "□ marks a period whose value was repaired for fitting; the raw value is shown.",
    "numbers part": "* Not every {noun} of the year is known.",
    "made title": "How it was made", "made sub": "So that it can be made again",
    "words title": "Words and cautions", "words sub": "",
    "why not title": "Why there is no forecast", "why not sub": "And what would change that",
    "why not say": "{reason}. It will be forecast when this no longer holds; its actuals so far are below.",
}

_GLOSSARY = {
    "word forecast": "Forecast", "means forecast": "The most likely number: as likely to be too high as too "
        "low. It is the "
                     "baseline with the adjustments added.",
    "word range": "Range", "means range": "Where the figure should fall. Values outside the {range} are "
        "expected now and "
                  "then ({outside}); they are not errors.",
    "word baseline": "Baseline, adjustment, adjusted",
    "means baseline": "The statistical forecast; a dated, signed and reasoned change to it; the sum of both.",
    "word round": "Round", "means round": "One run of the forecast cycle, named by its last closed {noun}. It "
        "is drafted, "
                  "issued, and then agreed; an agreed round never changes.",
    "word miss": "Typical miss", "means miss": "The average size of the miss, whichever side it fell on.",
    "word finding": "Finding, repair", "means finding": "A fault is certainly wrong, a query needs a person. A "
        "repair is the "
                    "value used for fitting instead; the raw value is kept and shown.",
    "word tried": "Would have said", "means tried": "The whole procedure lived through again from past "
        "{plural}, each time with "
                  "only what was known then.",
    "word blend": "Blend", "means blend": "A weighted combination of several methods.",
    "cautions": "Cautions",
    "caution 1": "Forecasts mislead: they carry the past forward and do not know what nobody has told them, "
        "such as price "
                 "changes, lost customers, closures or weather. Local rules and qualified judgement come first.",
    "caution 2": "The range is about the total of the {noun}. It does not say how single days will vary.",
    "caution 3": "Ranges do not add. For several {plural} or series, use the totals given.",
    "caution 4": "The range says how far such forecasts have missed, in this portfolio and its past. It "
        "promises nothing about "
                 "an unusual future.",
}

_METHODS = {
    "method naive": "Last value (naive)", "method seasonal_naive": "Same season last year (seasonal naive)",
    "method mean": "Mean of all periods", "method moving_average": "Moving average",
    "method drift": "Last value with drift", "method drift_with_season": "Drift with season",
    "method ses": "Simple exponential smoothing",
    "method differenced_ses": "Smoothed changes", "method seasonally_differenced_ses": "Smoothed changes on "
        "last year",
    "method holt": "Holt’s linear trend", "method damped_holt": "Damped trend",
    "method holt_winters_additive": "Holt-Winters, additive season",
    "method damped_holt_winters_additive": "Damped Holt-Winters, additive season",
    "method holt_winters_multiplicative": "Holt-Winters, multiplicative season",
    "method damped_holt_winters_multiplicative": "Damped Holt-Winters, multiplicative season",
    "method seasonal_ses_additive": "Simple smoothing, additive season",
    "method seasonal_ses_multiplicative": "Simple smoothing, multiplicative season",
    "method theta": "Theta", "method optimised_theta": "Optimised theta", "method dynamic_theta": "Dynamic theta",
    "method averaged_damped": "Averaged damped trend", "method log_ses": "Simple exponential smoothing of logarithms",
    "method best_form": "Best smoothing form", "method weighted_forms": "Weighted smoothing forms",
    "method temporal_hierarchy": "Temporal hierarchy of weighted forms",
    "method croston": "Croston", "method sba": "Syntetos-Boylan approximation",
    "method tsb": "Teunter-Syntetos-Babai",
}

_METHOD_VARIANTS = {"log": "{method} on logarithms", "relative": "{method}, relative errors"}

TEXTS: dict[str, str] = {
    **_NAMES, **_HEAD, **_SECTIONS, **_GLOSSARY, **_METHODS,
    **{f"method variant {key}": text for key, text in _METHOD_VARIANTS.items()}}
