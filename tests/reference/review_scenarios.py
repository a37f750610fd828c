"""Scenarios that the tests of the review page add to those of the engine."""

from __future__ import annotations

from survey_scenarios import ROOK, changed, limited

# Another limit alone, under which the later season has not yet its best
STARLING = limited(changed(ROOK, ('"Rook to Mars"', '"Starling to Mars"')), "c3_km2_s2 = { max = 12 }")
# A name and a description that would run a script, end an element or break out of text, if they were markup;
# as a TOML string has it
HOSTILE = "</script><script>window.taken=1</script><img src=x onerror=window.taken=2>\\\"'&lt;"
CUCKOO = changed(ROOK, ('"Rook to Mars"', f'"{HOSTILE}"\ndescription = "{HOSTILE}"'))
